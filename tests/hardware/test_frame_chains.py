"""Frame chains against scipy's composition and Slerp, timing errors against plain arithmetic."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation, Slerp

from trunnion.attitude.conventions import Convention
from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import HardwareError
from trunnion.hardware import frame_chains
from trunnion.hardware.frame_chains import FrameChain, Link


def _scalar_first(rotation):
    return np.roll(rotation.as_quat(), 1, axis=-1)


@pytest.fixture
def vehicle():
    """A vehicle that turns in heading at 20 deg/s while its gimbal holds the payload still against it."""
    t = np.linspace(0.0, 5.0, 26)
    heading = Rotation.from_euler("Z", np.radians(20) * t[:, None])
    gimbal = Rotation.from_euler("ZYX", np.column_stack([-np.radians(20) * t, 0.3 + 0 * t, 0 * t]))
    return t, heading, gimbal


def _chain(vehicle, **clock):
    t, heading, gimbal = vehicle
    mount = Rotation.from_euler("Y", 0.1).as_matrix()
    return FrameChain(
        (
            Link("local", "vehicle", times=t, quaternions=_scalar_first(heading), attitude_error=1e-3),
            Link("vehicle", "base", R_pc=mount, attitude_error=2e-3),
            Link("base", "payload", times=t, quaternions=_scalar_first(gimbal), **clock),
        )
    )


def test_any_frame_in_any_other_equals_scipys_product(vehicle):
    t, heading, gimbal = vehicle
    chain = _chain(vehicle)
    at = np.array([0.31, 2.77, 4.9])
    there = chain.attitude("payload", "local", at)
    expected = Slerp(t, heading)(at) * Rotation.from_euler("Y", 0.1) * Slerp(t, gimbal)(at)
    np.testing.assert_allclose(there.R, expected.as_matrix(), atol=1e-13, rtol=0)
    back = chain.attitude("local", "payload", at)
    np.testing.assert_allclose(back.R, expected.inv().as_matrix(), atol=1e-13, rtol=0)
    assert there.path == ("local", "vehicle", "base", "payload")
    assert there.error == pytest.approx(3e-3)


def test_a_known_time_offset_is_taken_out(vehicle):
    t, _, gimbal = vehicle
    stamped = Link("base", "payload", times=t + 0.4, quaternions=_scalar_first(gimbal), time_offset=0.4)
    at = np.array([1.0, 3.3])
    np.testing.assert_allclose(stamped.attitude(at), Slerp(t, gimbal)(at).as_matrix(), atol=1e-13, rtol=0)


def test_timing_error_is_relative_rate_times_time_error(vehicle):
    chain = _chain(vehicle, jitter=0.004, offset_error=0.006)
    found = chain.attitude("payload", "local", np.linspace(0.5, 4.5, 9))
    (timing,) = found.timing
    assert timing.rate == pytest.approx(np.radians(20), rel=1e-9)
    assert timing.error == pytest.approx(np.radians(20) * 0.01, rel=1e-9)
    late = _chain(vehicle, time_offset=0.01).attitude("payload", "local", np.linspace(0.5, 4.5, 9))
    moved = Rotation.from_matrix(np.swapaxes(found.R, -1, -2) @ late.R).magnitude()
    assert np.max(moved) <= timing.error + 1e-12
    assert np.max(moved) == pytest.approx(timing.error, rel=1e-6)


def test_angles_taken_to_the_wrong_frame_are_shown_beside_the_right_ones(vehicle):
    local, payload = Frame("local", ("north", "east", "down")), Frame("payload", ("forward", "starboard", "down"))
    convention = Convention("ordinary", local, payload, Sequence.ZYX, Sense.MOVING, ("heading", "elevation", "bank"))
    reading = frame_chains.wrong_link_reading(
        _chain(vehicle), "payload", "local", "vehicle", convention, np.array([0.0, 2.0])
    )
    np.testing.assert_allclose(np.degrees(reading.separation), [0.0, 40.0], atol=1e-9)


def test_tables_are_not_asked_outside_their_span_or_across_gaps(vehicle):
    t, heading, _ = vehicle
    chain = _chain(vehicle)
    assert chain.common_span("payload", "local") == (0.0, 5.0)
    with pytest.raises(HardwareError, match="covers 0 to 5 s"):
        chain.attitude("payload", "local", [5.5])
    keep = (t < 1) | (t > 3)
    gap = Link("local", "vehicle", times=t[keep], quaternions=_scalar_first(heading)[keep], longest_gap=0.5)
    with pytest.raises(HardwareError, match="gap of"):
        gap.attitude(np.array([2.0]))


@pytest.mark.parametrize(
    ("links", "message"),
    [
        ((("a", "b"), ("b", "c"), ("c", "a")), "closes a ring"),
        ((("a", "b"), ("c", "d")), "no links join"),
        ((("a", "c"),), "no link names frame 'd'"),
    ],
)
def test_links_that_do_not_make_a_chain(links, message):
    with pytest.raises(HardwareError, match=message):
        FrameChain(tuple(Link(p, c, R_pc=np.eye(3)) for p, c in links)).attitude("d", "a", [0.0])


def test_time_that_goes_back_and_links_without_data():
    q = np.tile([1.0, 0, 0, 0], (3, 1))
    with pytest.raises(HardwareError, match="time does not advance after sample 1"):
        Link("a", "b", times=np.array([0.0, 2.0, 1.0]), quaternions=q)
    with pytest.raises(HardwareError, match="constant or a table"):
        Link("a", "b")


def test_a_delay_between_two_records_is_found():
    t = np.arange(0, 20, 0.01)
    rate = np.sin(0.7 * t) + 0.4 * np.sin(2.3 * t + 1)
    delayed = np.sin(0.7 * (t - 0.25)) + 0.4 * np.sin(2.3 * (t - 0.25) + 1)
    delay, score = frame_chains.residual_delay(t, rate, delayed, largest=1.0)
    assert delay == pytest.approx(0.25, abs=0.011)
    assert score > 0.999
