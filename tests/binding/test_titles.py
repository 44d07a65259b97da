"""The template's own title is printed once at most: not again under a calculation that bears another title."""

from types import SimpleNamespace

from trunnion.binding import blocks as b
from trunnion.binding.calculation import _shifted


def _titles(*blocks: b.Block, title: str = "Antenna pedestal") -> list[str]:
    found = _shifted(list(blocks), SimpleNamespace(title=title))
    return ["".join(part.text for part in block.parts) for block in found if isinstance(block, b.Heading)]


TITLE = b.Heading(1, b.line("Gimbal travel"))
PURPOSE = b.Heading(2, b.line("Purpose"))


def test_a_template_title_with_nothing_under_it_is_dropped():
    code = b.Code("import x", folded=True)
    assert _titles(TITLE, PURPOSE) == ["Purpose"]
    assert _titles(TITLE, code, code, PURPOSE) == ["Purpose"]


def test_a_title_that_opens_text_of_its_own_stays():
    assert _titles(TITLE, b.Paragraph(b.line("What this is about.")), PURPOSE) == ["Gimbal travel", "Purpose"]


def test_the_calculations_own_title_is_never_repeated():
    assert _titles(TITLE, b.Paragraph(b.line("Text.")), title="gimbal travel") == []
