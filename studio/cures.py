"""Cures that can be pressed: a finding becomes an edit that takes it away, to be undone like any other step."""

import math
from typing import NamedTuple

from engine.errors import EditError
from engine.findings.finding import Finding, FindingKind
from engine.model.design import Design, Run
from engine.model.edits import free_id, insert_element, replace_element
from engine.model.elements import FULL_TURN, Bend, Easing, ElementBase, Helix, SegmentBase, Straight, Transition
from studio.steps import bank_for_speed
from studio.words import element_words
from studio.workspace import Workspace

EASED_TURN = 0.25
"""rad. Turn that an inserted transition takes over from the bend it leads into or out of."""
SHORTEST, LONGEST = 0.03, 0.3
"""m. Length of an inserted transition."""


class Cure(NamedTuple):
    """One cure, ready to be put in place: name of the step, design, element to select."""

    label: str
    design: Design
    element: str


def offers(workspace: Workspace, finding: Finding) -> bool:
    """Whether a finding has a cure that can be pressed; quick, asked for every finding after every roll."""
    before, after = _joint(workspace, finding)
    if finding.kind is FindingKind.CURVATURE_JUMP:
        return before is not None and after is not None and _bend_to_ease(before, after) is not None
    if finding.kind is FindingKind.JOINT and finding.unit == "m":
        return isinstance(before, SegmentBase) and isinstance(after, SegmentBase)
    if finding.kind is FindingKind.THIN_MARGIN:
        element = workspace.element(finding.segment)
        return isinstance(element, (Bend, Helix)) and element.section.kind == "trough"
    return False


def cure_of(workspace: Workspace, finding: Finding) -> Cure | None:
    """Cure of a finding; None when it has none, or when it is in place already."""
    before, after = _joint(workspace, finding)
    element = workspace.element(finding.segment)
    if not offers(workspace, finding) or element is None:
        return None
    if finding.kind is FindingKind.CURVATURE_JUMP and before is not None and after is not None:
        return ease_joint(workspace, before, after)
    if finding.kind is FindingKind.JOINT and isinstance(before, SegmentBase) and isinstance(after, SegmentBase):
        section = after.section.model_copy(update={"bore": before.section.bore})
        design = replace_element(workspace.design, after.id, after.model_copy(update={"section": section}))
        return Cure(f"bore of {element_words(after)}", design, after.id)
    design = bank_for_speed(workspace, element)
    return None if design is None else Cure(f"bank of {element_words(element)}", design, element.id)


def _joint(workspace: Workspace, finding: Finding) -> tuple[ElementBase | None, ElementBase | None]:
    """Element before the one a finding is on, and that one."""
    after = workspace.element(finding.segment)
    run = workspace.run
    if after is None or run is None or after not in run.elements:
        return None, after
    place = run.elements.index(after)
    return (run.elements[place - 1] if place > 0 else None), after


def ease_joint(workspace: Workspace, before: ElementBase, after: ElementBase) -> Cure:
    """Insert a transition between two segments, so that the curvature does not jump.

    Over plan length L the curvature goes from a to b, which turns the run by L (a + b)/2; the bend is shortened by as
    much, so that the run goes on in the same direction. L is chosen so that this is `EASED_TURN` where it can be.
    """
    a, b = curvature(before, at_end=True), curvature(after, at_end=False)
    bend = _bend_to_ease(before, after)
    if a is None or b is None or bend is None:
        raise EditError("This joint cannot be eased by a transition; draw one by hand.")
    mean = 0.5 * (a + b)
    length = min(max(EASED_TURN / abs(mean), SHORTEST), LONGEST) if mean else SHORTEST
    design = workspace.design
    key = free_id(design, "ease")
    piece = Transition(
        id=key,
        name=f"Transition {key.removeprefix('ease')}",
        length=length,
        curvature_start=a,
        curvature_end=b,
        grade=grade_of(before),
        section=after.section if isinstance(after, SegmentBase) else Transition(id=key).section,
    )
    design = replace_element(design, bend.id, shortened(bend, length * mean))
    run: Run = design.run_of(before.id)
    return Cure(
        f"ease the joint before {element_words(after)}", insert_element(design, run.id, piece, before.id), piece.id
    )


def curvature(element: ElementBase, *, at_end: bool) -> float | None:
    """Plan curvature of a segment at its inlet or outlet, 1/m, positive left; None where it has no single one."""
    if isinstance(element, (Straight, Easing)):
        return 0.0
    if isinstance(element, (Bend, Helix)):
        return math.copysign(1.0 / element.radius, element.turn if isinstance(element, Bend) else element.turns)
    if isinstance(element, Transition):
        return element.curvature_end if at_end else element.curvature_start
    return None


def grade_of(element: ElementBase) -> float:
    """Grade at the outlet of a segment."""
    if isinstance(element, Helix):
        return element.drop / (FULL_TURN * element.radius * abs(element.turns))
    grade = getattr(element, "grade_end", getattr(element, "grade", 0.0))
    return float(grade)


def shortened(bend: Bend | Helix, turn: float) -> Bend | Helix:
    """Bend that turns by `turn` rad less."""
    if isinstance(bend, Bend):
        return bend.model_copy(update={"turn": bend.turn - turn})
    left = bend.turns - turn / FULL_TURN
    return bend.model_copy(update={"turns": left, "drop": bend.drop * left / bend.turns})


def _bend_to_ease(before: ElementBase, after: ElementBase) -> Bend | Helix | None:
    """Bend or helix of a joint that is long enough to give some of its turn to a transition."""
    if curvature(before, at_end=True) is None or curvature(after, at_end=False) is None:
        return None
    for element in (after, before):
        if isinstance(element, (Bend, Helix)):
            turn = element.turn if isinstance(element, Bend) else FULL_TURN * element.turns
            if abs(turn) > 2.0 * EASED_TURN:
                return element
    return None
