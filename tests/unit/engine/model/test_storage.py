"""Design files: every problem told at once, nothing half written, nothing that a file may hold ends in a traceback."""

import errno
import json
import os
import stat
from pathlib import Path

import pytest

from engine.errors import DesignFileError, SaveError
from engine.model import storage
from engine.model.design import Design
from engine.model.elements import ELEMENTS
from engine.model.storage import load, parse, save, schema, to_text, write_whole
from tests.designs import bend_run, desk_run, every_kind, funnel_run, helix_run, level_run, straight_run

STORED = Path(__file__).parents[3] / "documents" / "version-1.json"
SHIPPED_SCHEMA = Path(__file__).parents[4] / "assets" / "schema" / "design-1.json"
SMALL = (straight_run, level_run, bend_run, helix_run, funnel_run, desk_run, every_kind)


def problems(content: bytes | str | dict) -> tuple[str, ...]:
    """Return what is wrong with the content of a file."""
    if isinstance(content, dict):
        content = json.dumps({"schema_version": 1, **content})
    with pytest.raises(DesignFileError) as caught:
        parse(content.encode() if isinstance(content, str) else content)
    return caught.value.problems


def with_element(**fields: object) -> dict:
    """Return the dictionary of a design of one element."""
    return {"runs": [{"id": "r", "elements": [fields]}]}


# -- round trip -----------------------------------------------------------------------------------
@pytest.mark.parametrize("make", SMALL)
def test_a_saved_design_is_read_back_equal(make, tmp_path):
    save(make(), tmp_path / "design.json")
    assert load(tmp_path / "design.json") == make()


def test_saving_again_gives_the_same_bytes(tmp_path):
    save(every_kind(), tmp_path / "a.json")
    save(load(tmp_path / "a.json"), tmp_path / "b.json")
    assert (tmp_path / "a.json").read_bytes() == (tmp_path / "b.json").read_bytes()


def test_text_is_utf8_with_fields_in_order_and_a_newline_at_the_end():
    text = to_text(every_kind())
    assert text.endswith("}\n") and "élément" in text
    assert list(json.loads(text))[:4] == ["schema_version", "id", "name", "note"]
    assert next(iter(json.loads(text)["runs"][0]["elements"][0])) == "kind"


def test_the_stored_file_of_version_1_is_read():
    design = load(STORED)
    kinds = [element.kind for element in design.run("r1").elements]
    assert kinds == list(ELEMENTS)
    assert design.run("r1").elements[1].turn == -1.2
    assert design.site is not None and design.site.reach == (0.4, 1.4)


def test_a_byte_order_mark_is_passed_over():
    assert parse(b"\xef\xbb\xbf" + to_text(desk_run()).encode()) == desk_run()


# -- what a file may be instead of a design -------------------------------------------------------
@pytest.mark.parametrize(
    ("content", "sentence"),
    [
        (b"", "The file is empty; a design is an object in braces."),
        (b" \n\t", "The file is empty; a design is an object in braces."),
        (b"[]", "The file holds a list of 0; a design is an object in braces."),
        (b"null", "The file holds null; a design is an object in braces."),
        (b"12", "The file holds 12; a design is an object in braces."),
        (b"[" * 200_000, "The file is nested more than 40 levels deep; a design has nine."),
        (b'{"a":' * 300 + b"1" + b"}" * 300, "The file is nested more than 40 levels deep; a design has nine."),
        ("{}".encode("utf-16"), "The file is UTF-16 text; save it as UTF-8."),
        (b'{"name":"\xe9"}', "The file is not UTF-8 text (byte 9 is 0xe9); save it as UTF-8."),
        (
            b'{"schema_version": 1, "name": "abc',
            "The file is not JSON at line 1, column 31: the text ends too early, as if the file was cut off.",
        ),
        (b'{"name": tube}', "The file is not JSON at line 1, column 10: expecting value."),
        (
            b'{"schema_version":' + b"9" * 5000 + b"}",
            "The file holds a whole number of several thousand digits; give numbers of a usual size.",
        ),
        (b"{}", "schema_version is missing; a design of this version has 1."),
        (b'{"schema_version": "1"}', 'schema_version is "1"; give a whole number up to 1.'),
        (b'{"schema_version": true}', "schema_version is true; give a whole number up to 1."),
        (
            b'{"schema_version": 2}',
            "schema_version is 2: the file was made by a newer Trundle; this one reads up to 1, update it.",
        ),
    ],
)
def test_a_file_that_is_no_design_is_answered_with_one_sentence(content, sentence):
    assert problems(content) == (sentence,)


@pytest.mark.parametrize("share", [0.01, 0.3, 0.5, 0.77, 0.999])
def test_a_cut_off_file_says_so(share):
    content = to_text(every_kind()).encode()
    (sentence,) = problems(content[: int(share * len(content))])
    assert "not JSON" in sentence or "cut off" in sentence


def test_every_cut_of_a_file_is_refused_with_sentences():
    content = to_text(desk_run()).encode().rstrip()
    for end in range(0, len(content) - 1, 37):
        assert problems(content[:end])


# -- problems of fields ---------------------------------------------------------------------------
@pytest.mark.parametrize(
    ("raw", "sentence"),
    [
        (
            with_element(kind="bend", id="b", radius=-1),
            "runs[0].elements[0].radius is -1; give a number from 1e-05 to 1000 m.",
        ),
        (
            with_element(kind="bend", id="b", radius=1e308),
            "runs[0].elements[0].radius is 1e+308; give a number from 1e-05 to 1000 m.",
        ),
        (
            with_element(kind="bend", id="b", radius=float("nan")),
            "runs[0].elements[0].radius is NaN; give a finite number from 1e-05 to 1000 m.",
        ),
        (
            with_element(kind="bend", id="b", radius=float("inf")),
            "runs[0].elements[0].radius is Infinity; give a finite number from 1e-05 to 1000 m.",
        ),
        (
            with_element(kind="bend", id="b", radius="wide"),
            'runs[0].elements[0].radius is "wide"; give a finite number from 1e-05 to 1000 m.',
        ),
        (
            with_element(kind="bend", id="b", radius=10**400),
            "runs[0].elements[0].radius is a whole number of about 401 digits; "
            "give a finite number from 1e-05 to 1000 m.",
        ),
        (
            with_element(kind="bend", id="b", raduis=1),
            'runs[0].elements[0].raduis is not a field of a bend; the nearest known name is "radius".',
        ),
        (
            with_element(kind="bnd", id="b"),
            'runs[0].elements[0].kind is "bnd", which is no known kind; the nearest known name is "bend".',
        ),
        (with_element(kind="bend"), "runs[0].elements[0].id is missing; it must be given."),
        (
            with_element(kind="bend", id="b", turn=0),
            "runs[0].elements[0].turn must not be 0; give an angle, positive to the left, or use a straight.",
        ),
        (
            with_element(kind="straight", id="s", section={"kind": "tube", "bore": 0}),
            "runs[0].elements[0].section.bore is 0; give a number from 1e-05 to 1000 m.",
        ),
        (
            with_element(kind="funnel", id="f", profile={"kind": "points", "points": [[0, 0], [1, 2, 3]]}),
            "runs[0].elements[0].profile.points[1] has 3 entries; give at most 2.",
        ),
        (
            with_element(kind="funnel", id="f", profile={"kind": "points", "points": [[0, 0]]}),
            "runs[0].elements[0].profile.points has 1 entries; give at least 2.",
        ),
        (
            {"runs": [{"id": "r", "ball": "steel-161"}]},
            'runs[0].ball is "steel-161", but there is no such ball; the nearest known name is "steel-16".',
        ),
        ({"units": "inch"}, "units is \"inch\"; allowed is 'mm', 'cm', 'm' or 'in'; the nearest is \"in\"."),
        (
            with_element(kind="well", id="w", hand=10**400),
            "runs[0].elements[0].hand is a whole number of about 401 digits; allowed is 1 or -1.",
        ),
        (with_element(kind="well", id="w", hand=0), "runs[0].elements[0].hand is 0; allowed is 1 or -1."),
        ({"runs": {}}, "runs is an object {...}; give a list in square brackets."),
        ({"site": 3}, "site is 3; give an object in braces."),
        ({"name": 3}, 'name is 3; give text in quotes ("...").'),
        ({"name": "x" * 201}, "name has 201 characters; give at most 200."),
        ({"name": "a\ud800"}, 'name is "a\\ud800"; give text that UTF-8 can hold.'),
        ({"site": {"reach": [2, 1]}}, "site.reach must be given as [low, high] with high above low."),
    ],
)
def test_a_wrong_field_is_named_with_what_was_given_and_what_is_allowed(raw, sentence):
    assert problems(raw) == (sentence,)


def test_an_id_with_blanks_is_answered_with_the_rule():
    (sentence,) = problems(with_element(kind="bend", id="a b"))
    assert sentence.startswith('runs[0].elements[0].id is "a b"; give another: an id is 1 to 64 letters')


def test_every_problem_of_a_file_is_told_at_once():
    raw = {
        "nmae": "x",
        "balls": [{"id": "b", "layers": []}],
        "runs": [
            {"id": "r", "pair": "x", "elements": [{"kind": "bend", "id": "a", "turn": 0}, {"kind": "tray", "id": "a"}]},
            {"id": "q", "start": {"kind": "outlet", "run": "q", "element": "z"}},
        ],
    }
    told = problems(raw)
    for expected in (
        "nmae is not a field",
        "balls[0].layers has 0 entries",
        "runs[0].elements[0].turn must not be 0",
        'runs[0].pair is "x"',
        'runs[0].elements[1].id is "a"',
        'runs[1].start.element is "z"',
        "runs[1].start.run leads round in a circle",
    ):
        assert any(sentence.startswith(expected) for sentence in told), expected
    assert len(told) == 7
    assert all(sentence.count(". ") == 0 and sentence.endswith(".") for sentence in told)


def test_a_name_given_twice_is_told_with_its_path():
    text = '{"schema_version": 1, "name": "a", "name": "b", "runs": [{"id": "r", "id": "q"}]}'
    assert set(problems(text)) == {
        "name is given twice; keep one of them.",
        "runs[0].id is given twice; keep one of them.",
    }


def test_more_problems_than_anybody_reads_are_counted():
    told = problems({"runs": [{"id": "r", "elements": [{"kind": "x"}] * 300}]})
    assert len(told) == storage.PROBLEM_LIMIT + 1
    assert told[-1] == "There are 100 more problems; correct these first."


# -- files that cannot be opened ------------------------------------------------------------------
def sentence_of(path: object) -> str:
    """Return the only problem of a file."""
    with pytest.raises(DesignFileError) as caught:
        load(path)  # type: ignore[arg-type]
    (sentence,) = caught.value.problems
    return sentence


def test_a_missing_file_a_folder_and_a_device_are_told_apart(tmp_path):
    assert sentence_of(tmp_path / "none.json") == "The file cannot be read: there is no such file or folder."
    assert sentence_of(tmp_path) == "It is a folder; name the design file inside it."
    assert sentence_of("/dev/null") == "It is a device or a pipe; name a file on a disk."
    assert sentence_of("a\0b") == "The name holds a character that no file name can have."
    assert sentence_of(tmp_path / ("x" * 300)) == "The file cannot be read: the name is too long."


def test_a_huge_file_is_refused(tmp_path):
    path = tmp_path / "huge.json"
    with path.open("wb") as file:
        file.truncate(storage.SIZE_LIMIT + 1)
    assert sentence_of(path) == "The file is larger than 50 MB; a design is far smaller."


def test_a_file_that_may_not_be_read_is_told(tmp_path, monkeypatch):
    save(desk_run(), tmp_path / "a.json")

    def refuse(*_: object, **__: object) -> None:
        raise PermissionError(errno.EACCES, "Permission denied")

    monkeypatch.setattr(Path, "open", refuse)
    assert sentence_of(tmp_path / "a.json") == "The file cannot be read: this account may not open it."


# -- saving ---------------------------------------------------------------------------------------
@pytest.mark.parametrize(
    ("number", "reason"),
    [(errno.ENOSPC, "the disk is full"), (errno.EROFS, "the disk can only be read"), (errno.EIO, "input/output error")],
)
@pytest.mark.parametrize("step", ["fsync", "replace"])
def test_a_failed_save_keeps_the_old_file_whole(tmp_path, monkeypatch, number, reason, step):
    path = tmp_path / "a.json"
    save(desk_run(), path)
    before = path.read_bytes()

    def fail(*_: object) -> None:
        raise OSError(number, os.strerror(number))

    monkeypatch.setattr(os, step, fail)
    with pytest.raises(SaveError, match=f"cannot be written: {reason}; what stood there before is unchanged"):
        save(every_kind(), path)
    monkeypatch.undo()
    assert path.read_bytes() == before
    assert os.listdir(tmp_path) == ["a.json"]


def test_saving_where_there_is_no_folder_or_onto_a_folder(tmp_path):
    with pytest.raises(SaveError, match="there is no such file or folder"):
        save(desk_run(), tmp_path / "none" / "a.json")
    with pytest.raises(SaveError, match="it is a folder, not a file"):
        save(desk_run(), tmp_path)


def test_a_write_protected_file_is_not_replaced(tmp_path, monkeypatch):
    save(desk_run(), tmp_path / "a.json")
    monkeypatch.setattr(os, "access", lambda *_: False)
    with pytest.raises(SaveError, match="it is write-protected; save under another name"):
        save(every_kind(), tmp_path / "a.json")
    assert load(tmp_path / "a.json") == desk_run()


def test_a_link_stays_a_link_and_permissions_stay(tmp_path):
    save(desk_run(), tmp_path / "a.json")
    (tmp_path / "a.json").chmod(0o640)
    (tmp_path / "link.json").symlink_to("a.json")
    save(every_kind(), tmp_path / "link.json")
    assert (tmp_path / "link.json").is_symlink()
    assert load(tmp_path / "a.json") == every_kind()
    assert stat.S_IMODE((tmp_path / "a.json").stat().st_mode) == 0o640


def test_a_new_file_has_the_usual_permissions(tmp_path):
    previous = os.umask(0o027)
    try:
        write_whole(b"x", tmp_path / "new")
    finally:
        os.umask(previous)
    assert stat.S_IMODE((tmp_path / "new").stat().st_mode) == 0o640


# -- schema ---------------------------------------------------------------------------------------
def test_schema_names_every_field_of_the_root_and_every_kind():
    made = schema()
    assert list(made["properties"]) == list(Design.model_fields)
    mapping = made["$defs"]["Run"]["properties"]["elements"]["items"]["discriminator"]["mapping"]
    assert set(mapping) == set(ELEMENTS)
    assert made["$defs"]["Bend"]["properties"]["radius"]["unit"] == "m"


def test_the_shipped_schema_is_the_present_one():
    """Written by `trundle schema --out`; write it again after a change of the document."""
    assert json.loads(SHIPPED_SCHEMA.read_text(encoding="utf-8")) == schema()
