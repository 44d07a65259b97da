"""The observatory's table row by row, and the elevation at which nothing is left."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from trunnion.hardware.gimbals import azimuth_elevation_chain
from trunnion.hardware.keyholes import keyhole, rate_left_on_sky

TABLE = np.genfromtxt(Path(__file__).parent / "scan_speed.csv", delimiter=",", names=True)
ARCSEC = np.radians(1 / 3600)
LIMIT, SIDEREAL = 150 * ARCSEC, 15.041 * ARCSEC
HALF_LAST_DIGIT = 0.5


def test_all_21_rows():
    left = rate_left_on_sky(LIMIT, np.radians(90 - TABLE["elevation_deg"]), SIDEREAL) / ARCSEC
    np.testing.assert_allclose(left, TABLE["scan_arcsec_s"], atol=HALF_LAST_DIGIT, rtol=0)


def test_nothing_is_left_at_the_keyhole_of_sidereal_motion():
    """84.245 deg, computed from the table's two rates; one row above it the table still prints 1."""
    hole = keyhole(azimuth_elevation_chain(rates=(LIMIT, LIMIT)), SIDEREAL)
    assert 90 - np.degrees(hole.by_rate) == pytest.approx(84.245, abs=0.001)
