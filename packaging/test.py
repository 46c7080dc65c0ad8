"""Sets Trundle up and passes all tests: `python3 packaging/test.py [pytest arguments]`.

Those of the window run under a virtual screen that this script starts itself; the others need none.
"""

import os
import shutil
import subprocess
import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent))

from setup_steps import (  # noqa: E402
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


class VirtualScreen:
    """Xvfb on a free display, for as long as the block lasts; without Xvfb the offscreen platform serves."""

    def __enter__(self) -> dict[str, str]:
        """Start the screen; return the environment to run in."""
        self.process = None
        if sys.platform in ("win32", "darwin") or shutil.which("Xvfb") is None:
            say("no virtual screen here: the window is tested without OpenGL")
            return {**os.environ, "QT_QPA_PLATFORM": "offscreen"}
        read, write = os.pipe()
        command = ["Xvfb", "-displayfd", str(write), "-screen", "0", SCREEN, "-nolisten", "tcp"]
        self.process = subprocess.Popen(command, pass_fds=(write,), stderr=subprocess.DEVNULL)
        os.close(write)
        with os.fdopen(read) as pipe:
            number = pipe.readline().strip()
        say(f"virtual screen :{number}")
        return {**os.environ, "DISPLAY": f":{number}", "QT_QPA_PLATFORM": "xcb"}

    def __exit__(self, *_: object) -> None:
        """End the screen."""
        if self.process is not None:
            self.process.terminate()
            self.process.wait(timeout=10)


def pytest(environment: dict[str, str], *words: str) -> int:
    """Run pytest in an environment; return its exit code."""
    return subprocess.run(
        [str(venv_python()), "-m", "pytest", *words], cwd=ROOT, env=environment, check=False
    ).returncode


def main() -> int:
    """Set up, test; return the exit code."""
    try:
        set_up("tests", (*QT_LIBRARIES, *SCREEN_LIBRARIES, *TEST_PROGRAMS))
    except SetupError as error:
        print(f"Trundle: {error}", file=sys.stderr)
        return 1
    more = sys.argv[1:]
    say("tests that need no screen")
    plain = {**os.environ, "QT_QPA_PLATFORM": "offscreen"}
    codes = [pytest(plain, "tests", "--ignore=tests/gui", "-q", "-n", "2", *more)]
    say("tests of the window")
    with VirtualScreen() as environment:
        codes.append(pytest(environment, "tests/gui", "-q", *more))
    failed = [code for code in codes if code != 0]
    say("all tests passed" if not failed else f"tests failed (exit codes {codes})")
    return failed[0] if failed else 0


if __name__ == "__main__":
    sys.exit(main())
