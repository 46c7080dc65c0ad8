"""Charts over time: ranges, values at the cursor, scrubbing."""

import math

import numpy as np
import pytest
from PySide6.QtCore import QPoint, Qt

from engine.simulate import roll
from studio.display import Series, path_of, series_of
from studio.theme import Theme
from studio.views.charts import ChartsView
from studio.workspace import Workspace
from tests.designs import helix_run


@pytest.fixture(scope="module")
def rolled():
    return roll(helix_run())


@pytest.fixture
def view(qtbot, rolled):
    workspace = Workspace(Theme())
    made = ChartsView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.resize(600, 420)
    made.show()
    workspace.new(rolled.design)
    workspace.take_roll(rolled)
    made.grab()
    return made


def test_whole_time_fits_in(view, rolled):
    left, right = (view.point(t, 0.0).x() for t in (0.0, rolled.duration))
    assert left == pytest.approx(view.room().left())
    assert right == pytest.approx(view.room().right())


def test_charts_stand_one_under_the_other(view):
    bands = [view.band(number) for number in range(6)]
    assert all(upper.bottom() < lower.top() for upper, lower in zip(bands, bands[1:], strict=False))
    assert bands[-1].bottom() == pytest.approx(view.room().bottom())


def test_press_and_drag_scrub(view, qtbot):
    qtbot.mousePress(view, Qt.MouseButton.LeftButton, pos=QPoint(300, 200))
    qtbot.mouseMove(view, QPoint(400, 20))
    qtbot.mouseRelease(view, Qt.MouseButton.LeftButton, pos=QPoint(400, 20))
    assert view.point(view.workspace.time, 0.0).x() == pytest.approx(400.0)


def test_ranges_hold_all_values_and_start_at_zero(view, rolled):
    for series in series_of(path_of(rolled)):
        low, high = view.span(series)
        assert low <= np.nanmin(series.values) and high >= np.nanmax(series.values)
        assert low < high
        if series.unit != "m":
            assert low <= 0.0


def test_noise_is_not_blown_up(view):
    assert view.span(Series("slip", "m/s", np.array([0.0, 1e-9]))) == (0.0, 0.01)
    assert view.span(Series("slip", "m/s", np.array([math.nan]))) == (0.0, 0.01)


def test_figures_have_the_units_of_the_design(view):
    assert view.figure(Series("head", "m", np.zeros(1)), 0.25) == "250 mm"
    assert view.figure(Series("wall angle", "rad", np.zeros(1)), -0.5) == "\u221228.6°"
    assert view.figure(Series("load", "g", np.zeros(1)), 1.0) == "1.00 g"


def test_nothing_rolled_is_an_empty_sheet(qtbot):
    workspace = Workspace(Theme("dark"))
    made = ChartsView(workspace, workspace.theme)
    qtbot.addWidget(made)
    made.grab()
    assert made.world_bounds() is None
