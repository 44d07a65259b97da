"""A comparison as one self-contained HTML page: no script, no network, changed figures side by side."""

from __future__ import annotations

import base64
from collections.abc import Iterable, Sequence
from html import escape
from pathlib import Path

from trunnion.calculations.baselines import RESULTS, read_json
from trunnion.calculations.compare import Comparison, change_rows
from trunnion.calculations.notebooks import joined, read_notebook
from trunnion.errors import StoreError
from trunnion.sheet.items import MIME

_POLICY = "default-src 'none'; style-src 'unsafe-inline'; img-src data:"
_STYLE = """
body { font: 16px/1.45 sans-serif; margin: 2rem auto; max-width: 72rem; padding: 0 1rem; color: #1b1b1b }
table { border-collapse: collapse; width: 100%; margin: 1rem 0 2rem }
th, td { text-align: left; vertical-align: top; padding: .3rem .8rem .3rem 0; border-bottom: 1px solid #d0d0d0 }
td:nth-child(2), td:nth-child(3) { font-variant-numeric: tabular-nums }
.pair { display: grid; grid-template-columns: 1fr 1fr; gap: 1rem; margin-bottom: 2rem }
.pair img { width: 100%; border: 1px solid #d0d0d0 }
"""


def page(comparison: Comparison, old: Path, new: Path) -> str:
    """The page; `old` and `new` are the folders whose sheets hold the figures, where they are held at all."""
    title = f"{comparison.old} → {comparison.new}"
    rows = change_rows(comparison)
    body = [f"<h1>{escape(title)}</h1>"]
    if comparison.same:
        body.append("<p>Nothing differs.</p>")
    body.append(_table(("what", "before", "after", "effect"), rows))
    if comparison.figures:
        body.append("<h2>Changed figures</h2>")
        before, after = _figures(old), _figures(new)
        for pair in comparison.figures:
            pictures = "".join(_picture(side.get(pair.what), name) for side, name in ((before, "old"), (after, "new")))
            body.append(f"<h3>{escape(pair.what)}</h3><div class='pair'>{pictures}</div>")
    return (
        "<!doctype html>\n<html lang='en'><head><meta charset='utf-8'>"
        f"<meta http-equiv='Content-Security-Policy' content=\"{_POLICY}\">"
        f"<title>{escape(title)}</title><style>{_STYLE}</style></head><body>{''.join(body)}</body></html>\n"
    )


def _table(headings: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    lines = ["".join(f"<td>{escape(cell)}</td>" for cell in row) for row in rows]
    if not lines:
        return ""
    head = "".join(f"<th>{escape(heading)}</th>" for heading in headings)
    return (
        f"<table><thead><tr>{head}</tr></thead><tbody>{''.join(f'<tr>{line}</tr>' for line in lines)}</tbody></table>"
    )


def _picture(svg: str | None, name: str) -> str:
    if svg is None:
        return f"<p>{name}: not held here</p>"
    data = base64.b64encode(svg.encode("utf-8")).decode("ascii")
    return f"<figure><img alt='{name}' src='data:image/svg+xml;base64,{data}'><figcaption>{name}</figcaption></figure>"


def _figures(folder: Path) -> dict[str, str]:
    """Figures of the sheets in a folder as SVG text, by `calculation figure`; none where sheets are not held."""
    found = {}
    for entry in read_json(folder / RESULTS).get("calculations", []):
        try:
            notebook = read_notebook(folder / f"{entry['id']}-{entry['template']}.ipynb")
        except StoreError:
            continue
        for cell in notebook["cells"]:
            for output in cell.get("outputs", []):
                payload = output.get("data", {}).get(MIME)
                if isinstance(payload, dict) and payload.get("kind") == "figure":
                    found[f"{entry['id']} {payload['id']}"] = joined(output["data"].get("image/svg+xml", ""))
    return found
