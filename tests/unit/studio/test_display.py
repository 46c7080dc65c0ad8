import math

import numpy as np
import pytest

from engine.constants import STANDARD_GRAVITY
from engine.findings.finding import Finding, FindingKind, Severity
from engine.integrate.result import LOSSES, Regime
from engine.placement import lay_out
from engine.simulate import roll
from studio import display
from studio.dragging import grips_of
from studio.outlines import distance_to_line, hull, inside, nearest_outline, outlines_of, stretches
from studio.panels import panels_of, rotated
from studio.stage import ribbon, stage_of
from tests.designs import bend_run, desk_run, every_kind, funnel_run, helix_run, straight_run

ROUNDING = 1e-9
ENERGY = 1e-6
"""m of head: what the roll itself loses to its tolerance."""


@pytest.fixture(scope="module")
def helix():
    return roll(helix_run())


@pytest.fixture(scope="module")
def path(helix):
    return display.path_of(helix)


def test_import_needs_no_qt():
    import subprocess
    import sys

    words = "import sys, studio.display, studio.outlines, studio.panels, studio.stage; print('PySide6' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", words], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"


# -- path -----------------------------------------------------------------------------------------
def test_head_and_losses_add_up_to_the_head_at_the_release(path):
    total = path.head + path.lost.sum(axis=1)
    assert np.ptp(total) < ENERGY
    assert total[0] == pytest.approx(path.place[0, 2] + 0.5 * path.speed[0] ** 2 / STANDARD_GRAVITY, abs=1e-3)


def test_developed_length_of_a_straight_is_the_way_between_its_ends():
    path = display.path_of(roll(straight_run(length=1.0, grade=0.1)))
    chord = np.linalg.norm(path.place[-1] - path.place[0])
    assert path.developed[-1] == pytest.approx(chord, rel=1e-6)
    assert (np.diff(path.developed) >= 0.0).all()


def test_load_on_a_level_wall_is_the_weight(path):
    assert path.load[1] == pytest.approx(math.cos(math.atan(0.03)), abs=2e-3)


def test_wall_angle_is_known_on_the_track_only():
    path = display.path_of(roll(funnel_run()))
    assert np.isfinite(path.angle[path.element == 0]).all()
    assert np.isnan(path.angle[path.element == 1]).all()


def test_moment_reads_between_samples_and_stays_within_the_roll(path):
    i = len(path.t) // 2
    middle = display.moment_at(path, 0.5 * (path.t[i] + path.t[i + 1]))
    assert middle.sample == i
    assert middle.place == pytest.approx(0.5 * (path.place[i] + path.place[i + 1]))
    assert display.moment_at(path, path.t[-1] + 5.0).place == pytest.approx(path.place[-1])
    assert display.moment_at(path, -1.0).place == pytest.approx(path.place[0])


def test_time_of_a_developed_length_is_that_of_the_moment(path):
    t = 0.6 * path.t[-1]
    assert display.time_at(path, display.moment_at(path, t).developed) == pytest.approx(t, abs=1e-6)


def test_arrivals_are_in_order_and_name_every_element_met(helix, path):
    found = display.arrivals(path)
    assert [helix.layout.placed[each.index].element.id for each in found] == ["s1", "h1"]
    assert found[0].sample == 0 < found[1].sample


def test_shares_of_losses_add_up(path):
    total, shares = display.losses_of(path)
    assert total == pytest.approx(path.head[0] - path.head[-1], abs=ENERGY)
    assert {cause for cause, _ in shares} <= set(LOSSES)
    assert 0.97 < sum(share for _, share in shares) <= 1.0 + ROUNDING
    assert [share for _, share in shares] == sorted((share for _, share in shares), reverse=True)


def test_no_roll_is_no_path():
    assert display.path_of(None) is None


def test_layout_of_the_roll_is_used_only_for_its_own_design(helix):
    assert display.layout_of(helix.design, helix) is helix.layout
    assert display.layout_of(bend_run(), helix).placed[1].element.id == "b1"


# -- orientation ----------------------------------------------------------------------------------
def test_even_turning_gives_the_exact_orientation():
    spin, t = np.array([0.3, -1.2, 2.0]), np.linspace(0.0, 7.0, 4001)
    found = display.orientations(t, np.tile(spin, (len(t), 1)))
    exact = display.turn_quaternions(t[:, None] * spin)
    assert np.abs(np.abs((found * exact).sum(axis=1)) - 1.0).max() < 1e-12


def test_running_product_is_the_product_one_after_another():
    rng = np.random.default_rng(4)
    t, spin = np.sort(rng.uniform(0.0, 1.0, 37)), rng.normal(0.0, 9.0, (37, 3))
    wanted = np.array([1.0, 0.0, 0.0, 0.0])
    for i in range(36):
        turn = display.turn_quaternions((0.5 * (spin[i] + spin[i + 1]) * (t[i + 1] - t[i]))[None])[0]
        wanted = display.quaternion_product(turn, wanted)
    assert display.orientations(t, spin)[-1] == pytest.approx(wanted, abs=1e-12)


def test_turned_points_follow_the_right_hand():
    quarter = display.turn_quaternions(np.array([[0.0, 0.0, 0.5 * math.pi]]))[0]
    assert rotated(np.array([[1.0, 0.0, 0.0]]), quarter)[0] == pytest.approx([0.0, 1.0, 0.0])


def test_rolling_ball_turns_by_its_way_over_its_radius():
    path = display.path_of(roll(straight_run(length=0.05, grade=0.1)))
    turned = 2.0 * math.acos(min(1.0, abs(float(path.orientation[-1, 0]))))
    way = path.developed[-1] / path.radius % (2.0 * math.pi)
    assert min(way, 2.0 * math.pi - way) == pytest.approx(turned, abs=1e-3)


def test_orientation_at_a_sample_is_that_of_the_sample(path):
    i = len(path.t) // 3
    found = display.orientation_at(path, display.moment_at(path, float(path.t[i])))
    assert abs(float(found @ path.orientation[i])) == pytest.approx(1.0, abs=1e-12)


# -- lines of many colours ------------------------------------------------------------------------
def test_thinned_straight_line_keeps_ends_and_changes():
    points = np.stack([np.linspace(0.0, 100.0, 1001), np.zeros(1001)], axis=1)
    keys = (np.arange(1001) >= 503).astype(np.int64)
    kept = display.thinned(points, 1.5, keys)
    assert kept[0] == 0 and kept[-1] == 1000 and 503 in kept
    assert np.diff(points[kept, 0]).max() <= display.LONGEST_CHORD + 0.2
    assert len(kept) <= 7


@pytest.mark.parametrize("radius", [3.0, 40.0, 400.0])
def test_thinned_circle_looks_the_same(radius):
    turn = np.linspace(0.0, 4.0 * math.pi, 20001)
    points = radius * np.stack([np.cos(turn), np.sin(turn)], axis=1)
    kept = display.thinned(points, 1.5, np.zeros(20001, dtype=np.int64))
    middle = 0.5 * (points[kept][1:] + points[kept][:-1])
    assert radius - np.hypot(middle[:, 0], middle[:, 1]).min() < 1.5 * display.MISS
    assert len(kept) < 0.5 * 4.0 * math.pi * radius / 1.5 or radius < 10.0


def test_thinned_line_keeps_the_corner_before_a_jump():
    points = np.concatenate([np.stack([np.linspace(0.0, 60.0, 400), np.zeros(400)], axis=1), [[60.0, 80.0]]])
    kept = display.thinned(points, 1.5, np.zeros(401, dtype=np.int64))
    assert kept[-2:].tolist() == [399, 400]


def test_thinned_line_keeps_a_turn_back():
    points = np.array([[0.0, 0.0], [50.0, 0.0], [90.0, 0.0], [50.0, 0.5], [0.0, 1.0]])
    assert 2 in display.thinned(points, 1.5, np.zeros(5, dtype=np.int64))


def test_runs_cover_the_line_without_gaps():
    keys = np.array([0, 0, 1, 1, 1, 2])
    assert display.runs_of(keys) == [(0, 2), (2, 5)]
    assert display.runs_of(np.zeros(4, dtype=np.int64)) == [(0, 3)]


def test_even_lengths_reach_both_ends():
    found = display.evenly(np.array([1.0, 1.2, 4.0]), 0.7)
    assert found[0] == 1.0 and found[-1] == 4.0
    assert np.ptp(np.diff(found)) < ROUNDING and np.diff(found).max() <= 0.7


def test_levels_span_the_palette():
    assert display.levels_of(np.array([0.0, 0.5, 1.0, 2.0]), 1.0, 10).tolist() == [0, 5, 9, 9]


def test_regime_runs_hold_exactly_the_samples_of_the_regime(path):
    runs = display.regime_runs(path, Regime.SLIPPING)
    inside_runs = np.zeros(len(path.t), dtype=bool)
    for first, last in runs:
        inside_runs[first:last] = True
    slipping = path.regime == int(Regime.SLIPPING)
    assert slipping.any()
    assert (inside_runs[:-1] == slipping[:-1]).all()


# -- findings -------------------------------------------------------------------------------------
def finding(**given):
    usual = dict(
        kind=FindingKind.SLIP, severity=Severity.NOTE, where="", segment="h1", s=0.1, t=math.nan, value=1.0, limit=0.5
    )
    return Finding(**{**usual, "unit": "ratio", "sentence": "", "cure": "", **given})


def test_place_of_a_finding_is_its_own_or_on_its_element(helix):
    assert display.finding_place(finding(position=(1.0, 2.0, 3.0)), helix.layout) == pytest.approx([1.0, 2.0, 3.0])
    at_inlet = display.finding_place(finding(s=0.0), helix.layout)
    assert at_inlet == pytest.approx(helix.layout.placed[1].inlet.position)
    assert display.finding_place(finding(segment="nowhere"), helix.layout) is None


def test_sample_of_a_finding_is_at_its_time_or_in_its_element(helix, path):
    i = len(path.t) // 2
    assert display.finding_sample(finding(t=float(path.t[i])), path, helix.layout) == i
    at = display.finding_sample(finding(), path, helix.layout)
    assert helix.layout.placed[path.element[at]].element.id == "h1"
    assert display.finding_sample(finding(segment=""), path, helix.layout) is None


def test_one_mark_for_each_kind_in_each_element():
    twice = [finding(), finding(s=0.2), finding(segment="s1"), finding(kind=FindingKind.LIFT_OFF)]
    assert display.shown_findings(twice) == [twice[0], twice[2], twice[3]]


# -- grips ----------------------------------------------------------------------------------------
def test_grips_of_a_bend_are_its_ends_and_its_centre():
    entry = lay_out(bend_run(radius=0.15)).placed[1]
    grips = {grip.role: grip.place for grip in grips_of(entry)}
    assert set(grips) == {"inlet", "outlet", "centre"}
    for end in ("inlet", "outlet"):
        assert np.hypot(*(grips[end] - grips["centre"])[:2]) == pytest.approx(0.15)


def test_grips_of_a_free_line_are_its_points():
    entry = next(entry for entry in lay_out(every_kind()).placed if entry.element.id == "l1")
    points = [grip.place for grip in grips_of(entry) if grip.role == "point"]
    ends = np.array(entry.element.points)
    assert len(points) == len(ends) - 1
    assert np.linalg.norm(points[0] - entry.inlet.position) == pytest.approx(np.linalg.norm(ends[0]))


# -- from above -----------------------------------------------------------------------------------
def test_straight_tube_is_as_wide_as_its_outside_and_its_bore():
    design = straight_run(length=0.5)
    section = design.runs[0].elements[0].section
    (outline,) = outlines_of(lay_out(design))
    width = section.bore + 2.0 * section.wall
    assert np.linalg.norm(outline.edges[0] - outline.edges[1], axis=1) == pytest.approx(width)
    assert np.linalg.norm(outline.fine[0] - outline.fine[1], axis=1) == pytest.approx(section.bore)


def test_outlines_come_lowest_first_and_helix_in_pieces():
    found = outlines_of(lay_out(helix_run(turns=2.0)))
    heights = [outline.height for outline in found]
    assert heights == sorted(heights)
    assert len([outline for outline in found if outline.element == "h1"]) >= 4


def test_pieces_of_a_curve_leave_nothing_out():
    curve = lay_out(helix_run(turns=2.0)).placed[1].curve
    covered = np.zeros(len(curve), dtype=int)
    for piece in stretches(curve):
        covered[piece] += 1
    assert covered.min() >= 1


def test_funnel_shows_rim_with_wall_and_throat():
    outline = next(each for each in outlines_of(lay_out(funnel_run())) if each.element == "f1")
    entry = lay_out(funnel_run()).placed[1]
    reach = np.hypot(*(outline.fill - entry.origin[:2]).T)
    assert reach == pytest.approx(entry.element.rim_radius + entry.element.wall)
    assert np.hypot(*(outline.hole - entry.origin[:2]).T) == pytest.approx(entry.element.throat_radius)


def test_every_kind_has_an_outline():
    layout = lay_out(every_kind())
    assert {each.index for each in outlines_of(layout)} == {entry.index for entry in layout.placed}


def test_point_is_found_in_the_topmost_outline_or_near_one():
    outlines = outlines_of(lay_out(straight_run(length=0.5)))
    assert nearest_outline(outlines, np.array([0.25, 0.0]), 0.0) is outlines[0]
    assert nearest_outline(outlines, np.array([0.25, 0.02]), 0.01) is outlines[0]
    assert nearest_outline(outlines, np.array([0.25, 0.2]), 0.01) is None


def test_inside_and_distance_of_a_square():
    square = np.array([[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0], [0.0, 0.0]])
    assert inside(square, np.array([0.5, 0.5])) and not inside(square, np.array([1.5, 0.5]))
    assert distance_to_line(square, np.array([2.0, 2.0])) == pytest.approx(math.sqrt(2.0))


def test_hull_of_a_square_with_points_inside():
    points = np.array([[0.0, 0.0], [2.0, 0.0], [2.0, 2.0], [0.0, 2.0], [1.0, 1.0], [0.5, 1.5]])
    assert len(hull(points)) == 5
    assert set(map(tuple, hull(points).tolist())) == {(0.0, 0.0), (2.0, 0.0), (2.0, 2.0), (0.0, 2.0)}


# -- in space -------------------------------------------------------------------------------------
def test_silhouette_of_a_tube_stands_off_by_its_radius_from_any_side():
    design = straight_run(length=0.5)
    section = design.runs[0].elements[0].section
    panels = panels_of(lay_out(design))
    for eye in (np.array([0.0, 0.0, 1.0]), np.array([0.36, 0.48, 0.8]), np.array([0.0, -1.0, 0.0])):
        corners, light, _ = panels.seen(eye)
        width = np.linalg.norm(corners[:, 0] - corners[:, 3], axis=1)
        assert width == pytest.approx(section.bore + 2.0 * section.wall)
        assert np.abs((corners[:, 0] - corners[:, 3]) @ eye).max() < ROUNDING
        assert light.min() >= 0.0 and light.max() <= 1.0


def test_panels_and_stage_of_nothing_are_empty():
    empty = lay_out(desk_run().model_copy(update={"runs": ()}))
    assert len(panels_of(empty).middle) == 0
    assert len(stage_of(empty).points) == 0


def test_stage_joins_all_triangles_and_knows_their_elements():
    layout = lay_out(every_kind())
    stage = stage_of(layout)
    count = sum(len(solid.mesh.faces) for solid in stage.solids)
    assert len(stage.opaque.mesh.faces) + len(stage.clear.mesh.faces) == count
    for part in (stage.opaque, stage.clear):
        owners = part.element[part.mesh.faces]
        assert (owners == owners[:, :1]).all()
    shown = set(stage.opaque.element.tolist()) | set(stage.clear.element.tolist())
    assert shown == {entry.index for entry in layout.placed if entry.element.kind != "gap"}


def test_ribbon_has_both_sides_of_every_point():
    line = np.array([[0.0, 0.0, 0.0], [1.0, 0.0, 0.0], [1.0, 1.0, 0.0]])
    made = ribbon(line, 0.001)
    assert made.points.shape == (6, 3) and made.faces.shape == (4, 3)
    assert np.linalg.norm(made.ahead, axis=1) == pytest.approx(0.001)
    assert made.side.tolist() == [0.0, 1.0] * 3
