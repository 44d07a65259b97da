"""The page as a reader uses it, in headless Chromium with the network cut off and scripts switched off."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from trunnion.binding.bind import bind

playwright = pytest.importorskip("playwright.sync_api")
pytestmark = pytest.mark.needs("chromium")


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    with playwright.sync_playwright() as driver:
        opened = driver.chromium.launch(executable_path=shutil.which("chromium"), args=["--no-sandbox"])
        yield opened
        opened.close()


@pytest.fixture(scope="module")
def address(material, tmp_path_factory) -> str:
    return bind(material.package(), tmp_path_factory.mktemp("view"), pdf=False).html.as_uri()


def opened(browser, address: str, **options: Any) -> Any:
    """A fresh page without scripts; every request but the file itself is an error."""
    context = browser.new_context(java_script_enabled=False, viewport={"width": 1280, "height": 900}, **options)
    page = context.new_page()
    page.requests = []

    def refuse(route: Any) -> None:
        page.requests.append(route.request.url)
        route.continue_() if route.request.url.startswith(("file:", "data:")) else route.abort()

    page.route("**/*", refuse)
    page.goto(address)
    return page


@pytest.fixture
def page(browser, address) -> Iterator[Any]:
    view = opened(browser, address)
    yield view
    view.context.close()


def style(page: Any, selector: str, name: str) -> str:
    """A computed style, read over the debugging protocol (scripts of the page stay off)."""
    return page.locator(selector).first.evaluate(f"e => getComputedStyle(e).getPropertyValue('{name}')")


def test_nothing_is_asked_of_the_network(page):
    assert all(url.startswith(("file:", "data:")) for url in page.requests)
    assert sum(url.startswith("file:") for url in page.requests) == 1


def test_verdict_filter_hides_rows_by_checkbox_alone(page):
    meets, fails = page.locator(".matrix tr.v-meets").first, page.locator(".matrix tr.v-fails").first
    assert meets.is_visible()
    page.locator("#f-v-meets").uncheck()
    assert not meets.is_visible()
    assert fails.is_visible()
    page.locator("#f-v-meets").check()
    page.locator("#f-counting").check()
    assert meets.is_visible()
    assert not fails.is_visible()


def test_jump_from_requirement_to_evidence_and_back(page):
    page.locator(".matrix tr").filter(has_text="wing-last").get_by_role("link", name="Table C01").click()
    assert page.url.endswith("#C01/res:cruise")
    row = page.locator("tr[id='C01/res:cruise']")
    assert row.evaluate("e => e.getBoundingClientRect().top >= 0 && e.getBoundingClientRect().bottom <= innerHeight")
    row.get_by_role("link", name="ATT-04").click()
    assert page.url.endswith("#req/ATT-04")
    page.go_back()
    assert page.url.endswith("#C01/res:cruise")


def test_a_figure_enlarges_to_the_window_and_back(page):
    picture = page.locator("figure[id='C01/fig:margin'] img")
    before = picture.bounding_box()
    page.locator("figure[id='C01/fig:margin'] a.in").click()
    after = picture.bounding_box()
    assert after["width"] > 1.2 * before["width"]
    page.get_by_text("Back to the page").locator("visible=true").click()
    assert abs(picture.bounding_box()["width"] - before["width"]) < 2


def test_a_value_is_selected_whole_by_one_click(page):
    assert style(page, "tr[id='C01/res:cruise'] .value", "user-select") == "all"
    page.locator("tr[id='C01/res:cruise'] .value").click()
    assert page.evaluate("() => getSelection().toString()").strip() == "45.00°"


@pytest.mark.parametrize(("scheme", "dark"), [("light", False), ("dark", True)])
def test_light_and_dark_by_preference_and_by_checkbox(browser, address, scheme, dark):
    view = opened(browser, address, color_scheme=scheme)
    bright = [int(part) for part in style(view, "body", "background-color")[4:-1].split(",")]
    assert (sum(bright) < 200) == dark
    view.locator("#flip").check()
    turned = [int(part) for part in style(view, "body", "background-color")[4:-1].split(",")]
    assert (sum(turned) < 200) != dark
    view.context.close()


def contrast(one: str, other: str) -> float:
    """Contrast of two colours (WCAG 2.2, definition of contrast ratio)."""

    def luminance(colour: str) -> float:
        parts = [float(part) / 255 for part in colour[colour.index("(") + 1 : -1].split(",")[:3]]
        linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    high, low = sorted((luminance(one), luminance(other)), reverse=True)
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_words_can_be_read_in_both_schemes(browser, address, scheme):
    """4.5 to 1 for all text (WCAG 2.2, success criterion 1.4.3)."""
    view = opened(browser, address, color_scheme=scheme)
    paper = style(view, "body", "background-color")
    for selector in ("body", ".quiet", "a", ".badge.v-meets", ".badge.v-unshown", ".note", "summary", ".eqn"):
        assert contrast(style(view, selector, "color"), paper) >= 4.5, selector
    view.context.close()


def test_code_unfolds_and_folds(page):
    code = page.locator("details pre").first
    assert not code.is_visible()
    page.locator("details:has(pre) summary").first.click()
    assert code.is_visible()


def test_keyboard_reaches_the_skip_links_first(page):
    page.keyboard.press("Tab")
    first = page.locator(":focus")
    assert first.inner_text() == "Skip to the content"
    assert first.bounding_box()["x"] >= 0
    page.keyboard.press("Enter")
    assert page.url.endswith("#content")


def test_landmarks_and_names_for_screen_readers(page):
    for role in ("main", "navigation", "banner", "contentinfo"):
        assert page.get_by_role(role).count() == 1
    assert page.get_by_role("heading", level=1).count() == 1
    assert page.get_by_role("table", name="Requirement matrix").count() == 1
    assert page.get_by_role("img", name="A line that stays above the limit").count() >= 1
    assert page.get_by_role("group", name="Show").count() == 1
    assert page.get_by_role("region", name="C01 Margins of the wing-last convention").count() == 1


def test_brackets_grow_with_their_matrix(page):
    """The embedded mathematics font is in use: a bracket is as tall as the three rows it holds."""
    formula = page.locator("math:has(mtable.m-matrix)").first
    bracket = formula.locator("mo[fence=true]").first.bounding_box()
    table = formula.locator("mtable").first.bounding_box()
    assert bracket["height"] >= 0.9 * table["height"]
    assert "TrunnionMaths" in style(page, "math", "font-family")


def test_nothing_overflows_sideways_even_on_a_narrow_screen(browser, address):
    for width in (1280, 900, 420):
        context = browser.new_context(viewport={"width": width, "height": 800})
        view = context.new_page()
        view.goto(address)
        assert view.evaluate("() => document.documentElement.scrollWidth <= innerWidth"), width
        context.close()


def test_on_paper_only_the_document_is_left(page, tmp_path: Path):
    page.emulate_media(media="print")
    assert not page.get_by_role("navigation").is_visible()
    assert not page.locator(".filter").is_visible()
    assert page.locator(".matrix table").is_visible()


def test_figures_carry_their_own_font(page):
    """The text of a picture keeps its face although pictures cannot use the fonts of the page."""
    source = page.locator("figure[id='C01/fig:margin'] img").get_attribute("src")
    import base64

    picture = base64.b64decode(source.split(",", 1)[1]).decode("utf-8")
    assert "@font-face{font-family:'DejaVu Sans'" in picture
