"""Sets Trundle up and starts it: `python3 packaging/start.py`.

With a screen: the window on the demonstration. Without one (or with --no-window): the same job in text, with parts,
pictures and a short report in a folder that is named at the end.
"""

import argparse
import json
import os
import subprocess
import sys
import tempfile
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent))

from setup_steps import QT_LIBRARIES, ROOT, SCREEN_LIBRARIES, SetupError, run, say, set_up, venv_python  # noqa: E402

DEMONSTRATION = ROOT / "assets" / "examples" / "wall.json"


def has_screen() -> bool:
    """Return whether a window can be shown."""
    if sys.platform in ("win32", "darwin"):
        return True
    return bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))


def result_folder(wanted: Path) -> Path:
    """Return a folder that can be written: the wanted one, one beside it with a number, else a temporary one."""
    for number in range(100):
        folder = wanted if number == 0 else wanted.with_name(f"{wanted.name}-{number + 1}")
        if folder.exists() and any(folder.iterdir()):
            continue
        try:
            folder.mkdir(parents=True, exist_ok=True)
            (folder / ".writable").touch()
            (folder / ".writable").unlink()
        except OSError:
            break
        return folder
    return Path(tempfile.mkdtemp(prefix="trundle-"))


def trundle(*words: str) -> subprocess.CompletedProcess[str]:
    """Run one command of the command line and return what it printed."""
    command = [str(venv_python()), "-m", "engine.cli", *words]
    return subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=False)


def without_window(design: Path, wanted: Path) -> None:
    """Roll the design, print verdict and findings, write parts, pictures and a report."""
    folder = result_folder(wanted)
    say(f"rolling {design.name}")
    checked = trundle("check", str(design))
    print(checked.stdout, end="")
    if checked.returncode > 1:
        raise SetupError(f"{design} could not be checked: {checked.stderr.strip()}")
    say("writing parts")
    parts = trundle("export", str(design), "--out", str(folder / "parts"))
    if parts.returncode != 0:
        print(parts.stdout + parts.stderr, end="")
    say("drawing pictures")
    run(
        [str(venv_python()), "-m", "studio.pictures", str(design), "--out", str(folder / "pictures")],
        "Drawing the pictures",
    )
    write_report(design, folder)
    say(f"everything is in {folder}")


def write_report(design: Path, folder: Path) -> None:
    """Write report.md: verdict, findings, list of parts."""
    result = json.loads(trundle("check", str(design), "--json").stdout)
    lines = [f"# {design.stem}", "", f"**{result['verdict']}**: {result['outcome']} after {result['duration_s']:.2f} s "
             f"at {result['exit_speed_m_s']:.2f} m/s.", "", "## Findings", ""]
    lines += [f"- {f['severity']}: {f['sentence']} {f['cure']}" for f in result["findings"]] or ["None."]
    lines += ["", "## Parts", ""]
    found = sorted((folder / "parts").glob("*.stl")) if (folder / "parts").exists() else []
    lines += [f"- {part.name} ({part.stat().st_size // 1000} kB)" for part in found] or ["None."]
    (folder / "report.md").write_text("\n".join(lines) + "\n", encoding="utf-8")


def main() -> int:
    """Set up, then start; return the exit code."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("file", nargs="?", type=Path, default=DEMONSTRATION, help="design to open (the demonstration)")
    parser.add_argument("--no-window", action="store_true", help="do the job in text even with a screen")
    parser.add_argument("--out", type=Path, default=Path("trundle-out"), help="folder for results without a window")
    given = parser.parse_args()
    try:
        set_up("", (*QT_LIBRARIES, *SCREEN_LIBRARIES))
        if has_screen() and not given.no_window:
            say("opening the window; close it to end")
            run([str(venv_python()), "-m", "studio.app", str(given.file.resolve())], "The window")
        else:
            without_window(given.file.resolve(), given.out.resolve())
    except SetupError as error:
        print(f"Trundle: {error}", file=sys.stderr)
        return 1
    except KeyboardInterrupt:
        print("Stopped. Run the same command again to go on.", file=sys.stderr)
        return 130
    return 0


if __name__ == "__main__":
    sys.exit(main())
