"""Export: all parts or none, safe names, what stood there before stays whole, no bad file whatever the design."""

import errno
import math
import os

import numpy as np
import pytest
import trimesh
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.errors import CancelledError, PartRefusedError, SaveError
from engine.fabrication import export
from engine.fabrication.export import export_parts, part_name
from engine.fabrication.solid import build_solid, refusals
from engine.fabrication.stl import read_stl
from engine.model.design import Design, Process
from engine.model.elements import (
    Bend,
    Bowl,
    Deck,
    Dome,
    Easing,
    FreeLine,
    Funnel,
    Gap,
    Helix,
    Loop,
    Straight,
    Transition,
    Tray,
    Trough,
    Tube,
    Well,
)
from engine.placement import lay_out
from tests.designs import single_run

COARSE = Process(chord_tolerance=3e-4)


def laid(*elements, process: Process = COARSE):
    return lay_out(single_run(*elements).model_copy(update={"process": process}))


def small():
    return laid(Straight(id="s1"), Gap(id="g1"), Bend(id="bend"), Deck(id="d1"))


def everything():
    """One element of every kind; vessels last in runs of their own would change nothing for their solids."""
    swept = (
        *(Straight(id="s"), Bend(id="b"), Helix(id="h"), Transition(id="t"), Easing(id="e"), FreeLine(id="f")),
        *(
            Loop(id="l"),
            Gap(id="g"),
            Straight(id="s2", section=Trough()),
            Bend(id="b2", section=Trough(), bank_end=0.5),
        ),
    )
    vessels = (Funnel(id="fu"), Well(id="w"), Bowl(id="bo"), Dome(id="do"), Deck(id="de"), Tray(id="tr"))
    return laid(*swept, *vessels)


def listing(folder):
    return {path.name: path.read_bytes() for path in folder.iterdir()}


# -- files ----------------------------------------------------------------------------------------
def test_every_kind_of_element_becomes_a_closed_file(tmp_path):
    layout = everything()
    parts = export_parts(layout, tmp_path)
    assert [part.element_id for part in parts] == [
        entry.element.id for entry in layout.placed if entry.element.id != "g"
    ]
    assert sorted(part.name for part in parts) == sorted(listing(tmp_path))
    for part in parts:
        read = trimesh.load(part.path)
        assert read.is_watertight and read.is_winding_consistent and read.body_count == 1
        assert read.volume == pytest.approx(1e9 * part.volume, rel=1e-4)
        assert read.bounds == pytest.approx(1e3 * (part.box - part.box[0]), abs=1e-3)
        assert len(read.faces) == part.triangles


def test_names_carry_place_name_and_unit(tmp_path):
    assert [part.name for part in export_parts(small(), tmp_path)] == ["01-s1-mm.stl", "03-bend-mm.stl", "04-d1-mm.stl"]


def test_header_says_where_the_part_stands(tmp_path):
    (part,) = export_parts(laid(Straight(id="s1")), tmp_path / "new" / "folder")
    x, y, z = 1e3 * part.box[0]
    assert read_stl(part.path)[0] == f"01-s1-mm.stl unit mm, from {x:.2f} {y:.2f} {z:.2f}"


def test_mass_is_volume_times_density_of_the_wall(tmp_path):
    layout = laid(Straight(id="s1"))
    (part,) = export_parts(layout, tmp_path)
    assert part.mass == pytest.approx(part.volume * layout.design.material_table()["pmma"].density)


def test_progress_reaches_its_end(tmp_path):
    seen = []
    export_parts(small(), tmp_path, progress=lambda done, total: seen.append((done, total)))
    assert seen == [(step, 6) for step in range(1, 7)]


def test_design_of_nothing_is_refused(tmp_path):
    with pytest.raises(PartRefusedError, match="has no part to export"):
        export_parts(lay_out(Design()), tmp_path / "parts")
    assert not (tmp_path / "parts").exists()


HOSTILE = [
    "../../etc/passwd",
    "CON",
    "nul.stl",
    "a/b\\c:d*e?f",
    "  .hidden ",
    "Böge 管 ½",
    "x" * 200,
    "",
    "-rf",
    "\u202egnp",
]


@pytest.mark.parametrize("name", HOSTILE)
def test_names_are_safe_whatever_elements_are_called(name, tmp_path):
    folder = tmp_path / "parts"
    layout = laid(Straight(id="s1", name=name.strip() and name))
    (part,) = export_parts(layout, folder)
    assert part.path.parent == folder and [entry.name for entry in tmp_path.iterdir()] == ["parts"]
    assert set(part.name) <= set("abcdefghijklmnopqrstuvwxyz0123456789-.") and part.name.count(".") == 1
    assert part.name.startswith("01-") and part.name.endswith("-mm.stl") and len(part.name) < 60


def test_names_differ_where_elements_are_called_the_same():
    layout = laid(Straight(id="a", name="Track"), Straight(id="b", name="TRACK"))
    assert len({part_name(entry).lower() for entry in layout.placed}) == 2


# -- refusal --------------------------------------------------------------------------------------
def test_bad_parts_are_all_named_and_nothing_is_written(tmp_path):
    layout = laid(Bend(id="tight", radius=0.005), Straight(id="good"), Helix(id="flat", drop=0.02))
    with pytest.raises(PartRefusedError) as caught:
        export_parts(layout, tmp_path / "parts")
    said = str(caught.value)
    assert 'Element 1, "tight" of run "r1", cannot be made: its wall folds over itself at s = ' in said
    assert 'Element 3, "flat" of run "r1", cannot be made: it meets itself: ' in said
    assert "good" not in said
    assert not (tmp_path / "parts").exists()


def test_part_that_cannot_be_built_is_named(tmp_path):
    with pytest.raises(PartRefusedError, match='Element 1, "w" of run "r1", cannot be made: its wall of 3.00 mm folds'):
        export_parts(laid(Well(id="w", rim_fillet=0.001)), tmp_path)


def test_free_jump_has_no_solid():
    with pytest.raises(PartRefusedError, match='Element 2, "g1" .* it is a free jump'):
        build_solid(small().placed[1], COARSE)


@pytest.mark.parametrize("coarse", [False, True])
def test_narrow_mouth_that_winds_round_stays_open(coarse):
    """The mouth is 0.37 mm wide: chords of a tolerance of 1 mm lead one lip through the other."""
    section = Trough(bore=0.012, wall=0.0055, opening=0.0612, lip_radius=0.0)
    size = {"radius": 0.0418, "turn": 0.599, "grade": 0.679}
    (entry,) = laid(Bend(id="b", section=section, bank_start=1.263, bank_end=-2.967, **size)).placed
    assert refusals(entry, build_solid(entry, COARSE, coarse=coarse), COARSE) == []


def test_coarse_solid_is_closed_and_has_fewer_triangles():
    for entry in everything().placed:
        if entry.element.id == "g":
            continue
        fine, coarse = build_solid(entry, Process(chord_tolerance=5e-5)), build_solid(entry, COARSE, coarse=True)
        assert coarse.triangles <= fine.triangles
        assert refusals(entry, coarse, COARSE) == []


# -- what stood there before ----------------------------------------------------------------------
def test_files_are_replaced_and_others_left_alone(tmp_path):
    (tmp_path / "notes.txt").write_text("mine")
    (tmp_path / "01-s1-mm.stl").write_text("old")
    export_parts(small(), tmp_path)
    after = listing(tmp_path)
    assert after["notes.txt"] == b"mine" and len(after["01-s1-mm.stl"]) > 84 and len(after) == 4


@pytest.fixture
def exported(tmp_path):
    export_parts(laid(Straight(id="s1", length=0.5), Gap(id="g1"), Bend(id="bend", radius=0.3)), tmp_path)
    return tmp_path, listing(tmp_path)


@pytest.mark.parametrize("stop_after", [0, 1, 3, 4, 5])
def test_cancelled_export_leaves_the_old_one_whole(exported, stop_after):
    folder, before = exported
    asked = []

    def cancel() -> bool:
        asked.append(None)
        return len(asked) > stop_after

    with pytest.raises(CancelledError, match="what stood in the folder before is unchanged"):
        export_parts(small(), folder, cancel=cancel)
    assert listing(folder) == before


def test_full_disk_leaves_the_old_export_whole(exported, monkeypatch):
    folder, before = exported
    whole, calls = export.write_stl, []

    def filling(file, *rest):
        calls.append(None)
        if len(calls) == 2:
            file.write(b"half a file")
            raise OSError(errno.ENOSPC, "No space left on device")
        whole(file, *rest)

    monkeypatch.setattr(export, "write_stl", filling)
    with pytest.raises(SaveError, match="the disk is full; what stood there before is unchanged"):
        export_parts(small(), folder)
    assert listing(folder) == before


@pytest.mark.parametrize("failing", [1, 2, 3, 4, 5])
def test_file_that_cannot_be_put_in_place_brings_the_old_ones_back(exported, monkeypatch, failing):
    folder, before = exported
    move, calls = os.replace, []

    def stubborn(source, target):
        calls.append(None)
        if len(calls) == failing:
            raise OSError(errno.EACCES, "Permission denied")
        move(source, target)

    monkeypatch.setattr(export.os, "replace", stubborn)
    with pytest.raises(SaveError, match="what stood there before is unchanged"):
        export_parts(small(), folder)
    assert listing(folder) == before


def test_folder_that_is_a_file_is_answered(tmp_path):
    (tmp_path / "parts").write_text("mine")
    with pytest.raises(SaveError, match="choose another folder"):
        export_parts(small(), tmp_path / "parts")
    assert (tmp_path / "parts").read_text() == "mine"


def test_link_in_the_folder_is_replaced_and_not_followed(tmp_path):
    outside = tmp_path / "outside.txt"
    outside.write_text("mine")
    folder = tmp_path / "parts"
    folder.mkdir()
    (folder / "01-s1-mm.stl").symlink_to(outside)
    export_parts(small(), folder)
    assert outside.read_text() == "mine" and not (folder / "01-s1-mm.stl").is_symlink()


# -- any design -----------------------------------------------------------------------------------
SIZE = st.floats(2e-3, 0.3)
BORES, WALLS = st.floats(4e-3, 0.06), st.floats(2e-4, 6e-3)
TUBES = st.builds(Tube, bore=BORES, wall=WALLS)
TROUGHS = st.builds(
    Trough,
    bore=BORES,
    wall=WALLS,
    opening=st.floats(0.05, 6.0),
    lip_radius=st.one_of(st.just(0.0), st.floats(1e-5, 5e-3)),
)
COMMON = {
    "id": st.just("e1"),
    "section": st.one_of(TUBES, TROUGHS),
    "bank_start": st.floats(-math.pi, math.pi),
    "bank_end": st.floats(-math.pi, math.pi),
}
GRADE, TURN = st.floats(-2.0, 5.0), st.floats(0.05, 12.0).flatmap(lambda size: st.sampled_from([size, -size]))
POINT = st.tuples(st.floats(0.02, 0.3), st.floats(-0.2, 0.2), st.floats(-0.2, 0.2))
SEGMENT = st.one_of(
    st.builds(Straight, length=SIZE, grade=GRADE, **COMMON),
    st.builds(Bend, radius=SIZE, turn=TURN, grade=GRADE, **COMMON),
    st.builds(Helix, radius=SIZE, turns=st.floats(0.1, 4.0), drop=st.floats(-0.1, 0.4), **COMMON),
    st.builds(Easing, length=SIZE, grade_start=GRADE, grade_end=GRADE, **COMMON),
    st.builds(Loop, radius=SIZE, shift=st.floats(-0.1, 0.1), **COMMON),
    st.builds(FreeLine, points=st.lists(POINT, min_size=1, max_size=4, unique=True).map(tuple), **COMMON),
)
VESSEL = st.one_of(
    st.builds(
        Well,
        id=st.just("e1"),
        radius=st.floats(0.03, 0.2),
        depth=st.floats(0.07, 0.3),
        tilt=st.floats(0.0, 3.1),
        rim_fillet=st.floats(0.0, 0.03),
        floor=st.booleans(),
        floor_fillet=st.floats(0.0, 0.03),
        wall=WALLS,
    ),
    st.builds(
        Funnel, id=st.just("e1"), rim_radius=st.floats(0.1, 0.3), throat_radius=st.floats(1e-3, 0.09), wall=WALLS
    ),
    st.builds(Dome, id=st.just("e1"), sphere_radius=st.floats(0.1, 0.3), rim_radius=st.floats(0.001, 0.1), wall=WALLS),
)


@settings(max_examples=120, deadline=None)
@given(element=st.one_of(SEGMENT, SEGMENT, VESSEL))
def test_any_element_becomes_a_good_file_or_is_refused_with_a_reason(element, tmp_path_factory):
    folder = tmp_path_factory.mktemp("parts")
    try:
        (part,) = export_parts(laid(element), folder)
    except PartRefusedError as error:
        said = str(error)
        assert said.startswith('Element 1, "e1" of run "r1", cannot be made: it') and said.endswith(".")
        assert any(word in said for word in ("make ", "raise ", "lead ", "round ", "give "))
        assert list(folder.iterdir()) == []
        return
    read = trimesh.load(part.path)
    assert read.is_watertight and read.is_winding_consistent and read.body_count == 1
    assert read.volume > 0.0 and np.isfinite(read.vertices).all()
