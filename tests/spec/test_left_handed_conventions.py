"""Conventions stated in legacy left-handed frames, carried to their right-handed partners.

The left-handed side is worked out here with plain arrays, by the left-hand rule; nothing of the project turns there.
"""

from __future__ import annotations

import numpy as np
import pytest

from trunnion.errors import SpecError
from trunnion.spec import load_workbook
from trunnion.spec.build import convention_from_plain
from trunnion.spec.frame_words import frame_notes
from trunnion.spec.plain import plain_part

TEXT = """\
workbook: 1
document: {number: T-9, title: Left-handed frames, revision: A}
frames:
  local: {axes: [north, east, down], north: "true", carried: along}
  body: {axes: [forward, starboard, down]}
  world: {axes: [north, east, up], handed: left, paired with: local, north: "true", carried: fixed at a point}
  model: {axes: [forward, starboard, up], handed: left, paired with: body}
conventions:
  legacy: {reference: world, body: model, sequence: 3-2-1, about: ABOUT, angles: [yaw, pitch, roll],
    positive: POSITIVE, maps: model to world}
"""
MIRROR = np.diag([1.0, 1.0, -1.0])  # up is minus down, in both frames


def convention(tmp_path, about: str = "moving axes", positive: str = "by axis"):
    (tmp_path / "workbook.yaml").write_text(TEXT.replace("ABOUT", about).replace("POSITIVE", positive))
    workbook = load_workbook(tmp_path)
    plain = plain_part(workbook, "convention", "legacy")
    return convention_from_plain(plain), plain


def elementary(axis: int, angle: float) -> np.ndarray:
    """Components turn as in any textbook; in left-handed axes that is the left-hand rule."""
    i, j = (axis + 1) % 3, (axis + 2) % 3
    turn = np.eye(3)
    turn[i, i] = turn[j, j] = np.cos(angle)
    turn[i, j], turn[j, i] = -np.sin(angle), np.sin(angle)
    return turn


@pytest.mark.parametrize("about", ["moving axes", "fixed axes"])
def test_angles_keep_their_values_and_the_matrix_is_carried_over(about: str, tmp_path) -> None:
    legacy, _ = convention(tmp_path, about)
    assert (legacy.reference.name, legacy.body.name) == ("local", "body")
    for angles in np.random.default_rng(3).uniform(-1.4, 1.4, size=(50, 3)):
        turns = [elementary(axis, angle) for axis, angle in zip((2, 1, 0), angles, strict=True)]
        first, second, third = turns if about == "moving axes" else turns[::-1]
        there = first @ second @ third  # model to world components, both left-handed
        np.testing.assert_allclose(legacy.matrix(angles), MIRROR @ there @ MIRROR, rtol=0, atol=1e-15)
        np.testing.assert_allclose(legacy.angles(legacy.matrix(angles)).angles, angles, rtol=0, atol=1e-12)


def test_senses_in_words_are_physical_on_either_hand(tmp_path) -> None:
    legacy, _ = convention(tmp_path, positive="{yaw: nose right, pitch: nose up, roll: starboard down}")
    R = legacy.matrix(np.radians([10.0, 0.0, 0.0]))
    assert (R @ [1, 0, 0])[1] > 0.1  # the nose went east
    assert (legacy.matrix(np.radians([0.0, 10.0, 0.0])) @ [1, 0, 0])[2] < -0.1  # up
    assert (legacy.matrix(np.radians([0.0, 0.0, 10.0])) @ [0, 1, 0])[2] > 0.1  # starboard down


def test_the_page_says_where_it_was_stated(tmp_path) -> None:
    _, plain = convention(tmp_path)
    note = frame_notes(plain)["body"]
    assert note.startswith("Stated in the left-handed frame model (x forward, y starboard, z up)")
    assert "x, y, z there are x, y, −z here" in note


def test_one_left_handed_frame_alone_is_a_mirror_and_refused(tmp_path) -> None:
    text = TEXT.replace("reference: world", "reference: local").replace("model to world", "model to local")
    (tmp_path / "workbook.yaml").write_text(text.replace("ABOUT", "moving axes").replace("POSITIVE", "by axis"))
    with pytest.raises(SpecError, match="frame 'model' is left-handed"):
        load_workbook(tmp_path)


def test_the_sense_must_be_said(tmp_path) -> None:
    text = TEXT.replace("ABOUT", "moving axes").replace("\n    positive: POSITIVE,", "")
    (tmp_path / "workbook.yaml").write_text(text)
    with pytest.raises(SpecError, match="sense"):
        load_workbook(tmp_path)


@pytest.mark.parametrize("offset", [0.0, 30.0])
def test_a_repeated_sequence_keeps_the_usual_range_of_its_own_frames(offset: float, tmp_path) -> None:
    text = TEXT.replace("3-2-1", "3-1-3").replace("ABOUT", "moving axes")
    text = text.replace("POSITIVE", f"by axis, offsets: {{pitch: {offset} deg}}")
    (tmp_path / "workbook.yaml").write_text(text)
    legacy = convention_from_plain(plain_part(load_workbook(tmp_path), "convention", "legacy"))
    angles = np.array([0.4, 1.1 + np.radians(offset), -2.0])
    np.testing.assert_allclose(legacy.angles(legacy.matrix(angles)).angles, angles, rtol=0, atol=1e-12)
