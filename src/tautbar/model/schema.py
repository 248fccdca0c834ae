"""JSON Schema of the model file, for editors, from the same description that the checks use."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from tautbar.model import spec as s
from tautbar.model.format import MODEL

_DRAFT = "http://json-schema.org/draft-07/schema#"
_QUANTITY = r"^\s*[+-]?(\d|\.\d)"
_NOTES = {key: {"type": "string"} for key in ("note", "source")}
Json = dict[str, Any]


def schema() -> Json:
    """JSON Schema draft-07 of the model file, format 1."""
    return {"$schema": _DRAFT, "title": "tautbar model file, format 1", **_of(MODEL)}


def _of(spec: s.Spec) -> Json:
    found = _HOW[type(spec)](spec)
    if spec.doc:
        found = {"description": " - ".join(t for t in (spec.doc, found.get("description", "")) if t)} | {
            k: v for k, v in found.items() if k != "description"
        }
    if spec.default is not None:
        found["default"] = spec.default
    return found


def _text(spec: s.Text) -> Json:
    found: Json = {"type": "string"}
    if spec.choices:
        found["enum"] = list(spec.choices)
    if spec.is_name:
        found["minLength"] = 1
    return found


def _count(spec: s.Count) -> Json:
    most = {} if spec.at_most is None else {"maximum": spec.at_most}
    return {"type": "integer", "minimum": spec.at_least, **most}


def _quantity(spec: s.Quantity) -> Json:
    """A bare number keeps only the bounds that hold in every unit: those at zero, and of ratios."""
    number: Json = {"type": "number"}
    for bound, key in (
        (spec.above, "exclusiveMinimum"),
        (spec.at_least, "minimum"),
        (spec.below, "exclusiveMaximum"),
        (spec.at_most, "maximum"),
    ):
        if bound is not None and not spec.dimension.absolute and (bound == 0 or not spec.dimension.made_of):
            number[key] = bound
    return {
        "description": f"{spec.dimension.name}, for example '{spec.dimension.example}'",
        "anyOf": [number, {"type": "string", "pattern": _QUANTITY}],
    }


def _vector(spec: s.Vector) -> Json:
    return {"type": "array", "items": _of(s.Quantity(dimension=spec.dimension)), "minItems": 2, "maxItems": 3}


def _names(spec: s.Names) -> Json:
    return {"type": "array", "items": {"type": "string"}, "minItems": 1, "uniqueItems": True}


def _listed(spec: s.Listed) -> Json:
    most = {} if spec.at_most is None else {"maxItems": spec.at_most}
    return {"type": "array", "items": _of(spec.of), "minItems": spec.at_least, **most}


def _row(spec: s.Row) -> Json:
    size = len(spec.of)
    return {"type": "array", "items": [_of(of) for of in spec.of], "minItems": size, "maxItems": size}


def _table(spec: s.Table) -> Json:
    required = [key for key, of in spec.fields.items() if of.required]
    return {
        "type": "object",
        "properties": {key: _of(of) for key, of in spec.fields.items()} | _NOTES,
        "additionalProperties": False,
        **({"required": required} if required else {}),
    }


def _named(spec: s.Named) -> Json:
    return {"type": "object", "properties": _notes_or(_of(spec.of)), "additionalProperties": _of(spec.of)}


def _factors(spec: s.Factors) -> Json:
    number = _of(s.Quantity())
    value = {"anyOf": [number, {"type": "array", "items": number, "minItems": 1}]} if spec.many else number
    return {"type": "object", "properties": _notes_or(value), "additionalProperties": value}


def _notes_or(value: Json) -> Json:
    """A thing may be called "note" as well as there be a note."""
    return {key: {"anyOf": [text, value]} for key, text in _NOTES.items()}


def _by_kind(spec: s.ByKind) -> Json:
    tables = []
    for kind, table in spec.kinds.items():
        found = _of(table)
        found["properties"]["kind"] = {"const": kind}
        tables.append(found)
    return tables[0] if len(tables) == 1 else {"oneOf": tables}


def _either(spec: s.Either) -> Json:
    return {"anyOf": [_of(option) for option in spec.options]}


def _combination(spec: s.Combination) -> Json:
    return {"anyOf": [_of(spec.family), _of(spec.plain)]}


_HOW: dict[type, Callable[[Any], Json]] = {
    s.Text: _text,
    s.Flag: lambda spec: {"type": "boolean"},
    s.Count: _count,
    s.Quantity: _quantity,
    s.Vector: _vector,
    s.Names: _names,
    s.Listed: _listed,
    s.Row: _row,
    s.Table: _table,
    s.Named: _named,
    s.Factors: _factors,
    s.ByKind: _by_kind,
    s.Either: _either,
    s.Combination: _combination,
}
