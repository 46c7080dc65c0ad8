"""Checks across a design say the same of a design and of the dictionaries of its file."""

import pytest

from engine.model.design import Run, Station
from engine.model.references import cross_problems
from tests.designs import desk_run, every_kind


def draft(**changes: object):
    """Return a design with unchecked changes."""
    return every_kind().model_copy(update=changes)


@pytest.mark.parametrize(
    "design",
    [
        draft(),
        draft(balls=()),
        draft(pairs=()),
        draft(runs=every_kind().runs[1:]),
        draft(runs=(*every_kind().runs, Run(id="r1", ball="no"))),
        draft(stations=(Station(id="a", run="r2", element="b1"), Station(id="a", run="r1", element="b1"))),
    ],
)
def test_a_design_and_its_dictionary_are_judged_alike(design):
    assert cross_problems(design) == cross_problems(design.model_dump(mode="json"))


def test_a_sound_design_has_no_problem():
    assert cross_problems(desk_run()) == [] and cross_problems(every_kind()) == []


@pytest.mark.parametrize("raw", [{}, {"runs": 3}, {"runs": [3, None, {"elements": {}}]}, {"balls": [{"layers": [1]}]}])
def test_what_has_no_expected_shape_is_passed_over(raw):
    assert cross_problems(raw) == []


def test_a_circle_away_from_the_first_run_is_told_once():
    def run(key: str, other: str) -> dict:
        start = {"kind": "outlet", "run": other, "element": "e" + other}
        return {"id": key, "start": start, "elements": [{"id": "e" + key}]}

    told = cross_problems({"runs": [run("a", "b"), run("b", "c"), run("c", "b")]})
    assert [problem.path for problem in told] == ["runs[1].start.run"]
    assert '"b" -> "c" -> "b"' in told[0].sentence
