"""Sets Trundle up and starts it: `python3 packaging/start.py [DESIGN]`.

With a screen: the window on the demonstration. Without one, or with --no-window: the same job in text. The ball is
rolled, what goes wrong is listed, and parts, pictures and a short report are written into a folder that is named at the
end.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent))

from setup_steps import (  # noqa: E402  (found only with this folder on the path)
    QT_LIBRARIES,
    ROOT,
    SCREEN_LIBRARIES,
    SetupError,
    say,
    set_up,
    venv_python,
)

DEMONSTRATION = ROOT / "assets" / "examples" / "wall.json"
UNUSABLE = 2
"""Exit code of the command line for a design that cannot be used."""
NO_SCREEN_S = 15.0
"""s. A window that fails sooner than this never came up: DISPLAY names a screen that is not there."""


def has_screen() -> bool:
    """Return whether a window can be shown."""
    if sys.platform in ("win32", "darwin"):
        return True
    return bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))


def result_folder(wanted: Path) -> Path:
    """Return an empty folder that can be written: the wanted one, one beside it with a number, else a temporary one."""
    number = 1
    while True:
        folder = wanted if number == 1 else wanted.with_name(f"{wanted.name}-{number}")
        number += 1
        try:
            if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
                continue
            folder.mkdir(parents=True, exist_ok=True)
            (folder / ".writable").touch()
            (folder / ".writable").unlink()
        except OSError as error:
            say(f"{folder} cannot be written ({error.strerror}); using a temporary folder")
            return Path(tempfile.mkdtemp(prefix="trundle-"))
        return folder


def module(*words: str) -> subprocess.CompletedProcess[str]:
    """Run one module of Trundle; return what it printed."""
    command = [str(venv_python()), "-m", *words]
    environment = {**os.environ, "PYTHONIOENCODING": "utf-8"}
    return subprocess.run(
        command, cwd=ROOT, env=environment, capture_output=True, text=True, encoding="utf-8", check=False
    )


# -- the window -----------------------------------------------------------------------------------
def open_window(design: Path) -> bool:
    """Open the window and wait until it closes; return False when it never came up."""
    say("opening the window; close it to end")
    begun = time.monotonic()
    code = subprocess.run([str(venv_python()), "-m", "studio.app", str(design)], cwd=ROOT, check=False).returncode
    if code == 0:
        return True
    if time.monotonic() - begun < NO_SCREEN_S:
        say(f"the window could not be opened (exit code {code}); doing the same job without it")
        return False
    raise SetupError(f"The window ended with exit code {code}; the lines above say why. The working copy is kept.")


# -- the same job without a window ----------------------------------------------------------------
def without_window(design: Path, wanted: Path) -> None:
    """Roll the design, print verdict and findings, write parts, pictures and a report."""
    say(f"rolling {design.name}")
    checked = module("engine.cli", "check", str(design))
    print(checked.stdout, end="", flush=True)
    if checked.returncode >= UNUSABLE or checked.returncode < 0:
        raise SetupError(f"{design} cannot be used:\n{checked.stderr.strip()}")
    folder = result_folder(wanted)
    say(f"writing the parts into {folder / 'parts'}")
    parts = module("engine.cli", "export", str(design), "--out", str(folder / "parts"), "--json")
    say(f"drawing the pictures into {folder / 'pictures'}")
    drawn = module("studio.pictures", str(design), "--out", str(folder / "pictures"))
    if drawn.returncode != 0:
        raise SetupError(f"The pictures could not be drawn:\n{drawn.stderr.strip()}")
    result = json.loads(module("engine.cli", "check", str(design), "--json").stdout)
    report = report_lines(design.stem, result, json.loads(parts.stdout), folder)
    (folder / "report.md").write_text("\n".join(report) + "\n", encoding="utf-8")
    say(f"done; look at {folder / 'report.md'}")


def report_lines(name: str, result: dict, parts: dict, folder: Path) -> list[str]:
    """Return the report: verdict, findings, parts (name, mass, file), pictures."""
    outcome = result["outcome"].replace("_", " ")
    lines = [f"# {name}", "", f"The run **{result['verdict']}**: {outcome} after {result['duration_s']:.2f} s "
             f"at {result['exit_speed_m_s']:.2f} m/s.", "", "## Findings", ""]  # fmt: skip
    # a place shared by several runs is found by each of them
    lines += dict.fromkeys(f"- {f['severity']}: {f['sentence']} {f['cure']}".rstrip() for f in result["findings"])
    lines += [] if result["findings"] else ["None."]
    lines += ["", "## Parts", ""]
    for part in parts.get("parts", []):
        lines.append(f"- `{Path(part['path']).name}`, {1000.0 * part['mass_kg']:.0f} g")
    if "error" in parts:
        lines += ["No parts were written.", *(f"- {problem}" for problem in parts["problems"])]
    lines += ["", "## Pictures", ""]
    lines += [f"![{path.stem}](pictures/{path.name})" for path in sorted((folder / "pictures").glob("*.png"))]
    return lines


def main() -> int:
    """Set up, then start; return the exit code."""
    parser = argparse.ArgumentParser(description="Set Trundle up and start it.")
    parser.add_argument("file", nargs="?", type=Path, default=DEMONSTRATION, help="design to open (the demonstration)")
    parser.add_argument("--no-window", action="store_true", help="do the job in text even with a screen")
    parser.add_argument("--out", type=Path, default=Path("trundle-out"), help="folder for results without a window")
    given = parser.parse_args()
    design, out = given.file.resolve(), given.out.resolve()
    try:
        set_up("", (*QT_LIBRARIES, *SCREEN_LIBRARIES))
        if given.no_window or not has_screen() or not open_window(design):
            without_window(design, out)
    except SetupError as error:
        print(f"Trundle: {error}", file=sys.stderr)
        return 1
    except KeyboardInterrupt:
        print("Stopped. Run the same command again to go on.", file=sys.stderr)
        return 130
    return 0


if __name__ == "__main__":
    sys.exit(main())
