"""The same quantities by another route: scipy's rotations and differences of them, nothing from the derivation.

This module reads a derivation as data (its numbers through `value`, `angles`, `combination`) and imports no module
of this room. A corrupted formula (a sign, a transposed matrix) shows up as a row that does not agree.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.sequences import Sense

if TYPE_CHECKING:
    from scipy.spatial.transform import Rotation

    from trunnion.symbolic.derivation import Derivation

Array = NDArray[np.float64]

LIBRARY = "scipy.spatial.transform"
_ENTRIES = 1e-13  # rounding of two products of three matrices; a wrong sign is of the order of one
_ANGLES = 1e-12  # rad; rounding divided by the least margin of the attitudes used (about 10 deg)
_DIFFERENCES = 1e-8  # central differences with one extrapolation: truncation 1e-13, rounding 1e-11
_RELATIVE = 1e-6  # of a condition number up to 1146, whose difference quotient carries 1e-11 · 1146
_STEP = 1e-3  # rad
_SHARES = ((0.42, 0.20, 0.61), (0.81, 0.37, 0.13), (0.09, 0.86, 0.72))
_SLIDE = 0.4  # rad along the null direction


@dataclass(frozen=True)
class CheckRow:
    """One comparison: ours, theirs, their difference against a tolerance, in `unit`, and the library asked."""

    what: str
    ours: float
    theirs: float
    difference: float
    tolerance: float
    unit: str
    library: str

    @property
    def agrees(self) -> bool:
        """True when the difference is within the tolerance; a NaN never is."""
        return bool(self.difference <= self.tolerance)


def independent_check(derivation: Derivation) -> list[CheckRow]:
    """Compare a derivation with scipy at several attitudes and at both singular values; every row should agree."""
    convention = derivation.convention
    triples = [_triple(convention, shares) for shares in _SHARES]
    rows = [
        _matrix(derivation, triples),
        _angles(derivation, triples),
        _angles_rebuilt(derivation, triples),
        _second(derivation, triples),
        _quaternion(derivation, triples),
    ]
    rows += [_rates(derivation, triples, side) for side in ("body", "reference")]
    rows += [_rates_inverse(derivation, triples, side) for side in ("body", "reference")]
    rows += [_determinant(derivation, triples), _conditions(derivation)]
    for number in (0, 1):
        rows += _lock(derivation, number)
    return rows


def confirmation(derivation: Derivation) -> list[tuple[str, float, float, float]]:
    """Rows (quantity, derived, scipy, difference) at one attitude: matrix entries, quaternion, angles in deg."""
    convention = derivation.convention
    angles = _triple(convention, _SHARES[0])
    theirs = _stated(convention, angles)
    letter = "R" if convention.maps_body_to_reference else "C"
    ours = derivation.value("matrix", angles)
    rows = [(f"{letter}{i + 1}{j + 1}", ours[i, j], theirs[i, j]) for i in range(3) for j in range(3)]
    four, other = _same_sign(derivation.value("quaternion", angles)[0], _four(rotation(convention, angles)))
    rows += [(f"q{n}", four[n], other[n]) for n in range(4)]
    back = np.degrees(derivation.angles(theirs))
    rows += [(f"{name}, deg", back[n], np.degrees(angles[n])) for n, name in enumerate(convention.angle_names)]
    wrap = [360.0 if name.endswith(", deg") else np.inf for name, _, _ in rows]
    return [(name, float(a), float(b), float(_gap(a - b, turn))) for (name, a, b), turn in zip(rows, wrap, strict=True)]


def _gap(difference: float, turn: float) -> float:
    return abs(difference) if np.isinf(turn) else abs(np.remainder(difference + turn / 2, turn) - turn / 2)


# -- scipy's side -------------------------------------------------------------------------------------------------


def rotation(convention: Convention, angles: Array) -> Rotation:
    """R_rb of stated angles (3,) rad by scipy alone: upper-case letters turn moving axes, lower-case fixed ones."""
    from scipy.spatial.transform import Rotation

    turns = np.asarray(convention.signs) * (np.asarray(angles) - np.asarray(convention.offsets))
    letters = convention.sequence.name
    chain = Rotation.from_euler(letters if convention.sense is Sense.MOVING else letters.lower(), turns)
    return Rotation.from_matrix(convention.left) * chain * Rotation.from_matrix(convention.right)


def _stated(convention: Convention, angles: Array) -> Array:
    R = rotation(convention, angles).as_matrix()
    return R if convention.maps_body_to_reference else R.T


def _four(R: Rotation) -> Array:
    return np.roll(R.as_quat(), 1)


def _slopes(convention: Convention, angles: Array) -> Array:
    """Angular velocity in reference axes per unit rate of each stated angle, as columns, by differences."""

    def quotient(place: int, step: float) -> Array:
        shift = np.zeros(3)
        shift[place] = step
        ahead, behind = rotation(convention, angles + shift), rotation(convention, angles - shift)
        return (ahead * behind.inv()).as_rotvec() / (2 * step)

    fine, coarse = (np.column_stack([quotient(n, s) for n in range(3)]) for s in (_STEP / 2, _STEP))
    return (4 * fine - coarse) / 3


def _triple(convention: Convention, shares: tuple[float, float, float]) -> Array:
    """Stated angles (3,) with outer turns anywhere and the middle angle at a share of its range."""
    half = convention.ranges is not None and abs(np.ptp(convention.ranges[1]) - np.pi) < 1e-6
    if half:
        assert convention.ranges is not None
        lo, hi = convention.ranges[1]
    else:
        turn = (0.0, np.pi) if convention.sequence.repeated else (-np.pi / 2, np.pi / 2)
        lo, hi = sorted(convention.offsets[1] + convention.signs[1] * end for end in turn)
    first, last = (-np.pi + 2 * np.pi * share for share in (shares[0], shares[2]))
    return np.array([first, lo + shares[1] * (hi - lo), last])


def _singular_triple(convention: Convention, turn: float) -> Array:
    middle = convention.offsets[1] + convention.signs[1] * turn
    return np.array([0.3, middle, -0.7])


# -- rows ---------------------------------------------------------------------------------------------------------


def _row(what: str, pairs: list[tuple[Array, Array]], tolerance: float, unit: str, turn: float = np.inf) -> CheckRow:
    """The entry with the largest difference over all pairs."""
    ours = np.concatenate([np.ravel(a) for a, _ in pairs])
    theirs = np.concatenate([np.ravel(b) for _, b in pairs])
    gaps = np.abs(ours - theirs)
    if np.isfinite(turn):
        gaps = np.abs(np.remainder(ours - theirs + turn / 2, turn) - turn / 2)
    worst = int(np.argmax(np.where(np.isnan(gaps), np.inf, gaps)))
    return CheckRow(what, float(ours[worst]), float(theirs[worst]), float(gaps[worst]), tolerance, unit, LIBRARY)


def _matrix(d: Derivation, triples: list[Array]) -> CheckRow:
    pairs = [(d.value("matrix", angles), _stated(d.convention, angles)) for angles in triples]
    return _row("entries of the stated matrix", pairs, _ENTRIES, "1")


def _angles(d: Derivation, triples: list[Array]) -> CheckRow:
    pairs = [(d.angles(_stated(d.convention, angles)), angles) for angles in triples]
    return _row("angles from the matrix", pairs, _ANGLES, "rad", 2 * np.pi)


def _angles_rebuilt(d: Derivation, triples: list[Array]) -> CheckRow:
    pairs = []
    for angles in triples:
        stated = _stated(d.convention, angles)
        pairs.append((_stated(d.convention, d.angles(stated)), stated))
    return _row("matrix rebuilt from the extracted angles", pairs, _ENTRIES, "1")


def _second(d: Derivation, triples: list[Array]) -> CheckRow:
    pairs = [(_stated(d.convention, d.other_angles(a)), _stated(d.convention, a)) for a in triples]
    return _row("matrix of the second triple", pairs, _ENTRIES, "1")


def _same_sign(ours: Array, theirs: Array) -> tuple[Array, Array]:
    return ours, theirs if np.dot(ours, theirs) >= 0 else -theirs


def _quaternion(d: Derivation, triples: list[Array]) -> CheckRow:
    pairs = [_same_sign(d.value("quaternion", a)[0], _four(rotation(d.convention, a))) for a in triples]
    return _row("quaternion, up to the common sign", pairs, _ENTRIES, "1")


def _their_rates(d: Derivation, angles: Array, side: str) -> Array:
    slopes = _slopes(d.convention, angles)
    return slopes if side == "reference" else rotation(d.convention, angles).inv().as_matrix() @ slopes


def _rates(d: Derivation, triples: list[Array], side: str) -> CheckRow:
    pairs = [(d.value(f"{side} rates", a), _their_rates(d, a, side)) for a in triples]
    return _row(f"rate matrix in {side} axes, against differences", pairs, _DIFFERENCES, "1")


def _rates_inverse(d: Derivation, triples: list[Array], side: str) -> CheckRow:
    pairs = [(d.value(f"{side} rates inverse", a) @ _their_rates(d, a, side), np.eye(3)) for a in triples]
    return _row(f"inverse rate matrix in {side} axes times differences", pairs, _DIFFERENCES, "1")


def _determinant(d: Derivation, triples: list[Array]) -> CheckRow:
    pairs = [(d.value("determinant", a), np.linalg.det(_slopes(d.convention, a))) for a in triples]
    return _row("determinant of the rate matrix", [(a, np.array([b])) for a, b in pairs], _DIFFERENCES, "1")


def _conditions(d: Derivation) -> CheckRow:
    """The tabulated condition numbers against singular values of the difference matrix, relative."""
    start = 0.0 if d.convention.sequence.repeated else np.pi / 2
    inward = 1.0 if d.convention.sequence.repeated else -1.0
    pairs = []
    for margin, _, _, condition in d.conditions:
        angles = _singular_triple(d.convention, start + inward * np.radians(margin))
        theirs = float(np.linalg.cond(_slopes(d.convention, angles)))
        pairs.append((np.array([condition / theirs]), np.array([1.0])))
    return _row("tabulated condition numbers, ratio to computed ones", pairs, _RELATIVE, "1")


def _lock(d: Derivation, number: int) -> list[CheckRow]:
    convention, case = d.convention, d.locked[number]
    angles = _singular_triple(convention, float(case.turn))
    label = f"{convention.angle_names[1]} {np.degrees(case.words.angle):.6g} deg"
    here = rotation(convention, angles)
    slide = np.array([_SLIDE, 0.0, -case.relation * _SLIDE])
    against = np.array([_SLIDE, 0.0, case.relation * _SLIDE])
    same = (here.inv() * rotation(convention, angles + slide)).magnitude()
    other = (here.inv() * rotation(convention, angles + against)).magnitude()
    first, _, last = d.setting.turns
    y1, y3 = (angles[turn.place] - (convention.offsets[turn.place] if turn.shifted else 0.0) for turn in (first, last))
    delta = y1 + case.relation * y3
    found = d.combination(number, _stated(convention, angles))
    pointing = here.as_matrix() @ case.words.body_direction
    return [
        _row(f"sliding along the null direction at {label}", [(np.array([same]), np.zeros(1))], _ANGLES, "rad"),
        _row(f"sliding across it at {label}", [(np.array([2 * _SLIDE]), np.array([other]))], _ANGLES, "rad"),
        _row(
            f"the combination recovered at {label}", [(np.array([found]), np.array([delta]))], _ANGLES, "rad", 2 * np.pi
        ),
        _row(
            f"where the body direction points at {label}", [(case.words.reference_direction, pointing)], _ENTRIES, "1"
        ),
    ]
