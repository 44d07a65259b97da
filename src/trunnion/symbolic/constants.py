"""The constant rotations of a convention as exact expressions where they can be, as stated numbers where not."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from fractions import Fraction

import mpmath
import numpy as np
import sympy
from numpy.typing import NDArray

from trunnion.symbolic.proofs import ROOT_2, WORKING_DIGITS

_SAME = 1e-13  # a constant this close to a named exact rotation is that rotation; doubles of one are within 1e-15
_DENOMINATOR = 180_000  # angles of up to three decimals of a degree are kept as exact multiples of pi

AXES = "xyz"


@dataclass(frozen=True)
class Constant:
    """One constant rotation.

    kind: `identity`, `relabelling` (one of the 24 right-angle rotations), `turn` (a relabelling turned about one
    coordinate axis by `angle`: entries in the symbols k = cos and l = sin of it) or `general` (stated numbers; the
    exact work is then done on the chain alone).
    """

    letter: str
    kind: str
    matrix: sympy.ImmutableMatrix
    axis: int | None
    angle: sympy.Expr | None
    relabelling: sympy.ImmutableMatrix
    numbers: mpmath.matrix
    quaternion: tuple[sympy.Expr, sympy.Expr, sympy.Expr, sympy.Expr]

    @property
    def exact(self) -> bool:
        """True when the entries are exact expressions."""
        return self.kind != "general"

    def values(self) -> dict[str, mpmath.mpf]:
        """Numeric values of the symbols k, l and their half-angle twins i, j."""
        if self.angle is None:
            return {}
        angle = to_number(self.angle)
        values = {"k": mpmath.cos(angle), "l": mpmath.sin(angle)}
        values |= {"i": mpmath.cos(angle / 2), "j": mpmath.sin(angle / 2)}
        return {name + self.letter: value for name, value in values.items()}


def turn_matrix(axis: int, cosine: sympy.Expr, sine: sympy.Expr) -> sympy.ImmutableMatrix:
    """The active turn about x, y or z, from Rodrigues' formula: I + sin t [n]× + (1 − cos t) [n]×²."""
    n = cross_matrix([sympy.Integer(int(axis == index)) for index in range(3)])
    return sympy.ImmutableMatrix((sympy.eye(3) + sine * n + (1 - cosine) * n * n).applyfunc(sympy.expand))


def cross_matrix(v: list[sympy.Expr]) -> sympy.ImmutableMatrix:
    """[v]×: the matrix of the cross product with v."""
    x, y, z = v
    return sympy.ImmutableMatrix([[0, -z, y], [z, 0, -x], [-y, x, 0]])


def relabellings() -> list[NDArray[np.float64]]:
    """The 24 proper signed permutation matrices."""
    found = []
    for order in itertools.permutations(range(3)):
        for signs in itertools.product((1.0, -1.0), repeat=3):
            matrix = np.zeros((3, 3))
            matrix[range(3), order] = signs
            if np.linalg.det(matrix) > 0:
                found.append(matrix)
    return found


def exact_angle(angle: float) -> sympy.Expr:
    """An angle (rad) as an exact multiple of pi where it is one to 1e-13 rad, else the double it is."""
    share = Fraction(angle / np.pi).limit_denominator(_DENOMINATOR)
    if abs(float(share) * np.pi - angle) < _SAME and _DENOMINATOR % share.denominator == 0:
        return sympy.pi * sympy.Rational(share.numerator, share.denominator)
    return sympy.Float(mpmath.nstr(mpmath.mpf(angle), 17), 17)


def to_number(value: object) -> mpmath.mpf:
    """An exact expression as a number of 70 digits."""
    return mpmath.mpf(sympy.Float(sympy.N(sympy.sympify(value), WORKING_DIGITS), WORKING_DIGITS)._mpf_)


def constant(matrix: NDArray[np.float64], letter: str) -> Constant:
    """Recognize a constant rotation (3, 3); `letter` is L (reference side) or B (body side)."""
    value = np.asarray(matrix, float)
    rounded = np.round(value)
    if np.max(np.abs(value - rounded)) < _SAME:
        exact = _integers(rounded)
        kind = "identity" if np.array_equal(rounded, np.eye(3)) else "relabelling"
        numbers = mpmath.matrix(rounded.tolist())
        return Constant(letter, kind, exact, None, None, exact, numbers, relabelling_quaternion(rounded))
    turned = _as_turn(value)
    return _turn(letter, *turned) if turned else _general(letter, value)


def _integers(matrix: NDArray[np.float64]) -> sympy.ImmutableMatrix:
    return sympy.ImmutableMatrix(3, 3, [int(entry) for entry in matrix.flat])


def _as_turn(value: NDArray[np.float64]) -> tuple[int, float, NDArray[np.float64]] | None:
    """(axis, angle, relabelling) with value = turn(axis, angle) @ relabelling, or None.

    No relabelling at all is preferred, then the smallest angle.
    """
    best = None
    for relabelling in sorted(relabellings(), key=lambda matrix: -float(np.trace(matrix))):
        if best is not None and np.array_equal(best[2], np.eye(3)):
            break
        rest = value @ relabelling.T
        for axis in range(3):
            if abs(rest[axis, axis] - 1) < _SAME and np.sum(np.abs(rest[axis])) < 1 + _SAME * 10:
                first, second = (axis + 1) % 3, (axis + 2) % 3
                angle = float(np.arctan2(rest[second, first], rest[first, first]))
                if best is None or abs(angle) < abs(best[1]) - _SAME:
                    best = (axis, angle, relabelling)
    return best


def _turn(letter: str, axis: int, angle: float, relabelling: NDArray[np.float64]) -> Constant:
    cosine, sine, half_cosine, half_sine = sympy.symbols(f"k{letter} l{letter} i{letter} j{letter}")
    exact = _integers(relabelling)
    matrix = sympy.ImmutableMatrix(turn_matrix(axis, cosine, sine) * exact)
    symbol = exact_angle(angle)
    with mpmath.workdps(WORKING_DIGITS):
        number = to_number(symbol)
        turn = sympy.Matrix(turn_matrix(axis, sympy.Symbol("c"), sympy.Symbol("s")))
        entries = sympy.lambdify(sympy.symbols("c s"), turn.tolist(), "mpmath")
        numbers = mpmath.matrix(entries(mpmath.cos(number), mpmath.sin(number))) * mpmath.matrix(relabelling.tolist())
    elementary: list[sympy.Expr] = [half_cosine, sympy.S.Zero, sympy.S.Zero, sympy.S.Zero]
    elementary[axis + 1] = half_sine
    quaternion = hamilton(tuple(elementary), relabelling_quaternion(relabelling))
    return Constant(letter, "turn", matrix, axis, symbol, exact, numbers, quaternion)


def _general(letter: str, value: NDArray[np.float64]) -> Constant:
    with mpmath.workdps(WORKING_DIGITS):
        numbers = mpmath.matrix(value.tolist())
        for _ in range(8):  # Newton's iteration to the nearest rotation: doubles are orthogonal to 1e-16 only
            numbers = (numbers + mpmath.inverse(numbers).T) / 2
        quaternion = _quaternion_numbers(numbers)
    symbols = sympy.ImmutableMatrix(3, 3, lambda i, j: sympy.Symbol(f"{letter}{i + 1}{j + 1}"))
    floats = tuple(sympy.Float(entry, WORKING_DIGITS) for entry in quaternion)
    return Constant(letter, "general", symbols, None, None, _integers(np.eye(3)), numbers, floats)


def _quaternion_numbers(R: mpmath.matrix) -> list[mpmath.mpf]:
    """Scalar-first quaternion of a rotation, from the largest of its four components; scalar part not negative."""
    trace = R[0, 0] + R[1, 1] + R[2, 2]
    squares = [1 + trace] + [1 + 2 * R[n, n] - trace for n in range(3)]
    outer = [
        [squares[0], R[2, 1] - R[1, 2], R[0, 2] - R[2, 0], R[1, 0] - R[0, 1]],
        [R[2, 1] - R[1, 2], squares[1], R[0, 1] + R[1, 0], R[0, 2] + R[2, 0]],
        [R[0, 2] - R[2, 0], R[0, 1] + R[1, 0], squares[2], R[1, 2] + R[2, 1]],
        [R[1, 0] - R[0, 1], R[0, 2] + R[2, 0], R[1, 2] + R[2, 1], squares[3]],
    ]
    row = outer[max(range(4), key=lambda n: squares[n])]
    length = mpmath.sqrt(sum(entry * entry for entry in row))
    leading = next(entry for entry in row if abs(entry) > mpmath.mpf(10) ** -40)
    sign = 1 if leading > 0 else -1
    return [sign * entry / length for entry in row]


def relabelling_quaternion(
    matrix: NDArray[np.float64],
) -> tuple[sympy.Expr, sympy.Expr, sympy.Expr, sympy.Expr]:
    """Exact quaternion of one of the 24: components 0, ±1/2, ±√2/2 or ±1."""
    exact = {0.0: sympy.S.Zero, 0.25: sympy.S.Half, 0.5: ROOT_2 / 2, 1.0: sympy.S.One}
    numbers = [float(entry) for entry in _quaternion_numbers(mpmath.matrix(matrix.tolist()))]
    return tuple(exact[round(n * n, 6)] * (1 if n >= 0 else -1) for n in numbers)


def hamilton(
    p: tuple[sympy.Expr, ...], q: tuple[sympy.Expr, ...]
) -> tuple[sympy.Expr, sympy.Expr, sympy.Expr, sympy.Expr]:
    """Hamilton product p q, scalar first."""
    p0, p1, p2, p3 = p
    q0, q1, q2, q3 = q
    return (
        sympy.expand(p0 * q0 - p1 * q1 - p2 * q2 - p3 * q3),
        sympy.expand(p0 * q1 + p1 * q0 + p2 * q3 - p3 * q2),
        sympy.expand(p0 * q2 - p1 * q3 + p2 * q0 + p3 * q1),
        sympy.expand(p0 * q3 + p1 * q2 - p2 * q1 + p3 * q0),
    )


def matrix_of(q: tuple[sympy.Expr, ...]) -> sympy.ImmutableMatrix:
    """Matrix of a unit quaternion, from v ↦ q v q*."""
    w, x, y, z = q
    return sympy.ImmutableMatrix(
        [
            [w * w + x * x - y * y - z * z, 2 * (x * y - w * z), 2 * (x * z + w * y)],
            [2 * (x * y + w * z), w * w - x * x + y * y - z * z, 2 * (y * z - w * x)],
            [2 * (x * z - w * y), 2 * (y * z + w * x), w * w - x * x - y * y + z * z],
        ]
    )
