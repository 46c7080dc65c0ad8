"""Set-up shared by start.py and test.py: an environment of its own, pinned packages, system libraries, kernels.

Standard library only, and readable by old Pythons, so that those are told what is wrong. Every step says what it does,
is safe to run again, and is skipped when nothing changed: a stamp in .venv holds the hash of what was installed,
written only after everything succeeded.
"""

from __future__ import annotations

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
SPACE = 2_000_000_000
"""bytes. What the packages, the download and the compiled kernels need, with room to spare (measured: 1.2 GB)."""
QT_LIBRARIES = ("libegl1", "libgl1", "libglib2.0-0", "libdbus-1-3", "libxkbcommon0", "libfontconfig1")
SCREEN_LIBRARIES = ("libxcb-cursor0", "libxcb-icccm4", "libxcb-keysyms1", "libxcb-shape0", "libxkbcommon-x11-0")
TEST_PROGRAMS = ("xvfb", "xauth")
APT = ("apt-get", "install", "--no-install-recommends")
SHOWN = ("Collecting ", "Installing collected", "Successfully ", "ERROR", "WARNING")
"""Beginnings of the lines of pip that are worth a look."""
CAUSES = (
    (("No space left", "Errno 28"), "The disk is full. Free about 2 GB and run the same command again."),
    (
        ("Permission denied", "Errno 13", "Read-only file system", "Errno 30"),
        "The folder cannot be written. Copy Trundle to a folder of your own and run it there.",
    ),
    (
        (
            "NewConnectionError",
            "Temporary failure in name resolution",
            "Network is unreachable",
            "ConnectTimeout",
            "getaddrinfo failed",
            "ProxyError",
            "Connection refused",
        ),
        "The network cannot be reached. The first start needs it once, for the packages; later starts do not.",
    ),
    (
        ("No matching distribution", "Could not find a version"),
        "A package has no build for this Python or machine. Python 3.11 is the one the tests pass with.",
    ),
)
"""Words in what pip prints, and what they mean to the person in front of it."""


class SetupError(Exception):
    """Set-up cannot go on; the message says what is missing and what to type."""


def say(text: str) -> None:
    """Print one step."""
    print(f"* {text}", flush=True)


def check_python(version: tuple[int, ...] = tuple(sys.version_info[:3])) -> None:
    """Refuse a Python that is too old."""
    if version[:2] < OLDEST:
        given = ".".join(map(str, version))
        raise SetupError(
            f"This is Python {given}; Trundle needs 3.11 or newer. Install one and run: python3.11 {sys.argv[0]}"
        )


def venv_python() -> Path:
    """Return the interpreter of the project's own environment."""
    return VENV / ("Scripts/python.exe" if os.name == "nt" else "bin/python")


def run(command: list[str], what: str) -> None:
    """Run a command in the project's folder; a failure becomes one sentence."""
    try:
        done = subprocess.run(command, cwd=ROOT, check=False)
    except OSError as error:
        raise SetupError(f"{what} could not start: {error}.") from error
    if done.returncode != 0:
        raise SetupError(f"{what} failed with exit code {done.returncode}; the lines above say why.")


# -- environment and packages ---------------------------------------------------------------------
def make_venv() -> None:
    """Make .venv where it is missing or broken."""
    if venv_python().exists() and _works([str(venv_python()), "-c", "import pip"]):
        return
    if shutil.disk_usage(ROOT).free < SPACE:
        raise SetupError(f"The disk of {ROOT} has less than 2 GB left. Free some space and run the same command again.")
    _need_ensurepip()
    say(f"making an environment of its own in {VENV}")
    command = [sys.executable, "-m", "venv", "--clear", str(VENV)]
    try:
        VENV.mkdir(exist_ok=True)
    except OSError as error:
        raise SetupError(f"{VENV} cannot be made: {error.strerror}. {CAUSES[1][1]}") from error
    run(command, "Making the environment")


def _works(command: list[str]) -> bool:
    """Return whether a command ends well; what it prints is dropped."""
    try:
        return subprocess.run(command, capture_output=True, check=False).returncode == 0
    except OSError:
        return False


def _need_ensurepip() -> None:
    """Refuse a Python without ensurepip, which Debian packs on its own, unless it can be installed here."""
    wanted = f"python{sys.version_info[0]}.{sys.version_info[1]}-venv"
    command = [sys.executable, "-c", "import ensurepip, venv"]
    if _works(command):
        return
    if can_install():
        apt_install((wanted,))
        if _works(command):
            return
    raise SetupError(f"This Python cannot make environments. On Debian or Ubuntu type: sudo apt-get install {wanted}")


def wanted_hash(extras: str) -> str:
    """Return the hash of what an installation depends on: the place, what is required, the pins."""
    digest = hashlib.sha256(f"{ROOT} {extras}".encode())
    project = (ROOT / "pyproject.toml").read_text(encoding="utf-8").split("[tool.ruff]")[0]
    digest.update(project.encode())
    digest.update((ROOT / "packaging" / "constraints.txt").read_bytes())
    return digest.hexdigest()


def install(extras: str) -> None:
    """Install Trundle with its pinned packages; nothing happens when the stamp says it is done."""
    stamp = VENV / STAMP
    done = stamp.read_text(encoding="utf-8").split() if stamp.exists() else []
    if wanted_hash(extras) in done:
        say("packages are installed already")
        return
    say("installing packages (about 800 MB; a minute or two on a fast line)")
    target = f"{ROOT}[{extras}]" if extras else str(ROOT)
    pins = str(ROOT / "packaging" / "constraints.txt")
    _pip(["install", "--disable-pip-version-check", "--progress-bar", "off", "-c", pins, "-e", target])
    fresh = {wanted_hash(extras), wanted_hash("")} | ({*done} if wanted_hash("") in done else set())
    stamp.write_text("\n".join(sorted(fresh)) + "\n", encoding="utf-8")


def _pip(words: list[str]) -> None:
    """Run pip, show what it collects, and say in plain words why it failed."""
    command = [str(venv_python()), "-m", "pip", *words]
    environment = {**os.environ, "PYTHONUNBUFFERED": "1"}
    said = []
    with subprocess.Popen(
        command,
        cwd=ROOT,
        env=environment,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        errors="replace",
    ) as process:
        for line in process.stdout or ():
            said.append(line)
            if line.startswith(SHOWN):
                print(f"    {line.rstrip()[:110]}", flush=True)
    if process.returncode != 0:
        raise SetupError(cause_of("".join(said)))


def cause_of(text: str) -> str:
    """Return one sentence for what pip printed when it failed."""
    for words, sentence in CAUSES:
        if any(word in text for word in words):
            return sentence
    return "Installing the packages failed:\n" + "\n".join(text.splitlines()[-12:])


# -- system libraries -----------------------------------------------------------------------------
def can_install() -> bool:
    """Return whether this user may install Debian packages."""
    return hasattr(os, "geteuid") and os.geteuid() == 0 and shutil.which("apt-get") is not None


def missing_libraries(names: tuple[str, ...]) -> list[str]:
    """Return the Debian packages of `names` that are not installed (none where dpkg does not exist)."""
    if shutil.which("dpkg-query") is None:
        return []
    # the 64-bit-time transition renamed some: libglib2.0-0t64
    return [name for name in names if not _installed(name) and not _installed(f"{name}t64")]


def _installed(name: str) -> bool:
    """Return whether a Debian package is installed."""
    command = ["dpkg-query", "-W", "-f=${Status}", name]
    answer = subprocess.run(command, capture_output=True, text=True, check=False).stdout
    return "install ok installed" in answer


def apt_install(names: tuple[str, ...]) -> None:
    """Install Debian packages, quietly; what is still missing afterwards is for the caller to see."""
    say("installing system packages: " + " ".join(names))
    environment = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
    for command in (["apt-get", "update", "-qq"], [*APT, "-y", "-qq", *names]):
        subprocess.run(command, stdout=subprocess.DEVNULL, env=environment, check=False)


def system_libraries(names: tuple[str, ...]) -> bool:
    """Install system libraries when that is possible, else print the line to type; return whether all are there."""
    missing = missing_libraries(names)
    if missing and can_install():
        apt_install(tuple(missing))
        missing = missing_libraries(names)
    if missing:
        say("these system libraries are missing; going on without. To install them type:")
        print(f"    sudo {' '.join(APT)} {' '.join(missing)}", flush=True)
    return not missing


# -- all of it ------------------------------------------------------------------------------------
def compile_kernels() -> None:
    """Compile the kernels with progress; quick when the disk cache has them."""
    say("compiling the kernels (about a minute the first time)")
    run([str(venv_python()), "-m", "engine.warm"], "Compiling the kernels")


def set_up(extras: str, libraries: tuple[str, ...]) -> None:
    """Do all the set-up: Python, system libraries, environment, packages, kernels."""
    check_python()
    system_libraries(libraries)
    make_venv()
    try:
        install(extras)
    except OSError as error:
        raise SetupError(f"{VENV} cannot be written: {error.strerror}. {CAUSES[1][1]}") from error
    compile_kernels()
