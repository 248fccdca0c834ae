"""Slack episodes against a plain loop and against what can be said by hand."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from tautbar.records.slack import SlackEpisodes


def follow(times, looseness, force, can_slack=None) -> SlackEpisodes:
    looseness = np.asarray(looseness, dtype=float).reshape(len(times), -1)
    force = np.asarray(force, dtype=float).reshape(len(times), -1)
    count = looseness.shape[1]
    slack = SlackEpisodes(np.ones(count, dtype=bool) if can_slack is None else np.array(can_slack))
    for time, row, forces in zip(times, looseness, force, strict=True):
        slack.update(time, row, forces)
    return slack


def test_instants_are_where_the_looseness_crosses_zero() -> None:
    slack = follow([0.0, 1.0, 2.0, 3.0], [-1.0, 3.0, 1.0, -1.0], [5.0, 0.0, 0.0, 8.0])
    # -1 to 3 crosses a quarter of the way; 1 to -1 half-way
    assert slack.episodes() == [(0, 0.25, 2.5, 8.0, 3.0)]
    assert slack.share().tolist() == [2.25 / 3.0]


def test_snatch_is_the_greatest_force_until_it_goes_slack_again() -> None:
    looseness = [1.0, -1.0, -1.0, 1.0, -1.0, -1.0]
    slack = follow(range(6), looseness, [0.0, 4.0, 9.0, 99.0, 2.0, 1.0])
    # the force while slack (99, which a mechanics would never give) does not count
    assert [e[1:] for e in slack.episodes()] == [(0.0, 0.5, 9.0, 2.0), (2.5, 3.5, 2.0, 4.0)]


def test_slack_to_the_end_has_no_end_and_no_snatch() -> None:
    slack = follow([0.0, 1.0, 2.0], [-1.0, 1.0, 1.0], [7.0, 0.0, 0.0])
    ((member, start, end, snatch, when),) = slack.episodes()
    assert (member, start) == (0, 0.5)
    assert np.isnan(end)
    assert np.isnan(snatch)
    assert np.isnan(when)
    assert slack.share().tolist() == [0.75]


def test_the_axis_of_members_can_be_another() -> None:
    fields = follow([0.0, 1.0], [1.0, 1.0], [0.0, 0.0]).fields("member_with_pieces")
    assert fields["slack_share"].axes == ("member_with_pieces",)


def test_a_snatch_without_force_comes_when_the_tie_tightens() -> None:
    assert follow([0.0, 1.0], [1.0, -1.0], [0.0, 0.0]).episodes() == [(0, 0.0, 0.5, 0.0, 0.5)]


def test_looseness_of_exactly_zero_is_taut() -> None:
    assert follow([0.0, 1.0], [0.0, 0.0], [0.0, 0.0]).episodes() == []


def test_members_that_cannot_go_slack_never_do() -> None:
    slack = follow([0.0, 1.0], [[1.0, 1.0], [1.0, 1.0]], np.zeros((2, 2)), can_slack=[False, True])
    assert [episode[0] for episode in slack.episodes()] == [1]
    assert slack.share().tolist() == [0.0, 1.0]


def test_force_of_a_strut_counts_by_its_size() -> None:
    assert follow([0.0, 1.0], [1.0, -1.0], [0.0, -6.0]).episodes()[0][3] == 6.0


def test_asking_in_the_middle_changes_nothing() -> None:
    times, looseness, force = range(5), [1.0, -1.0, 1.0, -1.0, -1.0], [0.0, 2.0, 0.0, 3.0, 4.0]
    quiet = follow(times, looseness, force)
    asked = SlackEpisodes(np.array([True]))
    for time, loose, f in zip(times, looseness, force, strict=True):
        asked.update(time, np.array([loose]), np.array([f]))
        asked.fields()
    assert asked.episodes() == quiet.episodes()


def test_a_single_step_has_a_share_of_all_or_nothing() -> None:
    assert follow([0.0], [[1.0, -1.0]], np.zeros((1, 2))).share().tolist() == [1.0, 0.0]


def test_fields_without_an_episode_have_no_rows() -> None:
    fields = follow([0.0, 1.0], [-1.0, -1.0], [1.0, 1.0]).fields()
    assert {path: f.values.shape for path, f in fields.items()} == {
        "slack/member": (0,),
        "slack/start": (0,),
        "slack/end": (0,),
        "slack/snatch_force": (0,),
        "slack/time_of_snatch": (0,),
        "slack_share": (1,),
    }
    assert fields["slack/member"].values.dtype == np.int64


WALKS = arrays(float, st.tuples(st.integers(1, 15), st.integers(1, 4)), elements=st.integers(-3, 3))


@given(WALKS)
def test_episodes_are_those_of_a_plain_loop(looseness: np.ndarray) -> None:
    times = 0.1 * np.arange(len(looseness))
    force = np.where(looseness > 0.0, 0.0, 1.0 - looseness)
    found = np.array(follow(times, looseness, force).episodes()).reshape(-1, 5)
    plain = [
        row for member in range(looseness.shape[1]) for row in plain_loop(member, times, looseness, force)
    ]
    # same arithmetic in both, so equal to the last bit
    np.testing.assert_array_equal(found, np.array(sorted(plain, key=lambda r: (r[1], r[0]))).reshape(-1, 5))


def plain_loop(member, times, looseness, force) -> list[tuple[int, float, float, float, float]]:
    """Episodes of one member by scanning its whole history."""
    a, f, rows = looseness[:, member], force[:, member], []
    k = 0
    while k < len(a):
        if a[k] <= 0.0:
            k += 1
            continue
        start = times[k] if k == 0 else crossing(times, a, k)
        while k < len(a) and a[k] > 0.0:
            k += 1
        if k == len(a):
            rows.append((member, start, np.nan, np.nan, np.nan))
            break
        taut = k
        while k < len(a) and a[k] <= 0.0:
            k += 1
        hardest = taut + np.abs(f[taut:k]).argmax()
        rows.append((member, start, crossing(times, a, taut), np.abs(f[hardest]), times[hardest]))
    return rows


def crossing(times, a, k) -> float:
    return times[k - 1] + (times[k] - times[k - 1]) * (a[k - 1] / (a[k - 1] - a[k]))
