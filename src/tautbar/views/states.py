"""One state of a result: a loading, an instant, or a point of a path."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tautbar.errors import InputError
from tautbar.store import Result
from tautbar.store.layout import UnknownName
from tautbar.views.quantities import figures, nearest

Array = NDArray[Any]


@dataclass(frozen=True, slots=True)
class State:
    """One state of the structure, in the order of the drawing; NaN where it was not stored or is not there.

    ``loading`` is its place among the loadings, None where there are none.
    """

    words: str
    moved: Array  # m, (J, 3)
    force: Array  # N, (N,)
    slack: Array  # (N,)
    there: NDArray[np.bool_]  # (N,)
    loading: int | None = None


def titled(result: Result, words: str) -> str:
    """Words after the name of the analysis, unless they are that name."""
    return words if words == result.name else f"{result.name}: {words}"


def loading_names(result: Result) -> list[str]:
    """Names of the loadings, without the name of the family that they all belong to."""
    names = [str(name) for name in result.values("loads")]
    family = names[0].partition(": ")[0] + ": " if names else ""
    of_one = all(name.startswith(family) and name != family for name in names)
    return [name.removeprefix(family) for name in names] if of_one else names


def state(
    result: Result,
    joints: tuple[str, ...],
    members: tuple[str, ...],
    *,
    loading: str | None = None,
    time: float | None = None,
    at: str | None = None,
) -> State:
    """The state asked for, or the one that is usual: see `shapes.displaced`."""
    choices = {"loading": loading, "time": time, "at": at}
    own = {"history": "time", "equilibrium-path": "at"}.get(result.kind, "loading")
    wrong = [name for name, value in choices.items() if value is not None and name != own]
    if wrong:
        thing = {"time": "a time", "at": "a point of the path", "loading": "a loading"}[own]
        raise InputError(f'"{result.name}" ({result.kind}) has no choice "{wrong[0]}": choose {thing}')
    which: int | None = None
    if own == "time":
        place = _instant(result, time)
        words = f"at {result['time'][place]:.4g} s"
    elif own == "at":
        place, words = _point(result, at)
    else:
        which = place = loading_place(result, loading)
        words = loading_names(result)[place]
    moved = _in_order(result, "displacement", place, joints)
    force = _in_order(result, "axial_force", place, members)
    present = there(result, members, which)
    if "present" not in result and np.isfinite(force).any():
        present = np.asarray(np.isfinite(force))
    return State(words, moved, force, _slack(result, place, force, members), present, which)


def loading_place(result: Result, loading: str | None) -> int:
    """Place of a loading by its name, the first by default."""
    names = [str(name) for name in result.values("loads")]
    if loading is not None and loading not in names:
        raise UnknownName("loading", loading, names)
    return 0 if loading is None else names.index(loading)


def there(result: Result, members: tuple[str, ...], loading: int | None = None) -> NDArray[np.bool_]:
    """Which of the members named are there: in one of several loadings, or else in any.

    All are where the file does not say.
    """
    if "present" not in result:
        return np.ones(len(members), bool)
    stored = np.atleast_2d(result.values("present")) != 0
    row = stored.any(axis=0) if loading is None else stored[loading if len(stored) > 1 else 0]
    labels = result.labels("present", len(result.axes("present")) - 1)
    known = dict(zip(map(str, labels), row.tolist(), strict=True))
    return np.array([known.get(name, True) for name in members], bool)


def _instant(result: Result, time: float | None) -> int:
    stored = result.time
    if not len(stored):
        raise InputError(f'"{result.name}" has no stored step')
    if time is not None:
        return nearest(time, stored, "time", "s")
    if "peaks/displacement/max" not in result:
        return len(stored) - 1
    table = result.peak("displacement").ravel()
    low, high = int(np.nanargmin(table["min"])), int(np.nanargmax(table["max"]))
    row, when = (low, "time_of_min") if -table["min"][low] > table["max"][high] else (high, "time_of_max")
    return int(np.abs(stored - table[when][row]).argmin())


def critical_names(result: Result) -> tuple[str, ...]:
    """Names of the critical points of a path: its type and which of that type, such as "limit point 1"."""
    if "critical_points/type" not in result:
        return ()
    counts: dict[str, int] = {}
    names = []
    for kind in result.values("critical_points/type").tolist():
        counts[kind] = counts.get(kind, 0) + 1
        names.append(f"{kind} {counts[kind]}")
    return tuple(names)


def _point(result: Result, at: str | None) -> tuple[int, str]:
    """Step of a path at its end or nearest to a critical point, and what it is called."""
    factors = result.values("load_factor")
    if at in (None, "end"):
        return len(factors) - 1, f"at the end, load factor {figures(float(factors[-1]), 4)}"
    names = critical_names(result)
    if at not in names:
        raise UnknownName("point of the path", at, ("end", *names))
    which = names.index(at)
    found = result.values("critical_points/displacement")[which]
    away = np.nan_to_num(result.values("displacement") - found)
    step = int(np.linalg.norm(away.reshape(len(factors), -1), axis=1).argmin())
    return step, f"the step nearest to {at}, load factor {figures(float(factors[step]), 4)}"


def _in_order(result: Result, path: str, place: int, names: tuple[str, ...]) -> Array:
    """One row of a dataset for the joints or members named, NaN where it was not stored."""
    row: Array = np.asarray(result[path][place], dtype=float)
    labels = tuple(str(label) for label in result.labels(path, 1))
    if labels == names:
        return row
    index = {name: k for k, name in enumerate(names)}
    whole: Array = np.full((len(names), *row.shape[1:]), np.nan)
    there = [k for k, label in enumerate(labels) if label in index]
    whole[[index[labels[k]] for k in there]] = row[there]
    return whole


def _slack(result: Result, place: int, force: Array, members: tuple[str, ...]) -> Array:
    if "taut" in result and result["taut"].shape[1] == len(members):
        return np.asarray((result["taut"][place] == 0) & np.isfinite(force))
    ties = np.isin(members, [*_of_kind(result, "tension-only", "hanging")])
    struts = np.isin(members, [*_of_kind(result, "compression-only")])
    return np.asarray((ties & (force <= 0.0)) | (struts & (force >= 0.0)))


def _of_kind(result: Result, *kinds: str) -> set[str]:
    """Names of the members of some kinds, and of the pieces of such ropes."""
    given = zip(result.results.members, result.results.model("members/kind").tolist(), strict=True)
    names = {name for name, kind in given if kind in kinds}
    return names | {piece for rope, pieces in result.ropes.items() if rope in names for piece in pieces}
