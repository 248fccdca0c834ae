"""Cut list and setting table of adjusted members: what the rigger marks, cuts and pulls to.

* unstressed length: at the model's temperature, without tension.
* take-up: length between the joints as drawn less unstressed length; above zero where the member is
  shorter than its place. Length change: unstressed length less the one it had before.
* marked length: unstressed length, at the marking temperature, under the marking tension, and an end
  allowance at either end.
* setting table: tension under the first loading with every member at a temperature; what the loading
  itself says about temperature is left out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context
from tautbar.analyses.judge import judge
from tautbar.analyses.strength import Strength
from tautbar.analyses.tuned import Tuned
from tautbar.analyses.words import chosen, quantity
from tautbar.model.parts import CutList, Parts
from tautbar.records.fields import Field
from tautbar.solvers.equilibrium import find_equilibrium

Array = NDArray[np.float64]
ZERO_CELSIUS = 273.15  # K
COLDEST, HOTTEST, STEP = -20.0, 40.0, 10.0  # degC, of the setting table
MOST_LINES = 12
BALANCE = 1e-9


@dataclass(frozen=True)
class Piece:
    """One thing to cut: a member, or all pieces of a rope."""

    name: str
    members: tuple[int, ...]


def pieces_to_cut(parts: Parts, adjust: tuple[int, ...]) -> list[Piece]:
    """Adjusted members, the pieces of a rope as one."""
    rope_of = {m: rope for rope in parts.members.hanging for m in rope.members}
    out: dict[str, Piece] = {}
    for m in adjust:
        rope = rope_of.get(m)
        piece = Piece(parts.members.names[m], (m,)) if rope is None else Piece(rope.name, tuple(rope.members))
        out.setdefault(piece.name, piece)
    return list(out.values())


@dataclass(frozen=True)
class Cut:
    """The cut list of a tuning, arrays over its pieces (P,)."""

    pieces: list[Piece]
    L0: Array  # m
    marked: Array  # m
    take_up: Array  # m
    change: Array  # m
    installed: Array  # N, the greatest along it, under the first loading
    share: Array  # of the breaking force, NaN where that is not known


def cut_list(context: Context, tuned: Tuned, asked: CutList) -> Cut:
    """Lengths of all adjusted members."""
    parts, s = context.parts, tuned.problem.rest.scene.structure
    pieces = pieces_to_cut(parts, tuned.analysis.adjust)
    warmer = 0.0
    if asked.temperature is not None and parts.temperature is not None:
        warmer = asked.temperature - parts.temperature
    factor = (1 + s.expansion * warmer) * (1 + asked.marking_tension / s.EA)

    def whole(values: Array) -> Array:
        return np.array([values[list(p.members)].sum() for p in pieces])

    L0, drawn = whole(tuned.L0), _drawn(tuned, pieces)
    N = tuned.solved[0].verdict.look.axial
    installed = np.array([N[list(p.members)].max() for p in pieces])
    breaks = Strength.of(tuned.problem.rest.scene).breaks[[p.members[0] for p in pieces]]
    return Cut(
        pieces=pieces,
        L0=L0,
        marked=whole(tuned.L0 * factor) + 2 * asked.end_allowance,
        take_up=drawn - L0,
        change=L0 - whole(s.L0),
        installed=installed,
        share=np.where(np.isfinite(breaks), installed / breaks, np.nan),
    )


def _drawn(tuned: Tuned, pieces: list[Piece]) -> Array:
    """Straight distance between the ends of each, as drawn (P,) [m]."""
    s = tuned.problem.rest.scene.structure
    ends = [s.position[:, s.end[p.members[-1]]] - s.position[:, s.start[p.members[0]]] for p in pieces]
    return np.array([float(np.sqrt(r @ r)) for r in ends])


def _without_expansion(context: Context, tuned: Tuned) -> list[int]:
    """Members for which nothing says how they grow with temperature."""
    sections = context.parts.sections
    there = tuned.problem.rest.scene.stage.members
    return [
        m for m, k in enumerate(context.parts.members.section) if there[m] and sections[k].expansion is None
    ]


def table_gap(context: Context, tuned: Tuned) -> str:
    """Why there is no setting table beside a cut list; empty where there is one or none is wanted."""
    bare = _without_expansion(context, tuned)
    if tuned.analysis.cut_list is None or not bare:
        return ""
    names = chosen(context.member_names, bare)
    return f"no setting table: the sections of {names} have no expansion (expansion = 0 to mean none)"


def temperatures(model: float | None) -> tuple[Array, Array]:
    """Temperatures of the setting table [K] and their changes from the model's [K].

    From -20 to 40 degC in steps of 10; without a temperature of the model, changes from -30 to 30 K.
    """
    steps = np.arange(COLDEST, HOTTEST + STEP / 2, STEP)
    if model is None:
        change = steps - 0.5 * (COLDEST + HOTTEST)
        return np.full(change.size, np.nan), change
    return steps + ZERO_CELSIUS, steps + ZERO_CELSIUS - model


def setting_table(context: Context, tuned: Tuned, pieces: list[Piece]) -> Array:
    """Tension (P, temperatures) [N] under the first loading, the greatest along each; NaN where it fails."""
    first = tuned.solved[0]
    _, change = temperatures(context.parts.temperature)
    out = np.full((len(pieces), change.size), np.nan)
    for i, kelvin in enumerate(change):
        acting = first.acting._replace(heating=first.scene.structure.expansion * kelvin)
        potential = first.scene.potential(acting)
        verdict = judge(potential, find_equilibrium(potential, first.verdict.look.q, BALANCE), BALANCE, False)
        if verdict.holds:
            out[:, i] = [verdict.look.axial[list(p.members)].max() for p in pieces]
    return out


def cut_list_fields(context: Context, tuned: Tuned) -> dict[str, Field]:
    """Datasets under ``cut_list`` and ``setting_table``; none where no list is wanted or nothing holds."""
    asked = tuned.analysis.cut_list
    if asked is None or not tuned.holds:
        return {}
    cut = cut_list(context, tuned, asked)
    piece = ("cut",)
    names = np.array([p.name for p in cut.pieces], dtype=object)
    first = np.array([p.members[0] for p in cut.pieces])
    fields = {
        "cut_list/name": Field(names, "1", "member or rope", piece),
        "cut_list/member": Field(first, "1", "member, counted from 0; the first piece of a rope", piece),
        "cut_list/unstressed_length": Field(cut.L0, "m", "unstressed length", piece),
        "cut_list/marked_length": Field(cut.marked, "m", "length to mark, with end allowances", piece),
        "cut_list/take_up": Field(cut.take_up, "m", "drawn less unstressed length", piece),
        "cut_list/length_change": Field(cut.change, "m", "unstressed length less the one before", piece),
        "cut_list/installed_tension": Field(cut.installed, "N", "tension under the first loading", piece),
        "cut_list/share_of_breaking_force": Field(cut.share, "1", "of that tension", piece),
    }
    if not _without_expansion(context, tuned):
        T, change = temperatures(context.parts.temperature)
        warm = ("setting",)
        tension = setting_table(context, tuned, cut.pieces)
        fields["setting_table/temperature"] = Field(T, "K", "temperature of all members", warm)
        fields["setting_table/change"] = Field(change, "K", "change from the model's temperature", warm)
        fields["setting_table/tension"] = Field(tension, "N", "installed tension", (*piece, *warm))
    return fields


def cut_list_lines(context: Context, tuned: Tuned) -> list[str]:
    """The cut list in words, one line a piece."""
    asked = tuned.analysis.cut_list
    assert asked is not None
    cut = cut_list(context, tuned, asked)
    lines = [
        f"{p.name}: unstressed {cut.L0[i]:.4f} m, mark at {cut.marked[i]:.4f} m under "
        f"{quantity(asked.marking_tension, 'N')}, take-up from the drawing {quantity(cut.take_up[i], 'm')}; "
        f"{quantity(cut.installed[i], 'N')} under {tuned.solved[0].loading.name}"
        for i, p in enumerate(cut.pieces[:MOST_LINES])
    ]
    more = len(cut.pieces) - len(lines)
    return [*lines, f"... and {more} more, in the results file"] if more else lines
