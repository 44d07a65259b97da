"""The independent check of an identification: scipy makes the attitudes and, without constants, tries every name."""

from __future__ import annotations

import itertools
from typing import Any

import numpy as np
from numpy.typing import NDArray

from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.offsets import offsets_of
from trunnion.sheet import display, independent

Array = NDArray[np.float64]

_TOLERANCE_DEG = 1e-6
_MOST = 60  # samples the brute-force check uses


def show(study: Any, found: Any) -> None:
    """The misses of the best reading by scipy; and the least miss of all readings where no constant is unknown."""
    best = found.fits[0] if found.fits else found.next_best
    evidence = study.evidence
    if evidence.truth is None:
        _show_rates(study, best)
        return
    if best.reading.chain is None:
        _show_form(study, best)
        return
    theirs = np.degrees(_misses(best, evidence.numbers, evidence.truth))
    ours = np.degrees(best.residuals)
    display.check(
        "check:residuals",
        f"largest difference between the misses of {len(ours)} samples",
        ours=0.0,
        theirs=float(np.abs(ours - theirs).max()),
        tolerance=_TOLERANCE_DEG,
        unit="deg",
        library=independent.LIBRARY,
    )
    if found.constants is Constants.NONE and not any(offsets_of(best)):
        _show_all(study, best)


def _misses(best: Any, numbers: Array, truth: Array) -> Array:
    from scipy.spatial.transform import Rotation

    chain = best.reading.chain
    added = np.array(offsets_of(best))
    turns = (np.radians(numbers) if chain.degrees else numbers) + added
    letters = "".join("XYZ"[axis] for axis in chain.axes)
    made = Rotation.from_euler(letters, turns[:, chain.columns] * np.array(chain.signs))
    whole = Rotation.from_matrix(best.left) * made * Rotation.from_matrix(best.right)
    misses: Array = np.asarray((whole.inv() * Rotation.from_matrix(truth)).magnitude())
    return misses


def _show_all(study: Any, best: Any) -> None:
    """Least root mean square miss over 12 sequences, 6 column orders, 8 signs and two units, all by scipy."""
    from scipy.spatial.transform import Rotation

    some = np.unique(np.linspace(0, study.evidence.samples - 1, _MOST).astype(int))
    numbers, truth = study.evidence.numbers[some], Rotation.from_matrix(study.evidence.truth[some])
    least = np.inf
    for unit in (True, False):
        turns = np.radians(numbers) if unit else numbers
        for letters in ("XYZ", "XZY", "YXZ", "YZX", "ZXY", "ZYX", "XYX", "XZX", "YXY", "YZY", "ZXZ", "ZYZ"):
            for order in itertools.permutations(range(3)):
                for signs in itertools.product((1, -1), repeat=3):
                    made = Rotation.from_euler(letters, turns[:, order] * np.array(signs))
                    miss = (made.inv() * truth).magnitude()
                    least = min(least, float(np.sqrt(np.median(miss**2))))
    ours = float(np.sqrt(np.median(best.residuals[some] ** 2)))
    display.check(
        "check:all",
        f"least median miss of all 1152 readings over {len(some)} samples",
        ours=float(np.degrees(ours)),
        theirs=float(np.degrees(least)),
        tolerance=_TOLERANCE_DEG,
        unit="deg",
        library=independent.LIBRARY,
    )


def _show_form(study: Any, best: Any) -> None:
    """Quaternions, matrices, rotation vectors, tilt pairs: median miss by scipy against ours."""
    theirs = _form_misses(study.evidence, best)
    ours = float(np.degrees(np.median(best.residuals)))
    display.check(
        "check:form",
        f"median miss of {len(theirs)} samples",
        ours=ours,
        theirs=float(np.degrees(np.median(theirs))),
        tolerance=max(_TOLERANCE_DEG, 2.0 * ours),
        unit="deg",
        library=independent.LIBRARY,
    )


def _form_misses(evidence: Any, best: Any) -> Array:
    """Miss (N,) rad of each sample; of a tilt pair the largest miss of its three angles, read off the attitude."""
    from scipy.spatial.transform import Rotation

    left, right = Rotation.from_matrix(best.left), Rotation.from_matrix(best.right)
    truth = left.inv() * Rotation.from_matrix(evidence.truth) * right.inv()
    form = best.reading.key
    if evidence.quaternion is not None:
        q = evidence.quaternion
        made = Rotation.from_quat(q if "scalar last" in str(form) else np.roll(q, -1, axis=1))
    elif evidence.matrix is not None:
        M = evidence.matrix.reshape(-1, 3, 3)
        made = Rotation.from_matrix(M if "by rows, maps" in str(form) else np.swapaxes(M, 1, 2))
    else:
        turned = np.radians(evidence.numbers) if form.degrees else evidence.numbers
        turned = turned[:, form.columns] * np.array(form.signs)
        if form.kind != "vector":
            return _tilt_misses(form.kind, turned, truth.as_matrix())
        made = Rotation.from_rotvec(turned)
    if "reference to body" in str(form) and evidence.matrix is None:
        made = made.inv()
    misses: Array = np.asarray((made.inv() * truth).magnitude())
    return misses


def _tilt_misses(kind: str, turned: Array, R: Array) -> Array:
    """Heading clockwise from above of the first axis, and what each axis makes with the horizontal."""
    across = np.abs(R[:, 2, 2])
    down = [np.arcsin(R[:, 2, n]) if kind == "sine" else np.arctan2(R[:, 2, n], across) for n in (0, 1)]
    read = np.column_stack([np.arctan2(-R[:, 1, 0], R[:, 0, 0]), *down])
    apart = np.angle(np.exp(1j * (read - turned)))
    misses: Array = np.abs(apart).max(axis=1)
    return misses


def _show_rates(study: Any, best: Any) -> None:
    """Rates of the identified attitudes, differenced by scipy, against the logged ones: the factor is 1."""
    from scipy.spatial.transform import Rotation

    evidence = study.evidence
    chain, unit = best.reading.key
    if best.reading.chain is not None:
        turns = np.radians(evidence.numbers) if chain.degrees else evidence.numbers
        letters = "".join("XYZ"[axis] for axis in chain.axes)
        made = Rotation.from_euler(letters, turns[:, chain.columns] * np.array(chain.signs))
    else:
        q = evidence.quaternion
        made = Rotation.from_quat(q if "scalar last" in chain else np.roll(q, -1, axis=1))
        made = made.inv() if "reference to body" in chain else made
    rates = np.radians(evidence.rates) if unit else evidence.rates
    ours = (made[:-1].inv() * made[1:]).as_rotvec()
    logged = 0.5 * (rates[1:] + rates[:-1]) * np.diff(evidence.times)[:, None]
    slope = float((ours * logged).sum() / (logged * logged).sum())
    display.check(
        "check:rates",
        "factor between the turns from sample to sample of the reading found and those of the logged rates",
        ours=1.0,
        theirs=slope,
        tolerance=0.05,
        unit="",
        library=independent.LIBRARY,
    )
