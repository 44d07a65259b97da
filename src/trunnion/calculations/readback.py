"""The spec in plain sentences, so that two parties can confirm it aloud; and the plan. Nothing is run."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from trunnion.attitude import words
from trunnion.calculations import templates
from trunnion.errors import TrunnionError
from trunnion.spec.plain import plain_part
from trunnion.spec.resolve import Resolver


@dataclass(frozen=True)
class Section:
    """A heading and its sentences."""

    title: str
    lines: tuple[str, ...]


def readback(workbook: Any) -> list[Section]:
    """Everything the spec says, part by part, then the plan and the requirements nobody promises to show."""
    resolver = Resolver(workbook.file)
    sections = [_document(workbook)]
    sections += [_convention(resolver.build("conventions", name), name) for name in workbook.conventions]
    sections += [_envelope(workbook, name) for name in workbook.envelopes]
    sections += [_mount(workbook, resolver, name) for name in workbook.mounts]
    if workbook.requirements:
        sections.append(Section("Requirements", tuple(_requirement(entry) for entry in workbook.requirements)))
    if workbook.decisions:
        sections.append(Section("Decisions", tuple(_decision(entry) for entry in workbook.decisions)))
    if workbook.assumptions:
        lines = tuple(f"{a.id} ({a.status}): {a.text}" for a in workbook.assumptions)
        sections.append(Section("Assumptions", lines))
    return [*sections, Section("Plan", tuple(_plan(workbook))), *_without_evidence(workbook)]


def _document(workbook: Any) -> Section:
    document = workbook.document
    supersedes = f", superseding {document.supersedes}" if document.supersedes else ""
    lines = [f"{document.number}, revision {document.revision}{supersedes}: {document.title}."]
    for name, frame in workbook.frames.items():
        lines.append(f"Frame {name}: x is {frame.axes[0]}, y is {frame.axes[1]}, z is {frame.axes[2]}.")
    return Section("Document and frames", tuple(lines))


def _convention(convention: Any, name: str) -> Section:
    """As one would turn a model by hand, with a worked triple, its matrix and a carried vector."""
    worked = words.worked_vector(convention)
    rows = ["  ".join(f"{value:+.4f}".replace("-", "−") for value in row) for row in worked.matrix]
    lines = [
        *words.turn_sentences(convention),
        words.mapping_sentence(convention),
        words.range_sentence(convention),
        worked.sentence,
        "The matrix there:",
        *(f"    {row}" for row in rows),
        *words.singular_words(convention),
    ]
    return Section(f"Convention {name}", tuple(lines))


def _envelope(workbook: Any, name: str) -> Section:
    part, plain = workbook.envelopes[name], plain_part(workbook, "envelopes", name)
    lines = [_region_sentence(plain)]
    if part.max_body_rate is not None:
        lines.append(f"The body turns at {part.max_body_rate.text} at most.")
    if part.dispersion is not None:
        lines.append(f"Every attitude may be off by {part.dispersion.text}.")
    lines.append(f"Source: {part.source}." if part.source else "No source is cited.")
    return Section(f"Envelope {name}", tuple(lines))


def _region_sentence(plain: Mapping[str, Any]) -> str:
    for key, say in _REGIONS.items():
        if key in plain:
            return say(plain)
    return f"Stated as {', '.join(plain)}."


def _box(plain: Mapping[str, Any]) -> str:
    ranges = words.listed([f"{angle} {_range(value)}" for angle, value in plain["box"].items()])
    return f"In the angles of {plain['convention']['name']}: {ranges}; every combination may occur."


def _cone(plain: Mapping[str, Any]) -> str:
    cone = plain["cone"]
    size = f"within {cone['half angle']}" if "half angle" in cone else f"between {' and '.join(cone['between'])}"
    roll = "any" if cone["roll"] == "any" else f"{_range(cone['roll']['range'])}, zero with {cone['roll']['zero']}"
    return f"{_direction(cone['axis'])} stays {size} of {_direction(cone['around'])}; the turn about it is {roll}."


def _table(plain: Mapping[str, Any]) -> str:
    error = plain.get("attitude error")
    known = f"the true attitude within {error} of the recorded one" if error else "the attitude's error is not stated"
    return f"Recorded in {plain['table']}; between samples: {plain['between samples']}; {known}."


def _poses(plain: Mapping[str, Any]) -> str:
    ball = f", each within {plain['ball']}" if "ball" in plain else ""
    return f"{len(plain['poses'])} listed attitudes{ball}."


_REGIONS: dict[str, Any] = {
    "box": _box,
    "cone": _cone,
    "table": _table,
    "poses": _poses,
    "phases": lambda plain: f"Any attitude of {words.listed(list(plain['phases']))}.",
    "product": lambda plain: (
        f"What {plain['product']['mount']['name']} goes through while its host is anywhere in "
        f"{plain['product']['host']['name']}."
    ),
    "campaign": lambda plain: f"Every attitude recorded in the {len(plain['files'])} files {plain['campaign']}.",
}


def _range(value: Any) -> str:
    if value == "any":
        return "anything"
    return f"from {value[0]} to {value[1]}" if isinstance(value, list) else f"exactly {value}"


def _direction(value: Any) -> str:
    return f"({', '.join(str(entry) for entry in value)})" if isinstance(value, list) else str(value)


def _mount(workbook: Any, resolver: Resolver, name: str) -> Section:
    mount = resolver.build("mounts", name)
    axes = [
        f"{axis} points {words.axis_words(mount.R_bs[:, index], mount.host)}"
        for index, axis in enumerate(mount.sensor_axes)
    ]
    lines = [f"On {mount.host.name}: {words.listed(axes)}."]
    part = workbook.mounts[name]
    if mount.boresight:
        lines.append(f"It looks along {mount.boresight}.")
    if part.accelerometer:
        at_rest = "+1 g" if part.accelerometer == "specific force" else "−1 g"
        lines.append(f"Its accelerometer reports {part.accelerometer}: an axis that points up reads {at_rest} at rest.")
    if mount.angles_as is not None:
        lines += ["The angles it states itself:", *words.turn_sentences(mount.angles_as)]
    lines.append(f"Source: {part.source}." if part.source else "No source is cited.")
    return Section(f"Mount {name}", tuple(lines))


def _requirement(entry: Any) -> str:
    side, limit = ("at least", entry.at_least) if entry.at_least is not None else ("at most", entry.at_most)
    over = f" over {words.listed(entry.over)}" if entry.over else ""
    source = f" ({entry.source})" if entry.source else ""
    return f"{entry.id}{source}: the {entry.result} of {entry.of} is {side} {limit.text}{over}, shown by {entry.basis}."


def _decision(entry: Any) -> str:
    return f"{entry.id}: {entry.chosen} is chosen, over {words.listed(entry.over)}. {entry.because}"


def _plan(workbook: Any) -> list[str]:
    lines = []
    for entry in workbook.calculations:
        given = "; ".join(f"{name}: {_given(value)}" for name, value in entry.parameters.items())
        shows = f"; shows {words.listed(entry.shows)}" if entry.shows else ""
        try:
            template = templates.find(entry.template, workbook.root)
            own = " (the workbook's own, runs only with consent)" if template.local else ""
            records = f"; records {words.listed(template.records)}" if template.records else ""
        except TrunnionError as err:
            own, records = f" ({err.fault.cause})", ""
        lines.append(f"{entry.id}: template {entry.template}{own}, {given}{shows}{records}.")
    return lines


def _given(value: Any) -> str:
    return ", ".join(str(entry) for entry in value) if isinstance(value, list) else str(value)


def _without_evidence(workbook: Any) -> list[Section]:
    promised = {name for entry in workbook.calculations for name in entry.shows or ()}
    lacking = [entry.id for entry in workbook.requirements if entry.id not in promised]
    if not lacking:
        return []
    return [Section("Requirements no calculation promises to show", tuple(lacking))]
