"""Checks of a derivation by scipy's rotations: product, extraction, rates, and what is left at lock."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.sheet import display, independent
from trunnion.symbolic.derivation import Derivation

Array = NDArray[np.float64]

TOLERANCE_DEG = 1e-9
RATE_TOLERANCE = 1e-6  # of a unit rate; scipy is differenced over a step of 1e-6 rad
_STEP = 1e-6
_SEED = 11
_COUNT = 20


def show_checks(derivation: Derivation) -> None:
    """Four checks, each the worst of its attitudes."""
    convention = derivation.convention
    stated = _ordinary_angles(convention)
    _check_matrices(derivation, stated)
    _check_extraction(derivation, stated)
    _check_rates(derivation, stated)
    _check_lock(derivation)


def _ordinary_angles(convention: Convention) -> Array:
    """Twenty attitudes (20, 3) rad, fixed seed, 5 deg or more from lock."""
    generator = np.random.default_rng(_SEED)
    outer = generator.uniform(-np.pi, np.pi, size=(_COUNT, 2))
    reach = np.radians(85.0)
    middle = generator.uniform(-reach, reach, size=_COUNT) + (np.pi / 2 if convention.sequence.repeated else 0.0)
    return convention.stated_from_chain(np.column_stack([outer[:, 0], middle, outer[:, 1]]))


def _check_matrices(derivation: Derivation, stated: Array) -> None:
    from scipy.spatial.transform import Rotation

    convention = derivation.convention
    theirs = independent.rotation(convention, np.degrees(stated))
    ours = np.array([derivation.value("matrix", angles) for angles in stated])
    if not convention.maps_body_to_reference:
        ours = ours.transpose(0, 2, 1)
    apart = np.degrees((Rotation.from_matrix(ours).inv() * theirs).magnitude())
    off = float(np.max(np.abs(ours - theirs.as_matrix())))
    _show("matrix", f"matrix of {_COUNT} attitudes", max(float(apart.max()), np.degrees(off)), TOLERANCE_DEG, "deg")


def _check_extraction(derivation: Derivation, stated: Array) -> None:
    """Angles derived from scipy's matrices must make scipy's rotation again."""
    convention = derivation.convention
    theirs = independent.rotation(convention, np.degrees(stated))
    matrices = theirs.as_matrix() if convention.maps_body_to_reference else theirs.inv().as_matrix()
    back = np.array([derivation.angles(matrix) for matrix in matrices])
    apart = np.degrees((independent.rotation(convention, np.degrees(back)).inv() * theirs).magnitude())
    _show(
        "extraction", f"angles recovered from {_COUNT} matrices, as rotations", float(apart.max()), TOLERANCE_DEG, "deg"
    )


def _check_rates(derivation: Derivation, stated: Array) -> None:
    """Angular velocity in body axes by differencing scipy's rotations, one angle at a time."""
    convention = derivation.convention
    worst = 0.0
    for angles in stated:
        matrix = derivation.value("body rates", angles)
        for place in range(3):
            step = np.eye(3)[place] * _STEP
            before, after = (independent.rotation(convention, np.degrees(angles + s)) for s in (-step, step))
            turned = (before.inv() * after).as_rotvec()[0] / (2.0 * _STEP)
            worst = max(worst, float(np.max(np.abs(turned - matrix[:, place]))))
    _show("rates", "angular velocity in body axes of unit angle rates", worst, RATE_TOLERANCE, "rad/s")


def _check_lock(derivation: Derivation) -> None:
    """At both singular values: the combination derived, put into the first angle alone, is the same rotation."""
    from trunnion.attitude.words import singular_attitudes

    convention = derivation.convention
    worst = 0.0
    for number, attitude in enumerate(singular_attitudes(convention)):
        locked = np.array([0.3, attitude.angle, -0.7])
        there = independent.rotation(convention, np.degrees(locked))
        matrix = (there if convention.maps_body_to_reference else there.inv()).as_matrix()[0]
        one = derivation.combination(number, matrix) + _offset(derivation, 0)
        alone = np.array([one, attitude.angle, _offset(derivation, 2)])
        again = independent.rotation(convention, np.degrees(alone))
        worst = max(worst, float(np.degrees((there.inv() * again).magnitude()[0])))
    _show("lock", "locked attitudes rebuilt from the one angle that is left", worst, TOLERANCE_DEG, "deg")


def _offset(derivation: Derivation, place: int) -> float:
    """What a formula's angle lacks to be the stated one (offsets that are no quarter turns)."""
    turn = derivation.setting.turns[place]
    return float(turn.offset) if turn.shifted else 0.0


def _show(name: str, what: str, worst: float, tolerance: float, unit: str) -> None:
    display.check(
        f"check:{name}", what, ours=0.0, theirs=worst, difference=worst, tolerance=tolerance, unit=unit,
        library=independent.LIBRARY,
    )  # fmt: skip
