"""The runs of a campaign: where each lies, its rows part by part, and a second look at them by scipy.

Everything here can be called in another process or on another machine, by which the files must be seen under the same
paths. `second_look` imports nothing of the room whose result it checks.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.errors import CalculationError
from trunnion.sheet import independent, parameters
from trunnion.spec.meaning.envelopes import STATEMENT_KEYS

Array = NDArray[np.float64]

ROWS_HELD = 1_000_000
"""Rows read at once; a process holds a few times as many numbers."""

_DIGEST_LETTERS = 12


@dataclass(frozen=True)
class Run:
    """One file of a campaign: its name for people, its absolute path, and the statement of its columns (plain)."""

    name: str
    path: str
    statement: Mapping[str, Any]


def runs_of(plain: Mapping[str, Any]) -> list[Run]:
    """The runs of a campaign envelope as a notebook carries it, by name."""
    files = plain.get("files")
    if "campaign" not in plain or not files:
        raise CalculationError(
            f"'{plain.get('name', 'this region')}' is no campaign, or its pattern matches no file",
            remedy="give an envelope with `campaign: folder/*.parquet`",
        )
    stated = {key: plain[key] for key in STATEMENT_KEYS if key in plain}
    names = [_shown_name(held) for held in files]
    unique = len(set(names)) == len(names)
    made = []
    for held, name in zip(files, names, strict=True):
        path = parameters.input_path(held).resolve()  # a link of this machine means nothing to another one
        made.append(Run(name if unique else held, str(path), {**stated, "table": path.name}))
    return made


def _shown_name(held: str) -> str:
    """The file's own name behind the digest under which it is held."""
    digest, dash, rest = held.partition("-")
    return rest if dash and len(digest) == _DIGEST_LETTERS else held


def read_run(run: Run) -> Iterator[tuple[Array, Array]]:
    """Times (n,) s and quaternions (n, 4), scalar first, of a run, part by part."""
    from trunnion.tables import iter_chunks

    for part in iter_chunks(parameters.table_statement(run.statement), Path(run.path).parent, rows=ROWS_HELD):
        yield part.times, part.quaternions


@dataclass(frozen=True)
class SecondLook:
    """What scipy finds in one run: rows, rows looked at, and the least margin (deg) by convention over those rows."""

    run: str
    rows: int
    looked_at: int
    least: Mapping[str, float]


def second_look(run: Run, *, conventions: Sequence[Convention], most_rows: int) -> SecondLook:
    """The least lock margin over rows of a run by scipy; at most about `most_rows` rows of each part, evenly spread."""
    from scipy.spatial.transform import Rotation

    least = {convention.name: np.inf for convention in conventions}
    rows = looked_at = 0
    for times, quaternions in read_run(run):
        step = max(1, len(times) // most_rows)
        attitudes = Rotation.from_quat(quaternions[::step][:, [1, 2, 3, 0]])
        rows, looked_at = rows + len(times), looked_at + len(attitudes)
        for convention in conventions:
            found = float(independent.lock_margin_deg(convention, attitudes).min())
            least[convention.name] = min(least[convention.name], found)
    return SecondLook(run.name, rows, looked_at, least)


def followed_least(run: Run, *, convention: Convention, longest_gap: float = np.inf) -> float:
    """The least lock margin (deg) of a whole run read as slerp, by scipy, part by part with the steps between parts.

    Rows further apart in time than `longest_gap` s are not joined.
    """
    best = np.inf
    times, quaternions = np.empty(0), np.empty((0, 4))
    for next_times, next_quaternions in read_run(run):
        times = np.concatenate([times[-1:], next_times])
        quaternions = np.concatenate([quaternions[-1:], next_quaternions])
        cuts = np.flatnonzero(np.diff(times) > longest_gap) + 1
        for moments, rows in zip(np.split(times, cuts), np.split(quaternions, cuts), strict=True):
            best = min(best, independent.track_margin_deg(convention, moments, rows)[0])
    return best
