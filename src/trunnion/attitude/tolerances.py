"""Every tolerance of the attitude room: name, value, unit, and what it costs.

Nothing below one of these is repaired in silence: the functions that use them raise, or say what they did.
"""

from __future__ import annotations

#: Largest |M^T M - 1| entry of a matrix still taken for a rotation (pure number). Matrices printed with ten
#: digits pass; a scale error of 1e-9 costs 1e-9 rad in any angle drawn from the matrix.
ROTATION = 1e-9

#: Largest | |q| - 1 | of a quaternion still taken for a unit one (pure number). Single precision logs (6e-8)
#: pass. The length itself never enters a result: every formula divides by |q|^2.
UNIT_QUATERNION = 1e-6

#: Squared quaternion length may differ from 1 by this much before a chunk is rescaled (pure number): 4
#: roundings of double precision, so the relative error of a margin from this source stays below 5e-16.
UNIT_QUATERNION_FAST = 9e-16

#: Slack when an angle is placed into a stated range (rad): a value this far outside counts as the end of the
#: range. 1e-9 rad is 5.7e-8 deg, below any printed digit.
RANGE = 1e-9

#: An angle this far outside a range is there by rounding of pi alone (rad).
RANGE_ROUNDING = 2e-15

#: Default answer of "same attitude?" (rad of rotation): 1e-9 rad is 2e-4 arcsec, above the rounding of any
#: chain of double precision products here and below every alignment tolerance met in practice.
SAME_ATTITUDE = 1e-9

#: Lock is taken as reached within this many roundings (pure number, times the working precision: 8.9e-16 rad
#: in double precision). There the outer angles are known to 0.1 rad at best, and setting the middle angle
#: onto its singular value moves the rebuilt attitude by no more than that margin.
LOCK_ROUNDINGS = 4
