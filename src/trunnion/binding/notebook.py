"""Notebook JSON to neutral blocks: prose, items, and fallbacks for outputs that are no items."""

from __future__ import annotations

import base64
import binascii
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from trunnion.binding import blocks as b
from trunnion.binding.markdown import Refuse, read_line, read_markdown
from trunnion.binding.maths import FormulaError, read_formula
from trunnion.binding.numbers import number_text, quantity_text, result_value
from trunnion.binding.package import ITEM_MIME, SHEET_TAG
from trunnion.binding.words import Words
from trunnion.errors import Fault, Place
from trunnion.glyphs import visible_text

_CAPTIONED = {"fig": "figure", "tbl": "table", "eq": "equation"}


@dataclass
class NotebookReader:
    """Reads one notebook. `name` is what errors call it; faults and warnings are collected, not raised."""

    name: str
    strict: bool = True
    fixed: Words = field(default_factory=Words)
    faults: list[Fault] = field(default_factory=list)
    warnings: list[str] = field(default_factory=list)
    code: list[tuple[str, str]] = field(default_factory=list)  # (cell, source)
    cell: str = ""

    def read(self, notebook: Mapping[str, Any]) -> list[b.Block]:
        """All blocks of the notebook in order; cells tagged as sheet are the binder's own business."""
        out: list[b.Block] = []
        for index, cell in enumerate(notebook.get("cells", ()), start=1):
            if SHEET_TAG in (cell.get("metadata") or {}).get("tags", ()):
                continue
            self.cell = f"cell {index}" + (f" ({cell['id']})" if cell.get("id") else "")
            source = _joined(cell.get("source", ""))
            if cell.get("cell_type") == "markdown":
                out += self.placed(read_markdown(source, self.refuse))
            elif cell.get("cell_type") == "code":
                out += self.code_cell(source, cell.get("outputs") or (), index)
        return out

    def placed(self, found: list[b.Block]) -> list[b.Block]:
        """Equations told which cell they come from, wherever they stand."""
        return [b.mapped(block, self._placed) for block in found]

    def _placed(self, block: b.Block) -> b.Block:
        return replace(block, cell=self.cell) if isinstance(block, b.Equation) else block

    def refuse(self, cause: str, remedy: str = "") -> None:
        """Hold a fault against the cell being read."""
        self.faults.append(Fault(cause, remedy, Place(self.name, key=self.cell)))

    def code_cell(self, source: str, outputs: Any, index: int) -> list[b.Block]:
        out: list[b.Block] = []
        if source.strip():
            self.code.append((f"{index}", source))
            out.append(b.Code(source, "python", title=f"{index}", folded=True))
        for output in outputs:
            out += self.output(output)
        return self.placed(out)

    def output(self, output: Mapping[str, Any]) -> list[b.Block]:
        kind = output.get("output_type")
        if kind == "stream":
            text = _joined(output.get("text", "")).rstrip()
            return [b.Code(_plain(text))] if text else []
        if kind == "error":
            words = f"{output.get('ename', 'Error')}: {output.get('evalue', '')}"
            return [b.Callout("failed", self.fixed("Failed"), (b.Paragraph(b.line(_plain(words))),))]
        data = output.get("data") or {}
        if ITEM_MIME in data:
            return self.item(data[ITEM_MIME], data)
        return self.plain_output(data)

    # -- outputs that are no items -----------------------------------------------------------------------
    def plain_output(self, data: Mapping[str, Any]) -> list[b.Block]:
        """The best printable form of an output that carries no item."""
        if "text/latex" in data:
            return self.latex(_joined(data["text/latex"]))
        for media in ("image/svg+xml", "image/png"):
            if media in data:
                words = f"{self.fixed('Picture of cell')} {self.cell.split()[1]}"
                return self.picture(media, data[media], words, b.line(words))
        if "text/markdown" in data:
            return read_markdown(_joined(data["text/markdown"]), self.refuse)
        if "text/plain" in data:
            text = _joined(data["text/plain"]).rstrip()
            return [b.Code(_plain(text))] if text else []
        if data:
            forms = ", ".join(sorted(data))
            cause = f"an output with no printable form (only {forms})"
            if self.strict:
                self.refuse(cause, "show it as text, a table item or a figure item")
            else:
                self.warnings.append(f"{self.name}: {self.cell}: {cause}; left out")
        return []

    def latex(self, text: str) -> list[b.Block]:
        """A text/latex output: one formula as a rule; otherwise words with formulas in them."""
        stripped = text.strip()
        try:
            whole = stripped.count("$") <= 2 or (stripped.startswith("$$") and stripped.count("$$") == 2)
            if not whole:
                return [b.Paragraph(read_line(stripped, self.refuse))]
            formula = read_formula(stripped)
        except FormulaError as error:
            self.refuse(f"formula {stripped!r}: {error}", error.remedy)
            return []
        return [b.Equation(formula, formula.label)]

    def picture(self, media: str, raw: Any, alt: str, caption: b.Line, anchor: str = "") -> list[b.Block]:
        try:
            content = clean_svg(visible_text(_joined(raw))) if media == "image/svg+xml" else _png(_joined(raw))
        except ValueError as error:
            self.refuse(f"{media}: {error}", "draw it with the figure functions")
            return []
        return [b.Figure(media, content, alt, caption, anchor)]

    # -- items -------------------------------------------------------------------------------------------
    def item(self, payload: Any, data: Mapping[str, Any]) -> list[b.Block]:
        if not isinstance(payload, Mapping) or payload.get("schema") != 1:
            self.refuse("an item that is not of schema 1", "run the calculation again with this version")
            return []
        reader = _ITEMS.get(str(payload.get("kind")))
        if reader is None:
            self.refuse(f"an item of the unknown kind {payload.get('kind')!r}")
            return []
        try:
            return reader(self, payload, data)
        except (KeyError, TypeError, AttributeError) as error:
            self.refuse(f"a malformed {payload.get('kind')} item ({type(error).__name__}: {error})")
            return []

    def words(self, value: Any) -> b.Line:
        """A cell or caption: text with `$…$`, or a value with its unit."""
        if isinstance(value, Mapping):
            return b.line(quantity_text(value.get("value", ""), str(value.get("unit", ""))))
        if isinstance(value, str):
            return read_line(value, self.refuse)
        return b.line("" if value is None else number_text(value))

    def equation(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        latex = _joined(item["latex"])
        try:
            formula = read_formula(latex)
        except FormulaError as error:
            self.refuse(f"{item.get('id', 'equation')}: formula {latex!r}: {error}", error.remedy)
            return []
        return [b.Equation(formula, str(item.get("id", "")), caption=self.words(item.get("caption") or ""))]

    def table(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        headers = tuple(self.words(cell) for cell in item["headers"])
        rows = tuple(tuple(self.words(cell) for cell in row) for row in item["rows"])
        if any(len(row) != len(headers) for row in rows):
            self.refuse(f"{item.get('id', 'table')}: a row with another number of cells than the head")
            return []
        align = "".join(str(a)[:1] for a in item.get("align") or ()) or "l" * len(headers)
        notes = item.get("notes") or ()
        notes = (notes,) if isinstance(notes, str) else notes
        return [
            b.Table(
                headers,
                rows,
                align,
                caption=self.words(item.get("caption") or ""),
                anchor=str(item.get("id", "")),
                notes=tuple(self.words(note) for note in notes),
            )
        ]

    def figure(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        caption = self.words(item.get("caption") or "")
        alt = str(item.get("alt") or item.get("caption") or item["id"])
        for media in ("image/svg+xml", "image/png"):
            if media in data:
                return self.picture(media, data[media], alt, caption, str(item["id"]))
        self.refuse(f"{item['id']}: a figure item without its picture")
        return []

    def result(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        return [
            b.ResultRow(
                str(item["id"]),
                str(item.get("quantity", "")),
                str(item.get("of") or ""),
                _listed(item.get("over")),
                result_value(item),
                str(item.get("basis", "")),
                _witness_words(item),
            )
        ]

    def check(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        unit = str(item.get("unit") or "")

        def shown(key: str) -> str:
            return quantity_text(item.get(key), unit)

        return [
            b.CheckRow(
                str(item["id"]),
                str(item["what"]),
                shown("ours"),
                shown("theirs"),
                shown("difference"),
                shown("tolerance"),
                str(item.get("library", "")),
                bool(item["agrees"]),
            )
        ]

    def statement(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        body = tuple(b.Paragraph(self.words(text)) for text in item["paragraphs"])
        return [b.Callout("statement", str(item.get("title") or ""), body)]

    def inputs(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        rows = item["rows"]
        if not rows:
            return []
        if isinstance(rows[0], Mapping):
            keys = list(dict.fromkeys(key for row in rows for key in row))
            headers, cells = keys, [[row.get(key, "") for key in keys] for row in rows]
        else:
            headers, cells = item.get("headers") or ["input", "value", "source"], rows
        width = max(len(headers), *(len(row) for row in cells))
        headers = [*headers, *[""] * (width - len(headers))]
        body = tuple(tuple(self.words(c) for c in [*row, *[""] * (width - len(row))]) for row in cells)
        head = tuple(b.line(str(h)[:1].upper() + str(h)[1:]) for h in headers)
        caption = self.words(item.get("caption") or self.fixed("Inputs"))
        return [b.Table(head, body, "l" * width, caption, str(item.get("id", "")))]

    def finding(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        against = f" ({self.fixed('against')} {item['against']})" if item.get("against") else ""
        title = f"{self.fixed('Finding')} {item['id']}{against}"
        return [b.Callout("finding", title, (b.Paragraph(self.words(item["text"])),))]

    def assumption(self, item: Mapping[str, Any], data: Mapping[str, Any]) -> list[b.Block]:
        title = f"{self.fixed('Assumption')} {item['id']} ({self.fixed.known(item.get('status', 'open'))})"
        return [b.Callout("assumption", title, (b.Paragraph(self.words(item["text"])),))]


_Item = Callable[[NotebookReader, Mapping[str, Any], Mapping[str, Any]], list[b.Block]]
_ITEMS: dict[str, _Item] = {
    "equation": NotebookReader.equation,
    "table": NotebookReader.table,
    "figure": NotebookReader.figure,
    "result": NotebookReader.result,
    "check": NotebookReader.check,
    "statement": NotebookReader.statement,
    "inputs": NotebookReader.inputs,
    "finding": NotebookReader.finding,
    "assumption": NotebookReader.assumption,
}


def clean_svg(text: str) -> bytes:
    """An SVG that can only draw: no scripts, no foreign content, no link out of itself; `ValueError` otherwise."""
    if "<!ENTITY" in text:
        raise ValueError("entities are declared in it")
    body = re.sub(r"<\?xml[^>]*\?>|<!DOCTYPE[^>\[]*>", "", text).strip()
    if not body.startswith("<svg") and "<svg" not in body[:2000]:
        raise ValueError("it is no SVG")
    if match := re.search(r"<\s*(?:\w+:)?(script|foreignObject|iframe|animate\w*|set)\b", body, re.IGNORECASE):
        raise ValueError(f"it contains <{match.group(1)}>")
    if match := re.search(r"\son\w+\s*=", body):
        raise ValueError(f"it contains the handler {match.group().strip()}")
    for match in re.finditer(r"(?:href\s*=\s*[\"']?|url\(\s*[\"']?|@import\s*[\"']?)([^\"')\s>]*)", body):
        if not match.group(1).startswith(("#", "data:image/png;base64,")):
            raise ValueError(f"it refers to {match.group(1)!r}")
    return body.encode("utf-8")


def _png(text: str) -> bytes:
    try:
        content = base64.b64decode("".join(text.split()), validate=True)
    except binascii.Error as error:
        raise ValueError("it is no base64 text") from error
    if not content.startswith(b"\x89PNG\r\n\x1a\n"):
        raise ValueError("it is no PNG picture")
    return content


def _joined(value: Any) -> str:
    return "".join(value) if isinstance(value, list | tuple) else str(value)


def _plain(text: str) -> str:
    """Without terminal colour codes."""
    return re.sub(r"\x1b\[[0-9;]*[A-Za-z]", "", text)


def _listed(value: Any) -> str:
    return ", ".join(str(v) for v in value) if isinstance(value, list | tuple) else str(value or "")


def _witness_words(item: Mapping[str, Any]) -> str:
    witness = item.get("witness")
    parts = []
    if isinstance(witness, Mapping):
        if witness.get("where"):
            parts.append(str(witness["where"]))
        if isinstance(witness.get("time"), int | float):
            parts.append(f"t = {number_text(witness['time'])} s")
    if item.get("note"):
        parts.append(str(item["note"]))
    return re.sub(r"(?<![\w.])-(?=\d)", "−", "; ".join(parts))


__all__ = ["NotebookReader", "Refuse", "clean_svg"]
