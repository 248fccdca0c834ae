"""Each study runs from its model to results and plots, and every one of its analyses passes its audit."""

from __future__ import annotations

import shutil
import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

STUDIES = Path(__file__).parents[1] / "studies"
NAMES = [
    "guy-tuning",
    "lantern-arch",
    "lantern-gantry",
    "rope-footbridge",
    "tide-gauge-mast",
    "x-braced-tower",
]


@pytest.mark.slow
@pytest.mark.parametrize("name", NAMES)
def test_a_study_runs_to_results_and_plots(name: str, tmp_path: Path) -> None:
    shutil.copytree(STUDIES / name, tmp_path / name, ignore=shutil.ignore_patterns("results"))
    shutil.copy(STUDIES / "run.py", tmp_path)
    done = subprocess.run(
        [sys.executable, "-W", "error", "run.py", name],
        cwd=tmp_path,
        capture_output=True,
        text=True,
        timeout=600,
    )
    assert done.returncode == 0, done.stdout + done.stderr
    plots = tomllib.loads((tmp_path / name / "plots.toml").read_text("utf-8"))["plots"]
    assert len(plots) >= 3
    wanted = {f"{name}.h5", *(row["file"] for row in plots)}
    assert {file.name for file in (tmp_path / name / "results").iterdir()} == wanted


def test_a_study_that_is_not_there_is_answered_with_those_that_are() -> None:
    done = subprocess.run(
        [sys.executable, STUDIES / "run.py", "bridge"], capture_output=True, text=True, timeout=60
    )
    assert done.returncode == 2
    assert done.stderr == f"Name one study: {', '.join(NAMES)}\n"
