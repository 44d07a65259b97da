"""Invented packages for the binding tests: small notebooks with every kind of output, sympy's included."""

from __future__ import annotations

import base64
import json
import struct
import zlib
from typing import Any

from trunnion.binding import package as p

MIME = p.ITEM_MIME
TINY_SVG = (
    '<?xml version="1.0" encoding="utf-8" standalone="no"?>\n'
    '<svg xmlns="http://www.w3.org/2000/svg" width="320pt" height="120pt" viewBox="0 0 320 120">'
    '<rect x="10" y="10" width="300" height="100" fill="none" stroke="#1d2429"/>'
    '<path d="M20 100 L110 40 L200 70 L300 20" fill="none" stroke="#1f4e79" stroke-width="2"/>'
    '<text x="30" y="30" style="font: 9px \'DejaVu Sans\'">lock margin, least 45.00°</text></svg>'
)


def tiny_png() -> str:
    """A two-by-one PNG, base64 coded."""

    def chunk(kind: bytes, data: bytes) -> bytes:
        return struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data))

    head = struct.pack(">IIBBBBB", 2, 1, 8, 0, 0, 0, 0)
    parts = [chunk(b"IHDR", head), chunk(b"IDAT", zlib.compress(b"\0\x20\xd0")), chunk(b"IEND", b"")]
    return base64.b64encode(b"\x89PNG\r\n\x1a\n" + b"".join(parts)).decode("ascii")


def markdown(source: str, *tags: str) -> dict[str, Any]:
    return {"cell_type": "markdown", "metadata": {"tags": list(tags)} if tags else {}, "source": source}


def code(source: str, *outputs: dict[str, Any], **metadata: Any) -> dict[str, Any]:
    return {
        "cell_type": "code",
        "execution_count": None,
        "metadata": metadata,
        "source": source,
        "outputs": list(outputs),
    }


def display(**data: Any) -> dict[str, Any]:
    return {"output_type": "display_data", "metadata": {}, "data": data}


def shown(media: str, content: Any) -> dict[str, Any]:
    return display(**{media: content})


def item(
    kind: str, identity: str | None = None, readable: dict[str, str] | None = None, **fields: Any
) -> dict[str, Any]:
    payload = {"schema": 1, "kind": kind, **({"id": identity} if identity else {}), **fields}
    return display(**{"text/plain": f"[{kind}]", **(readable or {}), MIME: payload})


def notebook(*cells: dict[str, Any]) -> dict[str, Any]:
    body = [{**cell, "id": f"c{index:02d}"} for index, cell in enumerate(cells)]
    kernel = {"kernelspec": {"name": "python3", "display_name": "Python 3", "language": "python"}}
    return {"cells": body, "metadata": kernel, "nbformat": 4, "nbformat_minor": 5}


def sympy_matrix() -> str:
    """What sympy prints for a product of three elementary rotations, in its own words."""
    import sympy as sp

    h, e, k = sp.symbols("psi theta phi")
    turn = sp.rot_axis3(-h) * sp.rot_axis2(-e) * sp.rot_axis1(-k)
    short = {sp.cos(h): "c_psi", sp.sin(h): "s_psi", sp.cos(e): "c_theta", sp.sin(e): "s_theta"}
    short |= {sp.cos(k): "c_phi", sp.sin(k): "s_phi"}
    names = {old: sp.Symbol(new) for old, new in short.items()}
    return f"$\\displaystyle {sp.latex(turn.subs(names))}$"


def result(identity: str, quantity: str, of: str, over: str, lo: float, **fields: Any) -> dict[str, Any]:
    base = {"quantity": quantity, "of": of, "over": over, "lo": lo, "hi": lo, "unit": "deg"}
    base |= {"basis": "certified bound", "attained": lo, "note": ""}
    base["witness"] = {"where": "heading 0 deg, elevation 25 deg, bank 45 deg"}
    return item("result", identity, **{**base, **fields})


def derivation(rows: int = 12, case: int = 0) -> dict[str, Any]:
    """A notebook with prose, formulas, a sympy matrix, a figure, tables, checks and results; no two cases alike."""
    table = [[f"{10 * i} deg", f"{90 - 7 * i + case:.2f}", f"{(i + case) / 7:.4f}"] for i in range(rows)]
    body = _derivation_cells(table)
    if case:
        text = json.dumps(body).replace("_{32}", f"_{{32,{case}}}").replace("phi", f"phi_{{{case}}}")
        body = json.loads(text.replace("lock margin", f"lock margin {case}").replace("three turns", f"{case} turns"))
    return body


def _derivation_cells(table: list[list[str]]) -> dict[str, Any]:
    return notebook(
        markdown("| | |\n|---|---|\n| number | SW |", p.SHEET_TAG),
        markdown(
            "# Margins of the wing-last convention\n\n## Purpose\n\n"
            "To state how near lock comes: $m(R) \\ge 20^\\circ$."
        ),
        code("from trunnion import sheet\nlimit = '20 deg'", injected_parameters=True),
        markdown("## Inputs"),
        code(
            "sheet.inputs()",
            item(
                "inputs",
                rows=[
                    {"name": "cruise", "value": "elevation −20 deg … 25 deg, bank ±45 deg", "source": "SYS 3.4"},
                    {"name": "hover", "value": "cone of 10 deg around up", "source": "SYS 3.2"},
                ],
            ),
            item("assumption", "AS-2", text="The wing does not bend by more than $0.2^\\circ$.", status="open"),
        ),
        markdown(
            '## Method\n\nThe product of the three turns is\n\n<a id="eq:product"></a>\n'
            "$$\\mathbf{R} = \\mathbf{R}_3(\\psi)\\,\\mathbf{R}_1(\\phi)\\,\\mathbf{R}_2(\\theta)$$\n\n"
            "and [the product](#eq:product) is read backwards in [](#eq:angles):\n\n"
            "- the middle angle from *one* entry,\n- the outer angles from **four**.\n\n"
            "> A triple is never compared with a triple.\n\n1. turn\n2. turn again\n"
        ),
        code("sp.Matrix(...)", shown("text/latex", sympy_matrix())),
        code(
            "sheet.equation()",
            item(
                "equation",
                "eq:angles",
                latex="\\begin{aligned}\\phi &= \\arcsin R_{32}\\\\ "
                "\\psi &= \\operatorname{atan2}(-R_{12}, R_{22})\\end{aligned}",
                caption="angles from the matrix",
            ),
            {"output_type": "stream", "name": "stdout", "text": "12 of 12 sequences\n"},
        ),
        code(
            "sheet.figure()",
            item(
                "figure",
                "fig:margin",
                {"image/svg+xml": TINY_SVG},
                caption="Least margin over the flight; the limit is $20^\\circ$",
                alt="A line that stays above the limit",
            ),
        ),
        markdown("## Calculation\n\nSee [the picture](#fig:margin) and [the table](#tbl:margins)."),
        code(
            "sheet.table()",
            item(
                "table",
                "tbl:margins",
                caption="Margin by elevation",
                headers=["elevation", "margin (deg)", "$\\sin$"],
                rows=table,
                align=["l", "r", "r"],
                notes=["Bounds are rounded down."],
            ),
            item("finding", "F-1", text="this box limits the wing to 1.73 deg; did you mean a cone?", against="cruise"),
        ),
        code(
            "sheet.check()",
            item(
                "check",
                "chk:scipy",
                what="least margin",
                ours=45.0,
                theirs=45.0 + 2e-12,
                difference=2e-12,
                tolerance=1e-9,
                unit="deg",
                library="scipy",
                agrees=True,
            ),
        ),
        markdown("## Results"),
        code(
            "sheet.record()",
            result("res:hover", "lock margin", "wing-last", "hover", 80.0),
            result("res:transition", "lock margin", "wing-last", "transition", 90.0),
            result("res:cruise", "lock margin", "wing-last", "cruise", 45.0),
        ),
        code("sheet.statement()", item("statement", "st:1", title="Convention", paragraphs=["Turn about $z$ first."])),
        code("plt.show()", shown("image/png", tiny_png())),
        markdown("## Limits of validity\n\nAttitude only; origins do not enter."),
    )


def failed_notebook() -> dict[str, Any]:
    broken = {"output_type": "error", "ename": "ValueError", "evalue": "no such column", "traceback": []}
    return notebook(markdown("# Mount check\n\n## Purpose\n\nTo check."), code("mount.check()", broken))


def requirements() -> tuple[p.RequirementRow, ...]:
    wing = p.Evidence("C01", "res:cruise")
    return (
        p.RequirementRow(
            "ATT-04",
            "Attitude angles handed to the controller stay clear of lock in every phase.",
            "lock margin at least 20 deg over hover, transition, cruise",
            p.Verdict.MEETS,
            source="SYS 3.2.1",
            candidate="wing-last",
            result="45.00° (cruise)",
            basis="certified bound",
            basis_asked="certified bound",
            evidence=(wing,),
        ),
        p.RequirementRow(
            "ATT-04",
            "Attitude angles handed to the controller stay clear of lock in every phase.",
            "lock margin at least 20 deg over hover, transition, cruise",
            p.Verdict.DOES_NOT_MEET,
            source="SYS 3.2.1",
            candidate="ordinary",
            counts=False,
            result="0.00° (hover)",
            basis="certified bound",
            evidence=(p.Evidence("C01", "res:hover"),),
            why="reached with the nose straight up",
        ),
        p.RequirementRow(
            "MNT-01",
            "The unit's own angles stay usable in hover.",
            "lock margin at least 60 deg over hover",
            p.Verdict.NOT_SHOWN,
            evidence=(p.Evidence("C02"),),
            why="calculation C02 failed",
            accepted="DV-1",
        ),
    )


def package(**changes: Any) -> p.PackageInput:
    """A complete small package; `changes` replace fields."""
    fields: dict[str, Any] = {
        "document": p.Document(
            "SW-ATT-010",
            "Attitude convention and singularity margins",
            "B",
            "2026-03-14",
            supersedes="A",
            classification="OPEN",
            subject="Sedgewing survey aircraft",
        ),
        "sheets": (
            p.Sheet(
                "C01",
                "Margins of the wing-last convention",
                "envelope-sweep",
                derivation(),
                key="ab" * 32,
                digest="cd" * 32,
                signatures=(p.Signature("prepared", "R. Sedge", "2026-03-14", p.SignatureState.SIGNED),),
            ),
            p.Sheet(
                "C02",
                "Mount check of the inertial unit",
                "sensor-mount-check",
                failed_notebook(),
                state=p.SheetState.FAILED,
                reason="cell 2: ValueError: no such column",
            ),
        ),
        "signatures": (p.Signature("prepared", "R. Sedge", "2026-03-14", p.SignatureState.SIGNED),),
        "requirements": requirements(),
        "decisions": (
            p.Decision(
                "D1",
                "Which convention is handed to the controller?",
                "wing-last",
                "its margin is $45^\\circ$ in the worst phase",
                (
                    p.Alternative("wing-last", "ATT-04 meets", "45.00° in cruise", chosen=True),
                    p.Alternative("ordinary", "ATT-04 does not meet", "0.00° in hover"),
                    p.Alternative("quaternion or matrix inside, angles for display only", "not judged"),
                ),
                (p.Evidence("C01", "res:cruise"),),
            ),
        ),
        "assumptions": (p.Assumption("AS-2", "The wing does not bend.", owner="R. Sedge"),),
        "findings": (p.Finding("F-1", "cruise", "this box limits the wing; did you mean a cone?"),),
        "deviations": (p.Deviation("DV-1", "MNT-01", "bench only", "until first flight", "2026-12-01"),),
        "revisions": (
            p.Revision("A", "2026-01-10", "first issue", "R. Sedge"),
            p.Revision("B", "2026-03-14", "cruise bank widened to 45 deg", "R. Sedge"),
        ),
        "inputs": (p.InputFile("data/transition.csv", "ef" * 32, 12345, "601 rows, 0 s … 12 s", "flight 7"),),
        "changes": (p.Change("envelope cruise", "bank ±30 deg", "bank ±45 deg", "C01: 60.00° → 45.00°"),),
        "statements": (
            p.StatementPage("wing-last", "Convention wing-last", ("Turn about down by $\\psi$, then …",), "C01"),
        ),
        "summary": p.Summary(
            "Does any phase come within $20^\\circ$ of lock?",
            "No, if the last turn is about the wing.",
            (("wing-last, cruise", "45.00°", "bank 45 deg"),),
            p.Evidence("C01", "fig:margin"),
        ),
        "environment": (("Python", "3.11.7"), ("numpy", "2.1.0")),
        "spec_text": "workbook: 1\ndocument: {number: SW-ATT-010}\n",
    }
    return p.PackageInput(**{**fields, **changes})


def large(calculations: int, rows: int = 60) -> p.PackageInput:
    """A package of many calculations, for growth in time."""
    sheets = tuple(
        p.Sheet(f"C{n:02d}", f"Margins of the wing-last convention, case {n}", "envelope-sweep", derivation(rows, n))
        for n in range(1, calculations + 1)
    )
    return package(sheets=sheets)


def one_cell(*cells: dict[str, Any]) -> p.PackageInput:
    """A package of one calculation made of these cells, nothing else in it."""
    sheet = p.Sheet("C01", "One", "envelope-sweep", notebook(*cells))
    document = p.Document("X-1", "One", "A", "2026-03-14")
    return p.PackageInput(document=document, sheets=(sheet,))


def as_bytes(body: dict[str, Any]) -> bytes:
    return (json.dumps(body, sort_keys=True) + "\n").encode("utf-8")
