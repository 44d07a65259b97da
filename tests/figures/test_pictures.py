"""Pictures are reproducible, carry real text, and show names from the spec literally."""

from __future__ import annotations

import re
from collections.abc import Callable

import numpy as np
import pytest

from trunnion.figures import charts, drawings
from trunnion.figures.style import new_figure

UP = np.array([0.0, 0.0, -1.0])
TRIAD = np.array([[0.0, 0.0, 1.0], [0.0, 1.0, 0.0], [-1.0, 0.0, 0.0]])
HOSTILE = '<script>alert(1)</script> $x_1$ "quoted" & #'


def _map() -> str:
    x = np.linspace(-90.0, 90.0, 37)
    y = np.linspace(-45.0, 45.0, 19)
    margin = np.broadcast_to(90.0 - np.abs(x), (y.size, x.size))
    return charts.margin_map(x, y, margin, x_label=HOSTILE, y_label="bank", region=(-20, 25, -45, 45), worst=(25, 0))


def _maps() -> str:
    x, y = np.linspace(-180.0, 180.0, 19), np.linspace(-90.0, 90.0, 19)
    margin = np.broadcast_to(90.0 - np.abs(y)[:, None], (19, 19))
    locked = np.zeros((19, 19))
    panels = [
        charts.MapPanel(x, y, values, HOSTILE, "elevation", "bank 0°", (-180, 180, -20, 25), (0.0, 25.0))
        for values in (margin, locked)
    ]
    return charts.margin_maps(panels)


PICTURES: dict[str, Callable[[], str]] = {
    "maps": _maps,
    "runs": lambda: charts.run_margins([HOSTILE, "flight-2"], {"ordinary": [1.0, 2.0], "wing-last": [30.0, 40.0]}),
    "many runs": lambda: charts.run_margins([f"run {n}" for n in range(50)], {HOSTILE: list(np.linspace(0, 90, 50))}),
    "ranking": lambda: charts.ranking_chart([HOSTILE, "3-1-2"], [0.0, 45.0], marked="3-1-2", limit=20.0),
    "histogram": lambda: charts.margin_histogram(np.linspace(0, 90, 10), {HOSTILE: np.full(9, 100 / 9)}),
    "map": _map,
    "time": lambda: charts.margin_against_time(
        np.arange(4.0),
        {HOSTILE: np.full(4, 50.0)},
        worst={HOSTILE: (1.0, 50.0)},
        phases=[("hover", 0.0, 2.0)],
    ),
    "gains": lambda: charts.gain_curves(
        np.linspace(-89, 89, 30), {HOSTILE: np.full(30, 2.0)}, locks=[-90.0, 90.0], x_label="elevation"
    ),
    "varied": lambda: charts.varied_value(
        [10.0, 20.0],
        {HOSTILE: ([1.0, 2.0], [2.0, 3.0])},
        x_label="limit, deg",
        y_label="margin, deg",
        flips=[(12, 14)],
    ),
    "budget": lambda: charts.budget_bars({HOSTILE: 3.0, "thermal": 4.0}, total=5.0, limit=6.0, unit="arcsec"),
    "turns": lambda: drawings.turns_drawing([np.eye(3), TRIAD], [HOSTILE, "b", "c"], ["at zero", HOSTILE], up=UP),
    "mount": lambda: drawings.mount_drawing(TRIAD, [HOSTILE, "starboard", "down"], ["x", "y", "z"], up=UP),
    "rings": lambda: drawings.rings_drawing(
        [UP, np.array([0.0, 1.0, 0.0]), -UP], [HOSTILE, "elevation", "bank"], up=UP, parallel=(0, 2)
    ),
    "sphere": lambda: drawings.sphere_drawing(
        [(HOSTILE, TRIAD)], lock=UP, cap=0.3, up=UP, lock_word="up", worst=np.array([1.0, 0.0, 0.0])
    ),
}


@pytest.mark.parametrize("name", PICTURES)
def test_the_same_picture_gives_the_same_bytes(name: str) -> None:
    assert PICTURES[name]() == PICTURES[name]()


@pytest.mark.parametrize("name", PICTURES)
def test_names_are_shown_literally_and_as_text(name: str) -> None:
    svg = PICTURES[name]()
    assert "<script" not in svg
    assert "&lt;script&gt;alert(1)&lt;/script&gt; $x_1$" in svg


@pytest.mark.parametrize("name", PICTURES)
def test_no_date_and_no_reference_to_anything_outside(name: str) -> None:
    svg = PICTURES[name]()
    assert "<dc:date>" not in svg
    references = re.findall(r'(?:href|src)="([^"]*)"', svg)
    assert all(target.startswith("#") for target in references)


def test_drawing_leaves_no_setting_behind() -> None:
    import matplotlib as mpl

    before = dict(mpl.rcParams)
    PICTURES["turns"]()
    assert dict(mpl.rcParams) == before


def test_the_drawings_vertical_is_drawn_upward() -> None:
    view = drawings.view_matrix(UP)
    assert np.allclose(view @ view.T, np.eye(3), rtol=0, atol=1e-15)
    shown = view @ UP
    assert abs(shown[0]) < 1e-15
    assert shown[1] > 0.8


def test_a_figure_has_the_size_asked_for() -> None:
    figure = new_figure(width_mm=127.0, height_mm=50.8)
    assert np.allclose(figure.get_size_inches(), (5.0, 2.0))
