"""Identification: time in every mode for 50 and 500 samples, and of the next measurement, against plain building.

Baseline of the ratio: building the 1152 attitudes of every sample with scipy (the least any identification must do).
"""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np
from scipy.spatial.transform import Rotation

from trunnion.crosswalk.fitting import Constants
from trunnion.crosswalk.identify import identify_angles
from trunnion.crosswalk.next_measurement import next_measurement
from trunnion.crosswalk.offsets import identify_with_offsets
from trunnion.crosswalk.other_forms import identify_other_forms
from trunnion.crosswalk.rate_evidence import identify_by_rates
from trunnion.crosswalk.readings import all_chains

LIMITS = {50: 0.2, 500: 1.0}
NEXT_LIMIT = 2.0


def best_of(run: Callable[[], object], rounds: int = 3) -> float:
    """Least wall time (s)."""
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        run()
        times.append(time.perf_counter() - start)
    return min(times)


def with_scipy(numbers: np.ndarray) -> None:
    """Every chain's attitudes of all samples, one scipy call a chain."""
    for chain in all_chains():
        letters = "".join("XYZ"[axis] for axis in chain.axes)
        Rotation.from_euler(
            letters, numbers[:, chain.columns] * np.array(chain.signs), degrees=chain.degrees
        ).as_matrix()


def samples(count: int) -> tuple[np.ndarray, np.ndarray]:
    """Angles over +-60 deg and their attitudes with 0.1 deg noise, a tenth of them false."""
    generator = np.random.default_rng(1)
    numbers = generator.uniform(-60, 60, size=(count, 3))
    noise = Rotation.from_rotvec(generator.normal(scale=np.radians(0.1), size=(count, 3)))
    truth = (Rotation.from_euler("ZXY", numbers, degrees=True) * noise).as_matrix()
    truth[::10] = Rotation.random(len(truth[::10]), random_state=2).as_matrix()
    return numbers, truth


def main() -> None:
    """Print a table of times, limits and ratios."""
    for count, limit in LIMITS.items():
        numbers, truth = samples(count)
        baseline = best_of(lambda numbers=numbers: with_scipy(numbers))
        print(f"{count} samples; baseline {baseline:.3f} s")
        for mode in Constants:
            took = best_of(lambda n=numbers, t=truth, m=mode: identify_angles(n, t, constants=m, noise=np.radians(0.1)))
            verdict = "reached" if took <= limit else "MISSED"
            print(f"  {mode.value:55s} {took:.3f} s (limit {limit} s, {verdict}; ratio {took / baseline:.2f})")
        for what, run in (("offsets", identify_with_offsets), ("forms that are no sequence", identify_other_forms)):
            print(f"  {what:55s} {best_of(lambda n=numbers, t=truth, r=run: r(n, t), 1):.3f} s")
    special = np.array([[10.0, 0, 0], [0, 20, 0], [0, 0, 30]])
    found = identify_angles(special, Rotation.from_euler("ZXY", special, degrees=True).as_matrix())
    took = best_of(lambda: next_measurement(found))
    print(f"next measurement for {len(found.fits)} readings {took:.3f} s (limit {NEXT_LIMIT} s)")
    one = np.array([[90.0, 90, 90]])
    found = identify_angles(one, Rotation.from_euler("ZXY", one, degrees=True).as_matrix(), constants=Constants.RIGHT)
    took = best_of(lambda: next_measurement(found), 1)
    print(f"next measurement for {len(found.fits)} readings {took:.3f} s (limit {NEXT_LIMIT} s)")
    t = np.arange(0.0, 60.0, 0.02)
    angles = np.column_stack([40 * np.sin(0.5 * t), 30 * np.sin(0.9 * t + 1), 50 * np.sin(0.7 * t + 2)])
    turned = Rotation.from_euler("ZYX", angles, degrees=True)
    rates = np.vstack([(turned[:-1].inv() * turned[1:]).as_rotvec() / 0.02, np.zeros(3)])
    print(f"rates over {len(t)} samples {best_of(lambda: identify_by_rates(t, angles, rates), 1):.3f} s")


if __name__ == "__main__":
    main()
