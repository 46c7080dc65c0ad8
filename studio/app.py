"""Starts the window: `python -m studio.app [FILE]`.

With `--screenshot PNG` the window opens, rolls the ball, writes a picture of itself and ends.
"""

import argparse
import logging
import logging.handlers
import sys
import threading
import types
from collections.abc import Sequence
from pathlib import Path

from PySide6.QtCore import QCoreApplication, QEventLoop, Qt, QTimer
from PySide6.QtWidgets import QApplication

from engine.errors import TrundleError
from engine.simulate import roll
from studio import dialogs
from studio.main_window import Drawings, MainWindow
from studio.resources import DEMONSTRATION, icon, load_fonts, state_folder, window_font
from studio.settings import Settings
from studio.steps import starting_design
from studio.theme import Theme
from studio.views.elevation import ElevationView
from studio.views.plan import PlanView
from studio.views.view3d import make_view3d
from studio.workers.preview import Preview
from studio.working_copy import discard, left_copies
from studio.workspace import Workspace

PROGRAM = "trundle"
READY = "trundle_ready"
"""Property of an application object that has been set up: style and fonts are loaded once."""
LOG_BYTES, LOG_FILES = 500_000, 3
SETTLE_MS = 400
"""ms after the roll before a picture is taken: the drawings have settled."""
ROLL_LIMIT_MS = 300_000
"""ms. A picture is taken even when the roll has not ended by then (first start compiles)."""

log = logging.getLogger("trundle")


def main(argv: Sequence[str] | None = None) -> int:
    """Open the window and run until it closes; return the exit code."""
    arguments = _parser().parse_args(sys.argv[1:] if argv is None else list(argv))
    start_log()
    application = make_application()
    settings = Settings()
    window = make_window(settings)
    if arguments.theme is not None:
        window.use_theme(arguments.theme)
    if arguments.size is not None:
        window.resize(*arguments.size)
        window.usual_panes()
    window.show()
    open_first(window, arguments.file, pictures=arguments.screenshot is not None)
    if arguments.select:
        window.workspace.select(arguments.select)
    if arguments.screenshot is not None:
        return take_picture(window, arguments.screenshot, arguments.time)
    return application.exec()


def make_application() -> QApplication:
    """Make the application object, with the fonts that ship with the program."""
    QCoreApplication.setAttribute(Qt.ApplicationAttribute.AA_ShareOpenGLContexts)
    application = QApplication.instance()
    if not isinstance(application, QApplication):
        application = QApplication(["trundle"])
    if application.property(READY):
        return application
    application.setProperty(READY, True)
    application.setApplicationName(PROGRAM)
    application.setApplicationDisplayName("Trundle")
    application.setStyle("Fusion")
    application.setFont(window_font(load_fonts()))
    application.setWindowIcon(icon("program", Theme().colour("accent"), 64))
    return application


def make_window(settings: Settings) -> MainWindow:
    """Make the window with its workspace and live roll."""
    workspace = Workspace(Theme())
    preview = Preview(workspace, roll)
    window = MainWindow(workspace, preview, settings, make_drawings)
    workspace.setParent(window)
    warm_up()
    return window


def make_drawings(workspace: Workspace, theme: Theme) -> Drawings:
    """Make the three drawings."""
    return Drawings(PlanView(workspace, theme), make_view3d(workspace, theme), ElevationView(workspace, theme))


def warm_up() -> threading.Thread:
    """Compile the kernels in a thread, so that the first roll does not wait for it."""
    thread = threading.Thread(target=_compile, name="warm-up", daemon=True)
    thread.start()
    return thread


def _compile() -> None:
    """Roll the smallest design once."""
    try:
        roll(starting_design())
    except TrundleError:
        log.exception("Warm-up")


def open_first(window: MainWindow, path: Path | None, pictures: bool = False) -> None:
    """Open the file that was given, else work left behind, else the demonstration."""
    if path is not None:
        if not window.files.load(path, remember=not pictures):
            window.workspace.new(starting_design())
        return
    for left in [] if pictures else left_copies():
        wanted = dialogs.ask_recover(window, left)
        if wanted:
            window.files.recover(left.design, left.path)
            window.copy.write()
        discard(left)
        if wanted:
            return
    if not (DEMONSTRATION.exists() and window.files.load(DEMONSTRATION, remember=False)):
        window.workspace.new(starting_design())


# -- pictures -------------------------------------------------------------------------------------
def wait_for_roll(window: MainWindow) -> None:
    """Wait until the ball has rolled and the drawings have settled."""
    loop = QEventLoop()
    if not (window.workspace.current or window.workspace.problem):
        window.workspace.rolled.connect(lambda _roll: loop.quit() if window.workspace.current else None)
        window.workspace.rollFailed.connect(loop.quit)
        QTimer.singleShot(ROLL_LIMIT_MS, loop.quit)
        loop.exec()
    pause = QEventLoop()
    QTimer.singleShot(SETTLE_MS, pause.quit)
    pause.exec()


def take_picture(window: MainWindow, path: Path, time: float | None) -> int:
    """Write a picture of the window and end."""
    wait_for_roll(window)
    roll_now = window.workspace.roll
    if roll_now is not None:
        window.workspace.set_time(time if time is not None else 0.3 * roll_now.duration)
    window.fit()
    QApplication.processEvents()
    written = window.grab().save(str(path))
    window.workspace.undo_stack.setClean()
    window.close()
    return 0 if written else 1


# -- log ------------------------------------------------------------------------------------------
def start_log() -> None:
    """Write warnings and crash reports to a file in the user's state folder."""
    handlers: list[logging.Handler] = [logging.StreamHandler()]
    folder = state_folder()
    try:
        folder.mkdir(parents=True, exist_ok=True)
        handlers.append(
            logging.handlers.RotatingFileHandler(
                folder / "trundle.log", maxBytes=LOG_BYTES, backupCount=LOG_FILES, encoding="utf-8"
            )
        )
    except OSError as error:
        print(f"No log file: {error.strerror or error}.", file=sys.stderr)
    logging.basicConfig(
        level=logging.WARNING, format="%(asctime)s %(levelname)s %(name)s: %(message)s", handlers=handlers
    )
    sys.excepthook = report_crash
    threading.excepthook = lambda crash: report_crash(
        crash.exc_type, crash.exc_value if crash.exc_value is not None else crash.exc_type(), crash.exc_traceback
    )


def report_crash(kind: type[BaseException], error: BaseException, trace: types.TracebackType | None) -> None:
    """Write what went wrong to the log; the window stays open, the working copy is on disk."""
    if issubclass(kind, KeyboardInterrupt):
        sys.__excepthook__(kind, error, trace)
        return
    log.critical("Fault of the program", exc_info=(kind, error, trace))


def _size(text: str) -> tuple[int, int]:
    """Size such as 1440x900."""
    width, _, height = text.partition("x")
    return int(width), int(height)


def _parser() -> argparse.ArgumentParser:
    """Parser of the arguments."""
    parser = argparse.ArgumentParser(prog="trundle", description="Design rolling-ball installations in a window.")
    parser.add_argument("file", nargs="?", type=Path, help="design to open; the demonstration when left out")
    parser.add_argument("--theme", choices=("light", "dark"), help="theme of this session")
    parser.add_argument("--size", type=_size, metavar="WxH", help="size of the window, px")
    parser.add_argument("--screenshot", type=Path, metavar="PNG", help="write a picture of the window and end")
    parser.add_argument("--select", nargs="+", metavar="ID", help="elements to select")
    parser.add_argument("--time", type=float, metavar="S", help="time cursor of the picture, s")
    return parser


if __name__ == "__main__":
    sys.exit(main())
