"""Export of parts from the window: ask for a folder, show progress, say what was written or why nothing was."""

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from PySide6.QtCore import QObject, Slot
from PySide6.QtWidgets import QMessageBox, QProgressDialog, QWidget

from studio import dialogs
from studio.workers.parts import PartsExport
from studio.workspace import Workspace


class ExportSteps(QObject):
    """Runs one export at a time."""

    def __init__(self, window: QWidget, workspace: Workspace) -> None:
        super().__init__(window)
        self._window, self._workspace = window, workspace
        self._work: PartsExport | None = None
        self._progress: QProgressDialog | None = None
        self.written: list[Any] = []

    @Slot()
    def ask(self) -> None:
        """Ask for a folder and export to it."""
        path = self._workspace.path
        folder = dialogs.ask_folder(self._window, path.parent if path is not None else Path.home())
        if folder is not None:
            self.start(folder)

    def start(self, folder: Path) -> None:
        """Export the present design to a folder."""
        if self._work is not None:
            return
        work = PartsExport(self._workspace.design, folder, self)
        self._progress = dialogs.progress_dialog(self._window, f"Making parts in {folder.name} …")
        self._progress.canceled.connect(work.stop)
        work.advanced.connect(self._advance)
        work.done.connect(self._done)
        work.refused.connect(self._refused)
        work.finished.connect(self._ended)
        self._work = work
        work.start()

    @Slot(int, int)
    def _advance(self, done: int, total: int) -> None:
        if self._progress is not None:
            self._progress.setMaximum(total)
            self._progress.setValue(done)

    @Slot(object)
    def _done(self, parts: Sequence[Any]) -> None:
        """Say what was written."""
        self.written = list(parts)
        self._close_progress()
        count = len(parts)
        folder = parts[0].path.parent if parts else ""
        text = (
            f"{count} part{'s' if count != 1 else ''} written to {folder}." if parts else "There are no parts to make."
        )
        box = QMessageBox(QMessageBox.Icon.NoIcon, "Parts", text, QMessageBox.StandardButton.Ok, self._window)
        box.setInformativeText("STL files in mm. Check a first print against the drawing before making the rest.")
        box.open()

    @Slot(str)
    def _refused(self, sentence: str) -> None:
        """Say why nothing was written."""
        self._close_progress()
        dialogs.problems_dialog(self._window, "No part was written.", [sentence]).open()

    @Slot()
    def _ended(self) -> None:
        self._close_progress()
        if self._work is not None:
            self._work.deleteLater()
            self._work = None

    def _close_progress(self) -> None:
        if self._progress is not None:
            self._progress.close()
            self._progress.deleteLater()
            self._progress = None

    def finish(self) -> None:
        """Stop and wait; call before quitting."""
        if self._work is not None:
            self._work.stop()
            self._work.wait()
