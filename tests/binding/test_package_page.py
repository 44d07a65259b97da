"""What the package shows, in which order, and what it refuses, read from the HTML page and the neutral document."""

from __future__ import annotations

import itertools
import re
from dataclasses import replace
from html.parser import HTMLParser

import pytest

from trunnion.binding import package as p
from trunnion.binding.bind import bind
from trunnion.binding.compose import compose
from trunnion.binding.house import House
from trunnion.errors import BindingError, StoreError


class Page(HTMLParser):
    """Elements, attributes, ids and text of a page, with a check that tags close in order."""

    VOID = frozenset(("meta", "br", "img", "input", "mspace"))

    def __init__(self, text: str) -> None:
        super().__init__()
        self.open: list[str] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.words: list[str] = []
        self.feed(text)
        assert self.open == []

    def handle_starttag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))
        if tag not in self.VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag):
        if tag not in self.VOID:
            assert self.open.pop() == tag

    def handle_data(self, data):
        if "style" not in self.open:
            self.words.append(data)

    @property
    def text(self) -> str:
        return " ".join("".join(self.words).split())

    def all(self, tag: str) -> list[dict[str, str | None]]:
        return [attributes for name, attributes in self.tags if name == tag]

    @property
    def ids(self) -> list[str]:
        return [str(a["id"]) for _, a in self.tags if "id" in a]


@pytest.fixture(scope="module")
def page(material, tmp_path_factory) -> Page:
    report = bind(material.package(), tmp_path_factory.mktemp("page"), pdf=False)
    return Page(report.html.read_text("utf-8"))


def refusal(package: p.PackageInput, tmp_path, **options) -> str:
    with pytest.raises(BindingError) as caught:
        bind(package, tmp_path, pdf=False, **options)
    assert not (tmp_path / "package.html").exists()
    return str(caught.value)


def test_the_page_loads_nothing_and_runs_nothing(page):
    policy = next(a for a in page.all("meta") if a.get("http-equiv") == "Content-Security-Policy")
    assert str(policy["content"]).startswith("default-src 'none'")
    assert not page.all("script")
    assert not page.all("link")
    assert not page.all("iframe")
    for _, attributes in page.tags:
        assert not any(name.startswith("on") for name in attributes)
        for name in ("src", "href", "action", "poster", "data"):
            assert str(attributes.get(name) or "#").startswith(("#", "data:")), attributes


def test_every_link_has_its_target_and_every_id_is_used_once(page):
    assert len(page.ids) == len(set(page.ids))
    for attributes in page.all("a"):
        assert str(attributes["href"]).removeprefix("#") in page.ids


def test_parts_come_in_the_order_of_a_controlled_document(material):
    document, _ = compose(material.package(), House())
    anchors = [part.anchor for part in document.parts]
    assert anchors == [
        "cover", "history", "contents", "lists", "summary", "requirements", "decisions", "standing", "C01", "C02",
        "statements", "changes", "inputs", "code", "environment", "glossary", "map",
    ]  # fmt: skip


def test_headings_never_skip_a_level(page):
    levels = [int(tag[1]) for tag, _ in page.tags if re.fullmatch(r"h[1-6]", tag)]
    assert levels[0] == 1
    assert all(after <= before + 1 for before, after in itertools.pairwise(levels))


def test_a_failed_calculation_is_said_on_the_cover_and_in_the_matrix(page):
    assert "Calculations without result" in page.text
    assert "cell 2: ValueError: no such column" in page.text
    assert "calculation C02 failed" in page.text


def test_verdicts_are_words_with_marks_and_those_of_rejected_candidates_stand_beside(page):
    for words in ("● meets", "✗ does not meet", "○ not shown", "accepted by DV-1", "Candidate: wing-last (chosen)"):
        assert words in page.text


def test_references_are_told_what_they_point_at(page):
    assert "the product (Eq. C01.1)" in page.text
    assert "the picture (Figure C01.1)" in page.text
    assert "read backwards in Eq. C01.3" in page.text


def test_evidence_and_requirement_lead_to_each_other(page):
    links = [str(a["href"]) for a in page.all("a")]
    assert "#C01/res:cruise" in links
    assert "#req/ATT-04" in links
    assert "↑ ATT-04" in page.text


def test_cells_generated_for_the_sheet_are_not_shown_twice(page):
    assert "number SW" not in page.text.replace("Document number", "")


def test_bounds_are_printed_as_the_notebook_prints_them(material, tmp_path):
    low = material.result("res:x", "lock margin", "a", "b", 21.3961, hi=None)
    report = bind(material.one_cell(material.code("x", low)), tmp_path, pdf=False)
    assert "at\u00a0least\u00a021.39°" in report.html.read_text("utf-8")


def test_neighbouring_results_share_a_table(page):
    assert page.text.count("Results: lock margin") >= 1
    assert "res:hover" not in page.text


def test_mistakes_in_two_cells_are_named_together(material, tmp_path):
    cells = (
        material.markdown("see [it](#eq:nowhere)"),
        material.code("x", material.shown("text/latex", "$\\frobnicate$")),
        material.code("y", material.shown("text/html", "<b>only</b>")),
        material.markdown("![a picture](https://example.invalid/a.png)"),
        material.markdown("half a formula $\\frac{1}{2} and more"),
    )
    words = refusal(material.one_cell(*cells), tmp_path)
    for part in (
        "C01-envelope-sweep.ipynb: cell 2 (c01): formula '$\\\\frobnicate$': \\frobnicate is not in the subset",
        "cell 3 (c02): an output with no printable form (only text/html)",
        "cell 4 (c03): a picture in a Markdown cell",
        "cell 5 (c04): dollar signs that do not pair",
        "a link to #eq:nowhere",
    ):
        assert part in words


def test_an_output_without_printable_form_is_left_out_with_a_warning_when_allowed(material, tmp_path):
    package = material.one_cell(material.code("y", material.shown("text/html", "<b>only</b>")))
    report = bind(package, tmp_path, pdf=False, strict=False)
    assert any("only text/html" in warning for warning in report.warnings)
    assert "<b>only</b>" not in report.html.read_text("utf-8")


@pytest.mark.parametrize(
    ("fields", "words"),
    [
        ({"kind": "equation", "identity": "eq:a", "latex": "\\mystery"}, "eq:a: formula"),
        ({"kind": "table", "identity": "tbl:a", "headers": ["a"], "rows": [["1", "2"]]}, "another number of cells"),
        ({"kind": "figure", "identity": "fig:a", "caption": "x", "alt": "y"}, "without its picture"),
        ({"kind": "result"}, "malformed result"),
        ({"kind": "novelty"}, "unknown kind 'novelty'"),
    ],
)
def test_items_that_cannot_be_shown_are_named(material, tmp_path, fields, words):
    output = material.item(fields.pop("kind"), fields.pop("identity", None), **fields)
    assert words in refusal(material.one_cell(material.code("x", output)), tmp_path)


def test_the_same_id_twice_is_refused(material, tmp_path):
    twice = [material.code("x", material.item("equation", "eq:a", latex="a")) for _ in range(2)]
    assert "'C01/eq:a' is used twice" in refusal(material.one_cell(*twice), tmp_path)


def test_an_item_of_another_schema_is_refused(material, tmp_path):
    output = material.shown(material.MIME, {"schema": 2, "kind": "equation"})
    assert "schema 1" in refusal(material.one_cell(material.code("x", output)), tmp_path)


def test_fallbacks_of_plain_outputs(material, tmp_path):
    cells = material.code(
        "x",
        material.shown("text/latex", "$$\\frac{1}{2}$$"),
        material.shown("text/latex", "with $a$ and $b$"),
        material.shown("text/markdown", "a **strong** word"),
        material.shown("text/plain", "array([1., 2.])"),
        material.shown("image/png", material.tiny_png()),
        {"output_type": "stream", "name": "stderr", "text": ["\x1b[31mred\x1b[0m warning\n"]},
        material.display(**{"text/plain": "   a\n0  1", "text/html": "<table><script>x</script></table>"}),
    )
    page = Page(bind(material.one_cell(cells), tmp_path, pdf=False).html.read_text("utf-8"))
    for words in ("strong", "array([1., 2.])", "red warning", "0 1"):
        assert words in page.text
    assert len(page.all("mfrac")) == 1
    assert sum(str(a.get("src", "")).startswith("data:image/png") for a in page.all("img")) == 1


def test_the_summary_shows_the_figure_it_names_or_says_that_it_is_missing(material, tmp_path, page):
    assert "repeated from Figure C01.1" in page.text
    summary = p.Summary(figure=p.Evidence("C01", "fig:none"))
    assert "the summary shows C01/fig:none" in refusal(material.package(summary=summary), tmp_path)


def test_a_package_without_anything_still_binds(material, tmp_path):
    document = p.Document("X-1", "Nothing yet", "A", "2026-03-14")
    report = bind(p.PackageInput(document=document), tmp_path, pdf=False)
    assert "no requirements are stated" in report.html.read_text("utf-8")


def test_signed_means_all_three_signatures(material, tmp_path):
    signed = tuple(
        p.Signature(d, "N", "2026-03-14", p.SignatureState.SIGNED) for d in ("prepared", "checked", "approved")
    )
    for signatures, words in (
        (signed, "signed"),
        (signed[:2], "partly signed (prepared, checked)"),
        ((), "not signed"),
    ):
        document, _ = compose(replace(material.package(), signatures=signatures), House())
        assert document.parts[0].state.split(" · ")[0] == words
    stale = (replace(signed[0], state=p.SignatureState.STALE),)
    document, _ = compose(replace(material.package(), signatures=stale), House())
    assert document.parts[0].state.startswith("signed, but the content has changed since")


def test_every_page_state_names_open_findings_and_deviations(material):
    document, _ = compose(material.package(), House())
    calculation = next(part for part in document.parts if part.calculation == "C02")
    assert calculation.state == "not signed · open findings: 1 · DV-1"
    assert document.parts[0].state == "partly signed (prepared) · open findings: 1 · DV-1"


def test_an_unusable_folder_is_said_and_nothing_is_left(material, tmp_path):
    blocked = tmp_path / "file"
    blocked.write_text("in the way")
    with pytest.raises(StoreError, match="cannot be written"):
        bind(material.one_cell(), blocked, pdf=False)
    assert blocked.read_text() == "in the way"


def test_another_folder_gives_the_same_page(material, tmp_path):
    pages = [bind(material.package(), tmp_path / name, pdf=False).html.read_bytes() for name in ("a", "b")]
    assert pages[0] == pages[1]


def test_links_reach_other_calculations_and_requirements(material, tmp_path):
    base = material.package()
    second = material.notebook(material.markdown("as [there](#C01/eq:product), for [](#ATT-04), in [it](#C01)"))
    sheets = (base.sheets[0], replace(base.sheets[1], notebook=second))
    page = Page(bind(replace(base, sheets=sheets), tmp_path, pdf=False).html.read_text("utf-8"))
    assert "as there (Eq. C01.1), for ATT-04, in it" in page.text
