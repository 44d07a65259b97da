"""The Python side of code generation: the standard library's mathematics only."""

from __future__ import annotations

from string import Template
from typing import TYPE_CHECKING

from trunnion.attitude.sequences import Sense
from trunnion.attitude.words import default_ranges
from trunnion.symbolic.derivation import Derivation
from trunnion.symbolic.emission import PYTHON, Lines, header_lines

if TYPE_CHECKING:
    from trunnion.symbolic.codegen import Row

_MODULE = Template('''\
"""$title

$about

Matrices are three rows of three numbers. The angles of a matrix rebuild that matrix to rounding at every attitude.
The lock margin (rad) is returned with them: divide the error of the attitude by it to get the error of either outer
angle. Input is not checked: a matrix must be a rotation, a quaternion must not be zero.
"""

import math

LAST_ZERO = 0  # which outer turn is zero when only one combination of both is known (margin exactly zero)
FIRST_ZERO = 1


def _into_turn(angle, low, high):
    """Whole turns added: into (low, high], or [low, high) where low is zero."""
    turn = 2.0 * math.pi
    if low == 0.0:
        while angle < low:
            angle += turn
        while angle >= high:
            angle -= turn
        return angle
    while angle <= low:
        angle += turn
    while angle > high:
        angle -= turn
    return angle


def _into_half(angle, low, high):
    """Whole turns added until the angle lies in a range of half a turn, or as near to it as can be."""
    turn, slack = 2.0 * math.pi, math.pi / 4.0
    while angle < low - slack:
        angle += turn
    while angle > high + slack:
        angle -= turn
    return angle


def _positive(q):
    """The one of q and -q whose first component that is not zero is positive."""
    for part in q:
        if part != 0.0:
            return tuple(-p for p in q) if part < 0.0 else tuple(q)
    return tuple(q)


def matrix_from_angles(angles):
    """The stated matrix of three stated angles."""
$cosines
$chain
    return (
        ($m0, $m1, $m2),
        ($m3, $m4, $m5),
        ($m6, $m7, $m8),
    )


def quaternion_from_angles(angles):
    """The quaternion, scalar first, of the stated matrix; first component that is not zero positive."""
$halves
$four
    return _positive(($q0, $q1, $q2, $q3))


def angles_from_matrix(matrix, policy=LAST_ZERO):
    """(stated angles, lock margin) of a stated matrix."""
    m = [entry for row in matrix for entry in row]
$back
$arguments
    locked = sine == 0.0 and cosine == 0.0
    zero_outer = policy == $outer_policy
    if locked:
        $outer = $outer_zero if zero_outer else $outer_locked
    else:
        $outer = $outer_regular
    $outer_c = math.cos($outer)
    $outer_s = math.sin($outer)
    $inner = $inner_zero if locked and not zero_outer else $inner_residual
    y2 = $middle
    return $choice, margin


def _placed(y1, y2, y3):
    """Offsets added and whole turns taken off."""
    return ($placed)
$second

def matrix_from_quaternion(q):
    """Matrix of a quaternion, scalar first, of any length but zero."""
    w, x, y, z = q
    s = 2.0 / (w * w + x * x + y * y + z * z)
    return (
        (1.0 - s * (y * y + z * z), s * (x * y - w * z), s * (x * z + w * y)),
        (s * (x * y + w * z), 1.0 - s * (x * x + z * z), s * (y * z - w * x)),
        (s * (x * z - w * y), s * (y * z + w * x), 1.0 - s * (x * x + y * y)),
    )


def quaternion_from_matrix(matrix):
    """Quaternion, scalar first, of a matrix, from its largest component; first component not zero positive."""
    (m0, m1, m2), (m3, m4, m5), (m6, m7, m8) = matrix
    trace = m0 + m4 + m8
    size = (1.0 + trace, 1.0 + 2.0 * m0 - trace, 1.0 + 2.0 * m4 - trace, 1.0 + 2.0 * m8 - trace)
    a, b, c = m7 - m5, m2 - m6, m3 - m1
    d, e, f = m1 + m3, m2 + m6, m5 + m7
    rows = ((size[0], a, b, c), (a, size[1], d, e), (b, d, size[2], f), (c, e, f, size[3]))
    row = rows[max(range(4), key=lambda n: size[n])]
    length = math.sqrt(sum(part * part for part in row))
    return _positive([part / length for part in row])


def angles_from_quaternion(q, policy=LAST_ZERO):
    """(stated angles, lock margin) of a quaternion of the stated matrix."""
    return angles_from_matrix(matrix_from_quaternion(q), policy)


def turn_between(one, other):
    """Angle (rad) of the turn between two matrices: the measure of whether they are the same attitude."""
    (a0, a1, a2), (a3, a4, a5), (a6, a7, a8) = one
    (b0, b1, b2), (b3, b4, b5), (b6, b7, b8) = other
    x = a2 * b1 + a5 * b4 + a8 * b7 - a1 * b2 - a4 * b5 - a7 * b8
    y = a0 * b2 + a3 * b5 + a6 * b8 - a2 * b0 - a5 * b3 - a8 * b6
    z = a1 * b0 + a4 * b3 + a7 * b6 - a0 * b1 - a3 * b4 - a6 * b7
    trace = a0 * b0 + a1 * b1 + a2 * b2 + a3 * b3 + a4 * b4 + a5 * b5 + a6 * b6 + a7 * b7 + a8 * b8
    return math.atan2(math.sqrt(x * x + y * y + z * z), trace - 1.0)


def body_rate(angles, rates):
    """Angular velocity of the body relative to the reference, in body components, from angle rates (rad/s)."""
$cosines
$body_lines
    return ($body_sides)


def reference_rate(angles, rates):
    """The same in reference components."""
$cosines
$reference_lines
    return ($reference_sides)


def angle_rates(angles, omega):
    """Angle rates from the angular velocity in body components; ZeroDivisionError exactly at lock."""
$cosines
$back_lines
    determinant = $determinant
    return ($back_sides)


# Reference attitudes: stated angles (rad), stated matrix, quaternion of the stated matrix (scalar first).
ROWS = (
$rows
)


def self_test(rows=ROWS, allowed=2e-14):
    """What fails, as sentences; nothing when all is well."""
    found = []

    def judge(what, row, miss):
        if not miss <= allowed:
            found.append(f"row {row}: {what}: off by {miss:.3g}, allowed {allowed:.3g}")

    for number, (angles, matrix, quaternion) in enumerate(rows, start=1):
        made = matrix_from_angles(angles)
        judge("matrix from angles", number, max(abs(made[i][j] - matrix[i][j]) for i in range(3) for j in range(3)))
        four = quaternion_from_angles(angles)
        signs = [max(abs(s * four[n] - quaternion[n]) for n in range(4)) for s in (1.0, -1.0)]
        judge("quaternion from angles", number, min(signs))
        for policy in (LAST_ZERO, FIRST_ZERO):
            triple, _ = angles_from_matrix(matrix, policy)
            judge("angles from matrix, turn", number, turn_between(matrix_from_angles(triple), matrix))
            triple, _ = angles_from_quaternion(quaternion, policy)
            judge("angles from quaternion, turn", number, turn_between(matrix_from_angles(triple), matrix))
        back = matrix_from_quaternion(quaternion_from_matrix(matrix))
        judge("quaternion from matrix, turn", number, turn_between(back, matrix))
    return found


if __name__ == "__main__":
    faults = self_test()
    print("\\n".join([*faults, f"{len(ROWS)} reference attitudes, {len(faults)} failures"]))
    raise SystemExit(1 if faults else 0)
''')

_SECOND = Template('''

def _chosen(y1, y2, y3):
    """The triple whose outer angle lies in its range; the second one where the first does not."""
    angles = _placed(y1, y2, y3)
    if $low - 1e-6 <= angles[$place] <= $high + 1e-6:
        return angles
    return _placed($second)
''')


def module(derivation: Derivation, stem: str, rows: list[Row]) -> str:
    """The module with its reference attitudes."""
    lines = Lines(derivation, PYTHON)
    about = header_lines(derivation)
    sides, four = lines.stated(), lines.stated_quaternion()
    fields = {"title": about[0], "about": "\n".join(about[1:])}
    fields |= {f"m{n}": side for n, side in enumerate(sides)} | {f"q{n}": side for n, side in enumerate(four)}
    fields |= {
        "cosines": _block(lines.cosines()),
        "chain": _block(lines.chain()),
        "halves": _block(lines.halves()),
        "four": _block(lines.quaternion()),
        "rows": "\n".join(_row_text(row) for row in rows),
    }
    return _MODULE.substitute(fields | _back_fields(lines) | _rate_fields(lines))


def _back_fields(lines: Lines) -> dict[str, str]:
    outer, _, inner = lines.setting.order
    o, i = outer.place + 1, inner.place + 1
    fields = {
        "back": _block(lines.back_to_chain()),
        "arguments": _block(lines.outer_arguments()),
        "outer_policy": "FIRST_ZERO" if lines.setting.convention.sense is Sense.MOVING else "LAST_ZERO",
        "outer": f"y{o}",
        "inner": f"y{i}",
        "outer_c": f"c{o}",
        "outer_s": f"s{o}",
        "outer_zero": lines.at_zero_turn(outer),
        "inner_zero": lines.at_zero_turn(inner),
        "outer_locked": lines.locked_outer(),
        "outer_regular": "math.atan2(sine, cosine)",
        "inner_residual": lines.inner(),
        "middle": lines.middle(),
        "placed": ", ".join(_placed(lines)),
    }
    place = lines.half_outer()
    if place is None:
        return fields | {"choice": "_placed(y1, y2, y3)", "second": ""}
    low, high = lines.ranges()[place]
    second = _SECOND.substitute(low=low, high=high, place=place, second=", ".join(lines.second()))
    return fields | {"choice": "_chosen(y1, y2, y3)", "second": second}


def _placed(lines: Lines) -> list[str]:
    spans = [high - low for low, high in default_ranges(lines.setting.convention)]
    parts = []
    for turn, (low, high), span in zip(lines.setting.turns, lines.ranges(), spans, strict=True):
        kind = "half" if abs(span - 3.141592653589793) < 1e-6 else "turn"
        parts.append(f"_into_{kind}({lines.with_offset(turn, f'y{turn.place + 1}')}, {low}, {high})")
    return parts


def _rate_fields(lines: Lines) -> dict[str, str]:
    fields = {}
    for side in ("body", "reference"):
        fields[f"{side}_lines"] = _block(lines.rate_lines(side))
        fields[f"{side}_sides"] = ", ".join(lines.rate_sides(side))
    determinant, sides = lines.back_rate_sides()
    fields["back_lines"] = _block(lines.back_rate_lines())
    fields["determinant"] = determinant
    fields["back_sides"] = ", ".join(f"({side}) / determinant" for side in sides)
    return fields


def _row_text(row: Row) -> str:
    def numbers(values) -> str:  # type: ignore[no-untyped-def]
        return "(" + ", ".join(repr(float(value)) for value in values) + ")"

    angles, matrix, quaternion = row
    matrix_text = "(" + ", ".join(numbers(line) for line in matrix) + ")"
    return f"    ({numbers(angles)}, {matrix_text}, {numbers(quaternion)}),"


def _block(lines: list[str]) -> str:
    return "\n".join(f"    {line}" for line in lines)
