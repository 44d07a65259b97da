"""The formulas of forms that are no sequence of turns, each proven exactly and to fifty digits.

Letters: a, b the two tilts; u = (u1, u2, u3) the components of up along the first, second and upright body axis; n the
axis of a single turn by t. R takes body to reference components.
"""

from __future__ import annotations

from random import Random

import mpmath
import sympy

from trunnion.attitude.forms import DirectionRoll, RotationVector, TiltPair, TiltType
from trunnion.attitude.stated_forms import StatedForm
from trunnion.symbolic.proofs import WORKING_DIGITS, Identity, Sample, identity, prove
from trunnion.symbolic.steps import Step

_SEED, _POINTS = 20260201, 3
S1, C1, S2, C2, S3, C3 = sympy.symbols("s1 c1 s2 c2 s3 c3")


def form_steps(stated: StatedForm) -> tuple[Step, ...]:
    """The steps from numbers to attitude and back, for the kind of form it is. ProofError for one that fails."""
    form = stated.form
    if isinstance(form, RotationVector):
        return _vector_steps()
    if isinstance(form, DirectionRoll) or form.gimballed:
        return _chain_steps(form)
    return _sine_steps() if form.types[0] is TiltType.SINE else _tangent_steps()


def _samples(*names: str) -> list[Sample]:
    """Random points: for each number n the symbols `sn`, `cn` of one angle within 80 degrees."""
    draw = Random(_SEED)
    found: list[Sample] = []
    with mpmath.workdps(WORKING_DIGITS):
        for _ in range(_POINTS):
            point = {}
            for number in names:
                angle = mpmath.mpf(draw.randint(-(10**9), 10**9)) / 10**9 * mpmath.mpf("1.39")
                point[f"s{number}"], point[f"c{number}"] = mpmath.sin(angle), mpmath.cos(angle)
            found.append(point)
    return found


def _step(id: str, title: str, prose: str, sides: tuple[str, str], claim: Identity, samples: list[Sample]) -> Step:
    return Step(id, "form", title, prose, *sides, prove(title, claim, {}, samples))


def _sine_steps() -> tuple[Step, ...]:
    """Up of two sine tilts, with s2, c2 of the angle in the plane across the first axis: sin b = c1 s2."""
    u = (S1, C1 * S2, C1 * C2)
    points = _samples("1", "2")
    return (
        _step(
            "up", "Up in the body, of two sine tilts",
            "Each tilt is the elevation of its own axis, so its sine is the component of up along that axis; the third "
            r"component follows from unit length. The sign $\sigma$ is $-1$ upside down; $\sin^2 a + \sin^2 b > 1$ is "
            "no attitude.",
            (r"\mathbf{u}", r"\left(\sin a,\; \sin b,\; \sigma\sqrt{1-\sin^2 a-\sin^2 b}\right)"),
            identity(u[2] ** 2, 1 - u[0] ** 2 - u[1] ** 2), points,
        ),
        _step(
            "tilts", "The tilts, of up in the body",
            "Two arguments each, so that no digits are lost near 90°: the second is the length of up across the axis.",
            (r"a", r"\operatorname{atan2}\left(u_1, \sqrt{u_2^2+u_3^2}\right), \qquad "
             r"b = \operatorname{atan2}\left(u_2, \sqrt{u_1^2+u_3^2}\right)"),
            identity([u[1] ** 2 + u[2] ** 2, u[0] ** 2 + u[2] ** 2], [1 - u[0] ** 2, 1 - u[1] ** 2]), points,
        ),
        _triad_step(u, sympy.Integer(1), points),
    )  # fmt: skip


def _tangent_steps() -> tuple[Step, ...]:
    """Up of two tangent tilts, with N² = 1 − s1² s2²."""
    raw = (S1 * C2, C1 * S2, C1 * C2)
    square = 1 - S1**2 * S2**2
    points = _samples("1", "2")
    return (
        _step(
            "up", "Up in the body, of two tangent tilts",
            "Each tilt is seen in the plane of its axis and the upright axis, so its tangent is the ratio of two "
            r"components of up. The sign $\sigma$ is $-1$ upside down.",
            (r"\mathbf{u}", r"\frac{1}{\sqrt{1-\sin^2 a\,\sin^2 b}}\left(\sin a\cos b,\; \cos a\sin b,\; "
             r"\sigma\cos a\cos b\right)"),
            identity(sum(entry**2 for entry in raw), square), points,
        ),
        _step(
            "tilts", "The tilts, of up in the body",
            "The ratio, with the second argument never negative: upside down is said by the sign apart.",
            (r"a", r"\operatorname{atan2}\left(u_1, |u_3|\right), \qquad b = \operatorname{atan2}\left(u_2, |u_3|"
             r"\right)"),
            identity([raw[0] * C1, raw[1] * C2], [raw[2] * S1, raw[2] * S2]), points,
        ),
        _triad_step(raw, square, points),
    )  # fmt: skip


def _triad_step(raw: tuple[sympy.Expr, ...], square: sympy.Expr, points: list[Sample]) -> Step:
    """The attitude from up and the heading: ahead is what of the first axis is level. `raw`: up times sqrt(square)."""
    up = sympy.Matrix(raw)
    ahead = sympy.Matrix([square, 0, 0]) - raw[0] * up  # ahead times square: e1 − u1 u
    side = up.cross(ahead)
    length = square * square - square * raw[0] ** 2  # |ahead|² square²
    claims = (
        (ahead.dot(up), 0),
        (ahead.dot(ahead), length),
        (side.dot(side), length * square),
        (side.dot(up), 0),
    )
    return _step(
        "attitude", "The attitude, of heading and up",
        r"What of the first axis $\mathbf{e}_1$ is level points along the heading $\psi$; with up and the side between "
        "them it makes a triad known on both sides. The identity shown is that the triad has unit length and right "
        r"angles. Where the first axis is vertical its level part vanishes, and $\psi$ means nothing.",
        (r"\mathbf{R}", r"\left[\mathbf{a}_r\;\; \mathbf{z}_r\times\mathbf{a}_r\;\; \mathbf{z}_r\right]"
         r"\left[\mathbf{a}\;\; \mathbf{u}\times\mathbf{a}\;\; \mathbf{u}\right]^{\mathsf T}, \qquad "
         r"\mathbf{a} = \frac{\mathbf{e}_1 - u_1\mathbf{u}}{\sqrt{1-u_1^2}}"),
        identity([a for a, _ in claims], [b for _, b in claims]), points,
    )  # fmt: skip


def _turn(axis: int, c: sympy.Expr, s: sympy.Expr) -> sympy.Matrix:
    i, j = (axis + 1) % 3, (axis + 2) % 3
    turn = sympy.eye(3)
    turn[i, i], turn[j, j], turn[i, j], turn[j, i] = c, c, -s, s
    return turn


def _chain_steps(form: DirectionRoll | TiltPair) -> tuple[Step, ...]:
    """The numbers are turns: their product, with the signs of the form, proven to point where the angles say."""
    chain = form.as_convention()
    numbers = [(C1, S1), (C2, S2), (C3, S3)]
    letters = [rf"\alpha_{place}" for place in (1, 2, 3)]
    product = sympy.eye(3)
    words = []
    for (c, s), axis, sign, letter in zip(numbers, chain.sequence.axes, chain.signs, letters, strict=True):
        product = product * _turn(axis, c, sign * s)
        words.append(rf"\mathbf{{T}}_{'xyz'[axis]}({'-' if sign < 0 else ''}{letter})")
    i, k = chain.sequence.axes[0], chain.sequence.axes[2]
    middle = product[i, k]
    points = _samples("1", "2", "3")
    minus = "" if middle == S2 else "-"
    return (
        _step(
            "product", "The numbers are turns one after the other",
            f"{', '.join(chain.angle_names)} are turns about moving axes between two constant right-angle frames, "
            r"$\mathbf{L}$ of the reference and $\mathbf{B}$ of the body; every formula of a sequence holds.",
            (r"\mathbf{R}", r"\mathbf{L}\," + r"\,".join(words) + r"\,\mathbf{B}"),
            identity(product * product.T, sympy.eye(3)), points,
        ),
        _step(
            "middle", f"One entry carries {chain.angle_names[1]} alone",
            "With the chain $\\mathbf{E} = \\mathbf{L}^{\\mathsf T}\\mathbf{R}\\mathbf{B}^{\\mathsf T}$.",
            (rf"E_{{{i + 1}{k + 1}}}", rf"{minus}\sin\alpha_2"), identity(middle, -S2 if minus else S2), points,
        ),
    )  # fmt: skip


def _vector_steps() -> tuple[Step, ...]:
    """Rodrigues' matrix of an axis n = (c1 c2, s1 c2, s2) and a turn by the angle of c3, s3."""
    n = sympy.Matrix([C1 * C2, S1 * C2, S2])
    cross = sympy.Matrix([[0, -n[2], n[1]], [n[2], 0, -n[0]], [-n[1], n[0], 0]])
    R = sympy.eye(3) + S3 * cross + (1 - C3) * cross * cross
    points = _samples("1", "2", "3")
    return (
        _step(
            "matrix", "The matrix of the vector",
            r"With $t$ the length of the vector and $\mathbf{n}$ its direction (half-turns included).",
            (r"\mathbf{R}", r"\mathbf{I} + \sin t\,[\mathbf{n}]_\times + (1-\cos t)\,[\mathbf{n}]_\times^2"),
            identity(R * R.T, sympy.eye(3)), points,
        ),
        _step(
            "axis", "The turn leaves its axis alone",
            "So the components of the vector are the same in both frames.",
            (r"\mathbf{R}\,\mathbf{n}", r"\mathbf{n}"), identity(R * n, n), points,
        ),
        _step(
            "vector", "The vector of the matrix",
            r"The skew half of the matrix is $\sin t\,[\mathbf{n}]_\times$ and its trace $1 + 2\cos t$; near half a "
            r"turn the skew half vanishes, and $\mathbf{n}$ comes from the symmetric one.",
            (r"\mathbf{R}-\mathbf{R}^{\mathsf T}",
             r"2\sin t\,[\mathbf{n}]_\times, \qquad \operatorname{tr}\mathbf{R} = 1 + 2\cos t"),
            identity([*(R - R.T), R.trace()], [*(2 * S3 * cross), 1 + 2 * C3]), points,
        ),
    )  # fmt: skip
