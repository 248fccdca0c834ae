"""The public names, and that importing the package costs next to nothing."""

from __future__ import annotations

import ast
import re
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

import tautbar

ROOT = Path(__file__).parents[1]
PUBLIC = [
    "AnalysisFailed",
    "InputError",
    "Mistake",
    "Model",
    "ModelError",
    "NotConverged",
    "ResultsError",
    "TautbarError",
    "__version__",
    "answer_text",
    "find_modes",
    "list_plots",
    "open_results",
    "plot",
    "read_model",
    "run",
    "save_plot",
    "schema",
    "solve_history",
    "solve_static",
    "summarise",
    "write_starter",
]


def fresh(program: str) -> str:
    """What a fresh interpreter prints."""
    return subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, timeout=60, check=True
    ).stdout.strip()


def test_the_public_names_are_pinned() -> None:
    assert sorted(tautbar.__all__) == PUBLIC
    assert set(PUBLIC) <= set(dir(tautbar))


@pytest.mark.parametrize("name", PUBLIC)
def test_each_public_name_can_be_fetched_and_explains_itself(name: str) -> None:
    value = getattr(tautbar, name)
    if name != "__version__":
        assert callable(value)
        assert value.__doc__


def test_type_checkers_see_the_same_names() -> None:
    tree = ast.parse((ROOT / "src/tautbar/__init__.py").read_text("utf-8"))
    (checked,) = (node for node in tree.body if isinstance(node, ast.If))
    seen = {
        alias.asname or alias.name: (node.module, alias.name)
        for node in checked.body
        if isinstance(node, ast.ImportFrom)
        for alias in node.names
    }
    assert sorted([*seen, "__version__"]) == PUBLIC
    for name, (home, there) in seen.items():
        assert tautbar._HOMES[name] in (f"{home}", f"{home}:{there}")


def test_an_unknown_name_is_refused() -> None:
    with pytest.raises(AttributeError, match="module 'tautbar' has no attribute 'solve'"):
        _ = tautbar.solve


def test_the_import_loads_nothing_heavy_and_takes_milliseconds() -> None:
    """3.5 ms measured; 30 ms is what a loaded machine may make of it, and a tenth of numpy."""
    program = """
import sys, time
began = time.perf_counter()
import tautbar
took = time.perf_counter() - began
print(took, *sorted({"numpy", "h5py", "scipy", "matplotlib", "argparse", "typing"} & set(sys.modules)))
"""
    took, *heavy = min((fresh(program) for _ in range(3)), key=lambda line: float(line.split()[0])).split()
    assert not heavy
    assert float(took) < 0.03


def test_run_is_the_function_whatever_was_imported_before() -> None:
    assert fresh("import tautbar.run, tautbar; print(type(tautbar.run).__name__)") == "function"
    assert fresh("import tautbar; tautbar.run; import tautbar.run; print(callable(tautbar.run))") == "True"
    assert fresh("from tautbar import run; print(callable(run))") == "True"


def test_it_is_marked_as_typed() -> None:
    assert (ROOT / "src/tautbar/py.typed").exists()


def test_the_core_needs_four_packages_only() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]
    names = {re.split(r"[<>=~!\[ ]", need)[0] for need in project["dependencies"]}
    assert names == {"numpy", "scipy", "matplotlib", "h5py"}


def commands(text: str) -> list[str]:
    """The commands in the sh blocks of a document."""
    blocks = re.findall(r"^```sh\n(.*?)^```", text, re.M | re.S)
    return [line for block in blocks for line in block.splitlines() if line.strip()]


def test_ci_runs_the_test_command_of_the_readme() -> None:
    """.ci/run takes the command from the README by a pattern, which must find exactly that one line."""
    script = (ROOT / ".ci/run").read_text("utf-8")
    (pattern,) = re.findall(r"grep -E '([^']+)' README.md", script)
    lines = (ROOT / "README.md").read_text("utf-8").splitlines()
    found = [line for line in lines if re.search(pattern, line)]
    assert found == [line for line in commands("\n".join(lines)) if "pytest" in line]
    assert len(found) == 1
    assert found[0].startswith("python3 -m venv .venv && ")


def test_the_examples_of_the_readme_run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The Python of the README, in order, beside a copy of the model it names."""
    text = (ROOT / "README.md").read_text("utf-8")
    blocks = re.findall(r"^```python\n(.*?)^```", text, re.M | re.S)
    assert blocks
    monkeypatch.chdir(tmp_path)
    tautbar.write_starter("bracket.toml")
    space: dict[str, object] = {}
    for block in blocks:
        exec(compile(block, "README.md", "exec"), space)
    assert (tmp_path / "bracket.h5").exists()
