"""Each calculation is spoiled on purpose (a sign, a transposed matrix, a limit), and its own check must report it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from trunnion.envelope.regions import Box, Cone, Region, Track
from trunnion.sheet import derivation as derivation_sheet
from trunnion.sheet import mount as mount_sheet
from trunnion.sheet import sweep as sweep_sheet
from trunnion.sheet.crosswalk import ConventionCrosswalk
from trunnion.symbolic.derivation import derive

Plain = Callable[..., dict[str, Any]]
Disagreeing = Callable[[], list[str]]

REGIONS = ("hover", "transition", "cruise", "flown")
CONVENTIONS = ("ordinary", "nose-lowered", "wing-last")


def test_sound_calculations_agree_with_their_checks(plain: Plain, shown: list, disagreeing: Disagreeing) -> None:
    sweep_sheet.EnvelopeSweep(
        conventions=plain("convention", *CONVENTIONS), envelopes=plain("envelope", *REGIONS)
    ).show_checks()
    mount_sheet.MountCheck(
        mount=plain("mount", "inertial-unit")["inertial-unit"], envelopes=plain("envelope", "hover", "cruise")
    ).show_checks()
    derivation_sheet.ConventionDerivation(convention=plain("convention", "wing-last")["wing-last"]).show_checks()
    walk_parts = plain("convention", "ordinary", "wing-last")
    ConventionCrosswalk(first=walk_parts["ordinary"], second=walk_parts["wing-last"], envelopes={}).show_checks()
    assert len([item for item in shown if item["kind"] == "check"]) > 30
    assert disagreeing() == []


def _narrowed(region: Region) -> Region:
    """A limit of a box three degrees too tight, of a cone one degree, a table without its error."""
    if isinstance(region, Box):
        low, high = region.ranges[1]
        inner = (region.ranges[0], (low + np.radians(3.0), high - np.radians(3.0)), region.ranges[2])
        return Box(region.convention, inner)
    if isinstance(region, Cone):
        return replace(region, farthest=region.farthest - np.radians(1.0))
    if isinstance(region, Track):
        return Track(region.times, region.quaternions, attitude_error=0.0)
    raise AssertionError(type(region))


@pytest.mark.parametrize(
    ("region", "convention"), [("hover", "wing-last"), ("cruise", "nose-lowered"), ("flown", "wing-last")]
)
def test_a_wrong_limit_of_a_region_is_reported(
    region: str, convention: str, plain: Plain, disagreeing: Disagreeing, monkeypatch: pytest.MonkeyPatch
) -> None:
    sound = sweep_sheet.lock_margin
    monkeypatch.setattr(sweep_sheet, "lock_margin", lambda where, of: sound(_narrowed(where), of))
    sweep_sheet.EnvelopeSweep(
        conventions=plain("convention", convention), envelopes=plain("envelope", region)
    ).show_checks()
    assert f"check:{convention}:{region}:search" in disagreeing()


@pytest.mark.parametrize("spoiled", ["transposed constant", "other sequence"])
def test_a_wrong_convention_in_the_sweep_is_reported(
    spoiled: str, plain: Plain, disagreeing: Disagreeing, monkeypatch: pytest.MonkeyPatch
) -> None:
    sound = sweep_sheet.lock_margin

    def wrong(region: Region, convention: Any) -> Any:
        if spoiled == "transposed constant":
            return sound(region, replace(convention, right=convention.right.T))
        from trunnion.attitude.sequences import Sequence

        return sound(region, replace(convention, sequence=Sequence.XYZ))

    monkeypatch.setattr(sweep_sheet, "lock_margin", wrong)
    sweep_sheet.EnvelopeSweep(
        conventions=plain("convention", "nose-lowered"), envelopes=plain("envelope", "hover", "cruise")
    ).show_checks()
    assert disagreeing() != []


@pytest.mark.parametrize("name", ["matrix", "body rates", "combination 0"])
@pytest.mark.parametrize("spoil", ["sign", "transposed"])
def test_a_wrong_formula_of_the_derivation_is_reported(
    name: str, spoil: str, plain: Plain, disagreeing: Disagreeing
) -> None:
    work = derivation_sheet.ConventionDerivation(convention=plain("convention", "wing-last")["wing-last"])
    sound = derive(work.convention)
    entry = sound.expressions[name]
    if spoil == "sign":
        wrong = entry.copy().as_mutable()
        row, column = next((i, j) for i in range(entry.rows) for j in range(entry.cols) if entry[i, j] != 0)
        wrong[row, column] = -wrong[row, column]
    elif entry.rows == entry.cols:
        wrong = entry.T
    else:
        wrong = entry[:, ::-1]
    work.__dict__["derivation"] = replace(sound, expressions={**sound.expressions, name: wrong})
    work.show_checks()
    assert disagreeing() != []


def test_a_transposed_mount_is_reported(plain: Plain, disagreeing: Disagreeing) -> None:
    check = mount_sheet.MountCheck(
        mount=plain("mount", "inertial-unit")["inertial-unit"], envelopes=plain("envelope", "hover")
    )
    check.mount = replace(check.mount, R_bs=check.mount.R_bs.T, typed=None)
    check.show_checks()
    # This mount is its own transpose about one axis only; the direction of its boresight gives it away.
    assert "check:inertial-unit:matrix" in disagreeing()


def test_readings_with_a_wrong_sign_are_reported(plain: Plain, disagreeing: Disagreeing) -> None:
    check = mount_sheet.MountCheck(mount=plain("mount", "inertial-unit")["inertial-unit"], envelopes={})
    table = check.table
    turned = replace(table.expected, accelerometer=-table.expected.accelerometer)
    check.__dict__["table"] = replace(table, expected=turned)
    check.show_checks()
    assert disagreeing() == ["check:inertial-unit:accelerometer"]


def test_a_cross_walk_with_a_map_applied_by_halves_is_reported(plain: Plain, disagreeing: Disagreeing) -> None:
    parts = plain("convention", "ordinary", "nose-lowered")
    walk = ConventionCrosswalk(first=parts["ordinary"], second=parts["nose-lowered"], envelopes={})
    sound = walk.walk
    wrong = replace(sound, second=replace(sound.second, right=np.eye(3)))
    walk.__dict__["walk"] = wrong
    walk.show_checks()
    assert disagreeing() != []
