"""Peak angle rates and accelerations over a region: the laws of `attitude.demand` at its least margin.

The demand falls as the margin grows, so a proven floor of the margin gives a proven ceiling of the demand.
"""

from __future__ import annotations

from dataclasses import dataclass

from trunnion.attitude.basis import Basis
from trunnion.attitude.conventions import Convention
from trunnion.attitude.demand import acceleration_demand, rate_demand
from trunnion.envelope.margins import lock_margin
from trunnion.envelope.regions import Region
from trunnion.envelope.results import Extreme


@dataclass(frozen=True)
class PeakDemand:
    """Peaks over a region: each lies between lo (at the least margin's witness) and hi (proven; inf at lock).

    Rates in rad/s, accelerations in rad/s²; outer are the first and last angle. basis is that of the margin.
    """

    outer_rate: tuple[float, float]
    middle_rate: tuple[float, float]
    outer_acceleration: tuple[float, float]
    middle_acceleration: tuple[float, float]
    basis: Basis
    margin: Extreme


def peak_demand(region: Region, convention: Convention, body_rate: float, body_acceleration: float = 0.0) -> PeakDemand:
    """Peak demand for body rates up to `body_rate` rad/s and body angular accelerations up to `body_acceleration`
    rad/s², in any direction. Raises AttitudeError for negative ones."""
    least = lock_margin(region, convention).least
    ends = (least.hi if least.witness is None else max(least.witness.value, least.lo), least.lo)
    rates = [rate_demand(margin, body_rate) for margin in ends]
    accelerations = [acceleration_demand(margin, body_rate, body_acceleration) for margin in ends]
    return PeakDemand(
        (float(rates[0].outer), float(rates[1].outer)),
        (float(rates[0].middle), float(rates[1].middle)),
        (float(accelerations[0].outer), float(accelerations[1].outer)),
        (float(accelerations[0].middle), float(accelerations[1].middle)),
        least.basis,
        least,
    )
