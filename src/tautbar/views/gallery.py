"""The plots there are: what each shows, what it needs, and the figure around it."""

from __future__ import annotations

import textwrap
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from tautbar.errors import InputError
from tautbar.store import Result, Results
from tautbar.store.layout import UnknownName
from tautbar.views import envelopes, mechanism, paths, ropes, sensitivity, shapes, slackness, traces
from tautbar.views.drawing import Size
from tautbar.views.style import TENSION, styled


def _plain(result: Result, choices: Mapping[str, Any]) -> Size:
    return (7.2, 5.2)


@dataclass(frozen=True, slots=True)
class Plot:
    """One plot: a function that takes an Axes and a Result, and what it can be drawn from.

    A plot with two ``panels`` (their shares of the height) is given the lower one as ``below``.
    """

    draw: Callable[..., Any]
    shows: str
    needs: tuple[str, ...] = ()  # datasets
    choices: tuple[str, ...] = ()
    size: Callable[[Result, Mapping[str, Any]], Size] = _plain
    panels: tuple[float, ...] = (1.0,)
    fits: Callable[[Result], bool] = lambda result: True

    def suits(self, result: Result) -> bool:
        """Whether the result holds what it needs."""
        return all(path in result for path in self.needs) and self.fits(result)


def _by_bars(result: Result, choices: Mapping[str, Any]) -> Size:
    rows = min(len(envelopes.bars(result, choices.get("member"))), envelopes.MOST_ROWS)
    return (7.2, 1.6 + 0.17 * max(rows, 8))


def _by_spells(result: Result, choices: Mapping[str, Any]) -> Size:
    rows = min(len(slackness.spells(result, choices.get("member"))), slackness.MOST_ROWS)
    return (7.2, 1.8 + 0.22 * max(rows, 4))


PLOTS: Mapping[str, Plot] = {
    "structure": Plot(
        shapes.structure,
        "joints and members as the model puts them",
        choices=("view",),
        size=shapes.page,
    ),
    "displaced": Plot(
        shapes.displaced,
        "displaced shape, coloured by axial force",
        ("displacement", "axial_force"),
        ("loading", "time", "at", "scale", "view"),
        size=shapes.page_with_colours,
    ),
    "mode": Plot(
        shapes.mode, "shape of a mode", ("shape",), ("mode", "scale", "view"), shapes.page_with_swing
    ),
    "history": Plot(
        traces.history,
        "a joint, member or group over time, with its peaks",
        ("time", "displacement"),
        ("joint", "member", "quantity"),
    ),
    "forces": Plot(
        envelopes.forces,
        "range of axial force of each member or group",
        ("axial_force",),
        ("member",),
        _by_bars,
    ),
    "slack": Plot(slackness.slack, "when members were slack", ("slack/member",), ("member",), _by_spells),
    "energy": Plot(traces.energy, "energy ledger", ("energy/time",)),
    "path": Plot(
        paths.path,
        "load factor against a displacement, critical points",
        ("load_factor", "displacement"),
        ("joint", "direction"),
    ),
    "mechanism": Plot(
        mechanism.mechanism,
        "what moves in the drawing without stretching members",
        choices=("mode", "scale", "view"),
        size=mechanism.page,
        fits=mechanism.has_mechanism,
    ),
    "rope-curve": Plot(
        ropes.rope_curve,
        "hanging members from the side, with sag and tensions",
        ("rope_curve/position", "loads"),
        ("member", "loading"),
        size=lambda result, choices: (7.2, 7.0),
        panels=(2.0, 1.0),
    ),
    "sensitivity": Plot(
        sensitivity.sensitivity,
        "frequencies and tensions against pretension",
        ("frequency", "shape"),
        ("member", "mode"),
        size=lambda result, choices: (7.2, 7.6),
        panels=(3.0, 2.0),
        fits=lambda result: len(sensitivity.levels(result)) > 1,
    ),
}


def plots_of(result: Result) -> dict[str, str]:
    """The plots a result can give, and what each shows."""
    return {what: plot.shows for what, plot in PLOTS.items() if plot.suits(result)}


def list_plots(results: Results) -> str:
    """The plots a results file can give, as text: analysis, plot, what it shows, its choices."""
    lines = []
    for name, result in results.items():
        lines.append(f"{name} ({result.kind}, {result.status})")
        for what, shows in plots_of(result).items():
            choices = "".join(f" --{choice}" for choice in PLOTS[what].choices if _has(result, choice))
            lines.append(f"  {what:<11} {shows}" + (f" [{choices.strip()}]" if choices else ""))
    return "\n".join(lines)


def _has(result: Result, choice: str) -> bool:
    """Whether there is something to choose from."""
    kinds = {"time": "history", "at": "equilibrium-path"}
    return "loads" in result if choice == "loading" else result.kind == kinds.get(choice, result.kind)


def draw(result: Result, what: str, **choices: Any) -> Figure:
    """Draw one plot of a result.

    Parameters
    ----------
    result
        An analysis of an open results file.
    what
        The plot; `plots_of` gives those there are.
    **choices
        ``joint``, ``direction``, ``member``, ``quantity``, ``mode``, ``loading``, ``time`` [s], ``at``,
        ``scale``, ``view``: each plot takes some of them.

    Raises
    ------
    InputError
        If there is no such plot, it cannot be drawn from this result, or a choice is not one of its.
    """
    plot = _plot(result, what)
    unknown = sorted(set(choices) - set(plot.choices))
    if unknown:
        known = ", ".join(plot.choices) or "none"
        raise InputError(f'plot "{what}" has no choice "{unknown[0]}" (its choices: {known})')
    with styled():
        figure = Figure(figsize=plot.size(result, choices), layout="constrained")
        FigureCanvasAgg(figure)
        if result.status != "complete":
            _warn(figure, result)
        axes, *lower = figure.subplots(len(plot.panels), height_ratios=plot.panels, squeeze=False)[:, 0]
        plot.draw(axes, result, **({"below": lower[0]} if lower else {}), **choices)
    return figure


def _plot(result: Result, what: str) -> Plot:
    if what not in PLOTS:
        raise UnknownName("plot", what, PLOTS)
    if not PLOTS[what].suits(result):
        raise InputError(
            f'"{result.name}" ({result.kind}, {result.status}) cannot give the plot "{what}"; '
            f"it can give {', '.join(plots_of(result))}"
        )
    return PLOTS[what]


def _warn(figure: Figure, result: Result) -> None:
    """Say above the plot that it shows no finished result."""
    words = textwrap.shorten(f"{result.status.upper()}: {result.outcome}", 180, placeholder=" ...")
    figure.suptitle(textwrap.fill(words, 90), color=TENSION, fontweight="bold", fontsize=9)


_METADATA: Mapping[str, dict[str, None]] = {  # nothing that changes from one run to the next
    ".png": {"Software": None},
    ".svg": {"Date": None},
    ".pdf": {"CreationDate": None},
}


def save(figure: Figure, path: Path | str) -> None:
    """Write a figure as PNG, SVG or PDF by the ending of the name; the same figure, the same bytes.

    Raises
    ------
    InputError
        If the ending is another, or the file cannot be written.
    """
    path = Path(path)
    if path.suffix.lower() not in _METADATA:
        raise InputError(f"{path}: a plot is saved as .png, .svg or .pdf")
    with styled():
        try:
            figure.savefig(path, metadata=_METADATA[path.suffix.lower()])
        except OSError as wrong:
            raise InputError(f"{path}: cannot be written ({wrong.strerror or wrong})") from None
