"""Rows of field editors for a piece of the document and its parts; a refused edit is answered in its row."""

from collections.abc import Callable, Mapping
from typing import Any, NamedTuple

from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import QGridLayout, QLabel, QWidget

from engine.model.base import FieldSpec, Frozen, fields_of
from engine.model.edits import Path
from studio.widgets.editors import editor_for
from studio.widgets.fields import FieldEditor
from studio.words import kind_words

LABEL_WIDTH = 112
HIDDEN = frozenset({"id", "schema_version", "place"})
"""Fields that nobody edits by hand."""

Entries = Callable[[FieldSpec], Mapping[Any, str] | None]
"""Gives the entries of a reference: id to words; None for a field that is no reference."""


class Row(NamedTuple):
    """One field on screen: where it stands and its editor."""

    path: Path
    editor: FieldEditor


class FieldForm(QWidget):
    """Editors of the fields of one or more pieces of the document."""

    edited = Signal(tuple, object, bool)
    """Path, new value, and whether it may merge with the step before."""

    def __init__(self, units: str, entries: Entries, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._units = units
        self._entries = entries
        self._grid = QGridLayout(self)
        self._grid.setContentsMargins(0, 0, 0, 0)
        self._grid.setHorizontalSpacing(8)
        self._grid.setVerticalSpacing(5)
        self._grid.setColumnMinimumWidth(0, LABEL_WIDTH)
        self._grid.setColumnStretch(1, 1)
        self.rows: list[Row] = []

    def heading(self, text: str) -> None:
        """Add a heading over the rows that follow."""
        label = QLabel(text)
        label.setProperty("role", "pane")
        label.setContentsMargins(0, 6, 0, 0)
        self._grid.addWidget(label, self._grid.rowCount(), 0, 1, 2)

    def add(self, model: Frozen, path: Path, names: list[str] | None = None) -> None:
        """Add the fields of a piece of the document, all or those named; what has parts follows with its parts."""
        specs = {spec.name: spec for spec in fields_of(model) if spec.name not in HIDDEN}
        for name in names if names is not None else list(specs):
            spec, value = specs[name], getattr(model, name)
            if spec.kind == "model" and isinstance(value, Frozen):
                self._add_part(spec, value, (*path, name))
            elif value is not None or spec.kind in ("number", "text", "reference"):
                self._add_row(spec, (*path, name), value, self._entries(spec))

    def _add_part(self, spec: FieldSpec, part: Frozen, path: Path) -> None:
        """Add the kind of a part, where there is a choice, and its fields."""
        if len(spec.choices) > 1:
            offered = self._entries(spec) or {choice: kind_words(choice) for choice in spec.choices}
            if len(offered) > 1:
                self._add_row(spec, path, getattr(part, "kind", ""), offered)
            else:
                self.heading(spec.label)
        else:
            self.heading(spec.label)
        self.add(part, path)

    def _add_row(self, spec: FieldSpec, path: Path, value: Any, entries: Mapping[Any, str] | None) -> None:
        editor = editor_for(spec, self._units, entries)
        if editor is None:
            return
        label = QLabel(spec.label)
        label.setProperty("role", "soft")
        label.setBuddy(editor)
        label.setContentsMargins(0, 4, 0, 0)
        row = self._grid.rowCount()
        if spec.kind in ("reference", "points"):  # long ones: over the whole width, below the label
            self._grid.addWidget(label, row, 0, 1, 2)
            self._grid.addWidget(editor, row + 1, 0, 1, 2)
        else:
            label.setWordWrap(True)
            label.setFixedWidth(LABEL_WIDTH)
            self._grid.addWidget(label, row, 0, Qt.AlignmentFlag.AlignTop)
            self._grid.addWidget(editor, row, 1, Qt.AlignmentFlag.AlignTop)
        editor.show_value(value)
        editor.committed.connect(lambda changed, merge, path=path: self.edited.emit(path, changed, merge))
        self.rows.append(Row(path, editor))

    def refuse(self, path: Path, sentence: str) -> None:
        """Answer in the row of a path."""
        for row in self.rows:
            if row.path == path:
                row.editor.refuse(sentence)
