"""The bench table in print, what it can and cannot show, and the field it is read in."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.hardware.bench import BenchTable, Channels, bench_table
from trunnion.hardware.diagnosis import Evidence, evidence, row_powers
from trunnion.hardware.instruments import BENCH, local_field
from trunnion.hardware.mistakes import only_read
from trunnion.hardware.mounts import Mount
from trunnion.sheet import display
from trunnion.units import parse_quantity

Array = NDArray[np.float64]

#: instrument -> (factor from inside units, unit in print)
SHOWN_IN: dict[str, tuple[float, str]] = {
    "accelerometer": (1.0, "g"),
    "gyro": (float(np.degrees(1.0)), "deg/s"),
    "clinometer": (float(np.degrees(1.0)), "deg"),
    "magnetometer": (1.0, "of the field"),
    "star_tracker": (1.0, ""),
}


def field_of(stated: Mapping[str, Any] | None) -> Array | None:
    """The field at the bench (3,), strength one, from its dip and declination (texts with units)."""
    if not stated:
        return None
    dip = parse_quantity(stated["dip"], kind="angle").value
    text = stated.get("declination")
    return local_field(strength=1.0, dip=dip, declination=parse_quantity(text, kind="angle").value if text else 0.0)


def table_of(mount: Mount, field: Mapping[str, Any] | None) -> BenchTable:
    """The bench table: six static poses and three turns."""
    return bench_table(mount, field_l=field_of(field))


def heads_of(table: BenchTable, instrument: str) -> Sequence[str]:
    """What the channels of an instrument are called."""
    mount = table.mount
    if instrument == "star_tracker":
        return BENCH.axes
    if instrument == "clinometer":
        return mount.tilt_axes or mount.sensor_axes[:2]
    return mount.sensor_axes


def named_rows(table: BenchTable, instrument: str) -> tuple[Any, ...]:
    """The poses, or the turns, an instrument is read in."""
    return tuple(table.rows_of(instrument))


def show_table(table: BenchTable) -> None:
    """Poses and turns with the reading each channel must show and the largest deviation to accept."""
    for name, values in table.expected.items():
        tolerance = getattr(table.tolerance, name)
        scale, unit = SHOWN_IN[name]
        rows = [
            [row.words, *(cell(scale * value, scale * allowed) for value, allowed in zip(line, around, strict=True))]
            for row, line, around in zip(named_rows(table, name), values, tolerance, strict=True)
        ]
        heads = [f"{head}, {unit}" if unit else head for head in heads_of(table, name)]
        caption = f"{name.replace('_', ' ').capitalize()}: expected readings"
        if name == "star_tracker":
            caption = "Star tracker: where its boresight points on the bench"
        display.table(
            f"tbl:bench-{name.replace('_', '-')}",
            ["put the vehicle so", *heads],
            rows,
            caption=caption,
            align="l" + "r" * len(heads),
        )


def cell(value: float, allowed: float) -> str:
    """A reading and its tolerance, or what stands for a reading that is undefined."""
    if not np.isfinite(value):
        return "undefined"
    text = f"{round(float(value), 2) + 0.0:+.2f}".replace("-", "−")
    return f"{text} ± {allowed:.2f}"


def show_evidence(table: BenchTable) -> None:
    """What the whole table reveals, and that level, planar or single poses do not."""
    whole = evidence(table)
    rows = [["all poses and turns", *_evidence_cells(whole)]]
    for words, keep in (
        ("level pose alone", _level(table)),
        ("level pose and the turn about the vertical", _planar(table)),
    ):
        rows.append([words, *_evidence_cells(evidence(table, keep))])
    display.table(
        "tbl:evidence",
        ["what is done", "evidence", "mistakes that would go unseen", "why"],
        rows,
        caption="What the bench test can show",
        align="llrl",
    )
    if not whole.sufficient:
        display.statement(
            "unseen", ["Not revealed even by the whole table:", *[f"{text}." for text in whole.unseen[:8]]]
        )
    _show_powers(table)


def _evidence_cells(found: Evidence) -> list[str]:
    says = "sufficient" if found.sufficient else "insufficient"
    return [says, str(len(found.unseen)), "; ".join(found.marks)]


def _level(table: BenchTable) -> Channels:
    return _kept(table, {"level"}, set())


def _planar(table: BenchTable) -> Channels:
    vertical = {t.key for t in table.turns if abs(_up(table) @ t.rate_b) > 0.9 * float(np.linalg.norm(t.rate_b))}
    return _kept(table, {"level"}, vertical)


def _up(table: BenchTable) -> Array:
    return next((pose.up_b for pose in table.poses if pose.key == "level"), table.poses[0].up_b)


def _kept(table: BenchTable, poses: set[str], turns: set[str]) -> Channels:
    made = {}
    for name, values in table.expected.items():
        keys = turns if name == "gyro" else poses
        keep = np.array([row.key in keys for row in table.rows_of(name)])
        made[name] = np.where(keep[:, None], values, np.nan)
    return only_read(table.expected, Channels(**made))


def _show_powers(table: BenchTable) -> None:
    powers = row_powers(table)
    words = {row.key: row.words for name, _ in table.expected.items() for row in named_rows(table, name)}
    display.table(
        "tbl:powers",
        ["instrument", "pose or turn", "mistakes it reveals by itself"],
        [[p.instrument.replace("_", " "), words.get(p.row, p.row), f"{p.revealed} of {p.considered}"] for p in powers],
        caption="How much each row reveals by itself",
        align="llr",
    )
