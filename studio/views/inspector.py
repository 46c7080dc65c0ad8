"""Inspector: the numbers of what is selected, what the ball does there, and the commands that fit."""

from collections.abc import Mapping
from typing import Any

from PySide6.QtCore import Qt, Slot
from PySide6.QtWidgets import QFrame, QGridLayout, QHBoxLayout, QLabel, QPushButton, QScrollArea, QVBoxLayout, QWidget

from engine.errors import EditError, UnknownNameError
from engine.model.base import FieldSpec, Frozen, fields_of
from engine.model.catalogue import ball_table, pair_table
from engine.model.edits import Path, get_field, path_text, path_to_element, set_field
from engine.model.elements import ElementBase
from studio.steps import bank_for_speed, part_of_kind
from studio.theme import Theme
from studio.widgets.fields import FieldEditor
from studio.widgets.forms import FieldForm, Row
from studio.words import element_words, figures_of, section_words
from studio.workspace import Workspace

LAST_FIELDS = ("bank_start", "bank_end", "section")
"""Fields every segment has come after the numbers of its kind."""
PLAIN_FIELDS = ("pair", "name", "note")
"""Fields that come last, below what the ball does."""
MARGIN = 12
Piece = tuple[Frozen, Path, list[str]]
"""Piece of the document to edit: model, path, names of its fields."""


class Inspector(QFrame):
    """Panel on the right: edits go through the workspace, the ball is rolled again at once."""

    def __init__(self, workspace: Workspace, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("sheet")
        self.setAccessibleName("Inspector")
        self._workspace = workspace
        self._signature: tuple[Any, ...] = ()
        self.forms: list[FieldForm] = []
        self._title, self._aside = QLabel(), QLabel()
        self._title.setProperty("role", "title")
        self._aside.setProperty("role", "soft")
        self._page = QWidget()
        self._column = QVBoxLayout(self._page)
        self._column.setContentsMargins(MARGIN, 4, MARGIN, MARGIN)
        self._column.setSpacing(8)
        self._facts = Facts()
        self.bank_button = QPushButton("Bank for this speed")
        self.bank_button.setProperty("role", "cure")
        self.bank_button.clicked.connect(self._bank)
        self._column.addWidget(self._facts)
        self._column.addWidget(self.bank_button)
        self._column.addStretch(1)
        self._lay_out()
        workspace.selectionChanged.connect(self._refresh)
        workspace.designChanged.connect(self._refresh)
        workspace.rolled.connect(self._refresh_facts)
        self._refresh()

    def _lay_out(self) -> None:
        """Title over a scrolled page."""
        top = QHBoxLayout()
        top.setContentsMargins(MARGIN, MARGIN, MARGIN, 4)
        top.addWidget(self._title, 1)
        top.addWidget(self._aside)
        scroll = QScrollArea()
        scroll.setWidgetResizable(True)
        scroll.setFrameShape(QFrame.Shape.NoFrame)
        scroll.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        scroll.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        scroll.setWidget(self._page)
        outer = QVBoxLayout(self)
        outer.setContentsMargins(0, 0, 0, 0)
        outer.setSpacing(0)
        outer.addLayout(top)
        outer.addWidget(scroll, 1)

    # -- showing ----------------------------------------------------------------------------------
    @Slot()
    def _refresh(self, *_: Any) -> None:
        """Show the selection: new rows when it is of another shape, else new values in the rows there are."""
        pieces = self._pieces()
        signature = (self._workspace.design.units, tuple((path, _shape(model)) for model, path, _ in pieces))
        if signature != self._signature:
            self._signature = signature
            self._rebuild(pieces)
        else:
            for row in self.rows:
                value = get_field(self._workspace.design, row.path)
                row.editor.show_value(getattr(value, "kind", value) if isinstance(value, Frozen) else value)
        self._show_title()
        self._refresh_facts()

    def _pieces(self) -> list[Piece]:
        """Pieces of the document to edit: model, path, names of fields."""
        design = self._workspace.design
        element = self._workspace.selected_element
        if element is not None:
            path = path_to_element(design, element.id)
            return [(element, path, element_fields(element)), (element, path, list(PLAIN_FIELDS))]
        if self._workspace.selection:
            return []
        pieces: list[Piece] = []
        run = self._workspace.run
        if run is not None:
            pieces.append((run, ("runs", design.runs.index(run)), ["name", "ball", "pair", "release", "start"]))
        pieces.append((design, (), ["name", "note"]))
        if design.site is not None:
            pieces.append((design.site, ("site",), ["height", "floor", "reach", "outline"]))
        return pieces

    def _rebuild(self, pieces: list[Piece]) -> None:
        """Make the rows anew: those of an element's last fields below what the ball does."""
        for form in self.forms:
            self._column.removeWidget(form)
            form.hide()
            form.deleteLater()
        upper, lower = self._new_form(), self._new_form()
        headings = {(): "Design", ("site",): "Site"}
        for model, path, names in pieces:
            form = lower if names == list(PLAIN_FIELDS) else upper
            if path in headings:
                form.heading(headings[path])
            form.add(model, path, names)
        self._column.insertWidget(0, upper)
        self._column.insertWidget(self._column.count() - 1, lower)
        upper.show()
        lower.setVisible(bool(lower.rows))
        self.forms = [upper, lower]

    def _new_form(self) -> FieldForm:
        """Empty form whose edits become steps."""
        form = FieldForm(self._workspace.design.units, self._entries)
        form.edited.connect(self._commit)
        return form

    @property
    def rows(self) -> list[Row]:
        """All rows on screen."""
        return [row for form in self.forms for row in form.rows]

    def editor(self, *path: str | int) -> FieldEditor:
        """Editor whose path ends with these steps."""
        found = next((row.editor for row in self.rows if row.path[-len(path) :] == path), None)
        if found is None:
            raise UnknownNameError("field", path_text(path), [str(row.path[-1]) for row in self.rows])
        return found

    def _show_title(self) -> None:
        """Name of what is selected, and its cross section beside it."""
        element, count = self._workspace.selected_element, len(self._workspace.selection)
        aside = ""
        if element is not None:
            title = element_words(element)
            aside = section_words(element, self._workspace.design.units)
        elif count:
            title = f"{count} selected"
        else:
            run = self._workspace.run
            title = (run.name or "Run") if run is not None else "Design"
            aside = f"{len(run.elements)} elements" if run is not None else ""
        self._title.setText(title)
        self._aside.setText(aside)

    @Slot()
    def _refresh_facts(self, *_: Any) -> None:
        """What the ball does in the selected element."""
        element, roll = self._workspace.selected_element, self._workspace.roll
        figures = figures_of(roll, element) if element is not None and roll is not None else []
        never = element is not None and roll is not None and not figures
        self._facts.show_rows(figures, "The ball does not come here." if never else "")
        self.bank_button.setVisible(
            element is not None and bank_for_speed(self._workspace, element) is not None and bool(figures)
        )

    def _entries(self, spec: FieldSpec) -> Mapping[Any, str] | None:
        """Entries of a reference: id to words; places to start for the start of a run."""
        design = self._workspace.design
        what = spec.choices[0] if spec.kind == "reference" else spec.name
        if what == "ball":
            return {ball.id: ball.name or ball.id for ball in ball_table(design.balls).values()}
        if what == "pair":
            pairs = {pair.id: pair.name or pair.id for pair in pair_table(design.pairs).values()}
            return {None: "As the run", **pairs} if spec.optional else pairs
        if what == "run":
            return {run.id: run.name or run.id for run in design.runs}
        if what == "element":
            run_id = self._workspace.run_id
            others = [element for run in design.runs if run.id != run_id for element in run.elements]
            return {element.id: element_words(element) for element in others}
        if what == "start" and len(design.runs) < 2:
            return {"free": "At a place of its own"}
        return None

    # -- changing ---------------------------------------------------------------------------------
    @Slot(tuple, object, bool)
    def _commit(self, path: Path, value: Any, merge: bool) -> None:
        """Make one step of an edited field; a refused one is answered in its row."""
        design = self._workspace.design
        try:
            present = get_field(design, path)
            changed = set_field(design, path, part_of_kind(self._workspace, present, value))
        except EditError as error:
            for form in self.forms:
                form.refuse(path, plain_sentence(str(error), path))
            return
        name = str(path[-1]).replace("_", " ")
        element = self._workspace.selected_element
        owner = f" of {element_words(element)}" if element is not None else ""
        self._workspace.edit(f"{name}{owner}", changed, path_text(path) if merge else "")

    @Slot()
    def _bank(self) -> None:
        """Bank the selected bend for the speed that arrives."""
        element = self._workspace.selected_element
        changed = bank_for_speed(self._workspace, element) if element is not None else None
        if element is not None and changed is not None:
            self._workspace.edit(f"bank of {element_words(element)}", changed)

    def focus_first(self) -> None:
        """Put the keyboard into the first row."""
        if self.rows:
            self.rows[0].editor.setFocus(Qt.FocusReason.ShortcutFocusReason)


class Facts(QWidget):
    """Rows of words and figures under a hair line."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._grid = QGridLayout(self)
        self._grid.setContentsMargins(0, 0, 0, 0)
        self._grid.setVerticalSpacing(6)
        rule = QFrame()
        rule.setProperty("role", "rule")
        self._grid.addWidget(rule, 0, 0, 1, 2)
        self._rows: list[tuple[QLabel, QLabel]] = []
        self._sentence = QLabel()
        self._sentence.setProperty("role", "soft")
        self._sentence.setWordWrap(True)
        self._grid.addWidget(self._sentence, 1, 0, 1, 2)

    def show_rows(self, figures: list[Any], sentence: str) -> None:
        """Show figures, or a sentence when there are none."""
        while len(self._rows) < len(figures):
            label, value = QLabel(), QLabel()
            label.setProperty("role", "soft")
            place = len(self._rows) + 2
            self._grid.addWidget(label, place, 0)
            self._grid.addWidget(value, place, 1, Qt.AlignmentFlag.AlignRight)
            self._rows.append((label, value))
        for place, (label, value) in enumerate(self._rows):
            shown = place < len(figures)
            label.setVisible(shown)
            value.setVisible(shown)
            if shown:
                label.setText(figures[place].label)
                value.setText(figures[place].value)
        self._sentence.setText(sentence)
        self._sentence.setVisible(bool(sentence))
        self.setVisible(bool(figures) or bool(sentence))


def element_fields(element: ElementBase) -> list[str]:
    """Fields of an element in the order of the panel: numbers of its kind first."""
    names = [spec.name for spec in fields_of(element) if spec.name not in ("id", *PLAIN_FIELDS)]
    own = [name for name in names if name not in LAST_FIELDS]
    return own + [name for name in LAST_FIELDS if name in names]


def plain_sentence(sentence: str, path: Path) -> str:
    """Sentence of a refused edit without the path of the field in the file."""
    whole, owner = path_text(path), path_text(path[:-1])
    short = sentence.replace(whole, str(path[-1]).replace("_", " "))
    if owner:
        short = short.replace(f"{owner}.", "").replace(owner, "")
    return short.strip()[:1].upper() + short.strip()[1:]


def _shape(model: Frozen) -> tuple[Any, ...]:
    """What decides which rows a piece has: class of it and of its parts, which optional fields are given."""
    parts: list[Any] = [type(model).__name__]
    for spec in fields_of(model):
        value = getattr(model, spec.name)
        if isinstance(value, Frozen):
            parts.append(_shape(value))
        elif value is None:
            parts.append(spec.name)
    return tuple(parts)
