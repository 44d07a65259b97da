"""Per-angle offsets, when asked for: R = Rot(p, x + a) Rot(q, y + b) Rot(r, z + c) with a, b, c unknown.

Each offset by itself has a closed-form best value (the trace is A cos a + B sin a + C), so the three are improved by
turns, from right-angle starts of the middle and last one; the best are then refined together by Gauss-Newton steps.
Offsets make more functions equal: (a, b, c) and (a + pi, pi - b, c + pi) are one attitude, and a right-angle offset of
the middle angle turns three different axes into a repeated one. Readings that predict the same are listed once, the one
with the least offsets.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.rotations import elementary, rotation_vector
from trunnion.attitude.words import degrees_text
from trunnion.crosswalk.fitting import Constants, Fitted, angle_between, scores
from trunnion.crosswalk.identify import Finding, Identification, Reading, chain_reading, checked_samples, decide
from trunnion.crosswalk.readings import Chain, all_chains

Array = NDArray[np.float64]

_USED = 16  # samples that choose the candidates
_SWEEPS = 5
_REFINED = 64
_REFINED_ON = 48
_POLISHED = 6
_STEPS = 12
_SAME = 1e-6  # rad; predictions this near are one function
_PROBES = np.random.default_rng(11).uniform(-3.0, 3.0, size=(6, 3))
_LARGEST_RADIANS = 4.0 * np.pi  # numbers above this are in degrees


@dataclass(frozen=True)
class WithOffsets:
    """A chain with offsets (rad) added to the three columns, in the order of the columns."""

    chain: Chain
    offsets: tuple[float, float, float]

    @property
    def turns(self) -> tuple[float, float, float]:
        """The offsets (rad) as turns of the three factors."""
        first, second, third = (
            sign * self.offsets[column] for sign, column in zip(self.chain.signs, self.chain.columns, strict=True)
        )
        return first, second, third

    def matrix(self, numbers: ArrayLike) -> Array:
        """R (..., 3, 3) of numbers (..., 3) as they stand in the file."""
        unit = 180.0 / np.pi if self.chain.degrees else 1.0
        return self.chain.matrix(np.asarray(numbers, dtype=float) + np.array(self.offsets) * unit)


def identify_with_offsets(
    numbers: ArrayLike,
    truth: ArrayLike,
    *,
    noise: float | None = None,
    names: tuple[str, str, str] = ("first number", "second number", "third number"),
) -> Identification:
    """Find chains and offsets that take numbers (N, 3) to R_rb (N, 3, 3), no constant rotation besides.

    The findings' keys are `WithOffsets`. Needs two generic samples; raises AttitudeError as `identify_angles` does.
    """
    written, R = checked_samples(numbers, truth)
    some = np.unique(np.linspace(0, len(R) - 1, _USED).astype(int))
    units = (True,) if np.abs(written).max() > _LARGEST_RADIANS else (True, False)
    rough: list[tuple[float, Chain, tuple[float, float, float]]] = []
    for unit in units:
        rough += _rough(written[some], R[some], unit)
    rough.sort(key=lambda entry: entry[0])
    more = np.unique(np.linspace(0, len(R) - 1, _REFINED_ON).astype(int))
    refined = [_refine(chain, turns, written[more], R[more]) for _, chain, turns in rough[:_REFINED]]
    kept = _different(sorted(refined, key=lambda w: _miss(w, written, R)))
    if len(more) < len(R):
        best = [_refine(entry.chain, entry.turns, written, R) for entry in kept[:_POLISHED]]
        kept = sorted([*best, *kept[_POLISHED:]], key=lambda w: _miss(w, written, R))
    readings = [_reading(entry, names) for entry in kept]
    residuals = np.array([angle_between(entry.matrix(written), R) for entry in kept])
    eye = np.broadcast_to(np.eye(3), (len(kept), 3, 3))
    fitted = Fitted(eye, eye, residuals, scores(residuals))
    return decide(readings, fitted, Constants.NONE, noise, len(all_chains()) // (2 // len(units)))


def offsets_of(finding: Finding) -> tuple[float, float, float]:
    """Offsets (rad) a finding adds to the columns; zeros for one without."""
    key = finding.reading.key
    return key.offsets if isinstance(key, WithOffsets) else (0.0, 0.0, 0.0)


def _reading(entry: WithOffsets, names: tuple[str, str, str]) -> Reading:
    base = chain_reading(entry.chain, Constants.NONE, names)
    told = [
        f"{names[column]} {'+' if offset > 0 else '−'} {degrees_text(abs(offset), 4)}"
        for column, offset in enumerate(entry.offsets)
        if offset
    ]
    tail = f"; offsets: {', '.join(told)}" if told else "; no offsets"
    return Reading(base.words + tail, tuple(name + tail for name in base.names), entry.chain, entry)


def _rough(written: Array, R: Array, degrees: bool) -> list[tuple[float, Chain, tuple[float, float, float]]]:
    """Every chain from 16 starts (turns of the middle and last factor), each turn improved in closed form by turns."""
    chains = all_chains(degrees=degrees)
    x = np.radians(written) if degrees else written
    starts = np.array(list(itertools.product((0.0,), np.arange(4) * np.pi / 2, np.arange(4) * np.pi / 2)))
    found = []
    for axes in sorted({chain.axes for chain in chains}):
        of_axes = [chain for chain in chains if chain.axes == axes]
        values = np.array([[s * x[:, c] for s, c in zip(k.signs, k.columns, strict=True)] for k in of_axes])
        turns = np.broadcast_to(starts, (len(of_axes), *starts.shape)).copy()
        for _ in range(_SWEEPS):
            _improve(axes, values, turns, R)
        E = _product(axes, values, turns)
        miss = scores(angle_between(E, R))
        for k, chain in enumerate(of_axes):
            best = int(np.argmin(miss[k]))
            found.append((float(miss[k, best]), chain, tuple(turns[k, best])))
    return found


def _product(axes: tuple[int, int, int], values: Array, turns: Array) -> Array:
    """(K, S, N, 3, 3) of columns (K, 3, N) with starts (K, S, 3) added."""
    one, two, three = (elementary(axis, values[:, None, n] + turns[:, :, n, None]) for n, axis in enumerate(axes))
    return one @ two @ three


def _improve(axes: tuple[int, int, int], values: Array, turns: Array, R: Array) -> None:
    """Each turn's best value with the other two held: maximum of sum tr(R^T F Rot(axis, x + a) L) over a."""
    for place in range(3):
        one, two, three = (elementary(a, values[:, None, n] + turns[:, :, n, None]) for n, a in enumerate(axes))
        if place == 0:
            M = (two @ three) @ np.swapaxes(R, -1, -2)
        elif place == 1:
            M = three @ (np.swapaxes(R, -1, -2) @ one)
        else:
            M = np.swapaxes(R, -1, -2) @ (one @ two)
        own = elementary(axes[place], values[:, None, place])
        M = (own @ M).sum(axis=2)  # tr(Rot(a) M): cos and sin parts in the plane across the axis
        i, j = (axes[place] + 1) % 3, (axes[place] + 2) % 3
        turns[:, :, place] = np.arctan2(M[..., i, j] - M[..., j, i], M[..., i, i] + M[..., j, j])


def _refine(chain: Chain, turns: tuple[float, float, float], written: Array, R: Array) -> WithOffsets:
    """Gauss-Newton steps on the three turns, the worst samples weighted down; near right angles they are snapped."""
    x = np.radians(written) if chain.degrees else written
    values = np.array([[[s * x[:, c] for s, c in zip(chain.signs, chain.columns, strict=True)]]])[0]
    t = np.array(turns, dtype=float)
    for _ in range(_STEPS):
        E = _product(chain.axes, values, t[None, None])[0, 0]
        miss = rotation_vector(E.swapaxes(-1, -2) @ R)
        J = _jacobian(chain, values[0], t)
        weight = 1.0 / np.maximum(np.linalg.norm(miss, axis=1), 1e-3)
        normal = np.einsum("nij,n,nik->jk", J, weight, J) + 1e-12 * np.eye(3)
        step = np.linalg.solve(normal, np.einsum("nij,n,ni->j", J, weight, miss))
        t += step
        if np.abs(step).max() < 1e-13:
            break
    offsets = np.zeros(3)
    for place, (sign, column) in enumerate(zip(chain.signs, chain.columns, strict=True)):
        offsets[column] = _wrapped(sign * t[place])
    return _snapped(WithOffsets(chain, tuple(offsets)), written, R)  # type: ignore[arg-type]


def _jacobian(chain: Chain, values: Array, t: Array) -> Array:
    """(N, 3, 3): the turn in body axes per turn of each factor."""
    i, j, k = chain.axes
    last = elementary(k, values[2] + t[2])
    two = elementary(j, values[1] + t[1]) @ last
    return np.stack([two[:, i, :], last[:, j, :], np.broadcast_to(np.eye(3)[k], (len(last), 3))], axis=-1)


def _snapped(entry: WithOffsets, written: Array, R: Array) -> WithOffsets:
    """Right angles in place of offsets beside them, unless the fit gets worse by more than a tenth."""
    right = np.pi / 2 * np.round(np.array(entry.offsets) / (np.pi / 2))
    near = np.abs(np.array(entry.offsets) - right) < np.radians(0.5)
    snapped = np.where(near, [_wrapped(float(value)) for value in right], entry.offsets)
    other = WithOffsets(entry.chain, tuple(float(value) for value in snapped))  # type: ignore[arg-type]
    return other if _miss(other, written, R) <= 1.1 * _miss(entry, written, R) + 1e-7 else entry


def _miss(entry: WithOffsets, written: Array, R: Array) -> float:
    return float(scores(angle_between(entry.matrix(written), R)))


def _different(entries: list[WithOffsets]) -> list[WithOffsets]:
    """Entries that predict different attitudes; of equal ones that with the least offsets."""
    kept: list[tuple[Array, WithOffsets]] = []
    for entry in entries:
        made = entry.matrix(np.degrees(_PROBES) if entry.chain.degrees else _PROBES)
        for n, (other, held) in enumerate(kept):
            if held.chain.degrees == entry.chain.degrees and angle_between(made, other).max() < _SAME:
                kept[n] = (other, min(held, entry, key=lambda e: (round(float(np.abs(e.offsets).sum()), 6), e.chain)))
                break
        else:
            kept.append((made, entry))
    return [entry for _, entry in kept]


def _wrapped(angle: float) -> float:
    made = float(np.arctan2(np.sin(angle), np.cos(angle)))
    return np.pi if made < -np.pi + 1e-9 else made
