"""One analysis of an open results file."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import h5py
import numpy as np
from numpy.typing import NDArray

from tautbar.errors import InputError, ResultsError
from tautbar.store.layout import UnknownName, given_name

if TYPE_CHECKING:
    from tautbar.store.reading import Results

Array = NDArray[Any]


class Result:
    """One analysis: its answer in words, its audit, and its arrays, read when asked for.

    ``result["axial_force"]`` is the dataset itself, to be sliced; the methods give the history of one
    joint or member (or its values over the loadings or modes). SI units throughout.
    """

    def __init__(self, group: h5py.Group, results: Results) -> None:
        self.group = group
        self.results = results
        self.name = given_name(group.name.rpartition("/")[2])

    def __repr__(self) -> str:
        return f"<Result {self.name!r}: {self.kind}, {self.status}>"

    def __getitem__(self, path: str) -> h5py.Dataset:
        """A dataset by its path in the analysis."""
        found = self.group.get(path)
        if not isinstance(found, h5py.Dataset):
            raise UnknownName(f'quantity of "{self.name}"', path, self.paths())
        return found

    def __contains__(self, path: object) -> bool:
        return isinstance(path, str) and isinstance(self.group.get(path), h5py.Dataset)

    def __iter__(self) -> Iterator[str]:
        """Paths of its datasets."""
        return iter(self.paths())

    def keys(self) -> tuple[str, ...]:
        """Paths of its datasets, as of a mapping."""
        return self.paths()

    def paths(self) -> tuple[str, ...]:
        """Paths of all datasets but the labels that analyses share."""
        return tuple(path for path in _walk(self.group) if path not in SHARED)

    @property
    def joints(self) -> tuple[str, ...]:
        """Names of the joints of this analysis: those of the model, and those between pieces of ropes."""
        return texts(self["joint_with_pieces"]) if "joint_with_pieces" in self else self.results.joints

    @property
    def members(self) -> tuple[str, ...]:
        """Names of the members of this analysis: pieces where it cut ropes into pieces."""
        return texts(self["member_with_pieces"]) if "member_with_pieces" in self else self.results.members

    @property
    def ropes(self) -> Mapping[str, tuple[str, ...]]:
        """Names of the pieces of each rope in pieces, whether the model or the analysis cut it."""
        pieces: dict[str, list[str]] = {}
        for name in self.members if "member_with_pieces" in self else ():
            rope = name.rpartition(".")[0]
            if rope in self.results.members and name not in self.results.members:
                pieces.setdefault(rope, []).append(name)
        return {**self.results.ropes, **{rope: tuple(names) for rope, names in pieces.items()}}

    def members_of(self, name: str) -> tuple[str, ...]:
        """Names of the members of a group or the pieces of a rope; none where it is neither.

        A rope in a group stands under its own name.
        """
        return self.ropes.get(name, ()) or self.results.groups.get(name, ())

    @property
    def kind(self) -> str:
        """Kind of the analysis, such as "history"."""
        return self._word("kind")

    @property
    def status(self) -> str:
        """One of "complete", "failed", "interrupted" and "not run"."""
        return self._word("status")

    @property
    def outcome(self) -> str:
        """The answer in words."""
        return self._word("outcome")

    @property
    def measured_from(self) -> str:
        """What displacement is measured from."""
        return self._word("measured_from")

    @property
    def wall_time(self) -> float:
        """Time it took [s]."""
        return float(self.group.attrs["wall_time"])

    @property
    def acting(self) -> tuple[str, ...]:
        """What acts, in words."""
        return texts(self.group.attrs["acting"])

    @property
    def audit_lines(self) -> tuple[str, ...]:
        """The audit in words."""
        return texts(self.group.attrs["audit_lines"])

    @property
    def warnings(self) -> tuple[str, ...]:
        """What the engineer should know."""
        return texts(self.group.attrs["warnings"])

    @property
    def sources(self) -> tuple[str, ...]:
        """Published sources of the methods used."""
        return texts(self.group.attrs["sources"])

    @property
    def settings(self) -> Mapping[str, Any]:
        """The settings it ran with."""
        settings: Mapping[str, Any] = json.loads(self._word("settings"))
        return settings

    @property
    def audit(self) -> dict[str, Any]:
        """Numbers of the audit: a plain number, or an array over the loadings or modes."""
        group = self.group.get("audit", {})
        names = [name for name in group if not group[name].is_scale]
        return {name: read(group[name]) for name in names}

    @property
    def time(self) -> Array:
        """Time of each stored step, (T,) [s]."""
        return self.values("time")

    def values(self, path: str) -> Array:
        """All of a dataset, in memory; text as strings."""
        return np.asarray(read(self[path]))

    def labels(self, path: str, axis: int) -> tuple[Any, ...]:
        """What the places along an axis of a dataset are called."""
        if self[path].is_scale:  # the names themselves
            return tuple(self.values(path).tolist())
        return tuple(np.asarray(read(self[path].dims[axis][0])).tolist())

    def axes(self, path: str) -> tuple[str, ...]:
        """Names of the axes of a dataset.

        Axes over a part of the joints or members, or over pieces of ropes too, are called "joint" and
        "member" all the same.
        """
        dataset = self[path]
        labels = [dataset] if dataset.is_scale else [axis[0] for axis in dataset.dims]
        names = (label.name.rpartition("/")[2] for label in labels)
        return tuple(name.removeprefix("stored_").removesuffix("_with_pieces") for name in names)

    def at(self, path: str, **places: str) -> Array:
        """Values of a dataset at a named place along one or more axes: ``at("shape", joint="C")``."""
        axes = self.axes(path)
        pick: list[Any] = [slice(None)] * len(axes)
        for axis, name in places.items():
            if axis not in axes:
                raise InputError(f'"{path}" of "{self.name}" has no axis "{axis}", only {", ".join(axes)}')
            pick[axes.index(axis)] = self._place(path, axes.index(axis), axis, name)
        return np.asarray(read(self[path], tuple(pick)))

    def _place(self, path: str, axis: int, thing: str, name: str) -> int:
        labels = self.labels(path, axis)
        if name in labels:
            return labels.index(name)
        if thing == "member" and (several := self.members_of(name)):
            raise InputError(_is_several(name, several, name in self.ropes))
        if name in getattr(self.results, thing + "s", ()):
            raise InputError(f'{thing} "{name}" is in the model, but "{self.name}" did not store it')
        raise UnknownName(thing, name, map(str, labels))

    def axial_force(self, member: str) -> Array:
        """Axial force of a member [N], tension positive, over the times or loadings."""
        return self.at("axial_force", member=member)

    def displacement(self, joint: str) -> Array:
        """Displacement of a joint, (..., 3) [m], over the times or loadings."""
        return self.at("displacement", joint=joint)

    def velocity(self, joint: str) -> Array:
        """Velocity of a joint, (times, 3) [m/s]."""
        return self.at("velocity", joint=joint)

    def acceleration(self, joint: str) -> Array:
        """Acceleration of a joint, (times, 3) [m/s2]."""
        return self.at("acceleration", joint=joint)

    def reaction(self, joint: str) -> Array:
        """Force of the support on a joint, (..., 3) [N], over the times or loadings."""
        return self.at("reaction", joint=joint)

    def shape(self, joint: str) -> Array:
        """Displacement of a joint in each mode, (modes, 3)."""
        return self.at("shape", joint=joint)

    def peak(self, quantity: str) -> Array:
        """Extremes of a quantity over every computed step of a history.

        A structured array with one row for each member, or for each joint and direction: ``member``
        (or ``joint`` and ``direction``), ``min``, ``time_of_min``, ``max``, ``time_of_max``.
        """
        known = self.group.get("peaks", {})
        if not known and "envelope/max" in self:
            raise InputError(
                f'"{self.name}" is {self.kind} and has no peaks in time; its extremes over the loadings are '
                'in values("envelope/min") and values("envelope/max"), one number a member'
            )
        if quantity not in known or not isinstance(known[quantity], h5py.Group):
            raise UnknownName(
                f'peaks in "{self.name}" of', quantity, (k for k in known if isinstance(known[k], h5py.Group))
            )
        path = f"peaks/{quantity}/"
        axes = self.axes(path + "min")
        labels = np.meshgrid(*(self.labels(path + "min", k) for k in range(len(axes))), indexing="ij")
        columns = {axis: label.ravel() for axis, label in zip(axes, labels, strict=True)}
        columns |= {name: self.values(path + name).ravel() for name in PEAK_COLUMNS}
        return _table(columns)

    @property
    def slack_episodes(self) -> Array:
        """When each tie was slack and how hard it snatched.

        A structured array with the columns ``member``, ``start`` [s], ``end`` [s], ``snatch_force`` [N]
        and ``time_of_snatch`` [s]; the last three are not a number where it was slack to the end.
        """
        names = np.array(self.members, dtype=str)
        columns = {"member": names[self.values("slack/member")]}
        stored = (name for name in SLACK_COLUMNS if f"slack/{name}" in self)  # older files lack a time
        return _table(columns | {name: self.values(f"slack/{name}") for name in stored})

    def _word(self, key: str) -> str:
        return str(self.group.attrs[key])


SHARED = ("joint", "member", "direction", "end")
PEAK_COLUMNS = ("min", "time_of_min", "max", "time_of_max")
SLACK_COLUMNS = ("start", "end", "snatch_force", "time_of_snatch")
MOST_LISTED = 40  # members named in a message


def _is_several(name: str, several: Sequence[str], rope: bool) -> str:
    what = f"a rope in {len(several)} pieces" if rope else f"a group of {len(several)} members"
    more = f" and {len(several) - MOST_LISTED} more" if len(several) > MOST_LISTED else ""
    return f'"{name}" is {what}, not one member; name one of {", ".join(several[:MOST_LISTED])}{more}'


def texts(stored: Any) -> tuple[str, ...]:
    """Strings of a dataset or an attribute."""
    values = stored.asstr()[:] if isinstance(stored, h5py.Dataset) else np.atleast_1d(stored)
    return tuple(str(value) for value in values.tolist())


def read(dataset: h5py.Dataset, pick: Any = ()) -> Any:
    """Read from a dataset, text as strings. Raises ResultsError if what is stored was changed."""
    try:
        if h5py.check_string_dtype(dataset.dtype):
            return np.asarray(dataset.asstr()[pick], dtype=str)
        return dataset[pick]
    except (OSError, RuntimeError) as wrong:
        raise ResultsError(f"{dataset.file.filename}: {dataset.name} is damaged ({wrong})") from None


def _walk(group: h5py.Group, above: str = "") -> Iterator[str]:
    """Paths of the datasets of a group; below the top without the labels of axes."""
    for name, thing in group.items():
        if isinstance(thing, h5py.Group):
            yield from _walk(thing, f"{above}{name}/")
        elif not (above and thing.is_scale):
            yield above + name


def _table(columns: Mapping[str, Array]) -> Array:
    kinds = [(name, values.dtype) for name, values in columns.items()]
    table = np.empty(len(next(iter(columns.values()))), dtype=kinds)
    for name, values in columns.items():
        table[name] = values
    return table
