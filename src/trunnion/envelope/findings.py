"""What is odd about a region itself, before any margin: said in words, for the reader to answer."""

from __future__ import annotations

import numpy as np

from trunnion.attitude.sequences import Sense
from trunnion.envelope.axis_dispersion import AxisDispersion
from trunnion.envelope.constrained import Constrained
from trunnion.envelope.margins import direction_clearance, lock_margin
from trunnion.envelope.regions import Box, Dispersed, Mounted, Referred, Region, Track, Union
from trunnion.envelope.results import ZERO_BELOW
from trunnion.envelope.tracks import track_report


def region_findings(region: Region) -> list[str]:
    """Findings against a region and its parts: boxes that lock their own convention, gaps and half turns of tracks."""
    match region:
        case Box():
            return _box_findings(region)
        case Track():
            return track_report(region).findings()
        case Union():
            return [f"{name}: {line}" for name, part in region.parts.items() for line in region_findings(part)]
        case Dispersed() | Mounted() | Referred() | AxisDispersion():
            return region_findings(region.region)
        case Constrained(region=Box() as box):
            return _box_findings(box)
    return []


def _box_findings(box: Box) -> list[str]:
    """A box that holds the lock of its own convention limits less there than its ranges seem to say."""
    convention = box.convention
    widths = [high - low for low, high in box.ranges]
    outer_limited = min(widths[0], widths[2]) < 2.0 * np.pi - 1e-9
    if lock_margin(box, convention).least.hi > ZERO_BELOW + 1e-9 or not outer_limited:
        return []
    first, second, last = convention.sequence.axes
    line, axis = (first, second) if convention.sense is Sense.MOVING else (last, second)
    clearance = direction_clearance(box, convention.right[axis], convention.left[:, line])
    tilt = max(np.pi / 2 - clearance.least.lo, clearance.largest.hi - np.pi / 2)
    word, level = convention.body.word(axis), convention.reference.word(line)
    return [
        f"this box holds the lock of its own convention, where {convention.angle_names[0]} and "
        f"{convention.angle_names[2]} cannot be told apart: it limits the {word} axis to {np.degrees(tilt):.2f} deg "
        f"from square to {level}; did you mean a cone?"
    ]
