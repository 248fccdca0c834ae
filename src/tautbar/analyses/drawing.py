"""The model as arrays, for the results file."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from tautbar.analyses.context import Context
from tautbar.analyses.scene import Scene
from tautbar.model.parts import KINDS
from tautbar.records.fields import Field


def model_fields(context: Context) -> dict[str, Field]:
    """Fields by their path under ``/model``."""
    parts, scene = context.parts, context.first_scene()
    s = scene.structure
    member = ("member",)
    sections = [sec.name for sec in parts.sections]
    return {
        "joints/name": Field(_text(context.joint_names), "1", "name of the joint", ("joint",)),
        "joints/position": Field(s.position.T, "m", "drawn position", ("joint", "direction")),
        "members/name": Field(_text(context.member_names), "1", "name of the member", member),
        "members/group": Field(_text(_groups(context)), "1", "group of the member", member),
        "members/ends": Field(
            np.stack([s.start, s.end], axis=1), "1", "joints of its ends, from 0", (*member, "end")
        ),
        "members/kind": Field(_text([KINDS[k] for k in s.kind]), "1", "kind of member", member),
        "members/section": Field(_text([sections[i] for i in parts.members.section]), "1", "section", member),
        "members/present": Field(s.present.astype(np.int8), "1", "1: there from the first", member),
        "members/axial_stiffness": Field(s.EA, "N", "axial stiffness EA", member),
        "members/unstressed_length": Field(s.L0, "m", "unstressed length", member),
        "members/mass_per_length": Field(s.m, "kg/m", "mass per unstressed length", member),
        "members/retardation_time": Field(s.tau, "s", "Kelvin-Voigt retardation time", member),
        "masses": Field(s.joint_mass, "kg", "mass at the joint, besides its members", ("joint",)),
        "supports/held": Field(
            _held(scene), "1", "1 held, 0 free, between: inclined", ("joint", "direction")
        ),
        "supports/spring": Field(_springs(scene), "N/m", "spring to ground", ("joint", "direction")),
    }


def _text(names: Iterable[str]) -> NDArray[np.object_]:
    return np.array(list(names), dtype=np.object_)


def _groups(context: Context) -> list[str]:
    """The group each member belongs to, its own name where it is in none."""
    out = list(context.member_names)
    for group, which in context.parts.members.groups.items():
        for m in which:
            out[m] = group
    return out


def _held(scene: Scene) -> NDArray[np.float64]:
    """How much of each direction is held (J, 3): the diagonal of I - T T^T."""
    T = scene.system.freedom.T
    return np.asarray(1.0 - T.multiply(T).sum(axis=1)).reshape(3, -1).T


def _springs(scene: Scene) -> NDArray[np.float64]:
    return np.asarray(scene.system.freedom.spring.diagonal()).reshape(3, -1).T
