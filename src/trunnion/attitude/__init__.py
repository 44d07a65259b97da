"""Attitude: rotations, sequences, conventions, angle extraction, rates, margins, metrics. numpy only."""

from trunnion.attitude.basis import Basis
from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import Extraction, Policy, chain_angles, chain_matrix
from trunnion.attitude.frames import Frame, attitude_from_axes
from trunnion.attitude.margins import entry_margins, line_angle
from trunnion.attitude.rotations import rotation_angle, same_attitude
from trunnion.attitude.sequences import Sense, Sequence

__all__ = [
    "Basis",
    "Convention",
    "Extraction",
    "Frame",
    "Policy",
    "Sense",
    "Sequence",
    "attitude_from_axes",
    "chain_angles",
    "chain_matrix",
    "entry_margins",
    "line_angle",
    "rotation_angle",
    "same_attitude",
]
