"""What the workbook says about itself: document, people, sources, requirements, decisions and what is
computed."""

# mypy: disable-error-code="valid-type"
# (the types of keys are made by functions such as one_of and list_of)
from __future__ import annotations

from typing import Any

from pydantic import ConfigDict

from trunnion.spec.parts.base import NamedPart, Part, Reference
from trunnion.spec.parts.rotations import Rotation
from trunnion.spec.values import AnyQuantity, Duration, Id, Name, Text, Time, Title, Truth, one_of

BASES = ("exact", "certified bound", "sampled", "measured")
ROLES = ("prepared", "checked", "approved")


class Document(Part):
    """The title block."""

    number: Name
    title: Title
    revision: Name
    supersedes: Name | None = None
    date: Name | None = None
    organization: Name | None = None
    approver_may_check: Truth | None = None
    fields: dict[str, Name] | None = None


class Revision(Part):
    """One line of the revision table."""

    revision: Name
    reason: Text
    date: Name | None = None
    supersedes: Name | None = None


class Person(Part):
    """Someone who signs, or who answers for an assumption."""

    id: Id
    name: Name
    signs_as: list[one_of(*ROLES)] | None = None
    organization: Name | None = None


class Source(Part):
    """A document that inputs and requirements cite."""

    id: Id
    title: Title
    number: Name | None = None
    edition: Name | None = None
    date: Name | None = None
    text: Text | None = None


class Requirement(Part):
    """A limit on a result."""

    id: Id
    text: Text
    source: Text | None = None
    result: Name
    of: Name
    at_least: AnyQuantity | None = None
    at_most: AnyQuantity | None = None
    over: list[Name] | None = None
    basis: one_of(*BASES) = "certified bound"


class Deviation(Part):
    """A requirement that is not met, accepted by an approver within limits."""

    id: Id
    requirement: Name
    reason: Text
    limits: Text
    expires: Name
    approved_by: Name


class Assumption(Part):
    """A stated input, confirmed or still open."""

    id: Id
    text: Text
    status: one_of("open", "confirmed")
    owner: Name
    confirmed_by: Name | None = None
    source: Text | None = None


class Decision(Part):
    """What was chosen, over what, why, and resting on which calculations."""

    id: Id
    chosen: Name
    over: list[Name]
    because: Text
    rests_on: list[Name]
    title: Title | None = None


class Calculation(Part):
    """One run of a template. Keys beyond these are the template's own parameters."""

    model_config = ConfigDict(extra="allow")

    id: Id
    template: Id
    title: Title | None = None
    number: Name | None = None
    shows: list[Name] | None = None

    @property
    def parameters(self) -> dict[str, Any]:
        """The template's parameters as written."""
        return dict(self.model_extra or {})


class Link(NamedPart):
    """How the frame `of` is carried by the frame `in`: a constant rotation, a mount, or an envelope's
    table."""

    of: Reference
    in_: Reference
    constant: Rotation | None = None
    mount: Reference | None = None
    attitude: Reference | None = None
    time_offset: Time | None = None
    offset_error: Duration | None = None
    jitter: Duration | None = None
    source: Text | None = None
    text: Text | None = None
