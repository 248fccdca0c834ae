"""Small structures for tests of paths and buckling, built as parts so that they need no file."""

from __future__ import annotations

from array import array
from collections.abc import Mapping, Sequence

import numpy as np

from tautbar.analyses.context import Context
from tautbar.analyses.job import Job
from tautbar.model.parts import (
    KINDS,
    Analysis,
    Buckling,
    EquilibriumPath,
    Joints,
    LoadCase,
    Loading,
    Members,
    Parts,
    Section,
    StartFrom,
    Static,
    StopAt,
    Support,
)
from tautbar.records.fields import Record

GROWING, CONSTANT = Loading("growing", {"growing": 1.0}), Loading("constant", {"constant": 1.0})
NAN = float("nan")


def member(ends: str, kind: str = "bar", section: int = 0, **lengths: float) -> dict[str, object]:
    """A member between two joints with names of one letter: ``member("AB", slack=0.1)``."""
    return {"ends": ends, "kind": kind, "section": section, **lengths}


def structure(
    joints: Mapping[str, Sequence[float]],
    members: Sequence[Mapping[str, object]],
    supports: Sequence[Support],
    cases: Mapping[str, LoadCase],
    sections: Sequence[Section],
    plane: bool = True,
) -> Parts:
    """Parts of a structure, in the plane xz unless told otherwise."""
    names = tuple(joints)
    index = {name: i for i, name in enumerate(names)}
    x, y, z = (array("d", [float(p[c]) for p in joints.values()]) for c in range(3))
    starts, ends = (array("l", [index[str(m["ends"])[i]] for m in members]) for i in (0, 1))
    kinds = array("l", [KINDS.index(str(m["kind"])) for m in members])

    def given(key: str) -> array[float]:
        return array("d", [m.get(key, NAN) for m in members])

    lengths = [given(key) for key in ("pretension", "unstressed_length", "slack", "sag")]
    called = tuple(str(m["ends"]) for m in members)
    where = {name: i for i, name in enumerate(called)}
    columns = Members(
        called, starts, ends, kinds, array("l", [m["section"] for m in members]), *lengths, index=where
    )
    return Parts(
        title="",
        joints=Joints(names, x, y, z, index),
        members=columns,
        sections=tuple(sections),
        materials=(),
        supports=tuple(supports),
        masses=(),
        load_cases=dict(cases),
        loadings={name: (Loading(name, {name: 1.0}),) for name in cases},
        events={},
        analyses=(),
        held_axis=1 if plane else None,
    )


def push(joint: int, force: Sequence[float]) -> LoadCase:
    """A force [N] at one joint."""
    return LoadCase("growing", forces=(((joint,), (force[0], force[1], force[2])),))


def toggle(
    span: float = 10.0, rise: float = 1.0, EA: float = 1e6, more: Sequence[Mapping[str, object]] = (),
    case: LoadCase | None = None, **joints: Sequence[float],
) -> Parts:  # fmt: skip
    """Two bars AC and BC to an apex C (joint 2) that 1 N presses down; other joints are held."""
    all_joints = {"A": (-span, 0, 0), "B": (span, 0, 0), "C": (0, 0, rise), **joints}
    held = tuple(i for i, name in enumerate(all_joints) if name != "C")
    return structure(
        all_joints,
        [member("AC"), member("BC"), *more],
        [Support("held", held, fixed=(0, 1, 2))],
        {"growing": case or push(2, (0, 0, -1)), "constant": LoadCase("constant")},
        [Section("bar", axial_stiffness=EA, expansion=1e-5)],
    )


def toggle_load(z: np.ndarray, span: float = 10.0, rise: float = 1.0, EA: float = 1e6) -> np.ndarray:
    """Load [N] that holds the apex at height z: N01, engineering strain."""
    L, now = np.hypot(span, rise), np.hypot(span, z)
    return 2 * EA * (L - now) / L * z / now


def path(parts: Parts, stop_at: StopAt, step: float = 10.0, **more: object) -> Record:
    """The path of the case "growing"."""
    return path_in(Context(parts), stop_at, step, **more)


def path_in(context: Context, stop_at: StopAt, step: float = 10.0, **more: object) -> Record:
    analysis = EquilibriumPath("path", GROWING, stop_at, step=step, **more)  # type: ignore[arg-type]
    return run(context, analysis)


def buckling(parts: Parts, count: int = 5, **more: object) -> Record:
    return run(Context(parts), Buckling("buckling", GROWING, count=count, **more))  # type: ignore[arg-type]


def static(parts: Parts, factor: float, start: StartFrom | None = None) -> Record:
    """Equilibrium under the constant case and a factor of the growing one."""
    loading = Loading("both", {"constant": 1.0, "growing": factor})
    return run(Context(parts), Static("static", start=start, loads=(loading,), folding=True))


def run(context: Context, analysis: Analysis) -> Record:
    job = Job(context.parts)
    job.context = context
    record = job.do(analysis)
    assert isinstance(record, Record)
    return record
