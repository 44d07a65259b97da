"""Joint solutions, reachable sets, clearances, rates and travel against scipy and plain trigonometry."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import brentq, minimize
from scipy.spatial.transform import Rotation

from trunnion.errors import HardwareError
from trunnion.hardware import gimbals, joint_rates, joint_solutions, platforms, redundancy, travel
from trunnion.hardware.gimbals import GimbalChain, Joint

REBUILD = 3e-15  # matrix entries; three products of doubles


def chain_of(axes, **details) -> GimbalChain:
    return GimbalChain("chain", tuple(Joint(f"axis {k + 1}", a) for k, a in enumerate(axes)), **details)


def skewed(rng, count):
    """Random axis triples with neighbours at least 5 deg from parallel."""
    found = []
    while len(found) < count:
        axes = rng.normal(size=(3, 3))
        axes /= np.linalg.norm(axes, axis=1, keepdims=True)
        sines = np.linalg.norm(np.cross(axes[:-1], axes[1:]), axis=1)
        if np.min(sines) > np.sin(np.radians(5)):
            found.append(axes)
    return found


def test_every_attitude_a_chain_makes_is_rebuilt_and_its_own_angles_are_among_the_two(rng, count):
    for axes in skewed(rng, count(600)):
        chain = chain_of(axes, R_gp0=Rotation.random(random_state=rng).as_matrix())
        t = rng.uniform(-np.pi, np.pi, (20, 3))
        R = (
            np.array(
                [
                    (
                        Rotation.from_rotvec(a * axes[0])
                        * Rotation.from_rotvec(b * axes[1])
                        * Rotation.from_rotvec(c * axes[2])
                    ).as_matrix()
                    for a, b, c in t
                ]
            )
            @ chain.R_gp0
        )
        found = joint_solutions.attitude_solutions(chain, R)
        assert found.reachable.all()
        np.testing.assert_allclose(chain.attitude(found.angles), np.stack([R, R], axis=1), atol=REBUILD, rtol=0)
        away = np.abs((found.angles - t[:, None] + np.pi) % (2 * np.pi) - np.pi).max(axis=-1).min(axis=-1)
        assert np.all(away[found.clearance > 1e-3] < 1e-11)


@pytest.mark.parametrize("axes", [[2, 1, 0], [2, 0, 2], [0, 1, 2], [1, 0, 1]])
def test_right_angled_chains_agree_with_scipys_davenport_angles(axes, random_rotations):
    """DAVENPORT-1973 through scipy: first solution or its partner, never closer than rounding to a third one."""
    R = random_rotations(300)
    found = joint_solutions.attitude_solutions(chain_of(np.eye(3)[axes]), R)
    theirs = Rotation.from_matrix(R).as_davenport(np.eye(3)[axes], "intrinsic")
    away = np.abs((found.angles - theirs[:, None] + np.pi) % (2 * np.pi) - np.pi).max(axis=-1).min(axis=-1)
    # scipy takes the middle angle from an arccosine, so it loses digits near lock as the outer angles do
    assert np.all(away < 1e-13 / np.sin(found.clearance) + 1e-14)


def test_slightly_skewed_axes_are_solved_exactly_where_scipy_is_off_by_a_part_of_the_skew(random_rotations):
    """scipy 1.17 accepts 1e-7 rad of skew and then rebuilds the attitude to about 0.27 of it (measured)."""
    axes = np.eye(3)[[2, 1, 0]]
    axes[2] = Rotation.from_rotvec([0, 0, 1e-7]).apply(axes[2])
    R = random_rotations(50)
    chain = chain_of(axes)
    found = joint_solutions.attitude_solutions(chain, R)
    ok = found.reachable
    rebuilt = chain.attitude(found.angles[:, 0])
    assert np.max(np.abs(rebuilt - R)[ok]) < REBUILD


@pytest.mark.parametrize("middle", [0.0, 1e-15, 1e-12, 1e-9, 1e-6, 1e-3])
def test_attitudes_at_and_near_lock_are_rebuilt_to_rounding(middle):
    for axes, at_lock in ((np.eye(3)[[2, 1, 0]], np.pi / 2), (np.eye(3)[[2, 0, 2]], 0.0)):
        chain = chain_of(axes)
        R = chain.attitude([0.7, at_lock + middle, -0.4])
        found = joint_solutions.attitude_solutions(chain, R)
        np.testing.assert_allclose(chain.attitude(found.angles), np.stack([R, R]), atol=REBUILD, rtol=0)
        assert found.clearance == pytest.approx(middle, abs=2e-15)


def test_clearance_is_the_rotation_distance_to_the_singular_set(rng):
    """A search with scipy over singular attitudes (V = 0 or pi) for skewed axes comes no nearer than the clearance."""
    axes = skewed(rng, 1)[0]
    chain = chain_of(axes)
    R = chain.attitude([0.5, 1.1, -2.0])
    found = joint_solutions.attitude_solutions(chain, R)

    def determinant(middle):
        return np.linalg.det(chain.axes_at([0.0, middle, 0.0]))

    grid = np.linspace(-np.pi, np.pi, 721)
    values = [determinant(t) for t in grid]
    middle = [
        brentq(determinant, a, b) for a, b, x, y in zip(grid, grid[1:], values, values[1:], strict=False) if x * y < 0
    ]
    assert len(middle) == 2

    def away(v):
        return min(Rotation.from_matrix(chain.attitude([v[0], t, v[1]]).T @ R).magnitude() for t in middle)

    nearest = min(minimize(away, s, method="Nelder-Mead", tol=1e-12).fun for s in rng.uniform(-3, 3, (8, 2)))
    assert nearest == pytest.approx(found.clearance, abs=1e-6)


def test_jacobian_determinant_is_the_product_of_three_sines(rng):
    for axes in skewed(rng, 20):
        chain = chain_of(axes)
        t = rng.uniform(-np.pi, np.pi, 3)
        l12, l23 = chain.neighbour_angles
        d = np.arccos(np.clip(axes[0] @ (chain.product(t) @ axes[2]), -1, 1))
        V = np.arccos(np.clip((np.cos(d) - np.cos(l12) * np.cos(l23)) / (np.sin(l12) * np.sin(l23)), -1, 1))
        assert abs(np.linalg.det(chain.axes_at(t))) == pytest.approx(np.sin(l12) * np.sin(l23) * np.sin(V), abs=1e-7)


def test_joint_rates_follow_a_turning_payload(rng):
    """Numerical differentiation of scipy rotations."""
    chain = chain_of(skewed(rng, 1)[0])
    t, w = np.array([0.3, 0.9, -0.5]), np.array([0.2, -0.1, 0.3])
    R = chain.attitude(t)
    h = 1e-6
    moved = np.array([(Rotation.from_rotvec(s * h * w) * Rotation.from_matrix(R)).as_matrix() for s in (1, -1)])
    found = joint_solutions.attitude_solutions(chain, moved).angles
    here = np.argmin(np.abs(found - t).max(axis=-1), axis=1)
    numeric = (found[0, here[0]] - found[1, here[1]]) / (2 * h)
    np.testing.assert_allclose(joint_rates.attitude_rates(chain, t, w), numeric, atol=1e-8)


def test_rate_bounds_are_reached_and_never_passed(rng):
    for axes in skewed(rng, 4):
        chain = chain_of(axes)
        reach = joint_solutions.reachable_set(chain)
        lo = reach.nearest + 0.2 * (reach.farthest - reach.nearest)
        hi = reach.nearest + 0.9 * (reach.farthest - reach.nearest)
        bound = joint_rates.largest_joint_rates(chain, 1.0, lo, hi).rate
        best = np.zeros(3)
        for _ in range(800):
            t = np.array([0.0, rng.uniform(-np.pi, np.pi), 0.0])
            A = chain.axes_at(t)
            d = np.arccos(np.clip(A[:, 0] @ A[:, 2], -1, 1))
            if lo <= d <= hi:
                best = np.maximum(best, np.linalg.norm(np.linalg.inv(A), axis=1))  # worst payload rate of size 1
        assert np.all(best <= bound * (1 + 1e-12))
        assert np.all(best > 0.85 * bound)


def test_right_angled_rate_bound_is_one_over_the_sine_of_the_margin():
    chain = chain_of(np.eye(3)[[2, 1, 0]])
    margin = np.radians(12)
    bound = joint_rates.largest_joint_rates(chain, 0.5, margin, np.pi - margin)
    np.testing.assert_allclose(bound.rate, [0.5 / np.sin(margin), 0.5, 0.5 / np.sin(margin)], rtol=1e-12)
    assert joint_rates.clearance_needed(
        chain_of(np.eye(3)[[2, 1, 0]]).__class__(
            "limited", tuple(Joint(f"a{k}", a, rate=2.0) for k, a in enumerate(np.eye(3)[[2, 1, 0]]))
        ),
        0.5,
    ) == pytest.approx(np.arcsin(0.25), abs=1e-12)


def test_acceleration_bound_holds_for_random_motions(rng):
    """Accelerations of scipy-made motions at constant body acceleration, by second differences."""
    chain = chain_of(np.eye(3)[[2, 1, 0]])
    margin, w_limit, a_limit = np.radians(30), 0.6, 0.4
    bound = joint_rates.largest_joint_rates(chain, w_limit, margin, np.pi - margin, acceleration=a_limit)
    h = 1e-4
    for _ in range(60):
        start = chain.attitude([rng.uniform(-3, 3), rng.uniform(-0.9, 0.9), rng.uniform(-3, 3)])
        w, a = rng.normal(size=(2, 3))
        w *= (w_limit - a_limit * h) / np.linalg.norm(w)
        a *= a_limit / np.linalg.norm(a)
        motion = np.array(
            [
                (Rotation.from_rotvec(w * s * h + 0.5 * a * (s * h) ** 2) * Rotation.from_matrix(start)).as_matrix()
                for s in (-1, 0, 1)
            ]
        )
        angles = np.unwrap(joint_solutions.attitude_solutions(chain, motion).angles[:, 0], axis=0)
        second = np.abs(angles[0] - 2 * angles[1] + angles[2]) / h**2
        assert np.all(second <= bound.acceleration * 1.001 + 1e-5)


def test_two_axis_levelling_of_a_pitching_and_rolling_deck_by_plain_trigonometry():
    """Roll axis outermost on a deck at heading, pitch, roll: the joints are the negatives, found by hand."""
    deck = Rotation.from_euler("ZYX", np.radians([40, 7, -12])).as_matrix()
    inner_pitch = chain_of([[1, 0, 0], [0, 1, 0]])
    found = platforms.levelling_solutions(inner_pitch, deck, up_r=[0, 0, -1], up_p=[0, 0, -1])
    near = found.angles[np.argmin(np.abs(found.angles).max(axis=1))]
    np.testing.assert_allclose(np.degrees(near), [12, -7], atol=1e-12)
    outer_pitch = chain_of([[0, 1, 0], [1, 0, 0]])
    found = platforms.levelling_solutions(outer_pitch, deck, up_r=[0, 0, -1], up_p=[0, 0, -1])
    near = np.degrees(found.angles[np.argmin(np.abs(found.angles).max(axis=1))])
    pitch, roll = np.radians([7, -12])
    by_hand = [
        -np.degrees(np.arctan2(np.tan(pitch), np.cos(roll))),
        -np.degrees(np.arcsin(np.sin(roll) * np.cos(pitch))),
    ]
    np.testing.assert_allclose(near, by_hand, atol=1e-12)
    level = deck @ outer_pitch.attitude(np.radians(near))
    np.testing.assert_allclose(level[:, 2], [0, 0, 1], atol=1e-14)


def test_the_host_is_read_back_from_a_stabilised_platform(rng, random_rotations):
    chain = chain_of(np.eye(3)[[2, 1, 0]], R_gp0=random_rotations(1)[0])
    R_rb, R_rp, R_bg = random_rotations(30), np.eye(3), random_rotations(1)[0]
    found = platforms.holding_solutions(chain, R_rb, R_rp, R_bg=R_bg)
    for branch in range(2):
        back = platforms.host_attitude(chain, found.angles[:, branch], R_rp, R_bg=R_bg)
        np.testing.assert_allclose(back, R_rb, atol=5e-15, rtol=0)


def test_certified_clearance_comes_from_two_directions_only(random_rotations):
    chain = chain_of(np.eye(3)[[2, 0, 1]], R_gp0=random_rotations(1)[0])
    R_rb, R_rp, R_bg = random_rotations(40), random_rotations(1)[0], random_rotations(1)[0]
    found = platforms.holding_solutions(chain, R_rb, R_rp, R_bg=R_bg)
    in_host, in_reference = platforms.clearance_directions(chain, R_rp, R_bg=R_bg)
    angle = np.arccos(np.clip((R_rb @ in_host) @ in_reference, -1, 1))
    np.testing.assert_allclose(found.outer_axes_angle, angle, atol=1e-7)
    over = joint_solutions.clearance_over(chain, float(angle.min()), float(angle.max()))
    assert over.least == pytest.approx(float(found.clearance.min()), abs=1e-7)
    assert over.largest >= float(found.clearance.max()) - 1e-7


def test_two_axes_hold_a_level_platform_but_not_its_heading():
    """A deck at heading 40, pitch 7, roll -12 deg: pitch inside roll keeps the deck's own heading exactly."""
    deck = Rotation.from_euler("ZYX", np.radians([40, 7, -12])).as_matrix()
    chain = chain_of([[1, 0, 0], [0, 1, 0]])
    level = Rotation.from_euler("Z", np.radians(40)).as_matrix()
    assert platforms.held_heading_error(chain, np.radians([12, -7]), deck, level) < 1e-14
    north = platforms.held_heading_error(chain, np.radians([12, -7]), deck, np.eye(3))
    assert np.degrees(north) == pytest.approx(40, abs=1e-12)


def test_encoder_steps_and_crooked_axes_bound_the_platforms_error(rng):
    step = np.radians(0.1)
    joints = tuple(Joint(f"a{k}", a, encoder_step=step) for k, a in enumerate(np.eye(3)[[2, 1, 0]]))
    chain = GimbalChain("encoders", joints)
    t = np.array([0.4, 0.9, -1.0])
    bound = platforms.encoder_error(chain, t)
    worst = max(
        Rotation.from_matrix(
            chain.attitude(t).T @ chain.attitude(t + rng.uniform(-1, 1, 3).round() * step / 2)
        ).magnitude()
        for _ in range(200)
    )
    assert worst <= bound * (1 + 1e-3)
    assert worst > 0.999 * bound
    crooked = np.radians([0.05, 0.02, 0.04])
    limit = platforms.axis_misalignment(chain, t, crooked).bound
    largest = 0.0
    for _ in range(400):
        bent = []
        for axis, e in zip(chain.axes, crooked, strict=True):
            v = np.cross(axis, rng.normal(size=3))
            bent.append(Rotation.from_rotvec(e * v / np.linalg.norm(v)).apply(axis))
        moved = chain_of(bent).attitude(t)
        largest = max(largest, Rotation.from_matrix(chain.attitude(t).T @ moved).magnitude())
    assert largest <= limit * (1 + 1e-3)
    assert largest > 0.5 * limit


def test_shortest_move_and_move_times():
    """180 deg to -170 deg is 10 deg the short way (PX4/PX4-SITL_gazebo-classic pull request 40)."""
    assert np.degrees(travel.shortest_move(np.pi, np.radians(-170))) == pytest.approx(10, abs=1e-9)
    assert travel.move_time(6.0, 2.0) == 3.0
    assert travel.move_time(6.0, 2.0, 1.0) == pytest.approx(6 / 2 + 2 / 1)  # trapezoid: way/rate + rate/acceleration
    assert travel.move_time(1.0, 2.0, 1.0) == pytest.approx(2.0)  # triangle: 2 sqrt(way/acceleration)


def test_a_joint_range_beyond_the_middle_angle_is_used(random_rotations):
    """Pitch joint -135 to 45 deg commanded to -91: inside, though yaw-pitch-roll prints yaw 180, pitch -89, roll 180
    (PX4/PX4-Autopilot issue 26600; quaternion 0.70091, 0, -0.71325, 0 scalar first).
    """
    limits = np.radians([[-180, 180], [-45, 45], [-135, 45]])
    joints = tuple(
        Joint(name, axis, tuple(lim))
        for name, axis, lim in zip(("yaw", "roll", "pitch"), np.eye(3)[[2, 0, 1]], limits, strict=True)
    )
    chain = GimbalChain("camera", joints)
    R = Rotation.from_quat([0, -0.71325, 0, 0.70091]).as_matrix()
    assert np.degrees(Rotation.from_matrix(R).magnitude()) == pytest.approx(91, abs=0.001)
    best = travel.choices(chain, joint_solutions.attitude_solutions(chain, R))[0]
    np.testing.assert_allclose(np.degrees(best.angles), [0, 0, -91], atol=0.001)


def test_whole_turns_and_the_flipped_solution_are_used_before_unwinding():
    """A line that goes round azimuth twice at 30 deg elevation."""
    t = np.linspace(0, 100, 401)
    azimuth = np.radians(7.0) * t
    from trunnion.hardware.passes import directions

    line = directions(azimuth, np.full_like(t, np.radians(30)))
    wide = gimbals.azimuth_elevation_chain(azimuth=(-2 * np.pi, 2 * np.pi), rates=(0.2, 0.2))
    plan = travel.plan_travel(wide, t, joint_solutions.pointing_solutions(wide, line))
    assert plan.whole
    assert np.degrees(plan.segments[0].angles[0, 0]) == pytest.approx(-360)
    narrow = gimbals.azimuth_elevation_chain(azimuth=(-np.pi, np.pi), rates=(0.2, 0.2))
    broken = travel.plan_travel(narrow, t, joint_solutions.pointing_solutions(narrow, line))
    assert len(broken.unwindings) == 2
    assert broken.unwindings[0].why == "travel stop"
    assert broken.unwindings[0].time == pytest.approx(2 * np.pi / 0.2, rel=0.01)
    flip = gimbals.azimuth_elevation_chain(azimuth=(-np.pi, np.pi), elevation=(0, np.pi), rates=(0.2, 0.2))
    shorter = travel.plan_travel(flip, t, joint_solutions.pointing_solutions(flip, line))
    assert sum(u.time for u in shorter.unwindings) <= sum(u.time for u in broken.unwindings)


def test_travel_left_at_the_stops_and_after_stopping():
    t = np.linspace(0, 10, 101)
    from trunnion.hardware.passes import directions

    chain = gimbals.azimuth_elevation_chain(
        azimuth=(-np.pi, np.pi), rates=(0.5, 0.5), accelerations=(0.25, 0.25), elevation=(-0.1, np.pi / 2)
    )
    line = directions(np.radians(np.linspace(10, 50, 101)), np.radians(np.linspace(20, 60, 101)))
    plan = travel.plan_travel(chain, t, joint_solutions.pointing_solutions(chain, line))
    np.testing.assert_allclose(np.degrees(plan.travel_left), [[190, 130], [20 + np.degrees(0.1), 30]], atol=1e-6)
    room = travel.stopping_room(chain, plan.travel_left)
    np.testing.assert_allclose(plan.travel_left - room, 0.5**2 / (2 * 0.25), atol=1e-12)


def test_travel_over_a_region_is_certified_when_the_samples_cover_it(rng):
    """Every deck within 12 deg of level at any heading, held by three right-angled axes: random decks by scipy."""
    joints = tuple(
        Joint(name, axis, (-lim, lim))
        for name, axis, lim in zip("abc", np.eye(3)[[0, 1, 2]], np.radians([40, 30, 200]), strict=True)
    )
    chain = GimbalChain("deck", joints)
    tilt = np.radians(12)

    def decks(number):
        axis = rng.normal(size=(number, 3)) * [1, 1, 0]
        axis /= np.linalg.norm(axis, axis=1, keepdims=True)
        return Rotation.from_rotvec(axis * tilt * np.sqrt(rng.random((number, 1)))).as_matrix()

    few, many = (platforms.holding_solutions(chain, decks(n), np.eye(3)) for n in (200, 4000))
    certified = travel.travel_over(chain, few, covering_radius=np.radians(4))
    sampled = travel.travel_over(chain, many)
    assert certified.basis.value == "certified bound"
    assert np.all(certified.left <= sampled.left)
    assert np.degrees(sampled.left[1]) == pytest.approx([18, 18], abs=0.5)  # 30 deg of travel less 12 of tilt
    skew = chain_of([[1, 0, 0], [0.1, 1, 0], [0, 0, 1]])
    with pytest.raises(HardwareError, match="not right-angled"):
        travel.travel_over(skew, joint_solutions.attitude_solutions(skew, np.eye(3)[None]), covering_radius=0.1)


def test_middle_axis_keep_out_is_reaction_and_stopping():
    """Common practice, no source; plain kinematics."""
    keep = joint_rates.middle_axis_keep_out(np.radians(10), 1.5, acceleration=np.radians(20), hard_margin=np.radians(1))
    assert np.degrees(keep.keep_out) == pytest.approx(1 + 15 + 2.5)
    assert np.degrees(keep.alarm) == pytest.approx(90 - 18.5)


def test_four_axes_keep_away_from_lock_at_a_rate_cost():
    """A platform held level while its host pitches through the vertical: three axes lock, four need not."""
    axes = np.eye(3)[[0, 2, 1, 0]]
    joints = tuple(Joint(f"a{k}", a, rate=2.0) for k, a in enumerate(axes))
    chain = GimbalChain("redundant", joints)
    t = np.linspace(0, 6, 121)
    R = np.swapaxes(
        Rotation.from_euler("ZYX", np.column_stack([0.05 + 0 * t, np.radians(30 * t), 0.1 + 0 * t])).as_matrix(), -1, -2
    )
    plan = redundancy.plan_redundant(chain, t, R)
    np.testing.assert_allclose(chain.attitude(plan.angles), R, atol=1e-14, rtol=0)
    assert np.min(plan.held_clearance) < np.radians(6)
    assert np.min(plan.clearance) > np.radians(15)
    assert np.max(plan.rates) < np.max(plan.held_rates)
    assert 0 < plan.rate_cost <= 2.0
    best, reached = redundancy.best_outer_angle(chain, R)
    assert np.all(redundancy.inner_solutions(chain, R, best).clearance == pytest.approx(reached, abs=1e-7))
    scan = np.array(
        [redundancy.inner_solutions(chain, R, np.full(len(t), a)).clearance for a in np.linspace(-np.pi, np.pi, 361)]
    )
    assert np.all(reached >= np.max(scan, axis=0) - 1e-9)


@pytest.mark.parametrize(
    ("build", "message"),
    [
        (lambda: chain_of([[0, 0, 1], [0, 1e-4, 1], [1, 0, 0]]), "from parallel"),
        (lambda: chain_of([[0, 0, 1]]), "has 1 axes"),
        (lambda: Joint("a", [0, 0, 0]), "no direction"),
        (lambda: Joint("a", [0, 0, 1], (0.2, 1.0)), "excludes zero"),
        (lambda: Joint("a", [0, 0, 1], (1.0, -1.0)), "lower limit first"),
        (lambda: Joint("a", [0, 0, 1], rate=0.0), "rate of joint 'a' is 0"),
        (lambda: Joint("a", [0, 0, 1], acceleration=-1.0), "acceleration of joint"),
        (lambda: GimbalChain("c", (Joint("a", [0, 0, 1]), Joint("a", [0, 1, 0]))), "names a joint twice"),
        (lambda: joint_solutions.attitude_solutions(chain_of(np.eye(3)[:2]), np.eye(3)), "an attitude needs three"),
        (lambda: joint_solutions.pointing_solutions(chain_of(np.eye(3)), [1, 0, 0]), "points with two"),
        (lambda: joint_solutions.pointing_solutions(chain_of(np.eye(3)[[2, 0]]), [1, 0, 0]), "along its inner axis"),
    ],
)
def test_chains_that_cannot_be(build, message):
    with pytest.raises(HardwareError, match=message):
        build()


def test_an_unreachable_target_says_how_far_and_what_would_reach():
    axes = np.eye(3)[[2, 1, 0]]
    axes[0] = Rotation.from_rotvec(np.radians([10, 0, 0])).apply(axes[0])  # outer neighbours 100 deg apart
    chain = chain_of(axes)
    assert joint_solutions.reachable_set(chain).cone_ahead == pytest.approx(np.radians(10))
    along = Rotation.align_vectors([axes[0]], [axes[2]])[0].as_matrix()  # the inner axis asked onto the outer one
    found = joint_solutions.attitude_solutions(chain, along[None])
    assert found.clearance[0] == pytest.approx(-np.radians(10), abs=1e-12)
    with pytest.raises(HardwareError, match=r"out of reach of chain 'chain' by 10 deg") as caught:
        joint_solutions.require_reachable(chain, found)
    assert "tilted by 10 deg" in caught.value.fault.remedy
