"""The workbook file as a whole, and the JSON Schema it publishes for editors."""

from __future__ import annotations

import functools
from typing import Any

from pydantic import Field

from trunnion.spec.parts import (
    Assumption,
    Budget,
    Calculation,
    Convention,
    Decision,
    Deviation,
    Document,
    Envelope,
    Form,
    Frame,
    Gimbal,
    Link,
    Mount,
    Part,
    Pass,
    Person,
    Requirement,
    Revision,
    Sector,
    Source,
    Survey,
)
from trunnion.spec.values import Count, DataSize, Name, RelativePath

EDITION = 1

#: Sections that hold named parts, and what one of them is called.
NAMED_SECTIONS = {
    "frames": "frame",
    "links": "link",
    "conventions": "convention",
    "forms": "form",
    "envelopes": "envelope",
    "mounts": "mount",
    "gimbals": "gimbal",
    "passes": "pass",
    "sectors": "sector",
    "surveys": "survey",
    "budgets": "budget",
}
#: Sections that list parts with ids, and what one of them is called.
LISTED_SECTIONS = {
    "people": "person",
    "sources": "source",
    "requirements": "requirement",
    "deviations": "deviation",
    "assumptions": "assumption",
    "decisions": "decision",
    "calculations": "calculation",
}


class WorkbookFile(Part):
    """The keys of `workbook.yaml`."""

    workbook: Count
    document: Document
    house: RelativePath | None = None
    max_copied_size: DataSize | None = None
    revisions: list[Revision] = Field(default_factory=list)
    people: list[Person] = Field(default_factory=list)
    sources: list[Source] = Field(default_factory=list)
    frames: dict[Name, Frame] = Field(default_factory=dict)
    links: dict[Name, Link] = Field(default_factory=dict)
    conventions: dict[Name, Convention] = Field(default_factory=dict)
    forms: dict[Name, Form] = Field(default_factory=dict)
    envelopes: dict[Name, Envelope] = Field(default_factory=dict)
    mounts: dict[Name, Mount] = Field(default_factory=dict)
    gimbals: dict[Name, Gimbal] = Field(default_factory=dict)
    passes: dict[Name, Pass] = Field(default_factory=dict)
    sectors: dict[Name, Sector] = Field(default_factory=dict)
    surveys: dict[Name, Survey] = Field(default_factory=dict)
    budgets: dict[Name, Budget] = Field(default_factory=dict)
    requirements: list[Requirement] = Field(default_factory=list)
    deviations: list[Deviation] = Field(default_factory=list)
    assumptions: list[Assumption] = Field(default_factory=list)
    decisions: list[Decision] = Field(default_factory=list)
    calculations: list[Calculation] = Field(default_factory=list)


@functools.cache
def json_schema() -> dict[str, Any]:
    """The JSON Schema (2020-12) of `workbook.yaml`, for editors that complete and check while one types."""
    schema = WorkbookFile.model_json_schema(by_alias=True)
    schema["$schema"] = "https://json-schema.org/draft/2020-12/schema"
    schema["title"] = "Trunnion workbook"
    _drop_inner_names(schema)
    return schema


def _drop_inner_names(schema: dict[str, Any]) -> None:
    """The `name` of a named part is its key in the file, so the file may not give it inside."""
    schema.get("$defs", {}).get("Campaign", {}).get("properties", {}).pop("files", None)
    for definition in schema.get("$defs", {}).values():
        name = definition.get("properties", {}).get("name")
        if name is not None and "name" not in definition.get("required", []):
            del definition["properties"]["name"]
