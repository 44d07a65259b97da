"""What the binder is given: one plain record of everything a calculation package shows.

The engine fills a `PackageInput`; the binder neither computes nor judges anything in it. All texts are plain
text (shown literally; `$…$` is read as mathematics only where a field says "prose"), all tables are already
worded, all verdicts already computed. Fields have defaults wherever a package can do without them.
"""

from __future__ import annotations

import enum
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

ITEM_MIME = "application/vnd.trunnion.item+json"
SHEET_TAG = "trunnion-sheet"


class Verdict(enum.Enum):
    """What the evidence says of a requirement; the values are the words printed."""

    MEETS = "meets"
    DOES_NOT_MEET = "does not meet"
    NOT_SHOWN = "not shown"


class SheetState(enum.Enum):
    """How a calculation ended."""

    COMPUTED = "computed"
    FAILED = "failed"
    MISSING = "missing"


class SignatureState(enum.Enum):
    """The state of one signature on the document or on a calculation."""

    NOT_SIGNED = "not signed"
    SIGNED = "signed"
    STALE = "signed, but the content has changed since"
    INVALID = "signature does not verify"


@dataclass(frozen=True)
class Document:
    """The title block: what is bound. `date` is the date printed on every page (ISO, YYYY-MM-DD)."""

    number: str
    title: str
    revision: str
    date: str
    status: str = "draft"
    supersedes: str = ""
    classification: str = ""
    subject: str = ""
    extra: Mapping[str, str] = field(default_factory=dict)  # fields asked for by house.yaml, by their key


@dataclass(frozen=True)
class Person:
    """Someone named in the package."""

    id: str
    name: str
    role: str = ""


@dataclass(frozen=True)
class Signature:
    """One row of a sign-off table. `does` is "prepared", "checked" or "approved"."""

    does: str
    name: str = ""
    date: str = ""
    state: SignatureState = SignatureState.NOT_SIGNED
    note: str = ""


@dataclass(frozen=True)
class Evidence:
    """Where a result stands: calculation id and item id (`C02`, `res:lock-margin-hover`)."""

    calculation: str
    item: str = ""


@dataclass(frozen=True)
class RequirementRow:
    """One row of the requirement matrix: a requirement judged for one candidate.

    A requirement of a decision has one row a candidate; only the row with `counts` decides approval.
    `asks` words the limit ("lock margin at least 20 deg over hover, transition, cruise"); `result` words the
    finding, already rounded to the unsafe side ("45.00 deg"); `accepted` names a deviation ("DV-1") or is "".
    """

    id: str
    text: str
    asks: str
    verdict: Verdict
    source: str = ""
    candidate: str = ""
    counts: bool = True
    result: str = ""
    basis: str = ""
    basis_asked: str = ""
    evidence: tuple[Evidence, ...] = ()
    accepted: str = ""
    signature: str = "not signed"
    why: str = ""  # why "not shown", or where the witness is; plain words


@dataclass(frozen=True)
class Alternative:
    """One candidate of a decision: its verdicts and worst margins in words."""

    name: str
    verdicts: str
    grounds: str = ""
    chosen: bool = False


@dataclass(frozen=True)
class Decision:
    """What was chosen, over what, and why."""

    id: str
    question: str
    chosen: str
    because: str
    alternatives: tuple[Alternative, ...] = ()
    rests_on: tuple[Evidence, ...] = ()


@dataclass(frozen=True)
class Assumption:
    """A stated input not confirmed by this calculation."""

    id: str
    text: str
    status: str = "open"
    owner: str = ""


@dataclass(frozen=True)
class Finding:
    """Something held against a calculation, a requirement or an input."""

    id: str
    against: str
    text: str
    state: str = "open"
    answer: str = ""


@dataclass(frozen=True)
class Deviation:
    """An accepted departure from a requirement; the verdict stays as computed."""

    id: str
    requirement: str
    reason: str
    limits: str = ""
    expires: str = ""
    signed: str = "not signed"


@dataclass(frozen=True)
class Revision:
    """One line of the revision history."""

    letter: str
    date: str
    reason: str
    by: str = ""


@dataclass(frozen=True)
class InputFile:
    """One input as read, by content."""

    name: str
    sha256: str
    size: int
    summary: str = ""
    source: str = ""
    held: bool = True


@dataclass(frozen=True)
class Change:
    """One line of the change report against the superseded revision."""

    what: str
    before: str
    after: str
    effect: str = ""


@dataclass(frozen=True)
class StatementPage:
    """A page of prose to hand over on its own (a convention statement). Paragraphs may hold `$…$`.

    `parts` are further headings with their paragraphs; `drawing` is SVG text, shown after the second
    of them, with its alternative text and caption.
    """

    id: str
    title: str
    paragraphs: tuple[str, ...]
    calculation: str = ""
    parts: tuple[tuple[str, tuple[str, ...]], ...] = ()
    drawing: str = ""
    drawing_alt: str = ""
    drawing_caption: str = ""


@dataclass(frozen=True)
class Sheet:
    """One calculation of the package.

    `notebook` is the sheet (body plus generated cells tagged `trunnion-sheet`); the binder draws title block,
    requirements and sign-off from this record, so tagged cells are skipped. `body` is the stored notebook,
    attached to the PDF bit for bit; without it the untagged cells are attached in canonical JSON.
    """

    id: str
    title: str
    template: str
    notebook: Mapping[str, Any] | None = None
    body: bytes | None = None
    number: str = ""
    state: SheetState = SheetState.COMPUTED
    reason: str = ""  # why it failed or is missing
    key: str = ""
    digest: str = ""
    local_template: bool = False
    signatures: tuple[Signature, ...] = ()
    fields: Mapping[str, str] = field(default_factory=dict)  # further rows of the calculation's title block


@dataclass(frozen=True)
class Summary:
    """The one-page answer. `figure` names the picture to show; `margins` rows are (what, value, where)."""

    question: str = ""
    answer: str = ""
    margins: tuple[tuple[str, str, str], ...] = ()
    figure: Evidence | None = None


@dataclass(frozen=True)
class PackageInput:
    """Everything one package shows. Lists keep the order in which they are to be printed."""

    document: Document
    sheets: tuple[Sheet, ...] = ()
    people: tuple[Person, ...] = ()
    signatures: tuple[Signature, ...] = ()
    requirements: tuple[RequirementRow, ...] = ()
    decisions: tuple[Decision, ...] = ()
    assumptions: tuple[Assumption, ...] = ()
    findings: tuple[Finding, ...] = ()
    deviations: tuple[Deviation, ...] = ()
    revisions: tuple[Revision, ...] = ()
    inputs: tuple[InputFile, ...] = ()
    changes: tuple[Change, ...] = ()
    statements: tuple[StatementPage, ...] = ()
    summary: Summary = field(default_factory=Summary)
    cautions: tuple[str, ...] = ()
    environment: tuple[tuple[str, str], ...] = ()
    spec_text: str = ""
    glossary: tuple[tuple[str, str], ...] = ()  # added to the binder's own list
    comparison_slack: str = "1e-9 deg"  # the tolerance of the verdict rule, printed in the package


@dataclass(frozen=True)
class BuildReport:
    """What the binder made, and what a careful reader should know of it."""

    html: Path
    pdf: Path | None
    digests: Mapping[str, str] = field(default_factory=dict)  # file name -> SHA-256
    pages: int | None = None
    missing_glyphs: Mapping[str, int] = field(default_factory=dict)  # "U+6F22" -> how often shown so
    scaled: tuple[tuple[str, str, float], ...] = ()  # (calculation, cell, factor) of formulas made smaller
    warnings: tuple[str, ...] = ()
