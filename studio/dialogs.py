"""Questions and pages that stand over the window; each can be answered by keyboard."""

import platform
from collections.abc import Sequence
from enum import Enum
from pathlib import Path

import numba
import PySide6
from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QDialog,
    QDialogButtonBox,
    QFileDialog,
    QGridLayout,
    QLabel,
    QListWidget,
    QMessageBox,
    QProgressDialog,
    QScrollArea,
    QVBoxLayout,
    QWidget,
)

from studio.actions import key_rows
from studio.working_copy import LeftCopy

FILTER = "Designs (*.json);;All files (*)"
WIDTH = 560
CAUTIONS = (
    "Small balls: a ball that passes a hole of 44.4 mm is a choking hazard for children under three (16 CFR "
    "1500.18(a)(17), small balls). Keep smaller ones behind a cover wherever young children come near.",
    "Openings: gaps between 8 mm and 25 mm can trap a finger (EN 1176-1, written for playgrounds). Cover moving lifts "
    "and gates, and leave no such gap within reach.",
    "A heavy ball at speed bruises and breaks glass. Look at the exit speed, catch every ball in a tray, and put a "
    "guard where one could leave the run. Stay clear of the run while trying new parts.",
    "Balls on a floor are a slip hazard: give the floor a rim, and count the balls back.",
    "Powered lifts: an electrician and a person responsible for machine safety should see them before the public does.",
    "Wall and ceiling fixings carry the run and whoever leans on it: have them checked by a competent person.",
    "The figures above are from memory of the standards named; check the text in force. These are reminders, "
    "not a safety assessment. Local codes and the advice of licensed people come first.",
)
"""Cautions shown in the help; both figures are from memory of the standards named."""


class Answer(Enum):
    """Answer to the question about unsaved changes."""

    SAVE = "save"
    DISCARD = "discard"
    CANCEL = "cancel"


def tell_problems(parent: QWidget, headline: str, problems: Sequence[str]) -> None:
    """Say in one message what is wrong, every problem on a line of its own."""
    problems_dialog(parent, headline, problems).exec()


def problems_dialog(parent: QWidget, headline: str, problems: Sequence[str]) -> QDialog:
    """Message that lists problems."""
    dialog = QDialog(parent)
    dialog.setWindowTitle("Cannot be used")
    dialog.setMinimumWidth(WIDTH)
    column = QVBoxLayout(dialog)
    column.setSpacing(10)
    title = QLabel(headline)
    title.setProperty("role", "title")
    title.setWordWrap(True)
    column.addWidget(title)
    rows = QListWidget()
    rows.setAccessibleName("Problems")
    rows.setWordWrap(True)
    rows.addItems(list(problems))
    column.addWidget(rows)
    _add_close(dialog, column)
    return dialog


def ask_unsaved(parent: QWidget, name: str) -> Answer:
    """Ask what to do with changes that are not in the file."""
    box = QMessageBox(parent)
    box.setWindowTitle("Unsaved changes")
    box.setText(f"{name} has changes that are not saved.")
    save = box.addButton("Save", QMessageBox.ButtonRole.AcceptRole)
    discard = box.addButton("Discard", QMessageBox.ButtonRole.DestructiveRole)
    box.addButton("Cancel", QMessageBox.ButtonRole.RejectRole)
    box.setDefaultButton(save)
    box.exec()
    return {save: Answer.SAVE, discard: Answer.DISCARD}.get(box.clickedButton(), Answer.CANCEL)


def ask_recover(parent: QWidget, left: LeftCopy) -> bool:
    """Ask whether to go on with a working copy that was left behind."""
    box = QMessageBox(parent)
    box.setWindowTitle("Unsaved work")
    name = left.design.name or (left.path.name if left.path is not None else "A design")
    box.setText(f"{name} was open with unsaved changes when the program ended.")
    box.setInformativeText("Go on with these changes? The file itself is as it was last saved.")
    go_on = box.addButton("Go on", QMessageBox.ButtonRole.AcceptRole)
    box.addButton("Discard", QMessageBox.ButtonRole.DestructiveRole)
    box.setDefaultButton(go_on)
    box.exec()
    return box.clickedButton() is go_on


def ask_open(parent: QWidget, folder: Path) -> Path | None:
    """Ask which file to open."""
    name, _ = QFileDialog.getOpenFileName(parent, "Open a design", str(folder), FILTER)
    return Path(name) if name else None


def ask_save(parent: QWidget, suggested: Path) -> Path | None:
    """Ask where to save; a name without an ending gets .json."""
    name, _ = QFileDialog.getSaveFileName(parent, "Save the design", str(suggested), FILTER)
    if not name:
        return None
    path = Path(name)
    return path if path.suffix else path.with_suffix(".json")


def ask_folder(parent: QWidget, folder: Path) -> Path | None:
    """Ask for a folder for the parts."""
    name = QFileDialog.getExistingDirectory(parent, "Folder for the parts", str(folder))
    return Path(name) if name else None


def progress_dialog(parent: QWidget, words: str) -> QProgressDialog:
    """Progress of long work, with a way to stop."""
    dialog = QProgressDialog(words, "Stop", 0, 0, parent)
    dialog.setWindowTitle("Trundle")
    dialog.setWindowModality(Qt.WindowModality.WindowModal)
    dialog.setMinimumDuration(200)
    dialog.setAutoClose(False)
    dialog.setAutoReset(False)
    return dialog


def keys_page(parent: QWidget) -> QDialog:
    """Page of all keys."""
    dialog, column = _page(parent, "Keys")
    grid = QGridLayout()
    grid.setHorizontalSpacing(24)
    grid.setVerticalSpacing(4)
    for row, (words, keys) in enumerate(key_rows()):
        label = QLabel(keys)
        label.setProperty("role", "soft")
        grid.addWidget(QLabel(words), row, 0)
        grid.addWidget(label, row, 1)
    column.addLayout(grid)
    return dialog


def cautions_page(parent: QWidget) -> QDialog:
    """Page of cautions."""
    dialog, column = _page(parent, "Cautions")
    for text in CAUTIONS:
        label = QLabel(text)
        label.setWordWrap(True)
        column.addWidget(label)
    return dialog


def about_page(parent: QWidget) -> QDialog:
    """Page about the program."""
    dialog, column = _page(parent, "About Trundle")
    versions = f"Python {platform.python_version()}, Qt {PySide6.__version__}, numba {numba.__version__}"
    for text in (
        "Trundle designs, rolls, proves and makes rolling-ball installations.",
        f"Running on {versions}.",
        "Type: Inter, under the SIL Open Font License (assets/fonts/OFL.txt). Icons drawn for this program.",
        "What it computes is a model. Time a prototype before you trust a margin.",
    ):
        label = QLabel(text)
        label.setWordWrap(True)
        column.addWidget(label)
    return dialog


def _page(parent: QWidget, title: str) -> tuple[QDialog, QVBoxLayout]:
    """Dialog with a scrolled page."""
    dialog = QDialog(parent)
    dialog.setWindowTitle(title)
    dialog.resize(WIDTH, 520)
    outer = QVBoxLayout(dialog)
    head = QLabel(title)
    head.setProperty("role", "title")
    outer.addWidget(head)
    inner = QWidget()
    column = QVBoxLayout(inner)
    column.setSpacing(10)
    column.setAlignment(Qt.AlignmentFlag.AlignTop)
    scroll = QScrollArea()
    scroll.setWidgetResizable(True)
    scroll.setWidget(inner)
    outer.addWidget(scroll, 1)
    _add_close(dialog, outer)
    return dialog, column


def _add_close(dialog: QDialog, column: QVBoxLayout) -> None:
    """Button that closes."""
    buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Close)
    buttons.rejected.connect(dialog.reject)
    column.addWidget(buttons)
