"""The plain (JSON) form of a workbook's parts, with everything they refer to written out.

This is what is injected into notebooks and what content keys are made of: quantities keep their units as
typed, texts and titles are left out.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from trunnion.spec import parts
from trunnion.spec.meaning.envelopes import table_frames
from trunnion.spec.model import NAMED_SECTIONS
from trunnion.spec.parts.mounts import AnglesAs
from trunnion.spec.resolve import Resolver
from trunnion.spec.workbook import Workbook

_SECTIONS = {singular: section for section, singular in NAMED_SECTIONS.items()}


def plain_part(workbook: Workbook, kind: str, name: str) -> dict[str, Any]:
    """A part of a workbook as plain JSON with its references written out.

    kind: what one part of a named section is called (`frame`, `convention`, `envelope`, `mount`, `link`, `gimbal`, …)
    or the section's name. KeyError for a name that is not there. Table files keep their path in the workbook.
    """
    section = _SECTIONS.get(kind, kind)
    part = workbook.part(section, name)
    made = {"name": name, **part.plain()}
    writers: dict[str, Callable[[Workbook, Any, dict[str, Any]], None]] = {
        "frames": _frame,
        "conventions": _convention,
        "envelopes": _envelope,
        "forms": _form,
        "mounts": _mount,
        "links": _link,
        "gimbals": _gimbal,
        "surveys": _survey,
        "budgets": _budget,
    }
    if section in writers:
        writers[section](workbook, part, made)
    return made


def _inline(workbook: Workbook, section: str, made: dict[str, Any], key: str) -> None:
    """Put a part in place of its name, where a name stands."""
    if isinstance(made.get(key), str):
        made[key] = plain_part(workbook, section, made[key])


def _frame(workbook: Workbook, part: parts.Frame, made: dict[str, Any]) -> None:
    _inline(workbook, "frames", made, "paired with")


def _convention(workbook: Workbook, part: parts.Convention, made: dict[str, Any]) -> None:
    for key in ("reference", "body"):
        _inline(workbook, "frames", made, key)
    for key in ("zero", "body turned by", "reference turned by"):
        if isinstance(made.get(key), dict):
            _inline(workbook, "conventions", made[key], "convention")


def _form(workbook: Workbook, part: Any, made: dict[str, Any]) -> None:
    for key in ("reference", "body"):
        _inline(workbook, "frames", made, key)


def _mount(workbook: Workbook, part: Any, made: dict[str, Any]) -> None:
    for key in ("host", "frame"):
        _inline(workbook, "frames", made, key)
    for key in ("enter as", "convention"):
        _inline(workbook, "conventions", made, key)
    if isinstance(part.angles_as, AnglesAs):
        _inline(workbook, "frames", made["angles as"], "relative to")
    else:
        _inline(workbook, "conventions", made, "angles as")


def _envelope(workbook: Workbook, part: Any, made: dict[str, Any]) -> None:
    _inline(workbook, "conventions", made, "convention")
    if isinstance(part, parts.Cone | parts.Poses):
        reference, body = Resolver(workbook.file).pair_names(part.reference, part.body) or ("", "")
        made["reference"] = plain_part(workbook, "frames", reference)
        made["body"] = plain_part(workbook, "frames", body)
    if isinstance(part, parts.Poses):
        for pose in made["poses"]:
            _inline(workbook, "conventions", pose, "convention")
    elif isinstance(part, parts.Table | parts.Campaign):
        _table(workbook, part, made)
    elif isinstance(part, parts.Phases):
        made["phases"] = {phase: plain_part(workbook, "envelopes", phase) for phase in part.phases}
    elif isinstance(part, parts.Product):
        made["product"] = {
            "host": plain_part(workbook, "envelopes", str(part.product.host)),
            "mount": plain_part(workbook, "mounts", str(part.product.mount)),
        }


def _link(workbook: Workbook, part: parts.Link, made: dict[str, Any]) -> None:
    for key in ("of", "in"):
        _inline(workbook, "frames", made, key)
    _inline(workbook, "mounts", made, "mount")
    _inline(workbook, "envelopes", made, "attitude")


def _gimbal(workbook: Workbook, part: parts.Gimbal, made: dict[str, Any]) -> None:
    for key in ("base", "payload"):
        _inline(workbook, "frames", made, key)


def _survey(workbook: Workbook, part: parts.Survey, made: dict[str, Any]) -> None:
    _inline(workbook, "frames", made, "host")
    _inline(workbook, "mounts", made, "mount")


def _budget(workbook: Workbook, part: parts.Budget, made: dict[str, Any]) -> None:
    for term in made["terms"]:
        _inline(workbook, "mounts", term, "mount")


def _table(workbook: Workbook, part: Any, made: dict[str, Any]) -> None:
    """Tables name their two frames; a campaign lists the files its pattern matches today."""
    if part.maps is not None and part.convention is None:
        pair = table_frames(Resolver(workbook.file).context(), part)
        if pair is not None:
            made["reference"], made["body"] = pair[0].name, pair[1].name
    if isinstance(part, parts.Campaign):
        matches = sorted(workbook.root.glob(part.campaign))
        made["files"] = [match.relative_to(workbook.root).as_posix() for match in matches if match.is_file()]
