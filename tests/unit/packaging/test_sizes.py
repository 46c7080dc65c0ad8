"""The size report: quiet on what is within the limits, and a sentence for each limit that is broken."""

import subprocess

import pytest

GOOD = '"""Module."""\n\n\ndef area(radius):\n    """Return an area."""\n    return 3 * radius**2\n'
BROKEN = {
    "has 401 lines (400 at most)": ("engine/long.py", GOOD + "\n" * 395),
    "has 61 lines (60 at most)": ("engine/far.py", "def far():\n" + "    x = 1\n" * 61),
    "takes 7 arguments (6 at most)": ("studio/many.py", "def many(a, b, c, d, *, e, f, g):\n    return a\n"),
    "has kernels and raises": (
        "engine/deep.py",
        "from engine.kernel import kernel\n\n\n@kernel\ndef f(x):\n    raise ValueError\n",
    ),
    "compiles by itself": ("engine/own.py", "from numba import njit\n\n\n@njit\ndef f(x):\n    return x\n"),
    "own.py:2 imports our own module inside": (
        "engine/own.py",
        "def f():\n    import engine.units\n    return engine\n",
    ),
    "the median function has 13 lines": (
        "engine/wide.py",
        "".join(f"def f{n}():\n" + "    x = 1\n" * 13 for n in range(9)),
    ),
}


@pytest.fixture
def sizes(script):
    return script("sizes")


@pytest.fixture
def tree(tmp_path):
    """Return a repository with one small module."""
    subprocess.run(["git", "init", "-q", str(tmp_path)], check=True)
    for folder in ("engine", "studio", "packaging"):
        (tmp_path / folder).mkdir()
    (tmp_path / "engine" / "good.py").write_text(GOOD)
    return tmp_path


def test_program_is_within_its_limits(sizes, capsys):
    assert sizes.main() == 0
    assert "every size is within its limit" in capsys.readouterr().out


def test_small_module_is_within_the_limits(sizes, tree):
    assert sizes.main(tree) == 0


@pytest.mark.parametrize("sentence", BROKEN)
def test_each_limit_is_told(sizes, tree, capsys, sentence):
    name, text = BROKEN[sentence]
    (tree / name).write_text(text)
    assert sizes.main(tree) == 1
    assert sentence in capsys.readouterr().out


def test_docstring_does_not_count(sizes):
    tree = sizes.ast.parse('def f():\n    """One.\n\n    Two.\n    """\n    x = 1\n    return x\n')
    assert sizes.code_lines(sizes.functions(tree)[0]) == 2
