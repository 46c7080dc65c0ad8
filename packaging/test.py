"""Sets Trundle up and passes all tests: `python3 packaging/test.py [pytest options, such as -k contact]`.

Those of the window run under a virtual screen that this script starts itself; the others need none.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent))

from setup_steps import (  # noqa: E402  (found only with this folder on the path)
    QT_LIBRARIES,
    ROOT,
    SCREEN_LIBRARIES,
    TEST_PROGRAMS,
    SetupError,
    say,
    set_up,
    venv_python,
)

SCREEN = "1600x1000x24"
NOTHING_COLLECTED = 5
"""Exit code of pytest when no test fits the options."""
MOST_WORKERS = 8


class VirtualScreen:
    """Xvfb on a free display, for as long as the block lasts; without Xvfb the offscreen platform serves."""

    def __init__(self) -> None:
        self.process: subprocess.Popen[bytes] | None = None

    def __enter__(self) -> dict[str, str]:
        """Start the screen; return the environment to run in."""
        plain = {name: value for name, value in os.environ.items() if name not in ("DISPLAY", "WAYLAND_DISPLAY")}
        number = "" if sys.platform in ("win32", "darwin") or shutil.which("Xvfb") is None else self.start()
        if not number:
            say("no virtual screen here: the window is tested without OpenGL")
            return {**plain, "QT_QPA_PLATFORM": "offscreen"}
        say(f"virtual screen :{number}")
        return {**plain, "DISPLAY": f":{number}", "QT_QPA_PLATFORM": "xcb"}

    def start(self) -> str:
        """Start Xvfb; return the number of its display, empty when it does not come up."""
        read, write = os.pipe()
        command = ["Xvfb", "-displayfd", str(write), "-screen", "0", SCREEN, "-nolisten", "tcp"]
        self.process = subprocess.Popen(command, pass_fds=(write,), stderr=subprocess.DEVNULL)
        os.close(write)
        with os.fdopen(read) as pipe:
            return pipe.readline().strip()

    def __exit__(self, *_: object) -> None:
        """End the screen."""
        if self.process is not None:
            self.process.terminate()
            self.process.wait(timeout=10)


def pytest(environment: dict[str, str], *words: str) -> tuple[int, str]:
    """Run pytest, pass on what it prints as it comes; return its exit code and its closing line."""
    colour = ["--color=yes"] if sys.stdout.isatty() else []
    command = [str(venv_python()), "-m", "pytest", "-q", *colour, *words]
    tail = b""
    with subprocess.Popen(command, cwd=ROOT, env=environment, stdout=subprocess.PIPE, bufsize=0) as process:
        assert process.stdout is not None
        while piece := process.stdout.read(4096):
            sys.stdout.buffer.write(piece)
            sys.stdout.flush()
            tail = (tail + piece)[-4096:]
    lines = tail.decode(errors="replace").strip().splitlines()
    return process.returncode, lines[-1] if lines else "pytest printed nothing"


def main() -> int:
    """Set up, test; return 0 only when every test passed."""
    more, begun = sys.argv[1:], time.monotonic()
    try:
        set_up("tests", (*QT_LIBRARIES, *SCREEN_LIBRARIES, *TEST_PROGRAMS))
        say("tests that need no screen")
        workers = str(max(1, min(os.cpu_count() or 1, MOST_WORKERS)))
        plain = {**os.environ, "QT_QPA_PLATFORM": "offscreen"}
        results = {"without a screen": pytest(plain, "tests", "--ignore=tests/gui", "-n", workers, *more)}
        say("tests of the window")
        with VirtualScreen() as environment:
            results["window"] = pytest(environment, "tests/gui", *more)
    except SetupError as error:
        print(f"Trundle: {error}", file=sys.stderr)
        return 1
    except KeyboardInterrupt:
        print("Stopped.", file=sys.stderr)
        return 130
    for name, (code, line) in results.items():
        say(f"{name}: {line} (exit code {code})")
    good = (0, NOTHING_COLLECTED) if more else (0,)
    failed = any(code not in good for code, _ in results.values())
    say(f"{'tests FAILED' if failed else 'all tests passed'} after {time.monotonic() - begun:.0f} s")
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
