"""Shared test rules: programs from outside are named when missing, and CI turns every skip into a failure."""

from __future__ import annotations

import os
import shutil
from pathlib import Path

import pytest
from hypothesis import settings

# Fixed examples on every commit, and no deadlines: a busy machine must not decide a test.
settings.register_profile("trunnion", deadline=None, derandomize=True)
settings.load_profile("trunnion")

NO_SKIP = os.environ.get("TRUNNION_NO_SKIP") == "1"
FULL = os.environ.get("TRUNNION_FULL") == "1"
REPOSITORY = Path(__file__).parents[1]


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Skip what needs a missing program, naming it; keep the full counts for the full run."""
    for item in items:
        for mark in item.iter_markers("needs"):
            missing = [program for program in mark.args if shutil.which(program) is None]
            if missing:
                item.add_marker(pytest.mark.skip(reason=f"needs {', '.join(missing)}, not installed here"))
    if not FULL:
        items[:] = [item for item in items if item.get_closest_marker("full") is None]


@pytest.hookimpl(hookwrapper=True)
def pytest_runtest_makereport(item: pytest.Item):
    """With TRUNNION_NO_SKIP=1 a skipped test is a failed one."""
    outcome = yield
    report = outcome.get_result()
    if NO_SKIP and report.skipped and not hasattr(report, "wasxfail"):
        reason = report.longrepr[2] if isinstance(report.longrepr, tuple) else report.longrepr
        report.outcome = "failed"
        report.longrepr = f"skipped where nothing may be skipped: {reason}"


@pytest.fixture(scope="session")
def repository() -> Path:
    """The root of the checkout."""
    return REPOSITORY


@pytest.fixture(scope="session")
def count():
    """`count(2000)`: the full count in the full run, a fixed tenth of it (at least one) otherwise."""
    return lambda full: full if FULL else max(1, full // 10)
