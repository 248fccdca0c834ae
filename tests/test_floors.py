"""The house is as DEVELOPERS.md says: who may import whom, and how long things may be."""

from __future__ import annotations

import ast
import re
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
PACKAGE = ROOT / "src" / "tautbar"
MODULES = sorted(PACKAGE.rglob("*.py"))
LONGEST_BODY, LONGEST_MODULE = 60, 500


def table() -> list[tuple[list[str], set[str]]]:
    """The floors from the top: (folders and files of a row, third parties it may import)."""
    rows = re.findall(r"^\| (`.*) \| .* \| (.*) \|$", (ROOT / "DEVELOPERS.md").read_text("utf-8"), re.M)
    return [
        (re.findall(r"`([^`]+)`", names), {word.strip() for word in third.split(",")} - {"-"})
        for names, third in rows
    ]


FLOORS = table()
FLOOR_OF = {
    name.removesuffix("/").removesuffix(".py"): k for k, (names, _) in enumerate(FLOORS) for name in names
}


def part(module: Path) -> str:
    """The folder or file of the table that a module belongs to."""
    return module.relative_to(PACKAGE).parts[0].removesuffix(".py")


def dotted(module: Path) -> str:
    """Its name for an import."""
    return ".".join(module.relative_to(PACKAGE.parent).with_suffix("").parts).removesuffix(".__init__")


def imports(module: Path) -> list[tuple[int, str]]:
    """(line, full name) of each import, wherever it stands in the module; of `from a import b` a and b."""
    found = []
    for node in ast.walk(ast.parse(module.read_text("utf-8"))):
        if isinstance(node, ast.Import):
            found += [(node.lineno, alias.name) for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{module}:{node.lineno}: a relative import; write it in full"
            home = node.module or ""
            names = [f"{home}.{alias.name}" for alias in node.names] if home == "tautbar" else [home]
            found += [(node.lineno, name) for name in names]
    return found


def faults(module: Path) -> list[str]:
    """Imports of a module that the table does not allow."""
    here = FLOOR_OF[part(module)]
    allowed = FLOORS[here][1]
    found = []
    for line, name in imports(module):
        top, *below = name.split(".")
        if top == "tautbar":
            there = FLOOR_OF.get(below[0]) if below else None
            if there is None:
                if here != FLOOR_OF["__init__"]:  # the root itself stands on the last floor
                    found.append(f"{module}:{line}: imports from the package root")
            elif there > here:
                found.append(f"{module}:{line}: imports {name}, which stands lower in the house")
        elif top not in sys.stdlib_module_names and top not in allowed:
            found.append(f"{module}:{line}: imports {name}, which is not for this floor")
    return found


def test_the_table_is_the_one_agreed() -> None:
    assert [names[0] for names, _ in FLOORS] == [
        "errors.py", "units.py", "model/", "mechanics/", "algebra/", "solvers/", "records/", "analyses/",
        "limits/", "store/", "views/", "sweep/", "summary.py", "cli.py",
    ]  # fmt: skip
    assert FLOORS[FLOOR_OF["model"]][1] == set()
    assert FLOORS[FLOOR_OF["analyses"]][1] == {"numpy"}
    assert FLOORS[FLOOR_OF["store"]][1] == {"h5py", "numpy"}


def test_every_module_has_its_place_in_the_table() -> None:
    homeless = [str(module) for module in MODULES if part(module) not in FLOOR_OF]
    assert not homeless


@pytest.mark.parametrize("module", MODULES, ids=dotted)
def test_imports_go_up_only(module: Path) -> None:
    assert not faults(module)


@pytest.mark.parametrize(
    ("home", "line"),
    [
        ("model/reading.py", "import numpy"),
        ("analyses/static.py", "from scipy import sparse"),
        ("mechanics/mass.py", "from tautbar.solvers.newton import step"),
        ("store/layout.py", "def f():\n    from tautbar.views import gallery"),
        ("records/fields.py", "import tautbar"),
        ("records/fields.py", "from tautbar import run"),
        ("run.py", "from tautbar import cli"),
    ],
)
def test_a_wrong_import_is_found(
    home: str, line: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    module = tmp_path / home
    module.parent.mkdir(exist_ok=True)
    module.write_text(line)
    monkeypatch.setattr(sys.modules[__name__], "PACKAGE", tmp_path)
    assert len(faults(module)) == 1


def test_modules_and_functions_are_short() -> None:
    long = []
    for module in MODULES:
        text = module.read_text("utf-8")
        if text.count("\n") > LONGEST_MODULE:
            long.append(f"{module}: {text.count(chr(10))} lines")
        for node in ast.walk(ast.parse(text)):
            if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef):
                body = node.body[1:] if ast.get_docstring(node) else node.body
                lines = (body[-1].end_lineno or 0) - body[0].lineno + 1 if body else 0
                if lines > LONGEST_BODY:
                    long.append(f"{module}:{node.lineno}: {node.name} has {lines} lines")
    assert not long


THIRD = ("numpy", "scipy", "matplotlib", "h5py")


def loaded_after(program: str) -> list[str]:
    """Modules of third parties that a fresh interpreter has loaded after a program."""
    end = "\nimport sys; print('|'.join(sys.modules))"
    done = subprocess.run(
        [sys.executable, "-c", program + end], capture_output=True, text=True, timeout=60, check=True
    )
    return [name for name in done.stdout.splitlines()[-1].split("|") if name.partition(".")[0] in THIRD]


def test_every_module_imports_alone() -> None:
    """Each in a process of its own, forked from one that has only the third parties loaded."""
    places = {dotted(module): str(module) for module in MODULES if module.stem != "__main__"}
    third = loaded_after("\n".join(f"import {name}" for name in places))
    program = f"""
import importlib, os, warnings
from importlib.machinery import SourceFileLoader

for name in {third}:
    importlib.import_module(name)
code = {{}}  # compiled once for all of them: there may be no cache on disk
for name, place in {places}.items():
    with open(place, encoding="utf-8") as file:
        code[name] = compile(file.read(), place, "exec")
plain = SourceFileLoader.get_code
SourceFileLoader.get_code = lambda loader, name: code.get(name) or plain(loader, name)
warnings.simplefilter("error")
for name in code:
    child = os.fork()
    if not child:
        try:
            importlib.import_module(name)
        except BaseException as error:
            print(f"{{name}}: {{error!r}}", flush=True)
        os._exit(0)
    os.waitpid(child, 0)
"""
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, timeout=120)
    assert (done.stdout, done.stderr, done.returncode) == ("", "", 0)


@pytest.mark.parametrize(
    "name", ["errors", "units", "progress", "model", "model.reading", "model.schema", "cli"]
)
def test_what_comes_before_computing_loads_no_third_party(name: str) -> None:
    assert not loaded_after(f"import tautbar.{name}")
