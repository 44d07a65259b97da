"""A sensor that reports a tilt pair: each axis to the horizontal on its own, no sequence."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.forms import Level, TiltPair, TiltType
from trunnion.attitude.rotations import rotation_angle
from trunnion.attitude.words import degrees_text
from trunnion.envelope.regions import Region
from trunnion.hardware import mounts
from trunnion.hardware.mounts import Mount
from trunnion.sheet import display
from trunnion.sheet.sampled import attitudes

Array = NDArray[np.float64]

_TYPES = {mounts.TiltType.SINE: TiltType.SINE, mounts.TiltType.TANGENT: TiltType.TANGENT}


def pair_of(mount: Mount) -> TiltPair | None:
    """The tilt pair the mount's clinometer reports, in sensor axes; None without one."""
    if mount.clinometer is None or mount.tilt_axes is None:
        return None
    first, second = (mount.sensor_direction(word) for word in mount.tilt_axes)
    third = np.cross(first, second)
    up_s = mount.R_bs.T @ mount.host.direction("up")
    upright = third if float(third @ up_s) >= 0.0 else -third
    kind = _TYPES[mount.clinometer]
    return TiltPair(
        Level(up=np.array([0.0, 0.0, -1.0]), north=np.array([1.0, 0.0, 0.0])), first, second, upright, (kind, kind)
    )


def misread(pair: TiltPair, R_ls: Array) -> Array:
    """Rotation (N,) rad between attitudes and what they become when their pair is taken for heading, pitch and roll.

    The sequence is that of a gimballed pair: heading, then the first tilt to the horizontal, then the second about the
    tilted first axis.
    """
    numbers = pair.numbers(R_ls).values
    gimballed = TiltPair(pair.level, pair.first, pair.second, pair.upright, (TiltType.SINE, TiltType.TANGENT))
    return np.asarray(rotation_angle(R_ls, gimballed.rotation(numbers)))


def show_tilts(mount: Mount, regions: Mapping[str, Region]) -> None:
    """Largest tilts over every region, and what taking the pair for pitch and roll would cost, recorded (sampled)."""
    pair = pair_of(mount)
    if pair is None or not regions:
        display.statement("tilts", "No pair of tilts is worked out: the sensor reports none, or no region is stated.")
        return
    rows = []
    for over, region in regions.items():
        R_ls = attitudes(region) @ mount.R_bs
        found = pair.numbers(R_ls)
        wrong = float(np.degrees(np.max(misread(pair, R_ls))))
        tilts = np.max(np.abs(found.values[:, 1:]), axis=0)
        least = float(np.min(found.margin))
        rows.append([over, *(degrees_text(float(v), 2) for v in tilts), degrees_text(least, 2), f"{wrong:.3f}°"])
        display.record(
            quantity="tilt pair taken for pitch and roll", of=mount.name, over=over, lo=None, hi=None, unit="deg",
            basis="sampled", attained=wrong, witness={"where": "largest of the samples"},
        )  # fmt: skip
    names = mount.tilt_axes or ("first", "second")
    display.table(
        "tbl:tilts",
        [
            "region",
            *(f"largest tilt of {name}" for name in names),
            "least margin of the pair",
            "taken for pitch and roll",
        ],
        rows,
        caption="The tilt pair, and the attitude error of taking it for heading, pitch and roll",
        align="lrrrr",
        notes=[
            f"Both tilts are of the {pair.types[0].value}: {pair.singular_set}.",
            "Sampled, with the corners of boxes among the samples: a demonstration, not a proof.",
        ],
    )


def check_tilts(mount: Mount, regions: Mapping[str, Region]) -> None:
    """The tilts of the samples against the components of up by scipy's rotations."""
    from scipy.spatial.transform import Rotation

    pair = pair_of(mount)
    if pair is None:
        return
    for over, region in regions.items():
        R_ls = attitudes(region, 256) @ mount.R_bs
        up_s = Rotation.from_matrix(R_ls).inv().apply([0.0, 0.0, -1.0])
        rise = up_s @ np.column_stack([pair.first, pair.second])
        theirs = np.arcsin(np.clip(rise, -1.0, 1.0))
        if pair.types[0] is TiltType.TANGENT:
            theirs = np.arctan2(rise, np.abs(up_s @ np.asarray(pair.upright))[:, None])
        ours = pair.numbers(R_ls).values[:, 1:]
        display.check(
            f"check:{mount.name}:{over}:tilts",
            f"tilt pair over {over}",
            ours=float(np.degrees(np.max(np.abs(ours)))),
            theirs=float(np.degrees(np.max(np.abs(theirs)))),
            difference=float(np.degrees(np.max(np.abs(ours - theirs)))),
            tolerance=1e-6,
            unit="deg",
            library="scipy Rotation",
        )
