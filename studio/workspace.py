"""The open design and what is known about it: the only emitter of change signals.

Views read `design`, `roll`, `selection`, `time` and connect to the signals; they change things through `select`,
`set_time` and `edit`. `roll` may be older than `design` while the ball is being rolled anew: `current` tells.
"""

from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QObject, Signal, Slot
from PySide6.QtGui import QUndoStack

from engine.errors import DesignError, UnknownNameError
from engine.model.design import Design, Run
from engine.model.elements import ElementBase
from engine.model.storage import load, save
from studio.commands import EditCommand
from studio.theme import Theme

if TYPE_CHECKING:
    from engine.simulate import Roll


class Workspace(QObject):
    """One open design with its file, undo history, selection, roll and time cursor."""

    designChanged = Signal(object)
    """The design was replaced, by an edit, undo, redo or opening; carries the design."""
    rolled = Signal(object)
    """A roll arrived (Roll), or the last one was dropped (None)."""
    rollFailed = Signal(str)
    """The design cannot be rolled; a sentence."""
    selectionChanged = Signal(tuple)
    """Ids of the selected elements."""
    timeChanged = Signal(float)
    """Time cursor, s."""
    fileChanged = Signal()
    """File path or edited mark changed."""
    opened = Signal()
    """Another design was opened; views should fit it."""

    def __init__(self, theme: Theme | None = None, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.theme = theme if theme is not None else Theme(parent=self)
        self.undo_stack = QUndoStack(self)
        self._design = Design()
        self._path: Path | None = None
        self._roll: Roll | None = None
        self._problem = ""
        self._selection: tuple[str, ...] = ()
        self._time = 0.0
        self._run_id: str | None = None
        self._recovered = False
        self.undo_stack.cleanChanged.connect(self._tell_file)

    @Slot(bool)
    def _tell_file(self, _clean: bool) -> None:
        """Pass on that the edited mark changed. A slot, not a lambda: the stack tells once more while it is deleted."""
        self.fileChanged.emit()

    # -- reading ----------------------------------------------------------------------------------
    @property
    def design(self) -> Design:
        """The design as it is drawn."""
        return self._design

    @property
    def roll(self) -> "Roll | None":
        """Latest roll; of an earlier state of the design while `current` is False."""
        return self._roll

    @property
    def current(self) -> bool:
        """Whether the roll is of exactly this design and run."""
        return self._roll is not None and self._roll.design is self._design and self._roll.run_id == self.run_id

    @property
    def problem(self) -> str:
        """Why the design cannot be rolled; empty when it can."""
        return self._problem

    @property
    def selection(self) -> tuple[str, ...]:
        """Ids of the selected elements."""
        return self._selection

    @property
    def time(self) -> float:
        """Time cursor, s."""
        return self._time

    @property
    def path(self) -> Path | None:
        """File of the design; None when it has not been saved yet."""
        return self._path

    @property
    def dirty(self) -> bool:
        """Whether there are changes that are not in the file."""
        return self._recovered or not self.undo_stack.isClean()

    @property
    def title(self) -> str:
        """Name to show for the design."""
        return self._design.name or (self._path.stem if self._path is not None else "Untitled design")

    @property
    def run(self) -> Run | None:
        """Run in work; None when the design has none."""
        run_id = self.run_id
        return self._design.run(run_id) if run_id is not None else None

    @property
    def run_id(self) -> str | None:
        """Id of the run in work; the first one unless another was chosen."""
        ids = [run.id for run in self._design.runs]
        return self._run_id if self._run_id in ids else (ids[0] if ids else None)

    @property
    def selected_element(self) -> ElementBase | None:
        """The selected element when exactly one is selected."""
        if len(self._selection) != 1:
            return None
        return self.element(self._selection[0])

    def element(self, key: str) -> ElementBase | None:
        """Element by id, None when there is none."""
        for run in self._design.runs:
            for element in run.elements:
                if element.id == key:
                    return element
        return None

    # -- what views may set -----------------------------------------------------------------------
    def select(self, ids: Iterable[str]) -> None:
        """Select elements by id; unknown ids are left out."""
        known = {element.id: run.id for run in self._design.runs for element in run.elements}
        chosen = tuple(dict.fromkeys(key for key in ids if key in known))
        if chosen and known[chosen[0]] != self.run_id:
            self.choose_run(known[chosen[0]])
        if chosen != self._selection:
            self._selection = chosen
            self.selectionChanged.emit(chosen)

    def set_time(self, t: float) -> None:
        """Set the time cursor, s; kept within the roll."""
        last = self._roll.duration if self._roll is not None else 0.0
        wanted = min(max(float(t), 0.0), last)
        if wanted != self._time:
            self._time = wanted
            self.timeChanged.emit(wanted)

    def choose_run(self, run_id: str) -> None:
        """Work on another run."""
        if run_id == self.run_id:
            return
        self._design.run(run_id)
        self._run_id = run_id
        self.selectionChanged.emit(self._selection)
        self.designChanged.emit(self._design)

    # -- changing the design ----------------------------------------------------------------------
    def edit(self, label: str, changed: Design, merge_key: str = "") -> None:
        """Put an edited design in place as one step that can be undone.

        `label` is the name of the step in the undo menu; `changed` a design made by `engine.model.edits` (the same
        object as before makes no step); steps in a row with the same `merge_key` become one (drags, stepped numbers).
        """
        if changed is not self._design:
            self.undo_stack.push(EditCommand(self.put, self._design, changed, label, merge_key))

    def put(self, design: Design) -> None:
        """Replace the design; called by undo commands only."""
        self._design = design
        known = {element.id for run in design.runs for element in run.elements}
        kept = tuple(key for key in self._selection if key in known)
        if kept != self._selection:
            self._selection = kept
            self.selectionChanged.emit(kept)
        self.designChanged.emit(design)
        self.fileChanged.emit()

    def take_roll(self, roll: "Roll") -> None:
        """Accept a finished roll; one of another design than the present is kept only while none is better."""
        self._roll = roll
        self._problem = ""
        self.rolled.emit(roll)
        if self._time > roll.duration:
            self.set_time(roll.duration)

    def take_failure(self, sentence: str) -> None:
        """Accept that the present design cannot be rolled."""
        self._roll = None
        self._problem = sentence
        self.rolled.emit(None)
        self.rollFailed.emit(sentence)
        self.set_time(0.0)

    # -- files ------------------------------------------------------------------------------------
    def new(self, design: Design | None = None) -> None:
        """Start on a new design without a file."""
        self._open(design if design is not None else Design(), None)

    def open(self, path: Path) -> None:
        """Open a design file; raises DesignFileError with every problem, the present design stays then."""
        self._open(load(path), path)

    def recover(self, design: Design, path: Path | None) -> None:
        """Open a working copy left by a session that ended badly; it counts as edited."""
        self._open(design, path)
        self._recovered = True
        self.fileChanged.emit()

    def save(self, path: Path | None = None) -> None:
        """Save to a file, the present one when none is given; raises SaveError."""
        target = path if path is not None else self._path
        if target is None:
            raise DesignError("The design has no file yet; choose a name for it.")
        save(self._design, target)
        self._path = target
        self._recovered = False
        self.undo_stack.setClean()
        self.fileChanged.emit()

    def _open(self, design: Design, path: Path | None) -> None:
        """Put a design in place of everything."""
        self.undo_stack.clear()
        self._design, self._path, self._roll, self._problem = design, path, None, ""
        self._selection, self._run_id, self._recovered = (), None, False
        self._time = 0.0
        self.selectionChanged.emit(())
        self.rolled.emit(None)
        self.timeChanged.emit(0.0)
        self.designChanged.emit(design)
        self.fileChanged.emit()
        self.opened.emit()

    def require_element(self, key: str) -> ElementBase:
        """Element by id; raises UnknownNameError."""
        found = self.element(key)
        if found is None:
            known = [element.id for run in self._design.runs for element in run.elements]
            raise UnknownNameError("element", key, known)
        return found
