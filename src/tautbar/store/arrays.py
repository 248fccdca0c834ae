"""Fields as datasets, with a dimension scale on every axis."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterable, Mapping
from typing import Any

import h5py
import numpy as np

from tautbar.records.fields import Field

TEXT = h5py.string_dtype("utf-8")
COUNT_FROM = {"mode": 1}  # everything else is counted from 0


def put(group: h5py.Group, path: str, values: Any, unit: str, long_name: str) -> h5py.Dataset:
    """Write one array with its unit and long name. Yes and no become 1 and 0, text UTF-8."""
    array = np.asarray(values)
    if array.dtype.kind in "UO":
        dataset = group.create_dataset(path, data=array.astype(object), dtype=TEXT)
    elif array.dtype.kind == "b":
        dataset = group.create_dataset(path, data=array.astype(np.int8))
        dataset.attrs["flag_values"] = np.array([0, 1], dtype=np.int8)
        dataset.attrs["flag_meanings"] = "no yes"
    else:
        dataset = group.create_dataset(path, data=array)
    describe(dataset, unit, long_name)
    return dataset


def describe(dataset: h5py.Dataset, unit: str, long_name: str) -> None:
    """Give a dataset its unit and long name."""
    dataset.attrs["units"] = unit
    dataset.attrs["long_name"] = long_name


def put_scale(group: h5py.Group, name: str, values: Any, unit: str, long_name: str) -> h5py.Dataset:
    """Write a dimension scale."""
    scale = put(group, name, values, unit, long_name)
    scale.make_scale(name)
    return scale


def attach(dataset: h5py.Dataset, axes: Iterable[str]) -> None:
    """Attach the scale of each axis of a dataset.

    A scale is looked for in the dataset's group and then in those above it, and takes part if it is
    as long as the axis; one found above is linked into the group, where readers that look at one
    group alone find it. Where there is none, the places are counted.
    """
    names = tuple(axes)
    if len(names) != dataset.ndim:
        raise ValueError(f"{dataset.name}: {dataset.ndim} axes, but names {names}")
    for k, name in enumerate(names):
        if dataset.name.rpartition("/")[2] == name and dataset.is_scale:
            continue
        dataset.dims[k].attach_scale(_scale(dataset.parent, name, dataset.shape[k]))


def _scale(group: h5py.Group, name: str, length: int) -> h5py.Dataset:
    here = group
    while True:
        found = here.get(name)
        if isinstance(found, h5py.Dataset) and found.is_scale and found.shape == (length,):
            if name not in group:
                group[name] = found
            return found
        if here.name == "/":
            break
        here = here.parent
    if name in group:
        raise ValueError(f'{group.name}: axis "{name}" has {length} places, its scale {group[name].shape}')
    first = COUNT_FROM.get(name, 0)
    values = np.arange(first, first + length)
    return put_scale(group, name, values, "1", f"{name}, counted from {first}")


def write_fields(group: h5py.Group, fields: Mapping[str, Field]) -> None:
    """Write all values, then name the axes: a scale may come after what it labels."""
    for path, field in fields.items():
        dataset = put(group, path, field.values, field.unit, field.long_name)
        if field.axes == (path.rpartition("/")[2],):
            dataset.make_scale(field.axes[0])
    for path, field in fields.items():
        attach(group[path], field.axes)


def room_for(fields: Iterable[Field]) -> int:
    """Bytes that fields take in the file, with plenty for names and texts."""
    return sum(2 * field.values.nbytes + 1024 for field in fields)


def text_list(lines: Iterable[str]) -> Any:
    """Lines as the value of an attribute."""
    lines = list(lines)
    return np.array(lines, dtype=object).astype(TEXT) if lines else np.empty(0, dtype=TEXT)


def as_json(value: object) -> str:
    """Settings as the value of an attribute."""
    return json.dumps(value, ensure_ascii=False, default=_plain)


def _plain(value: object) -> object:
    conversion: Callable[[], object] | None = getattr(value, "tolist", None)
    if conversion is not None:
        return conversion()
    return dict(value) if isinstance(value, Mapping) else str(value)
