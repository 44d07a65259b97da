"""Generated C is compiled and run, generated Python is run; both agree with the library to rounding."""

from __future__ import annotations

import ctypes
import importlib.util
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from trunnion.attitude.conventions import Convention
from trunnion.attitude.extraction import Policy
from trunnion.attitude.rotations import rotation_angle
from trunnion.attitude.sequences import Sense, Sequence
from trunnion.errors import AttitudeError
from trunnion.symbolic.codegen import codegen

GCC = ["gcc", "-std=c99", "-O1", "-Wall", "-Wextra", "-Wconversion", "-pedantic", "-Werror"]
DOUBLE, FLOAT = 3e-15, 1.5e-6  # rad or 1: a dozen roundings of 1.1e-16, and of 6e-8

DRIVER = """
#include "stated.h"
void from_angles(int n, const double *a, double *m, double *q, float *mf, float *qf)
{
    int i, k;
    for (i = 0; i < n; ++i) {
        float af[3];
        for (k = 0; k < 3; ++k) af[k] = (float)a[3*i + k];
        stated_matrix_from_angles(a + 3*i, m + 9*i);
        stated_quaternion_from_angles(a + 3*i, q + 4*i);
        stated_matrix_from_angles_f(af, mf + 9*i);
        stated_quaternion_from_angles_f(af, qf + 4*i);
    }
}
void from_matrix(int n, int policy, const double *m, double *a, double *margin, double *b, float *af)
{
    int i, k;
    for (i = 0; i < n; ++i) {
        float mf[9];
        double q[4];
        for (k = 0; k < 9; ++k) mf[k] = (float)m[9*i + k];
        margin[i] = stated_angles_from_matrix(m + 9*i, policy, a + 3*i);
        stated_quaternion_from_matrix(m + 9*i, q);
        stated_angles_from_quaternion(q, policy, b + 3*i);
        stated_angles_from_matrix_f(mf, policy, af + 3*i);
    }
}
void rates(int n, const double *a, const double *r, double *body, double *reference, double *back)
{
    int i;
    for (i = 0; i < n; ++i) {
        stated_body_rate(a + 3*i, r + 3*i, body + 3*i);
        stated_reference_rate(a + 3*i, r + 3*i, reference + 3*i);
        stated_angle_rates(a + 3*i, body + 3*i, back + 3*i);
    }
}
"""


def pointer(array: np.ndarray) -> ctypes.c_void_p:
    return array.ctypes.data_as(ctypes.c_void_p)


class Compiled:
    """The generated header behind ctypes."""

    def __init__(self, convention: Convention, folder: Path) -> None:
        self.convention = convention
        for name, source in codegen(convention).items():
            (folder / name).write_text(source, encoding="ascii")
        (folder / "driver.c").write_text(DRIVER)
        command = [*GCC, "-shared", "-fPIC", "driver.c", "-o", "driver.so", "-lm"]
        subprocess.run(command, cwd=folder, check=True, capture_output=True, text=True)
        self.library = ctypes.CDLL(str(folder / "driver.so"))

    def from_angles(self, angles: np.ndarray) -> tuple[np.ndarray, ...]:
        n = len(angles)
        m, q = np.empty((n, 3, 3)), np.empty((n, 4))
        mf, qf = np.empty((n, 3, 3), np.float32), np.empty((n, 4), np.float32)
        self.library.from_angles(n, *map(pointer, (np.ascontiguousarray(angles), m, q, mf, qf)))
        return m, q, mf, qf

    def from_matrix(self, matrices: np.ndarray, policy: int = 0) -> tuple[np.ndarray, ...]:
        n = len(matrices)
        a, margin, b, af = np.empty((n, 3)), np.empty(n), np.empty((n, 3)), np.empty((n, 3), np.float32)
        m = np.ascontiguousarray(matrices)
        self.library.from_matrix(n, policy, *map(pointer, (m, a, margin, b, af)))
        return a, margin, b, af

    def rates(self, angles: np.ndarray, rates: np.ndarray) -> tuple[np.ndarray, ...]:
        found = [np.empty_like(angles) for _ in range(3)]
        self.library.rates(len(angles), *map(pointer, (angles, rates, *found)))
        return tuple(found)


def attitudes(convention: Convention, count: int, seed: int) -> np.ndarray:
    """Stated angles (count, 3): anywhere, and a share close to and at both singular values."""
    draw = np.random.default_rng(seed)
    singular = np.array([0.0, np.pi]) if convention.sequence.repeated else np.array([np.pi / 2, -np.pi / 2])
    turns = draw.uniform(-np.pi, np.pi, (count, 3))
    near = count // 2
    turns[:near, 1] = draw.choice(singular, near) + draw.choice([0.0, 1e-15, 1e-12, 1e-9, 1e-6, 1e-3, -1e-7], near)
    return convention.stated_from_chain(turns)


def compare(convention: Convention, folder: Path, count: int = 400) -> None:
    """Everything the header offers against the library."""
    made = Compiled(convention, folder)
    angles = attitudes(convention, count, 3)
    R = convention.matrix(angles)
    M, q = convention.stated_matrix(R), convention.stated_quaternion(R)
    m, four, mf, qf = made.from_angles(angles)
    close(m, M, DOUBLE)
    close(np.abs(np.sum(four * q, axis=-1)), 1.0, DOUBLE)
    close(mf, M, FLOAT)
    close(np.abs(np.sum(qf * q, axis=-1)), 1.0, FLOAT)
    for number, policy in enumerate((Policy.LAST_ZERO, Policy.FIRST_ZERO)):
        a, margin, b, af = made.from_matrix(M, number)
        ours = convention.angles(R, policy)
        for triple in (a, b, af.astype(float)):
            allowed = FLOAT * 4 if triple is not a and triple is not b else DOUBLE * 4
            close(rotation_angle(convention.matrix(triple), R), 0.0, allowed)
        close(margin, ours.margin, DOUBLE)
        clear = ours.margin > 0.01
        close(np.cos(a[clear] - ours.angles[clear]), 1.0, 1e-14)
        inside = np.abs(np.abs(ours.angles[clear]) - np.pi) > 1e-6  # at the seam both ends are right
        close(np.where(inside, a[clear] - ours.angles[clear], 0.0), 0.0, 1e-12)
    _compare_rates(made, angles[count // 2 :])


def _compare_rates(made: Compiled, angles: np.ndarray) -> None:
    """Against differences of the library's matrices, and there and back."""
    convention = made.convention
    rates = np.random.default_rng(5).normal(size=angles.shape)
    body, reference, back = made.rates(np.ascontiguousarray(angles), rates)
    R = convention.matrix(angles)
    close(np.einsum("nij,nj->ni", R, body), reference, 1e-13)
    step = 1e-5
    slope = (convention.matrix(angles + step * rates) - convention.matrix(angles - step * rates)) / (2 * step)
    skew = np.swapaxes(R, -1, -2) @ slope
    close(np.stack([skew[:, 2, 1], skew[:, 0, 2], skew[:, 1, 0]], -1), body, 1e-7)
    clear = convention.lock_margin(R) > 0.1
    close(back[clear], rates[clear], 1e-11)


def close(actual, expected, atol: float) -> None:
    np.testing.assert_allclose(actual, expected, rtol=0, atol=atol)


@pytest.mark.needs("gcc")
@pytest.mark.parametrize("number", [0, 5, 10, 15, 18])
def test_c_agrees_with_the_library_for_any_convention(number: int, any_convention, tmp_path) -> None:
    compare(any_convention(number), tmp_path)


@pytest.mark.full
@pytest.mark.needs("gcc")
@pytest.mark.parametrize("sense", list(Sense), ids=lambda sense: sense.name)
@pytest.mark.parametrize("sequence", list(Sequence), ids=lambda sequence: sequence.name)
def test_c_agrees_with_the_library_for_all_24(sequence: Sequence, sense: Sense, convention, tmp_path) -> None:
    compare(convention(sequence.name, sense), tmp_path, 4000)


@pytest.mark.full
@pytest.mark.needs("gcc")
@pytest.mark.parametrize("number", range(24))
def test_c_agrees_with_the_library_for_many_conventions(number: int, any_convention, tmp_path) -> None:
    compare(any_convention(number), tmp_path, 1000)


RANGES = [
    ("ZYX", ((-np.pi, np.pi), (np.pi / 2, 3 * np.pi / 2), (-np.pi, np.pi))),
    ("ZXZ", ((0.0, 2 * np.pi), (0.0, np.pi), (0.0, 2 * np.pi))),
    ("ZYX", ((-np.pi, np.pi), (-np.pi, np.pi), (-np.pi / 2, np.pi / 2))),
    ("YZX", ((0.0, np.pi), (-np.pi, np.pi), (-np.pi, np.pi))),
]


@pytest.mark.needs("gcc")
@pytest.mark.parametrize(("name", "ranges"), RANGES)
def test_c_keeps_the_stated_ranges(name: str, ranges, convention, tmp_path) -> None:
    stated = convention(name, ranges=ranges)
    made = Compiled(stated, tmp_path)
    R = stated.matrix(np.random.default_rng(9).uniform(-np.pi, np.pi, (500, 3)))
    ours = stated.angles(R)
    a, *_ = made.from_matrix(stated.stated_matrix(R))
    clear = ours.margin > 1e-3
    close(a[clear], ours.angles[clear], 1e-11)


@pytest.mark.needs("gcc")
def test_c_self_test_passes_and_sees_a_wrong_row(convention, tmp_path) -> None:
    stated = convention("XZY", Sense.FIXED, signs=(1, -1, 1))
    angles = np.array([[0.3, 0.4, -0.7], [1.0, -0.2, 2.0]])
    R = stated.matrix(angles)
    rows = list(zip(angles, stated.stated_matrix(R), stated.stated_quaternion(R), strict=True))
    assert _run_c(codegen(stated, rows), tmp_path) == (0, "2 reference attitudes, 0 failures\n")
    wrong = [(rows[0][0], rows[0][1].T, rows[0][2]), rows[1]]
    code, text = _run_c(codegen(stated, wrong), tmp_path)
    assert code == 1
    assert "row 1: double matrix from angles: off by" in text
    assert "row 2" not in text


def _run_c(sources: dict[str, str], folder: Path) -> tuple[int, str]:
    for name, source in sources.items():
        (folder / name).write_text(source, encoding="ascii")
    subprocess.run([*GCC, "stated_selftest.c", "-o", "run", "-lm"], cwd=folder, check=True, capture_output=True)
    done = subprocess.run([str(folder / "run")], capture_output=True, text=True, check=False)
    return done.returncode, done.stdout


def load(convention: Convention, folder: Path):
    source = codegen(convention)["stated.py"]
    path = folder / "stated.py"
    path.write_text(source, encoding="ascii")
    spec = importlib.util.spec_from_file_location("stated", path)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.mark.parametrize("number", [0, 10, 18])
def test_python_agrees_with_the_library(number: int, any_convention, tmp_path) -> None:
    convention = any_convention(number)
    module = load(convention, tmp_path)
    assert module.self_test() == []
    for angles in attitudes(convention, 100, 4):
        R = convention.matrix(angles)
        M, q = convention.stated_matrix(R), convention.stated_quaternion(R)
        close(module.matrix_from_angles(angles), M, DOUBLE)
        assert abs(np.dot(module.quaternion_from_angles(angles), q)) == pytest.approx(1.0, abs=DOUBLE)
        for policy in (module.LAST_ZERO, module.FIRST_ZERO):
            triple, margin = module.angles_from_matrix(M.tolist(), policy)
            assert rotation_angle(convention.matrix(triple), R) < 4 * DOUBLE
            assert margin == pytest.approx(float(convention.lock_margin(R)), abs=DOUBLE)
            triple, _ = module.angles_from_quaternion(q.tolist(), policy)
            assert rotation_angle(convention.matrix(triple), R) < 4 * DOUBLE


@pytest.mark.parametrize(("name", "ranges"), RANGES)
def test_python_keeps_the_stated_ranges(name: str, ranges, convention, tmp_path) -> None:
    stated = convention(name, ranges=ranges)
    module = load(stated, tmp_path)
    for angles in np.random.default_rng(9).uniform(-np.pi, np.pi, (60, 3)):
        R = stated.matrix(angles)
        triple, margin = module.angles_from_matrix(R.tolist())
        if margin > 1e-3:
            close(triple, stated.angles(R).angles, 1e-11)


def test_python_runs_without_numpy(convention, tmp_path) -> None:
    (tmp_path / "stated.py").write_text(codegen(convention())["stated.py"])
    blocked = "import sys; sys.modules['numpy'] = None; import runpy; runpy.run_path('stated.py', run_name='__main__')"
    done = subprocess.run([sys.executable, "-c", blocked], cwd=tmp_path, capture_output=True, text=True, check=False)
    assert (done.returncode, done.stdout) == (0, "3 reference attitudes, 0 failures\n")


@pytest.mark.parametrize("policy", [0, 1])
def test_exact_lock_takes_the_policy(policy: int, convention, tmp_path) -> None:
    """The exact matrix of heading 90 deg, elevation 90 deg: the published dispute of two programs, ours says both."""
    module = load(convention(), tmp_path)
    R = [[0.0, -1.0, 0.0], [0.0, 0.0, 1.0], [-1.0, 0.0, 0.0]]
    triple, margin = module.angles_from_matrix(R, policy)
    assert margin == 0.0
    assert triple[1] == np.pi / 2
    assert triple[2 if policy == 0 else 0] == 0.0
    close(module.matrix_from_angles(triple), R, 1e-15)


def test_hostile_names_stay_inside_their_comments(convention) -> None:
    stated = convention(angle_names=('x */ evil() /* "', "two\nlines", '"""'))
    for source in codegen(stated).values():
        source.encode("ascii")
        assert "*/ evil" not in source
        assert "two\nlines" not in source
    compile(codegen(stated)["stated.py"], "stated.py", "exec")


def test_rows_of_the_wrong_shape_are_named(convention) -> None:
    with pytest.raises(AttitudeError, match="reference attitude 2 has parts of shape"):
        codegen(convention(), [([0, 0, 0], np.eye(3), [1, 0, 0, 0]), ([0, 0], np.eye(3), [1, 0, 0, 0])])


def test_file_names_follow_the_convention(convention) -> None:
    stated = Convention(
        "Wing-last (B)", convention().reference, convention().body, Sequence.ZXY, Sense.MOVING, ("a", "b", "d")
    )
    assert set(codegen(stated)) == {"wing_last_b.h", "wing_last_b_selftest.c", "wing_last_b.py"}
