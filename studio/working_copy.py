"""A working copy of the open design, written after each step and offered back when the last session ended badly."""

import json
import os
import time
from pathlib import Path
from typing import NamedTuple

from PySide6.QtCore import QLockFile, QObject, QTimer, Slot

from engine.errors import DesignFileError, SaveError
from engine.model.design import Design
from engine.model.storage import load, save, write_whole
from studio.resources import state_folder
from studio.workspace import Workspace

PAUSE_MS = 400
"""ms after the last step before the copy is written: a drag writes once."""


class LeftCopy(NamedTuple):
    """A copy that a session left behind: its files, the design, and the file it was of."""

    copy: Path
    note: Path
    design: Design
    path: Path | None


def copies_folder() -> Path:
    """Folder of the working copies."""
    return state_folder() / "working"


def lock_of(copy: Path) -> QLockFile:
    """Lock that the session of a copy holds while it runs; the system tells when its process is gone."""
    lock = QLockFile(str(copy.with_suffix(".lock")))
    lock.setStaleLockTime(0)
    return lock


def left_copies() -> list[LeftCopy]:
    """Copies whose session is no longer running, the latest first; unreadable ones are left out."""
    found: list[tuple[float, LeftCopy]] = []
    for note in copies_folder().glob("*.note"):
        copy = note.with_suffix(".json")
        try:
            raw = json.loads(note.read_text(encoding="utf-8"))
            path = raw["path"]
            lock = lock_of(copy)
            if not lock.tryLock(0):
                continue
            lock.unlock()
            left = LeftCopy(copy, note, load(copy), Path(path) if path else None)
            found.append((copy.stat().st_mtime, left))
        except (OSError, ValueError, KeyError, TypeError, DesignFileError):
            continue
    return [left for _, left in sorted(found, key=lambda entry: -entry[0])]


def discard(left: LeftCopy) -> None:
    """Remove a copy that is no longer wanted."""
    left.copy.unlink(missing_ok=True)
    left.note.unlink(missing_ok=True)


class WorkingCopy(QObject):
    """Writes the working copy of one workspace."""

    def __init__(self, workspace: Workspace, parent: QObject | None = None) -> None:
        super().__init__(parent if parent is not None else workspace)
        self._workspace = workspace
        self._copy = copies_folder() / f"{os.getpid()}-{time.time_ns()}.json"
        self._note = self._copy.with_suffix(".note")
        self._lock = lock_of(self._copy)
        self.failure = ""
        self._timer = QTimer(self)
        self._timer.setSingleShot(True)
        self._timer.setInterval(PAUSE_MS)
        self._timer.timeout.connect(self.write)
        workspace.fileChanged.connect(self._changed)

    @property
    def file(self) -> Path:
        """File of the copy; there only while the design has unsaved steps."""
        return self._copy

    @Slot()
    def _changed(self) -> None:
        """Write soon, or remove the copy once everything is in the file."""
        if self._workspace.dirty:
            self._timer.start()
        else:
            self.remove()

    @Slot()
    def write(self) -> None:
        """Write the copy now; a disk that refuses is noted, the work goes on."""
        path = self._workspace.path
        note = {"path": str(path.resolve()) if path is not None else ""}
        try:
            self._copy.parent.mkdir(parents=True, exist_ok=True)
            self._lock.tryLock(0)
            save(self._workspace.design, self._copy)
            write_whole(json.dumps(note).encode(), self._note)
            self.failure = ""
        except SaveError as error:
            self.failure = str(error)
        except OSError as error:
            self.failure = f"The working copy cannot be written: {error.strerror or error}."

    def remove(self) -> None:
        """Remove the copy: nothing would be lost."""
        self._timer.stop()
        for path in (self._copy, self._note):
            try:
                path.unlink(missing_ok=True)
            except OSError as error:
                self.failure = f"The working copy cannot be removed: {error.strerror or error}."
        self._lock.unlock()
