"""The PDF: structure, attachments, alternative texts, fonts, and the same bytes everywhere (read with pikepdf)."""

from __future__ import annotations

import hashlib
import os
import re
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import pikepdf
import pytest

from trunnion.binding import package as p
from trunnion.binding.bind import bind
from trunnion.binding.house import House
from trunnion.errors import BindingError


@pytest.fixture(scope="module")
def bound(material, tmp_path_factory):
    body = material.as_bytes(material.derivation())
    sheet = replace(material.package().sheets[0], body=body)
    package = material.package(sheets=(sheet, material.package().sheets[1]))
    return package, bind(package, tmp_path_factory.mktemp("pdf"))


@pytest.fixture(scope="module")
def pdf(bound):
    with pikepdf.open(bound[1].pdf) as opened:
        yield opened


def struct_elements(pdf: pikepdf.Pdf) -> list[pikepdf.Dictionary]:
    """All elements of the structure tree."""
    found, todo = [], [pdf.Root.StructTreeRoot]
    while todo:
        node = todo.pop()
        kids = node.get("/K", [])
        kids = kids if isinstance(kids, pikepdf.Array) else [kids]
        for kid in kids:
            if isinstance(kid, pikepdf.Dictionary) and "/S" in kid:
                found.append(kid)
                todo.append(kid)
    return found


def fonts(pdf: pikepdf.Pdf) -> dict[str, pikepdf.Dictionary]:
    """All fonts of all pages and of the pictures on them, by name."""
    found: dict[str, pikepdf.Dictionary] = {}

    def gather(resources: pikepdf.Dictionary) -> None:
        for font in resources.get("/Font", {}).values():
            found[str(font.BaseFont)] = font
        for form in resources.get("/XObject", {}).values():
            if "/Resources" in form:
                gather(form.Resources)

    for page in pdf.pages:
        gather(page.Resources)
    return found


def test_it_claims_both_standards_and_has_what_they_ask(pdf):
    """ISO 19005-3 (PDF/A-3a) and ISO 14289-1 (PDF/UA-1): claims, output intent, marks, language, file id."""
    xmp = bytes(pdf.Root.Metadata.read_bytes()).decode("utf-8")
    assert re.search(r"pdfaid:part>\s*3\s*<", xmp)
    assert re.search(r"pdfaid:conformance>\s*A\s*<", xmp)
    assert re.search(r"pdfuaid:part>\s*1\s*<", xmp)
    assert "/Filter" not in pdf.Root.Metadata
    assert pdf.Root.OutputIntents[0].S == "/GTS_PDFA1"
    assert "/DestOutputProfile" in pdf.Root.OutputIntents[0]
    assert pdf.Root.MarkInfo.Marked
    assert str(pdf.Root.Lang) == "en"
    assert pdf.Root.ViewerPreferences.DisplayDocTitle
    assert len(pdf.trailer.ID) == 2
    assert "/Encrypt" not in pdf.trailer
    assert "/AcroForm" not in pdf.Root
    assert "/OpenAction" not in pdf.Root


def test_metadata_say_what_document_it_is(pdf):
    xmp = bytes(pdf.Root.Metadata.read_bytes()).decode("utf-8")
    assert "SW-ATT-010 B: Attitude convention and singularity margins" in xmp
    assert "R. Sedge" in xmp
    assert "2026-03-14" in xmp


def test_every_font_is_embedded_and_ours(pdf):
    """No standard font, no system font, no last-resort font; every one can be searched and copied (ToUnicode)."""
    named = fonts(pdf)
    assert named
    ours = re.compile(r"/[A-Z]{6}\+(TrunnionSans|TrunnionMono|STIXTwoMath|DejaVuSans)\b")
    for name, font in named.items():
        assert ours.match(name), name
        descendant = font.DescendantFonts[0] if "/DescendantFonts" in font else font
        assert {"/FontFile2", "/FontFile3", "/FontFile"} & set(descendant.FontDescriptor.keys()), name
        assert "/ToUnicode" in font, name


def test_every_formula_and_figure_has_its_words(pdf, bound):
    elements = struct_elements(pdf)
    spoken = [str(e.get("/Alt", "")) for e in elements if e.S in ("/Formula", "/Figure")]
    assert len(spoken) > 8
    assert all(spoken)
    assert any("arcsin" in words for words in spoken)
    assert "A line that stays above the limit" in spoken


def test_tables_have_heads_and_headings_do_not_skip(pdf):
    elements = struct_elements(pdf)
    kinds = [str(e.S) for e in elements]
    assert kinds.count("/TH") > 20
    assert kinds.count("/Table") > 10
    assert "/H1" in kinds
    assert "/H2" in kinds
    assert "/TOC" in kinds


def test_notebook_bodies_come_out_bit_for_bit(pdf, bound):
    package, _ = bound
    attached = dict(pdf.attachments)
    assert set(attached) == {"C01-envelope-sweep.ipynb", "C02-sensor-mount-check.ipynb"}
    assert attached["C01-envelope-sweep.ipynb"].get_file().read_bytes() == package.sheets[0].body
    relations = {str(spec.F): str(spec.AFRelationship) for spec in pdf.Root.AF}
    assert set(relations.values()) == {"/Source"}
    subtypes = {str(spec.EF.F.Subtype) for spec in pdf.Root.AF}
    assert subtypes == {"/application/x-ipynb+json"}


def test_a_body_not_given_is_attached_without_its_sheet_cells(pdf):
    assert b"trunnion-sheet" not in pdf.attachments["C02-sensor-mount-check.ipynb"].get_file().read_bytes()


def test_bookmarks_lead_to_every_part(pdf):
    with pdf.open_outline() as outline:
        titles = [item.title for item in outline.root]
    assert any("Requirements" in title for title in titles)
    assert any("C01" in title and "wing-last" in title for title in titles)


def test_the_file_is_sound(pdf):
    """qpdf's own check of syntax, streams and cross references finds nothing."""
    assert pdf.check_pdf_syntax() == []


def test_pages_are_counted(pdf, bound):
    assert bound[1].pages == len(pdf.pages)


CHILD = """
import importlib.util, sys, pathlib
spec = importlib.util.spec_from_file_location("material", sys.argv[1])
material = importlib.util.module_from_spec(spec); spec.loader.exec_module(material)
from trunnion.binding.bind import bind
print(sorted(bind(material.package(), pathlib.Path(sys.argv[2])).digests.values()))
"""


def test_another_folder_time_zone_and_locale_give_the_same_bytes(tmp_path):
    """Three processes, three surroundings, one pair of digests."""
    seen = set()
    for name, surroundings in (
        ("a", {"TZ": "UTC", "LC_ALL": "C", "PYTHONHASHSEED": "1"}),
        (
            "deep/er folder",
            {"TZ": "Pacific/Kiritimati", "LC_ALL": "C.UTF-8", "LANG": "de_DE.UTF-8", "PYTHONHASHSEED": "2"},
        ),
        ("c", {"TZ": "America/St_Johns", "HOME": str(tmp_path), "PYTHONHASHSEED": "3", "SOURCE_DATE_EPOCH": "1"}),
    ):
        folder = tmp_path / name
        folder.mkdir(parents=True)
        command = [sys.executable, "-c", CHILD, str(Path(__file__).with_name("material.py")), str(folder)]
        done = subprocess.run(command, cwd=folder, env={**os.environ, **surroundings}, capture_output=True, text=True)
        assert done.returncode == 0, done.stderr
        seen.add(done.stdout)
        for made in ("package.html", "package.pdf"):
            assert hashlib.sha256((folder / made).read_bytes()).hexdigest() in done.stdout
    assert len(seen) == 1


def wide(columns: int) -> str:
    row = " & ".join(f"c_{{\\psi}} c_{{\\theta}} + s_{{{i}}}" for i in range(columns))
    return f"\\begin{{bmatrix}} {row} \\\\ {row} \\end{{bmatrix}}"


def test_a_formula_a_little_too_wide_is_made_smaller_and_reported(material, tmp_path):
    package = material.one_cell(material.code("x", material.item("equation", "eq:a", latex=wide(8))))
    report = bind(package, tmp_path)
    ((calculation, cell, factor),) = report.scaled
    assert (calculation, cell) == ("C01", "cell 1 (c00)")
    assert 0.7 <= factor < 1


def test_a_formula_far_too_wide_is_refused_with_its_cell(material, tmp_path):
    package = material.one_cell(material.code("x", material.item("equation", "eq:a", latex=wide(16))))
    with pytest.raises(BindingError, match=r"C01: cell 1 \(c00\): a formula would be printed at 0\.\d\d of its size"):
        bind(package, tmp_path)
    assert list(tmp_path.iterdir()) == []


def test_letter_paper_german_words_and_house_fields(material, tmp_path):
    house = House(organization="Sedge Werke", paper="Letter", language="de", fields=(("contract", "Vertrag"),))
    document = replace(material.package().document, extra={"contract": "V-7"})
    report = bind(material.package(document=document), tmp_path, house=house)
    html = report.html.read_text("utf-8")
    for words in (
        "Berechnungsdokument",
        "● erfüllt",
        "nicht gezeigt",
        "Vertrag",
        "V-7",
        "Sedge Werke",
        'lang="de"',
    ):
        assert words in re.sub(r"<span aria-hidden=\"true\">(.)</span>", r"\1", html)
    with pikepdf.open(report.pdf) as pdf:
        assert str(pdf.Root.Lang) == "de"
        assert [round(float(x)) for x in pdf.pages[0].MediaBox] == [0, 0, 612, 792]


def test_a_date_that_is_none_is_refused(material, tmp_path):
    document = p.Document("X-1", "One", "A", "14 March 2026")
    with pytest.raises(BindingError, match="the document date '14 March 2026'"):
        bind(p.PackageInput(document=document), tmp_path)


def test_hebrew_and_arabic_letters_are_really_printed(material, tmp_path):
    """The fallback face has them; poppler is not needed: the fonts of the page say so."""
    report = bind(material.one_cell(material.markdown("שלום מרחבا")), tmp_path)
    assert report.missing_glyphs == {}
    with pikepdf.open(report.pdf) as pdf:
        assert any("DejaVuSans" in name for name in fonts(pdf))
