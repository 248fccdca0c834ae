"""The JSON Schema: it is draft-07, covers every key, and takes the gantry and refuses slips."""

from __future__ import annotations

import json
import re
import tomllib
from typing import Any

import pytest
from footbridge_text import FOOTBRIDGE

from tautbar.model import spec as s
from tautbar.model.format import MODEL
from tautbar.model.schema import schema


def fits(rule: dict[str, Any], data: Any) -> bool:
    """A small reading of the parts of draft-07 that our schema uses."""
    kinds = {
        "object": dict,
        "array": list,
        "string": str,
        "boolean": bool,
        "integer": int,
        "number": (int, float),
    }
    if "anyOf" in rule and not any(fits(option, data) for option in rule["anyOf"]):
        return False
    if "oneOf" in rule and sum(fits(option, data) for option in rule["oneOf"]) != 1:
        return False
    if "const" in rule and data != rule["const"]:
        return False
    kind = rule.get("type")
    if isinstance(data, bool):
        return kind in (None, "boolean")
    if kind and not isinstance(data, kinds[kind]):
        return False
    if "enum" in rule and data not in rule["enum"]:
        return False
    if isinstance(data, str):
        return re.search(rule.get("pattern", ""), data) is not None
    if isinstance(data, int | float):
        above = data > rule.get("exclusiveMinimum", -1e300) and data >= rule.get("minimum", -1e300)
        return above and data < rule.get("exclusiveMaximum", 1e300) and data <= rule.get("maximum", 1e300)
    if isinstance(data, list):
        return _list_fits(rule, data)
    return not isinstance(data, dict) or _table_fits(rule, data)


def _list_fits(rule: dict[str, Any], data: list[Any]) -> bool:
    if not rule.get("minItems", 0) <= len(data) <= rule.get("maxItems", 1000):
        return False
    items = rule.get("items", {})
    each = items if isinstance(items, list) else [items] * len(data)
    return all(fits(of, item) for of, item in zip(each, data, strict=True))


def _table_fits(rule: dict[str, Any], data: dict[str, Any]) -> bool:
    if not set(rule.get("required", ())) <= data.keys():
        return False
    known, other = rule.get("properties", {}), rule.get("additionalProperties", {})
    return all(
        fits(known[key], value) if key in known else bool(other is not False) and fits(other, value)
        for key, value in data.items()
    )


def test_it_is_a_draft_07_schema_with_numeric_bounds() -> None:
    found = schema()
    assert found["$schema"] == "http://json-schema.org/draft-07/schema#"
    text = json.dumps(found)
    assert '"exclusiveMinimum": 0' in text
    assert '"exclusiveMinimum": true' not in text


def test_it_takes_the_gantry_and_the_footbridge(gantry: str) -> None:
    assert fits(schema(), tomllib.loads(gantry))
    assert fits(schema(), tomllib.loads(FOOTBRIDGE))


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ('pretension = "15 kN"', 'pretention = "15 kN"'),
        ('modulus = "210 GPa"\n', ""),
        ('area = "12.0 cm^2"', "area = -3"),
        ('area = "12.0 cm^2"', 'area = "wide"'),
        ('kind = "tension-only"', 'kind = "tension"'),
        ('kind = "modes"', 'kind = "mode"'),
        ("pieces = 4", "pieces = 1"),
        ('pairs = [["D", "C"]]', 'pairs = [["D"]]'),
        ('ratio = "1 %"', "ratio = 1"),
        ("[[masses]]", "[[massses]]"),
        ("count = 12", 'count = "12"'),
    ],
)
def test_it_refuses_slips(gantry: str, old: str, new: str) -> None:
    assert old in gantry
    assert not fits(schema(), tomllib.loads(gantry.replace(old, new, 1)))


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ('only_pushes = "z"', 'only_pushes = "up"'),
        ("rope = true", 'rope = "yes"'),
        ('["4 m", "0.8 kPa"]', '["4 m"]'),
        ('thickness = "20 mm"', "thickness = 0"),
        ("stop_at =", "stop_when ="),
        ('at = "to end"', 'at = "top"'),
        ('adjust = ["back"]', "adjust = []"),
        ("{ marking_tension", "{ marking"),
        ('value = "4 kN/m"', "worth = 4"),
        ("pieces = 8", "pieces = 1"),
    ],
)
def test_it_refuses_slips_in_the_footbridge(old: str, new: str) -> None:
    assert old in FOOTBRIDGE
    assert not fits(schema(), tomllib.loads(FOOTBRIDGE.replace(old, new, 1)))


def _described(spec: s.Spec, rule: dict[str, Any], path: str = "") -> None:
    if isinstance(spec, s.Table):
        assert rule["properties"].keys() == spec.fields.keys() | {"note", "source"}, path
        for key, of in spec.fields.items():
            _described(of, rule["properties"][key], f"{path}.{key}")
    elif isinstance(spec, s.Named):
        _described(spec.of, rule["additionalProperties"], path)
    elif isinstance(spec, s.Listed):
        _described(spec.of, rule["items"], path)


def test_every_key_of_the_description_is_in_it() -> None:
    _described(MODEL, schema())


def test_every_key_of_the_model_file_says_what_it_means() -> None:
    missing = [key for key, of in MODEL.fields.items() if not of.doc]
    assert missing == []
