"""Slack, tension, frequencies and shocks of structures whose members carry axial force only.

The public names are fetched on first use, so that ``import tautbar`` costs next to nothing.
"""

from __future__ import annotations

import sys
from importlib import import_module
from types import ModuleType

TYPE_CHECKING = False  # type checkers take it as true; `typing` alone would double the time of the import
if TYPE_CHECKING:
    from tautbar.analyses.memory import find_modes, solve_history, solve_static
    from tautbar.errors import (
        AnalysisFailed,
        InputError,
        Mistake,
        ModelError,
        NotConverged,
        ResultsError,
        TautbarError,
    )
    from tautbar.model import Model
    from tautbar.model.reading import read_model
    from tautbar.model.schema import schema
    from tautbar.run import run
    from tautbar.starter import write_starter
    from tautbar.store import open_results
    from tautbar.summary import summarise
    from tautbar.views.answers import answer_text
    from tautbar.views.gallery import draw as plot
    from tautbar.views.gallery import list_plots
    from tautbar.views.gallery import save as save_plot

__version__ = "0.1.0"

_HOMES = {  # public name: the module it lives in, and its name there where that differs
    "AnalysisFailed": "tautbar.errors",
    "InputError": "tautbar.errors",
    "Mistake": "tautbar.errors",
    "Model": "tautbar.model",
    "ModelError": "tautbar.errors",
    "NotConverged": "tautbar.errors",
    "ResultsError": "tautbar.errors",
    "TautbarError": "tautbar.errors",
    "answer_text": "tautbar.views.answers",
    "find_modes": "tautbar.analyses.memory",
    "list_plots": "tautbar.views.gallery",
    "open_results": "tautbar.store",
    "plot": "tautbar.views.gallery:draw",
    "read_model": "tautbar.model.reading",
    "run": "tautbar.run",
    "save_plot": "tautbar.views.gallery:save",
    "schema": "tautbar.model.schema",
    "solve_history": "tautbar.analyses.memory",
    "solve_static": "tautbar.analyses.memory",
    "summarise": "tautbar.summary",
    "write_starter": "tautbar.starter",
}
__all__ = [
    "AnalysisFailed",
    "InputError",
    "Mistake",
    "Model",
    "ModelError",
    "NotConverged",
    "ResultsError",
    "TautbarError",
    "__version__",
    "answer_text",
    "find_modes",
    "list_plots",
    "open_results",
    "plot",
    "read_model",
    "run",
    "save_plot",
    "schema",
    "solve_history",
    "solve_static",
    "summarise",
    "write_starter",
]


def __getattr__(name: str) -> object:
    """Fetch a public name from its module, once."""
    if name not in _HOMES:
        raise AttributeError(f"module 'tautbar' has no attribute {name!r}")
    home, _, there = _HOMES[name].partition(":")
    value = getattr(import_module(home), there or name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})


class _Package(ModuleType):
    """The package, whose function ``run`` does not give way to the module ``tautbar.run``.

    Importing a module sets it as an attribute of its package; without this, what ``tautbar.run``
    is would hang on what was imported before.
    """

    def __setattr__(self, name: str, value: object) -> None:
        if not (name in _HOMES and isinstance(value, ModuleType)):
            super().__setattr__(name, value)


sys.modules[__name__].__class__ = _Package
