"""Left-handed frames: what is carried over to the partner is the same attitude, by scipy's products."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.attitude.extraction import chain_matrix
from trunnion.attitude.frames import Frame
from trunnion.attitude.partners import axis_map, matrix_through_partners, sequence_through_partner
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError

OLD = Frame("old", ("north", "east", "up"), left_handed=True)
LOCAL = Frame("local", ("north", "east", "down"))
BODY_OLD = Frame("body old", ("forward", "port", "down"), left_handed=True)
BODY = Frame("body", ("forward", "starboard", "down"))


def test_component_maps() -> None:
    np.testing.assert_array_equal(axis_map(LOCAL, OLD), np.diag([1.0, 1.0, -1.0]))
    np.testing.assert_array_equal(axis_map(BODY, BODY_OLD), np.diag([1.0, -1.0, 1.0]))
    turned = Frame("turned", ("east", "north", "up"))
    np.testing.assert_array_equal(axis_map(turned, OLD), [[0, 1, 0], [1, 0, 0], [0, 0, 1]])
    with pytest.raises(AttitudeError, match="axis 'forward' of frame 'body' is no axis of frame 'local'"):
        axis_map(LOCAL, BODY)


@pytest.mark.parametrize("sequence", list(Sequence), ids=lambda sequence: sequence.name)
def test_sequences_in_every_left_or_right_handed_relabelling(sequence: Sequence) -> None:
    """P Rot Rot Rot P^T, multiplied out by scipy's elementary matrices, is the carried-over sequence."""
    angles = np.array([10.0, -35.0, 50.0])
    M = Rotation.from_euler(sequence.name, angles, degrees=True).as_matrix()
    for order in itertools.permutations(range(3)):
        for signs in itertools.product((1.0, -1.0), repeat=3):
            P = np.eye(3)[list(order)] * np.array(signs)
            carried, senses = sequence_through_partner(sequence, P)
            ours = chain_matrix(np.radians(angles) * senses, sequence=carried, sense=Sense.MOVING)
            np.testing.assert_allclose(ours, P @ M @ P.T, rtol=0, atol=1e-15)
            fixed = chain_matrix(np.radians(angles) * senses, sequence=carried, sense=Sense.FIXED)
            N = Rotation.from_euler(sequence.name.lower(), angles, degrees=True).as_matrix()
            np.testing.assert_allclose(fixed, P @ N @ P.T, rtol=0, atol=1e-15)


def test_matrices_between_left_handed_frames() -> None:
    M = Rotation.random(50, random_state=4).as_matrix()
    R = matrix_through_partners(M, axis_map(LOCAL, OLD), axis_map(BODY, BODY_OLD))
    v_body = np.array([0.3, -1.2, 0.5])
    v_old = (M @ (axis_map(BODY_OLD, BODY) @ v_body)) @ axis_map(LOCAL, OLD).T
    np.testing.assert_allclose(R @ v_body, v_old, rtol=0, atol=1e-15)
    with pytest.raises(AttitudeError, match="is a reflection"):
        matrix_through_partners(M, axis_map(LOCAL, OLD), np.eye(3))
    with pytest.raises(AttitudeError, match=r"one \+1 or -1 in each row"):
        sequence_through_partner(Sequence.ZYX, 0.5 * np.eye(3))
