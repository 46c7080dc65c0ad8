"""Files of reference cases: what is refused, what is compared, what the report says."""

import copy
import json
import math

import numpy as np
import pytest

from engine import cli
from engine.errors import CasesFileError
from engine.reference.cases import read_cases
from engine.reference.compare import compare
from engine.verification import verify_file

G, RADIUS = 9.80665, 0.0125
ROLLED = {
    "name": "level",
    "kind": "B1",
    "ball": {"r": RADIUS, "m": 0.064, "k": 0.4},
    "surfaces": [{"type": "plane", "point": [0.0, 0.0, 0.0], "normal": [0.0, 0.0, 2.0]}],
    "contact": {"law": "coulomb", "mu": 0.25},
    "start": {"t": 0.0, "mode": "slip", "x": [0.0, 0.0, RADIUS], "v": [1.4, 0.0, 0.0], "w": [0.0, 0.0, 0.0]},
    "samples": [
        {"t": 0.5, "mode": "roll", "x": [0.0, 0.0, RADIUS], "v": [1.0, 0.0, 0.0], "w": [0.0, 80.0, 0.0]},
    ],
    "events": [{"name": "rolling starts", "t": 0.4 / (0.25 * G)}],
    "numbers": {"final_speed": 1.0, "critical_angle_deg": 41.2},
}
"""A ball that slides at 1.4 m/s and rolls at 1 m/s after 0.4/(mu g); the place follows from the closed form."""
ROLLED["samples"][0]["x"][0] = 1.2 * 0.4 / (0.25 * G) + 1.0 * (0.5 - 0.4 / (0.25 * G))


def case(**changes) -> dict:
    made = copy.deepcopy(ROLLED)
    made.update(changes)
    return made


def written(tmp_path, content) -> str:
    path = tmp_path / "cases.json"
    path.write_text(content if isinstance(content, str) else json.dumps(content), encoding="utf-8")
    return str(path)


def checked(tmp_path, made: dict):
    return compare(read_cases(written(tmp_path, {"g": G, "cases": [made]}))[0])


def test_case_that_agrees(tmp_path) -> None:
    result = checked(tmp_path, case())
    assert result.ok is True, result.note
    assert max(result.worst.values()) < 0.1
    assert result.note == "Not run: critical_angle_deg."


@pytest.mark.parametrize(
    ("key", "index", "by", "kind"),
    [("x", 0, 3e-6, "x"), ("v", 1, 3e-5, "v"), ("w", 2, 3e-5 * 1.4 / RADIUS, "w")],
)
def test_error_above_its_limit_fails(tmp_path, key: str, index: int, by: float, kind: str) -> None:
    made = case()
    made["samples"][0][key][index] += by
    result = checked(tmp_path, made)
    assert result.ok is False
    assert result.worst[kind] == pytest.approx(3.0 if kind == "x" else 3.0 / (1.4 if kind == "v" else 1.0), rel=0.05)
    assert f"{kind} of sample at 0.5 s" in result.note
    assert all(ratio < 0.1 for name, ratio in result.worst.items() if name != kind)


def test_gain_widens_the_limits(tmp_path) -> None:
    made = case(sensitivity={"t": [0.1, 0.5], "gain": [1.0, 6.0]})
    made["samples"][0]["x"][0] += 3e-6
    result = checked(tmp_path, made)
    assert result.ok is True
    assert result.worst["x"] == pytest.approx(0.5, rel=0.05)


def test_gain_below_one_does_not_narrow_them(tmp_path) -> None:
    made = case(sensitivity={"t": [0.5], "gain": [0.01]})
    made["samples"][0]["x"][0] += 0.5e-6
    assert checked(tmp_path, made).worst["x"] == pytest.approx(0.5, rel=0.05)


def test_time_of_an_event_is_compared(tmp_path) -> None:
    made = case()
    made["events"][0]["t"] += 4e-6
    result = checked(tmp_path, made)
    assert result.ok is False
    assert result.worst["t"] == pytest.approx(4.0, rel=0.05)


def test_event_that_does_not_happen_fails(tmp_path) -> None:
    result = checked(tmp_path, case(events=[{"name": "lift-off", "t": 0.1}]))
    assert result.ok is False
    assert 'event "lift-off": is missing from the run.' in result.note


def test_second_event_of_a_name_needs_a_second_mark(tmp_path) -> None:
    made = case()
    made["events"].append(dict(made["events"][0]))
    assert "is missing from the run" in checked(tmp_path, made).note


def test_wrong_mode_fails(tmp_path) -> None:
    made = case()
    made["samples"][0]["mode"] = "slip"
    result = checked(tmp_path, made)
    assert result.ok is False
    assert 'the mode is "roll", not "slip"' in result.note


def test_mode_at_an_event_may_be_either(tmp_path) -> None:
    made = case()
    t = made["events"][0]["t"]
    for mode in ("slip", "roll"):
        x = [1.2 * t, 0.0, RADIUS]
        made["samples"] = [{"t": t, "mode": mode, "x": x, "v": [1.0, 0.0, 0.0], "w": [0.0, 80.0, 0.0]}]
        assert checked(tmp_path, made).ok is True


def test_number_of_the_run_is_compared(tmp_path) -> None:
    result = checked(tmp_path, case(numbers={"final_speed": 1.00005}))
    assert result.ok is False
    assert result.worst["numbers"] == pytest.approx(5.0, rel=0.01)


def test_extreme_read_beside_the_true_one_is_accepted_but_none_beyond_it(tmp_path) -> None:
    well = case(
        surfaces=[{"type": "cylinder", "side": "inside", "point": [0, 0, 0], "axis": [0, 0, 1], "radius": 0.15}],
        contact={"law": "no_slip"},
        start={"mode": "roll", "x": [0.1375, 0, 0], "v": [0, 2.0, 0], "w": [0, 0, -160.0]},
        samples=[],
        events=[{"name": "first lowest point", "t": math.pi * math.sqrt(3.5) * 0.1375 / 2.0}],
    )
    true = 12.0 / 7.0 * G * 0.1375 / 4.0
    for factor, passes in ((1.0, True), (1.0 - 2e-5, True), (1.0 + 2e-5, False), (0.97, False)):
        well["numbers"] = {"mu_needed": true * factor}
        assert checked(tmp_path, well).ok is passes, factor


def test_case_without_a_run_is_not_run(tmp_path) -> None:
    result = checked(tmp_path, {"name": "angles", "kind": "A6", "numbers": {"k=0": {"cos": 0.6667}}})
    assert result.ok is None
    assert "without a run" in result.note


def test_ball_that_touches_nothing_is_a_failed_case(tmp_path) -> None:
    made = case()
    made["start"]["x"] = [0.0, 0.0, 0.1]
    result = checked(tmp_path, made)
    assert result.ok is False
    assert "not on it" in result.note


def test_ball_too_large_for_its_tube_is_a_failed_case(tmp_path) -> None:
    made = case(surfaces=[{"type": "cylinder", "point": [0, 0, 0], "axis": [1, 0, 0], "radius": 0.005}])
    assert checked(tmp_path, made).ok is False


def test_knife_edge_counts_in_time_only(tmp_path) -> None:
    made = case(
        contact={"law": "coulomb", "mu": 0.2, "restitution": 0.5},
        start={"mode": "flight", "x": [0, 0, RADIUS + 0.1], "v": [0, 0, 0], "w": [0, 0, 0]},
        samples=[],
        numbers={},
        events=[{"name": "after the impact", "t": math.sqrt(0.2 / G), "v": [0.0, 0.0, 9.0]}],
    )
    assert checked(tmp_path, made).ok is False
    made["note"] = "A knife edge: compare the time."
    assert checked(tmp_path, made).ok is True


def test_unknown_event_is_compared_at_its_own_time_and_said_so(tmp_path) -> None:
    made = case(events=[{"name": "passes the mark", **{k: v for k, v in case()["samples"][0].items() if k != "mode"}}])
    result = checked(tmp_path, made)
    assert result.ok is True
    assert "of no known kind" in result.note


MAP = {
    "name": "map",
    "kind": "B3",
    "ball": {"r": RADIUS, "m": 0.064, "k": 0.4},
    "surfaces": [{"type": "cylinder", "side": "inside", "point": [0, 0, 0], "axis": [0, 0, 1], "radius": 0.15}],
    "contact": {"law": "coulomb", "mu": "per row"},
    "start": {"note": "rolling"},
    "numbers": {
        "drop_depth": 0.6,
        "t_max": 3.0,
        "rows": [{"mu": 50.0, "down_angle_deg": 10.0, "speed": 2.0, "outcome": "exit", "t": 0.0, "robust": True}],
    },
}


def bob_time() -> float:
    """Return after z = 0 of a ball entered 10 degrees down at 2 m/s, without slip (closed form)."""
    rate, down = 2.0 * math.cos(math.radians(10)) / 0.1375, 2.0 * math.sin(math.radians(10))
    bobbing = rate * math.sqrt(2.0 / 7.0)
    middle = -G / (0.4 * rate**2)
    phase = math.atan2(-down / bobbing, -middle)
    return 2.0 * (math.pi - abs(phase)) / bobbing


def test_map_outcome_and_time(tmp_path) -> None:
    made = copy.deepcopy(MAP)
    row = made["numbers"]["rows"][0]
    row["t"] = bob_time()
    result = checked(tmp_path, made)
    assert result.ok is True, result.note
    row["t"] += 3e-5
    assert checked(tmp_path, made).worst["t"] == pytest.approx(3.0, rel=0.05)
    row["outcome"] = "drop"
    assert "exit, not drop" in checked(tmp_path, made).note
    row["robust"] = False
    assert checked(tmp_path, made).ok is True


def test_report_counts_and_lines(tmp_path) -> None:
    bad = case(name="wrong")
    bad["samples"][0]["x"][0] += 1.0
    unrun = {"name": "closed", "kind": "A7", "numbers": {}}
    report = verify_file(written(tmp_path, {"cases": [case(), bad, unrun]}))
    assert (report.passed, report.failed, report.not_run) == (1, 1, 1)
    lines = report.lines()
    assert lines[-1] == "1 passed, 1 failed, 1 not run."
    assert "pass" in lines[0] and "FAIL" in lines[1] and "not run" in lines[2]
    told = json.loads(json.dumps(report.as_json(), allow_nan=False))
    assert set(told) == {"cases", "passed", "failed", "not_run"}
    assert set(told["cases"][0]) == {"name", "kind", "ok", "worst", "note"}
    assert set(told["cases"][0]["worst"]) == {"x", "v", "w", "t", "numbers"}
    assert [entry["ok"] for entry in told["cases"]] == [True, False, None]


def without(*keys: str) -> dict:
    """A case without one key, given as the way to it."""
    made = case()
    place = made
    for key in keys[:-1]:
        place = place[key]
    del place[keys[-1]]
    return made


BROKEN = {
    "not JSON": ("{", "not JSON"),
    "a list": ([], 'object with a list "cases"'),
    "no cases": ({"cases": []}, 'no list "cases"'),
    "nested too deep": ("[" * 100_000, "too deep"),
    "NaN": ('{"cases": [{"name": "a", "start": {"x": [NaN, 0, 0]}}]}', "not a finite number"),
    "infinite": ('{"cases": [{"name": "a", "g": 1e999}]}', "not a finite number"),
    "case no object": ({"cases": [3]}, "Case 1 must be an object"),
    "unknown surface": ({"cases": [case(surfaces=[{"type": "saddle"}])]}, 'no type of surface "saddle"'),
    "surface key missing": ({"cases": [case(surfaces=[{"type": "torus", "centre": [0, 0, 0]}])]}, '"axis" is missing'),
    "radius no number": (
        {"cases": [case(surfaces=[{"type": "sphere", "centre": [0, 0, 0], "radius": "1"}])]},
        '"radius" must be a number',
    ),
    "normal without length": (
        {"cases": [case(surfaces=[{"type": "plane", "point": [0, 0, 0], "normal": [0, 0, 0]}])]},
        '"normal" has no length',
    ),
    "unknown law": ({"cases": [case(contact={"law": "sticky"})]}, 'no law "sticky"'),
    "no friction": ({"cases": [case(contact={"law": "coulomb"})]}, '"mu" must be a number; it is missing'),
    "no ball": ({"cases": [without("ball")]}, '"r" must be a number'),
    "no inertia": ({"cases": [case(ball={"r": 0.01, "m": 0.1, "k": 0})]}, '"k" must be above 0'),
    "start without place": ({"cases": [without("start", "x")]}, "x missing"),
    "sample without mode": ({"cases": [without("samples", 0, "mode")]}, "mode missing"),
    "two numbers": ({"cases": [case(events=[{"name": "top", "t": 0, "x": [0, 1]}])]}, '"x" must be three numbers'),
    "unknown mode": ({"cases": [case(start={**ROLLED["start"], "mode": "hover"})]}, 'no mode "hover"'),
    "event without name": ({"cases": [case(events=[{"t": 0.0}])]}, 'no "name"'),
    "samples no list": ({"cases": [case(samples=4)]}, '"samples" must be a list'),
    "unknown outcome": (
        {"cases": [{**MAP, "numbers": {**MAP["numbers"], "rows": [{**MAP["numbers"]["rows"][0], "outcome": "up"}]}}]},
        'no outcome "up"',
    ),
    "map without depth": ({"cases": [{**MAP, "numbers": {"rows": MAP["numbers"]["rows"]}}]}, '"drop_depth"'),
}


@pytest.mark.parametrize("name", BROKEN)
def test_broken_file_is_refused_with_a_sentence(tmp_path, capsys, name: str) -> None:
    content, words = BROKEN[name]
    path = written(tmp_path, content)
    with pytest.raises(CasesFileError) as caught:
        verify_file(path)
    assert words in str(caught.value)
    assert str(caught.value).endswith(".")
    assert cli.main(["verify", path]) == 2
    assert words in capsys.readouterr().err


def test_file_that_is_not_there(tmp_path) -> None:
    with pytest.raises(CasesFileError, match="no such file"):
        verify_file(tmp_path / "none.json")


def test_file_that_is_not_text(tmp_path) -> None:
    (tmp_path / "cases.json").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(CasesFileError, match="UTF-8"):
        verify_file(tmp_path / "cases.json")


def test_many_problems_are_counted_not_listed(tmp_path) -> None:
    path = written(tmp_path, {"cases": [case(surfaces=[{"type": "saddle"}] * 40)]})
    with pytest.raises(CasesFileError, match="28 more problems"):
        verify_file(path)


def test_exit_codes_of_the_command(tmp_path, capsys) -> None:
    good = written(tmp_path, {"cases": [case()]})
    assert cli.main(["verify", good]) == 0
    assert cli.main(["verify", good, "--json"]) == 0
    assert json.loads(capsys.readouterr().out.split("\n", 2)[2])["passed"] == 1
    bad = case()
    bad["samples"][0]["x"][0] += 1.0
    assert cli.main(["verify", written(tmp_path, {"cases": [bad]})]) == 1


@pytest.mark.parametrize("seed", range(6))
def test_strange_but_whole_cases_never_raise(tmp_path, seed: int) -> None:
    """Sizes and states far from sense give a failed case, not an exception."""
    rng = np.random.default_rng(seed)
    kinds = [
        {"type": "cone", "half_angle": float(rng.uniform(0.1, 3.0))},
        {"type": "paraboloid", "focal_length": float(10.0 ** rng.uniform(-4, 2))},
        {"type": "hyperbolic_funnel", "c": float(10.0 ** rng.uniform(-6, 1))},
        {"type": "helical_tube", "helix_radius": 0.1, "pitch": 0.05, "hand": -1, "tube_radius": 0.4},
        {"type": "torus", "centre": [0, 0, 0], "axis": [0, 0, 1], "bend_radius": 0.01, "tube_radius": 0.5},
        {"type": "sphere", "centre": [0, 0, 0], "radius": 0.001},
    ]
    for surface in kinds:
        made = case(
            surfaces=[surface], numbers={"period": 1.0, "theta_rate": 2.0, "N_over_mg_at_top": 1.0, "decel": 1.0}
        )
        made["start"]["v"] = rng.normal(size=3).tolist()
        assert checked(tmp_path, made).ok in (True, False)
