"""Size report: worst files and functions; fails on what is over the limits. `python packaging/sizes.py`."""

import ast
import statistics
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
FILE_LIMIT, FUNCTION_LIMIT, MEDIAN_LIMIT, ARGUMENT_LIMIT = 400, 60, 12, 6
KERNEL_FILES = {
    "engine/geometry/projection.py",
    "engine/contact/query.py",
    "engine/contact/laws.py",
    "engine/dynamics/rates.py",
    "engine/dynamics/impact.py",
    "engine/dynamics/phases.py",
    "engine/integrate/step.py",
    "engine/integrate/events.py",
    "engine/integrate/advance.py",
    "engine/integrate/outcome.py",
    "engine/integrate/log.py",
    "engine/integrate/solve.py",
}
"""Modules of compiled functions: they never raise."""
MANY_ARGUMENTS: dict[str, str] = {}
"""Functions that take more arguments than usual, each with the reason."""
WORST = 10


def sources() -> list[Path]:
    """Return the Python files of the program."""
    names = subprocess.run(
        ["git", "ls-files", "engine/*.py", "studio/*.py", "packaging/*.py"],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=True,
    ).stdout.split()
    return [ROOT / name for name in names if (ROOT / name).exists()]


def code_lines(node: ast.FunctionDef | ast.AsyncFunctionDef) -> int:
    """Return the lines of a function from its first statement on, docstring left out."""
    body = node.body[1:] if ast.get_docstring(node) and len(node.body) > 1 else node.body
    return (node.end_lineno or 0) - body[0].lineno + 1


def arguments(node: ast.FunctionDef | ast.AsyncFunctionDef) -> int:
    """Return how many arguments a function takes, self and keyword-only ones left out."""
    names = [a.arg for a in (*node.args.posonlyargs, *node.args.args)]
    return len([name for name in names if name not in ("self", "cls")])


def own_imports(tree: ast.AST) -> list[int]:
    """Return the lines at which our own modules are imported inside functions."""
    lines = []
    for function in ast.walk(tree):
        if isinstance(function, ast.FunctionDef | ast.AsyncFunctionDef):
            for node in ast.walk(function):
                if isinstance(node, ast.ImportFrom) and (node.module or "").split(".")[0] in ("engine", "studio"):
                    lines.append(node.lineno)
    return lines


def main() -> int:
    """Print the report; return 1 when a limit is broken."""
    files, functions, problems = [], [], []
    for path in sources():
        name, text = str(path.relative_to(ROOT)), path.read_text(encoding="utf-8")
        tree = ast.parse(text)
        files.append((text.count("\n"), name))
        if name in KERNEL_FILES and any(isinstance(node, ast.Raise) for node in ast.walk(tree)):
            problems.append(f"{name} raises; kernels never do")
        if name != "engine/kernel.py" and "numba.njit" in text and not name.startswith("packaging"):
            problems.append(f"{name} compiles by itself; use engine.kernel")
        problems += [f"{name}:{line} imports our own module inside a function" for line in own_imports(tree)]
        for node in ast.walk(tree):
            if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef):
                where = f"{name}:{node.lineno} {node.name}"
                functions.append((code_lines(node), where))
                if arguments(node) > ARGUMENT_LIMIT and f"{name} {node.name}" not in MANY_ARGUMENTS:
                    problems.append(f"{where} takes {arguments(node)} arguments ({ARGUMENT_LIMIT} at most)")
    problems += [f"{name} has {lines} lines ({FILE_LIMIT} at most)" for lines, name in files if lines > FILE_LIMIT]
    problems += [
        f"{where} has {lines} lines ({FUNCTION_LIMIT} at most)" for lines, where in functions if lines > FUNCTION_LIMIT
    ]
    median = statistics.median(lines for lines, _ in functions)
    if median > MEDIAN_LIMIT:
        problems.append(f"the median function has {median} lines ({MEDIAN_LIMIT} at most)")
    print(
        f"{len(files)} files, median {statistics.median(n for n, _ in files):.0f} lines; "
        f"{len(functions)} functions, median {median:.0f} lines"
    )
    for title, rows in (("longest files", files), ("longest functions", functions)):
        print(title + ": " + ", ".join(f"{where} {lines}" for lines, where in sorted(rows, reverse=True)[:WORST]))
    print("\n".join(problems) or "every size is within its limit")
    return 1 if problems else 0


if __name__ == "__main__":
    sys.exit(main())
