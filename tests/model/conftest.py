"""The gantry of the Orrin Quay works as a text and as a file."""

from __future__ import annotations

from pathlib import Path

import pytest
from gantry_text import GANTRY


@pytest.fixture
def gantry() -> str:
    return GANTRY


@pytest.fixture
def gantry_file(tmp_path: Path) -> Path:
    file = tmp_path / "gantry.toml"
    file.write_text(GANTRY, encoding="utf-8")
    return file
