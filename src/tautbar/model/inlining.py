"""The words of a model with its CSV tables written into them, cell by cell as they stand."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from tautbar.model.checking import NOTES
from tautbar.model.format_structure import LENGTH_KEYS
from tautbar.model.parts import AXES
from tautbar.model.source import Source, bare_name, rows_of, separator_of


def inlined(source: Source) -> dict[str, Any]:
    """Words that mean the same and need no file."""
    words = {key: value for key, value in source.words.items() if key != "tables"}
    tables = source.words.get("tables", {})
    if "joints" in tables:
        words["joints"] = {**words.get("joints", {}), **_joints(source.files[tables["joints"]])}
    if "members" in tables:
        words["members"] = [*words.get("members", []), *_members(source.files[tables["members"]])]
    if any(isinstance(event.get("table"), str) for event in _events(words)):
        words["events"] = {
            name: _with_table(event, source.files) if isinstance(event, dict) else event
            for name, event in words["events"].items()
        }
    return words


def _events(words: Mapping[str, Any]) -> list[dict[str, Any]]:
    return [event for event in words.get("events", {}).values() if isinstance(event, dict)]


def _with_table(event: dict[str, Any], files: Mapping[str, str]) -> dict[str, Any]:
    if not isinstance(event.get("table"), str):
        return event
    rows = [[row["time"], row["factor"]] for row in _rows(files[event["table"]])]
    return {**event, "table": rows}


def _joints(text: str) -> dict[str, Any]:
    return {row["joint"]: [row[axis] for axis in AXES if axis in row] for row in _rows(text)}


def _members(text: str) -> Iterator[dict[str, Any]]:
    for row in _rows(text):
        keys = [k for k in ("from", "to", "kind", "section", *LENGTH_KEYS, *NOTES) if row.get(k, "") != ""]
        pieces = {"pieces": int(row["pieces"])} if row.get("pieces", "") != "" else {}
        yield {"name": row["member"], **{k: row[k] for k in keys}, **pieces}


_TEXTS = frozenset({"joint", "member", "from", "to", "kind", "section", "pieces", *NOTES})


def _rows(text: str) -> Iterator[dict[str, Any]]:
    """Rows by bare column names; numbers as numbers, or as text with the unit of their column."""
    heads, separator = separator_of(text)
    names = [bare_name(head) for head in heads]
    units = [head[head.index("[") + 1 :].rstrip("] ") if "[" in head else "" for head in heads]
    for cells in rows_of(text, separator):
        if cells:
            yield {
                name: cell.strip() if name in _TEXTS else _number(cell.strip(), unit)
                for name, unit, cell in zip(names, units, cells, strict=True)
            }


def _number(cell: str, unit: str) -> Any:
    try:
        number = float(cell)
    except ValueError:
        return cell  # empty, or with its own unit
    return f"{cell} {unit}" if unit else number
