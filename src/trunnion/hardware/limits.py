"""Numbers the hardware room decides with: name, value, unit, what it costs to choose otherwise."""

from __future__ import annotations

import math
from typing import Final

# Largest |MᵀM - I| entry that still counts as rounding of a rotation built here (three products of doubles).
ORTHONORMAL_ROUNDING: Final = 1e-12

# Largest |MᵀM - I| entry accepted from a matrix typed without a stated number of digits; more is reported
# and refused.
ORTHONORMAL_AS_TYPED: Final = 1e-9

# Neighbouring gimbal axes, or two measured directions, nearer than this (rad) count as parallel: the joint
# angles or the turn about the common line would then be worse than a hundred times the input error.
PARALLEL: Final = math.radians(0.5)

# Two directions nearer than this (rad) give a survey in which one axis is weaker than the others by 1/sin:
# warned of.
WEAKLY_INDEPENDENT: Final = math.radians(15.0)

# Clearances below this (rad) are called zero: ninety degrees in double precision is itself 6e-17 rad off.
SINGULAR: Final = 1e-12

# A reading set must separate two explanations by this many tolerances before one of them is excluded.
SEPARATION: Final = 2.0
