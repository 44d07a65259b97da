"""A calculation that names a reference and a body frame joins the two: they are no stray frames."""

from __future__ import annotations

from pathlib import Path

import pytest

from trunnion.errors import SpecError
from trunnion.spec.load import load_text

SPEC = """workbook: 1
document: {{number: T-1, title: Trial, revision: A}}
people:
  - {{id: p1, name: Someone, signs as: [prepared]}}
frames:
  local: {{axes: [north, east, down], north: "true", carried: along}}
  body: {{axes: [forward, starboard, down]}}
calculations:
  - {{id: C01, template: convention-identification, reference: local{more}}}
"""


def test_two_frames_named_by_a_calculation_are_joined() -> None:
    text = SPEC.format(more=", body: body")
    assert load_text(text.encode(), Path("workbook.yaml"), check_files=False).names("frames") == ["local", "body"]


def test_one_frame_alone_is_not() -> None:
    with pytest.raises(SpecError, match="frame 'local' is not linked to any other"):
        load_text(SPEC.format(more="").encode(), Path("workbook.yaml"), check_files=False)
