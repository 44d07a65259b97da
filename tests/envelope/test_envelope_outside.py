"""The closed form against programs that know nothing of it: scipy, CSPICE, mpmath, and our own subdivision."""

import mpmath
import numpy as np
import pytest
import spiceypy
from mpmath import iv
from scipy.spatial.transform import Rotation

from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.box import ROUNDING_BOUND, box_angle_range
from trunnion.envelope.margins import direction_clearance, entry_margin_table, lock_margin
from trunnion.envelope.regions import Box, Cone, Roll
from trunnion.envelope.subdivision import check_angle, self_check


def test_closed_form_lies_in_the_bracket_of_the_subdivision(random_case, count):
    """Boxes of any width in any convention, constants on both sides, evaluated for another convention."""
    rng = np.random.default_rng(11)
    for n in range(count(2000)):
        box, convention = random_case(rng, n)
        margin = lock_margin(box, convention).least
        check = self_check(box, convention, tolerance=np.radians(1e-4))
        assert check.finished
        assert margin.lo <= check.hi + 1e-13
        assert margin.hi >= check.lo - 1e-13


def test_largest_angle_lies_in_the_bracket_of_the_subdivision(random_case, count):
    rng = np.random.default_rng(12)
    for n in range(count(500)):
        box, convention = random_case(rng, n)
        u, v = convention.lock_axes
        clearance = direction_clearance(box, v, u)
        check = check_angle(box, -u, v, tolerance=np.radians(1e-4))
        assert check.finished
        assert clearance.largest.hi >= np.pi - check.hi - 1e-13
        assert clearance.largest.lo <= np.pi - check.lo + 1e-13


def test_skewed_axes_need_the_inner_points(count):
    """Neighbouring axes that are not perpendicular: the 16 inner candidates against subdivision."""
    from trunnion.envelope.branching import least_value
    from trunnion.envelope.subdivision import _ChainProblem

    rng = np.random.default_rng(13)
    for _ in range(count(500)):
        axes, (u, v) = rng.normal(size=(3, 3)), rng.normal(size=(2, 3))
        axes /= np.linalg.norm(axes, axis=1)[:, None]
        u, v = (w[:, None] / np.linalg.norm(w) for w in (u, v))
        low = rng.uniform(-np.pi, np.pi, 3)
        high = low + rng.uniform(0.0, 4.0, 3)
        exact = box_angle_range(axes, low[:, None], high[:, None], u, v).least[0]
        bracket = least_value(_ChainProblem(axes, u, v).bound, low, high, tolerance=np.radians(1e-3))
        assert bracket.lo - 1e-13 <= exact <= bracket.hi + 1e-13


def test_dense_scipy_sampling_is_never_below_the_bound(random_case, count):
    """scipy's Rotation builds the attitudes; none of 4,000 a box has a smaller or larger margin than claimed."""
    rng = np.random.default_rng(14)
    for n in range(count(300)):
        box, convention = random_case(rng, n)
        t = rng.uniform(size=(4000, 3))
        t = np.where(rng.uniform(size=t.shape) < 0.3, np.round(t), t)
        ranges = np.array(box.ranges)
        angles = ranges[:, 0] + t * (ranges[:, 1] - ranges[:, 0])
        letters = box.convention.sequence.name
        letters = letters if box.convention.sense is Sense.MOVING else letters.lower()
        R = box.convention.left @ Rotation.from_euler(letters, angles).as_matrix() @ box.convention.right
        u, v = convention.lock_axes
        carried = R @ v
        line = np.arctan2(np.linalg.norm(np.cross(u, carried), axis=1), np.abs(carried @ u))
        margin = lock_margin(box, convention)
        assert line.min() >= margin.least.lo
        assert line.max() <= margin.largest.hi + 1e-15


def test_witness_margins_by_cspice_and_scipy(random_case, count):
    """CSPICE's middle angle at each witness gives the claimed margin (NAIF rotations: matrix = [a]i [b]j [c]k)."""
    rng = np.random.default_rng(15)
    for n in range(count(300)):
        box, _ = random_case(rng, n)
        table = entry_margin_table(box)
        for sequence in Sequence:
            margin = table.of(sequence, Sense.MOVING)
            for extreme in (margin.least, margin.largest):
                R = np.ascontiguousarray(extreme.witness.matrix)
                middle = spiceypy.m2eul(R, *(axis + 1 for axis in sequence.axes))[1]
                ours = min(abs(middle), np.pi - abs(middle)) if sequence.repeated else np.pi / 2 - abs(middle)
                tolerance = 1e-12 if extreme.lo > 0.1 else 3e-8  # its arccosine is blind to 2e-8 rad near lock
                assert ours == pytest.approx(extreme.witness.value, abs=tolerance)
                assert extreme.lo <= extreme.witness.value + 1e-15
                assert extreme.witness.value <= extreme.hi + 1e-15


def _rotated(axis, angle, w):
    c, s = mpmath.cos(angle), mpmath.sin(angle)
    n = mpmath.matrix(axis)
    cross = mpmath.matrix([n[1] * w[2] - n[2] * w[1], n[2] * w[0] - n[0] * w[2], n[0] * w[1] - n[1] * w[0]])
    along = (n.T * w)[0] * (1 - c)
    return w * c + cross * s + n * along


class _FiftyDigits:
    """Least angle over a box in 50 digits: stationary points of f by plain Cartesian formulas.

    A different road from the library's: circles are intersected in Cartesian coordinates and angles taken by arccos,
    which loses half of the digits; half of 50 is enough.
    """

    def __init__(self, axes, low, high, u, v):
        exact = [[mpmath.mpf(float(x)) for x in w] for w in (*axes, u, v)]
        self.p, self.q, self.r, self.u, self.v = (mpmath.matrix(w) / mpmath.norm(mpmath.matrix(w)) for w in exact)
        self.low, self.high = ([mpmath.mpf(float(x)) for x in end] for end in (low, high))

    def f(self, t):
        a, b, c = t
        carried = _rotated(self.p, a, _rotated(self.q, b, _rotated(self.r, c, self.v)))
        return (self.u.T * carried)[0]

    def least_angle(self):
        best = mpmath.mpf(4)
        for t in self._points():
            fitted = self._fit(t)
            if fitted is not None:
                best = min(best, mpmath.acos(min(self.f(fitted), mpmath.mpf(1))))
        return best

    def _fit(self, t):
        placed = []
        for value, low, high in zip(t, self.low, self.high, strict=True):
            turns = mpmath.ceil((low - value) / (2 * mpmath.pi) - mpmath.mpf(10) ** -40)
            value = value + 2 * mpmath.pi * turns
            if value > high + mpmath.mpf(10) ** -40:
                return None
            placed.append(min(max(value, low), high))
        return placed

    def _points(self):
        ends = [(low, high) for low, high in zip(self.low, self.high, strict=True)]
        for a in ends[0]:
            for b in ends[1]:
                for c in ends[2]:
                    yield (a, b, c)
        for free in range(3):
            others = [i for i in range(3) if i != free]
            for one in ends[others[0]]:
                for two in ends[others[1]]:
                    yield from self._edge(free, others, (one, two))
        for fixed in range(3):
            for value in ends[fixed]:
                yield from self._face(fixed, value)

    def _edge(self, free, others, values):
        """f = A + B cos + C sin along the edge, from three values of f."""
        t = [None] * 3
        t[others[0]], t[others[1]] = values

        def at(angle):
            t[free] = angle
            return self.f(t)

        at_0, at_90, at_180 = at(mpmath.mpf(0)), at(mpmath.pi / 2), at(mpmath.pi)
        mean = (at_0 + at_180) / 2
        angle = mpmath.atan2(at_90 - mean, (at_0 - at_180) / 2)
        for turn in (0, mpmath.pi):
            t[free] = angle + turn
            yield tuple(t)

    def _face(self, fixed, value):
        """Two turns: f = s' M t' with s' = (cos s, sin s, 1); stationary and touching points."""
        i, j = (k for k in range(3) if k != fixed)
        n1, n2, u, v = self._two_turns(fixed, value)
        for s, t in [*_plane_points(n1, n2, u, v), *_touching_points(n1, n2, u, v)]:
            point = [None] * 3
            point[fixed], point[i], point[j] = value, s, t
            yield tuple(point)

    def _two_turns(self, fixed, value):
        if fixed == 2:
            return self.p, self.q, self.u, _rotated(self.r, value, self.v)
        if fixed == 0:
            return self.q, self.r, _rotated(self.p, -value, self.u), self.v
        return self.p, _rotated(self.q, value, self.r), self.u, _rotated(self.q, value, self.v)


def _inner(a, b):
    return (a.T * b)[0]


def _outer(a, b):
    return mpmath.matrix([a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]])


def _turn(axis, start, goal):
    """Turn about axis that brings the perpendicular part of start onto that of goal."""
    one, two = start - axis * _inner(axis, start), goal - axis * _inner(axis, goal)
    if mpmath.norm(one) == 0 or mpmath.norm(two) == 0:
        return mpmath.mpf(0)
    return mpmath.atan2(_inner(axis, _outer(one, two)), _inner(one, two))


def _plane_points(n1, n2, u, v):
    """Rot(n1, -s) u and Rot(n2, t) v both in the plane of n1 and n2."""
    s, t = _turn(n1, n2, u), _turn(n2, v, n1)
    return [(s + i, t + j) for i in (0, mpmath.pi) for j in (0, mpmath.pi)]


def _touching_points(n1, n2, u, v):
    """Where the circles meet: w = α n1 + β n2 ± γ n1×n2 with w.n1 = u.n1, w.n2 = v.n2."""
    h1, h2, g = _inner(n1, u), _inner(n2, v), _inner(n1, n2)
    det = 1 - g * g
    if det < mpmath.mpf(10) ** -30:
        return
    alpha, beta = (h1 - g * h2) / det, (h2 - g * h1) / det
    rest = 1 - (alpha * alpha + beta * beta + 2 * alpha * beta * g)
    if rest < 0:
        return
    gamma = mpmath.sqrt(rest / det)
    for sign in (1, -1):
        w = n1 * alpha + n2 * beta + _outer(n1, n2) * gamma * sign
        yield _turn(n1, w, u), _turn(n2, v, w)


def _adversarial(rng, kind):
    """A box with ends next to stationary or touching points, and slightly misaligned directions."""
    axes = np.eye(3)[rng.permutation(3)]
    if kind % 3 == 0:
        axes[2] = axes[0]
    u, v = rng.normal(size=(2, 3))
    if kind % 2:
        tiny = 10.0 ** rng.uniform(-12, -2, 2)
        u, v = axes[0] + tiny[0] * u, axes[2] + tiny[1] * v
    if kind % 5 == 0:
        u = axes[1] + 10.0 ** rng.uniform(-12, -2) * rng.normal(size=3)
    u, v = u / np.linalg.norm(u), v / np.linalg.norm(v)
    low = rng.uniform(-np.pi, np.pi, 3)
    high = low + rng.choice([0.0, 0.3, 2.0, 6.3], 3) * rng.uniform(0.2, 1.0, 3)
    found = box_angle_range(axes, low[:, None], high[:, None], u[:, None], v[:, None])
    near = found.least_at[:, 0] if kind % 4 else found.largest_at[:, 0]
    shift = rng.choice([-1.0, 1.0], 3) * 10.0 ** rng.uniform(-17, -4, 3)
    chosen = rng.uniform(size=3) < 0.6
    low = np.where(chosen & (rng.uniform(size=3) < 0.5), near + shift, low)
    high = np.maximum(np.where(chosen, np.maximum(near + shift, low), high), low)
    return axes, low, high, u, v


def test_rounding_bound_on_adversarial_boxes_in_50_digits(count):
    """Ends within 1e-17 … 1e-4 rad of the points that matter: the claimed 1e-12 deg holds."""
    rng = np.random.default_rng(16)
    worst = 0.0
    with mpmath.workdps(50):
        for n in range(count(1000)):
            axes, low, high, u, v = _adversarial(rng, n)
            ours = box_angle_range(axes, low[:, None], high[:, None], u[:, None], v[:, None]).least[0]
            theirs = _FiftyDigits(axes, low, high, u, v).least_angle()
            worst = max(worst, abs(float(mpmath.mpf(float(ours)) - theirs)))
    print("largest error", worst, "rad")
    assert worst < 0.25 * ROUNDING_BOUND


def test_interval_arithmetic_confirms_a_few_boxes(make_convention):
    """mpmath's interval arithmetic proves that no attitude of the box is closer to lock than the bound less 0.2 deg."""
    d = np.radians
    for low, high, text in (
        ([10.0, -5.0, -8.0], [18.0, 6.0, 4.0], "1-3-2"),
        ([-40.0, 20.0, 30.0], [-30.0, 32.0, 41.0], "3-1-2"),
        ([100.0, -60.0, -20.0], [112.0, -50.0, -8.0], "3-1-3"),
    ):
        box = Box(make_convention("3-2-1"), tuple(zip(d(low), d(high), strict=True)))
        convention = make_convention(text)
        margin = lock_margin(box, convention).least.lo
        i, _, k = convention.sequence.axes
        limit = float(np.cos(margin - d(0.2)))
        assert _intervals_prove(i, k, [tuple(map(float, span)) for span in box.ranges], limit)


def _intervals_prove(i, k, spans, limit):
    """Entry (i, k) of Rz(a) Ry(b) Rx(c) keeps below `limit` in size over the box, cell by cell."""
    cells = [spans]
    for _ in range(20_000):
        if not cells:
            return True
        cell = cells.pop()
        entry = _interval_entry(i, k, [iv.mpf(list(span)) for span in cell])
        if max(abs(float(entry.a)), abs(float(entry.b))) <= limit:
            continue
        widest = max(range(3), key=lambda n: cell[n][1] - cell[n][0])
        low, high = cell[widest]
        middle = 0.5 * (low + high)
        for half in ((low, middle), (middle, high)):
            cells.append([half if n == widest else cell[n] for n in range(3)])
    return False


def _interval_entry(i, k, angles):
    (ca, sa), (cb, sb), (cc, sc) = ((iv.cos(t), iv.sin(t)) for t in angles)
    rows = [
        [ca * cb, ca * sb * sc - sa * cc, ca * sb * cc + sa * sc],
        [sa * cb, sa * sb * sc + ca * cc, sa * sb * cc - ca * sc],
        [-sb, cb * sc, cb * cc],
    ]
    return rows[i][k]


def test_cones_against_scipy_sampling_and_subdivision(make_convention, count):
    """Annuli with and without a limit on roll: never beaten by samples, inside the bracket of the subdivision."""
    rng = np.random.default_rng(17)
    for n in range(count(200)):
        m, d, s = rng.normal(size=(3, 3))
        near, far = np.sort(rng.uniform(0.0, np.pi, 2)) if n % 3 else (0.0, rng.uniform(0.0, 1.0))
        low = rng.uniform(-np.pi, np.pi)
        roll = Roll(low, low + rng.uniform(0.0, 2.0), s) if n % 2 else None
        cone = Cone(m, d, near, far, roll)
        convention = make_convention(list(Sequence)[n % 12].value)
        margin = lock_margin(cone, convention)
        check = self_check(cone, convention, tolerance=np.radians(0.01))
        assert check.finished
        assert check.lo - 1e-13 <= margin.least.hi
        assert margin.least.lo <= check.hi + 1e-13
        _witness_keeps_the_cone(cone, margin.least.witness.matrix)
        _witness_keeps_the_cone(cone, margin.largest.witness.matrix)
        if roll is None:
            _sampled_cone_is_inside(rng, cone, convention, margin)


def _witness_keeps_the_cone(cone, R):
    held = R @ cone.body_axis
    angle = np.arctan2(np.linalg.norm(np.cross(held, cone.reference_axis)), held @ cone.reference_axis)
    assert cone.nearest - 1e-12 <= angle <= cone.farthest + 1e-12
    assert np.allclose(R @ R.T, np.eye(3), rtol=0.0, atol=1e-14)


def _sampled_cone_is_inside(rng, cone, convention, margin):
    R = Rotation.random(2000, random_state=int(rng.integers(2**31))).as_matrix()
    held = R @ cone.body_axis
    angle = np.arccos(np.clip(held @ cone.reference_axis, -1.0, 1.0))
    inside = R[(angle >= cone.nearest) & (angle <= cone.farthest)]
    if len(inside):
        lines = convention.lock_margin(inside)
        assert lines.min() >= margin.least.lo
        assert lines.max() <= margin.largest.hi + 1e-15
