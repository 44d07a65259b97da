"""The published condition for a rotation to be reachable, for random axes and scipy's random rotations."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from trunnion.hardware.gimbals import GimbalChain, Joint
from trunnion.hardware.joint_solutions import attitude_solutions, reachable_set


def _published_margin(axes, R):
    r1, r2, r3 = axes
    left = np.abs(np.einsum("i,nij,j->n", r1, R - np.outer(r2, r2), r3))
    return np.sqrt(1 - (r1 @ r2) ** 2) * np.sqrt(1 - (r3 @ r2) ** 2) - left


def test_condition_for_random_axes(count):
    rng = np.random.default_rng(4)
    for _ in range(count(300)):
        axes = rng.normal(size=(3, 3))
        axes /= np.linalg.norm(axes, axis=1, keepdims=True)
        if min(np.linalg.norm(np.cross(axes[:-1], axes[1:]), axis=1)) < 0.05:
            continue
        chain = GimbalChain("chain", tuple(Joint(f"a{k}", a) for k, a in enumerate(axes)))
        R = Rotation.random(300, random_state=rng).as_matrix()
        published = _published_margin(axes, R)
        decided = np.abs(published) > 1e-12
        ours = attitude_solutions(chain, R).reachable
        np.testing.assert_array_equal(ours[decided], published[decided] >= 0)


@pytest.mark.parametrize(("l12", "l23"), [(90, 90), (60, 50), (120, 90), (30, 140)])
def test_share_of_attitudes_is_the_product_of_the_two_sines(l12, l23):
    """Counted on 20,000 random rotations: four standard deviations."""
    middle = np.array([0.0, 0.0, 1.0])
    outer = Rotation.from_rotvec(np.radians([l12, 0, 0])).apply(middle)
    inner = Rotation.from_rotvec(np.radians([0, l23, 0])).apply(middle)
    chain = GimbalChain("chain", tuple(Joint(f"a{k}", a) for k, a in enumerate([outer, middle, inner])))
    reach = reachable_set(chain)
    R = Rotation.random(20_000, random_state=5).as_matrix()
    counted = np.mean(_published_margin(chain.axes, R) >= -1e-12)
    assert counted == pytest.approx(reach.share, abs=4 * np.sqrt(0.25 / 20_000))
    assert reach.cone_ahead == pytest.approx(np.radians(abs(l12 - l23)), abs=1e-12)
    assert reach.cone_behind == pytest.approx(np.radians(abs(180 - l12 - l23)), abs=1e-12)
    assert (reach.share == pytest.approx(1.0)) == (l12 == l23 == 90)
