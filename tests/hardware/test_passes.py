"""Passes, keyholes, base tilt and forbidden sectors against closed formulas and plain geometry."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.errors import HardwareError
from trunnion.hardware import gimbals, keyholes, passes, sectors

DEG = np.radians(1.0)


@pytest.mark.parametrize(("highest", "peak"), [(70, 1.5168), (80, 3.1140), (84, 5.2184), (88, 15.698), (89, 31.404)])
def test_peak_azimuth_rate_of_a_pass_at_780_km(highest, peak):
    """Orbital rate over the sine of the ground angle, computed; inputs from csete/gpredict issue 334 and an antenna
    paper (International Telemetering Conference 1996): 780 km, 84 deg. Spherical Earth of 6378.137 km that does not
    turn.
    """
    track = passes.circular_pass(780e3, highest * DEG, step=0.5)
    found = passes.analyse_pass(gimbals.azimuth_elevation_chain(), track)
    assert np.degrees(found.rates[0]) == pytest.approx(peak, abs=0.002)
    assert np.degrees(track.highest) == pytest.approx(highest, abs=1e-9)


@pytest.mark.parametrize(
    ("limit", "seconds", "followed"), [(2, 27.86, 74.613), (4, 12.12, 82.189), (6, 0, 84.778), (8, 0, 86.079)]
)
def test_seconds_above_the_azimuth_limit_and_highest_pass_followed(limit, seconds, followed):
    chain = gimbals.azimuth_elevation_chain(rates=(limit * DEG, limit * DEG))
    found = passes.analyse_pass(chain, passes.circular_pass(780e3, 84 * DEG, step=0.1))
    assert found.seconds_over_rate[0] == pytest.approx(seconds, abs=0.02)
    assert np.degrees(passes.highest_pass_followed(780e3, limit * DEG)) == pytest.approx(followed, abs=0.001)
    assert found.seconds_lost >= seconds
    assert bool(found.lost) == (seconds > 0)


def test_an_x_y_mount_needs_no_rate_to_speak_of_on_the_same_pass():
    """Largest elevation rate 0.4774 and X rate 0.5485 deg/s at 84 deg, computed with plain orbit geometry."""
    chain = gimbals.azimuth_elevation_chain()
    track = passes.circular_pass(780e3, 84 * DEG, step=0.1)
    assert np.degrees(passes.analyse_pass(chain, track).rates[1]) == pytest.approx(0.4774, abs=0.001)
    across = passes.circular_pass(780e3, 84 * DEG, step=0.1, heading=np.pi / 2)
    assert np.degrees(passes.analyse_pass(gimbals.x_y_chain(), across).rates[0]) == pytest.approx(0.5485, abs=0.001)


def test_passes_from_a_table_differ_from_analytic_ones_by_the_differences_only():
    exact = passes.circular_pass(600e3, 60 * DEG, step=0.5)
    azimuth, elevation = passes.azimuth_elevation(exact.direction_g)
    table = passes.pass_from_table("table", exact.times, azimuth, elevation)
    np.testing.assert_allclose(table.change_g, exact.change_g, atol=5e-6)


@pytest.mark.parametrize("elevation", [60, 75, 80, 85, 87, 88, 89, 89.5, 89.9])
def test_keyhole_half_angle_is_the_arcsine_of_one_over_the_speed_ratio(elevation):
    """The formula of the trade: a limit of V line-of-sight rates follows outside the zenith distance asin(1/V)."""
    ratio = 1 / np.cos(elevation * DEG)
    hole = keyholes.keyhole(gimbals.azimuth_elevation_chain(rates=(ratio * 0.01, 1.0)), 0.01)
    assert np.degrees(hole.by_rate) == pytest.approx(90 - elevation, abs=1e-9)
    assert hole.unreachable_ahead == hole.unreachable_behind == 0.0


def test_unreachable_cone_and_keyhole_are_kept_apart():
    """An elevation axis leaning 2 deg cannot look within 2 deg of the azimuth axis; the keyhole lies around that
    cone.
    """
    lean = Rotation.from_rotvec([2 * DEG, 0, 0])
    joints = (
        gimbals.Joint("azimuth", [0, 0, 1], rate=0.2),
        gimbals.Joint("elevation", lean.apply([0, 1, 0]), rate=0.2),
    )
    chain = gimbals.GimbalChain("leaning", joints)
    hole = keyholes.keyhole(chain, 0.01)
    assert np.degrees(hole.unreachable_ahead) == pytest.approx(2.0, abs=1e-9)
    assert 0.0 < hole.by_rate < np.arcsin(0.05)  # what rate costs beyond the cone itself


def test_peak_outer_acceleration_against_second_differences():
    miss, rate = 3 * DEG, 0.01
    x = np.linspace(-0.4, 0.4, 400_001)
    azimuth = np.arctan2(np.sin(x), np.cos(x) * np.sin(miss))
    numeric = np.max(np.abs(np.diff(azimuth, 2))) / ((x[1] - x[0]) / rate) ** 2
    assert keyholes.peak_outer_acceleration(rate, miss) == pytest.approx(numeric, rel=1e-5)
    limited = gimbals.azimuth_elevation_chain(accelerations=(keyholes.peak_outer_acceleration(rate, miss), None))
    assert keyholes.keyhole(limited, rate).by_acceleration == pytest.approx(miss, rel=1e-9)


def test_flipping_over_the_top_saves_time_on_a_nearly_overhead_pass():
    track = passes.circular_pass(780e3, 88 * DEG, step=0.1)
    stiff = gimbals.azimuth_elevation_chain(rates=(5 * DEG, 5 * DEG))
    free = gimbals.azimuth_elevation_chain(elevation=(0.0, np.pi), rates=(5 * DEG, 5 * DEG))
    without, with_flip = passes.analyse_pass(stiff, track), passes.analyse_pass(free, track)
    assert not any(gap.flipped for gap in without.lost_with_flip)
    assert with_flip.seconds_lost < without.seconds_lost


def test_time_lost_is_what_full_rate_needs_to_catch_up():
    """Leaving the target at the start of a lost interval and turning at the limit, the axis is back on it at the
    end.
    """
    limit = 2 * DEG
    track = passes.circular_pass(780e3, 84 * DEG, step=0.1)
    found = passes.analyse_pass(gimbals.azimuth_elevation_chain(rates=(limit, limit)), track)
    (gap,) = found.lost
    azimuth = np.unwrap(passes.azimuth_elevation(track.direction_g)[0])
    need = abs(np.interp(gap.end, track.times, azimuth) - np.interp(gap.start, track.times, azimuth))
    assert need <= limit * gap.seconds + 1e-9
    assert need == pytest.approx(limit * gap.seconds, rel=0.01)


def test_acceleration_limits_lengthen_the_time_lost_and_the_axis_is_back_on_rate_and_angle():
    """The axis simulated in small steps: up to the limit, along it, and down to the demanded rate at the end."""
    track = passes.circular_pass(780e3, 84 * DEG, step=0.05)
    azimuth = np.unwrap(passes.azimuth_elevation(track.direction_g)[0])
    rate = np.gradient(azimuth, track.times)
    limit, seconds = 2 * DEG, []
    for acceleration in (None, 1 * DEG, 0.1 * DEG):
        chain = gimbals.azimuth_elevation_chain(rates=(limit, None), accelerations=(acceleration, None))
        (gap,) = passes.analyse_pass(chain, track).lost
        seconds.append(gap.seconds)
        if acceleration is None:
            continue
        a, b = np.searchsorted(track.times, [gap.start - 1e-9, gap.end - 1e-9])
        sense = np.sign(rate[a])
        t = np.linspace(0, gap.seconds, 20_001)
        up, down = sense * rate[a] + acceleration * t, sense * rate[b] + acceleration * (gap.seconds - t)
        way = np.trapezoid(np.minimum(np.minimum(up, down), limit), t)
        assert way >= sense * (azimuth[b] - azimuth[a]) - 1e-6
        assert way == pytest.approx(sense * (azimuth[b] - azimuth[a]), rel=0.01)
    assert seconds[0] < seconds[1] < seconds[2]


def test_a_base_tilt_takes_the_passes_out_of_the_keyhole():
    tracks = [passes.circular_pass(780e3, e * DEG, step=1.0, heading=0.2) for e in (70, 80, 86, 89.5)]
    chain = gimbals.azimuth_elevation_chain(elevation=(-30 * DEG, 210 * DEG), rates=(3 * DEG, 3 * DEG))
    tilt = keyholes.best_base_tilt(chain, tracks, largest=25 * DEG)
    assert tilt.seconds_over[1] < tilt.seconds_over[0]
    assert tilt.seconds_over[1] == 0.0
    assert tilt.clearance[1] > tilt.clearance[0]
    assert tilt.tilt <= 25 * DEG + 1e-12
    moved = keyholes.tilted(chain, tilt)
    np.testing.assert_allclose(moved.joints[0].axis, tilt.axis_g, atol=1e-14)
    lost = sum(passes.analyse_pass(moved, track).seconds_lost for track in tracks)
    assert lost == 0.0


def test_keyhole_map_marks_keyhole_and_stops():
    chain = gimbals.azimuth_elevation_chain(
        azimuth=(-90 * DEG, 90 * DEG), elevation=(10 * DEG - 10 * DEG, 80 * DEG), rates=(1 * DEG, 1 * DEG)
    )
    sky = keyholes.keyhole_map(chain, 0.5 * DEG, azimuths=37, elevations=10)
    north, south = 0, 18
    assert sky.in_travel[3, north]
    assert not sky.in_travel[3, south]
    assert not sky.in_travel[9, north]  # the zenith lies beyond the elevation stop
    np.testing.assert_allclose(sky.rate_ratio[:9, 5], 0.5 / np.cos(sky.elevation[:9]), rtol=1e-9)
    np.testing.assert_allclose(sky.clearance[:, 5], np.pi / 2 - sky.elevation, atol=1e-12)


MAST = sectors.Sector("mast", np.radians([[350, 0], [370, 0], [370, 40], [350, 40]]))


def test_a_sector_across_north_holds_whatever_turn_azimuth_is_in():
    azimuth = np.radians([0, 355, 5, -5, 365, 15, 345, 180, 350, 10])
    inside = MAST.contains(azimuth, np.radians(20))
    assert inside.tolist() == [True, True, True, True, True, False, False, False, True, True]
    assert not MAST.contains(0.0, np.radians(41))


def test_sector_clearance_is_the_angle_to_its_edge_and_never_more():
    """Great circle distance to the upper edge's middle and to a corner, by scipy's haversine-free dot products."""
    above = passes.directions(0.0, 50 * DEG)
    found = float(sectors.clearance_of_directions(MAST, above))
    edge = passes.directions(np.linspace(-10, 10, 20_001) * DEG, 40 * DEG)
    true = np.min(np.arccos(np.clip(edge @ above, -1, 1)))
    assert found <= true
    assert found == pytest.approx(true, abs=0.06 * DEG)
    assert float(sectors.clearance_of_directions(MAST, passes.directions(0.0, 20 * DEG))) == 0.0
    cone = sectors.sectors_against_cone([MAST], above, 4 * DEG)[0]
    assert cone.clearance == pytest.approx(found - 4 * DEG, abs=1e-12)
    assert sectors.sectors_against_cone([MAST], above, 15 * DEG)[0].clearance == 0.0


def test_time_in_a_sector_along_a_pass_that_crosses_it():
    """A line moving in azimuth at 1 deg/s and 20 deg elevation is in a 20 deg wide sector for 20 s."""
    t = np.arange(0.0, 101.0)
    track = passes.pass_from_table("level", t, (310 + t) * DEG, np.full_like(t, 20 * DEG))
    (found,) = sectors.sectors_along_pass([MAST], track)
    assert found.seconds == pytest.approx(20.0, abs=0.11)
    assert found.clearance == 0.0
    (passing,) = sectors.sectors_along_pass(
        [MAST], passes.pass_from_table("high", t, (310 + t) * DEG, np.full_like(t, 60 * DEG))
    )
    assert passing.seconds == 0.0
    assert 19 * DEG < passing.clearance < 20 * DEG


def test_keeping_away_from_the_sun_along_a_pass():
    """A line that moves at 1 deg/s straight through the Sun's cone of 5.1 deg is inside for 10.2 s."""
    t = np.arange(0.0, 61.0)
    track = passes.pass_from_table("level", t, t * DEG, np.zeros_like(t))
    through = sectors.keep_away("Sun", track, passes.directions(30 * DEG, 0.0), 5.1 * DEG)
    assert through.seconds == pytest.approx(10.2, abs=1.0)
    assert through.clearance == 0.0
    beside = sectors.keep_away("Sun", track, passes.directions(30 * DEG, 25 * DEG), 5 * DEG)
    assert 19 * DEG < beside.clearance <= 20 * DEG
    assert beside.seconds == 0.0


def test_a_rolling_host_turns_the_demand_on_the_mount():
    """A fixed target to the east at 0.3 rad seen from a rolling deck: its line moves at the roll rate."""
    t = np.linspace(0, 10, 401)
    roll = np.radians(10) * np.sin(t)
    R_rg = Rotation.from_euler("X", roll[:, None]).as_matrix()
    fixed = passes.pass_from_directions("star", t, np.tile(passes.directions(np.pi / 2, 0.3), (len(t), 1)))
    seen = passes.pass_on_host(fixed, R_rg)
    np.testing.assert_allclose(seen.line_of_sight_rate, np.abs(np.radians(10) * np.cos(t)), atol=2e-4)


def test_sectors_hold_in_their_modes_only():
    transmit = sectors.Sector("crew", MAST.corners, modes=("transmit",))
    track = passes.circular_pass(780e3, 40 * DEG)
    assert sectors.sectors_along_pass([transmit], track, mode="receive") == []
    assert len(sectors.sectors_along_pass([transmit], track, mode="transmit")) == 1


def test_a_route_goes_round_a_sector_and_its_clearance_is_kept_everywhere():
    chain = gimbals.azimuth_elevation_chain(azimuth=(-170 * DEG, 170 * DEG), rates=(0.1, 0.1))
    start, end = np.radians([-40, 15]), np.radians([40, 15])
    way = sectors.route(chain, start, end, [MAST], clearance=3 * DEG)
    assert len(way.angles) > 2
    assert way.clearance >= 3 * DEG
    dense = np.concatenate([np.linspace(a, b, 400) for a, b in zip(way.angles, way.angles[1:], strict=False)])
    line = chain.attitude(dense) @ [1.0, 0, 0]
    assert np.min(sectors.clearance_of_directions(MAST, line)) >= way.clearance
    direct = sectors.route(chain, start, np.radians([-60, 30]), [MAST])
    assert len(direct.angles) == 2
    assert direct.time == pytest.approx(20 * DEG / 0.1)


def test_unwindings_are_routed_round_the_sectors():
    """A record that passes the azimuth stop; the mast lies on the short way back."""
    from trunnion.hardware import joint_solutions, travel

    chain = gimbals.azimuth_elevation_chain(azimuth=(-170 * DEG, 170 * DEG), rates=(0.1, 0.1))
    t = np.linspace(0, 60, 61)
    line = passes.directions((150 + t) * DEG, np.full_like(t, 15 * DEG))
    plan = travel.plan_travel(chain, t, joint_solutions.pointing_solutions(chain, line))
    ways = sectors.unwinding_routes(chain, plan, [MAST], clearance=2 * DEG)
    assert len(ways) == len(plan.unwindings) == 1
    assert ways[0].clearance >= 2 * DEG
    assert np.max(ways[0].angles[:, 1]) > 40 * DEG  # over the mast
    assert ways[0].time >= plan.unwindings[0].time - 1e-9


def test_a_route_that_cannot_be_says_so():
    wall = sectors.Sector("wall", np.radians([[-10, -5], [10, -5], [10, 90], [-10, 90]]))
    chain = gimbals.azimuth_elevation_chain(azimuth=(-90 * DEG, 90 * DEG), elevation=(0, 80 * DEG), rates=(0.1, 0.1))
    with pytest.raises(HardwareError, match="no way from the start"):
        sectors.route(chain, np.radians([-40, 15]), np.radians([40, 15]), [wall], step=4 * DEG)
    with pytest.raises(HardwareError, match="lies in sector 'wall'"):
        sectors.route(chain, np.radians([0, 15]), np.radians([40, 15]), [wall])


@pytest.mark.parametrize(
    ("corners", "message"),
    [
        ([[0, 0], [20, 20], [20, 0], [0, 20]], "crosses itself"),
        ([[0, 0], [20, 0], [10, 0], [10, 20]], "crosses itself"),
        ([[0, 0], [20, 0]], "three or more corners"),
        ([[0, 0], [20, 0], [20, 95]], "beyond 90 deg"),
        ([[0, 0], [400, 0], [400, 20]], "spans 400 deg"),
    ],
)
def test_polygons_that_are_none(corners, message):
    with pytest.raises(HardwareError, match=message):
        sectors.Sector("bad", np.radians(corners))


@pytest.mark.parametrize(
    ("times", "message"), [([0, 1, 1], "does not advance after sample 1"), ([0, 1], "three or more")]
)
def test_pass_tables_that_cannot_be_used(times, message):
    with pytest.raises(HardwareError, match=message):
        passes.pass_from_table("bad", times, np.zeros(len(times)), np.zeros(len(times)))


def test_rates_of_zero_and_an_axis_slower_than_the_sky_are_errors():
    with pytest.raises(HardwareError, match="rate above zero"):
        keyholes.keyhole(gimbals.azimuth_elevation_chain(rates=(0.1, 0.1)), 0.0)
    with pytest.raises(HardwareError, match="no faster than the sky"):
        keyholes.zenith_blind_spot(0.7, 0.9)
    with pytest.raises(HardwareError, match="below the orbital rate"):
        passes.highest_pass_followed(780e3, 1e-5)
