"""Single pieces of the reader against plain twins: positions, patterns, the least tension of a rope."""

from __future__ import annotations

import math
import tomllib
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tautbar.model.lookup import Finder, groups_of, matching
from tautbar.model.mistakes import Mistakes, near
from tautbar.model.positions import Path, Positions
from tautbar.model.prestress import least_tension
from tautbar.model.writing import to_toml

keys = st.text(min_size=1, max_size=5)
values = st.recursive(
    st.text(max_size=8) | st.integers(-99, 99) | st.booleans(),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(keys, inner, max_size=3),
    max_leaves=10,
)


def _leaves(data: Any, path: Path = ()) -> list[tuple[Path, Any]]:
    if isinstance(data, dict):
        return [leaf for key, item in data.items() for leaf in _leaves(item, (*path, key))]
    if isinstance(data, list):
        return [leaf for i, item in enumerate(data) for leaf in _leaves(item, (*path, i))]
    return [(path, data)]


@settings(max_examples=200, deadline=None)
@given(st.dictionaries(keys, values, max_size=4))
def test_every_key_is_found_where_it_stands(words: dict[str, Any]) -> None:
    text = to_toml(words)
    positions = Positions(text)
    for path, value in _leaves(words):
        line, column = positions.of(path)
        rest = positions.line(line)[column - 1 :]
        if isinstance(path[-1], int):  # an item of a list: the value itself stands there
            end = next(n for n in range(1, len(rest) + 1) if _reads_as(rest[:n], value))
            assert end
        else:
            assert tomllib.loads(rest.split("=")[0].strip() + " = 1") if "=" not in path[-1] else True


def _reads_as(text: str, value: Any) -> bool:
    try:
        return bool(tomllib.loads(f"k = {text}")["k"] == value)
    except tomllib.TOMLDecodeError:
        return False


def test_positions_in_all_the_ways_toml_is_written() -> None:
    text = (
        'a.b = 1 # c = 2\n"q k" = """two\nlines = 3"""\nd = [\n  1, # one\n  { e = \'x\' },\n]\n'
        "[t . u]\nf = 1979-05-27\n[[m]]\ng = 1\n[m.n]\nh = 2\n[[m]]\ng = 3\n"
    )
    positions = Positions(text)
    assert positions.of(("a", "b")) == (1, 3)
    assert positions.of(("q k",)) == (2, 1)
    assert positions.of(("d", 1, "e")) == (6, 5)
    assert positions.of(("t", "u", "f")) == (9, 1)
    assert positions.of(("m", 0, "n", "h")) == (13, 1)
    assert positions.of(("m", 1, "g")) == (15, 1)
    assert positions.of(("m", 1, "absent")) == (14, 1)  # the nearest thing around it


def test_patterns_are_plain_text_but_for_two_signs() -> None:
    names = ["stay-1", "stay-2", "stay-10", "stay.1", "a+b"]
    assert matching("stay-*", names) == ["stay-1", "stay-2", "stay-10"]
    assert matching("stay-?", names) == ["stay-1", "stay-2"]
    assert matching("stay.?", names) == ["stay.1"]
    assert matching("a+*", names) == ["a+b"]


def test_groups_are_named_by_what_stands_before_the_number() -> None:
    names = ["rope.1.1", "rope.1.2", "rope.2.1", "single", "v.x", "single.1"]
    index = {name: i for i, name in enumerate(names)}
    assert groups_of(names, index) == {"rope.1": (0, 1), "rope": (0, 1, 2), "rope.2": (2,)}


def test_joints_between_pieces_are_matched_only_when_meant() -> None:
    index = {"A": 0, "B": 1, "rope@1": 2, "rope@2": 3}
    finder = Finder("joint", index, Mistakes(), drawn=2)
    assert finder.find(["*"], ()) == (0, 1)
    assert finder.find(["rope@*", "A"], ()) == (2, 3, 0)


def test_the_nearest_name_is_found_among_many() -> None:
    many = [f"joint-{i}" for i in range(20_000)]
    assert near("Joint-777", many) == "did you mean 'joint-777'?"
    assert near("jiont-777", many).startswith("did you mean 'joint-")
    assert near("x", []) == "there are none"


def test_least_tension_of_a_level_rope() -> None:
    """T = w a cosh(span / 2a) is least where (span / 2a) tanh(span / 2a) = 1, at 1.19967864."""
    u = 1.1996786402577338
    assert u * math.tanh(u) == pytest.approx(1, rel=1e-14)
    # the minimum is flat, so golden sections find its value to about rounding
    assert least_tension(10, 0, 2.0) == pytest.approx(2.0 * 10 * math.cosh(u) / (2 * u), rel=1e-12)


def test_least_tension_of_a_sloping_rope_against_a_scan() -> None:
    span, rise, weight = 7.0, 4.0, 3.0

    def lower_end(a: float) -> float:
        middle = a * math.asinh(rise / (2 * a * math.sinh(span / (2 * a))))
        return weight * a * math.cosh((middle - span / 2) / a)

    scanned = min(lower_end(0.3 * 1.001**k) for k in range(8000))  # steps of 0.1 %: 1e-6 at a flat minimum
    assert least_tension(span, rise, weight) == pytest.approx(scanned, rel=1e-6)
    assert least_tension(0.0, 5.0, weight) == 0.0
