"""Writing the words of a model as TOML: top-level tables as tables, all below them in one line."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_ESCAPES = {'"': '\\"', "\\": "\\\\", "\n": "\\n", "\t": "\\t", "\r": "\\r"}


def to_toml(words: Mapping[str, Any]) -> str:
    """TOML text that `tomllib` reads back as equal words."""
    plain = [f"{key_text(k)} = {value_text(v)}" for k, v in words.items() if not _is_table(v)]
    blocks = ["\n".join(plain)] if plain else []
    for key, value in words.items():
        if _is_table(value):
            blocks += _list_of_tables(key, value) if isinstance(value, list) else _tables(key, value)
    return "\n\n".join(blocks) + "\n"


def _is_table(value: Any) -> bool:
    return isinstance(value, dict) or (
        isinstance(value, list) and bool(value) and all(isinstance(item, dict) for item in value)
    )


def _list_of_tables(key: str, value: list[dict[str, Any]]) -> list[str]:
    return ["\n".join([f"[[{key_text(key)}]]", *_lines(item)]) for item in value]


def _tables(key: str, value: dict[str, Any]) -> list[str]:
    """[key] with what is no table, then [key.name] for each table in it."""
    own = {k: v for k, v in value.items() if not isinstance(v, dict)}
    blocks = ["\n".join([f"[{key_text(key)}]", *_lines(own)])] if own or not value else []
    for name, table in value.items():
        if isinstance(table, dict):
            blocks.append("\n".join([f"[{key_text(key)}.{key_text(name)}]", *_lines(table)]))
    return blocks


def _lines(table: dict[str, Any]) -> list[str]:
    return [f"{key_text(k)} = {value_text(v)}" for k, v in table.items()]


def key_text(key: str) -> str:
    """A key, quoted where TOML wants it."""
    return key if _BARE_KEY.fullmatch(key) else _quoted(key)


def value_text(value: Any) -> str:
    """A value in one line."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return _quoted(value)
    if isinstance(value, dict):
        inside = ", ".join(_lines(value))
        return f"{{ {inside} }}" if inside else "{}"
    if isinstance(value, list):
        return "[" + ", ".join(map(value_text, value)) + "]"
    return repr(value)  # a number; those of a checked model are finite


def _quoted(text: str) -> str:
    return '"' + "".join(_ESCAPES.get(c) or (c if _printable(c) else f"\\u{ord(c):04X}") for c in text) + '"'


def _printable(sign: str) -> bool:
    return ord(sign) >= 32 and ord(sign) != 127
