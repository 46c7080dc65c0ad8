"""The root of the document: look-ups and checks across it."""

import pytest
from pydantic import ValidationError

from engine.errors import UnknownNameError
from engine.model.ball import Material
from engine.model.design import Design, KeepOut, OutletStart, Process, Run, Site, Station
from engine.model.elements import Straight
from tests.designs import desk_run, every_kind, single_run


def test_an_empty_design_is_a_design():
    assert Design().runs == ()


def test_the_first_run_is_taken_when_none_is_named():
    design = every_kind()
    assert design.run().id == "r1"
    assert design.run("r2").id == "r2"


def test_an_unknown_run_is_answered_with_the_known_ones():
    with pytest.raises(UnknownNameError, match='There is no run "r3"; known are "r1", "r2"'):
        every_kind().run("r3")


def test_elements_are_found_with_their_run():
    design = every_kind()
    assert design.run_of("s9").id == "r2"
    assert design.run("r1").index("h1") == 2
    with pytest.raises(UnknownNameError):
        design.run_of("nowhere")


def test_an_elements_own_pair_comes_before_that_of_the_run():
    design = every_kind()
    run = design.run("r1")
    assert design.pair_of(run).id == "steel-pmma"
    assert design.pair_of(run, run.element("b1")).id == "lossless"
    assert design.pair_of(run, run.element("h1")).id == "steel-pmma"


def test_a_designs_own_material_comes_before_the_built_in_one():
    own = Material(id="steel", density=7000.0)
    design = desk_run().model_copy(update={"materials": (own,)})
    ball = design.ball_of(design.run())
    assert design.mass_of(ball) == pytest.approx(desk_run().mass_of(ball) * 7000.0 / 7830.0)
    assert design.inertia_factor_of(ball) == pytest.approx(0.4)


@pytest.mark.parametrize(
    ("make", "sentence"),
    [
        (
            lambda: single_run(Straight(id="s1"), Straight(id="s1")),
            r'runs\[0\]\.elements\[1\]\.id is "s1", which runs\[0\]\.elements\[0\]\.id is already',
        ),
        (
            lambda: Design(runs=(Run(id="a", elements=(Straight(id="s"),)), Run(id="b", elements=(Straight(id="s"),)))),
            r"runs\[1\]\.elements\[0\]\.id",
        ),
        (lambda: Design(runs=(Run(id="a"), Run(id="a"))), r'runs\[1\]\.id is "a"'),
        (
            lambda: Design(runs=(Run(id="a", ball="steel-61"),)),
            r'runs\[0\]\.ball is "steel-61", but there is no such ball; the nearest known name is "steel-6"',
        ),
        (lambda: Design(runs=(Run(id="a", pair="x"),)), r"runs\[0\]\.pair"),
        (lambda: Design(stations=(Station(id="g", run="a", element="b"),)), r"stations\[0\]\.run"),
        (
            lambda: Design(
                runs=(Run(id="a", elements=(Straight(id="s"),)), Run(id="b", start=OutletStart(run="a", element="t")))
            ),
            r'runs\[1\]\.start\.element is "t", but there is no such element in that run; known are "s"',
        ),
    ],
)
def test_ids_are_unique_and_references_exist(make, sentence):
    with pytest.raises(ValidationError, match=sentence):
        make()


def test_runs_that_start_from_each_other_are_refused_once():
    def run(key: str, other: str) -> Run:
        return Run(id=key, start=OutletStart(run=other, element=f"{other}1"), elements=(Straight(id=f"{key}1"),))

    with pytest.raises(ValidationError) as caught:
        Design(runs=(run("a", "b"), run("b", "c"), run("c", "a")))
    assert str(caught.value).count("leads round in a circle") == 1


def test_a_run_may_not_start_from_itself():
    with pytest.raises(ValidationError, match="leads round in a circle"):
        Design(runs=(Run(id="a", start=OutletStart(run="a", element="s"), elements=(Straight(id="s"),)),))


@pytest.mark.parametrize(
    ("make", "sentence"),
    [
        (lambda: KeepOut(id="k", min=(0, 0, 0), max=(1, 1, 0)), "max must be larger than min"),
        (lambda: Site(reach=(1.0, 0.5)), r"reach must be given as \[low, high\]"),
        (lambda: Process(build_volume=(0.2, 0.0, 0.2)), "build_volume must be three lengths"),
    ],
)
def test_boxes_have_an_inside(make, sentence):
    with pytest.raises(ValidationError, match=sentence):
        make()
