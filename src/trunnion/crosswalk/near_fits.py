"""What one reading takes differently from another: the mistake that explains a near-fit, in words."""

from __future__ import annotations

import itertools

import numpy as np

from trunnion.attitude.words import degrees_text, listed
from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.identify import Finding, Identification
from trunnion.crosswalk.readings import Chain
from trunnion.crosswalk.readings import Reading as Name


def difference(one: Chain, other: Chain, names: tuple[str, str, str]) -> str:
    """How `other` reads the numbers differently from `one`: the fewest mistakes that turn one into the other."""
    if one == other:
        return "the same reading"
    if one.degrees is other.degrees and _turned(one) == _turned(other):
        return f"the turns taken in the order {', '.join(names[column] for column in other.columns)}"
    pairs = itertools.product(one.readings(), other.readings())
    return listed(min((_mistakes(a, b, names) for a, b in pairs), key=len))


def _turned(chain: Chain) -> set[tuple[int, int, int]]:
    """Which signed axis each column turns about."""
    return set(zip(chain.columns, chain.axes, chain.signs, strict=True))


def explanations(found: Identification, names: tuple[str, str, str], most: int = 5) -> list[str]:
    """The mistake that leads from the best reading to each of the others that fit, and to the best that does not."""
    if not found.fits or found.fits[0].reading.chain is None or found.constants is Constants.BOTH:
        return []
    best = found.fits[0]
    others: list[Finding] = list(found.fits[1 : most + 1])
    if found.next_best is not None:
        others.append(found.next_best)
    lines = []
    for other in others:
        if best.reading.chain is None or other.reading.chain is None:
            continue
        words = difference(best.reading.chain, other.reading.chain, names)
        if words == "the same reading" and not np.allclose(best.right, other.right, rtol=0, atol=1e-6):
            words = "the body frame relabelled otherwise"
        fits = any(other is finding for finding in found.fits)
        lines.append(f"{words}: {'fits as well' if fits else f'misses by {degrees_text(other.miss, 4)}'}")
    return lines


def in_common(found: Identification, names: tuple[str, str, str]) -> list[str]:
    """What all readings that fit agree on: the unit, and the axis that each number turns about."""
    chains = [finding.reading.chain for finding in found.fits if finding.reading.chain is not None]
    if len(chains) < 2 or found.constants is Constants.BOTH:
        return []
    lines = []
    if len({chain.degrees for chain in chains}) == 1:
        lines.append(f"the numbers are in {'deg' if chains[0].degrees else 'rad'}")
    for column, name in enumerate(names):
        turned = {(c.axes[c.columns.index(column)], c.signs[c.columns.index(column)]) for c in chains}
        if len(turned) == 1:
            ((axis, sign),) = turned
            lines.append(f"{name} turns about {'' if sign > 0 else '−'}{'xyz'[axis]}")
    first = {chain.columns for chain in chains}
    if len(first) == 1:
        lines.append(f"the turns come in the order {', '.join(names[column] for column in chains[0].columns)}")
    return lines


def _mistakes(one: Name, other: Name, names: tuple[str, str, str]) -> list[str]:
    found = []
    if one.degrees is not other.degrees:
        found.append("degrees taken for radians" if one.degrees else "radians taken for degrees")
    if one.sequence is not other.sequence:
        found.append(f"sequence {other.sequence.value} for {one.sequence.value}")
    if one.sense is not other.sense:
        found.append(f"{other.sense.value} for {one.sense.value}")
    if one.maps_body_to_reference is not other.maps_body_to_reference:
        found.append("the matrix taken the other way round")
    moved = [place for place in range(3) if one.columns[place] != other.columns[place]]
    if moved:
        found.append(f"{listed([names[one.columns[place]] for place in moved])} exchanged")
    sign = dict(zip(one.columns, one.signs, strict=True))
    turned = [names[c] for c, s in zip(other.columns, other.signs, strict=True) if sign[c] != s]
    found += [f"the sign of {name} reversed" for name in turned]
    return found
