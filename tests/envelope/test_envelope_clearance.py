"""Clearance to moving directions: by hand, against dense sampling, and what is refused."""

import erfa
import numpy as np
import pytest
from scipy.spatial.transform import Rotation, Slerp

from trunnion.attitude.basis import Basis
from trunnion.attitude.rotations import about, quaternion_from_matrix
from trunnion.envelope.clearance import Directions, clearance_along, clearance_to_any
from trunnion.envelope.margins import direction_clearance
from trunnion.envelope.regions import Between, Cone, Track, Union
from trunnion.errors import RegionError

d = np.radians


def sun_year():
    """Directions of the Sun over 2025, one a day, by ERFA's Earth ephemeris (epv00, IAU SOFA)."""
    days = np.arange(366.0)
    heliocentric, _ = erfa.epv00(2460676.5, days)
    return Directions(days, -heliocentric["p"])


def test_sun_keeps_within_the_obliquity_of_the_equator():
    """A pole-pointing axis held within 5 deg: the Sun comes as near as 90 - 23.4393 - 5 deg (IAU obliquity)."""
    pole = Cone([0, 0, 1], [0, 0, 1], 0.0, d(5.0))
    clearance = clearance_to_any(pole, [0, 0, 1], sun_year())
    assert np.degrees(clearance.least.lo) == pytest.approx(85.0 - 23.4393, abs=0.015)
    assert np.degrees(clearance.largest.hi) == pytest.approx(95.0 + 23.4393, abs=0.015)
    assert clearance.least.basis is Basis.CERTIFIED
    assert clearance.least.witness.value == pytest.approx(clearance.least.hi, abs=1e-9)


def test_every_row_and_dense_points_between_are_inside(count):
    rng = np.random.default_rng(81)
    for n in range(count(40)):
        path = np.cumsum(rng.normal(size=(8, 3)), axis=0) + rng.normal(size=3)
        directions = Directions(np.arange(8.0), path)
        cone = Cone(rng.normal(size=3), rng.normal(size=3), 0.0, d(20.0))
        region = Union({"one": cone, "other": Cone([1, 0, 0], rng.normal(size=3), 0.1, 0.2)}) if n % 2 else cone
        body = rng.normal(size=3)
        clearance = clearance_to_any(region, body, directions)
        row = rng.integers(0, 7, 15)
        u = directions.at(row, rng.uniform(size=15))
        singles = [direction_clearance(region, body, each) for each in u]
        assert clearance.least.lo <= min(s.least.lo for s in singles) + 1e-13
        assert clearance.largest.hi >= max(s.largest.hi for s in singles) - 1e-13
        assert clearance.least.hi - clearance.least.lo <= d(0.0101)


def test_directions_between_rows_follow_the_great_circle():
    """scipy's slerp of the rotations that carry x to the rows gives the same points."""
    angles = np.array([0.0, 0.7, 1.1, 2.9])
    rows = np.stack([np.cos(angles), np.sin(angles), np.zeros(4)], axis=1)
    slerp = Slerp(np.arange(4.0), Rotation.from_rotvec(angles[:, None] * [[0, 0, 1]]))
    times = np.linspace(0.0, 3.0, 50)
    directions = Directions(np.arange(4.0), rows)
    assert np.allclose(directions.at(*directions.when(times)), slerp(times).apply([1, 0, 0]), rtol=0.0, atol=1e-14)


def test_track_and_direction_at_the_same_time(count):
    rng = np.random.default_rng(82)
    for _ in range(count(40)):
        steps = Rotation.from_rotvec(rng.normal(size=(10, 3)) * 0.3)
        path = [steps[0]]
        for step in steps[1:]:
            path.append(path[-1] * step)
        rotations = Rotation.concatenate(path)
        track = Track(np.arange(10.0), np.roll(rotations.as_quat(), 1, axis=1), attitude_error=0.0)
        times = np.sort(rng.uniform(0.0, 9.0, 5))
        times[0], times[-1] = -1.0, 10.0
        directions = Directions(times, rng.normal(size=3) + 0.3 * rng.normal(size=(5, 3)))
        body = rng.normal(size=3)
        clearance = clearance_along(track, body, directions)
        dense = np.linspace(0.0, 9.0, 9001)
        carried = Slerp(np.arange(10.0), rotations)(dense).apply(body / np.linalg.norm(body))
        u = directions.at(*directions.when(dense))
        angle = np.arctan2(np.linalg.norm(np.cross(u, carried), axis=1), np.einsum("ij,ij->i", u, carried))
        assert clearance.least.lo <= angle.min() + 1e-12
        assert clearance.largest.hi >= angle.max() - 1e-12
        assert clearance.least.hi - clearance.least.lo <= d(0.0101)
        assert clearance.least.hi >= angle.min() - 1e-3


def test_body_that_follows_the_direction_keeps_its_angle():
    """Both turn about z at the same rate: the angle stays 30 deg however coarse the rows."""
    angles = np.array([0.0, 1.0, 2.0])
    track = Track(angles, quaternion_from_matrix(np.stack([about([0, 0, 1], a) for a in angles])))
    directions = Directions(angles, np.stack([np.cos(angles), np.sin(angles), np.zeros(3)], axis=1))
    body = [np.cos(d(30.0)), 0.0, np.sin(d(30.0))]
    clearance = clearance_along(track, body, directions)
    assert np.degrees(clearance.least.lo) == pytest.approx(30.0, abs=0.011)
    assert np.degrees(clearance.largest.hi) == pytest.approx(30.0, abs=0.011)
    assert clearance.least.basis is Basis.MEASURED
    wide = clearance_along(Track(angles, track.quaternions, attitude_error=d(2.0)), body, directions)
    assert np.degrees(wide.least.lo) == pytest.approx(28.0, abs=0.011)


def test_what_is_refused():
    with pytest.raises(RegionError, match="nearly half a turn"):
        Directions([0.0, 1.0], [[1, 0, 0], [-1, 1e-3, 0]])
    with pytest.raises(RegionError, match="do not increase"):
        Directions([0.0, 0.0], [[1, 0, 0], [0, 1, 0]])
    with pytest.raises(RegionError, match="N times and N x 3"):
        Directions([0.0], [[1, 0, 0], [0, 1, 0]])
    track = Track([0.0, 5.0], [[1, 0, 0, 0], [1, 0, 0, 0]])
    with pytest.raises(RegionError, match="known from 0 to 1 only"):
        clearance_along(track, [1, 0, 0], Directions([0.0, 1.0], [[1, 0, 0], [0, 1, 0]]))
    with pytest.raises(RegionError, match="joined by slerp"):
        clearance_along(Track([0.0], [[1, 0, 0, 0]], Between.SAMPLES), [1, 0, 0], Directions([0.0], [[1, 0, 0]]))
