"""Command line: the same results as the window, for people at a terminal and for other programs.

Exit codes: 0 clean, 1 findings (or a failed check), 2 unusable input, 130 stopped with Ctrl-C.
"""

import argparse
import importlib.util
import json
import math
import os
import sys
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import numpy as np

from engine.bench import run_rows
from engine.errors import DesignError, DesignFileError, PartRefusedError, TrundleError, suggestion
from engine.fabrication.export import export_parts
from engine.findings.finding import Finding
from engine.model.design import Design
from engine.model.storage import load, schema, write_whole
from engine.placement import lay_out
from engine.samples import csv_bytes, npz_bytes
from engine.simulate import Roll, roll
from engine.units import format_length
from engine.verification import verify_file

CLEAN, FOUND, UNUSABLE, BROKEN_PIPE, INTERRUPTED = 0, 1, 2, 141, 130
WRITERS = {".csv": csv_bytes, ".npz": npz_bytes}
WINDOW_MODULE = "studio.app"
WINDOW_NEEDS = "PySide6"

Arguments = argparse.Namespace


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command; return the exit code."""
    given = list(sys.argv[1:] if argv is None else argv)
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
    try:
        code = _run(given)
        sys.stdout.flush()
    except KeyboardInterrupt:
        print("Stopped.", file=sys.stderr)
        return INTERRUPTED
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return BROKEN_PIPE
    return code


def _run(given: list[str]) -> int:
    """Find the command and carry it out; errors become sentences."""
    if not given or (given[0] not in COMMANDS and not given[0].startswith("-")):
        return _open_window(given)
    arguments = _parser().parse_args(given)
    try:
        command: Callable[[Arguments], int] = arguments.command
        return command(arguments)
    except PartRefusedError as error:
        return _refuse(error, arguments.json, FOUND)
    except TrundleError as error:
        return _refuse(error, getattr(arguments, "json", False), UNUSABLE)


def _refuse(error: TrundleError, as_json: bool, code: int) -> int:
    """Tell what is wrong: a sentence a line on stderr, or one object on stdout."""
    problems = list(getattr(error, "problems", ())) or [str(error)]
    if as_json:
        path = getattr(error, "path", None)
        headline = f"{path} cannot be used." if path is not None else str(error)
        _print_json({"error": headline, "problems": problems})
        return code
    prefix = f"{error.path}: " if isinstance(error, DesignFileError) else ""
    for problem in problems:
        print(prefix + problem, file=sys.stderr)
    return code


def _print_json(content: Any) -> None:
    """Print one JSON object."""
    print(json.dumps(content, ensure_ascii=False, allow_nan=False))


# -- the window -----------------------------------------------------------------------------------
def _open_window(given: list[str]) -> int:
    """Become the window, on a file when one is named."""
    if len(given) > 1 or (given and Path(given[0]).suffix != ".json" and not Path(given[0]).exists()):
        print(f'There is no command "{given[0]}"{suggestion(given[0], COMMANDS, len(COMMANDS))}.', file=sys.stderr)
        return UNUSABLE
    if importlib.util.find_spec(WINDOW_NEEDS) is None:
        print(f"The window needs {WINDOW_NEEDS}; install it, or use a command: trundle --help.", file=sys.stderr)
        return UNUSABLE
    sys.stdout.flush()
    os.execv(sys.executable, [sys.executable, "-m", WINDOW_MODULE, *given])  # does not come back


# -- check, simulate ------------------------------------------------------------------------------
def _rolled(design: Design, run: str) -> Roll:
    """Roll one run in a thread, so that Ctrl-C is heard while the kernel works."""
    cancel = np.zeros(1, dtype=np.uint8)
    with ThreadPoolExecutor(max_workers=1) as pool:
        future = pool.submit(roll, design, run, cancel=cancel)
        try:
            return future.result()
        except KeyboardInterrupt:
            cancel[0] = 1
            raise


def _loaded(path: str) -> Design:
    """Design of a file that has something to roll."""
    design = load(path)
    if not design.runs:
        raise DesignError(f"{path} has no run yet; add one with at least one element.")
    return design


def _progress(text: str) -> None:
    """Show what is being worked on, when a person is watching."""
    if sys.stderr.isatty():
        print(f"\r\x1b[K{text}", end="", file=sys.stderr, flush=True)


def _check(arguments: Arguments) -> int:
    """Roll the runs of a design and tell what is found."""
    design = _loaded(arguments.file)
    wanted = [design.run(arguments.run).id] if arguments.run is not None else [run.id for run in design.runs]
    rolls = []
    for number, run in enumerate(wanted, start=1):
        _progress(f'Rolling "{run}", {number} of {len(wanted)}')
        rolls.append(_rolled(design, run))
    _progress("")
    findings = [finding for rolled in rolls for finding in rolled.findings]
    clears = all(rolled.verdict == "clears" for rolled in rolls)
    if arguments.json:
        _print_json(_check_json(rolls, findings, clears))
    else:
        _print_check(design, rolls)
    return CLEAN if clears and not findings else FOUND


def _check_json(rolls: list[Roll], findings: list[Finding], clears: bool) -> dict[str, Any]:
    """Result of a check; figures are those of the first run, findings those of every run."""
    first = rolls[0]
    return {
        "verdict": "clears" if clears else "fails",
        "outcome": first.outcome,
        "duration_s": first.duration,
        "exit_speed_m_s": first.exit_speed,
        "findings": [finding.as_json() for finding in findings],
    }


def _print_check(design: Design, rolls: list[Roll]) -> None:
    """Print the verdict and the findings of each run."""
    for rolled in rolls:
        outcome = rolled.outcome.replace("_", " ")
        print(
            f"Run {rolled.run_id} {rolled.verdict}: {outcome} after {rolled.duration:.3f} s "
            f"at {rolled.exit_speed:.3f} m/s, {_count(len(rolled.findings))}."
        )
        for finding in rolled.findings:
            _print_finding(finding, design)


def _count(findings: int) -> str:
    """Number of findings in words."""
    return "no findings" if findings == 0 else f"{findings} finding{'s' if findings > 1 else ''}"


def _print_finding(finding: Finding, design: Design) -> None:
    """Print one finding: how bad, where, what, and what cures it."""
    entry = finding.as_json()
    place = entry["segment"] or entry["where"] or "design"
    along = f" at {format_length(finding.s, design.units)}" if math.isfinite(finding.s) else ""
    print(f"  {entry['severity']}: {place}{along}: {entry['sentence']}")
    if entry["cure"]:
        print(f"    Cure: {entry['cure']}")


def _simulate(arguments: Arguments) -> int:
    """Roll one run and write its samples."""
    writer = WRITERS.get(Path(arguments.out).suffix.lower())
    if writer is None:
        raise TrundleError(f"{arguments.out} has no known ending; give a file name that ends in .csv or .npz.")
    design = _loaded(arguments.file)
    rolled = _rolled(design, design.run(arguments.run).id)
    write_whole(writer(rolled.trajectory), arguments.out)
    samples = len(rolled.trajectory.t)
    if arguments.json:
        figures = {"outcome": rolled.outcome, "duration_s": rolled.duration, "exit_speed_m_s": rolled.exit_speed}
        _print_json({"path": arguments.out, "samples": samples, **figures})
    else:
        print(f"{arguments.out}: {samples} samples over {rolled.duration:.3f} s.")
    return CLEAN


# -- export, verify, bench, schema ----------------------------------------------------------------
def _export(arguments: Arguments) -> int:
    """Write the parts of a design as mesh files."""
    design = _loaded(arguments.file)
    _progress("Making parts")
    parts = export_parts(lay_out(design), Path(arguments.out))
    _progress("")
    if arguments.json:
        _print_json({"parts": [_part_json(part) for part in parts]})
        return CLEAN
    for part in parts:
        print(f"{part.path}: {part.name}, {part.triangles} triangles")
    return CLEAN


def _part_json(part: Any) -> dict[str, Any]:
    """One exported part."""
    return {"name": part.name, "path": str(part.path), "triangles": part.triangles, "mass_kg": part.mass}


def _verify(arguments: Arguments) -> int:
    """Compare the engine with reference cases."""
    report = verify_file(arguments.cases)
    if arguments.json:
        _print_json(report.as_json())
    else:
        print("\n".join(report.lines()))
    return FOUND if report.failed else CLEAN


def _bench(arguments: Arguments) -> int:
    """Measure speed on this machine."""
    rows = [row.as_json() for row in run_rows(window=arguments.window)]
    if arguments.json:
        _print_json({"results": rows})
        return CLEAN
    for row in rows:
        word = "ok  " if row["ok"] else "MISS"
        sign = ">=" if row["better"] == "higher" else "<="
        print(f"{word} {row['name']:58} {row['value']:12.4g} {row['unit']:16} {sign} {row['target']:g}")
    return CLEAN


def _schema(arguments: Arguments) -> int:
    """Print or write the JSON Schema of the document."""
    text = json.dumps(schema(), indent=1, ensure_ascii=False) + "\n"
    if arguments.out is None:
        print(text, end="")
    else:
        write_whole(text.encode("utf-8"), arguments.out)
    return CLEAN


# -- arguments ------------------------------------------------------------------------------------
COMMANDS = ("check", "simulate", "export", "verify", "schema", "bench")


def _parser() -> argparse.ArgumentParser:
    """Parser of the command line."""
    parser = argparse.ArgumentParser(
        prog="trundle",
        description="Design, roll, prove and make rolling-ball installations. Without a command: open the window.",
        epilog="Exit codes: 0 clean, 1 findings, 2 unusable input, 130 stopped.",
    )
    commands = parser.add_subparsers(metavar="COMMAND", required=True)
    check = _command(commands, "check", _check, "roll a design and list what goes wrong, where and by how much")
    simulate = _command(commands, "simulate", _simulate, "roll one run and write its samples")
    export = _command(commands, "export", _export, "write the parts as mesh files")
    for command in (check, simulate, export):
        command.add_argument("file", metavar="FILE", help="design (JSON)")
    for command in (check, simulate):
        command.add_argument("--run", metavar="ID", help="run to roll (check: all, simulate: the first)")
    simulate.add_argument("--out", required=True, metavar="FILE", help="samples, .csv or .npz")
    export.add_argument("--out", required=True, metavar="FOLDER", help="folder for the parts")
    verify = _command(commands, "verify", _verify, "compare the engine with reference cases")
    verify.add_argument("cases", metavar="CASES", help="reference cases (JSON)")
    _command(commands, "schema", _schema, "print the JSON Schema of a design", as_json=False).add_argument(
        "--out", metavar="FILE", help="write it here instead"
    )
    bench = _command(commands, "bench", _bench, "measure speed on this machine")
    bench.add_argument("--window", action="store_true", help="also the window")
    return parser


def _command(
    commands: Any, name: str, function: Callable[[Arguments], int], summary: str, as_json: bool = True
) -> argparse.ArgumentParser:
    """Parser of one command."""
    made: argparse.ArgumentParser = commands.add_parser(name, help=summary, description=summary.capitalize() + ".")
    made.set_defaults(command=function)
    if as_json:
        made.add_argument("--json", action="store_true", help="one JSON object on standard output")
    return made


if __name__ == "__main__":
    sys.exit(main())
