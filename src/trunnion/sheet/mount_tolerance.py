"""What a misalignment costs in the sensor's own angles: three routes side by side, and the growth towards lock."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.words import degrees_text, number_text
from trunnion.envelope.regions import Region
from trunnion.envelope.results import AngleRange
from trunnion.figures import sky
from trunnion.hardware.misalignment import AngleErrors, angle_errors, growth_towards_lock, turn_with_probability
from trunnion.hardware.mounts import Mount
from trunnion.sheet import display
from trunnion.sheet.rounding import ceiling_text
from trunnion.sheet.sampled import attitudes

Array = NDArray[np.float64]

PROBABILITY = 0.9973
_SAMPLES = 1024
_DRAWS = 4000
_GROWTH_DEG = (90.0, 60.0, 45.0, 30.0, 20.0, 10.0, 5.0, 2.0, 1.0)


def turn_of(mount: Mount) -> tuple[float, str] | None:
    """The whole turn (rad) judged by, and what it is: a bound, or a point of the covariance."""
    bound = mount.tolerance.largest_turn
    if bound is not None:
        return bound, "bound"
    if mount.tolerance.covariance is not None:
        return turn_with_probability(mount.tolerance.covariance, PROBABILITY), f"{100 * PROBABILITY:g} % point"
    return None


def show_vehicle(mount: Mount) -> None:
    """What the misalignment makes of the vehicle's attitude: its own size, whatever the attitude."""
    found = turn_of(mount)
    if found is None:
        display.statement("tolerance", "No misalignment is stated, so its cost is not worked out.")
        return
    turn, what = found
    size = float(np.degrees(turn))
    display.statement(
        "tolerance",
        f"The seat is known within a turn of {ceiling_text(size, 3)}° ({what}). The vehicle's attitude is wrong by "
        "exactly "
        "the turn, at every attitude; what becomes of the three angles depends on their margin.",
    )
    display.record(
        quantity="vehicle attitude error", of=mount.name, over=None, lo=0.0, hi=size, unit="deg",
        basis="certified bound" if what == "bound" else "sampled",
        note="the mount alone" if what == "bound" else f"the mount alone, {what}",
    )  # fmt: skip


def errors_over(
    mount: Mount, regions: Mapping[str, Region], margins: Mapping[str, AngleRange]
) -> dict[str, AngleErrors]:
    """Errors of the sensor's own angles over every region, the certified least margin used."""
    convention = mount.angles_as
    if convention is None or turn_of(mount) is None:
        return {}
    return {
        name: angle_errors(
            mount.tolerance,
            convention,
            attitudes(region, _SAMPLES) @ mount.R_bs,
            np.eye(3),
            least_margin=margins[name].least.lo,
            draws=_DRAWS,
        )
        for name, region in regions.items()
    }


def show_errors(mount: Mount, found: Mapping[str, AngleErrors]) -> None:
    """Linear, certified and Monte Carlo side by side, recorded as certified bounds where there is one."""
    convention = mount.angles_as
    if convention is None or not found:
        display.statement("angle-errors", "No angles of the sensor's own, no region, or no tolerance is stated.")
        return
    rows = []
    for over, errors in found.items():
        for k, name in enumerate(convention.angle_names):
            cells = [
                _cell(errors.linear, k),
                _cell(errors.certified, k),
                _cell(errors.monte_carlo, k),
                _cell(errors.sigma, k),
            ]
            rows.append([over, name, *cells])
            if errors.certified is not None:
                _record(
                    mount, over, name, float(np.degrees(errors.certified[k])), float(np.degrees(errors.monte_carlo[k]))
                )
    draws = max(errors.draws for errors in found.values())
    sigma = any(errors.sigma is not None for errors in found.values())  # only a covariance has one
    display.table(
        "tbl:angle-errors",
        ["region", "angle", "linear", "certified worst", "Monte Carlo", *(["one sigma, linear"] if sigma else [])],
        rows if sigma else [row[:-1] for row in rows],
        caption="Error of the sensor's own angles from the misalignment, by three routes",
        align="llrrrr" if sigma else "llrrr",
        notes=[
            f"Monte Carlo: {draws} draws, half of them at the sample of least margin; the largest error, or the "
            "99.73 % point "
            "of a covariance. 180° means that the angle may be anything: the misalignment reaches the lock."
        ],
    )


def _record(mount: Mount, over: str, angle: str, bound: float, drawn: float) -> None:
    display.record(
        quantity=f"error of {angle}", of=mount.name, over=over, lo=0.0, hi=bound, unit="deg", basis="certified bound",
        attained=min(drawn, bound), witness={"where": "a draw of the Monte Carlo"},
    )  # fmt: skip


def _cell(values: Array | None, k: int) -> str:
    if values is None:
        return "none"
    if not np.isfinite(values[k]):
        return "unbounded"
    return f"{ceiling_text(float(np.degrees(values[k])), 3)}°"


def show_growth(mount: Mount, margins: Mapping[str, AngleRange]) -> None:
    """How the outer angles' error grows as the margin shrinks, linear beside certified."""
    found = turn_of(mount)
    if found is None or mount.angles_as is None:
        display.statement("growth", "No growth towards lock is worked out.")
        return
    turn, _ = found
    rows = growth_towards_lock(turn, np.radians(_GROWTH_DEG))
    display.table(
        "tbl:growth",
        ["lock margin", "gain 1/sin m", "linear", "certified worst"],
        [
            [
                degrees_text(row.margin, 1),
                f"{row.gain:.2f}",
                f"{number_text(float(np.degrees(row.linear)), 3)}°",
                f"{ceiling_text(float(np.degrees(row.certified)), 3)}°",
            ]
            for row in rows
        ],
        caption="Growth of the outer angles' error towards lock",
        align="rrrr",
    )
    least = min((float(np.degrees(entry.least.lo)) for entry in margins.values()), default=None)
    size = float(np.degrees(turn))
    at = np.geomspace(max(1.001 * size, 0.05), 90.0, 240)
    fine = growth_towards_lock(turn, np.radians(at))
    display.figure(
        "fig:growth",
        sky.growth_curves(
            at,
            {
                "certified worst": np.degrees([row.certified for row in fine]),
                "linear": np.degrees([row.linear for row in fine]),
            },
            turn=size,
            here=least,
        ),
        caption=f"Error of the outer angles for a misalignment of {size:.3g}°",
        alt=f"Error grows from {size:.3g} deg at 90 deg margin to anything where the margin equals the misalignment",
    )


def check_errors(mount: Mount, found: Mapping[str, AngleErrors]) -> None:
    """No draw made by scipy's rotations may exceed the certified worst."""
    from scipy.spatial.transform import Rotation

    from trunnion.sheet import independent

    convention, stated = mount.angles_as, turn_of(mount)
    if convention is None or stated is None:
        return
    for over, errors in found.items():
        if errors.certified is None or not 1e-6 < errors.margin < np.pi / 2 - 1e-9:
            continue
        # an attitude at the least margin, made by scipy from the convention's middle angle; turned every way
        middle = errors.margin if convention.sequence.repeated else np.pi / 2 - errors.margin
        inner = np.array([0.2, middle, -0.4])
        stated_angles = inner * np.array(convention.signs) + np.asarray(convention.offsets)
        base = independent.rotation(convention, np.degrees(stated_angles))
        draws = np.random.default_rng(20_310_507).normal(size=(4000, 3))
        turns = Rotation.from_rotvec(stated[0] * draws / np.linalg.norm(draws, axis=1, keepdims=True))
        margins = np.radians(independent.lock_margin_deg(convention, base * turns))
        gap = float(np.max(np.abs(margins - errors.margin)))
        display.check(
            f"check:{mount.name}:{over}:middle-angle",
            f"middle angle at the least margin of {over}: no draw beyond the certified worst",
            ours=float(np.degrees(errors.certified[1])),
            theirs=float(np.degrees(gap)),
            difference=max(0.0, float(np.degrees(gap - errors.certified[1]))),
            tolerance=1e-5,
            unit="deg",
            library=independent.LIBRARY,
        )
