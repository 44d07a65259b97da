"""What the frame-chain template calls: the attitude of one frame in another through all links, and what clocks cost."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cached_property
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.words import number_text
from trunnion.figures import sky
from trunnion.hardware.frame_chains import ChainAttitude, FrameChain, Link, ReadingComparison, wrong_link_reading
from trunnion.sheet import display, hardware_parts, parameters
from trunnion.sheet.rounding import ceiling_text

Array = NDArray[np.float64]

SHOWN_ROWS = 9
SAMPLES = 721


class FrameChainCheck:
    """Links end to end; each `show_…` displays one part and records what it finds."""

    def __init__(
        self,
        *,
        links: Mapping[str, Any],
        of: str,
        relative_to: str,
        taken_to: str = "",
        convention: Mapping[str, Any] | None = None,
    ) -> None:
        self._plain = dict(links)
        self.links: dict[str, Link] = {name: hardware_parts.link(plain) for name, plain in links.items()}
        self.chain = FrameChain(tuple(self.links.values()))
        self.of, self.relative_to, self.taken_to = of, relative_to, taken_to
        self.convention: Convention | None = parameters.convention(convention) if convention else None

    @cached_property
    def times(self) -> Array:
        """Chain times (N,) s: evenly over the span all tables share; zero without tables."""
        span = self.chain.common_span(self.of, self.relative_to)
        if self.taken_to:
            other = self.chain.common_span(self.of, self.taken_to)
            span = (max(span[0], other[0]), min(span[1], other[1]))
        return np.linspace(*span, SAMPLES) if np.isfinite(span[0]) else np.zeros(1)

    @cached_property
    def found(self) -> ChainAttitude:
        """The attitude asked for, at all times."""
        return self.chain.attitude(self.of, self.relative_to, self.times)

    @cached_property
    def comparison(self) -> ReadingComparison | None:
        """Right and wrong reading side by side, if both are named."""
        if not self.taken_to or self.convention is None:
            return None
        return wrong_link_reading(self.chain, self.of, self.relative_to, self.taken_to, self.convention, self.times)

    @property
    def _name(self) -> str:
        return f"{self.of} in {self.relative_to}"

    def show_inputs(self) -> None:
        """Every link as the injected parameters state it."""
        display.inputs([hardware_parts.row("link", name, plain) for name, plain in self._plain.items()])

    def show_assumptions(self) -> None:
        """What joins the tables."""
        display.statement(
            "assumptions",
            "Between the rows of a table a frame turns at a constant rate about one line; a sample stamped by a "
            "link's own "
            "clock happened its offset earlier on the chain's clock.",
        )

    def show_path(self) -> None:
        """The way through the links, what each of them is, and its clock."""
        rows = []
        for name, link in self.links.items():
            kind = "constant" if link.constant else f"table of {len(link.times) if link.times is not None else 0} rows"
            clock = (
                ""
                if link.constant
                else f"{link.time_offset:+.4g} s ± {link.offset_error:.3g} s, jitter {link.jitter:.3g} s"
            )
            rows.append(
                [name, f"{link.child} in {link.parent}", kind, clock.replace("-", "−"), link.source or "not stated"]
            )
        display.table(
            "tbl:links",
            ["link", "carries", "kind", "its clock: offset and what is left", "source"],
            rows,
            caption="The links",
            align="lllll",
        )
        display.statement(
            "path",
            f"{self.of} relative to {self.relative_to} is taken over {' → '.join(self.found.path)}: "
            + (
                f"{self.times[0]:g} s to {self.times[-1]:g} s are covered by every table on the way."
                if len(self.times) > 1
                else "no table is on the way, so the attitude is constant."
            ),
        )

    def show_attitude(self) -> None:
        """The attitude at times spread over the span, as angles of the stated convention or as a quaternion."""
        pick = np.unique(np.linspace(0, len(self.times) - 1, SHOWN_ROWS).astype(int))
        heads, cells = self._cells(pick)
        display.table(
            "tbl:attitude",
            ["time, s", *heads],
            [[f"{self.times[k]:.3f}", *row] for k, row in zip(pick, cells, strict=True)],
            caption=f"Attitude of {self._name}",
            align="r" * (1 + len(heads)),
        )

    def _cells(self, pick: NDArray[np.intp]) -> tuple[list[str], list[list[str]]]:
        from trunnion.attitude.rotations import quaternion_from_matrix

        if self.convention is None:
            rows = quaternion_from_matrix(self.found.R[pick])
            return ["scalar", "i", "j", "k"], [[f"{v:+.6f}".replace("-", "−") for v in row] for row in rows]
        found = self.convention.angles(self.found.R[pick])
        return (
            [*self.convention.angle_names, "lock margin"],
            [
                [*(_angle(float(v), 3) for v in angles), _angle(float(margin), 2)]
                for angles, margin in zip(found.angles, found.margin, strict=True)
            ],
        )

    def show_history(self) -> None:
        """The angles against time."""
        if self.convention is None or len(self.times) < 2:
            display.statement("history", "No angles against time are drawn: no convention is named, or nothing moves.")
            return
        angles = np.degrees(np.unwrap(self.convention.angles(self.found.R).angles, axis=0))
        names = self.convention.angle_names
        display.figure(
            "fig:history",
            sky.joint_history(self.times, dict(zip(names, angles.T, strict=True))),
            caption=f"Angles of {self._name}",
            alt="; ".join(
                f"{name} {np.min(a):.1f} to {np.max(a):.1f} deg" for name, a in zip(names, angles.T, strict=True)
            ),
        )

    def show_errors(self) -> None:
        """The error budget of the chain: stated attitude errors and, for each clock, relative rate times time error."""
        rows = [
            [
                f"clock of {term.link}",
                f"{np.degrees(term.rate):.5g} deg/s × {term.time_error:.3g} s",
                f"{np.degrees(term.error):.4f}°",
            ]
            for term in self.found.timing
        ]
        rows.append(["stated attitude errors of the links", "sum", f"{np.degrees(self.found.attitude_error):.4f}°"])
        rows.append(["all together", "plain sum", f"{ceiling_text(float(np.degrees(self.found.error)), 4)}°"])
        display.table(
            "tbl:errors", ["cause", "how", "at most"], rows, caption="Attitude error of the chain", align="llr"
        )
        display.record(
            quantity="chain attitude error",
            of=self._name,
            over="all links",
            lo=0.0,
            hi=float(np.degrees(self.found.error)),
            unit="deg",
            basis="certified bound",
            note="for tables followed at a constant rate between their rows",
        )

    def show_wrong_link(self) -> None:
        """The same angles taken to another frame by mistake, beside the right ones."""
        found = self.comparison
        if found is None:
            display.statement("wrong-link", "No other frame is named that the angles could be taken to by mistake.")
            return
        assert self.convention is not None
        worst = int(np.argmax(found.separation))
        rows = [
            [name, _angle(float(right), 3), _angle(float(wrong), 3)]
            for name, right, wrong in zip(
                self.convention.angle_names, found.right[worst], found.wrong[worst], strict=True
            )
        ]
        largest = float(np.degrees(found.separation[worst]))
        display.table(
            "tbl:wrong-link",
            ["angle", f"relative to {self.relative_to}", f"taken to {self.taken_to}"],
            rows,
            caption=f"Where both readings differ most, at {self.times[worst]:.3f} s: {largest:.3f}° apart",
            align="lrr",
        )
        display.record(
            quantity="wrong-link difference",
            of=self.of,
            over=f"{self.relative_to} or {self.taken_to}",
            lo=None,
            hi=None,
            unit="deg",
            basis="sampled",
            attained=largest,
            witness={"where": f"{self.times[worst]:.3f} s"},
        )

    def show_checks(self) -> None:
        """The product of the links again by scipy, tables joined by its own SLERP."""
        from scipy.spatial.transform import Rotation

        theirs = _scipy_chain(self.found.path, tuple(self.links.values()), self.times)
        apart = (Rotation.from_matrix(self.found.R).inv() * theirs).magnitude()
        display.check(
            f"check:{self.of}:chain",
            f"{self._name} at {len(self.times)} times",
            ours=0.0,
            theirs=float(np.degrees(np.max(apart))),
            tolerance=1e-6,
            unit="deg",
            library="scipy Rotation and Slerp",
        )

    def show_results(self) -> None:
        """The results in one table."""
        rows = [
            [
                "chain attitude error",
                self._name,
                f"{ceiling_text(float(np.degrees(self.found.error)), 4)}°",
                "certified bound",
            ]
        ]
        if self.comparison is not None:
            largest = float(np.degrees(np.max(self.comparison.separation)))
            rows.append(["wrong-link difference", f"taken to {self.taken_to}", f"{largest:.3f}°", "sampled"])
        display.table(
            "tbl:results",
            ["quantity", "of", "value", "basis"],
            rows,
            caption="Results of this calculation",
            align="llrl",
        )


def _angle(value: float, digits: int) -> str:
    """An angle (rad) with a fixed count of decimals, so that the column lines up."""
    return f"{number_text(float(np.degrees(value)), digits)}°"


def _scipy_chain(path: tuple[str, ...], links: tuple[Link, ...], times: Array) -> Any:
    """The attitudes along the path by scipy alone."""
    from scipy.spatial.transform import Rotation, Slerp

    whole = Rotation.identity(len(times))
    for near, far in pairwise(path):
        (link,) = [link for link in links if {link.parent, link.child} == {near, far}]
        if link.times is None or link.quaternions is None:
            step = Rotation.from_matrix(np.broadcast_to(np.asarray(link.R_pc), (len(times), 3, 3)))
        else:
            table = Rotation.from_quat(link.quaternions[:, [1, 2, 3, 0]])
            at = np.clip(times + link.time_offset, link.times[0], link.times[-1])
            step = Slerp(link.times, table)(at)
        whole = whole * (step if link.parent == near else step.inv())
    return whole
