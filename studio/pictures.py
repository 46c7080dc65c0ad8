"""Pictures of a design and of the window on it: `python -m studio.pictures FILE --out DIR`.

Writes plan.png, elevation.png, window-light.png and window-dark.png; needs no screen.
"""

import argparse
import os
import sys
from collections.abc import Sequence
from pathlib import Path

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

from PySide6.QtWidgets import QApplication  # noqa: E402 (the platform is chosen before Qt starts)

from engine.errors import DesignFileError  # noqa: E402
from studio.app import make_application, make_window, wait_for_roll  # noqa: E402
from studio.main_window import MainWindow  # noqa: E402
from studio.settings import Settings  # noqa: E402

SIZE = (1440, 900)
CURSOR = 0.3
"""Share of the run at which the ball is shown."""


def main(argv: Sequence[str] | None = None) -> int:
    """Write the pictures; return the exit code."""
    parser = argparse.ArgumentParser(prog="python -m studio.pictures", description=__doc__)
    parser.add_argument("file", type=Path)
    parser.add_argument("--out", type=Path, default=Path("."))
    arguments = parser.parse_args(sys.argv[1:] if argv is None else list(argv))
    arguments.out.mkdir(parents=True, exist_ok=True)
    application = make_application()
    window = make_window(Settings(arguments.out / ".window.ini"))
    try:
        window.workspace.open(arguments.file)
    except DesignFileError as error:
        print("\n".join(error.problems), file=sys.stderr)
        return 2
    written = write_pictures(window, arguments.out)
    window.close()
    (arguments.out / ".window.ini").unlink(missing_ok=True)
    application.processEvents()
    return 0 if written else 1


def write_pictures(window: MainWindow, folder: Path) -> bool:
    """Write the pictures of an open design; return whether all could be written."""
    window.resize(*SIZE)
    window.usual_panes()
    window.use_theme("light")
    window.show()
    wait_for_roll(window)
    if window.workspace.roll is not None:
        window.workspace.set_time(CURSOR * window.workspace.roll.duration)
    window.fit()
    written = []
    for theme in ("light", "dark"):
        window.use_theme(theme)
        QApplication.processEvents()
        if theme == "light":
            written.append(window.drawings.plan.grab().save(str(folder / "plan.png")))
            written.append(window.drawings.elevation.grab().save(str(folder / "elevation.png")))
        written.append(window.grab().save(str(folder / f"window-{theme}.png")))
    return all(written)


if __name__ == "__main__":
    sys.exit(main())
