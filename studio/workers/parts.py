"""Export of parts in a worker thread, with progress and a way to stop."""

from pathlib import Path
from threading import Event
from typing import Any

from PySide6.QtCore import QObject, QThread, Signal

from engine.errors import CancelledError, TrundleError
from engine.fabrication.export import export_parts
from engine.model.design import Design
from engine.placement import lay_out


class PartsExport(QThread):
    """Writes the parts of one design; ends with one of `done`, `refused` or `stopped`."""

    advanced = Signal(int, int)
    done = Signal(object)
    """List of exported parts."""
    refused = Signal(str)
    stopped = Signal()

    def __init__(self, design: Design, folder: Path, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._design, self._folder = design, folder
        self._stop = Event()

    def stop(self) -> None:
        """Ask to stop at the next part."""
        self._stop.set()

    def run(self) -> None:
        """Write the parts."""
        try:
            parts: list[Any] = export_parts(
                lay_out(self._design), self._folder, progress=self.advanced.emit, cancel=self._stop.is_set
            )
        except CancelledError:
            self.stopped.emit()
        except TrundleError as error:
            self.refused.emit(str(error))
        else:
            self.done.emit(parts)
