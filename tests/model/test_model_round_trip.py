"""Words to TOML and back: the same parts, for the gantry and for models made at random."""

from __future__ import annotations

import tomllib
from itertools import pairwise
from pathlib import Path
from typing import Any

from footbridge_text import FOOTBRIDGE
from hypothesis import given, settings
from hypothesis import strategies as st

from tautbar.model import Model, read_model
from tautbar.model.reading import model_from_text
from tautbar.model.writing import to_toml


def test_the_gantry_comes_back(gantry_file: Path) -> None:
    model = read_model(gantry_file)
    again = Model(**tomllib.loads(model.to_toml()))
    assert again.parts == model.parts
    assert Model(**model.words).parts == model.parts
    assert tomllib.loads(again.text) == dict(model.words)


def test_the_footbridge_comes_back() -> None:
    model = model_from_text(FOOTBRIDGE)
    assert Model(**tomllib.loads(model.to_toml())).parts == model.parts


def test_parts_differ_where_a_single_value_does(gantry_file: Path) -> None:
    model = read_model(gantry_file)
    words = tomllib.loads(model.text)
    words["members"][0]["pretension"] = "15.001 kN"
    assert Model(**words).parts != model.parts


keys = st.text(min_size=1, max_size=8)
scalars = (
    st.text(max_size=12)
    | st.booleans()
    | st.integers(-(2**63), 2**63 - 1)
    | st.floats(allow_nan=False, allow_infinity=False)
)
values = st.recursive(
    scalars,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(keys, inner, max_size=3),
    max_leaves=12,
)


@settings(max_examples=200, deadline=None)
@given(st.dictionaries(keys, values, max_size=5))
def test_any_words_are_written_as_toml_that_reads_back_equal(words: dict[str, Any]) -> None:
    assert tomllib.loads(to_toml(words)) == words


names = st.text(
    st.characters(codec="utf-8", exclude_characters="*?", categories=["L", "N"]), min_size=1, max_size=6
)
coordinates = st.integers(-1000, 1000)


@st.composite
def models(draw: st.DrawFn) -> dict[str, Any]:
    """Chains of members through random joints, some of them pretensioned."""
    points = draw(
        st.lists(st.tuples(coordinates, coordinates, coordinates), min_size=2, max_size=8, unique=True)
    )
    joints = draw(st.lists(names, min_size=len(points), max_size=len(points), unique=True))
    kind = draw(st.sampled_from(["bar", "tension-only", "compression-only"]))
    sign = -1 if kind == "compression-only" else 1
    return {
        "unsupported": "allowed",
        "units": {"length": draw(st.sampled_from(["m", "mm", "ft"]))},
        "joints": {name: list(point) for name, point in zip(joints, points, strict=True)},
        "sections": {draw(names): {"axial_stiffness": "1 GN", "mass_per_length": draw(st.floats(0, 1e3))}},
        "members": [
            {"name": f"m{i}", "from": a, "to": b, "kind": kind, "pretension": f"{sign * i} kN"}
            for i, (a, b) in enumerate(pairwise(joints))
        ],
    }


@settings(max_examples=60, deadline=None)
@given(models())
def test_random_models_come_back(words: dict[str, Any]) -> None:
    (section,) = words["sections"]
    for member in words["members"]:
        member["section"] = section
    model = Model(**words)
    assert Model(**tomllib.loads(model.to_toml())).parts == model.parts
    assert model.parts.joints.names == tuple(words["joints"])
