"""Pure edits: a design in, a new design out; the old one is untouched, so undo is keeping it.

An edit that changes nothing gives back the same object. A refused one raises EditError with a sentence for each reason.
"""

import re
from collections.abc import Callable
from typing import Any, TypeVar

from pydantic import TypeAdapter, ValidationError

from engine.errors import EditError, UnknownNameError, suggestion
from engine.model.base import Frozen
from engine.model.design import Design, OutletStart, Release, Run
from engine.model.elements import Element, ElementBase
from engine.model.problems import problems_of

Path = tuple[str | int, ...]
Piece = TypeVar("Piece", bound=Frozen)

ROOT_LISTS = ("materials", "balls", "pairs", "runs", "stations")
REFERENCES = {"materials": ("material", "ball_material", "wall_material"), "balls": ("ball",), "pairs": ("pair",)}
"""Fields by which each list of the design is pointed at."""
_STEP = re.compile(r"([A-Za-z_]\w*)|\[(\d+)\]")
_ELEMENT: TypeAdapter[ElementBase] = TypeAdapter(Element)


def path_of(text: str | Path) -> Path:
    """Take a path apart: `runs[0].elements[3].radius` to ("runs", 0, "elements", 3, "radius")."""
    if isinstance(text, tuple):
        return text
    steps = [(match.group(1) or int(match.group(2))) for match in _STEP.finditer(text)]
    if not steps or path_text(tuple(steps)) != text:
        raise EditError(f'"{text}" is not a path; write one like runs[0].elements[3].radius.')
    return tuple(steps)


def path_text(path: Path) -> str:
    """Write a path as it stands in sentences."""
    return "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in path).removeprefix(".")


def path_to_element(design: Design, key: str) -> Path:
    """Path of an element, by its id."""
    for r, run in enumerate(design.runs):
        for e, element in enumerate(run.elements):
            if element.id == key:
                return ("runs", r, "elements", e)
    raise _unknown("element", key, [element.id for run in design.runs for element in run.elements])


def get_field(design: Design, path: str | Path) -> Any:
    """Value at a path."""
    value: Any = design
    for step in path_of(path):
        value = _inner(value, step, path)
    return value


def set_field(design: Design, path: str | Path, value: Any) -> Design:
    """Set one field.

    Parameters
    ----------
    design : Design
    path : place of the field, such as `runs[0].elements[3].radius`
    value : number, text, document object or the plain dictionary of one (its `kind` may differ from the present one)

    Returns
    -------
    Design
        The same object when the field already has that value.
    """
    steps = path_of(path)
    present = get_field(design, steps)
    if type(present) is type(value) and present == value:
        return design
    made: Design = _with(design, steps, value, "")
    return design if made == design else made


def _inner(value: Any, step: str | int, path: str | Path) -> Any:
    """One step down into the document."""
    where = path if isinstance(path, str) else path_text(path)
    if isinstance(step, int):
        if not isinstance(value, tuple) or step >= len(value):
            count = len(value) if isinstance(value, tuple) else 0
            raise EditError(f"{where} does not exist: there are {count} entries, counted from 0.")
        return value[step]
    if not isinstance(value, Frozen) or step not in type(value).model_fields:
        names = list(type(value).model_fields) if isinstance(value, Frozen) else []
        raise EditError(f'{where} does not exist: there is no field "{step}"{suggestion(step, names, len(names))}.')
    return getattr(value, step)


def _with(node: Any, steps: Path, value: Any, prefix: str) -> Any:
    """Node with another value some steps further down."""
    if not steps:
        return value
    step = steps[0]
    where = path_text((step,)) if not prefix else prefix + (f"[{step}]" if isinstance(step, int) else f".{step}")
    inner = _with(_inner(node, step, where), steps[1:], value, where)
    if isinstance(step, int):
        return (*node[:step], inner, *node[step + 1 :])
    return _remade(node, {step: inner}, prefix)


def _remade(node: Piece, changes: dict[str, Any], prefix: str = "") -> Piece:
    """Document object with some fields changed, checked anew."""
    fields = {name: getattr(node, name) for name in type(node).model_fields}
    try:
        return type(node).model_validate({**fields, **changes})
    except ValidationError as error:
        sentences = [problem.sentence for problem in problems_of(error, type(node), prefix)]
        raise EditError(" ".join(sentences)) from error


def _unknown(what: str, key: str, known: list[str]) -> EditError:
    """Error about an id that is not there, in the words of UnknownNameError."""
    return EditError(str(UnknownNameError(what, key, known)))


# -- elements of a run ----------------------------------------------------------------------------
def _with_elements(design: Design, run: str, change: Callable[[list[ElementBase]], None]) -> Design:
    """Design in which the list of elements of one run has been changed."""
    place = _run_place(design, run)
    elements: list[ElementBase] = list(design.runs[place].elements)
    change(elements)
    if tuple(elements) == design.runs[place].elements:
        return design
    made: Design = _with(design, ("runs", place, "elements"), tuple(elements), "")
    return made


def _run_place(design: Design, run: str) -> int:
    """Place of a run among the runs."""
    for place, entry in enumerate(design.runs):
        if entry.id == run:
            return place
    raise _unknown("run", run, [entry.id for entry in design.runs])


def _place(elements: list[ElementBase], key: str) -> int:
    """Place of an element in a list."""
    for place, element in enumerate(elements):
        if element.id == key:
            return place
    raise _unknown("element", key, [element.id for element in elements])


def replace_element(design: Design, key: str, element: ElementBase) -> Design:
    """Put another element in the place of one; with another id, references follow."""
    path = path_to_element(design, key)
    changed: Design = _with(_freed(design, key, element.id), path, element, "")
    return design if changed == design else changed


def insert_element(design: Design, run: str, element: ElementBase, after: str | None = None) -> Design:
    """Insert an element after another one; at the inlet of the run when `after` is None."""

    def change(elements: list[ElementBase]) -> None:
        elements.insert(0 if after is None else _place(elements, after) + 1, element)

    return _with_elements(design, run, change)


def append_element(design: Design, run: str, element: ElementBase) -> Design:
    """Add an element at the end of a run."""
    return _with_elements(design, run, lambda elements: elements.append(element))


def remove_element(design: Design, key: str) -> Design:
    """Remove an element and the stations on it; refused while another run starts at its outlet."""
    owner = design.runs[int(path_to_element(design, key)[1])]
    for run in design.runs:
        if isinstance(run.start, OutletStart) and run.start.element == key and run.start.run == owner.id:
            raise EditError(
                f'"{key}" cannot be removed: run "{run.id}" starts at its outlet; give that run another start.'
            )
    stations = tuple(station for station in design.stations if station.element != key)
    elements = tuple(element for element in owner.elements if element.id != key)
    runs = tuple(run if run.id != owner.id else _remade(run, {"elements": elements}) for run in design.runs)
    return _remade(design, {"stations": stations, "runs": runs})


def move_element(design: Design, key: str, by: int) -> Design:
    """Move an element by some places downstream (negative: upstream); it stops at the ends of its run."""
    run = design.runs[int(path_to_element(design, key)[1])].id

    def change(elements: list[ElementBase]) -> None:
        place = _place(elements, key)
        elements.insert(min(max(place + by, 0), len(elements) - 1), elements.pop(place))

    return _with_elements(design, run, change)


def make_element(plain: dict[str, Any]) -> ElementBase:
    """Element from its plain dictionary."""
    try:
        return _ELEMENT.validate_python(plain)
    except ValidationError as error:
        run = {"id": "run", "elements": (plain,)}
        raise EditError(_sentences_of_run(run) or str(error)) from error


def _sentences_of_run(run: dict[str, Any]) -> str:
    """Sentences about the only element of a run."""
    try:
        Run.model_validate(run)
    except ValidationError as error:
        found = [problem.sentence for problem in problems_of(error, Run)]
        return " ".join(sentence.removeprefix("elements[0].").removeprefix("elements[0] ") for sentence in found)
    return ""


def free_id(design: Design, stem: str) -> str:
    """Id that nothing in the design has yet: the stem and the next number."""
    entries = [entry.id for name in ROOT_LISTS for entry in getattr(design, name)]
    taken = {*entries, *(element.id for run in design.runs for element in run.elements)}
    number = 1
    while f"{stem}{number}" in taken:
        number += 1
    return f"{stem}{number}"


# -- runs and the lists of the design -------------------------------------------------------------
def add_run(design: Design, run: Run) -> Design:
    """Add a run at the end."""
    return add_entry(design, "runs", run)


def remove_run(design: Design, key: str) -> Design:
    """Remove a run and its stations; refused while another run starts from it."""
    place = _run_place(design, key)
    for run in design.runs:
        if run.id != key and isinstance(run.start, OutletStart) and run.start.run == key:
            raise EditError(f'"{key}" cannot be removed: run "{run.id}" starts from it; give that run another start.')
    stations = tuple(station for station in design.stations if station.run != key)
    return _remade(design, {"stations": stations, "runs": design.runs[:place] + design.runs[place + 1 :]})


def set_release(design: Design, run: str, release: Release) -> Design:
    """Set how the ball of a run is let go."""
    return set_field(design, ("runs", _run_place(design, run), "release"), release)


def add_entry(design: Design, name: str, entry: Frozen) -> Design:
    """Add a material, ball, pair, run or station at the end of its list."""
    _root_list(name)
    return _remade(design, {name: (*getattr(design, name), entry)})


def remove_entry(design: Design, name: str, key: str) -> Design:
    """Remove a material, ball, pair or station; refused while something points at it."""
    _root_list(name)
    if name == "runs":
        return remove_run(design, key)
    entries = getattr(design, name)
    kept = tuple(entry for entry in entries if entry.id != key)
    if len(kept) == len(entries):
        raise _unknown(name.rstrip("s"), key, [entry.id for entry in entries])
    return _remade(design, {name: kept})


def _root_list(name: str) -> None:
    """Refuse the name of a list that a design does not have."""
    if name not in ROOT_LISTS:
        raise _unknown("list", name, list(ROOT_LISTS))


# -- ids ------------------------------------------------------------------------------------------
def rename(design: Design, key: str, new: str, within: str | None = None) -> Design:
    """Give an element, or an entry of the list `within` (runs, balls, ...), another id; references follow.

    Parameters
    ----------
    design : Design
    key, new : present and new id
    within : name of the list of the design; elements when left out
    """
    if key == new:
        return design
    if within is None:
        path = path_to_element(design, key)
        changed: Design = _with(_freed(design, key, new), (*path, "id"), new, "")
        return changed
    _root_list(within)
    entries = getattr(design, within)
    place = next((place for place, entry in enumerate(entries) if entry.id == key), None)
    if place is None:
        raise _unknown(within.rstrip("s"), key, [entry.id for entry in entries])
    made = _remade(entries[place], {"id": new}, f"{within}[{place}]")
    renamed = (*entries[:place], made, *entries[place + 1 :])
    draft = design.model_copy(update={within: renamed})
    followed = (
        _follow_run(draft, key, new) if within == "runs" else _follow(draft, REFERENCES.get(within, ()), key, new)
    )
    return _remade(followed, {})


def _freed(design: Design, key: str, new: str) -> Design:
    """Draft, not yet checked, in which what points at element `key` points at `new`."""
    if key == new:
        return design
    stations = tuple(
        station.model_copy(update={"element": new}) if station.element == key else station
        for station in design.stations
    )
    runs = tuple(
        run.model_copy(update={"start": run.start.model_copy(update={"element": new})})
        if isinstance(run.start, OutletStart) and run.start.element == key
        else run
        for run in design.runs
    )
    return design.model_copy(update={"stations": stations, "runs": runs})


def _follow_run(design: Design, key: str, new: str) -> Design:
    """Draft in which what points at run `key` points at `new`."""
    stations = tuple(
        station.model_copy(update={"run": new}) if station.run == key else station for station in design.stations
    )
    runs = tuple(
        run.model_copy(update={"start": run.start.model_copy(update={"run": new})})
        if isinstance(run.start, OutletStart) and run.start.run == key
        else run
        for run in design.runs
    )
    return design.model_copy(update={"stations": stations, "runs": runs})


def _follow(node: Any, names: tuple[str, ...], key: str, new: str) -> Any:
    """Document object, and all inside it, with fields of these names changed from `key` to `new`; a draft."""
    if isinstance(node, tuple):
        made = tuple(_follow(entry, names, key, new) for entry in node)
        return node if all(one is other for one, other in zip(made, node, strict=True)) else made
    if not isinstance(node, Frozen):
        return node
    changes = {}
    for name in type(node).model_fields:
        value = getattr(node, name)
        followed = new if name in names and value == key else _follow(value, names, key, new)
        if followed is not value:
            changes[name] = followed
    return node.model_copy(update=changes) if changes else node
