"""What the documents say can be done can be done."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parents[1]
DOCUMENTS = [ROOT / "README.md", ROOT / "DEVELOPERS.md", *sorted((ROOT / "docs").glob("*.md"))]
BLOCKS = re.findall(r"^```toml\n(.*?)^```", (ROOT / "docs/model.md").read_text("utf-8"), re.M | re.S)


def together(whole: dict[str, Any], added: dict[str, Any]) -> dict[str, Any]:
    """A model with what an example adds to it: tables are joined, lists of tables made longer."""
    joined = dict(whole)
    for key, value in added.items():
        if isinstance(value, dict) and isinstance(joined.get(key), dict):
            joined[key] = together(joined[key], value)
        elif key in joined and key in ("members", "supports", "masses", "analyses"):
            joined[key] = joined[key] + value
        else:
            joined[key] = value
    return joined


@pytest.mark.parametrize("number", range(len(BLOCKS)))
def test_the_examples_of_the_model_file_have_no_mistakes(number: int) -> None:
    from tautbar.model import Model

    whole = tomllib.loads(BLOCKS[0])
    model = Model(**(whole if number == 0 else together(whole, tomllib.loads(BLOCKS[number]))))
    assert model.parts.analyses


def test_the_family_in_the_example_has_the_names_told() -> None:
    from tautbar.model import Model

    (block,) = (block for block in BLOCKS if "in_turn" in block)
    model = Model(**together(tomllib.loads(BLOCKS[0]), tomllib.loads(block)))
    names = [loading.name for loading in model.parts.loadings["strength"]]
    assert "strength: lanterns 1.5, gust 1.5" in names
    assert len(names) == 2 * 5


def test_every_key_the_reader_knows_is_in_the_document() -> None:
    from tautbar.model.schema import schema

    def keys(part: object) -> set[str]:
        if isinstance(part, dict):
            own = set(part["properties"]) if isinstance(part.get("properties"), dict) else set()
            return own.union(*(keys(value) for value in part.values()))
        if isinstance(part, list):
            return set().union(*map(keys, part))
        return set()

    text = (ROOT / "docs/model.md").read_text("utf-8")
    assert {key for key in keys(schema()) if not re.search(rf"\b{re.escape(key)}\b", text)} == set()


@pytest.mark.parametrize("document", DOCUMENTS, ids=lambda path: path.name)
def test_links_lead_somewhere(document: Path) -> None:
    for target in re.findall(r"\]\(([^)#]+)\)", document.read_text("utf-8")):
        assert (document.parent / target).exists(), target
