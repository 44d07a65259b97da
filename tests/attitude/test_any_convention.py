"""Any convention at any attitude: hypothesis picks sequence, senses, constants, ranges, and attitudes near lock."""

from __future__ import annotations

from typing import Any

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import Policy
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence

LOCAL, BODY = Frame("local", ("north", "east", "down")), Frame("body", ("forward", "starboard", "down"))
ANGLE = st.floats(-np.pi, np.pi)
VECTOR = st.tuples(ANGLE, ANGLE, ANGLE)
SIGN = st.sampled_from([1, -1])
DISTANCE = st.sampled_from([0.0, 1e-16, 1e-14, 1e-10, 1e-7, 1e-3, 0.3, 1.0])


@st.composite
def conventions(draw: Any) -> Convention:
    sequence, sense = draw(st.sampled_from(list(Sequence))), draw(st.sampled_from(list(Sense)))
    signs, offsets = draw(st.tuples(SIGN, SIGN, SIGN)), draw(VECTOR)
    left, right = (Rotation.from_rotvec(draw(VECTOR)).as_matrix() for _ in range(2))
    ranges = None
    if draw(st.booleans()):
        low = 0.0 if sequence.repeated else -np.pi / 2
        ends = sorted(signs[1] * (low + half) + offsets[1] for half in (0.0, np.pi))
        outer = st.sampled_from([(0.0, 2 * np.pi), (-np.pi, np.pi)])
        ranges = (draw(outer), (ends[0], ends[1]), draw(outer))
    return Convention(
        "any", LOCAL, BODY, sequence, sense, ("a", "b", "c"), signs, offsets, left, right, ranges, draw(st.booleans())
    )


@settings(max_examples=300, deadline=None, derandomize=True)
@given(conventions(), VECTOR, DISTANCE, st.booleans(), st.sampled_from(list(Policy)))
def test_there_and_back(
    convention: Convention, outer: tuple[float, ...], distance: float, upper: bool, policy: Policy
) -> None:
    repeated = convention.sequence.repeated
    singular = (np.pi if upper else 0.0) if repeated else (np.pi / 2 if upper else -np.pi / 2)
    turns = np.array([outer[0], singular + (-distance if upper else distance), outer[2]])
    R = convention.matrix(convention.stated_from_chain(turns))
    found = convention.angles(R, policy)
    again = convention.matrix(found.angles)
    assert (Rotation.from_matrix(R).inv() * Rotation.from_matrix(again)).magnitude() < 1e-14
    assert abs(found.margin - convention.lock_margin(R)) < 2e-15
    assert abs(found.margin - min(distance, np.pi / 2)) < 3e-15
    if convention.ranges is not None:
        for angle, (low, high) in zip(found.angles, convention.ranges, strict=True):
            assert low <= angle <= high
    through_matrix = convention.from_stated_matrix(convention.stated_matrix(R))
    through_quaternion = convention.from_stated_quaternion(convention.stated_quaternion(R))
    np.testing.assert_array_equal(through_matrix, R)
    np.testing.assert_allclose(through_quaternion, R, rtol=0, atol=2e-15)
