"""Envelope: regions of attitudes; margins and clearances over them, exact or guaranteed; conventions ranked and
switched; the choice of zero; campaigns. numpy only when imported; scipy where a function needs it.
"""

from trunnion.envelope.axis_dispersion import AxisDispersion, TurnSide
from trunnion.envelope.clearance import Directions, clearance_along, clearance_to_any
from trunnion.envelope.constrained import Constrained
from trunnion.envelope.findings import region_findings
from trunnion.envelope.margins import direction_clearance, entry_margin_table, lock_margin
from trunnion.envelope.ranking import rank_sequences
from trunnion.envelope.regions import (
    Between,
    Box,
    Cone,
    Dispersed,
    Mounted,
    Poses,
    Referred,
    Region,
    Roll,
    Track,
    Union,
)
from trunnion.envelope.results import AngleRange, Extreme, MarginRange, Witness
from trunnion.envelope.subdivision import self_check
from trunnion.envelope.tracks import track_report
from trunnion.envelope.zero import Side, best_right_angle_zero, best_zero

__all__ = [
    "AngleRange",
    "AxisDispersion",
    "Between",
    "Box",
    "Cone",
    "Constrained",
    "Directions",
    "Dispersed",
    "Extreme",
    "MarginRange",
    "Mounted",
    "Poses",
    "Referred",
    "Region",
    "Roll",
    "Side",
    "Track",
    "TurnSide",
    "Union",
    "Witness",
    "best_right_angle_zero",
    "best_zero",
    "clearance_along",
    "clearance_to_any",
    "direction_clearance",
    "entry_margin_table",
    "lock_margin",
    "rank_sequences",
    "region_findings",
    "self_check",
    "track_report",
]
