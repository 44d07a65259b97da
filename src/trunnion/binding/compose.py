"""The package in reading order: from the package input to the neutral document."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable
from dataclasses import replace

from trunnion.binding import blocks as b
from trunnion.binding.calculation import Registry, calculation_part, plain, sign_off, signature_words, verdict_line
from trunnion.binding.glossary import CONTENTS_NOTE, terms, usual_contents
from trunnion.binding.house import House
from trunnion.binding.markdown import read_line
from trunnion.binding.notebook import clean_svg
from trunnion.binding.package import (
    SHEET_TAG,
    Evidence,
    PackageInput,
    RequirementRow,
    Sheet,
    SheetState,
    StatementPage,
    Verdict,
)
from trunnion.binding.references import resolve
from trunnion.binding.words import Words
from trunnion.errors import BindingError, Fault, Place
from trunnion.glyphs import visible_text

ROW_CLASS = {Verdict.MEETS: "v-meets", Verdict.DOES_NOT_MEET: "v-fails", Verdict.NOT_SHOWN: "v-unshown"}


def compose(package: PackageInput, house: House, *, strict: bool = True) -> tuple[b.NeutralDocument, list[str]]:
    """The neutral document and warnings; all faults of all notebooks are raised together as `BindingError`."""
    house.require_class(package.document.classification)
    composer = _Composer(package, house, Words(house.language), strict)
    document = composer.document()
    if composer.registry.faults:
        raise BindingError(composer.registry.faults)
    return document, composer.registry.warnings


class _Composer:
    """Builds the parts one after another; holds what they share."""

    def __init__(self, package: PackageInput, house: House, words: Words, strict: bool) -> None:
        self.package, self.house, self.words, self.strict = package, house, words, strict
        self.registry = Registry()
        self.section = 0
        self.appendix = 0

    def document(self) -> b.NeutralDocument:
        doc = self.package.document
        self._register()
        calculations = [
            calculation_part(sheet, self.package, self.words, self.registry, self.strict)
            for sheet in self.package.sheets
        ]
        front = [self.cover(), self.history(), self.contents(), self.lists(), self.summary(calculations)]
        middle = [self.requirements(), self.decisions(), self.standing()]
        back = [*self.statements(), self.changes(), *self.appendices()]
        parts = [part for part in (*front, *middle, *calculations, *back) if part is not None]
        state, standing = self.state(), self.standing_words()
        parts = [replace(part, state=" · ".join([part.state, *standing]) if part.state else state) for part in parts]
        parts = [_stepped(resolve(part, self.registry)) for part in parts]
        return b.NeutralDocument(
            title=doc.title,
            number=doc.number,
            revision=doc.revision,
            date=doc.date,
            status=doc.status,
            language=self.words.language,
            parts=parts,
            attachments=[_attachment(sheet) for sheet in self.package.sheets if sheet.body or sheet.notebook],
            authors=tuple(s.name for s in self.package.signatures if s.name and s.does == "prepared"),
            organization=self.house.organization,
            classification=doc.classification,
        )

    def _register(self) -> None:
        """Anchors of requirements and decisions; candidates of one requirement share one."""
        for name in dict.fromkeys(row.id for row in self.package.requirements):
            self.registry.add(f"req/{name}", name, Place(key="requirements"))
        for decision in self.package.decisions:
            self.registry.add(f"dec/{decision.id}", decision.id, Place(key="decisions"))

    # -- small things ------------------------------------------------------------------------------------
    def numbered(self) -> str:
        self.section += 1
        return str(self.section)

    def lettered(self) -> str:
        self.appendix += 1
        return chr(64 + self.appendix)

    def prose(self, text: str, where: str) -> b.Line:
        def refuse(cause: str, remedy: str) -> None:
            self.registry.faults.append(Fault(cause, remedy, Place(key=where)))

        return read_line(text, refuse)

    def heads(self, *phrases: str) -> tuple[b.Line, ...]:
        return tuple(b.line(self.words(phrase)) for phrase in phrases)

    def state(self) -> str:
        """What the foot of every page says: signatures, open findings, deviations."""
        return " · ".join([signature_words(self.package.signatures, self.words), *self.standing_words()])

    def standing_words(self) -> list[str]:
        """Open findings and deviations, in the fewest words."""
        parts = []
        findings = sum(f.state == "open" for f in self.package.findings)
        if findings:
            parts.append(f"{self.words('open findings')}: {findings}")
        if ids := [d.id for d in self.package.deviations]:
            parts.append(", ".join(ids) if len(ids) <= 3 else f"{self.words('Deviations')}: {len(ids)}")
        return parts

    def link(self, evidence: Evidence) -> b.Inline:
        """A way to the evidence; to the calculation when the item is unknown or the calculation gave none."""
        anchor = f"{evidence.calculation}/{evidence.item}" if evidence.item else evidence.calculation
        if anchor not in self.registry.labels:
            anchor = evidence.calculation
        if anchor not in self.registry.labels:
            return b.Text(evidence.calculation)
        return b.Link(anchor, b.line(self.registry.labels[anchor]), page=True)

    def links(self, found: tuple[Evidence, ...]) -> b.Line:
        """Ways to all evidence, one a line, each table or figure named once."""
        out: list[b.Inline] = []
        seen: set[str] = set()
        for evidence in found:
            way = self.link(evidence)
            words = plain((way,))
            if words not in seen:
                out += [b.Break(), way] if out else [way]
            seen.add(words)
        return tuple(out) or b.line("–")

    # -- front -------------------------------------------------------------------------------------------
    def cover(self) -> b.Part:
        doc, w = self.package.document, self.words
        rows: list[tuple[str, b.Line]] = [
            (w("Document"), (b.Marked("id", b.line(doc.number)),)),
            (w("Revision"), b.line(doc.revision)),
            (w("Date"), b.line(doc.date)),
            (w("Status"), b.line(w.known(doc.status))),
        ]
        for label, value in (
            ("Supersedes", doc.supersedes),
            ("Classification", doc.classification),
            ("Subject", doc.subject),
            ("Organization", self.house.organization),
        ):
            if value:
                rows.append((w(label), b.line(value)))
        rows += [(label, b.line(doc.extra.get(key, "–"))) for key, label in self.house.fields]
        blocks: list[b.Block] = [b.Grid(tuple(rows), columns=2), self.overall()]
        blocks += self.without_result()
        blocks += [b.Heading(2, b.line(w("Sign-off"))), sign_off(self.package.signatures, w)]
        cautions = (w.caution(self.package.comparison_slack), *self.package.cautions)
        body = tuple(b.Paragraph(self.prose(text, "cautions")) for text in cautions)
        blocks.append(b.Callout("caution", w("Caution"), body))
        return b.Part("cover", doc.title, tuple(blocks), look="cover")

    def overall(self) -> b.Block:
        """The verdict of the package in one line: how many of the requirements that count are what."""
        counting = [row for row in self.package.requirements if row.counts]
        if not counting:
            return b.Paragraph(b.line(f"{self.words('Overall')}: {self.words('no requirements are stated')}."), "lead")
        parts: list[b.Inline] = [b.Marked("strong", b.line(f"{self.words('Overall')}:"))]
        for verdict in Verdict:
            number = sum(row.verdict is verdict for row in counting)
            if number:
                parts += [*b.line(f"  {number} × "), b.Badge(verdict)]
        accepted = [f"{row.id} {self.words('accepted by')} {row.accepted}" for row in counting if row.accepted]
        parts += b.line(f"  ({'; '.join(accepted)})" if accepted else "")
        return b.Paragraph(tuple(parts), "lead")

    def without_result(self) -> list[b.Block]:
        broken = [sheet for sheet in self.package.sheets if sheet.state is not SheetState.COMPUTED]
        if not broken:
            return []
        items = []
        for sheet in broken:
            words = f" {sheet.title}: {self.words.state(sheet.state)}" + (f" – {sheet.reason}" if sheet.reason else "")
            items.append((b.Paragraph((b.Link(sheet.id, b.line(sheet.id)), *b.line(words))),))
        return [b.Callout("failed", self.words("Calculations without result"), (b.Items(tuple(items)),))]

    def history(self) -> b.Part | None:
        if not self.package.revisions:
            return None
        rows = [tuple(b.line(x) for x in (r.letter, r.date, r.reason, r.by)) for r in self.package.revisions]
        table = b.Table(self.heads("Revision", "Date", "Reason", "By"), tuple(rows), "llll", widths=(1, 1.4, 6, 2))
        return b.Part("history", self.words("Revision history"), (table,))

    def contents(self) -> b.Part:
        return b.Part(
            "contents",
            self.words("Contents"),
            (b.Contents("sections"),),
            look="contents",
            flows=bool(self.package.revisions),
        )

    def lists(self) -> b.Part:
        return b.Part(
            "lists",
            self.words("Figures and tables"),
            (b.Contents("figures"), b.Contents("tables")),
            look="contents",
            flows=True,
        )

    def summary(self, calculations: list[b.Part]) -> b.Part:
        w, summary = self.words, self.package.summary
        blocks: list[b.Block] = []
        for label, text in (("Question", summary.question), ("Answer", summary.answer)):
            if text:
                blocks += [b.Heading(2, b.line(w(label))), b.Paragraph(self.prose(text, f"summary, {label.lower()}"))]
        if self.package.requirements:
            blocks += [b.Heading(2, b.line(w("Verdicts"))), self.verdicts()]
        if summary.margins:
            rows = tuple(tuple(b.line(cell) for cell in row) for row in summary.margins)
            table = b.Table(self.heads("What", "Value", "Where"), rows, "lrl", widths=(4, 2, 4))
            blocks += [b.Heading(2, b.line(w("Worst margins"))), table]
        picture = self.picture(calculations)
        return b.Part("summary", w("Summary"), (*blocks, *picture), number=self.numbered())

    def verdicts(self) -> b.Table:
        rows = []
        for row in self.package.requirements:
            if row.counts:
                name = b.Link(f"req/{row.id}", (b.Marked("strong", b.line(row.id)),))
                rows.append(((name,), b.line(row.asks), b.line(row.result or "–"), verdict_line(row, self.words)))
        heads = self.heads("Requirement", "Asked for", "Result", "Verdict")
        return b.Table(heads, tuple(rows), "llll", widths=(1.6, 5, 2.4, 2.2))

    def picture(self, calculations: list[b.Part]) -> list[b.Block]:
        """The figure the summary names, shown again without a number of its own."""
        wanted = self.package.summary.figure
        if wanted is None:
            return []
        anchor = f"{wanted.calculation}/{wanted.item}"
        for part in calculations:
            for block in part.blocks:
                if isinstance(block, b.Figure) and block.anchor == anchor:
                    label = self.registry.labels[anchor]
                    note = b.line(f" ({self.words('repeated from')} ")
                    caption = (*block.caption, *note, b.Link(anchor, b.line(label)), *b.line(")"))
                    return [replace(block, anchor="", number="", caption=caption)]
        cause = f"the summary shows {anchor}, which is nowhere in the package"
        self.registry.faults.append(Fault(cause, "name a figure of a calculation", Place(key="summary")))
        return []

    # -- middle ------------------------------------------------------------------------------------------
    def requirements(self) -> b.Part | None:
        if not self.package.requirements:
            return None
        seen: set[str] = set()
        rows, anchors, classes = [], [], []
        for row in self.package.requirements:
            rows.append(self.matrix_row(row, first=row.id not in seen))
            anchors.append("" if row.id in seen else f"req/{row.id}")
            classes.append(ROW_CLASS[row.verdict] + ("" if row.counts else " idle"))
            seen.add(row.id)
        table = b.Table(
            self.heads("Requirement", "Asked for", "Result", "Verdict", "Evidence", "Signature"),
            tuple(rows),
            "llllll",
            caption=b.line(self.words("Requirement matrix")),
            anchor="tbl/matrix",
            number="1",
            widths=(3.2, 2.4, 2.0, 2.25, 1.75, 1.5),
            row_anchors=tuple(anchors),
            row_classes=tuple(classes),
            look="matrix",
        )
        return b.Part("requirements", self.words("Requirements"), (table,), number=self.numbered())

    def matrix_row(self, row: RequirementRow, *, first: bool) -> tuple[b.Line, ...]:
        w = self.words
        name: list[b.Inline] = [b.Marked("id", (b.Marked("strong", b.line(row.id)),))]
        if row.source:
            name.append(b.Marked("quiet", b.line(f"  {row.source}")))
        if first:
            name += [b.Break(), *b.line(row.text)]
        if row.candidate:
            chosen = f" ({w('chosen')})" if row.counts else ""
            name += [b.Break(), b.Marked("emph", b.line(f"{w('Candidate')}: {row.candidate}{chosen}"))]
        asks: list[b.Inline] = list(b.line(row.asks))
        if row.basis_asked:
            asks += [b.Break(), b.Marked("quiet", b.line(f"{w('Basis')}: {row.basis_asked}"))]
        result: list[b.Inline] = [b.Marked("value", b.line(row.result or "–"))]
        if row.basis:
            result += [b.Break(), b.Marked("quiet", b.line(row.basis))]
        if row.why:
            result += [b.Break(), b.Marked("quiet", b.line(row.why))]
        signature = b.line(w.known(row.signature))
        return (tuple(name), tuple(asks), tuple(result), verdict_line(row, w), self.links(row.evidence), signature)

    def decisions(self) -> b.Part | None:
        if not self.package.decisions:
            return None
        w, blocks = self.words, list[b.Block]()
        for decision in self.package.decisions:
            blocks.append(b.Heading(2, b.line(f"{decision.id}: {decision.question}"), f"dec/{decision.id}"))
            rows: list[tuple[str, b.Line]] = [
                (w("Chosen"), (b.Marked("strong", b.line(decision.chosen)),)),
                (w("Because"), self.prose(decision.because, decision.id)),
                (w("Rests on"), self.links(decision.rests_on)),
            ]
            blocks.append(b.Grid(tuple(rows)))
            if decision.alternatives:
                blocks.append(self.alternatives(decision.alternatives))
        return b.Part("decisions", w("Decisions"), tuple(blocks), number=self.numbered(), flows=True)

    def alternatives(self, found: tuple) -> b.Table:
        rows = []
        for option in found:
            how = "strong" if option.chosen else "plain"
            name = (b.Marked(how, b.line(option.name)), *b.line(f" ({self.words('chosen')})" if option.chosen else ""))
            rows.append((name, b.line(option.verdicts), b.line(option.grounds)))
        return b.Table(self.heads("Candidate", "Verdicts", "Grounds"), tuple(rows), "lll", widths=(2, 3, 4))

    def standing(self) -> b.Part:
        """Assumptions still open, findings, deviations; "None." where there are none, so that none is missed."""
        w, p = self.words, self.package
        groups: tuple[tuple[str, tuple[str, ...], list[tuple[str, ...]], tuple[float, ...]], ...] = (
            (
                "Assumptions",
                ("Id", "Text", "State", "Owner"),
                [(a.id, a.text, w.known(a.status), a.owner) for a in p.assumptions],
                (1, 6, 1.2, 1.6),
            ),
            (
                "Findings",
                ("Id", "Against", "Text", "State", "Answer"),
                [(f.id, f.against, f.text, w.known(f.state), f.answer) for f in p.findings],
                (1.3, 1.3, 4, 0.9, 3) if any(f.answer for f in p.findings) else (1.3, 1.3, 6, 0.9, 1),
            ),
            (
                "Deviations",
                ("Id", "Requirement", "Reason", "Limits", "Expires", "Signed"),
                [(d.id, d.requirement, d.reason, d.limits, d.expires, w.known(d.signed)) for d in p.deviations],
                (1, 1.6, 3.2, 2, 1.5, 1.4),
            ),
        )
        blocks: list[b.Block] = []
        for title, heads, rows, widths in groups:
            blocks.append(b.Heading(2, b.line(w(title))))
            cells = tuple(tuple(b.line(cell) for cell in row) for row in rows)
            table = b.Table(self.heads(*heads), cells, "l" * len(heads), widths=widths)
            blocks.append(table if rows else b.Paragraph(b.line(w("None."))))
        title = w("Assumptions, findings and deviations")
        return b.Part("standing", title, tuple(blocks), number=self.numbered(), flows=True)

    # -- back --------------------------------------------------------------------------------------------
    def statements(self) -> list[b.Part]:
        """One part a statement, so that each begins a page and can be taken out."""
        return [self._statement(page, index) for index, page in enumerate(self.package.statements)]

    def _statement(self, page: StatementPage, index: int) -> b.Part:
        blocks: list[b.Block] = [b.Paragraph(self.prose(text, page.id)) for text in page.paragraphs]
        for place, (title, paragraphs) in enumerate(page.parts):
            if page.drawing and place == _DRAWN_BEFORE:
                blocks.append(_drawing(page))
            told = [self.prose(text, page.id) for text in paragraphs]
            if page.calculation and place == len(page.parts) - 1:  # in the last line, so that it takes no line more
                told[-1] = (*told[-1], *b.line(" "), *self._way(page.calculation))
            blocks.append(b.Callout("statement", title, tuple(b.Paragraph(line) for line in told)))
        if page.calculation and not page.parts:
            blocks.append(b.Paragraph(self._way(page.calculation)))
        anchor = f"statements-{index + 1}" if index else "statements"
        return b.Part(anchor, page.title, tuple(blocks), number=self.numbered())

    def _way(self, calculation: str) -> b.Line:
        return (*b.line(f"{self.words('Calculation')} "), b.Link(calculation, b.line(calculation)), *b.line("."))

    def changes(self) -> b.Part | None:
        if not self.package.changes:
            return None
        rows = tuple(tuple(b.line(x) for x in (c.what, c.before, c.after, c.effect)) for c in self.package.changes)
        table = b.Table(self.heads("What", "Before", "After", "Effect"), rows, "llll", widths=(3.8, 2.3, 2.3, 2.6))
        title = f"{self.words('Changes against revision')} {self.package.document.supersedes or '–'}"
        return b.Part("changes", title, (table,), number=self.numbered(), flows=bool(self.package.statements))

    def appendices(self) -> list[b.Part]:
        makers: tuple[Callable[[], b.Part | None], ...] = (
            self.inputs,
            self.code,
            self.environment,
            self.terms,
            self.map,
        )
        return [part for part in (make() for make in makers) if part is not None]

    def inputs(self) -> b.Part:
        w = self.words
        rows = []
        for found in self.package.inputs:
            name: list[b.Inline] = [*b.line(found.name), b.Break(), b.Marked("hash", b.line(found.sha256))]
            how: list[b.Inline] = [*b.line(found.summary), b.Break()] if found.summary else []
            how.append(b.Marked("quiet", b.line(w("held" if found.held else "not held"))))
            size = f"{found.size:,}".replace(",", "\u202f")
            rows.append((tuple(name), b.line(size), tuple(how), b.line(found.source)))
        blocks: list[b.Block] = []
        if rows:
            heads = self.heads("Input", "Bytes", "Read as", "Source")
            blocks.append(b.Table(heads, tuple(rows), "lrll", widths=(3.5, 1.6, 3, 2)))
        if self.package.spec_text:
            blocks += [b.Heading(2, b.line(w("Project spec"))), b.Code(self.package.spec_text.rstrip("\n"), "yaml")]
        if not blocks:
            blocks.append(b.Paragraph(b.line(w("None."))))
        return b.Part("inputs", w("Inputs as read"), tuple(blocks), number=self.lettered())

    def code(self) -> b.Part | None:
        """Code cells, for paper; in HTML they stand folded where they belong."""
        if not self.registry.code:
            return None
        blocks: list[b.Block] = []
        before = ""
        for calculation, cell, source in self.registry.code:
            if calculation != before:
                blocks.append(b.Heading(2, b.line(f"{self.words('Calculation')} {calculation}")))
            before = calculation
            blocks.append(b.Code(source, "python", title=f"{self.words('Cell')} {cell}"))
        return b.Part("code", self.words("Program code"), tuple(blocks), number=self.lettered(), look="paper")

    def environment(self) -> b.Part | None:
        attached = [sheet for sheet in self.package.sheets if sheet.body or sheet.notebook]
        if not self.package.environment and not attached:
            return None
        rows = tuple((b.line(name), b.line(version)) for name, version in self.package.environment)
        blocks: list[b.Block] = []
        if rows:
            blocks.append(b.Table(self.heads("Program", "Version"), rows, "ll", widths=(3, 7)))
        if attached:
            lines = []
            for sheet in attached:
                found = _attachment(sheet)
                digest = hashlib.sha256(found.data).hexdigest()
                lines.append((b.line(found.name), (b.Marked("hash", b.line(digest)),)))
            blocks.append(b.Heading(2, b.line(self.words("Attached to this file")), ""))
            heads = (b.line(self.words("Calculation")), b.line("SHA-256"))
            blocks.append(b.Table(heads, tuple(lines), "ll", widths=(3, 7)))
        return b.Part("environment", self.words("Environment and versions"), tuple(blocks), number=self.lettered())

    def terms(self) -> b.Part:
        rows = (*terms(self.words.language), *self.package.glossary)
        body = tuple(((b.Marked("strong", b.line(term)),), b.line(meaning)) for term, meaning in rows)
        table = b.Table(self.heads("Term", "Meaning"), body, "ll", widths=(2.4, 7.6))
        return b.Part("glossary", self.words("Glossary and notation"), (table,), number=self.lettered(), flows=True)

    def map(self) -> b.Part:
        language = self.words.language
        rows = tuple((b.line(what), b.line(where)) for what, where in usual_contents(language))
        table = b.Table(self.heads("Usual content", "Stands in"), rows, "ll", widths=(4, 6))
        title = self.words("Where the usual contents of a calculation stand")
        note = b.Paragraph(b.line(CONTENTS_NOTE[language]), "note")
        return b.Part("map", title, (table, note), number=self.lettered(), flows=True)


def _stepped(part: b.Part) -> b.Part:
    """Headings that never skip a level (a part opens level 1), as readers of structure expect."""
    before = 1

    def step(block: b.Block) -> b.Block:
        nonlocal before
        if not isinstance(block, b.Heading):
            return block
        before = min(block.level, before + 1)
        return replace(block, level=before)

    return replace(part, blocks=tuple(b.mapped(block, step) for block in part.blocks))


def _attachment(sheet: Sheet) -> b.Attachment:
    """The notebook body: as stored, or the untagged cells in canonical JSON."""
    data = sheet.body
    if data is None:
        cells = (sheet.notebook or {}).get("cells", ())
        kept = [cell for cell in cells if SHEET_TAG not in (cell.get("metadata") or {}).get("tags", ())]
        text = json.dumps({**(sheet.notebook or {}), "cells": kept}, sort_keys=True, ensure_ascii=False, indent=1)
        data = (text + "\n").encode("utf-8")
    return b.Attachment(f"{sheet.id}-{sheet.template}.ipynb", data, f"{sheet.id} {sheet.title}")


_DRAWN_BEFORE = 2  # the drawing follows the frames and the turns


def _drawing(page: StatementPage) -> b.Figure:
    """The drawing of a statement page, made safe like any picture."""
    content = clean_svg(visible_text(page.drawing))
    return b.Figure("image/svg+xml", content, page.drawing_alt, b.line(page.drawing_caption))
