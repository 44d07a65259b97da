"""Texts that would like to be markup: shown literally, nothing injected, nothing hidden."""

from __future__ import annotations

import re
from dataclasses import replace

import pikepdf
import pytest

from trunnion.binding import package as p
from trunnion.binding.bind import bind
from trunnion.binding.notebook import clean_svg
from trunnion.errors import BindingError

HOSTILE = (
    "<script>alert('x')</script>",
    "\"><img src=https://example.invalid/x onerror=alert(1)>",
    "#panic(\"typst\") #import \"/etc/passwd\" $ #read(\"x\") ] } ) \\ @ref <label>",
    "\\input{/etc/passwd} \\write18{x} ${jndi:x}",
    "![x](https://example.invalid/x.png) [y](javascript:alert(1)) **bold** `code` | a | b |",
    "]] --> <!-- </style></title></svg> &lt; &amp; &#0;",
    "שלום עליכם مرحبا abc",
    "emoji 🚀 漢字 \u202egnp.exe \u200b zero \x07 bell",
    "lines\u2028#panic(1)\u0085#panic(2)\x0b#panic(3)\r#panic(4)\u2029#panic(5)\n#panic(6)",
    "a" * 10_000,
    "word " * 2_000,
)  # fmt: skip


def everywhere(material, text: str) -> p.PackageInput:
    """A package with the text in every place that takes text."""
    quiet = text.replace("$", "")  # prose reads $…$ as mathematics; there it is not hostile but a formula
    cells = (
        material.code("x = 1  # " + text.replace("\n", " "), {"output_type": "stream", "name": "stdout", "text": text}),
        material.code(
            "y",
            material.item("table", "tbl:a", headers=[quiet, "b"], rows=[[quiet, "1"]], caption=quiet, align=["l", "r"]),
            material.item("assumption", "AS-1", text=quiet),
            material.item("statement", "st:1", title=text, paragraphs=[quiet]),
            material.item("figure", "fig:a", {"image/svg+xml": material.TINY_SVG}, caption=quiet, alt=text),
            material.result("res:a", text, text, text, 45.0, note=text),
            material.item(
                "check",
                "chk:a",
                what=text,
                ours=1.0,
                theirs=1.0,
                difference=0.0,
                tolerance=1.0,
                unit="",
                library=text,
                agrees=True,
            ),
            {"output_type": "error", "ename": text, "evalue": text, "traceback": []},
        ),
    )
    base = material.one_cell(*cells)
    row = p.RequirementRow("R-1", text, text, p.Verdict.MEETS, source=text, result=text, why=text)
    return replace(
        base,
        document=replace(base.document, title=text[:120].strip(), subject=text),
        sheets=(replace(base.sheets[0], title=text[:120].strip()),),
        requirements=(row,),
        decisions=(p.Decision("D1", text, text, quiet, (p.Alternative(text, text, text),)),),
        assumptions=(p.Assumption("AS-1", text),),
        revisions=(p.Revision("A", "2026-03-14", text, text),),
        inputs=(p.InputFile(text[:200], "ab" * 32, 1, text),),
        summary=p.Summary(quiet, quiet),
        spec_text=text,
        glossary=((text, text),),
    )


def shown_text(html: str) -> str:
    """The text of a page as a reader sees it, tags and styles removed, entities resolved."""
    from html import unescape

    body = html.split("</style>", 1)[1]
    return unescape(re.sub(r"<[^>]*>", "", body))


@pytest.mark.parametrize("index", range(len(HOSTILE)))
def test_html_shows_hostile_text_literally_and_runs_none_of_it(material, tmp_path, index):
    text = HOSTILE[index]
    report = bind(everywhere(material, text), tmp_path, pdf=False)
    html = report.html.read_text("utf-8")
    body = html.split("</style>", 1)[1]
    tags = re.findall(r"<([a-zA-Z]+)((?:[^>\"']|\"[^\"]*\"|'[^']*')*)>", body)
    assert not {name.lower() for name, _ in tags} & {"script", "iframe", "object", "embed", "link", "base", "form"}
    for _, attributes in tags:
        assert not re.search(r"\son\w+\s*=", re.sub(r"\"[^\"]*\"", '""', attributes))
        for url in re.findall(r"\b(?:src|href)=\"([^\"]*)\"", attributes):
            assert url.startswith(("#", "data:"))
    visible = max(re.split(r"[^\x20-\x7e]+", text), key=len)[:60].strip()
    assert visible in shown_text(html)


@pytest.mark.parametrize("index", range(len(HOSTILE)))
def test_pdf_shows_hostile_text_and_runs_none_of_it(material, tmp_path, index):
    report = bind(everywhere(material, HOSTILE[index]), tmp_path)
    assert report.pdf is not None
    with pikepdf.open(report.pdf) as pdf:
        assert "/JavaScript" not in str(pdf.Root.get("/Names", {}).keys())
        assert list(pdf.attachments) == ["C01-envelope-sweep.ipynb"]
        for page in pdf.pages:
            for annotation in page.get("/Annots", []):
                assert annotation.get("/A", {}).get("/S", "/GoTo") == "/GoTo"


def test_characters_without_glyphs_are_shown_by_number_and_counted(material, tmp_path):
    report = bind(everywhere(material, "漢 \u202e \x07"), tmp_path)
    assert set(report.missing_glyphs) == {"U+6F22", "U+202E", "U+0007"}
    assert all(count >= 10 for count in report.missing_glyphs.values())
    html = report.html.read_text("utf-8")
    assert "[U+6F22]" in html
    assert not any(char in html for char in "漢\u202e\x07")


@pytest.mark.parametrize(
    "svg",
    [
        "<svg xmlns='http://www.w3.org/2000/svg'><script>x</script></svg>",
        "<svg xmlns='http://www.w3.org/2000/svg' onload='x()'/>",
        "<svg xmlns='http://www.w3.org/2000/svg'><image href='https://example.invalid/a.png'/></svg>",
        "<svg xmlns='http://www.w3.org/2000/svg'><image xlink:href=\"file:///etc/passwd\"/></svg>",
        "<svg xmlns='http://www.w3.org/2000/svg'><style>@import 'https://example.invalid/a.css';</style></svg>",
        "<svg xmlns='http://www.w3.org/2000/svg'><rect style='fill:url(https://example.invalid/a)'/></svg>",
        "<svg xmlns='http://www.w3.org/2000/svg'><foreignObject/></svg>",
        "<!DOCTYPE svg [<!ENTITY a 'b'>]><svg>&a;</svg>",
        "<p>no picture</p>",
    ],
)
def test_pictures_that_do_more_than_draw_are_refused(material, tmp_path, svg):
    with pytest.raises(ValueError, match=r"\bit\b"):
        clean_svg(svg)
    output = material.item("figure", "fig:a", {"image/svg+xml": svg}, caption="x", alt="y")
    with pytest.raises(BindingError, match=r"cell 1 \(c00\): image/svg\+xml: "):
        bind(material.one_cell(material.code("x", output)), tmp_path, pdf=False)


def test_characters_of_figures_are_numbered_and_counted_too(material, tmp_path):
    """A picture drawn with a character no vendored font has, and one drawn with its number already."""
    for text in ("漢", "[U+6F22]"):
        svg = material.TINY_SVG.replace("lock margin", text)
        output = material.item("figure", "fig:a", {"image/svg+xml": svg}, caption="x", alt="y")
        report = bind(material.one_cell(material.code("x", output)), tmp_path)
        assert report.missing_glyphs == {"U+6F22": 1}
