"""Stars near the zenith: the general pointing rates give the published formulas, and ERFA's directions."""

from __future__ import annotations

from pathlib import Path

import erfa
import numpy as np
import pytest

from trunnion.hardware.gimbals import azimuth_elevation_chain
from trunnion.hardware.joint_rates import pointing_rates
from trunnion.hardware.joint_solutions import pointing_solutions
from trunnion.hardware.keyholes import zenith_blind_spot
from trunnion.hardware.passes import directions

HERE = Path(__file__).parent
SPOTS = np.genfromtxt(HERE / "blind_spot.csv", delimiter=",", names=True)
STARS = np.genfromtxt(HERE / "star_rates.csv", delimiter=",", names=True)
TWELVE_DECIMALS = 0.6e-12  # deg


@pytest.mark.parametrize("row", SPOTS, ids=lambda row: f"{row['latitude_deg']:g} deg, V {row['V']:g}")
def test_blind_spot_edges_and_spans(row):
    spot = zenith_blind_spot(np.radians(row["latitude_deg"]), row["V"])
    low, high = np.degrees([spot.lowest, spot.highest])
    assert low == pytest.approx(row["low_deg"], abs=1e-11)
    assert high == pytest.approx(row["high_deg"], abs=1e-11)
    V, cosine = row["V"], np.cos(np.radians(row["latitude_deg"]))
    span_formula = np.degrees(np.arctan(2 * V * cosine / (V**2 - 1)))  # as the abstract gives it
    assert high - low == pytest.approx(span_formula, abs=1e-11)
    assert span_formula == pytest.approx(row["span_deg"], abs=TWELVE_DECIMALS)
    assert np.degrees(spot.hour_angle) == pytest.approx(row["hour_angle_deg"], abs=1e-11)


@pytest.mark.parametrize("row", STARS, ids=lambda row: f"h {row['h']:g} dec {row['dec']:g} lat {row['lat']:g}")
def test_pointing_rates_of_a_star(row):
    """dA/dh = sin(lat) - cos(lat) cos A tan a, da/dh = cos(lat) sin A, through the general two-axis formulas."""
    azimuth, elevation = erfa.hd2ae(row["h"], row["dec"], row["lat"])
    line = directions(azimuth, elevation)
    pole = directions(0.0, row["lat"])  # the sky turns left-handed about it as the hour angle grows
    chain = azimuth_elevation_chain()
    found = pointing_solutions(chain, line).angles
    branch = np.argmin(np.abs(found[:, 1] - elevation))
    rates = pointing_rates(chain, found[branch], line, -np.cross(pole, line))
    scale = 1.0 / np.cos(elevation) ** 2  # the azimuth rate's own sensitivity to the rounding of the direction
    assert rates[0] == pytest.approx(row["azimuth_rate"], abs=2e-15 * scale + 1e-14)
    assert rates[1] == pytest.approx(row["elevation_rate"], abs=1e-13)


def test_a_star_on_the_edge_of_the_blind_spot_asks_for_exactly_the_limit():
    """Largest azimuth speed on the meridian: cos(dec) / sin(lat - dec)."""
    lat, V = np.radians(45), 60.0
    spot = zenith_blind_spot(lat, V)
    for dec in (spot.lowest, spot.highest):
        assert abs(np.cos(dec) / np.sin(lat - dec)) == pytest.approx(V, rel=1e-12)
