"""Items: what a cell shows and, in the same output, the machine-readable record of it.

A cell output is one display bundle: a form for people (LaTeX, Markdown or SVG), a text fallback, and the
payload under `MIME`. Payloads are plain JSON; numbers are finite.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from trunnion.errors import CalculationError
from trunnion.sheet.rounding import interval_text, with_unit
from trunnion.units import LIMIT_SLACK_DEG

MIME = "application/vnd.trunnion.item+json"
SCHEMA = 1
BASES = ("exact", "certified bound", "sampled", "measured")


@dataclass(frozen=True)
class Item:
    """One thing to show: the payload (plain JSON) and its readable forms by MIME type."""

    payload: dict[str, Any]
    readable: dict[str, str]

    def bundle(self) -> dict[str, Any]:
        """The display bundle: readable forms and the payload."""
        return {**self.readable, MIME: self.payload}


def plain(value: Any, place: str = "") -> Any:
    """`value` as plain JSON; numpy scalars and arrays become numbers.

    Raises CalculationError, naming the field, for NaN, infinities and anything JSON does not know.
    """
    if value is None or isinstance(value, str | bool):
        return value
    if isinstance(value, Mapping):
        return {_key(key, place): plain(entry, f"{place}.{key}" if place else str(key)) for key, entry in value.items()}
    if isinstance(value, list | tuple):
        return [plain(entry, f"{place}[{index}]") for index, entry in enumerate(value)]
    if isinstance(value, int):
        return value
    if isinstance(value, float):
        if not math.isfinite(value):
            raise CalculationError(
                f"{place or 'a recorded number'} is {value}",
                remedy="record finite numbers only; leave out what is not known",
            )
        return float(value)
    if hasattr(value, "tolist"):  # numpy scalars and arrays
        return plain(value.tolist(), place)
    raise CalculationError(
        f"{place or 'a recorded value'} is a {type(value).__name__}, which JSON does not know",
        remedy="record text, numbers, lists and mappings",
    )


def _key(key: Any, place: str) -> str:
    if not isinstance(key, str):
        raise CalculationError(f"{place or 'a record'} has the key {key!r}", remedy="keys are text")
    return key


def _item(kind: str, identity: str | None, readable: Mapping[str, str], **fields: Any) -> Item:
    """Assemble an item; fields that are None are kept only where the kind defines them so."""
    head: dict[str, Any] = {"schema": SCHEMA, "kind": kind}
    if identity is not None:
        head["id"] = identity
    return Item(plain({**head, **fields}, kind if identity is None else identity), dict(readable))


def equation_item(identity: str, latex: str, caption: str = "") -> Item:
    """A displayed equation; `latex` without dollar signs, `identity` of the form `eq:…`."""
    readable = {"text/latex": f"$\\displaystyle {latex}$", "text/plain": f"[equation {identity}] {latex}"}
    return _item("equation", _prefixed(identity, "eq:"), readable, latex=latex, **_given(caption=caption))


def table_item(
    identity: str,
    headers: Sequence[str],
    rows: Sequence[Sequence[Any]],
    *,
    caption: str,
    align: Sequence[str] | str | None = None,
    notes: Sequence[str] = (),
) -> Item:
    """A table of already formatted cells (text, `$…$` allowed); `align` is one of l, r, c a column."""
    columns = list(align) if align is not None else ["l"] * len(headers)
    body = [[_cell(cell) for cell in row] for row in rows]
    _require_rectangle(identity, headers, body, columns)
    readable = {
        "text/markdown": _markdown_table(headers, body, columns, caption, notes),
        "text/plain": _text_table(headers, body, caption),
    }
    fields: dict[str, Any] = {"caption": caption, "headers": list(headers), "rows": body, "align": columns}
    return _item("table", _prefixed(identity, "tbl:"), readable, **fields, **_given(notes=list(notes)))


def figure_item(identity: str, svg: str, *, caption: str, alt: str) -> Item:
    """A picture as SVG text, with the caption and the words that stand for it where it can't be seen."""
    if "<svg" not in svg:
        raise CalculationError(f"{identity} is not an SVG picture", remedy="give the text of an SVG document")
    readable = {"image/svg+xml": svg, "text/plain": f"[figure {identity}] {alt}"}
    return _item("figure", _prefixed(identity, "fig:"), readable, caption=caption, alt=alt)


def statement_item(identity: str, paragraphs: Sequence[str] | str, *, title: str = "") -> Item:
    """Prose written by the library: plain text paragraphs with `$…$` mathematics."""
    texts = [paragraphs] if isinstance(paragraphs, str) else list(paragraphs)
    head = f"**{title}**\n\n" if title else ""
    readable = {
        "text/markdown": head + "\n\n".join(texts),
        "text/plain": "\n".join(([title] if title else []) + texts),
    }
    return _item("statement", identity, readable, title=title, paragraphs=texts)


def result_item(
    *,
    quantity: str,
    of: str,
    over: str | None,
    lo: float | None,
    hi: float | None,
    unit: str,
    basis: Any,
    attained: float | None = None,
    witness: Mapping[str, Any] | None = None,
    note: str = "",
    identity: str | None = None,
) -> Item:
    """One recorded quantity: the interval [lo, hi] that holds it, in `unit`, on `basis` (Basis or word).

    `attained` is a value really reached, in `unit`, and `witness` the attitude where (JSON: matrix, where,
    time).
    A bound that is not known is None; an interval with neither bound, or reversed, is refused.
    """
    basis_text = getattr(basis, "value", basis)
    name = identity or ":".join(part for part in ("res", quantity, of, over) if part)
    fields = {
        "quantity": quantity, "of": of, "over": over, "lo": lo, "hi": hi, "unit": unit, "basis": basis_text,
        "attained": attained, "witness": None if witness is None else dict(witness), "note": note,
    }  # fmt: skip
    whole = _item("result", name, {}, **fields)
    _require_interval(name, whole.payload)
    text = result_text(whole.payload)
    return Item(whole.payload, {"text/markdown": _safe(text), "text/plain": text})


def check_item(
    identity: str,
    what: str,
    *,
    ours: float,
    theirs: float,
    tolerance: float,
    unit: str,
    library: str,
    difference: float | None = None,
) -> Item:
    """The same quantity by an independent route: ours, theirs, the tolerance, and whether they agree.

    `agrees` is computed here and never passed; `difference` may be given where it is not |ours − theirs|
    (a rotation angle between two attitudes, say). NaN on either side never agrees and is refused.
    """
    gap = abs(float(ours) - float(theirs)) if difference is None else abs(float(difference))
    agrees = bool(gap <= float(tolerance))
    text = (
        f"{what}: ours {float(ours):.10g}, {library} {float(theirs):.10g}, difference {gap:.3g} {unit} "
        f"(allowed {float(tolerance):.3g} {unit}): {'agrees' if agrees else 'DOES NOT AGREE'}"
    )
    fields = {"what": what, "ours": ours, "theirs": theirs, "difference": gap, "tolerance": tolerance}
    readable = {"text/markdown": _safe(text), "text/plain": text}
    return _item("check", identity, readable, **fields, unit=unit, library=library, agrees=agrees)


def inputs_item(rows: Sequence[Mapping[str, Any]]) -> Item:
    """The inputs of a calculation: rows of {name, value, source, …}, all text."""
    headers = list(dict.fromkeys(key for row in rows for key in row))
    body = [[_cell(row.get(header, "")) for header in headers] for row in rows]
    readable = {
        "text/markdown": _markdown_table(headers, body, ["l"] * len(headers), "", ()),
        "text/plain": _text_table(headers, body, ""),
    }
    return _item("inputs", None, readable, rows=[dict(row) for row in rows])


def finding_item(identity: str, text: str, *, against: str) -> Item:
    """Something a check holds against a calculation, a requirement or an input."""
    line = f"Finding against {against}: {text}"
    readable = {"text/markdown": _safe(line), "text/plain": line}
    return _item("finding", identity, readable, text=text, against=against)


def assumption_item(identity: str, text: str, *, status: str = "open") -> Item:
    """A stated input, confirmed or still open."""
    line = f"Assumption {identity} ({status}): {text}"
    return _item("assumption", identity, {"text/markdown": _safe(line), "text/plain": line}, text=text, status=status)


def result_text(payload: Mapping[str, Any]) -> str:
    """A result payload in one line, bounds rounded towards the unsafe side."""
    over = f" over {payload['over']}" if payload.get("over") else ""
    interval = interval_text(payload["lo"], payload["hi"], payload["unit"])
    text = f"{payload['quantity']} of {payload['of']}{over}: {interval} ({payload['basis']})"
    if payload.get("attained") is not None:
        where = (payload.get("witness") or {}).get("where")
        reached = with_unit(f"{payload['attained']:.4f}".replace("-", "−"), payload["unit"])
        text += f"; reached {reached}" + (f" at {where}" if where else "")
    return f"{text}; {payload['note']}" if payload.get("note") else text


def _require_interval(name: str, payload: Mapping[str, Any]) -> None:
    lo, hi, attained = payload["lo"], payload["hi"], payload["attained"]
    if payload["basis"] not in BASES:
        raise CalculationError(f"{name}: basis '{payload['basis']}' is not one", remedy=f"one of {', '.join(BASES)}")
    if not isinstance(payload["unit"], str):
        raise CalculationError(f"{name}: a result needs its unit", remedy="for instance unit='deg'")
    if lo is None and hi is None and attained is None:
        raise CalculationError(f"{name}: neither bound nor attained value", remedy="give lo, hi or attained")
    if lo is not None and hi is not None and lo > hi:
        raise CalculationError(f"{name}: lower bound {lo} above upper bound {hi}", remedy="exchange lo and hi")
    if attained is None:
        return
    below = lo is not None and attained < lo - LIMIT_SLACK_DEG
    above = hi is not None and attained > hi + LIMIT_SLACK_DEG
    if below or above:
        raise CalculationError(
            f"{name}: the value reached, {attained}, contradicts its bounds {lo} and {hi}",
            remedy="a proven bound can't be passed: one of the two routes is wrong",
        )


def _prefixed(identity: str, prefix: str) -> str:
    if not identity.startswith(prefix) or len(identity) == len(prefix):
        raise CalculationError(f"'{identity}' is no id of this kind", remedy=f"write it as {prefix}name")
    return identity


def _given(**fields: Any) -> dict[str, Any]:
    return {name: value for name, value in fields.items() if value}


def _cell(cell: Any) -> str:
    return cell if isinstance(cell, str) else str(plain(cell))


def _require_rectangle(
    identity: str, headers: Sequence[str], rows: Sequence[Sequence[str]], align: Sequence[str]
) -> None:
    wrong = [index for index, row in enumerate(rows, 1) if len(row) != len(headers)]
    if wrong:
        raise CalculationError(f"{identity}: row {wrong[0]} has not the {len(headers)} cells of its heading")
    if len(align) != len(headers) or set(align) - {"l", "r", "c"}:
        raise CalculationError(f"{identity}: align needs {len(headers)} of l, r, c", remedy="for instance 'lrr'")


def _safe(text: str) -> str:
    """Text shown as Markdown: characters that would become markup are escaped, `$…$` stays mathematics."""
    return "".join(f"\\{sign}" if sign in "\\`*_<>[]#|" else sign for sign in text) if "$" not in text else text


def _markdown_table(
    headers: Sequence[str],
    rows: Sequence[Sequence[str]],
    align: Sequence[str],
    caption: str,
    notes: Sequence[str],
) -> str:
    rule = {"l": ":---", "r": "---:", "c": ":---:"}
    lines = [_markdown_row(headers), "|" + "|".join(rule[side] for side in align) + "|"]
    lines += [_markdown_row(row) for row in rows]
    before = f"*{caption}*\n\n" if caption else ""
    after = "".join(f"\n\n{note}" for note in notes)
    return before + "\n".join(lines) + after


def _markdown_row(cells: Sequence[str]) -> str:
    return "| " + " | ".join(cell.replace("|", "\\|").replace("\n", " ") for cell in cells) + " |"


def _text_table(headers: Sequence[str], rows: Sequence[Sequence[str]], caption: str) -> str:
    lines = [headers, *rows]
    widths = [max(len(line[column]) for line in lines) for column in range(len(headers))]
    text = ["  ".join(cell.ljust(width) for cell, width in zip(line, widths, strict=True)).rstrip() for line in lines]
    return "\n".join(([caption] if caption else []) + text)
