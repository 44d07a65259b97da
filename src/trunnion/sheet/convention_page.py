"""The statement page of a convention as a workbook states it: its frames' notes and its standard included."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from trunnion.attitude.conventions import Convention
from trunnion.figures import drawings
from trunnion.sheet import parameters
from trunnion.spec.frame_words import frame_notes, taken_from_standard
from trunnion.symbolic.statement import ConventionStatement, statement


def stated_page(plain: Mapping[str, Any]) -> ConventionStatement:
    """The statement of a plain convention (frames written out), with everything its workbook says about it."""
    convention = parameters.convention(plain)
    return statement(
        convention,
        frame_notes=frame_notes(plain),
        standard=plain.get("as"),
        fixed_by_standard=taken_from_standard(plain, convention),
    )


def page_drawing(page: ConventionStatement, convention: Convention, *, columns: int = 2) -> tuple[str, str, str]:
    """(SVG, alternative text, caption) of the body axes at zero and after each turn, `columns` panels side by side."""
    captions = page.stage_captions if columns <= 2 else ("start", *page.stage_captions[1:])
    svg = drawings.turns_drawing(
        page.stages,
        convention.body.axes,
        captions,
        up=drawings.upward(convention.reference.axes),
        columns=columns,
    )
    alt = "Four drawings of the body axes: " + "; ".join(page.stage_captions)
    return svg, alt, f"The axes of {convention.body.name} at zero and after each turn of {convention.name}"
