"""Every page rendered: nothing in the margins but head and foot, nothing empty, no glyph missing."""

from __future__ import annotations

import subprocess
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from trunnion.binding import package as p
from trunnion.binding.bind import bind
from trunnion.binding.house import House

DPI = 60
MM = DPI / 25.4


def rendered(pdf: Path, folder: Path) -> list[np.ndarray]:
    """Every page as grey levels, 0 black to 255 white."""
    folder.mkdir()
    command = ["pdftoppm", "-r", str(DPI), "-gray", str(pdf), str(folder / "p")]
    subprocess.run(command, check=True, capture_output=True)
    pages = []
    for path in sorted(folder.glob("p-*.pgm")):
        data = path.read_bytes()
        magic, size, _depth, pixels = data.split(b"\n", 3)
        assert magic == b"P5"
        width, height = map(int, size.split())
        pages.append(np.frombuffer(pixels, np.uint8).reshape(height, width))
    return pages


def require_clean_margins(pages: list[np.ndarray]) -> None:
    """Ink only inside the text width (25 mm margins), between the head line and the foot line."""
    for number, page in enumerate(pages, start=1):
        ink = page < 200
        side = int(24 * MM)
        assert not ink[:, :side].any(), f"ink in the left margin of page {number}"
        assert not ink[:, -side:].any(), f"ink in the right margin of page {number}"
        assert not ink[: int(12 * MM)].any(), f"ink above the head of page {number}"
        assert not ink[-int(9 * MM) :].any(), f"ink below the foot of page {number}"
        gap = ink[-int(23 * MM) : -int(18.5 * MM)]
        assert not gap.any(), f"text runs into the foot of page {number}"
        body = ink[int(26 * MM) : -int(23 * MM)]
        assert body.any(), f"page {number} is empty"


def hard_to_fit(material) -> p.PackageInput:
    """Wide tables, long words, long code, tall and wide pictures, deep lists, a long title."""
    wide = [[f"{i}{j}.123456789" for j in range(14)] for i in range(70)]
    dotted = "scipy.spatial.transform.Rotation.from_matrix"
    words = [["a" * 120, "word " * 80, dotted, "−1.234567890·10⁻¹² deg/s"]] * 4
    svg = "image/svg+xml"
    size = 'width="320pt" height="120pt" viewBox="0 0 320 120"'
    tall = material.TINY_SVG.replace(size, 'viewBox="0 0 320 2400"')
    broad = material.TINY_SVG.replace(size, 'viewBox="0 0 9000 120"')
    heads = [f"column {j}" for j in range(14)]
    cells = (
        material.code(
            "y = '" + "x" * 300 + "'\nz = " + " + ".join(f"value_{i}" for i in range(80)),
            material.item("table", "tbl:a", headers=heads, rows=wide, caption="wide " * 40, align=["r"] * 14),
            material.item("table", "tbl:b", headers=list("abcd"), rows=words, caption="words", align=["l"] * 4),
            material.item("figure", "fig:a", {svg: tall}, caption="tall", alt="tall"),
            material.item("figure", "fig:b", {svg: broad}, caption="broad " * 60, alt="broad"),
            material.result("res:" + "r" * 80, "q " * 60, "o" * 50, "over " * 30, 1e-15, note="n" * 200),
            {"output_type": "stream", "name": "stdout", "text": "o" * 500 + "\n" + "p " * 400},
        ),
        material.markdown("- a\n  - b\n    - c\n      - d\n        - " + "deep " * 60 + "\n\n> " + "q" * 300),
    )
    base = material.one_cell(*cells)
    row = p.RequirementRow(
        "R" * 40,
        "t" * 150,
        "asks " * 40,
        p.Verdict.DOES_NOT_MEET,
        result="45.00° over " + "phase, " * 20,
        why="w" * 90,
        candidate="c" * 60,
        source="S" * 60,
        accepted="DV-" + "1" * 30,
        evidence=(p.Evidence("C01", "res:" + "r" * 80),),
    )
    return replace(
        base,
        document=replace(base.document, title="T" * 60 + " " + "title " * 9, number="N" * 40, classification="C" * 30),
        requirements=(row,),
        inputs=(p.InputFile("data/" + "f" * 120 + ".csv", "ab" * 32, 10**12, "s" * 90, "S" * 60),),
        deviations=tuple(p.Deviation(f"DV-{i}", "R" * 40, "reason " * 20, "l" * 60) for i in range(3)),
        spec_text="key: " + "v" * 400 + "\n" + "list: [" + ", ".join(map(str, range(200))) + "]\n",
    )


@pytest.mark.needs("pdftoppm")
@pytest.mark.parametrize(("paper", "language"), [("A4", "en"), ("Letter", "de")])
def test_margins_are_clean_on_every_page(material, tmp_path, paper, language):
    for name, package in (("usual", material.package()), ("hard", hard_to_fit(material))):
        report = bind(package, tmp_path / name, house=House(paper=paper, language=language))
        pages = rendered(report.pdf, tmp_path / f"{name}-pages")
        assert len(pages) == report.pages
        require_clean_margins(pages)


@pytest.mark.needs("pdftotext")
def test_long_tables_repeat_their_head_on_every_page(material, tmp_path):
    """A table of 200 rows: its head stands on each of its pages (read by poppler)."""
    rows = [[f"row {i}", f"{i}"] for i in range(200)]
    table = material.item(
        "table", "tbl:a", headers=["elevation head", "n"], rows=rows, caption="long", align=["l", "r"]
    )
    report = bind(material.one_cell(material.code("x", table)), tmp_path)
    done = subprocess.run(["pdftotext", "-layout", str(report.pdf), "-"], capture_output=True, text=True, check=True)
    pages = [page for page in done.stdout.split("\f") if "row " in page]
    assert len(pages) >= 3
    assert all("elevation head" in page for page in pages)


@pytest.mark.needs("pdftotext")
def test_head_and_foot_of_every_page(material, tmp_path):
    """Document number, revision, date, sheet x of y, signature state; the calculation on its own pages."""
    report = bind(material.package(), tmp_path)
    done = subprocess.run(["pdftotext", "-layout", str(report.pdf), "-"], capture_output=True, text=True, check=True)
    pages = done.stdout.rstrip("\f").split("\f")
    for number, page in enumerate(pages, start=1):
        assert "SW-ATT-010 · Rev. B · 2026-03-14" in page
        assert f"Sheet {number} of {len(pages)}" in page
        assert "signed" in page
        assert "OPEN" in page
    heads = [page.strip().splitlines()[0].split()[-1] for page in pages]
    assert heads.count("C01") >= 2
    assert heads.count("C02") >= 1


@pytest.mark.needs("pdftotext")
def test_text_of_figures_can_be_searched(material, tmp_path):
    report = bind(material.package(), tmp_path)
    done = subprocess.run(["pdftotext", str(report.pdf), "-"], capture_output=True, text=True, check=True)
    assert "lock margin, least 45.00°" in done.stdout
    assert "■" not in done.stdout
