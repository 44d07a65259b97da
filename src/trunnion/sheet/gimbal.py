"""What the gimbal-travel template calls: where the axes reach, how near they come to lock and stops, what is lost.

Letters: `r` reference, `b` the base the outermost axis is fixed in, `p` the payload. The base is the body of the host's
regions; without regions it stands in the frame the passes are given in (north, east, down).
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.envelope.regions import Track
from trunnion.errors import HardwareError
from trunnion.hardware.gimbals import GimbalChain
from trunnion.hardware.joint_solutions import ReachableSet, reachable_set
from trunnion.hardware.passes import Pass
from trunnion.hardware.sectors import Sector
from trunnion.sheet import display, gimbal_base, gimbal_checks, gimbal_host, gimbal_sky, hardware_parts
from trunnion.sheet.describe import region_rows
from trunnion.sheet.regions import Regions
from trunnion.units import parse_quantity

Array = NDArray[np.float64]


class GimbalTravel:
    """One gimbal on its host or on the ground; each `show_…` displays one part and records what it finds."""

    def __init__(
        self,
        *,
        gimbal: Mapping[str, Any],
        envelopes: Mapping[str, Any],
        passes: Mapping[str, Any],
        sectors: Mapping[str, Any],
        hold: str = "up",
        host_rate: str = "",
        sight_rate: str = "",
        reaction_time: str = "",
        largest_tilt: str = "",
        mode: str = "",
    ) -> None:
        self.plain = {
            "gimbal": dict(gimbal),
            "envelopes": dict(envelopes),
            "passes": dict(passes),
            "sectors": dict(sectors),
        }
        self.chain: GimbalChain = hardware_parts.gimbal(gimbal)
        self.regions = Regions(envelopes)
        self.passes: dict[str, Pass] = {name: hardware_parts.sky_pass(plain) for name, plain in passes.items()}
        self.sectors: dict[str, Sector] = {name: hardware_parts.sector(plain) for name, plain in sectors.items()}
        self.hold, self.mode = hold, mode or None
        self.host_rate = parse_quantity(host_rate, kind="angular rate").value if host_rate else None
        self.reaction_time = parse_quantity(reaction_time).value if reaction_time else None
        self.largest_tilt = parse_quantity(largest_tilt, kind="angle").value if largest_tilt else None
        self._sight_rate = parse_quantity(sight_rate, kind="angular rate").value if sight_rate else None
        if self.passes and len(self.chain.joints) != 2:
            raise HardwareError(f"'{self.name}' has {len(self.chain.joints)} axes; passes are followed with two")

    @property
    def name(self) -> str:
        """The gimbal's name."""
        return self.chain.name

    @property
    def boresight(self) -> Array:
        """The line pointed or kept (3,), payload components."""
        return gimbal_base.boresight(self.plain["gimbal"])

    @property
    def sight_rate(self) -> float | None:
        """Rate (rad/s) of the line of sight the keyhole is judged for: as stated, else the fastest pass's."""
        if self._sight_rate is not None:
            return self._sight_rate
        rates = [float(np.max(track.line_of_sight_rate)) for track in self.passes.values()]
        return max(rates) if rates else None

    @cached_property
    def reach(self) -> ReachableSet:
        """What the axes reach, stops aside."""
        return reachable_set(self.chain, boresight_p=self.boresight)

    @cached_property
    def host(self) -> gimbal_host.HostWork:
        """The work over the host's regions."""
        return gimbal_host.HostWork(self)

    @cached_property
    def sky(self) -> gimbal_sky.SkyWork:
        """The work over passes and sectors."""
        return gimbal_sky.SkyWork(self)

    @property
    def tracks(self) -> dict[str, Track]:
        """The regions that are records against time."""
        return {name: region for name, region in self.regions.items() if isinstance(region, Track)}

    def show_inputs(self) -> None:
        """The gimbal, the host's regions, passes and sectors."""
        rows = gimbal_base.joint_rows(self.plain["gimbal"])
        for name, plain in self.plain["envelopes"].items():
            rows += region_rows(name, plain)
        for kind in ("passes", "sectors"):
            word = {"passes": "pass", "sectors": "sector"}[kind]
            rows += [hardware_parts.row(word, name, plain) for name, plain in self.plain[kind].items()]
        display.inputs(rows)

    def show_assumptions(self) -> None:
        """What stands where."""
        base = self.plain["gimbal"]["base"]
        texts = ["The axes are rigid and meet their stated directions; what crooked axes cost is shown apart."]
        if self.regions:
            texts.append(f"The base of the gimbal is fixed in the host's {base['name']} axes.")
        if self.passes:
            texts.append("Passes are directions seen from the mount with its base level and facing north.")
        display.statement("assumptions", texts)
        self.regions.tell()

    def show_chain(self) -> None:
        """The axes, their limits, and what they reach."""
        gimbal_base.show_chain(self.chain, self.reach, self.plain["gimbal"]["base"]["axes"])

    def show_rings(self) -> None:
        """The rings at zero and at a locked position."""
        gimbal_base.show_rings(self.chain, self.boresight, self.plain["gimbal"]["base"]["axes"])

    def show_precision(self) -> None:
        """What encoder steps and crooked axes cost."""
        gimbal_base.show_precision(self.chain)

    def show_host_clearance(self) -> None:
        """Certified clearance to the singular set over the host's regions."""
        self.host.show_clearance()

    def show_host_rates(self) -> None:
        """Certified joint rates over the host's regions, and the keep-out of the middle axis."""
        self.host.show_rates()

    def show_host_travel(self) -> None:
        """Travel left at each stop over the host's regions."""
        self.host.show_travel()

    def show_read_back(self) -> None:
        """The host's attitude read back from the joints."""
        self.host.show_read_back()

    def show_redundancy(self) -> None:
        """Four axes: the free turn used to keep away from lock."""
        self.host.show_redundancy()

    def show_keyhole(self) -> None:
        """The keyhole for the stated rate, apart from what is unreachable."""
        self.sky.show_keyhole()

    def show_passes(self) -> None:
        """What every pass demands and what is lost."""
        self.sky.show_passes()

    def show_sky(self) -> None:
        """The sky with keyhole, stops, sectors and passes."""
        self.sky.show_sky()

    def show_histories(self) -> None:
        """Joint angles along every pass."""
        self.sky.show_histories()

    def show_tilt(self) -> None:
        """The tilt of the base that moves the keyhole out of the passes' way."""
        self.sky.show_tilt()

    def show_sectors(self) -> None:
        """Clearance from the forbidden sectors and time in them."""
        self.sky.show_sectors()

    def show_unwinding(self) -> None:
        """Unwinding and flips, and ways round the sectors."""
        self.sky.show_unwinding()

    def show_checks(self) -> None:
        """Solutions by scipy's Davenport angles or rotations, keyhole and rates by plain trigonometry."""
        gimbal_checks.check_solutions(self.chain, self.boresight)
        self.host.show_checks()
        self.sky.show_checks()

    def show_results(self) -> None:
        """The results in one table."""
        display.table(
            "tbl:results",
            ["quantity", "over", "value", "basis"],
            [*gimbal_base.result_rows(self.reach), *self.host.result_rows(), *self.sky.result_rows()],
            caption=f"Results of this calculation for {self.name}",
            align="llrl",
        )
