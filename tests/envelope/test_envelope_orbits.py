"""Earth-pointing attitudes of the SGP4 verification orbits as tracks against inertial axes.

Source: D. Vallado et al., Revisiting Spacetrack Report #3, AIAA 2006-6753: element sets SGP4-VER.TLE and results
tcppver.out (positions, velocities, osculating elements), as bundled with the sgp4 package. Body axes: z to the Earth's
centre, y against the orbit normal, x forward. The y axis then stands at the inclination from the inertial z line.
"""

from pathlib import Path

import numpy as np
import pytest
import sgp4
from sgp4.api import Satrec

from trunnion.attitude.rotations import quaternion_from_matrix
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Between, Poses, Track

FOLDER = Path(sgp4.__file__).parent
HALF_LAST_DIGIT = 0.5e-5  # deg; inclinations are printed with five decimals


def published():
    """Satellite number → rows of (minutes, position km, velocity km/s, inclination deg) that carry elements."""
    rows, satellite = {}, None
    for line in (FOLDER / "tcppver.out").read_text().splitlines():
        words = line.split()
        if words[-1] == "xx":
            satellite = int(words[0])
        elif len(words) > 10:
            numbers = np.array(words[:10], dtype=float)
            rows.setdefault(satellite, []).append((numbers[0], numbers[1:4], numbers[4:7], numbers[9]))
    return rows


def elements():
    """Satellite number → propagator."""
    lines = [line for line in (FOLDER / "SGP4-VER.TLE").read_text().splitlines() if line[:2] in ("1 ", "2 ")]
    pairs = zip(lines[::2], lines[1::2], strict=True)
    return {int(one[2:7]): Satrec.twoline2rv(one[:69], two[:69]) for one, two in pairs}


def earth_pointing(r, v):
    """R_ib (N, 3, 3): body axes as columns in inertial components."""
    z = -r / np.linalg.norm(r, axis=1, keepdims=True)
    h = np.cross(r, v)
    y = -h / np.linalg.norm(h, axis=1, keepdims=True)
    return np.stack([np.cross(y, z), y, z], axis=2)


PUBLISHED = published()


def test_margin_at_published_positions_is_the_published_inclination(make_convention):
    """3-1-2 locks when body y meets inertial z: its margin is the inclination, folded to 0 … 90 deg."""
    convention = make_convention("3-1-2")
    checked = 0
    for rows in PUBLISHED.values():
        for _, r, v, inclination in rows:
            margin = lock_margin(Poses(earth_pointing(r[None], v[None])), convention).least
            expected = min(inclination, 180.0 - inclination)
            assert np.degrees(margin.lo) == pytest.approx(expected, abs=2.0 * HALF_LAST_DIGIT)
            checked += 1
    assert checked > 200


@pytest.mark.parametrize("satellite", [5, 6251, 28057, 22312, 25954])
def test_two_revolutions_as_a_slerp_track(make_convention, satellite):
    """Body z sweeps the orbit plane: 3-1-3 keeps a right angle less the inclination, 3-1-2 the inclination.

    One row a minute; the published osculating inclinations over the window say how far it wanders meanwhile.
    """
    orbit = elements()[satellite]
    period = 2.0 * np.pi / orbit.no_kozai
    minutes = np.arange(0.0, 2.0 * period, max(1.0, period / 200.0))
    states = [orbit.sgp4_tsince(t) for t in minutes]
    assert all(error == 0 for error, _, _ in states)
    R = earth_pointing(np.array([r for _, r, _ in states]), np.array([v for _, _, v in states]))
    track = Track(minutes, quaternion_from_matrix(R), Between.SLERP, attitude_error=0.0)
    inclinations = np.array([min(i, 180.0 - i) for *_, i in PUBLISHED[satellite]])
    wander = np.ptp(inclinations) + 0.02
    normal = lock_margin(track, make_convention("3-1-2"))
    assert np.degrees(normal.least.lo) == pytest.approx(np.median(inclinations), abs=wander)
    assert np.degrees(normal.largest.hi) == pytest.approx(np.median(inclinations), abs=wander)
    radial = lock_margin(track, make_convention("3-1-3"))
    assert np.degrees(radial.least.lo) == pytest.approx(90.0 - np.median(inclinations), abs=wander)
    assert np.degrees(radial.largest.hi) == pytest.approx(90.0, abs=1e-9)


def test_propagated_positions_are_the_published_ones():
    """The track above rests on the same orbits: sgp4 gives the published positions to 1e-5 km."""
    orbits = elements()
    for satellite in (5, 6251, 28057, 22312, 25954):
        for minutes, r, _, _ in PUBLISHED[satellite]:
            error, position, _ = orbits[satellite].sgp4_tsince(minutes)
            assert error == 0
            assert np.allclose(position, r, rtol=0.0, atol=1e-5)
