"""Makes the pictures of README.md: `python packaging/pictures.py`, after a change that can be seen.

Runs in the project's own environment, without a screen; the pictures are those of the demonstration.
"""

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent))

from setup_steps import ROOT, SetupError, run, venv_python  # noqa: E402  (found only with this folder on the path)

DEMONSTRATION = ROOT / "assets" / "examples" / "wall.json"
PICTURES = ROOT / "assets" / "pictures"


def main() -> int:
    """Write the pictures; return the exit code."""
    command = [str(venv_python()), "-m", "studio.pictures", str(DEMONSTRATION), "--out", str(PICTURES)]
    try:
        run(command, "Drawing the pictures")
    except SetupError as error:
        print(f"Trundle: {error}", file=sys.stderr)
        return 1
    print("\n".join(str(path) for path in sorted(PICTURES.glob("*.png"))))
    return 0


if __name__ == "__main__":
    sys.exit(main())
