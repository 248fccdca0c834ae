"""Loadings: load cases that act together, from combinations and from what analyses ask for."""

from __future__ import annotations

import itertools
import math
from collections.abc import Collection, Mapping
from dataclasses import dataclass
from typing import Any

from tautbar.model.format_asking import EACH, NONE
from tautbar.model.lookup import is_pattern, matching
from tautbar.model.mistakes import Mistakes, near
from tautbar.model.parts import LoadCase, Loading
from tautbar.model.positions import Path

_MOST_LOADINGS = 100_000
NOTHING = Loading("nothing", {})


def build_loadings(
    cases: Mapping[str, Any], combinations: dict[str, Any], mistakes: Mistakes
) -> dict[str, tuple[Loading, ...]]:
    """Loadings by the name of a load case, a combination (one) or a family (many)."""
    found: dict[str, tuple[Loading, ...]] = {name: (Loading(name, {name: 1.0}),) for name in cases}
    for table, names in (("load_cases", cases), ("combinations", combinations)):
        for name in (EACH, NONE):
            if name in names:
                what = f"'{name}' has a meaning of its own where an analysis names its loads"
                mistakes.add((table, name), what, "give it another name")
    for name, data in combinations.items():
        path: Path = ("combinations", name)
        if name in cases:
            mistakes.add(path, f"'{name}' is the name of a load case too")
        if data is None:
            found.setdefault(name, ())
        elif isinstance(data.get("in_turn"), list) or isinstance(data.get("always"), dict):
            found[name] = _family(name, data, cases, mistakes)
        else:
            found[name] = (Loading(name, check_factors(data, cases, path, mistakes, combinations)),)
    return found


def check_factors(
    data: dict[str, Any] | None,
    cases: Mapping[str, Any],
    path: Path,
    mistakes: Mistakes,
    combinations: Collection[str] = (),
) -> dict[str, float]:
    """Factors of load cases that are known; patterns are refused (they would sum)."""
    good = {}
    for name, factor in (data or {}).items():
        if is_pattern(name):
            what = f"a pattern ('{name}') is not allowed here: all that match it would act together"
            mistakes.add((*path, name), what, "name the load cases, or use a family with in_turn")
        elif name not in cases and name in combinations:
            what = f"'{name}' is a combination, factors are of load cases"
            mistakes.add((*path, name), what, f'write "{name}" without braces, or name its load cases')
        elif name not in cases:
            mistakes.add((*path, name), f"there is no load case '{name}'", near(name, cases))
        elif factor is not None:
            good[name] = factor
    return good


def _family(
    name: str, data: dict[str, Any], cases: Mapping[str, Any], mistakes: Mistakes
) -> tuple[Loading, ...]:
    path: Path = ("combinations", name)
    always = check_factors(data.get("always"), cases, (*path, "always"), mistakes)
    tables = [
        _choices(table, cases, (*path, "in_turn", i), mistakes)
        for i, table in enumerate(data.get("in_turn") or ())
    ]
    _refuse_twice(always, tables, path, mistakes)
    if math.prod(map(len, tables)) > _MOST_LOADINGS:
        mistakes.add(path, f"gives more than {_MOST_LOADINGS} loadings")
        return ()
    loadings = []
    for choice in itertools.product(*tables):
        words = ", ".join(f"{case} {factor:g}" for case, factor in choice)
        loadings.append(Loading(f"{name}: {words}", {**always, **dict(choice)}))
    return tuple(loadings)


def _choices(
    table: dict[str, Any] | None, cases: Mapping[str, Any], path: Path, mistakes: Mistakes
) -> list[tuple[str, float]]:
    found: list[tuple[str, float]] = []
    for name, given in (table or {}).items():
        factors = given if isinstance(given, list) else [given]
        named = matching(name, cases) if is_pattern(name) else [name] if name in cases else []
        if not named:
            pattern = f"the pattern '{name}' matches no load case"
            what = pattern if is_pattern(name) else f"there is no load case '{name}'"
            mistakes.add((*path, name), what, near(name, cases))
        found += [(case, f) for case in named for f in factors if f is not None and (case, f) not in found]
    return found


def _refuse_twice(
    always: Mapping[str, float], tables: list[list[tuple[str, float]]], path: Path, mistakes: Mistakes
) -> None:
    seen = dict.fromkeys(always, "always")
    for i, table in enumerate(tables):
        for case in dict.fromkeys(case for case, _ in table):
            if case in seen:
                what = f"load case '{case}' is in {seen[case]} too: a loading takes it once"
                mistakes.add((*path, "in_turn", i), what)
            seen[case] = f"table {i + 1} of in_turn"


def has_load(case: LoadCase) -> bool:
    """Does the case say anything that is not zero?"""
    listed = (case.forces, case.line_loads, case.movements)
    single = (case.masses, case.temperature_change, case.take_up)
    return bool(
        case.self_weight
        or any(vector and any(vector) for entries in listed for _, vector in entries)
        or any(value for entries in single for _, value in entries)
        or any(any(wind.pressures) for wind in case.wind)
        or case.ice
    )


def acts(loading: Loading, cases: Mapping[str, LoadCase]) -> bool:
    """Does anything act in the loading?"""
    return any(factor and has_load(cases[name]) for name, factor in loading.factors.items() if name in cases)


def joined(name: str, *loadings: Loading | None) -> Loading:
    """Several loadings as one."""
    factors: dict[str, float] = {}
    for loading in loadings:
        for case, factor in loading.factors.items() if loading is not None else ():
            factors[case] = factors.get(case, 0.0) + factor
    return Loading(name, factors)


@dataclass
class Loads:
    """What analyses ask for, as loadings."""

    mistakes: Mistakes
    cases: Mapping[str, LoadCase]
    loadings: Mapping[str, tuple[Loading, ...]]

    def all(self, data: Mapping[str, Any], path: Path) -> tuple[Loading, ...] | None:
        """All loadings of an analysis; None where its start state's loads stay."""
        if "loads" not in data:
            return None
        given = data["loads"]
        found: list[Loading] = []
        for i, item in enumerate(given if isinstance(given, list) else [given]):
            where = (*path, "loads", i) if isinstance(given, list) else (*path, "loads")
            for loading in self._of(item, where):
                if any(loading.name == other.name for other in found):
                    self.mistakes.add(where, f"the loading '{loading.name}' is in the list twice")
                found.append(loading)
        return tuple(found)

    def one(self, item: Any, path: Path) -> Loading:
        """The one loading that is wanted here."""
        found = self._of(item, path)
        if len(found) > 1:
            names = ", ".join(f"'{loading.name}'" for loading in found[:8])
            self.mistakes.add(path, f"one loading is wanted here, these are {len(found)}", f"one of {names}")
        return found[0] if found else NOTHING

    def growing(self, item: Any, path: Path) -> Loading:
        """The loading that a load factor multiplies: something must act in it."""
        loading = self.one(item, path)
        doubtful = self.mistakes.at(*path) or any(self.mistakes.at("load_cases", c) for c in loading.factors)
        if item is not None and not doubtful and not acts(loading, self.cases):
            self.mistakes.add(path, "no load grows: nothing acts in it, whatever the load factor")
        return loading

    def _of(self, item: Any, path: Path) -> tuple[Loading, ...]:
        if isinstance(item, dict):
            factors = check_factors(item, self.cases, path, self.mistakes, self.loadings)
            words = " + ".join(f"{factor:g} {case}" for case, factor in factors.items())
            return (Loading(words or "nothing", factors),)
        if item is None:
            return ()
        if item in self.loadings:
            return self.loadings[item]
        each = [loading for several in self.loadings.values() for loading in several]
        one = tuple(loading for loading in each if loading.name == item)
        if not one:
            known = [*self.loadings, *(loading.name for loading in each)]
            self.mistakes.add(path, f"there is no load case or combination '{item}'", near(item, known))
        return one
