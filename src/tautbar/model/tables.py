"""CSV tables of joints, members and pulses: columns of cells, every bad one noted with its row."""

from __future__ import annotations

import csv
import math
from array import array
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field

from tautbar.model import spec as s
from tautbar.model.checking import NOTES, Checker, meant, out_of_bounds
from tautbar.model.mistakes import near, nearest
from tautbar.model.positions import Path
from tautbar.model.source import bare_name, rows_of, separator_of
from tautbar.units import BadQuantity, unit

_SHOWN = 20  # bad cells of one column that are named one by one
NAN = float("nan")


@dataclass
class Columns:
    """The columns of a table, one value for each of its good rows.

    Cells of text are stripped, "" where empty; numbers are in SI, NaN where empty. ``rows`` are the
    positions of the good rows in the file, the first below the heads being 0.
    """

    path: Path
    rows: list[int] = field(default_factory=list)
    heads: dict[str, str] = field(default_factory=dict)
    text: dict[str, list[str]] = field(default_factory=dict)
    numbers: dict[str, array[float]] = field(default_factory=dict)

    def place(self, row: int, column: str = "") -> Path:
        """Path of a cell, for messages."""
        cell = (self.heads[column],) if column in self.heads else ()
        return (*self.path, self.rows[row], *cell)


def read_columns(c: Checker, text: str, wanted: Mapping[str, s.Spec], path: Path) -> Columns:
    """Read a table whose columns are described by ``wanted``."""
    heads, separator = separator_of(text)
    columns = Columns(path)
    names = _check_heads(c, heads, wanted, path)
    try:
        rows = rows_of(text, separator)
    except csv.Error as error:
        c.wrong(path, f"the file cannot be read as a table: {error}")
        return columns
    width = len(heads)
    bad = [i for i, row in enumerate(rows) if row and len(row) != width]
    _note(c, bad, lambda i: (*path, i), lambda i: f"{len(rows[i])} cells, {width} are wanted")
    columns.rows = [i for i, row in enumerate(rows) if len(row) == width]
    cells = list(zip(*(rows[i] for i in columns.rows), strict=True)) or [()] * width
    for name, position in names.items():
        columns.heads[name] = heads[position]
        _read_column(c, columns, name, wanted[name], cells[position])
    return columns


def _check_heads(c: Checker, heads: list[str], wanted: Mapping[str, s.Spec], path: Path) -> dict[str, int]:
    found: dict[str, int] = {}
    missing = [name for name, of in wanted.items() if of.required]
    for position, head in enumerate(heads):
        name = bare_name(head)
        if name in found:
            c.wrong((*path, -1, head), f"there are two columns '{name}'")
        elif name in wanted:
            found[name] = position
        elif name not in NOTES:
            c.wrong((*path, -1, head), f"there is no column '{name}' here", near(name, wanted))
            missing = [column for column in missing if column != nearest(name, wanted)]
    for name in missing:
        if name not in found:
            c.wrong(
                (*path, -1), f"column '{name}' is missing", "columns: " + ", ".join(map(bare_name, heads))
            )
    return found


def _read_column(c: Checker, columns: Columns, name: str, of: s.Spec, cells: tuple[str, ...]) -> None:
    if isinstance(of, s.Quantity):
        columns.numbers[name] = _numbers(c, columns, name, of, cells)
    elif isinstance(of, s.Count):
        columns.numbers[name] = _counts(c, columns, name, of, cells)
    else:
        columns.text[name] = _texts(c, columns, name, of, cells)


def _texts(c: Checker, columns: Columns, name: str, of: s.Spec, cells: tuple[str, ...]) -> list[str]:
    stripped = [cell.strip() for cell in cells]
    if of.required:
        empty = [i for i, cell in enumerate(stripped) if not cell]
        _note(c, empty, lambda i: columns.place(i, name), lambda i: "the cell is empty")
    if isinstance(of, s.Text) and of.is_name:
        strange = [
            i for i, cell in enumerate(stripped) if not cell.isprintable() or "*" in cell or "?" in cell
        ]
        _note(c, strange, lambda i: columns.place(i, name), lambda i: f"'{stripped[i]}' is no name")
    if isinstance(of, s.Text) and of.choices:
        default = str(of.default or "")
        stripped = [cell or default for cell in stripped]
        strange = [i for i, cell in enumerate(stripped) if cell not in of.choices]
        _note(
            c,
            strange,
            lambda i: columns.place(i, name),
            lambda i: f"'{stripped[i]}' is not one of the words known here ({meant(of, stripped[i])})",
        )
    return stripped


def _numbers(c: Checker, columns: Columns, name: str, of: s.Quantity, cells: tuple[str, ...]) -> array[float]:
    factor = _factor(c, columns, name, of)
    try:
        values = array("d", map(float, cells))
        if factor != 1.0:
            values = array("d", [v * factor for v in values])
        if all(map(math.isfinite, values)) and _all_within(of, values):
            return values
    except ValueError:
        pass  # an empty cell, a quantity with its own unit, or a mistake: look at each
    problems: dict[int, str] = {}
    values = array("d", [NAN]) * len(cells)
    for i, cell in enumerate(cells):
        try:
            values[i] = _number(c, of, cell.strip(), factor)
        except BadQuantity as error:
            problems[i] = str(error)
    _note(c, problems, lambda i: columns.place(i, name), problems.__getitem__)
    return values


def _all_within(of: s.Quantity, values: array[float]) -> bool:
    return not values or not (out_of_bounds(of, min(values), "") or out_of_bounds(of, max(values), ""))


def _number(c: Checker, of: s.Quantity, cell: str, factor: float) -> float:
    if not cell:
        if of.required:
            raise BadQuantity("the cell is empty")
        return NAN
    try:
        value = float(cell) * factor
    except ValueError:
        value = c.units.read(cell, of.dimension)
    if not math.isfinite(value):
        raise BadQuantity(f"a finite value is wanted, not {cell}")
    problem = out_of_bounds(of, value, cell)
    if problem:
        raise BadQuantity(problem)
    return value


def _factor(c: Checker, columns: Columns, name: str, of: s.Quantity) -> float:
    """SI value of one in this column: by the unit in its head, else by the model's units."""
    head = columns.heads[name]
    if "[" not in head:
        return c.units.factor(of.dimension)
    try:
        factor, dimension = unit(head[head.index("[") + 1 :].rstrip("] "))
        if dimension == of.dimension.exponents:
            return factor
        c.wrong(
            (*columns.path, -1, head), f"the unit in '{head}' does not fit: {of.dimension.name} is wanted"
        )
    except BadQuantity as error:
        c.wrong((*columns.path, -1, head), str(error))
    return 1.0


def _counts(c: Checker, columns: Columns, name: str, of: s.Count, cells: tuple[str, ...]) -> array[float]:
    most = of.at_most if of.at_most is not None else math.inf
    values = array("d", [NAN]) * len(cells)
    bad = []
    for i, cell in enumerate(cells):
        if not cell.strip():
            continue
        try:
            values[i] = int(cell)
        except ValueError:
            bad.append(i)
            continue
        if not of.at_least <= values[i] <= most:
            bad.append(i)
    wanted = f"a whole number from {of.at_least} to {most:g} is wanted"
    _note(c, bad, lambda i: columns.place(i, name), lambda i: f"{wanted}, not '{cells[i]}'")
    return values


def _note(c: Checker, bad: Iterable[int], place: Callable[[int], Path], what: Callable[[int], str]) -> None:
    """Note bad cells one by one, and only how many more there are of them after the first few."""
    numbers = list(bad)
    for i in numbers[:_SHOWN]:
        c.wrong(place(i), what(i))
    if len(numbers) > _SHOWN:
        c.wrong(
            place(numbers[_SHOWN]), f"{what(numbers[_SHOWN])}; {len(numbers) - _SHOWN - 1} more rows like it"
        )
