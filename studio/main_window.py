"""The window: header, strip, drawings, playback, inspector, findings, and what its commands do."""

from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any, NamedTuple

from PySide6.QtCore import Qt, QTimer, Slot
from PySide6.QtGui import QAction, QCloseEvent, QDragEnterEvent, QDropEvent, QGuiApplication, QKeyEvent, QResizeEvent
from PySide6.QtWidgets import QApplication, QHBoxLayout, QMainWindow, QSplitter, QVBoxLayout, QWidget
from shiboken6 import isValid

from engine.errors import TrundleError
from engine.model.design import Site
from engine.model.edits import set_field
from studio import dialogs
from studio.actions import MENUS, SEPARATOR, build_menus, draw_icons, needs_of
from studio.export_parts import ExportSteps
from studio.files import FileSteps
from studio.settings import Settings, ThemeChoice
from studio.steps import (
    add_element,
    duplicate_elements,
    move_elements,
    neighbour_after_removal,
    remove_elements,
)
from studio.theme import Theme
from studio.views.findings import FindingsPanel
from studio.views.header import Header
from studio.views.inspector import Inspector
from studio.views.strip import SEGMENT_KINDS, VESSEL_KINDS, Strip
from studio.views.timeline import Playback
from studio.words import element_words, kind_words
from studio.workers.preview import Preview
from studio.working_copy import WorkingCopy
from studio.workspace import Workspace

NARROW_BELOW = 1360
"""px. A narrower window shows the strip as icons."""
SIDE_WIDTH = 300
PLAY_STEP = 0.02
"""s. One press of the step keys."""


class Drawings(NamedTuple):
    """The three drawings in the middle."""

    plan: QWidget
    view3d: QWidget
    elevation: QWidget


class MainWindow(QMainWindow):
    """One open design."""

    def __init__(
        self,
        workspace: Workspace,
        preview: Preview,
        settings: Settings,
        make_drawings: Callable[[Workspace, Theme], Drawings],
    ) -> None:
        super().__init__()
        self.workspace, self.preview, self.settings = workspace, preview, settings
        self.theme = workspace.theme
        self.setAcceptDrops(True)
        self.header = Header(workspace, self.theme)
        self.strip = Strip(self.theme)
        self.drawings = make_drawings(workspace, self.theme)
        self.playback = Playback(workspace, self.theme)
        self.inspector = Inspector(workspace, self.theme)
        self.findings = FindingsPanel(workspace, self.theme)
        self.copy = WorkingCopy(workspace, self)
        self.export = ExportSteps(self, workspace)
        self._lay_out()
        self.files = FileSteps(self, workspace, settings)
        self.actions_by_name: dict[str, QAction] = build_menus(self, self.theme, self._slots(), self.files.recent_menu)
        self._connect()
        self.use_theme(settings.theme)
        self._restore_shape()
        self.drawings.plan.setFocus()

    # -- layout -----------------------------------------------------------------------------------
    def _lay_out(self) -> None:
        """Nest the panes in splitters."""
        self.upper = self._splitter(Qt.Orientation.Horizontal, self.drawings.plan, self.drawings.view3d)
        self.middle = self._splitter(Qt.Orientation.Vertical, self.upper, self.drawings.elevation, self.playback)
        self.side = self._splitter(Qt.Orientation.Vertical, self.inspector, self.findings)
        self.board = self._splitter(Qt.Orientation.Horizontal, self.middle, self.side)
        self.board.setStretchFactor(0, 1)
        self.board.setStretchFactor(1, 0)
        self.middle.setStretchFactor(0, 1)
        self.playback.setMaximumHeight(88)
        self.inspector.setMinimumWidth(240)
        body = QWidget()
        body.setObjectName("board")
        body.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        inner = QVBoxLayout(body)
        inner.setContentsMargins(8, 8, 8, 8)
        inner.addWidget(self.board)
        row = QHBoxLayout()
        row.setSpacing(0)
        row.addWidget(self.strip)
        row.addWidget(body, 1)
        whole = QWidget()
        column = QVBoxLayout(whole)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.header)
        column.addLayout(row, 1)
        self.setCentralWidget(whole)

    @staticmethod
    def _splitter(way: Qt.Orientation, *panes: QWidget) -> QSplitter:
        made = QSplitter(way)
        made.setHandleWidth(8)
        made.setChildrenCollapsible(False)
        for pane in panes:
            made.addWidget(pane)
        return made

    @property
    def panes(self) -> dict[str, QWidget]:
        """Panes that can be hidden, by the name of their command."""
        return {
            "plan": self.drawings.plan,
            "view3d": self.drawings.view3d,
            "elevation": self.drawings.elevation,
            "playback": self.playback,
            "inspector": self.inspector,
            "findings": self.findings,
        }

    @property
    def splitters(self) -> dict[str, QSplitter]:
        """Rows of panes, by name."""
        return {"upper": self.upper, "middle": self.middle, "side": self.side, "board": self.board}

    def usual_panes(self) -> None:
        """Show all panes at their usual sizes."""
        for pane in (*self.panes.values(), self.upper, self.side):
            pane.show()
        width, height = max(self.width() - 140, 700), max(self.height() - 80, 480)
        self.board.setSizes([width - SIDE_WIDTH, SIDE_WIDTH])
        self.upper.setSizes([int(0.56 * width), int(0.44 * width)])
        self.middle.setSizes([int(0.56 * height), int(0.34 * height), 76])
        self.side.setSizes([int(0.6 * height), int(0.4 * height)])
        self._update_actions()

    def _restore_shape(self) -> None:
        """Sizes as they were left, else the usual ones."""
        shape = self.settings.shape("window")
        if shape is None or not self.restoreGeometry(shape):
            screen = QGuiApplication.primaryScreen().availableGeometry()
            self.resize(min(1440, screen.width()), min(900, screen.height()))
        self.usual_panes()
        for name, splitter in self.splitters.items():
            kept = self.settings.shape(name)
            if kept is not None:
                splitter.restoreState(kept)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Shrink the strip in a narrow window."""
        super().resizeEvent(event)
        self.strip.set_narrow(event.size().width() < NARROW_BELOW)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Play or pause with Space where nothing with the keyboard wants it."""
        if event.key() == Qt.Key.Key_Space:
            self.playback.toggle()
        else:
            super().keyPressEvent(event)

    # -- wiring -----------------------------------------------------------------------------------
    def _connect(self) -> None:
        """Keep window, menus and theme up to date."""
        workspace = self.workspace
        self.strip.wanted.connect(self.add)
        self.theme.changed.connect(self._apply_theme)
        QGuiApplication.styleHints().colorSchemeChanged.connect(lambda _scheme: self.use_theme(self.settings.theme))
        stack = workspace.undo_stack
        for signal in (stack.indexChanged, workspace.fileChanged, workspace.selectionChanged, workspace.rolled):
            signal.connect(self._update_actions)
        workspace.designChanged.connect(self._update_actions)
        workspace.opened.connect(lambda: QTimer.singleShot(0, self.fit))
        self._update_actions()

    def _slots(self) -> dict[str, Callable[[], object]]:
        """What each command does."""
        play = self.playback
        slots: dict[str, Callable[[], object]] = {
            "undo": self.workspace.undo_stack.undo,
            "redo": self.workspace.undo_stack.redo,
            "earlier": partial(self.move, -1),
            "later": partial(self.move, 1),
            "select_before": partial(self.select_next, -1),
            "select_after": partial(self.select_next, 1),
            "select_none": partial(self.workspace.select, ()),
            "numbers": self.inspector.focus_first,
            "play": play.toggle,
            "to_start": play.to_start,
            "step_back": partial(play.step, -PLAY_STEP),
            "step_on": partial(play.step, PLAY_STEP),
            "slower": partial(play.change_speed, -1),
            "faster": partial(play.change_speed, 1),
            "next_finding": self.findings.go_next,
            "take_cure": self.findings.take_chosen_cure,
            "export_parts": self.export.ask,
            "quit": self.close,
            "keys": lambda: dialogs.keys_page(self).exec(),
            "cautions": lambda: dialogs.cautions_page(self).exec(),
            "about": lambda: dialogs.about_page(self).exec(),
        }
        slots |= {f"add_{kind}": partial(self.add, kind) for kind in SEGMENT_KINDS + VESSEL_KINDS}
        slots |= {f"theme_{name}": partial(self.choose_theme, name) for name in ("system", "light", "dark")}
        slots |= {f"pane_{name}": partial(self.toggle_pane, name) for name in self.panes}
        slots |= {name: getattr(self.files, name) for name in ("new", "open", "demonstration", "save", "save_as")}
        names = [spec.name for specs in MENUS.values() for spec in specs if spec.name not in (SEPARATOR, "recent")]
        return {name: slots[name] if name in slots else getattr(self, name) for name in names}

    @Slot()
    def _update_actions(self, *_: Any) -> None:
        """Words and usability of the commands, title of the window."""
        workspace, stack = self.workspace, self.workspace.undo_stack
        if not isValid(stack):  # it tells once more while it is deleted
            return
        usable = {
            "always": True,
            "selected": bool(workspace.selection),
            "savable": workspace.run is not None,
            "rolled": workspace.roll is not None,
            "undo": stack.canUndo(),
            "redo": stack.canRedo(),
            "siteless": workspace.design.site is None,
        }
        for name, action in self.actions_by_name.items():
            action.setEnabled(usable[needs_of(name)])
        self.actions_by_name["undo"].setText(f"&Undo {stack.undoText()}".rstrip())
        self.actions_by_name["redo"].setText(f"&Redo {stack.redoText()}".rstrip())
        for name, pane in self.panes.items():
            self.actions_by_name[f"pane_{name}"].setChecked(not pane.isHidden())
        for name in ("system", "light", "dark"):
            self.actions_by_name[f"theme_{name}"].setChecked(self.settings.theme == name)
        self.setWindowTitle(f"{workspace.title}{' (edited)' if workspace.dirty else ''} · Trundle")

    # -- theme and panes --------------------------------------------------------------------------
    def choose_theme(self, choice: ThemeChoice) -> None:
        """Choose a theme and remember it."""
        self.settings.theme = choice
        self.use_theme(choice)
        self._update_actions()

    def use_theme(self, choice: ThemeChoice) -> None:
        """Use a theme; that of the system follows the desktop."""
        dark_desktop = QGuiApplication.styleHints().colorScheme() == Qt.ColorScheme.Dark
        name = ("dark" if dark_desktop else "light") if choice == "system" else choice
        if name == self.theme.name:
            self._apply_theme()
        self.theme.use(name)

    @Slot()
    def _apply_theme(self) -> None:
        """Palette, style sheet and icons of the theme in use."""
        application = QApplication.instance()
        if isinstance(application, QApplication):
            application.setPalette(self.theme.palette())
            application.setStyleSheet(self.theme.style_sheet())
        draw_icons(self.actions_by_name, self.theme)

    def toggle_pane(self, name: str) -> None:
        """Show or hide a pane."""
        pane = self.panes[name]
        pane.setVisible(pane.isHidden())
        self.upper.setVisible(not (self.drawings.plan.isHidden() and self.drawings.view3d.isHidden()))
        self.side.setVisible(not (self.inspector.isHidden() and self.findings.isHidden()))
        self._update_actions()

    @Slot()
    def fit(self) -> None:
        """Fit every drawing to its pane."""
        for drawing in self.drawings:
            fit = getattr(drawing, "fit", None)
            if callable(fit):
                fit()

    # -- editing ----------------------------------------------------------------------------------
    @Slot(str)
    def add(self, kind: str) -> None:
        """Add an element after the selected one, or at the open end, and select it."""
        changed, key = add_element(self.workspace, kind)
        self.workspace.edit(f"add {kind_words(kind).lower()}", changed)
        self.workspace.select((key,))

    def duplicate(self) -> None:
        """Copy the selected elements behind themselves."""
        changed, ids = duplicate_elements(self.workspace)
        self.workspace.edit(f"duplicate {self._selection_words()}", changed)
        self.workspace.select(ids)

    def delete(self) -> None:
        """Delete the selected elements."""
        words, neighbour = self._selection_words(), neighbour_after_removal(self.workspace)
        try:
            changed = remove_elements(self.workspace)
        except TrundleError as error:
            dialogs.tell_problems(self, "This cannot be deleted.", [str(error)])
            return
        self.workspace.edit(f"delete {words}", changed)
        self.workspace.select((neighbour,) if neighbour is not None else ())

    def move(self, by: int) -> None:
        """Move the selected elements earlier or later in the run."""
        words = f"move {self._selection_words()} {'earlier' if by < 0 else 'later'}"
        self.workspace.edit(words, move_elements(self.workspace, by))

    def _selection_words(self) -> str:
        """Selection in the name of a step."""
        element = self.workspace.selected_element
        if element is not None:
            return element_words(element)
        return f"{len(self.workspace.selection)} elements"

    def select_next(self, by: int) -> None:
        """Select the element before or after the selected one."""
        run = self.workspace.run
        if run is None or not run.elements:
            return
        ids = [element.id for element in run.elements]
        chosen = self.workspace.selection
        place = ids.index(chosen[-1]) + by if chosen and chosen[-1] in ids else (0 if by > 0 else len(ids) - 1)
        self.workspace.select((ids[min(max(place, 0), len(ids) - 1)],))

    def select_all(self) -> None:
        """Select every element of the run."""
        run = self.workspace.run
        self.workspace.select(element.id for element in run.elements) if run is not None else None

    def add_site(self) -> None:
        """Give the design a site around what is drawn."""
        self.workspace.edit("add site", set_field(self.workspace.design, "site", Site()))
        self.workspace.select(())

    # -- from outside ------------------------------------------------------------------------------
    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        """Take files."""
        if any(url.isLocalFile() for url in event.mimeData().urls()):
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        """Open the file that was dropped."""
        paths = [Path(url.toLocalFile()) for url in event.mimeData().urls() if url.isLocalFile()]
        if paths and self.files.may_leave():
            event.acceptProposedAction()
            self.files.load(paths[0])

    def closeEvent(self, event: QCloseEvent) -> None:
        """Ask about unsaved changes, keep the sizes, stop the workers."""
        if not self.files.may_leave():
            event.ignore()
            return
        self.playback.pause()
        self.export.finish()
        self.preview.finish()
        self.copy.remove()
        self.settings.keep_shape("window", self.saveGeometry())
        for name, splitter in self.splitters.items():
            self.settings.keep_shape(name, splitter.saveState())
        self.settings.write()
        event.accept()
