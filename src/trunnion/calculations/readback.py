"""The plan, read back beside the spec: calculations, templates, what each shows, what nobody shows. Nothing is run."""

from __future__ import annotations

from typing import Any

from trunnion.attitude.words import listed
from trunnion.calculations import templates
from trunnion.errors import TrunnionError
from trunnion.spec.readback import Section, read_back


def readback(workbook: Any) -> list[Section]:
    """The spec part by part, then the plan and the requirements no calculation promises to show."""
    sections = [
        *read_back(workbook),
        Section("Plan", tuple(_planned(entry, workbook) for entry in workbook.calculations)),
    ]
    promised = {name for entry in workbook.calculations for name in entry.shows or ()}
    lacking = tuple(entry.id for entry in workbook.requirements if entry.id not in promised)
    if lacking:
        sections.append(Section("Requirements no calculation promises to show", lacking))
    return sections


def _planned(entry: Any, workbook: Any) -> str:
    """One calculation: its template, what it is given, what it shows and records."""
    given = [f"{name}: {_given(value)}" for name, value in entry.parameters.items()]
    shows = [f"shows {listed(entry.shows)}"] if entry.shows else []
    try:
        template = templates.find(entry.template, workbook.root)
        own = " (the workbook's own: runs only with consent)" if template.local else ""
        records = [f"records {listed(template.records)}"] if template.records else []
    except TrunnionError as err:
        own, records = f" ({err.fault.cause})", []
    return f"{entry.id}: " + "; ".join([f"template {entry.template}{own}", *given, *shows, *records]) + "."


def _given(value: Any) -> str:
    return ", ".join(str(entry) for entry in value) if isinstance(value, list) else str(value)
