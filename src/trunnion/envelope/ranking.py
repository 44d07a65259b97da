"""The twelve sequences ranked over a region, and the nine axis pairs behind them."""

from __future__ import annotations

from dataclasses import dataclass

from numpy.typing import ArrayLike

from trunnion.attitude.frames import Frame
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.envelope.margins import EntryTable, entry_margin_table
from trunnion.envelope.regions import Region
from trunnion.envelope.results import TIE, MarginRange


@dataclass(frozen=True)
class AxisPair:
    """One of nine: lock when body axis `body` lies along the line of reference axis `reference` (0, 1, 2).

    moving and fixed: the sequences about moving and about fixed axes that lock there. Off the diagonal one each, on
    it two each: a sequence locks where its first axis meets its last, and for fixed axes the roles are swapped.
    """

    reference: int
    body: int
    moving: tuple[Sequence, ...]
    fixed: tuple[Sequence, ...]

    def words(self, reference: Frame, body: Frame) -> str:
        """The lock said with the frames' own axis names."""
        return (
            f"locks when the vehicle's {body.word(self.body)} axis lies along the "
            f"{reference.word(self.reference)}/{reference.word(self.reference, -1)} line"
        )


def _pair(reference: int, body: int) -> AxisPair:
    moving = tuple(s for s in Sequence if (s.axes[0], s.axes[2]) == (reference, body))
    fixed = tuple(s for s in Sequence if (s.axes[2], s.axes[0]) == (reference, body))
    return AxisPair(reference, body, moving, fixed)


AXIS_PAIRS: tuple[tuple[AxisPair, ...], ...] = tuple(tuple(_pair(i, k) for k in range(3)) for i in range(3))
"""The nine pairs, `AXIS_PAIRS[reference axis][body axis]`."""


@dataclass(frozen=True, eq=False)
class RankedSequence:
    """A sequence with its margins over the region and its rank; sequences within TIE of each other share a rank."""

    rank: int
    sequence: Sequence
    sense: Sense
    pair: AxisPair
    margin: MarginRange


def rank_sequences(
    region: Region, left: ArrayLike | None = None, right: ArrayLike | None = None, *, sense: Sense = Sense.MOVING
) -> list[RankedSequence]:
    """All twelve sequences, best guaranteed least margin first, for conventions R_rb = left E right."""
    return rank_from_table(entry_margin_table(region, left, right), sense)


def rank_from_table(table: EntryTable, sense: Sense = Sense.MOVING) -> list[RankedSequence]:
    """The twelve sequences ranked by an existing table of nine."""
    found = [(sequence, table.of(sequence, sense)) for sequence in Sequence]
    found.sort(key=lambda item: -item[1].least.lo)
    ranked: list[RankedSequence] = []
    for place, (sequence, margin) in enumerate(found, start=1):
        tied = ranked and margin.least.lo >= ranked[-1].margin.least.lo - TIE
        i, _, k = sequence.axes
        row, column = (i, k) if sense is Sense.MOVING else (k, i)
        rank = ranked[-1].rank if tied else place
        ranked.append(RankedSequence(rank, sequence, sense, AXIS_PAIRS[row][column], margin))
    return ranked
