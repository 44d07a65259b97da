"""Quaternion, three angles and matrix of one file that should say the same: which readings of each make them agree.

Reversing every statement at once (all maps the other way) changes nothing between them, so one sense is held: the
reading of the first statement that maps body to reference. The words say so.
"""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.crosswalk.fitting import Constants, angle_between, scores
from trunnion.crosswalk.identify import Answer, Identification, identify_angles, matrix_readings, quaternion_readings
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

AGREES = np.radians(0.1)
"""rad; statements whose attitudes differ by no more than this, in the root mean square, agree."""

REVERSAL = "reversing the maps of all of them at once changes nothing between them: the file can't tell that"


@dataclass(frozen=True, eq=False)
class Agreement:
    """One way to read every statement of the file: words for each, and the root mean square miss (rad) between them.

    angles: what the three numbers are under it, where there are any.
    """

    words: Mapping[str, str]
    miss: float
    agrees: bool
    angles: Identification | None = None

    def line(self) -> str:
        """All in one line."""
        told = "; ".join(f"{what}: {words}" for what, words in self.words.items())
        verb = "agree" if self.agrees else "still differ by"
        return f"{told} — {verb} {'within ' if self.agrees else ''}{np.degrees(self.miss):.4g} deg"


def agreements(
    *,
    quaternion: ArrayLike | None = None,
    matrix: ArrayLike | None = None,
    numbers: ArrayLike | None = None,
    names: tuple[str, str, str] = ("first number", "second number", "third number"),
    noise: float | None = None,
    tolerance: float = AGREES,
) -> list[Agreement]:
    """Every way to read the statements given, those that agree first, then by how far they miss.

    quaternion (N, 4), matrix (N, 9), numbers (N, 3), at least two of them, as they stand in the file. Each way to read
    quaternion and matrix is tried, and the angles against each. Raises AttitudeError when fewer than two are given.
    """
    forms: dict[str, list[tuple[str, Array]]] = {}
    if quaternion is not None:
        forms["quaternion"] = quaternion_readings(quaternion)
    if matrix is not None:
        forms["matrix"] = matrix_readings(matrix)
    if len(forms) + (numbers is not None) < 2:
        raise AttitudeError("one statement alone can't disagree", remedy="give two of quaternion, matrix and angles")
    first = next(iter(forms))
    forms[first] = [entry for entry in forms[first] if not _reversed(entry[0])]
    found = []
    for chosen in itertools.product(*forms.values()):
        words = {what: said for what, (said, _) in zip(forms, chosen, strict=True)}
        found.append(_agreement(words, [R for _, R in chosen], numbers, names, noise, tolerance))
    return sorted(found, key=lambda entry: (not entry.agrees, entry.miss))


def _reversed(words: str) -> bool:
    return "maps reference to body" in words and " or " not in words


def _agreement(
    words: dict[str, str],
    attitudes: list[Array],
    numbers: ArrayLike | None,
    names: tuple[str, str, str],
    noise: float | None,
    tolerance: float,
) -> Agreement:
    apart = [float(scores(angle_between(attitudes[0], other))) for other in attitudes[1:]]
    miss = max(apart, default=0.0)
    angles = None
    if numbers is not None:
        angles = identify_angles(numbers, attitudes[0], constants=Constants.NONE, noise=noise, names=names)
        best = angles.fits[0] if angles.fits else angles.next_best
        miss = max(miss, best.miss if best is not None else np.inf)
        if best is not None:
            others = len(angles.fits) - 1
            more = f" (or {others} more)" if angles.answer is Answer.AMBIGUOUS else ""
            words = {**words, "angles": best.reading.words + more}
    return Agreement(words, miss, miss <= tolerance, angles)
