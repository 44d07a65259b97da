"""The C99 side of code generation."""

from __future__ import annotations

import re
from collections.abc import Iterable
from string import Template
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.sequences import Sense
from trunnion.attitude.words import default_ranges
from trunnion.symbolic.derivation import Derivation
from trunnion.symbolic.emission import C_DOUBLE, C_FLOAT, Language, Lines, header_lines

if TYPE_CHECKING:
    from trunnion.symbolic.codegen import Row

_TOP = Template("""\
/*
$about
 *
 * Matrices are nine numbers, row by row. Functions ending in _f work in float, the others in double.
 * The angles of a matrix rebuild that matrix to rounding at every attitude. The lock margin (rad) is returned:
 * divide the error of the attitude by it to get the error of either outer angle. Input is not checked: a matrix
 * must be a rotation, a quaternion must not be zero.
 */
#ifndef ${guard}_H
#define ${guard}_H

#include <math.h>

/* Which outer turn is zero when only one combination of both is known (margin exactly zero). */
#define ${guard}_LAST_ZERO 0
#define ${guard}_FIRST_ZERO 1
""")

_FUNCTIONS = Template("""
/* Whole turns added: into (low, high], or [low, high) where low is zero. */
static inline $T ${p}into_turn$e($T angle, $T low, $T high)
{
    const $T turn = $turn;
    if (low == $zero) {
        while (angle < low) angle += turn;
        while (angle >= high) angle -= turn;
    } else {
        while (angle <= low) angle += turn;
        while (angle > high) angle -= turn;
    }
    return angle;
}

/* Whole turns added until the angle lies in a range of half a turn, or as near to it as can be. */
static inline $T ${p}into_half$e($T angle, $T low, $T high)
{
    const $T turn = $turn;
    const $T slack = $slack;
    while (angle < low - slack) angle += turn;
    while (angle > high + slack) angle -= turn;
    return angle;
}

/* The stated matrix of three stated angles. */
static inline void ${p}matrix_from_angles$e(const $T angles[3], $T m[9])
{
$cosines
$chain
$stated
}

/* The quaternion, scalar first, of the stated matrix; first component that is not zero positive. */
static inline void ${p}quaternion_from_angles$e(const $T angles[3], $T q[4])
{
$halves
$four
    $T sign = $one;
    int n;
$stated_four
    for (n = 0; n < 4; ++n) {
        if (q[n] != $zero) {
            sign = q[n] < $zero ? -$one : $one;
            break;
        }
    }
    for (n = 0; n < 4; ++n) q[n] *= sign;
}

/* Stated angles of a stated matrix; returns the lock margin. */
static inline $T ${p}angles_from_matrix$e(const $T m[9], int policy, $T angles[3])
{
$back
$arguments
    const int locked = sine == $zero && cosine == $zero;
    const int zero_outer = policy == $outer_policy;
    $T $outer = locked ? (zero_outer ? $outer_zero : $outer_locked) : $outer_regular;
    const $T $outer_c = $cos_outer;
    const $T $outer_s = $sin_outer;
    $T $inner = locked && !zero_outer ? $inner_zero : $inner_residual;
    $T y2 = $middle;
$choice
    return margin;
}

/* Matrix of a quaternion, scalar first, of any length but zero. */
static inline void ${p}matrix_from_quaternion$e(const $T q[4], $T m[9])
{
    const $T w = q[0], x = q[1], y = q[2], z = q[3];
    const $T s = $two / (w*w + x*x + y*y + z*z);
    m[0] = $one - s*(y*y + z*z); m[1] = s*(x*y - w*z); m[2] = s*(x*z + w*y);
    m[3] = s*(x*y + w*z); m[4] = $one - s*(x*x + z*z); m[5] = s*(y*z - w*x);
    m[6] = s*(x*z - w*y); m[7] = s*(y*z + w*x); m[8] = $one - s*(x*x + y*y);
}

/* Quaternion, scalar first, of a matrix, from its largest component; first component that is not zero positive. */
static inline void ${p}quaternion_from_matrix$e(const $T m[9], $T q[4])
{
    const $T trace = m[0] + m[4] + m[8];
    const $T size[4] = {$one + trace, $one + $two*m[0] - trace, $one + $two*m[4] - trace, $one + $two*m[8] - trace};
    const $T a = m[7] - m[5], b = m[2] - m[6], c = m[3] - m[1];
    const $T d = m[1] + m[3], e = m[2] + m[6], f = m[5] + m[7];
    const $T row[4][4] = {{size[0], a, b, c}, {a, size[1], d, e}, {b, d, size[2], f}, {c, e, f, size[3]}};
    $T length, sign = $one;
    int best = 0, n;
    for (n = 1; n < 4; ++n) if (size[n] > size[best]) best = n;
    length = $sqrt(row[best][0]*row[best][0] + row[best][1]*row[best][1]
                  + row[best][2]*row[best][2] + row[best][3]*row[best][3]);
    for (n = 0; n < 4; ++n) {
        if (row[best][n] != $zero) {
            sign = row[best][n] < $zero ? -$one : $one;
            break;
        }
    }
    for (n = 0; n < 4; ++n) q[n] = sign*row[best][n]/length;
}

/* Stated angles of a quaternion of the stated matrix; returns the lock margin. */
static inline $T ${p}angles_from_quaternion$e(const $T q[4], int policy, $T angles[3])
{
    $T m[9];
    ${p}matrix_from_quaternion$e(q, m);
    return ${p}angles_from_matrix$e(m, policy, angles);
}

/* Angle (rad) of the turn between two matrices: the measure of whether they are the same attitude. */
static inline $T ${p}turn_between$e(const $T a[9], const $T b[9])
{
    const $T x = a[2]*b[1] + a[5]*b[4] + a[8]*b[7] - a[1]*b[2] - a[4]*b[5] - a[7]*b[8];
    const $T y = a[0]*b[2] + a[3]*b[5] + a[6]*b[8] - a[2]*b[0] - a[5]*b[3] - a[8]*b[6];
    const $T z = a[1]*b[0] + a[4]*b[3] + a[7]*b[6] - a[0]*b[1] - a[3]*b[4] - a[6]*b[7];
    $T trace = $zero;
    int n;
    for (n = 0; n < 9; ++n) trace += a[n]*b[n];
    return $atan2($sqrt(x*x + y*y + z*z), trace - $one);
}

/* Angular velocity of the body relative to the reference, in body components, from angle rates (rad/s). */
static inline void ${p}body_rate$e(const $T angles[3], const $T rates[3], $T omega[3])
{
$body_cosines
$body_lines
$body_sides
}

/* The same in reference components. */
static inline void ${p}reference_rate$e(const $T angles[3], const $T rates[3], $T omega[3])
{
$reference_cosines
$reference_lines
$reference_sides
}

/* Angle rates from the angular velocity in body components; returns the determinant that was divided by:
   the sine of the lock margin up to sign. Zero means lock, and the rates are then not finite. */
static inline $T ${p}angle_rates$e(const $T angles[3], const $T omega[3], $T rates[3])
{
$back_cosines
$back_lines
    const $T determinant = $determinant;
$back_sides
    return determinant;
}
""")

_SELF_TEST = Template("""\
/* Runs reference attitudes through $stem.h; prints what fails and returns 1 if anything does. */
#include <stdio.h>
#include "$stem.h"

#define ROWS $count

static const double angles_of[ROWS][3] = {
$angles
};
static const double matrix_of[ROWS][9] = {
$matrices
};
static const double quaternion_of[ROWS][4] = {
$quaternions
};

static int failures = 0;

static void judge(const char *what, int row, double miss, double allowed)
{
    if (!(miss <= allowed)) {
        printf("row %d: %s: off by %.3g, allowed %.3g\\n", row + 1, what, miss, allowed);
        ++failures;
    }
}
$double_test$float_test
int main(void)
{
    int row;
    for (row = 0; row < ROWS; ++row) {
        check(row);
        check_f(row);
    }
    printf("%d reference attitudes, %d failures\\n", ROWS, failures);
    return failures ? 1 : 0;
}
""")

_ONE_TEST = Template("""
static void check$e(int row)
{
    $T angles[3], m[9], q[4], found[9], four[4], triple[3];
    double miss = 0.0, plus = 0.0, minus = 0.0;
    int n;
    for (n = 0; n < 3; ++n) angles[n] = ($T)angles_of[row][n];
    for (n = 0; n < 9; ++n) m[n] = ($T)matrix_of[row][n];
    for (n = 0; n < 4; ++n) q[n] = ($T)quaternion_of[row][n];
    ${p}matrix_from_angles$e(angles, found);
    for (n = 0; n < 9; ++n) miss = fmax(miss, fabs((double)found[n] - matrix_of[row][n]));
    judge("$T matrix from angles", row, miss, $allowed);
    ${p}quaternion_from_angles$e(angles, four);
    for (n = 0; n < 4; ++n) {
        plus = fmax(plus, fabs((double)four[n] - quaternion_of[row][n]));
        minus = fmax(minus, fabs((double)four[n] + quaternion_of[row][n]));
    }
    judge("$T quaternion from angles", row, fmin(plus, minus), $allowed);
    for (n = 0; n < 2; ++n) {
        ${p}angles_from_matrix$e(m, n, triple);
        ${p}matrix_from_angles$e(triple, found);
        judge("$T angles from matrix, turn", row, ${p}turn_between$e(found, m), $allowed);
        ${p}angles_from_quaternion$e(q, n, triple);
        ${p}matrix_from_angles$e(triple, found);
        judge("$T angles from quaternion, turn", row, ${p}turn_between$e(found, m), $allowed);
    }
    ${p}quaternion_from_matrix$e(m, four);
    ${p}matrix_from_quaternion$e(four, found);
    judge("$T quaternion from matrix, turn", row, ${p}turn_between$e(found, m), $allowed);
}
""")

_ALLOWED = {"double": "2e-14", "float": "4e-6"}  # rounding of the format times the dozen operations of the longest path


def header(derivation: Derivation, stem: str) -> str:
    """The header: double and float functions."""
    about = "\n".join(f" * {line}" for line in header_lines(derivation))
    text = _TOP.substitute(about=about, guard=stem.upper())
    for kind, language in (("double", C_DOUBLE), ("float", C_FLOAT)):
        text += _FUNCTIONS.substitute(_fields(derivation, stem, kind, language))
    return text + f"\n#endif /* {stem.upper()}_H */\n"


def self_test(derivation: Derivation, stem: str, rows: list[Row]) -> str:
    """A program that includes the header and runs the rows in both precisions."""
    tests = {
        kind: _ONE_TEST.substitute(T=kind, p=f"{stem}_", e=end, allowed=_ALLOWED[kind])
        for kind, end in (("double", ""), ("float", "_f"))
    }
    return _SELF_TEST.substitute(
        stem=stem,
        count=len(rows),
        angles=_table([row[0] for row in rows]),
        matrices=_table([row[1].ravel() for row in rows]),
        quaternions=_table([row[2] for row in rows]),
        double_test=tests["double"],
        float_test=tests["float"],
    )


def _table(rows: list[NDArray[np.float64]]) -> str:
    return ",\n".join("    {" + ", ".join(repr(float(value)) for value in row) + "}" for row in rows)


def _fields(derivation: Derivation, stem: str, kind: str, language: Language) -> dict[str, str]:
    lines = Lines(derivation, language)
    number = language.number
    fields = {
        "T": kind,
        "p": f"{stem}_",
        "e": "" if kind == "double" else "_f",
        "turn": number(6.283185307179586),
        "slack": number(0.7853981633974483),
        "zero": number(0.0),
        "one": number(1.0),
        "two": number(2.0),
        "sqrt": f"sqrt{language.suffix.lower()}",
        "atan2": f"atan2{language.suffix.lower()}",
        "cosines": _block(lines.cosines()),
        "chain": _block(lines.chain()),
        "stated": _block(f"m[{n}] = {side};" for n, side in enumerate(lines.stated())),
        "halves": _block(lines.halves()),
        "four": _block(lines.quaternion()),
        "stated_four": _block(f"q[{n}] = {side};" for n, side in enumerate(lines.stated_quaternion())),
    }
    return fields | _back_fields(lines, stem) | _rate_fields(lines)


def _back_fields(lines: Lines, stem: str) -> dict[str, str]:
    outer, _, inner = lines.setting.order
    call = lines.language.call
    o, i = outer.place + 1, inner.place + 1
    outer_first = lines.setting.convention.sense is Sense.MOVING
    residual, arguments = lines.inner(), lines.outer_arguments()
    locked, middle = lines.locked_outer(), lines.middle()
    return {
        "back": _used(lines.back_to_chain(), " ".join([*arguments, residual, locked])),
        "arguments": _block(arguments),
        "outer_policy": f"{stem.upper()}_{'FIRST' if outer_first else 'LAST'}_ZERO",
        "outer": f"y{o}",
        "inner": f"y{i}",
        "outer_c": f"c{o}",
        "outer_s": f"s{o}",
        "cos_outer": call("cos", f"y{o}"),
        "sin_outer": call("sin", f"y{o}"),
        "outer_zero": lines.at_zero_turn(outer),
        "inner_zero": lines.at_zero_turn(inner),
        "outer_locked": locked,
        "outer_regular": call("atan2", "sine", "cosine"),
        "inner_residual": residual,
        "middle": middle,
        "choice": _block(_choice(lines, stem)),
    }


def _choice(lines: Lines, stem: str) -> list[str]:
    """Offsets, the second triple where an outer range rules the first out, and the ranges."""
    end = "_f" if lines.language.suffix else ""
    placed = []
    for turn, (low, high) in zip(lines.setting.turns, lines.ranges(), strict=True):
        half = abs(_span(lines, turn.place) - 3.141592653589793) < 1e-6
        name = f"{stem}_into_{'half' if half else 'turn'}{end}"
        placed.append(f"angles[{turn.place}] = {name}({lines.with_offset(turn, f'y{turn.place + 1}')}, {low}, {high});")
    place = lines.half_outer()
    if place is None:
        return placed
    low, high = lines.ranges()[place]
    slack = lines.language.number(1e-6)
    first, second, third = lines.second()
    again = [f"    y1 = {first};", f"    y2 = {second};", f"    y3 = {third};", *(f"    {line}" for line in placed)]
    test = f"if (angles[{place}] < {low} - {slack} || angles[{place}] > {high} + {slack}) {{"
    return [*placed, test, *again, "}"]


def _span(lines: Lines, place: int) -> float:
    low, high = default_ranges(lines.setting.convention)[place]
    return high - low


def _rate_fields(lines: Lines) -> dict[str, str]:
    fields = {}
    for side in ("body", "reference"):
        rows = lines.rate_lines(side)
        fields[f"{side}_cosines"] = _used(lines.cosines(), " ".join(rows))
        fields[f"{side}_lines"] = _block(rows)
        fields[f"{side}_sides"] = _block(f"omega[{n}] = {s};" for n, s in enumerate(lines.rate_sides(side)))
    determinant, sides = lines.back_rate_sides()
    fields["back_cosines"] = _used(lines.cosines(), " ".join([determinant, *sides]))
    fields["back_lines"] = _block(lines.back_rate_lines())
    fields["determinant"] = determinant
    fields["back_sides"] = _block(f"rates[{n}] = ({side})/determinant;" for n, side in enumerate(sides))
    return fields


def _block(lines: Iterable[str]) -> str:
    return "\n".join(f"    {line}" for line in lines)


def _used(lines: list[str], text: str) -> str:
    """Only the assignments whose name is read in `text`."""
    read = set(re.findall(r"\w+", text))
    return _block(line for line in lines if line.split(" =")[0].split()[-1] in read)
