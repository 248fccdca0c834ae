"""Damaged models: whatever is changed, the answer is a model or told mistakes, never a crash."""

from __future__ import annotations

import copy
import tomllib
from typing import Any

from footbridge_text import FOOTBRIDGE
from gantry_text import GANTRY
from hypothesis import given, settings
from hypothesis import strategies as st

from tautbar.errors import Mistake, ModelError
from tautbar.model import Model
from tautbar.model.reading import model_from_text

numbers = (0, -1, 1.5, float("nan"), float("inf"), True)
texts = (
    "",
    "A",
    "low",
    "each",
    "none",
    "back",
    "handrail",
    "dead",
    "12 mm",
    "3 kN",
    "*",
    "@",
    "as drawn",
    "x\ny",
    "auto",
)
lists = ([], [1], [0, 0], ["A"], ["A", "C"], [[]], [{}])
tables = ({}, {"a": 1}, {"name": "m"}, {"analysis": "strength"})
junk = st.sampled_from([*numbers, *texts, *lists, *tables])


def _places(data: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    items = data.items() if isinstance(data, dict) else enumerate(data) if isinstance(data, list) else ()
    return [p for key, item in items for p in [(*path, key), *_places(item, (*path, key))]]


def _change(words: Any, path: tuple[Any, ...], value: Any, how: str) -> None:
    for key in path[:-1]:
        words = words[key]
    if how == "remove":
        del words[path[-1]]
    elif how == "rename" and isinstance(words, dict):
        words[f"{path[-1]}x"] = words.pop(path[-1])
    else:
        words[path[-1]] = value


@settings(max_examples=400, deadline=None)
@given(data=st.data())
def test_a_damaged_model_is_answered_in_words(data: st.DataObject) -> None:
    words = tomllib.loads(data.draw(st.sampled_from([GANTRY, FOOTBRIDGE])))
    for _ in range(data.draw(st.integers(1, 3))):
        path = data.draw(st.sampled_from(_places(words)))
        _change(
            words,
            path,
            copy.deepcopy(data.draw(junk)),
            data.draw(st.sampled_from(["put", "put", "remove", "rename"])),
        )
    try:
        model = Model(**words)
    except ModelError as error:
        told = error.mistakes
    else:
        assert Model(**tomllib.loads(model.to_toml())).parts == model.parts
        return
    assert told
    assert all(m.what for m in told)


@settings(max_examples=150, deadline=None)
@given(start=st.integers(0, 2400), length=st.integers(0, 30), put=st.text("\"'[]{}=,.#\n\\ a1", max_size=4))
def test_a_damaged_text_is_answered_with_a_line(start: int, length: int, put: str) -> None:
    text = GANTRY[:start] + put + GANTRY[start + length :]
    try:
        model_from_text(text, file="damaged.toml")
        told: tuple[Mistake, ...] = ()
    except ModelError as error:
        told = error.mistakes
    assert all(m.line >= 1 and m.column >= 1 for m in told)
