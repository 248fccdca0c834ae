"""How plots look: colours that stay apart for colour-blind readers and in print, one set of settings."""

from __future__ import annotations

from contextlib import AbstractContextManager
from typing import Any

import matplotlib
from matplotlib.axes import Axes
from matplotlib.colors import LinearSegmentedColormap
from matplotlib.rcsetup import cycler

COMPRESSION, ZERO, TENSION = "#0072b2", "#8c8c8c", "#d55e00"
INK, PALE, SLACK = "#222222", "#bdbdbd", "#555555"
SERIES = ("#0072b2", "#d55e00", "#009e73", "#cc79a7", "#56b4e9", "#e69f00", "#000000")
DASHES: tuple[Any, ...] = (
    "-",
    (0, (5, 1.5)),
    (0, (1.5, 1.2)),
    (0, (6, 1.5, 1.5, 1.5)),
    "-",
    (0, (3, 1)),
    "-",
)
AXIAL = LinearSegmentedColormap.from_list("axial", [COMPRESSION, ZERO, TENSION])
DASHED = (0, (3, 2))
DOTS = 150  # per inch, of a picture
STYLE: dict[str, Any] = {
    "font.size": 9,
    "axes.titlesize": 10,
    "axes.titlelocation": "left",
    "axes.grid": True,
    "axes.axisbelow": True,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.prop_cycle": cycler(color=SERIES),
    "grid.alpha": 0.3,
    "legend.frameon": False,
    "lines.linewidth": 1.2,
    "savefig.dpi": DOTS,
    "svg.fonttype": "none",
    "svg.hashsalt": "tautbar",
    "pdf.fonttype": 42,
}


def styled() -> AbstractContextManager[None]:
    """The settings, for the making and the saving of a figure."""
    settings: dict[Any, Any] = {**matplotlib.rcParamsDefault, **STYLE}  # the user's own have no say
    return matplotlib.rc_context(settings)


def say_nothing_to_show(axes: Axes, words: str) -> list[Any]:
    """A plot with nothing in it says so."""
    axes.set_axis_off()
    return [axes.text(0.5, 0.5, words, transform=axes.transAxes, ha="center", va="center", color=INK)]
