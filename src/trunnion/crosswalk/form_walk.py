"""From numbers that are no sequence to the angles of one and back, and what it costs to take one for the other.

Letters: `r`, `b` reference and body frame of the form; `p`, `q` those of the convention. An attitude R_rb of the form
is R_pq = R_pr R_rb R_bq in the convention.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from trunnion.attitude.conventions import Convention
from trunnion.attitude.forms import FormNumbers
from trunnion.attitude.rotations import rotation_angle
from trunnion.attitude.stated_forms import StatedForm
from trunnion.crosswalk.walk import frame_rotation
from trunnion.errors import AttitudeError

Array = NDArray[np.float64]

_STEP = 1e-6  # rad; central differences of this step are right to about 1e-9 away from the singular sets


@dataclass(frozen=True, eq=False)
class FormWalk:
    """A form and a convention of one vehicle, with the constant rotations between their frames.

    `columns`: which number of the form stands where the convention has its first, second, third angle when one is
    taken for the other: by name where all three names are the same, else by place; None where the form has two numbers.
    """

    form: StatedForm
    convention: Convention
    R_pr: Array
    R_bq: Array
    columns: tuple[int, int, int] | None

    def attitude(self, R_rb: ArrayLike) -> Array:
        """R_pq (..., 3, 3) of R_rb."""
        return self.R_pr @ np.asarray(R_rb, dtype=float) @ self.R_bq

    def angles(self, values: ArrayLike) -> tuple[Array, Array]:
        """The convention's angles (..., 3) rad and its lock margin (...) rad, of the form's numbers (..., n)."""
        found = self.convention.angles(self.attitude(self.form.rotation(values)))
        return np.asarray(found.angles), np.asarray(found.margin)

    def numbers(self, angles: ArrayLike) -> FormNumbers:
        """The form's numbers of the convention's angles (..., 3) rad, with the form's own margin and flags."""
        R_pq = self.convention.matrix(angles)
        return self.form.numbers(self.R_pr.T @ R_pq @ self.R_bq.T)

    def taken_for_angles(self, values: ArrayLike) -> Array:
        """Rotation angle (...) rad of the error when the form's numbers are taken for the convention's angles.

        Raises AttitudeError for a form of two numbers, which cannot be taken for three.
        """
        if self.columns is None:
            raise AttitudeError(f"'{self.form.name}' has two numbers", remedy="state the roll")
        numbers = np.asarray(values, dtype=float)
        taken = self.convention.matrix(numbers[..., self.columns])
        return rotation_angle(taken, self.attitude(self.form.rotation(numbers)))

    def amplification(self, values: ArrayLike) -> Array:
        """Largest growth (...) of a small error of the form's numbers into the convention's angles.

        2-norm of the derivatives, by central differences; means nothing at either singular set.
        """
        numbers = np.asarray(values, dtype=float)
        columns = []
        for place in range(numbers.shape[-1]):
            step = np.zeros(numbers.shape[-1])
            step[place] = _STEP
            ahead, back = self.angles(numbers + step)[0], self.angles(numbers - step)[0]
            columns.append((np.remainder(ahead - back + np.pi, 2.0 * np.pi) - np.pi) / (2.0 * _STEP))
        return np.asarray(np.linalg.norm(np.stack(columns, axis=-1), ord=2, axis=(-2, -1)))


def form_walk(form: StatedForm, convention: Convention) -> FormWalk:
    """The walk between a form and a convention whose frames name the same axes (AttitudeError otherwise)."""
    outer = frame_rotation(form.reference, convention.reference)
    inner = frame_rotation(convention.body, form.body)
    return FormWalk(form, convention, outer, inner, _columns(form.names, convention.angle_names))


def _columns(names: tuple[str, ...], angles: tuple[str, str, str]) -> tuple[int, int, int] | None:
    if len(names) != 3:
        return None
    if set(names) == set(angles):
        return names.index(angles[0]), names.index(angles[1]), names.index(angles[2])
    return 0, 1, 2
