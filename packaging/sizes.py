"""Size report: worst files and functions; fails on what is over the limits. `python packaging/sizes.py`.

Also refuses what the linter cannot see: kernels compiled past `engine.kernel`, kernel modules that raise, and imports
of our own modules inside functions.
"""

import ast
import statistics
import subprocess
import sys
from pathlib import Path
from typing import NamedTuple

ROOT = Path(__file__).resolve().parent.parent
FILE_LIMIT, FUNCTION_LIMIT, MEDIAN_LIMIT, ARGUMENT_LIMIT = 400, 60, 12, 6
OWN = ("engine", "studio")
KERNEL_MODULE = "engine/kernel.py"
MANY_ARGUMENTS: dict[str, str] = {}
"""Functions ("file name") that take more arguments than usual, each with the reason."""
WORST = 10

Function = ast.FunctionDef | ast.AsyncFunctionDef


class Size(NamedTuple):
    """Lines of a file or function, and where it is."""

    lines: int
    where: str


def sources(root: Path) -> list[Path]:
    """Return the Python files of the program, those that git does not know yet included."""
    command = ["git", "ls-files", "--cached", "--others", "--exclude-standard", "engine", "studio", "packaging"]
    names = subprocess.run(command, cwd=root, capture_output=True, text=True, check=True).stdout.split()
    return [root / name for name in sorted(names) if name.endswith(".py") and (root / name).exists()]


def code_lines(node: Function) -> int:
    """Return the lines of a function from its first statement on, docstring left out."""
    body = node.body[1:] if ast.get_docstring(node) is not None and len(node.body) > 1 else node.body
    return (node.end_lineno or 0) - body[0].lineno + 1


def arguments(node: Function) -> int:
    """Return how many arguments a function takes, self and cls left out."""
    names = [argument.arg for argument in (*node.args.posonlyargs, *node.args.args, *node.args.kwonlyargs)]
    return len([name for name in names if name not in ("self", "cls")])


def functions(tree: ast.AST) -> list[Function]:
    """Return every function of a module, those inside others included."""
    return [node for node in ast.walk(tree) if isinstance(node, Function)]


def imported(node: ast.AST) -> list[str]:
    """Return the modules that a statement imports, empty for other statements."""
    if isinstance(node, ast.ImportFrom):
        return [node.module or ""]
    return [alias.name for alias in node.names] if isinstance(node, ast.Import) else []


def inner_imports(tree: ast.AST) -> list[int]:
    """Return the lines at which our own modules are imported inside functions."""
    inside = [node for function in functions(tree) for node in ast.walk(function)]
    return sorted({node.lineno for node in inside if any(name.split(".")[0] in OWN for name in imported(node))})


def compiles_itself(tree: ast.AST) -> bool:
    """Return whether a module names one of numba's own decorators."""
    names = {node.attr for node in ast.walk(tree) if isinstance(node, ast.Attribute)}
    names |= {alias.name for node in ast.walk(tree) if isinstance(node, ast.ImportFrom) for alias in node.names}
    return bool(names & {"njit", "jit", "vectorize", "guvectorize", "jitclass", "cfunc"})


def has_kernels(tree: ast.AST) -> bool:
    """Return whether a module defines kernels."""
    return any("engine.kernel" in imported(node) for node in ast.walk(tree))


def rules_broken(name: str, tree: ast.AST) -> list[str]:
    """Return what one module breaks, apart from lengths."""
    problems = [f"{name}:{line} imports our own module inside a function" for line in inner_imports(tree)]
    if has_kernels(tree) and any(isinstance(node, ast.Raise) for node in ast.walk(tree)):
        problems.append(f"{name} has kernels and raises; kernels return a status")
    if name != KERNEL_MODULE and compiles_itself(tree):
        problems.append(f"{name} compiles by itself; use engine.kernel")
    for node in functions(tree):
        if arguments(node) > ARGUMENT_LIMIT and f"{name} {node.name}" not in MANY_ARGUMENTS:
            problems.append(
                f"{name}:{node.lineno} {node.name} takes {arguments(node)} arguments ({ARGUMENT_LIMIT} at most)"
            )
    return problems


def too_long(sizes: list[Size], limit: int) -> list[str]:
    """Return a sentence for each size over its limit."""
    return [f"{where} has {lines} lines ({limit} at most)" for lines, where in sizes if lines > limit]


def report(title: str, sizes: list[Size]) -> float:
    """Print number, median and the worst ten; return the median."""
    median = statistics.median(size.lines for size in sizes)
    worst = sorted(sizes, reverse=True)[:WORST]
    print(f"{len(sizes)} {title}, median {median:g} lines; longest:")
    print("\n".join(f"  {lines:4d}  {where}" for lines, where in worst))
    return median


def main(root: Path = ROOT) -> int:
    """Print the report; return 1 when a limit is broken."""
    files, parts, problems = [], [], []
    for path in sources(root):
        name, text = path.relative_to(root).as_posix(), path.read_text(encoding="utf-8")
        tree = ast.parse(text)
        files.append(Size(text.count("\n"), name))
        parts += [Size(code_lines(node), f"{name}:{node.lineno} {node.name}") for node in functions(tree)]
        problems += rules_broken(name, tree)
    report("files", files)
    median = report("functions", parts)
    problems += too_long(files, FILE_LIMIT) + too_long(parts, FUNCTION_LIMIT)
    if median > MEDIAN_LIMIT:
        problems.append(f"the median function has {median:g} lines ({MEDIAN_LIMIT} at most)")
    print("\n".join(problems) or "every size is within its limit")
    return 1 if problems else 0


if __name__ == "__main__":
    sys.exit(main())
