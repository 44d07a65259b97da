"""One calculation of the package: its title block, what it addresses, its body, its signatures."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field, replace

from trunnion.binding import blocks as b
from trunnion.binding.notebook import NotebookReader
from trunnion.binding.package import PackageInput, RequirementRow, Sheet, SheetState, Signature, SignatureState
from trunnion.binding.words import Words
from trunnion.errors import Fault, Place

_DEEPEST = 4
TRADE = ("prepared", "checked", "approved")


@dataclass
class Registry:
    """Anchors of the whole package and how each is printed when referred to; code cells; what went wrong."""

    labels: dict[str, str] = field(default_factory=dict)
    code: list[tuple[str, str, str]] = field(default_factory=list)  # (calculation, cell, source)
    faults: list[Fault] = field(default_factory=list)
    warnings: list[str] = field(default_factory=list)

    def add(self, anchor: str, label: str, place: Place) -> None:
        """Register an anchor once; a second one of the same name is a fault."""
        if anchor in self.labels:
            remedy = "give every item of a notebook its own id"
            self.faults.append(Fault(f"the id {anchor!r} is used twice", remedy, place))
        self.labels[anchor] = label


def signature_words(signatures: tuple[Signature, ...], words: Words) -> str:
    """The signature state in one phrase, for the foot of a page."""
    wanted = dict.fromkeys([*TRADE, *(s.does for s in signatures)])
    good = [s.does for s in signatures if s.state is SignatureState.SIGNED]
    bad = [s for s in signatures if s.state in (SignatureState.STALE, SignatureState.INVALID)]
    if bad:
        return words.state(bad[0].state)
    if not good:
        return words("not signed")
    if set(good) == set(wanted):
        return words("signed")
    return f"{words('partly signed')} ({', '.join(words.known(does) for does in good)})"


def sign_off(signatures: tuple[Signature, ...], words: Words, anchor: str = "") -> b.SignOff:
    """The signature table; the three signatures of the trade are listed even when nobody has signed."""
    listed = list(signatures)
    for does in TRADE:
        if not any(s.does == does for s in listed):
            listed.append(Signature(does))
    rows = [(words.known(s.does), s.name, s.date, words.state(s.state), s.note) for s in listed]
    return b.SignOff(tuple(rows), anchor)


def calculation_part(sheet: Sheet, package: PackageInput, words: Words, registry: Registry, strict: bool) -> b.Part:
    """The part of one sheet; numbers, anchors, code and faults go to the registry."""
    name = f"{sheet.id}-{sheet.template}.ipynb"
    place = Place(name)
    registry.add(sheet.id, sheet.id, place)
    head: list[b.Block] = [_title_block(sheet, package, words)]
    if sheet.state is not SheetState.COMPUTED:
        failed = sheet.state is SheetState.FAILED
        title = words("This calculation failed" if failed else "This calculation is missing")
        head.append(b.Callout("failed", title, (b.Paragraph(b.line(sheet.reason or "–")),)))
    addressed = [row for row in package.requirements if any(e.calculation == sheet.id for e in row.evidence)]
    if addressed:
        head += [b.Heading(2, b.line(words("Requirements addressed"))), _addressed(addressed, words)]
    body: list[b.Block] = []
    if sheet.notebook is not None:
        reader = NotebookReader(name, strict, words)
        body = reader.read(sheet.notebook)
        registry.faults += reader.faults
        registry.warnings += reader.warnings
        registry.code += [(sheet.id, cell, source) for cell, source in reader.code]
    body = _without_echoes(_shifted(_gathered(body, words), sheet))
    numbered = _Numbering(sheet, package, words, registry, name).number(body)
    foot = [b.Heading(2, b.line(words("Sign-off"))), sign_off(sheet.signatures, words)]
    return b.Part(
        anchor=sheet.id,
        title=sheet.title,
        blocks=(*head, *numbered, *foot),
        number=sheet.id,
        calculation=sheet.id,
        state=signature_words(sheet.signatures, words),
    )


def _title_block(sheet: Sheet, package: PackageInput, words: Words) -> b.Grid:
    document = package.document
    number = sheet.number or f"{document.number}-{sheet.id}"
    template = sheet.template
    if sheet.local_template:
        template += f" ({words('local template, not shipped with the program')})"
    rows: list[tuple[str, b.Line]] = [
        (words("Number"), (b.Marked("id", b.line(number)),)),
        (words("Template"), b.line(template)),
        (words("Revision"), b.line(document.revision)),
        (words("Date"), b.line(document.date)),
        (words("State"), b.line(words.state(sheet.state))),
        (words("Signature"), b.line(signature_words(sheet.signatures, words))),
    ]
    rows += [(label, b.line(value)) for label, value in sheet.fields.items()]
    for label, value in (("Content key", sheet.key), ("Content digest", sheet.digest)):
        if value:
            rows.append((words(label), (b.Marked("hash", b.line(value)),)))
    return b.Grid(tuple(rows), columns=2)


def verdict_line(row: RequirementRow, words: Words) -> b.Line:
    """The badge of a row, with an acceptance beside it."""
    parts: list[b.Inline] = [b.Badge(row.verdict, quiet=not row.counts)]
    if row.accepted:
        parts += [b.Break(), *b.line(f"{words('accepted by')} {row.accepted}")]
    return tuple(parts)


def _addressed(rows: list[RequirementRow], words: Words) -> b.Table:
    heads = ("Requirement", "Asked for", "Result", "Verdict")
    body = []
    for row in rows:
        name: tuple[b.Inline, ...] = (b.Link(f"req/{row.id}", (b.Marked("strong", b.line(row.id)),)),)
        if row.candidate:
            name = (*name, *b.line(f" ({row.candidate})"))
        body.append((name, b.line(row.asks), b.line(row.result or "–"), verdict_line(row, words)))
    return b.Table(tuple(b.line(words(h)) for h in heads), tuple(body), "llll", widths=(2.7, 4, 2, 2.2))


# ---- gathering results and checks into tables --------------------------------------------------------------


def _gathered(found: list[b.Block], words: Words) -> list[b.Block]:
    """Neighbouring results become one table, neighbouring checks too; folded code between them comes first."""
    out: list[b.Block] = []
    run: list[b.Block] = []
    held: list[b.Block] = []
    for block in [*found, None]:
        if run and isinstance(block, type(run[0])):
            out += held
            held = []
            run.append(block)
        elif run and isinstance(block, b.Code) and block.folded:
            held.append(block)
        else:
            if run:
                out += [_RUNS[type(run[0])](run, words), *held]
                run, held = [], []
            if isinstance(block, b.ResultRow | b.CheckRow):
                run = [block]
            elif block is not None:
                out.append(block)
    return out


def _results_table(rows: list, words: Words) -> b.Table:
    heads = ["Quantity", "Of", "Over", "Value", "Basis", "Where"]
    keep = [True, any(r.of for r in rows), any(r.over for r in rows), True, True, any(r.where for r in rows)]
    body = []
    for row in rows:
        value: b.Line = (b.Marked("value", b.line(row.value.replace(" ", "\u00a0"))),)
        cells = [b.line(row.quantity), b.line(row.of), b.line(row.over), value, b.line(row.basis), b.line(row.where)]
        body.append(tuple(cell for cell, kept in zip(cells, keep, strict=True) if kept))
    return b.Table(
        tuple(b.line(words(h)) for h, kept in zip(heads, keep, strict=True) if kept),
        tuple(body),
        "".join("r" if h == "Value" else "l" for h, kept in zip(heads, keep, strict=True) if kept),
        caption=b.line(f"{words('Results')}: {_named(row.quantity for row in rows)}"),
        row_anchors=tuple(row.anchor for row in rows),
        look="results",
    )


def _named(names: Iterable[str], most: int = 3) -> str:
    """The different names, the first few of them."""
    different = [name for name in dict.fromkeys(names) if name]
    return ", ".join(different[:most]) + (", …" if len(different) > most else "")


def _checks_table(rows: list, words: Words) -> b.Table:
    heads = ("What", "Ours", "Independent", "Difference", "Tolerance", "Agreement")
    body = []
    for r in rows:
        verdict = words("agrees") if r.agrees else words("DOES NOT AGREE")
        mark: b.Line = (b.Marked("emph" if r.agrees else "strong", b.line(verdict)),)
        numbers = (b.line(r.ours), b.line(r.theirs), b.line(r.difference), b.line(r.tolerance))
        route = (b.Break(), b.Marked("quiet", b.line(r.library))) if r.library else ()
        body.append(((*b.line(r.what), *route), *numbers, mark))
    return b.Table(
        tuple(b.line(words(h)) for h in heads),
        tuple(body),
        "lrrrrl",
        caption=b.line(words("Independent check")),
        row_anchors=tuple(r.anchor for r in rows),
        row_classes=tuple("" if r.agrees else "v-fails" for r in rows),
        look="checks",
    )


_RUNS: dict[type, Callable[[list, Words], b.Table]] = {b.ResultRow: _results_table, b.CheckRow: _checks_table}


# ---- headings and numbers ----------------------------------------------------------------------------------


def _shifted(found: list[b.Block], sheet: Sheet) -> list[b.Block]:
    """Headings of the notebook below the part's own; a first heading that repeats the title is dropped, and so is
    the template's own title with nothing under it, where the calculation bears another one.
    """
    out = []
    for index, block in enumerate(found):
        if isinstance(block, b.Heading):
            same = plain(block.parts).strip().lower() == sheet.title.strip().lower()
            if index < 3 and block.level == 1 and (same or _nothing_under(found[index + 1 :])):
                continue
            block = replace(block, level=min(max(block.level, 2), _DEEPEST))
        out.append(block)
    return out


def _nothing_under(rest: list[b.Block]) -> bool:
    """Whether only folded code stands before the next heading."""
    for block in rest:
        if not (isinstance(block, b.Code) and block.folded):
            return isinstance(block, b.Heading)
    return False


def _without_echoes(found: list[b.Block]) -> list[b.Block]:
    """Formulas whose caption only repeats the title of the statement before them, without that caption."""
    out: list[b.Block] = []
    said = ""
    for block in found:
        if isinstance(block, b.Equation) and said and plain(block.caption).strip() == said:
            block = replace(block, caption=())
        if not (isinstance(block, b.Code) and block.folded):
            said = block.title.strip() if isinstance(block, b.Callout) else ""
        out.append(block)
    return out


class _Numbering:
    """Gives equations, figures and tables of one calculation their numbers and anchors."""

    def __init__(self, sheet: Sheet, package: PackageInput, words: Words, registry: Registry, name: str) -> None:
        self.sheet, self.words, self.registry, self.name = sheet, words, registry, name
        self.counts = {"Eq.": 0, "Figure": 0, "Table": 0}
        self.supports: dict[str, list[str]] = {}
        for row in package.requirements:
            for evidence in row.evidence:
                if evidence.calculation == sheet.id and evidence.item:
                    known = self.supports.setdefault(evidence.item, [])
                    if row.id not in known:
                        known.append(row.id)

    def number(self, found: list[b.Block]) -> list[b.Block]:
        return [b.mapped(block, self.one) for block in found]

    def next(self, kind: str) -> str:
        self.counts[kind] += 1
        return f"{self.sheet.id}.{self.counts[kind]}"

    def anchored(self, item: str, label: str, cell: str = "") -> str:
        if not item:
            return ""
        anchor = f"{self.sheet.id}/{item}"
        self.registry.add(anchor, label, Place(self.name, key=cell))
        return anchor

    def one(self, block: b.Block) -> b.Block:
        if isinstance(block, b.Equation):
            number = self.next("Eq.") if block.formula.numbered else ""
            label = f"{self.words('Eq.')} {number}"
            anchor = self.anchored(block.anchor, label, block.cell)
            return replace(block, number=number, anchor=anchor, calculation=self.sheet.id)
        if isinstance(block, b.Figure):
            number = self.next("Figure")
            return replace(block, number=number, anchor=self.anchored(block.anchor, f"{self.words('Figure')} {number}"))
        if isinstance(block, b.Table) and (block.caption or block.anchor):
            number = self.next("Table")
            label = f"{self.words('Table')} {number}"
            block = replace(block, number=number, anchor=self.anchored(block.anchor, label))
            return self.evidence(block, label) if block.row_anchors else block
        return block

    def evidence(self, table: b.Table, label: str) -> b.Table:
        """Rows that requirements rest on get a column with the way back to them."""
        anchors = tuple(self.anchored(item, label) for item in table.row_anchors)
        backs = [self.supports.get(item, []) for item in table.row_anchors]
        table = replace(table, row_anchors=anchors)
        if not any(backs):
            return table
        rows = []
        for row, ids in zip(table.rows, backs, strict=True):
            links: list[b.Inline] = []
            for index, name in enumerate(ids):
                links += [*b.line(", " if index else ""), b.Link(f"req/{name}", b.line(f"↑ {name}"))]
            rows.append((*row, tuple(links)))
        return replace(
            table,
            headers=(*table.headers, b.line(self.words("Requirement"))),
            rows=tuple(rows),
            align=table.align + "l",
            widths=(*table.widths, 2) if table.widths else (),
        )


def unlinked(parts: b.Line) -> b.Line:
    """A line without its links (for lists whose entries are links themselves)."""
    out: list[b.Inline] = []
    for part in parts:
        out += unlinked(part.parts) if isinstance(part, b.Link) else [part]
    return tuple(out)


def plain(parts: b.Line) -> str:
    """The words of a line, formulas as their source."""
    out = []
    for part in parts:
        if isinstance(part, b.Text):
            out.append(part.text)
        elif isinstance(part, b.InlineMath):
            out.append(part.formula.latex)
        elif isinstance(part, b.Marked | b.Link):
            out.append(plain(part.parts))
        elif isinstance(part, b.Break):
            out.append("\n")
        elif isinstance(part, b.Badge):
            out.append("●\u00a0" + part.verdict.value.replace(" ", "\u00a0"))
    return "".join(out)
