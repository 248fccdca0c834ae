"""The answers of one analysis as plain numbers for scripts: SI, with the unit in each key."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tautbar.store import Result
from tautbar.store.result import texts
from tautbar.views.envelopes import envelope
from tautbar.views.states import critical_names

Array = NDArray[Any]
Data = dict[str, Any]
SUFFIX = {  # of a key, by the unit in the file
    "1": "",
    "m": "_m",
    "N": "_n",
    "J": "_j",
    "s": "_s",
    "kg": "_kg",
    "Hz": "_hz",
    "rad": "_rad",
    "m/s": "_m_per_s",
    "m/s2": "_m_per_s2",
    "N/m": "_n_per_m",
    "K": "_k",
    "rad2/s2": "_rad2_per_s2",
    "kg^0.5": "_sqrt_kg",
}
ENERGIES = ("event_work", "damped", "dissipated_by_method")


def numbers(result: Result) -> Data:
    """What an analysis found, by key; only what the file holds."""
    found: Data = {}
    parts = (_loadings, _modes, _buckling, _path, _peaks, _slack, _energy, _lengths, _cut_list, _forces)
    for part in parts:
        found |= part(result)
    return found


def audit_numbers(result: Result) -> Data:
    """Numbers of the audit by name and unit: plain ones, or lists over loadings, modes or steps."""
    return {_key(result, f"audit/{name}"): plain(values) for name, values in result.audit.items()}


def plain(value: Any) -> Any:
    """Data that JSON can hold; what is not a number becomes None."""
    if isinstance(value, Mapping):
        return {str(key): plain(part) for key, part in value.items()}
    if isinstance(value, np.ndarray | np.generic):
        return plain(value.tolist())
    if isinstance(value, list | tuple):
        return [plain(part) for part in value]
    return None if isinstance(value, float) and not np.isfinite(value) else value


def _key(result: Result, path: str) -> str:
    unit = str(result[path].attrs["units"])
    return path.rpartition("/")[2] + SUFFIX.get(unit, "_" + "".join(c if c.isalnum() else "_" for c in unit))


def _largest(values: Array) -> int | None:
    """Place of the largest number in a flat array, None where there is none."""
    flat = np.where(np.isfinite(values), values, -np.inf).ravel()
    place = int(flat.argmax()) if flat.size else 0
    return place if flat.size and np.isfinite(flat[place]) else None


def _most_moved(result: Result, path: str, moved: Array) -> Data | None:
    """The largest component of displacement (J, 3): joint, direction and value."""
    place = _largest(np.abs(moved))
    if place is None:
        return None
    joint, axis = divmod(place, moved.shape[1])
    names = result.labels(path, len(result.axes(path)) - 2)
    return {"joint": str(names[joint]), "direction": "xyz"[axis], "value_m": float(moved[joint, axis])}


def _pulls(members: Iterable[Any], force: Array) -> Data:
    """Members with the greatest tension and compression (N,), None where nothing pulls or pushes."""
    names = [str(name) for name in members]
    found: Data = {}
    for word, values in (("tension", force), ("compression", -force)):
        place = _largest(values)
        some = place is not None and values[place] > 0.0
        found[f"greatest_{word}"] = (
            {"member": names[place], "value_n": float(values[place])} if some and place is not None else None
        )
    return found


def _loadings(result: Result) -> Data:
    """One entry a loading of a static analysis, or of one that ends in such a state."""
    if "loads" not in result or "displacement" not in result:
        return {}
    return {"loadings": [_loading(result, k) for k in range(len(result["loads"]))]}


def _loading(result: Result, place: int) -> Data:
    force = np.asarray(result["axial_force"][place], dtype=float)
    members = [str(name) for name in result.labels("axial_force", 1)]
    found: Data = {"name": str(result.values("loads")[place])}
    if "converged" in result:
        found["converged"] = bool(result["converged"][place])
    moved = np.asarray(result["displacement"][place], dtype=float)
    found["greatest_displacement"] = _most_moved(result, "displacement", moved)
    found |= _pulls(members, force)
    if "taut" in result:
        found |= _slack_of(result, place, members, force)
    if "reaction" in result:
        found["reaction_sum_n"] = plain(np.asarray(result["reaction"][place], dtype=float).sum(axis=0))
    return found | {
        _key(result, f"audit/{name}"): plain(values[place])
        for name, values in result.audit.items()
        if np.ndim(values) == 1 and result.axes(f"audit/{name}") == ("loading",)
    }


def _slack_of(result: Result, place: int, members: list[str], force: Array) -> Data:
    """Members slack in a loading, with how much too long they are and when they went slack."""
    slack = np.flatnonzero((np.asarray(result["taut"][place]) == 0) & np.isfinite(force))
    found: Data = {"slack_members": [members[k] for k in slack.tolist()]}
    for path, key in (("loose_length", "loose_length_m"), ("slack_onset", "slack_onset_load_factor")):
        if path in result:
            values = np.asarray(result[path][place], dtype=float)
            found[key] = {members[k]: plain(values[k]) for k in slack.tolist()}
    return found


def _modes(result: Result) -> Data:
    if "frequency" not in result or "effective_mass" not in result:
        return {"frequency_hz": plain(result.values("frequency"))} if "frequency" in result else {}
    frequency, mass = result.values("frequency"), result.values("effective_mass")
    modes = [
        {"mode": k + 1, "frequency_hz": plain(frequency[k]), "effective_mass_kg": plain(mass[k])}
        for k in range(len(frequency))
    ]
    if "kinetic_energy_share" in result:
        groups = [str(group) for group in result.labels("kinetic_energy_share", 1)]
        for row, shares in zip(modes, result.values("kinetic_energy_share"), strict=True):
            row["kinetic_energy_share"] = dict(zip(groups, plain(shares), strict=True))
    found: Data = {"frequency_hz": plain(frequency), "modes": modes}
    if "free_mass" in result:
        found["free_mass_kg"] = plain(result.values("free_mass"))
    return found


def _buckling(result: Result) -> Data:
    found = result.kind == "buckling" and "load_factor" in result
    return {"load_factor": plain(result.values("load_factor"))} if found else {}


def _path(result: Result) -> Data:
    """Range and end of a path, and its critical points."""
    if result.kind != "equilibrium-path" or "load_factor" not in result or not len(result["load_factor"]):
        return {}
    factors = result.values("load_factor")
    moved = np.asarray(result["displacement"][-1], dtype=float)
    found: Data = {
        "steps": len(factors) - 1,
        "greatest_load_factor": plain(factors.max()),
        "least_load_factor": plain(factors.min()),
        "end": {
            "load_factor": plain(factors[-1]),
            "greatest_displacement": _most_moved(result, "displacement", moved),
            **_pulls(result.labels("axial_force", 1), np.asarray(result["axial_force"][-1], dtype=float)),
        },
        "critical_points": [],
    }
    for k, name in enumerate(critical_names(result)):
        at = "critical_points/displacement"
        found["critical_points"].append(
            {
                "name": name,
                "type": name.rpartition(" ")[0],
                "load_factor": plain(result["critical_points/load_factor"][k]),
                "greatest_displacement": _most_moved(result, at, np.asarray(result[at][k], dtype=float)),
            }
        )
    return found


def _peaks(result: Result) -> Data:
    """Least and greatest of each quantity of a history, with where and when."""
    group = result.group.get("peaks", {})
    quantities = [name for name in group if f"peaks/{name}/max" in result]
    found = {name: _peak(result, name) for name in quantities}
    return {"peaks": found} if found else {}


def _peak(result: Result, quantity: str) -> Data:
    table = result.peak(quantity)
    suffix = _key(result, f"peaks/{quantity}/max").removeprefix("max")
    found: Data = {}
    for word, end, sign in (("least", "min", -1.0), ("greatest", "max", 1.0)):
        place = _largest(sign * table[end])
        found[word] = None
        if place is not None:
            where = {name: str(table[name][place]) for name in (table.dtype.names or ())[:-4]}
            when = plain(table[f"time_of_{end}"][place])
            found[word] = {**where, f"value{suffix}": plain(table[end][place]), "time_s": when}
    return found


def _slack(result: Result) -> Data:
    """Slack episodes of a history, and the share of the time of each member that was slack."""
    if "slack/member" not in result:
        return {}
    rows = result.slack_episodes
    keys = {"start": "start_s", "end": "end_s", "snatch_force": "snatch_force_n"}
    columns = rows.dtype.names or ()
    names = [keys.get(name, name + "_s" * name.startswith("time")) for name in columns]
    found: Data = {"slack": [dict(zip(names, map(plain, row), strict=True)) for row in rows.tolist()]}
    if "slack_share" in result:
        shares = zip(result.labels("slack_share", 0), result.values("slack_share").tolist(), strict=True)
        found["slack_share_of_time"] = {str(name): share for name, share in shares if share > 0.0}
    return found


def _energy(result: Result) -> Data:
    if "energy/time" not in result or not len(result["energy/time"]):
        return {}
    found = {f"{name}_j": plain(result["energy/" + name][-1]) for name in ENERGIES}
    left = np.abs(result.values("energy/unaccounted"))
    return {
        "energy": {
            "greatest_kinetic_j": plain(result.values("energy/kinetic").max()),
            **found,
            "greatest_left_over_j": plain(left.max()),
        }
    }


def _lengths(result: Result) -> Data:
    """Unstressed lengths and positions that were found, and how far targets were missed."""
    found: Data = {}
    for path in ("unstressed_length", "force_density", "position"):
        if path in result:
            names = [str(name) for name in result.labels(path, 0)]
            found[_key(result, path)] = dict(zip(names, plain(result.values(path)), strict=True))
    if "target_name" in result:
        misses = [path for path in ("target_miss", "tension_miss", "position_miss") if path in result]
        columns = {_key(result, path): plain(result.values(path)) for path in misses}
        found["targets"] = _table({"name": plain(result.values("target_name")), **columns})
    if "level_name" in result:
        names, values = plain(result.values("level_name")), plain(result.values("level"))
        found["level_n"] = dict(zip(names, values, strict=True))
    return found


def _cut_list(result: Result) -> Data:
    """How lengths are to be marked, and the tension of each line at several temperatures."""
    group = result.group.get("cut_list", {})
    columns = {
        _key(result, f"cut_list/{name}"): plain(values[()] if values.dtype.kind != "O" else texts(values))
        for name, values in group.items()
        if values.ndim == 1 and not values.is_scale and name != "member"
    }
    found: Data = {"cut_list": _table(columns)} if columns else {}
    if "setting_table/tension" in result and "cut_list/name" in result:
        names = texts(result["cut_list/name"])
        found["setting_table"] = {
            "temperature_k": plain(result.values("setting_table/temperature")),
            "tension_n": dict(zip(names, plain(result.values("setting_table/tension")), strict=True)),
        }
    return found


def _table(columns: Mapping[str, list[Any]]) -> list[Data]:
    return [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]


def _forces(result: Result) -> Data:
    """Range of axial force of each member."""
    if "axial_force" not in result:
        return {}
    whole = envelope(result)
    rows = zip(whole.members, plain(whole.low), plain(whole.high), strict=True)
    return {"axial_force_n": {name: {"least": low, "greatest": high} for name, low, high in rows}}
