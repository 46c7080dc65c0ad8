"""Set-up shared by start.py and test.py: own .venv, pinned packages, system libraries, kernels.

Standard library only. Every step says what it does, is safe to run again, and is skipped when nothing changed: a stamp
in .venv holds the hash of what was installed, written only after everything succeeded.
"""

import hashlib
import os
import shutil
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
VENV = ROOT / ".venv"
OLDEST = (3, 11)
STAMP = "trundle-installed"
QT_LIBRARIES = ("libegl1", "libgl1", "libglib2.0-0", "libdbus-1-3", "libxkbcommon0", "libfontconfig1")
SCREEN_LIBRARIES = ("libxcb-cursor0", "libxcb-icccm4", "libxcb-keysyms1", "libxcb-shape0", "libxkbcommon-x11-0")
TEST_PROGRAMS = ("xvfb", "xauth")


class SetupError(Exception):
    """Set-up cannot go on; the message says what is missing and what to type."""


def say(text: str) -> None:
    """Print one step."""
    print(f"* {text}", flush=True)


def check_python() -> None:
    """Refuse a Python that is too old."""
    if sys.version_info < OLDEST:
        given = ".".join(map(str, sys.version_info[:3]))
        raise SetupError(
            f"Python {given} runs this; Trundle needs {OLDEST[0]}.{OLDEST[1]} or newer. Install it and run again."
        )


def venv_python() -> Path:
    """Return the interpreter of the project's own environment."""
    return VENV / ("Scripts/python.exe" if os.name == "nt" else "bin/python")


def run(command: list[str], what: str, **more: object) -> None:
    """Run a command; a failure becomes one sentence."""
    try:
        done = subprocess.run(command, cwd=ROOT, check=False, **more)  # type: ignore[call-overload]
    except OSError as error:
        raise SetupError(f"{what} could not start: {error}.") from error
    if done.returncode != 0:
        raise SetupError(f"{what} failed with exit code {done.returncode}; the lines above say why.")


def make_venv() -> None:
    """Make .venv where it is missing or broken."""
    if venv_python().exists() and subprocess.run([str(venv_python()), "-c", "import pip"], check=False).returncode == 0:
        return
    say(f"making an environment of its own in {VENV}")
    try:
        import venv

        venv.EnvBuilder(with_pip=True, clear=VENV.exists()).create(VENV)
    except (ImportError, subprocess.CalledProcessError) as error:
        line = f"apt-get install python{sys.version_info[0]}.{sys.version_info[1]}-venv"
        raise SetupError(f"Python's venv module is incomplete ({error}). On Debian or Ubuntu type: {line}") from error
    except OSError as error:
        raise SetupError(
            f"{VENV} cannot be written: {error}. Free some space or move the folder, then run again."
        ) from error


def wanted_hash(extras: str) -> str:
    """Return the hash of what an installation depends on."""
    digest = hashlib.sha256(extras.encode())
    for name in ("pyproject.toml", "packaging/constraints.txt"):
        digest.update((ROOT / name).read_bytes())
    digest.update(str(ROOT).encode())
    return digest.hexdigest()


def install(extras: str) -> None:
    """Install Trundle with its pinned packages; nothing happens when the stamp says it is done."""
    stamp, wanted = VENV / STAMP, wanted_hash(extras)
    done = stamp.read_text().split() if stamp.exists() else []
    if wanted in done:
        say("packages are installed already")
        return
    say("installing packages (about 800 MB; a minute or two on a fast line)")
    pip = [str(venv_python()), "-m", "pip", "install", "--disable-pip-version-check", "--quiet"]
    target = f"{ROOT}[{extras}]" if extras else str(ROOT)
    run([*pip, "-c", str(ROOT / "packaging" / "constraints.txt"), "-e", target], "Installing the packages")
    fresh = [wanted] if not done or wanted_hash("") not in done else [*done, wanted]
    if extras:
        fresh.append(wanted_hash(""))
    stamp.write_text("\n".join(dict.fromkeys(fresh)) + "\n")


def missing_libraries(names: tuple[str, ...]) -> list[str]:
    """Return the Debian packages of `names` that are not installed (none where dpkg does not exist)."""
    if shutil.which("dpkg-query") is None:
        return []
    missing = []
    for name in names:
        answer = subprocess.run(
            ["dpkg-query", "-W", "-f=${Status}", name], capture_output=True, text=True, check=False
        ).stdout
        if "install ok installed" not in answer and not _renamed(name):
            missing.append(name)
    return missing


def _renamed(name: str) -> bool:
    """Return whether a newer Debian has the library under another name (time_t transition: a t64 suffix)."""
    answer = subprocess.run(
        ["dpkg-query", "-W", "-f=${Status}", f"{name}t64"], capture_output=True, text=True, check=False
    )
    return "install ok installed" in answer.stdout


def system_libraries(names: tuple[str, ...]) -> bool:
    """Install system libraries when that is possible, else print the line to type; return whether all are there."""
    missing = missing_libraries(names)
    if not missing:
        return True
    line = "apt-get install --no-install-recommends " + " ".join(missing)
    may = hasattr(os, "geteuid") and os.geteuid() == 0 and shutil.which("apt-get") is not None
    if not may:
        say(f"these system libraries are missing; type: sudo {line}")
        return False
    say("installing system libraries: " + " ".join(missing))
    quiet = {"stdout": subprocess.DEVNULL, "env": {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}}
    subprocess.run(["apt-get", "update", "-qq"], check=False, **quiet)  # type: ignore[call-overload]
    subprocess.run([*line.split(), "-y", "-qq"], check=False, **quiet)  # type: ignore[call-overload]
    left = missing_libraries(tuple(missing))
    if left:
        say("could not install them; type: sudo apt-get install --no-install-recommends " + " ".join(left))
    return not left


def compile_kernels() -> None:
    """Compile the kernels with progress; quick when the disk cache has them."""
    say("compiling the kernels (a minute or two the first time)")
    run([str(venv_python()), "-m", "engine.warm"], "Compiling the kernels")


def set_up(extras: str, libraries: tuple[str, ...]) -> None:
    """Do all the set-up: Python, system libraries, environment, packages, kernels."""
    check_python()
    system_libraries(libraries)
    make_venv()
    install(extras)
    compile_kernels()
