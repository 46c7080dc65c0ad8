"""Files from the window: new, open, save, recent ones, and the question about unsaved changes."""

from pathlib import Path

from PySide6.QtCore import QObject, Slot
from PySide6.QtWidgets import QMenu, QWidget

from engine.errors import DesignFileError, TrundleError
from engine.model.design import Design
from studio import dialogs
from studio.dialogs import Answer
from studio.resources import DEMONSTRATION
from studio.settings import Settings
from studio.steps import starting_design
from studio.workspace import Workspace


class FileSteps(QObject):
    """What the commands of the file menu do; nothing is lost without a question."""

    def __init__(self, window: QWidget, workspace: Workspace, settings: Settings) -> None:
        super().__init__(window)
        self._window, self._workspace, self._settings = window, workspace, settings
        self.recent_menu = QMenu(window)
        self.recent_menu.aboutToShow.connect(self._fill_recent)

    def new(self) -> None:
        """Start a new design."""
        if self.may_leave():
            self._workspace.new(starting_design())

    def open(self) -> None:
        """Ask for a file and open it."""
        if self.may_leave():
            path = dialogs.ask_open(self._window, self._settings.folder)
            if path is not None:
                self.load(path)

    def demonstration(self) -> None:
        """Open the demonstration."""
        if self.may_leave():
            self.load(DEMONSTRATION, remember=False)

    def load(self, path: Path, remember: bool = True) -> bool:
        """Open a file; a damaged one is answered with every problem in it, and nothing changes."""
        try:
            self._workspace.open(path)
        except DesignFileError as error:
            dialogs.tell_problems(self._window, f"{path.name} cannot be opened.", error.problems)
            return False
        if remember:
            self._settings.remember(path)
        return True

    def save(self) -> bool:
        """Save to the file of the design; ask where when it has none. The demonstration is never overwritten."""
        path = self._workspace.path
        if path is None or path.resolve() == DEMONSTRATION:
            return self.save_as()
        return self.save_to(path)

    def save_as(self) -> bool:
        """Ask where and save there."""
        path = dialogs.ask_save(self._window, self._settings.folder / f"{self._workspace.title}.json")
        return path is not None and self.save_to(path)

    def save_to(self, path: Path) -> bool:
        """Save, or say why not."""
        try:
            self._workspace.save(path)
        except TrundleError as error:
            dialogs.tell_problems(self._window, "The design is not saved.", [str(error)])
            return False
        self._settings.remember(path)
        return True

    def may_leave(self) -> bool:
        """Whether the present design may be closed: asks when it has unsaved changes."""
        if not self._workspace.dirty:
            return True
        answer = dialogs.ask_unsaved(self._window, self._workspace.title)
        if answer is Answer.SAVE:
            return self.save()
        return answer is Answer.DISCARD

    def recover(self, design: Design, path: Path | None) -> None:
        """Go on with a working copy that was left behind."""
        self._workspace.recover(design, path)

    def load_if_free(self, path: Path) -> None:
        """Open a file after the question about unsaved changes."""
        if self.may_leave():
            self.load(path)

    @Slot()
    def _fill_recent(self) -> None:
        """Entries of the menu of recent files."""
        self.recent_menu.clear()
        for path in self._settings.recent:
            action = self.recent_menu.addAction(path.name)
            action.setToolTip(str(path))
            action.triggered.connect(lambda _checked=False, path=path: self.load_if_free(path))
        if self.recent_menu.isEmpty():
            self.recent_menu.addAction("None yet").setEnabled(False)
