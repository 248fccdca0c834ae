"""Checking words against the description of the model file, and turning quantities into SI."""

from __future__ import annotations

import operator
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from tautbar.model import spec as s
from tautbar.model.mistakes import Mistakes, near, nearest
from tautbar.model.parts import AXES
from tautbar.model.positions import Path
from tautbar.units import NUMBER, BadQuantity, Units, say

NOTES = ("note", "source")
_NOT_YET = "is not available in this version"
_WORDS = {"text": "quoted text", "number": "a number or quantity", "list": "a list", "table": "a table"}


@dataclass(frozen=True)
class Checker:
    """Checks words of one model.

    `check` gives the data back with quantities in SI and defaults filled in. A value that is wrong
    is noted and becomes None, its key staying, so that later checks can tell wrong from absent.
    """

    units: Units
    axes: tuple[int, ...]  # the axes that coordinates and vectors are given in
    mistakes: Mistakes

    def check(self, spec: s.Spec, data: Any, path: Path) -> Any:
        """The data at a path in SI, None where it is wrong."""
        return _HOW[type(spec)](self, spec, data, path)

    def wrong(self, path: Path, what: str, hint: str = "") -> Any:
        """Note a mistake; gives the None that stands for a wrong value."""
        self.mistakes.add(path, what, hint)
        return None


def kind_of(data: Any) -> str:
    """The type of a value in the words of the model file."""
    if isinstance(data, bool):
        return "flag"
    if isinstance(data, int | float):
        return "number"
    for words, kind in (("text", str), ("list", list), ("table", dict)):
        if isinstance(data, kind):
            return words
    return "date"


def _text(c: Checker, spec: s.Text, data: Any, path: Path) -> Any:
    if not isinstance(data, str):
        return c.wrong(path, f"quoted text is wanted, not {say(data)}")
    if data in spec.later:
        return c.wrong(path, f"'{data}' {_NOT_YET}", _choices(spec))
    if spec.choices and data not in spec.choices:
        return c.wrong(path, f"'{data}' is not one of the words known here", meant(spec, data))
    if spec.is_name:
        check_name(c.mistakes, data, path)
    return data


def meant(spec: s.Text, word: str) -> str:
    """What to write for a word that is none of the choices."""
    return spec.meant.get(word.lower()) or near(word, spec.choices)


def _choices(spec: s.Text) -> str:
    return "known: " + ", ".join(spec.choices) if spec.choices else ""


def check_name(mistakes: Mistakes, name: str, path: Path) -> None:
    """Note a name that could not be told from a pattern, or not be seen."""
    if not name or name != name.strip() or not name.isprintable():
        mistakes.add(path, f"{name!r} is no name: it is empty or has spaces at its ends or unprintable signs")
    elif "*" in name or "?" in name:
        mistakes.add(path, f"'{name}': * and ? are for patterns, not for names")


def _flag(c: Checker, spec: s.Flag, data: Any, path: Path) -> Any:
    if not isinstance(data, bool):
        return c.wrong(path, f"true or false is wanted, not {say(data)}")
    return data


def _count(c: Checker, spec: s.Count, data: Any, path: Path) -> Any:
    if isinstance(data, bool) or not isinstance(data, int):
        return c.wrong(path, f"a whole number is wanted, not {say(data)}")
    if data < spec.at_least:
        return c.wrong(path, f"must be {spec.at_least} or more, is {data}")
    if spec.at_most is not None and data > spec.at_most:
        return c.wrong(path, f"must be {spec.at_most} or less, is {data}")
    return data


def _quantity(c: Checker, spec: s.Quantity, data: Any, path: Path) -> Any:
    if data in spec.later and isinstance(data, str):
        return c.wrong(path, f"'{data}' {_NOT_YET}", f'write for example "{spec.dimension.example}"')
    try:
        value = c.units.read(data, spec.dimension)
    except BadQuantity as error:
        return c.wrong(path, str(error))
    problem = out_of_bounds(spec, value, data)
    return c.wrong(path, problem) if problem else value


def out_of_bounds(spec: s.Quantity, value: float, given: Any) -> str:
    """What is wrong with a value in SI, or an empty text."""
    for words, bound, holds in (
        ("above", spec.above, operator.gt),
        ("at least", spec.at_least, operator.ge),
        ("below", spec.below, operator.lt),
        ("at most", spec.at_most, operator.le),
    ):
        if bound is not None and not holds(value, bound):
            return f"must be {words} {bound:g}, is {given}"
    return ""


def _vector(c: Checker, spec: s.Vector, data: Any, path: Path) -> Any:
    names = ", ".join(AXES[a] for a in c.axes)
    if not isinstance(data, list):
        return c.wrong(path, f"a list of {len(c.axes)} ({names}) is wanted, not {say(data)}")
    if len(data) != len(c.axes):
        return c.wrong(path, f"{len(c.axes)} values ({names}) are wanted, {len(data)} given")
    vector = [0.0, 0.0, 0.0]
    whole = True
    for i, (axis, item) in enumerate(zip(c.axes, data, strict=True)):
        try:
            vector[axis] = c.units.read(item, spec.dimension)
        except BadQuantity as error:
            c.wrong((*path, i), str(error))
            whole = False
    return (vector[0], vector[1], vector[2]) if whole else None


def _names(c: Checker, spec: s.Names, data: Any, path: Path) -> Any:
    if not isinstance(data, list):
        hint = f'write ["{data}"]' if isinstance(data, str) else ""
        return c.wrong(path, f"a list of names of {spec.of} is wanted, not {say(data)}", hint)
    if not data:
        return c.wrong(path, f"the list is empty: name at least one of the {spec.of}")
    good: list[str] = []
    for i, item in enumerate(data):
        if not isinstance(item, str):
            c.wrong((*path, i), f"quoted text is wanted, not {say(item)}")
        elif item in good:
            c.wrong((*path, i), f"'{item}' is named twice in this list")
        else:
            good.append(item)
    return good


def _listed(c: Checker, spec: s.Listed, data: Any, path: Path) -> Any:
    if not isinstance(data, list):
        return c.wrong(path, f"a list is wanted, not {say(data)}", _as_list(spec, data))
    if len(data) < spec.at_least or (spec.at_most is not None and len(data) > spec.at_most):
        most = f" to {spec.at_most}" if spec.at_most is not None else " or more"
        return c.wrong(path, f"{spec.at_least}{most} values are wanted, {len(data)} given")
    return [c.check(spec.of, item, (*path, i)) for i, item in enumerate(data)]


def _as_list(spec: s.Listed, data: Any) -> str:
    """How to write a single thing as the list that is wanted."""
    if isinstance(data, dict) and isinstance(spec.of, s.Table | s.Factors):
        return "put it in square brackets, [ { .. } ]"
    if not isinstance(data, str) or not isinstance(spec.of, s.Text | s.Quantity):
        return ""
    choices = spec.of.choices if isinstance(spec.of, s.Text) else ()
    words = list(data) if set(data) <= set(choices) else [data]  # "xyz" for three axes
    return "write [" + ", ".join(f'"{word}"' for word in words) + "]"


def _row(c: Checker, spec: s.Row, data: Any, path: Path) -> Any:
    if not isinstance(data, list):
        return c.wrong(path, f"a list of {len(spec.of)} is wanted, not {say(data)}")
    if len(data) != len(spec.of):
        return c.wrong(path, f"{len(spec.of)} values are wanted, {len(data)} given")
    return [c.check(of, item, (*path, i)) for i, (of, item) in enumerate(zip(spec.of, data, strict=True))]


def _table(c: Checker, spec: s.Table, data: Any, path: Path) -> Any:
    if not isinstance(data, dict):
        return c.wrong(path, f"a table is wanted, not {say(data)}")
    misspelt = _keys(c, spec, data, path)
    out: dict[str, Any] = {}
    for key, of in spec.fields.items():
        if key in data:
            out[key] = c.check(of, data[key], (*path, key))
        elif key in misspelt:
            out[key] = None
        elif of.default is not None:
            out[key] = of.default
        elif of.required:
            out[key] = None
    out.update((key, _text(c, s.Text(), data[key], (*path, key))) for key in NOTES if key in data)
    return out


def _keys(c: Checker, spec: s.Table, data: dict[str, Any], path: Path) -> set[str]:
    """Note unknown and missing keys; gives those that were misspelt, which are wrong, not missing."""
    missing = [k for k, of in spec.fields.items() if of.required and k not in data]
    misspelt = set()
    for key in data:
        if key in spec.fields or key in NOTES:
            continue
        if key in spec.later:
            c.wrong((*path, key), f"'{key}' {_NOT_YET}")
            continue
        other = spec.synonyms.get(key) or nearest(key, spec.fields)
        misspelt.add(other)
        hint = f"did you mean '{other}'?" if other else near(key, spec.fields)
        c.wrong((*path, key), f"there is no key '{key}' here", hint)
    for key in missing:
        if key not in misspelt:
            c.wrong(path, f"'{key}' is missing", spec.fields[key].doc)
    return misspelt


def _named(c: Checker, spec: s.Named, data: Any, path: Path) -> Any:
    if not isinstance(data, dict):
        return c.wrong(path, f"a table of names is wanted, not {say(data)}")
    out = {}
    for name, item in data.items():
        if name in NOTES and isinstance(item, str):
            continue
        check_name(c.mistakes, name, (*path, name))
        out[name] = c.check(spec.of, item, (*path, name))
    return out


def _factors(c: Checker, spec: s.Factors, data: Any, path: Path) -> Any:
    if not isinstance(data, dict):
        return c.wrong(path, f"a table of factors is wanted, not {say(data)}")
    number = s.Quantity(dimension=NUMBER)
    out = {}
    for name, item in data.items():
        if name in NOTES and isinstance(item, str):
            continue
        many = spec.many and isinstance(item, list)
        of = s.Listed(of=number, at_least=1) if many else number
        out[name] = c.check(of, item, (*path, name))
    return out


def _by_kind(c: Checker, spec: s.ByKind, data: Any, path: Path) -> Any:
    if not isinstance(data, dict):
        return c.wrong(path, f"a table is wanted, not {say(data)}")
    kind = data.get("kind")
    known = ", ".join(spec.kinds)
    if "kind" not in data:
        return c.wrong(path, "'kind' is missing", f"known: {known}")
    if not isinstance(kind, str):
        return c.wrong((*path, "kind"), f"quoted text is wanted, not {say(kind)}")
    if kind in spec.later:
        return c.wrong((*path, "kind"), f"'{kind}' {_NOT_YET}", f"known: {known}")
    if kind not in spec.kinds:
        return c.wrong((*path, "kind"), f"there is no kind '{kind}'", near(kind, spec.kinds))
    return _table(c, spec.kinds[kind], data, path)


def _either(c: Checker, spec: s.Either, data: Any, path: Path) -> Any:
    kind = kind_of(data)
    for option in spec.options:
        if kind in option.accepts:
            return c.check(option, data, path)
    wanted = " or ".join(dict.fromkeys(_WORDS[k] for option in spec.options for k in option.accepts))
    return c.wrong(path, f"{wanted} is wanted, not {say(data)}")


def _combination(c: Checker, spec: s.Combination, data: Any, path: Path) -> Any:
    if isinstance(data, dict):
        family = isinstance(data.get("always"), dict) or isinstance(data.get("in_turn"), list)
        return c.check(spec.family if family else spec.plain, data, path)
    return c.wrong(path, f"a table of factors is wanted, not {say(data)}")


_HOW: dict[type, Callable[[Checker, Any, Any, Path], Any]] = {
    s.Text: _text,
    s.Flag: _flag,
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
