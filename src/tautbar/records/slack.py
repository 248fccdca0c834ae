"""When each tie goes slack, for how long, and how hard it snatches when it tightens again."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tautbar.records.fields import Field

Floats = NDArray[np.float64]


@dataclass(slots=True)
class _Episode:
    member: int
    start: float  # s
    end: float  # s
    snatch: float = np.nan  # N, known once the taut spell that follows is over
    snatch_time: float = np.nan  # s


class SlackEpisodes:
    """Follows the ties of a march and keeps a row for each time one of them was slack.

    A tie is slack while it is too long: its looseness, the unstressed length less the distance
    between its ends, is above zero. The instants of going slack and taut are found between computed
    steps by linear interpolation of the looseness. The snatch force of an episode is the greatest
    force of the taut spell that follows it, up to its going slack again or the end, and its time is
    that of the first step with that force.

    Parameters
    ----------
    can_slack
        (N,) whether a member can go slack at all; False also for one that is not there.
    """

    def __init__(self, can_slack: NDArray[np.bool_]) -> None:
        count = len(can_slack)
        self._can = np.asarray(can_slack, dtype=bool)
        self._slack = np.zeros(count, dtype=bool)
        self._before: Floats = np.zeros(count)  # m, looseness at the last step
        self._since = np.full(count, np.nan)  # s, start of the episode that lasts
        self._snatch = np.zeros(count)  # N, greatest force of the taut spell that lasts
        self._snatch_time = np.full(count, np.nan)  # s, when it was met
        self._last = np.full(count, -1)  # the episode whose taut spell lasts, -1: none
        self._total = np.zeros(count)  # s, length of the episodes that are over
        self._episodes: list[_Episode] = []
        self._first = self._time = np.nan

    def update(self, time: float, looseness: Floats, force: Floats) -> None:
        """Take in a step: ``time`` [s], ``looseness`` (N,) [m] and ``force`` (N,) [N]."""
        slack = self._can & (looseness > 0.0)
        if np.isnan(self._time):
            self._first = time
            self._since[slack] = time
        else:
            self._cross(time, looseness, slack)
        harder = ~slack & (np.abs(force) > self._snatch)
        np.copyto(self._snatch, np.abs(force), where=harder)
        np.copyto(self._snatch_time, time, where=harder)
        self._slack = slack
        self._before = looseness.copy()
        self._time = time

    def _cross(self, time: float, looseness: Floats, slack: NDArray[np.bool_]) -> None:
        changed = np.flatnonzero(slack != self._slack)
        for member in changed.tolist():
            before, now = self._before[member], looseness[member]
            instant = self._time + (time - self._time) * float(before / (before - now))
            if slack[member]:
                self._go_slack(member, instant)
            else:
                self._tighten(member, instant)

    def _go_slack(self, member: int, instant: float) -> None:
        if self._last[member] >= 0:
            episode = self._episodes[self._last[member]]
            episode.snatch, episode.snatch_time = self._spell(member)
        self._last[member] = -1
        self._since[member] = instant

    def _tighten(self, member: int, instant: float) -> None:
        self._last[member] = len(self._episodes)
        self._episodes.append(_Episode(member, float(self._since[member]), instant))
        self._total[member] += instant - self._since[member]
        self._snatch[member], self._snatch_time[member] = 0.0, instant

    def _spell(self, member: int) -> tuple[float, float]:
        """Greatest force [N] of the taut spell that lasts, and when [s]."""
        return float(self._snatch[member]), float(self._snatch_time[member])

    def share(self) -> Floats:
        """Share of the time that each member was slack, (N,)."""
        covered = self._time - self._first
        lasting = np.where(self._slack, self._time - self._since, 0.0)
        return (self._total + lasting) / covered if covered > 0.0 else self._slack.astype(float)

    def episodes(self) -> list[tuple[int, float, float, float, float]]:
        """Member, start [s], end [s], snatch force [N] and its time [s] of each episode.

        They come by start and member. One that lasts has NaN for its end, snatch force and time.
        """
        done = [
            (
                e.member,
                e.start,
                e.end,
                *(self._spell(e.member) if self._last[e.member] == k else (e.snatch, e.snatch_time)),
            )
            for k, e in enumerate(self._episodes)
        ]
        lasting = [
            (member, float(self._since[member]), np.nan, np.nan, np.nan)
            for member in np.flatnonzero(self._slack).tolist()
        ]
        return sorted(done + lasting, key=lambda row: (row[1], row[0]))

    def fields(self, member_axis: str = "member") -> dict[str, Field]:
        """Fields ``slack/{member, start, end, snatch_force, time_of_snatch}`` and ``slack_share`` (N,).

        ``member_axis`` names the axis over the members followed.
        """
        rows = np.array(self.episodes(), dtype=float).reshape(-1, 5)
        axis = ("episode",)
        return {
            "slack/member": Field(rows[:, 0].astype(np.int64), "1", "member, counted from 0", axis),
            "slack/start": Field(rows[:, 1], "s", "time of going slack", axis),
            "slack/end": Field(rows[:, 2], "s", "time of tightening, not a number: slack to the end", axis),
            "slack/snatch_force": Field(
                rows[:, 3], "N", "greatest force of the taut spell that follows", axis
            ),
            "slack/time_of_snatch": Field(rows[:, 4], "s", "time of that force", axis),
            "slack_share": Field(self.share(), "1", "share of the time slack", (member_axis,)),
        }
