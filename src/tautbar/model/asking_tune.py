"""Tuning from its checked words: what may change, what is wanted, and how lengths are marked."""

from __future__ import annotations

from typing import Any

from tautbar.model.echo import quantity_text
from tautbar.model.inquiry import Inquiry
from tautbar.model.mistakes import near, several
from tautbar.model.parts import CutList, Indices, Loading, PositionTarget, TensionTarget, Tune

_TENSION, _POSITION = ("members", "tension"), ("joint", "direction", "position")
_FORMS = "give members and tension, or joint, direction and position"


def build_tune(asked: Inquiry) -> Tune:
    """Unstressed lengths for wanted tensions or positions, or for members that stay taut."""
    data = asked.data
    loads = asked.loads.all(data, asked.path) or ()
    adjust = asked.members(data["adjust"], "adjust")
    _check_aim(asked)
    return Tune(
        loads=loads,
        adjust=adjust,
        targets=_Targets(asked, loads).build(),
        together=_together(asked, adjust),
        keep_taut=_keep_taut(asked),
        margin=data.get("margin") or 0.0,
        cut_list=_cut_list(asked, adjust),
        **asked.common,
    )


def _check_aim(asked: Inquiry) -> None:
    data = asked.data
    if "targets" in data and "keep_taut" in data:
        what = "targets and keep_taut are given: one fixes the lengths, the other looks for the least tension"
        asked.wrong(("keep_taut",), what, "give one of them, or tune twice")
    elif not {"targets", "keep_taut", "margin"} & data.keys():
        asked.wrong((), "nothing is wanted", "give targets, or keep_taut and margin")
    if "keep_taut" in data and "margin" not in data:
        hint = 'tension that must be left in the slackest of them, for example margin = "500 N"'
        asked.wrong((), "'margin' is missing", hint)
    elif "margin" in data and "keep_taut" not in data:
        asked.wrong(("margin",), "'margin' belongs to keep_taut", "name the members that shall keep it")


def _together(asked: Inquiry, adjust: Indices) -> tuple[Indices, ...]:
    """Groups of one relative change each: those given, and every rope that is adjusted as a whole."""
    names = asked.site.members.names
    found: list[Indices] = []
    seen: set[int] = set()
    for i, listed in enumerate(asked.data.get("together") or ()):
        group = asked.members(listed, "together", i)
        other = [names[m] for m in group if m not in adjust and asked.data["adjust"] is not None]
        if other:
            what = f"{several(other)} {'is' if len(other) == 1 else 'are'} not in adjust"
            asked.wrong(("together", i), what)
        twice = [names[m] for m in group if m in seen]
        if twice:
            asked.wrong(("together", i), f"{several(twice)}: in two lists of together")
        seen.update(group)
        found.append(group)
    for whole in asked.site.wholes.named(asked.data["adjust"] or ()):
        if seen.isdisjoint(whole.members) and set(whole.members) <= set(adjust):
            seen.update(whole.members)
            found.append(whole.members)
    _check_pieces(asked, adjust, found)
    return tuple(found)


def _check_pieces(asked: Inquiry, adjust: Indices, groups: list[Indices]) -> None:
    """All pieces of a rope change together."""
    for whole in asked.site.wholes.all:
        pieces = set(whole.members)
        touched = whole.in_pieces and not pieces.isdisjoint(adjust)
        if touched and not any(pieces <= set(group) for group in groups):
            what = f"the pieces of '{whole.name}' can only change together"
            asked.wrong(("adjust",), what, f"name it as a whole: '{whole.name}'")


def _keep_taut(asked: Inquiry) -> Indices:
    found = asked.members(asked.data.get("keep_taut"), "keep_taut")
    struts = [asked.site.members.names[m] for m in found if asked.site.kind(m) == "compression-only"]
    if struts:
        asked.wrong(("keep_taut",), f"{several(struts)}: compression-only, so never taut")
    return found


def _cut_list(asked: Inquiry, adjust: Indices) -> CutList | None:
    data: dict[str, Any] | None = asked.data.get("cut_list")
    if data is None:
        return None
    where = ("cut_list", "temperature")
    if data.get("temperature") is not None and asked.site.temperature is None:
        if not asked.mistakes.at("temperature"):
            what = "the model does not say at which temperature its lengths are given"
            asked.wrong(where, what, 'add temperature = "10 degC" to the model')
    elif data.get("temperature") is not None:
        site = asked.site
        known = [m for m in adjust if site.columns.section[m] >= 0]
        bare = [
            site.members.names[m] for m in known if site.sections[site.columns.section[m]].expansion is None
        ]
        if bare:
            hint = "give it to the section or its material; expansion = 0 to mean none"
            asked.wrong(where, f"{several(bare)}: the section has no expansion", hint)
    return CutList(data["marking_tension"], data.get("temperature"), data["end_allowance"])


class _Targets:
    """Reads the targets of one analysis, and sees whether they contradict each other."""

    def __init__(self, asked: Inquiry, loads: tuple[Loading, ...]) -> None:
        self.asked, self.names = asked, [loading.name for loading in loads]
        self.tensions: dict[tuple[int, str, str], float] = {}
        self.positions: set[tuple[int, int, str]] = set()

    def build(self) -> tuple[TensionTarget | PositionTarget, ...]:
        found: list[TensionTarget | PositionTarget] = []
        for i, data in enumerate(self.asked.data.get("targets") or ()):
            if data is None:
                continue
            tension = [key for key in _TENSION if key in data]
            position = [key for key in _POSITION if key in data]
            loads = self._loads(data.get("loads"), i)
            if bool(tension) == bool(position):
                what = "wants a tension and a position at once" if tension else "wants nothing"
                self.asked.wrong(("targets", i), what, _FORMS)
            elif tension:
                found += self._tension(data, loads, i)
            else:
                found += self._position(data, loads, i)
        return tuple(found)

    def _loads(self, name: str | None, i: int) -> str:
        if name is not None and self.names and name not in self.names:
            what = f"'{name}' is not among the loadings of this analysis"
            self.asked.wrong(("targets", i, "loads"), what, near(name, self.names))
        return name or (self.names[0] if self.names else "")

    def _whole(self, data: dict[str, Any], keys: tuple[str, ...], i: int) -> bool:
        missing = [key for key in keys if key not in data]
        for key in missing:
            self.asked.wrong(("targets", i), f"'{key}' is missing", _FORMS)
        return not missing and all(data[key] is not None for key in keys)

    def _tension(self, data: dict[str, Any], loads: str, i: int) -> list[TensionTarget]:
        if not self._whole(data, _TENSION, i):
            return []
        named, at = data["members"], data.get("at")
        members, whole = self._ends_of_ropes(self.asked.members(named, "targets", i, "members"), named, at)
        self._check_at(members, whole, at, i)
        self._check_sense(members, data["tension"], i)
        for member in members:
            self._note_tension(member, at or "greatest", loads, data["tension"], i)
        return [TensionTarget(members, data["tension"], at, data.get("loads"))] if members else []

    def _ends_of_ropes(
        self, members: Indices, named: list[str], at: str | None
    ) -> tuple[Indices, frozenset[int]]:
        """Of a rope in pieces named as a whole the piece whose tension is meant; and those pieces."""
        left = dict.fromkeys(members)
        picked = set()
        for whole in self.asked.site.wholes.named(named):
            if whole.in_pieces and all(m in left for m in whole.members):
                for member in whole.members:
                    del left[member]
                piece = whole.members[0 if self._from_end(whole.members, at) else -1]
                left[piece] = None
                picked.add(piece)
        return tuple(left), frozenset(picked)

    def _from_end(self, pieces: Indices, at: str | None) -> bool:
        """Is the piece at the "from" end meant? The greatest tension is at the higher end."""
        if at == "from end" or at == "to end":
            return at == "from end"
        site = self.asked.site
        start, end = site.columns.start[pieces[0]], site.columns.end[pieces[-1]]
        return site.heights[start] >= site.heights[end]

    def _check_at(self, members: Indices, whole: frozenset[int], at: str | None, i: int) -> None:
        site = self.asked.site
        straight = [site.members.names[m] for m in members if site.kind(m) != "hanging" and m not in whole]
        if at is not None and straight:
            what = f"{several(straight)}: straight, its tension is the same everywhere"
            self.asked.wrong(("targets", i, "at"), what, "`at` is for hanging members")

    def _check_sense(self, members: Indices, tension: float, i: int) -> None:
        """A tie wants a tension above zero, a strut one below."""
        site = self.asked.site
        for kind, wrong in (
            ("tension-only", tension <= 0),
            ("hanging", tension <= 0),
            ("compression-only", tension >= 0),
        ):
            which = [site.members.names[m] for m in members if site.kind(m) == kind]
            if wrong and which:
                what = f"the {kind} {several(which)} cannot be tuned to {quantity_text(tension, 'N')}"
                self.asked.wrong(("targets", i, "tension"), what, "tension is positive")

    def _note_tension(self, member: int, at: str, loads: str, tension: float, i: int) -> None:
        key = (member, at if self.asked.site.kind(member) == "hanging" else "", loads)
        if key not in self.tensions:
            self.tensions[key] = tension
            return
        name, earlier = self.asked.site.members.names[member], self.tensions[key]
        if earlier == tension:
            what = f"the tension of '{name}' is given already"
        else:
            what = f"'{name}' shall have {tension:g} N, but another target wants {earlier:g} N"
        self.asked.wrong(("targets", i), what, "leave one of them out, or name another loading")

    def _position(self, data: dict[str, Any], loads: str, i: int) -> list[PositionTarget]:
        if not self._whole(data, _POSITION, i):
            return []
        joint = self.asked.joint(data["joint"], "targets", i, "joint")
        axis = self.asked.axis(joint, data["direction"], "targets", i, "direction")
        if joint is None or axis is None:
            return []
        if (joint, axis, loads) in self.positions:
            what = f"a position of joint '{data['joint']}' in {data['direction']} is given already"
            self.asked.wrong(("targets", i), what, "leave one of them out, or name another loading")
        self.positions.add((joint, axis, loads))
        return [PositionTarget(joint, axis, data["position"], data.get("loads"))]
