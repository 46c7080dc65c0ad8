"""Edits: the old design is untouched, a change and its reverse give back an equal one, refusals are sentences."""

import pytest

from engine.errors import EditError
from engine.model import edits
from engine.model.ball import Ball, Material
from engine.model.design import OutletStart, Release, Run, Station
from engine.model.elements import Bend, Straight, Trough, Tube
from engine.model.storage import to_text
from tests.designs import desk_run, every_kind


@pytest.fixture(autouse=True)
def untouched():
    """Check after every test that the shared designs are as they were made."""
    before = to_text(every_kind())
    yield
    assert to_text(every_kind()) == before


def ids(design, run: str = "r1") -> list[str]:
    """Return the ids of the elements of a run."""
    return [element.id for element in design.run(run).elements]


@pytest.mark.parametrize(
    ("path", "value"),
    [
        ("name", "Hall"),
        ("units", "cm"),
        ("process.clearance", 3e-4),
        ("runs[0].release.speed", 1.5),
        ("runs[0].elements[1].radius", 0.3),
        ("runs[0].elements[0].section.bore", 0.03),
        ("runs[0].elements[0].section", Trough(bore=0.03)),
        ("runs[0].elements[8].profile.points[1]", (0.1, 0.06)),
        ("runs[0].elements[1].pair", None),
        ("runs[0].start.position[2]", 2.2),
        ("site", None),
    ],
)
def test_setting_a_field_and_setting_it_back(path, value):
    design = every_kind()
    before = edits.get_field(design, path)
    changed = edits.set_field(design, path, value)
    assert edits.get_field(changed, path) == value
    assert changed != design
    assert edits.set_field(changed, path, before) == design
    assert design == every_kind()


def test_a_plain_dictionary_changes_the_kind():
    changed = edits.set_field(desk_run(), "runs[0].elements[0].section", {"kind": "trough", "opening": 2.0})
    assert changed.run().elements[0].section == Trough(opening=2.0)


def test_what_changes_nothing_gives_back_the_same_object():
    design = desk_run()
    assert edits.set_field(design, "runs[0].elements[0].length", 0.25) is design
    assert edits.set_field(design, "runs[0].elements[0].section", {"kind": "tube"}) is design
    assert edits.replace_element(design, "s1", design.run().elements[0]) is design
    assert edits.move_element(design, "s1", -3) is design
    assert edits.rename(design, "s1", "s1") is design


def test_the_parts_that_stay_are_shared():
    design = desk_run()
    changed = edits.set_field(design, "runs[0].elements[2].radius", 0.5)
    assert changed.run().elements[0] is design.run().elements[0]
    assert changed.process is design.process


@pytest.mark.parametrize(
    ("path", "value", "sentence"),
    [
        (
            "runs[0].elements[2].radius",
            -1.0,
            "runs[0].elements[2].radius is -1.0; give a number from 1e-05 to 1000 m.",
        ),
        ("runs[0].elements[2].turn", 0.0, "runs[0].elements[2].turn must not be 0"),
        ("runs[0].elements[2].raduis", 1.0, 'there is no field "raduis"; the nearest known name is "radius".'),
        ("runs[0].elements[99].radius", 1.0, "there are 6 entries, counted from 0."),
        ("runs[0].elements[0].section.bore", 1e9, "runs[0].elements[0].section.bore is 1000000000.0; give a number"),
        ("runs[0].elements[0].section", {"kind": "tub"}, 'section.kind is "tub", which is no known kind'),
        ("runs[0].elements[1].id", "s1", 'runs[0].elements[1].id is "s1", which runs[0].elements[0].id is already'),
        ("runs[0].ball", "steel-61", "runs[0].ball is"),
        ("runs[0]..ball", "x", "is not a path"),
        ("", "x", "is not a path"),
    ],
)
def test_a_refused_value_is_a_sentence_with_its_path(path, value, sentence):
    with pytest.raises(EditError) as caught:
        edits.set_field(desk_run(), path, value)
    assert sentence in str(caught.value)


def test_paths_are_read_and_written_alike():
    text = "runs[0].elements[3].section.bore"
    assert edits.path_of(text) == ("runs", 0, "elements", 3, "section", "bore")
    assert edits.path_text(edits.path_of(text)) == text
    assert edits.path_to_element(every_kind(), "s9") == ("runs", 1, "elements", 0)


def test_inserting_and_removing_give_back_an_equal_design():
    design = desk_run()
    new = Straight(id="new", section=Tube(bore=0.03))
    first = edits.insert_element(design, "r1", new)
    middle = edits.insert_element(design, "r1", new, after="b1")
    last = edits.append_element(design, "r1", new)
    assert (ids(first).index("new"), ids(middle).index("new"), ids(last).index("new")) == (0, 3, 6)
    for changed in (first, middle, last):
        assert edits.remove_element(changed, "new") == design


def test_inserting_is_refused_for_an_id_in_use_and_for_unknown_places():
    with pytest.raises(EditError, match="give each its own id"):
        edits.insert_element(every_kind(), "r2", Straight(id="s1"))
    with pytest.raises(EditError, match='There is no element "s8"'):
        edits.insert_element(desk_run(), "r1", Straight(id="n"), after="s8")
    with pytest.raises(EditError, match='There is no run "r8"'):
        edits.append_element(desk_run(), "r8", Straight(id="n"))


def test_removing_takes_the_stations_along_but_not_another_runs_start():
    design = every_kind()
    assert edits.remove_element(design, "b1").stations == ()
    with pytest.raises(EditError, match='"s1" cannot be removed: run "r2" starts at its outlet'):
        edits.remove_element(design, "s1")


def test_moving_there_and_back():
    design = desk_run()
    moved = edits.move_element(design, "b1", 2)
    assert ids(moved) == ["s1", "t1", "t2", "s2", "b1", "tray1"]
    assert edits.move_element(moved, "b1", -2) == design
    assert ids(edits.move_element(design, "b1", 100))[-1] == "b1"


def test_replacing_an_element_by_another_kind_keeps_its_place_and_what_points_at_it():
    design = every_kind()
    changed = edits.replace_element(design, "s1", Bend(id="turned"))
    assert ids(changed)[0] == "turned"
    assert changed.run("r2").start == OutletStart(run="r1", element="turned")


def test_renaming_an_element_follows_every_reference_and_back():
    design = every_kind()
    once = edits.rename(design, "b1", "curve")
    assert once.stations[0].element == "curve"
    twice = edits.rename(once, "s1", "start")
    assert twice.run("r2").start.element == "start"
    assert edits.rename(edits.rename(twice, "start", "s1"), "curve", "b1") == design


@pytest.mark.parametrize(
    ("within", "old", "new"), [("runs", "r1", "main"), ("balls", "shell", "hollow"), ("pairs", "lossless", "ideal")]
)
def test_renaming_an_entry_follows_every_reference_and_back(within, old, new):
    design = every_kind()
    renamed = edits.rename(design, old, new, within)
    assert f'"{old}"' not in to_text(renamed)
    assert edits.rename(renamed, new, old, within) == design


def test_renaming_a_material_is_followed_in_layers_and_pairs():
    design = edits.add_entry(every_kind(), "materials", Material(id="ours"))
    design = edits.set_field(design, "balls[0].layers[1].material", "ours")
    design = edits.set_field(design, "pairs[0].wall_material", "ours")
    renamed = edits.rename(design, "ours", "theirs", "materials")
    assert renamed.balls[0].layers[1].material == "theirs"
    assert renamed.pairs[0].wall_material == "theirs"


def test_renaming_to_an_id_in_use_or_no_id_is_refused():
    with pytest.raises(EditError, match="give each its own id"):
        edits.rename(every_kind(), "b1", "s9")
    with pytest.raises(EditError, match="an id is 1 to 64 letters"):
        edits.rename(every_kind(), "b1", "no id")
    with pytest.raises(EditError, match='There is no ball "shll"; the nearest known name is "shell"'):
        edits.rename(every_kind(), "shll", "x", "balls")


def test_runs_are_added_and_removed():
    design = desk_run()
    added = edits.add_run(design, Run(id="side", start=OutletStart(run="r1", element="s1")))
    assert [run.id for run in added.runs] == ["r1", "side"]
    assert edits.remove_run(added, "side") == design
    with pytest.raises(EditError, match='"r1" cannot be removed: run "side" starts from it'):
        edits.remove_run(added, "r1")


def test_entries_in_use_are_not_removed():
    design = edits.add_entry(desk_run(), "balls", Ball(id="mine"))
    assert edits.remove_entry(design, "balls", "mine") == desk_run()
    with pytest.raises(EditError, match=r'runs\[0\]\.ball is "shell", but there is no such ball'):
        edits.remove_entry(every_kind(), "balls", "shell")
    with pytest.raises(EditError, match='There is no station "x"; known are "gate"'):
        edits.remove_entry(every_kind(), "stations", "x")
    with pytest.raises(EditError, match='There is no list "site"'):
        edits.add_entry(every_kind(), "site", Station(id="x", run="r1", element="b1"))


def test_the_release_is_set():
    changed = edits.set_release(desk_run(), "r1", Release(speed=2.0))
    assert changed.run().release.speed == 2.0


def test_an_element_is_made_from_a_dictionary_or_refused_in_words():
    assert edits.make_element({"kind": "bend", "id": "b", "radius": 0.2}) == Bend(id="b", radius=0.2)
    with pytest.raises(EditError, match="^radius is -1; give a number"):
        edits.make_element({"kind": "bend", "id": "b", "radius": -1})


def test_free_ids_are_not_in_use():
    assert edits.free_id(every_kind(), "s") == "s2"
    assert edits.free_id(every_kind(), "bend") == "bend1"
