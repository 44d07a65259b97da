"""What a body records, read back with json: results, checks, findings, assumptions, statements."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from trunnion.attitude.basis import Basis
from trunnion.calculations.digest import sha256
from trunnion.calculations.notebooks import is_notebook, items, joined
from trunnion.calculations.verdicts import Bounds
from trunnion.errors import StoreError
from trunnion.sheet.items import MIME

_NEEDED = {
    "check": ("id", "agrees"),
    "finding": ("id", "text", "against"),
    "assumption": ("id", "text"),
    "figure": ("id",),
    "statement": ("paragraphs",),
    "inputs": ("rows",),
}


@dataclass(frozen=True)
class Result:
    """One recorded quantity of one calculation."""

    calculation: str
    id: str
    quantity: str
    of: str
    over: str | None
    bounds: Bounds
    unit: str
    witness: Mapping[str, Any] | None = None
    note: str = ""

    @property
    def place(self) -> str:
        """Where it stands, for messages: `C02, res:lock margin:wing-last:hover`."""
        return f"{self.calculation}, {self.id}"

    def plain(self) -> dict[str, Any]:
        """The result as `results.json` has it."""
        return {
            "id": self.id,
            "quantity": self.quantity,
            "of": self.of,
            "over": self.over,
            "lo": self.bounds.lo,
            "hi": self.bounds.hi,
            "attained": self.bounds.attained,
            "basis": self.bounds.basis.value,
            "unit": self.unit,
            "witness": self.witness,
            "note": self.note,
        }


@dataclass(frozen=True)
class Recorded:
    """Everything one body records."""

    calculation: str
    results: tuple[Result, ...] = ()
    checks: tuple[Mapping[str, Any], ...] = ()
    findings: tuple[Mapping[str, Any], ...] = ()
    assumptions: tuple[Mapping[str, Any], ...] = ()
    inputs: tuple[Mapping[str, Any], ...] = ()
    statements: tuple[Mapping[str, Any], ...] = ()
    figures: tuple[Mapping[str, str], ...] = ()

    @property
    def failed_checks(self) -> list[str]:
        """Ids of independent checks that do not agree."""
        return [str(check.get("id")) for check in self.checks if check.get("agrees") is not True]


def recorded(calculation: str, body: Mapping[str, Any]) -> Recorded:
    """Collect the items of a body; StoreError for two results under one id or a payload that is none."""
    if not is_notebook(body):
        raise StoreError(f"the body of {calculation} is no notebook", remedy="compute it again")
    kinds: dict[str, list[dict[str, Any]]] = {}
    for payload, _ in items(body):
        kind = str(payload.get("kind"))
        lacking = [name for name in _NEEDED.get(kind, ()) if name not in payload]
        if lacking or (kind == "inputs" and not isinstance(payload["rows"], list)):
            raise StoreError(
                f"{calculation} records a {kind} without its {', '.join(lacking) or 'rows'}",
                remedy="record with the functions of trunnion.sheet",
            )
        kinds.setdefault(kind, []).append(payload)
    results = tuple(result_from_plain(calculation, payload) for payload in kinds.get("result", []))
    _require_different_ids(calculation, results)
    return Recorded(
        calculation=calculation,
        results=results,
        checks=tuple(_without_head(payload) for payload in kinds.get("check", [])),
        findings=tuple(_without_head(payload) for payload in kinds.get("finding", [])),
        assumptions=tuple(_without_head(payload) for payload in kinds.get("assumption", [])),
        inputs=tuple(row for payload in kinds.get("inputs", []) for row in payload["rows"]),
        statements=tuple(_without_head(payload) for payload in kinds.get("statement", [])),
        figures=tuple(_figures(body)),
    )


def result_from_plain(calculation: str, payload: Mapping[str, Any]) -> Result:
    """A result from its payload or from `results.json`; StoreError names what is missing."""
    try:
        lo, hi, attained = (_number(payload[name]) for name in ("lo", "hi", "attained"))
        return Result(
            calculation=calculation,
            id=_text(payload["id"]),
            quantity=_text(payload["quantity"]),
            of=_text(payload["of"]),
            over=None if payload["over"] is None else _text(payload["over"]),
            bounds=Bounds(lo, hi, attained, Basis(_text(payload["basis"]))),
            unit=_text(payload["unit"]),
            witness=payload.get("witness"),
            note=str(payload.get("note", "")),
        )
    except (KeyError, ValueError, OverflowError) as err:
        raise StoreError(
            f"{calculation} records a result that is none ({type(err).__name__}: {err})",
            remedy="record results with sheet.record(…)",
        ) from err


def _text(value: Any) -> str:
    if not isinstance(value, str):
        raise ValueError(f"{value!r:.40} is no text")
    return value


def _number(value: Any) -> float | None:
    if value is None:
        return None
    if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
        raise ValueError(f"{value!r:.40} is no finite number")
    return float(value)


def select(results: Iterable[Result], *, quantity: str, of: str, over: str | None) -> list[Result]:
    """The results a requirement names: by quantity, whose it is, and where; `over` None leaves the place open."""
    return [
        result for result in results if result.quantity == quantity and result.of == of and over in (None, result.over)
    ]


def _figures(body: Mapping[str, Any]) -> Iterator[dict[str, str]]:
    """Figures by id, caption and the SHA-256 of their SVG text."""
    for cell in body["cells"]:
        for output in cell.get("outputs", []):
            data = output.get("data", {})
            payload = data.get(MIME)
            if isinstance(payload, dict) and payload.get("kind") == "figure":
                svg = joined(data.get("image/svg+xml", ""))
                yield {
                    "id": str(payload["id"]),
                    "caption": str(payload.get("caption", "")),
                    "sha256": sha256(svg.encode("utf-8", "replace")),
                }


def _without_head(payload: Mapping[str, Any]) -> dict[str, Any]:
    return {name: value for name, value in payload.items() if name not in ("schema", "kind")}


def _require_different_ids(calculation: str, results: tuple[Result, ...]) -> None:
    seen: set[str] = set()
    for result in results:
        if result.id in seen:
            raise StoreError(
                f"{calculation} records two results under the id '{result.id}'",
                remedy="give each result its own quantity, owner or region",
            )
        seen.add(result.id)
