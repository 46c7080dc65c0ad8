"""Edits that the window offers: add, duplicate, remove, move, another kind of a part, bank for the speed."""

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from engine.constants import STANDARD_GRAVITY
from engine.errors import EditError
from engine.model.base import Frozen
from engine.model.design import Design, FreeStart, OutletStart, Run
from engine.model.edits import (
    add_run,
    append_element,
    free_id,
    insert_element,
    make_element,
    move_element,
    remove_element,
    replace_element,
)
from engine.model.elements import Bend, ElementBase, Helix, SegmentBase, Straight, Tray, Trough, Tube
from studio.words import kind_words

if TYPE_CHECKING:
    from studio.workspace import Workspace

STEMS = {"free_line": "line", "transition": "ease", "easing": "dip"}
"""Beginning of the id of a new element, where it is not its kind."""
LEAST_SPEED = 0.02
"""m/s. Below this there is nothing to bank for."""


def starting_design() -> Design:
    """New design: one run with a straight, so that there is something to roll and to continue from."""
    run = Run(
        id="run1",
        start=FreeStart(position=(0.0, 0.0, 1.0)),
        elements=(Straight(id="straight1", name="Straight 1", grade=0.05),),
    )
    return Design(id="design", runs=(run,))


def new_element(workspace: "Workspace", kind: str, before: ElementBase | None) -> ElementBase:
    """Element of a kind, fitted to the one it follows: same cross section, curvature and grade where it has them."""
    design = workspace.design
    stem = STEMS.get(kind, kind)
    key = free_id(design, stem)
    fields: dict[str, Any] = {"kind": kind, "id": key, "name": f"{kind_words(kind)} {key.removeprefix(stem)}"}
    if isinstance(before, SegmentBase):
        model = type(make_element(fields))
        if "section" in model.model_fields:
            fields["section"] = before.section
        grade = getattr(before, "grade", getattr(before, "grade_end", None))
        if grade is not None and "grade" in model.model_fields and kind != "deck":
            fields["grade"] = grade
        if grade is not None and "grade_start" in model.model_fields:
            fields["grade_start"] = grade
        if kind == "transition" and isinstance(before, (Bend, Helix)):
            turn = before.turn if isinstance(before, Bend) else before.turns
            fields.update(curvature_start=math.copysign(1.0 / before.radius, turn), curvature_end=0.0)
    return make_element(fields)


def add_element(workspace: "Workspace", kind: str) -> tuple[Design, str]:
    """Design with a new element after the selected one, else at the open end of the run; and its id."""
    design, run = workspace.design, workspace.run
    if run is None:
        design = add_run(design, Run(id=free_id(design, "run")))
        run = design.runs[-1]
    after = next((e for e in run.elements if workspace.selection and e.id == workspace.selection[-1]), None)
    if after is None and run.elements:
        after = run.elements[-1]
        if isinstance(after, Tray):
            after = run.elements[-2] if len(run.elements) > 1 else None
    element = new_element(workspace, kind, after)
    if after is None and not run.elements:
        return append_element(design, run.id, element), element.id
    return insert_element(design, run.id, element, after.id if after is not None else None), element.id


def duplicate_elements(workspace: "Workspace") -> tuple[Design, list[str]]:
    """Design with copies of the selected elements behind the last of them; and the ids of the copies."""
    design, made = workspace.design, []
    run = design.run_of(workspace.selection[0])
    chosen = [element for element in run.elements if element.id in workspace.selection]
    after = chosen[-1].id
    for element in chosen:
        stem = element.id.rstrip("0123456789") or element.kind
        key = free_id(design, stem)
        name = f"{kind_words(element.kind)} {key.removeprefix(stem)}"
        copy = element.model_copy(update={"id": key, "name": name})
        design = insert_element(design, run.id, copy, after)
        after = copy.id
        made.append(copy.id)
    return design, made


def remove_elements(workspace: "Workspace") -> Design:
    """Design without the selected elements."""
    design = workspace.design
    for key in workspace.selection:
        design = remove_element(design, key)
    return design


def move_elements(workspace: "Workspace", by: int) -> Design:
    """Design with the selected elements one place earlier (-1) or later (+1); at the end of a run nothing moves."""
    design = workspace.design
    run = design.run_of(workspace.selection[0])
    chosen = [element.id for element in run.elements if element.id in workspace.selection]
    at_end = chosen[0] == run.elements[0].id if by < 0 else chosen[-1] == run.elements[-1].id
    if at_end:
        return design
    for key in chosen if by < 0 else reversed(chosen):
        design = move_element(design, key, by)
    return design


def neighbour_after_removal(workspace: "Workspace") -> str | None:
    """Element to select once the selected ones are gone: the one before them, else the one after."""
    run = workspace.design.run_of(workspace.selection[0])
    kept = [element.id for element in run.elements if element.id not in workspace.selection]
    if not kept:
        return None
    return kept[max(0, run.index(workspace.selection[0]) - 1) if run.index(workspace.selection[0]) <= len(kept) else -1]


def part_of_kind(workspace: "Workspace", present: Any, value: Any) -> Any:
    """Value to set: where a part of the document gets another kind, a new part that keeps what both kinds have."""
    if not isinstance(present, Frozen) or not isinstance(value, str):
        return value
    if value == "tube" and isinstance(present, Trough):
        return Tube(bore=present.bore, wall=present.wall)
    if value == "trough" and isinstance(present, Tube):
        return Trough(bore=present.bore, wall=present.wall)
    if value == "outlet":
        for run in workspace.design.runs:
            if run.id != workspace.run_id and run.elements:
                return OutletStart(run=run.id, element=run.elements[-1].id)
        raise EditError("There is no other run with an outlet; give this run a place of its own.")
    return {"kind": value}


def bank_for_speed(workspace: "Workspace", element: ElementBase) -> Design | None:
    """Design with the bank that keeps the ball on the lowest line of a trough bend; None where that does not apply.

    On a bend of radius R at speed v the load leans outward by atan(v^2/(g R)); the bank turns the lowest line as far.
    A turn to the left (positive) leans it to the right, which is a negative bank. The speed is the root of the mean
    square over the element.
    """
    roll = workspace.roll
    if roll is None or not isinstance(element, (Bend, Helix)) or not isinstance(element.section, Trough):
        return None
    index = next((entry.index for entry in roll.layout.placed if entry.element.id == element.id), -1)
    rows = roll.trajectory.element == index
    if not rows.any():
        return None
    square = float(np.mean(np.sum(roll.trajectory.v[rows] ** 2, axis=1)))
    if square < LEAST_SPEED**2:
        return None
    turn = element.turn if isinstance(element, Bend) else element.turns
    bank = -math.copysign(round(math.atan(square / (STANDARD_GRAVITY * element.radius)), 4), turn)
    banked = element.model_copy(update={"bank_start": bank, "bank_end": bank})
    changed = replace_element(workspace.design, element.id, banked)
    return None if changed is workspace.design else changed
