"""The spec said back in plain sentences, so that two parties can confirm it aloud. Nothing is computed but examples.

Each convention is told as one would turn a model by hand, with a worked triple, its matrix and a carried vector; each
region, mount, requirement and decision in a sentence or two. The plan, which needs the templates, is added by the
calculations.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from trunnion.attitude import words
from trunnion.attitude.conventions import Convention
from trunnion.attitude.stated_forms import StatedForm, form_sentences, worked_sentences
from trunnion.spec import parts
from trunnion.spec.frame_words import carried_words, north_words, text_words
from trunnion.spec.resolve import Resolver
from trunnion.spec.standards import STANDARDS
from trunnion.spec.values import Range
from trunnion.spec.workbook import Workbook
from trunnion.units import convert


@dataclass(frozen=True)
class Section:
    """A heading and its sentences; lines that begin with four blanks are set as they are."""

    title: str
    lines: tuple[str, ...]


def read_back(workbook: Workbook) -> list[Section]:
    """Everything the spec says, part by part. Needs numpy only."""
    resolver = Resolver(workbook.file)
    sections = [Section("Document", tuple(_document(workbook)))]
    sections.append(Section("Frames", tuple(_frames(workbook))))
    for name in workbook.conventions:
        lines = _convention(workbook.conventions[name], resolver.build("conventions", name))
        sections.append(Section(f"Convention {name}", tuple(lines)))
    for name, form in workbook.forms.items():
        sections.append(Section(f"Form {name}", tuple(_form(form, resolver.build("forms", name)))))
    for name, envelope in workbook.envelopes.items():
        sections.append(Section(f"Envelope {name}", tuple(_envelope(envelope))))
    for name, mount in workbook.mounts.items():
        sections.append(Section(f"Mount {name}", tuple(_mount(mount, resolver.build("mounts", name)))))
    for title, entries in _hardware(workbook):
        sections.append(Section(title, tuple(entries)))
    for title, entries in _records(workbook):
        if entries:
            sections.append(Section(title, tuple(entries)))
    return sections


# --- document and frames -------------------------------------------------------------------------------------------


def _document(workbook: Workbook) -> Iterator[str]:
    document = workbook.document
    supersedes = f", which supersedes revision {document.supersedes}" if document.supersedes else ""
    yield f"{document.number}, revision {document.revision}{supersedes}: {document.title}."
    for person in workbook.people:
        roles = words.listed(person.signs_as) if person.signs_as else "nothing"
        yield f"{person.name} ({person.id}) may sign as {roles}."
    if document.approver_may_check:
        yield "One person may both check and approve; the cover says so."


def _frames(workbook: Workbook) -> Iterator[str]:
    for name, frame in workbook.frames.items():
        x, y, z = frame.axes
        said = (f"Frame {name}: x is {x}, y is {y}, z is {z}.", north_words(frame.north), carried_words(frame.carried))
        yield " ".join(sentence for sentence in said if sentence)
        if frame.handed == "left":
            yield f"Frame {name} is left-handed; it is used only through its right-handed partner {frame.paired_with}."
        yield from text_words(frame)
    for name, link in workbook.links.items():
        by = "a constant rotation" if link.constant is not None else link.mount or link.attitude
        late = f", its time stamps off by {link.time_offset.text}" if link.time_offset else ""
        yield f"Link {name}: {link.of} is carried by {link.in_} through {by}{late}."


# --- conventions ---------------------------------------------------------------------------------------------------


def _convention(part: parts.Convention, convention: Convention) -> Iterator[str]:
    if part.as_ is not None:
        yield from _fixed_by(part, convention)
    sense = "moving axes, each turn about an axis the earlier turns have carried along"
    fixed = "fixed axes, each turn about an axis that stays put"
    about = sense if convention.sense.value == "moving axes" else fixed
    yield f"Sequence {convention.sequence.value} about {about}."
    yield from words.turn_sentences(convention)
    yield from _constants(convention)
    yield words.range_sentence(convention)
    yield words.mapping_sentence(convention)
    worked = words.worked_vector(convention)
    yield worked.sentence
    name = "R" if convention.maps_body_to_reference else "C"
    yield f"The matrix {name} there:"
    for row in worked.matrix:
        yield "    " + "  ".join(f"{value:+.4f}".replace("-", "−") for value in row + 0.0)
    yield "Singular attitudes:"
    yield from words.singular_words(convention)
    if part.source:
        yield f"Source: {part.source}."


def _fixed_by(part: parts.Convention, convention: Convention) -> Iterator[str]:
    standard = STANDARDS[str(part.as_)]
    open_keys = [key for key in ("sequence", "about", "angles", "ranges") if getattr(part, key) is None]
    what = {"about": "moving or fixed axes", "angles": "the names of the angles"}
    fixed = [what.get(key, key) for key in open_keys] + (["the senses"] if part.positive is None else [])
    if fixed:
        yield f"{standard.name} fixes {words.listed(fixed)} here ({standard.seen})."


def _constants(convention: Convention) -> Iterator[str]:
    """Where the constants stand: what is turned before the three turns, and what after."""
    identity = np.eye(3)
    if not np.allclose(convention.left, identity, atol=1e-12, rtol=0.0):
        yield "A constant stands on the reference side: R = constant times the three turns, which come after it."
    if not np.allclose(convention.right, identity, atol=1e-12, rtol=0.0):
        yield "A constant stands on the body side: R = the three turns times constant, which is inside them all."


def _form(part: Any, stated: StatedForm) -> Iterator[str]:
    yield f"{stated.kind[0].upper()}{stated.kind[1:]}: {stated.body.name} relative to {stated.reference.name}."
    yield from form_sentences(stated)
    yield from worked_sentences(stated)
    yield f"Singular: {stated.form.singular_set}."
    if part.source:
        yield f"Source: {part.source}."


# --- envelopes -----------------------------------------------------------------------------------------------------


def _envelope(part: Any) -> Iterator[str]:
    yield from _REGIONS[type(part)](part)
    for further in getattr(part, "also", None) or ():
        held = f"{_direction(further.axis)} axis stays {_cone_size(further)} of {_direction(further.around)}"
        yield f"At the same time the {held}."
    about = getattr(part, "dispersion_about", None)
    if about is not None:
        turns = words.listed([f"{axis} by up to {limit.text}" for axis, limit in about.limits.items()])
        owner = "its own axes" if about.axes_of == "body" else "axes of the reference"
        yield f"Each attitude may be followed by a turn about {owner}: {turns}, either way and all at once."
    if part.dispersion is not None:
        yield f"Each attitude may be followed by any turn of up to {part.dispersion.text}."
    if part.max_body_rate is not None:
        yield f"The body turns at no more than {part.max_body_rate.text}."
    if part.max_angular_acceleration is not None:
        yield f"Its turning changes by no more than {part.max_angular_acceleration.text}."
    yield f"Source: {part.source}." if part.source else "No source is cited."


def _box(part: parts.Box) -> Iterator[str]:
    ranges = words.listed([f"{name} {range_text(limits)}" for name, limits in part.box.items()])
    yield f"In the angles of {part.convention}: {ranges}; every combination may occur."


def range_text(limits: Range) -> str:
    """A range in words: `anything`, `exactly 0 deg`, `from -20 deg to 25 deg`, the way through the half turn said."""
    if limits.lo is None or limits.hi is None:
        return "anything"
    if limits.lo is limits.hi:
        return f"exactly {limits.lo.text}"
    through = ", the way through 180 deg" if limits.lo.value > limits.hi.value else ""
    return f"from {limits.lo.text} to {limits.hi.text}{through}"


def _cone(part: parts.Cone) -> Iterator[str]:
    cone = part.cone
    yield f"The {_direction(cone.axis)} axis stays {_cone_size(cone)} of {_direction(cone.around)}."
    if isinstance(cone.roll, str):
        yield "The turn about that axis may be anything."
    else:
        start = f"{_direction(cone.roll.zero)} points as near to {_direction(cone.around)} as it can"
        yield f"The turn about that axis is {range_text(cone.roll.range)}, counted from where {start}."


def _cone_size(cone: Any) -> str:
    if cone.between is None:
        return f"within {cone.half_angle}"
    nearest, farthest = cone.between
    return f"no nearer than {nearest.text} and no farther than {farthest.text}"


def _direction(value: str | list[float]) -> str:
    return value if isinstance(value, str) else f"({', '.join(f'{entry:g}' for entry in value)})"


def _poses(part: parts.Poses) -> Iterator[str]:
    one = len(part.poses) == 1
    count = "One listed attitude" if one else f"{len(part.poses)} listed attitudes"
    ball = f", and all within {part.ball.text} of {'it' if one else 'one of them'}" if part.ball else ""
    yield f"{count}{ball}."


def _table(part: Any) -> Iterator[str]:
    file = part.table if isinstance(part, parts.Table) else f"the files {part.campaign}"
    yield f"The attitudes recorded in {file}{f', topic {part.topic}' if part.topic else ''}."
    yield from _columns(part)
    meaning = {
        "slerp": "Between samples it turns at a constant rate about one axis.",
        "rate limited": "Between samples it moves in any way its largest rate allows.",
        "samples": "Nothing is said of what happens between samples.",
    }
    yield meaning[part.between_samples]
    if part.attitude_error is not None:
        yield f"The true attitude lies within {part.attitude_error.text} of the recorded one."
    else:
        yield "The error of the recorded attitude is not stated: results are of the recorded estimate."
    if part.max_gap is not None:
        yield f"Samples more than {part.max_gap.text} apart are a gap and are not joined."
    if part.accept_damaged is not None:
        yield f"Damaged rows are left out, because: {part.accept_damaged}."


def _columns(part: Any) -> Iterator[str]:
    columns = part.columns
    if columns is None:
        return
    time = f"time in {columns.time.column} ({columns.time.unit}); " if columns.time else ""
    if columns.quaternion is not None:
        yield f"Columns: {time}quaternion {', '.join(columns.quaternion)}, scalar {part.scalar}, taking {part.maps}."
    elif columns.matrix is not None:
        yield f"Columns: {time}matrix by {part.order}, {', '.join(columns.matrix)}, taking {part.maps}."
    elif columns.angles is not None:
        names = ", ".join(columns.angles)
        yield f"Columns: {time}angles {names} in {columns.unit}, in the convention {part.convention}."


def _phases(part: parts.Phases) -> Iterator[str]:
    yield f"Any attitude of {words.listed(list(part.phases))}."


def _product(part: parts.Product) -> Iterator[str]:
    yield f"What {part.product.mount} goes through while its host is anywhere in {part.product.host}."


_REGIONS: dict[type, Any] = {
    parts.Box: _box,
    parts.Cone: _cone,
    parts.Poses: _poses,
    parts.Table: _table,
    parts.Campaign: _table,
    parts.Phases: _phases,
    parts.Product: _product,
}

# --- mounts --------------------------------------------------------------------------------------------------------


def _mount(part: Any, mount: Any) -> Iterator[str]:
    columns = zip(mount.sensor_axes, mount.R_bs.T, strict=True)
    axes = [f"{axis} points {words.axis_words(column, mount.host)}" for axis, column in columns]
    yield f"On {mount.host.name}: {words.listed(axes)} (stated as {mount.stated_as})."
    if mount.boresight:
        yield f"It looks along {mount.boresight}, which is {words.axis_words(mount.boresight_in_host, mount.host)}."
    yield from _tolerance(mount.tolerance)
    instruments = [instrument.value for instrument in mount.instruments]
    yield f"Inside: {words.listed(instruments)}." if instruments else "What is inside is not said."
    if part.accelerometer:
        at_rest = "+1 g" if part.accelerometer == "specific force" else "−1 g"
        yield f"Its accelerometer reports {part.accelerometer}: an axis that points up reads {at_rest} at rest."
    if mount.angles_as is not None:
        yield f"The angles it states of itself, relative to {mount.angles_as.reference.name}:"
        yield from words.turn_sentences(mount.angles_as)
        yield from words.singular_words(mount.angles_as)
    if mount.enter_as is not None:
        yield f"The consuming system takes the mount in the convention {mount.enter_as.name}."
    yield f"Source: {part.source}." if part.source else "No source is cited."


def _tolerance(tolerance: Any) -> Iterator[str]:
    if tolerance.total is not None:
        yield f"The whole mount may be turned by up to {_degrees(tolerance.total)} from this."
    if tolerance.per_axis is not None:
        bounds = ", ".join(_degrees(bound) for bound in tolerance.per_axis)
        yield f"It may be turned about x, y and z by up to {bounds}."
    if tolerance.covariance is not None:
        yield "The covariance of its small turn is stated, in rad² and sensor axes."


def _degrees(angle: float) -> str:
    return f"{convert(angle, 'angle', 'deg'):.6g} deg"


# --- gimbals, passes, sectors, surveys, budgets ---------------------------------------------------------------------


def _hardware(workbook: Workbook) -> Iterator[tuple[str, list[str]]]:
    for name, gimbal in workbook.gimbals.items():
        yield f"Gimbal {name}", [*_gimbal(gimbal), *_cited(gimbal)]
    for name, each in workbook.passes.items():
        yield f"Pass {name}", [_pass(each), *_cited(each)]
    for name, sector in workbook.sectors.items():
        corners = "; ".join(f"{azimuth.text}, {elevation.text}" for azimuth, elevation in sector.corners)
        modes = f" in the modes {words.listed(sector.modes)}" if sector.modes else " in every mode"
        yield f"Sector {name}", [f"Forbidden{modes}: the azimuth, elevation corners {corners}.", *_cited(sector)]
    for name, survey in workbook.surveys.items():
        drawing = f", to be compared with the mount {survey.mount}" if survey.mount else ""
        count = f"{len(survey.sightings)} directions seen by the sensor and known in {survey.host}"
        yield f"Survey {name}", [f"{count}, each to {survey.accuracy.text} (one sigma){drawing}.", *_cited(survey)]
    for name, budget in workbook.budgets.items():
        terms = [f"{term.name} ({term.kind}, {term.source})" for term in budget.terms]
        yield f"Budget {name}", [f"On {words.listed(budget.axes)}: {words.listed(terms)}.", *_cited(budget)]


def _gimbal(gimbal: parts.Gimbal) -> Iterator[str]:
    yield f"On {gimbal.base}, outermost axis first:"
    for joint in gimbal.joints:
        limits = [
            f"{what} {limit.text}"
            for what, limit in (
                ("rate at most", joint.max_rate),
                ("acceleration at most", joint.max_acceleration),
                ("encoder step", joint.encoder_step),
            )
            if limit is not None
        ]
        said = f"; {', '.join(limits)}" if limits else ""
        yield f"{joint.name} turns about {_direction(joint.axis)}, travel {range_text(joint.travel)}{said}."
    if gimbal.boresight is not None:
        yield f"The payload looks along {_direction(gimbal.boresight)}."


def _pass(each: Any) -> str:
    if isinstance(each, parts.TablePass):
        columns = each.columns
        return f"Azimuth {columns.azimuth} and elevation {columns.elevation} ({columns.unit}) from {each.table}."
    return f"A circular orbit at {each.circular.altitude.text}, highest at {each.circular.highest.text}; for sizing."


def _cited(part: Any) -> list[str]:
    return [f"Source: {part.source}." if part.source else "No source is cited."]


# --- requirements, decisions, assumptions --------------------------------------------------------------------------


def _records(workbook: Workbook) -> Iterator[tuple[str, list[str]]]:
    yield "Requirements", [_requirement(entry) for entry in workbook.requirements]
    yield (
        "Deviations",
        [
            f"{entry.id}: {entry.requirement} need not be met within these limits: {entry.limits}; expires "
            f"{entry.expires}; because: {entry.reason} (to be signed by {entry.approved_by})."
            for entry in workbook.deviations
        ],
    )
    yield "Decisions", [_decision(entry) for entry in workbook.decisions]
    yield (
        "Assumptions",
        [
            f"{entry.id}, {entry.status}{f' by {entry.confirmed_by}' if entry.confirmed_by else ''}: {entry.text}"
            for entry in workbook.assumptions
        ],
    )


def _requirement(entry: parts.Requirement) -> str:
    side, limit = ("at least", entry.at_least) if entry.at_least is not None else ("at most", entry.at_most)
    over = f" over {words.listed(entry.over)}" if entry.over else " over every envelope"
    source = f" ({entry.source})" if entry.source else ""
    text = limit.text if limit is not None else ""
    return (
        f"{entry.id}{source}: {entry.text} That is: the {entry.result} of {entry.of} is {side} {text}{over}; "
        f"the evidence asked for is {entry.basis}."
    )


def _decision(entry: parts.Decision) -> str:
    others = [name for name in entry.over if name != entry.chosen]
    over = f" over {words.listed(others)}" if others else ""
    title = f" {entry.title}" if entry.title else ""
    rests = f" It rests on {words.listed(entry.rests_on)}." if entry.rests_on else ""
    return f"{entry.id}:{title} {entry.chosen} is chosen{over}. {entry.because}{rests}"
