"""Paths of equilibrium, buckling and form-finding from their checked words."""

from __future__ import annotations

from typing import Any

from tautbar.model.format_asking import NONE
from tautbar.model.inquiry import Inquiry
from tautbar.model.mistakes import several
from tautbar.model.parts import Buckling, EquilibriumPath, FormFinding, Indices, Loading, StopAt

_DISPLACED = ("joint", "direction", "displacement")
_FORMS = "joint, direction and displacement, or load_factor, or limit_points, or steps"


def build_path(asked: Inquiry) -> EquilibriumPath:
    """An equilibrium path."""
    return EquilibriumPath(
        loads=asked.loads.growing(asked.data["loads"], (*asked.path, "loads")),
        constant=_constant(asked),
        stop_at=_stop_at(asked),
        step=asked.data["step"],
        **asked.common,
    )


def build_buckling(asked: Inquiry) -> Buckling:
    """Linearised buckling about a state."""
    return Buckling(
        loads=asked.loads.growing(asked.data["loads"], (*asked.path, "loads")),
        constant=_constant(asked),
        count=asked.data["count"],
        **asked.common,
    )


def _constant(asked: Inquiry) -> Loading | None:
    """What stays while the loads grow; it must be said where the start state carries loads."""
    if "constant" not in asked.data:
        if asked.carried():
            what = "'constant' is missing: its start state carries loads, do they stay?"
            asked.wrong((), what, f'name what stays beside the growing loads, or constant = "{NONE}"')
        return None
    given = asked.data["constant"]
    return None if given in (NONE, None) else asked.loads.one(given, (*asked.path, "constant"))


def _stop_at(asked: Inquiry) -> StopAt:
    data: dict[str, Any] | None = asked.data["stop_at"]
    if data is None:
        return StopAt()
    displaced = [key for key in _DISPLACED if key in data]
    forms = [key for key in ("load_factor", "limit_points", "steps") if key in data]
    if len(forms) + bool(displaced) != 1:
        what = "says in two ways where to stop" if forms else "does not say where to stop"
        asked.wrong(("stop_at",), what, f"give one of: {_FORMS}")
    if displaced and len(displaced) < len(_DISPLACED):
        missing = " and ".join(f"'{key}'" for key in _DISPLACED if key not in data)
        asked.wrong(("stop_at",), f"{missing} is missing", f"it takes {', '.join(_DISPLACED)}")
    joint = asked.joint(data.get("joint"), "stop_at", "joint")
    axis = asked.axis(joint, data.get("direction"), "stop_at", "direction")
    return StopAt(
        data.get("load_factor"),
        joint,
        axis or 0,
        data.get("displacement") or 0.0,
        data.get("limit_points"),
        data.get("steps"),
    )


def build_form_finding(asked: Inquiry) -> FormFinding:
    """Form-finding by force densities."""
    return FormFinding(loads=asked.one_loading(), force_densities=_densities(asked), **asked.common)


def _densities(asked: Inquiry) -> tuple[tuple[Indices, float], ...]:
    """Force densities: every member that is there has exactly one."""
    names, found = asked.site.members.names, []
    given: set[int] = set()
    for i, entry in enumerate(asked.data["force_densities"] or ()):
        if entry is None:
            continue
        members = asked.members(entry["members"], "force_densities", i, "members")
        twice = [names[m] for m in members if m in given]
        if twice:
            asked.wrong(("force_densities", i), f"{several(twice)}: a force density is given twice")
        given.update(members)
        if entry["value"] is not None:
            _check_density(asked, members, entry["value"], i)
            found.append((members, entry["value"]))
    hanging = asked.site.catenaries(asked.presence)
    if hanging:
        what = f"{several([names[m] for m in hanging])}: form-finding knows no hanging members"
        asked.wrong((), what, "make them tension-only, or take them away here with `without`")
    settled = given | asked.presence.members | set(hanging)
    bare = [name for m, name in enumerate(names) if m not in settled]
    if bare and not asked.mistakes.at(*asked.path, "force_densities"):
        asked.wrong(("force_densities",), f"{several(bare)}: no force density is given")
    return tuple(found)


def _check_density(asked: Inquiry, members: Indices, value: float, i: int) -> None:
    for kind, wrong, force in (
        ("tension-only", value < 0, "compression"),
        ("compression-only", value > 0, "tension"),
    ):
        which = [asked.site.members.names[m] for m in members if asked.site.kind(m) == kind]
        if wrong and which:
            what = f"a force density of {force}, which the {kind} {several(which)} cannot carry"
            asked.wrong(("force_densities", i, "value"), what)
