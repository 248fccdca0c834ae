"""Plots: that they show what is in the file, and say what they cannot."""

from __future__ import annotations

from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure

from fake_mast import FakeHistory, FakeMast, modes_record, static_record
from results_files import write
from tautbar.errors import InputError
from tautbar.records.fields import Field, Record
from tautbar.store import open_results
from tautbar.views.drawing import Drawing
from tautbar.views.envelopes import bars, envelope
from tautbar.views.gallery import draw, list_plots, plots_of, save
from tautbar.views.slackness import _spell

MAST = FakeMast()


@pytest.fixture(scope="module")
def results(tmp_path_factory):
    path = tmp_path_factory.mktemp("results") / "mast.h5"
    failed = replace(static_record(MAST, "gale"), status="failed", outcome="NOT A RESULT: no balance")
    history = FakeHistory(MAST, every=2, steps=200)
    write(path, MAST, static_record(MAST), modes_record(MAST), history, failed, nothing_found())
    with open_results(path) as results:
        yield results


def nothing_found() -> Record:
    record = static_record(MAST, "storm", "failed")
    lost = {
        k: replace(f, values=np.full(f.values.shape, np.nan))
        for k, f in record.fields.items()
        if f.unit in "mN"
    }
    converged = Field(np.zeros(3, dtype=np.int8), "1", "converged", ("loading",))
    return replace(record, fields={**record.fields, **lost, "converged": converged})


def axes_of(figure: Figure):
    return figure.axes[0]


def words_of(figure: Figure) -> str:
    axes = axes_of(figure)
    legend = axes.get_legend()
    texts = [axes.get_title(loc="left"), axes.get_xlabel(), axes.get_ylabel()]
    texts += [text.get_text() for text in axes.texts] + [a.get_ylabel() for a in figure.axes[1:]]
    texts += [text.get_text() for text in legend.get_texts()] if legend else []
    return "\n".join([*texts, figure.get_suptitle()])


def test_each_result_gives_the_plots_it_has_data_for(results) -> None:
    found = {name: set(plots_of(result)) for name, result in results.items()}
    assert found["standing"] == {"structure", "displaced", "forces"}
    assert found["ringing"] == {"structure", "mode"}
    assert found["lantern dropped"] == {"structure", "displaced", "history", "forces", "slack", "energy"}


def test_the_list_names_plots_and_their_choices(results) -> None:
    text = list_plots(results)
    assert "ringing (modes, complete)\n  structure " in text
    assert "  mode        shape of a mode [--mode --scale --view]\n" in text
    assert "coloured by axial force [--loading --scale --view]\n" in text  # a static analysis has no time
    assert "coloured by axial force [--time --scale --view]\n" in text
    assert text.isascii()


OFTEN = ("structure", "displaced", "mode", "history", "forces", "slack", "energy")
FILES = [(what, ending) for what in OFTEN for ending in (".png", ".svg")] + [
    ("history", ".pdf"),
    ("mode", ".pdf"),
]


@pytest.mark.parametrize(("what", "ending"), FILES)
def test_the_same_plot_gives_the_same_bytes(results, tmp_path, what, ending) -> None:
    result = results["ringing" if what == "mode" else "lantern dropped"]
    paths = [tmp_path / (name + ending) for name in "ab"]
    for path in paths:
        save(draw(result, what), path)
    assert paths[0].read_bytes() == paths[1].read_bytes()
    assert paths[0].stat().st_size > 3000


def test_text_stays_text_in_svg(results, tmp_path) -> None:
    save(draw(results["lantern dropped"], "history", member="guy-6-1"), tmp_path / "a.svg")
    assert "axial force, tension + [kN]" in (tmp_path / "a.svg").read_text("utf-8")


def test_settings_of_the_user_change_nothing(results, tmp_path) -> None:
    import matplotlib

    save(draw(results["lantern dropped"], "energy"), tmp_path / "a.png")
    with matplotlib.rc_context({"lines.linewidth": 9.0, "axes.facecolor": "black"}):
        save(draw(results["lantern dropped"], "energy"), tmp_path / "b.png")
    assert (tmp_path / "a.png").read_bytes() == (tmp_path / "b.png").read_bytes()


def test_the_displaced_shape_is_the_loading_asked_for_at_the_scale_asked_for(results) -> None:
    figure = draw(results["standing"], "displaced", loading="dead + wind x", scale=3.0)
    coloured = next(c for c in axes_of(figure).collections if c.get_array() is not None)
    force, slack = MAST.forces(0.35), (MAST.looseness(0.35) > 0.0)
    np.testing.assert_allclose(coloured.get_array(), force[~slack] / 1e3, rtol=1e-15)
    drawing = Drawing(results["standing"])
    place = drawing.seen(MAST.positions + 3.0 * MAST.sway(0.35))[MAST.ends[~slack]]
    np.testing.assert_allclose([p.vertices for p in coloured.get_paths()], place, rtol=1e-12)
    text = words_of(figure)
    assert "standing: dead + wind x" in text
    assert "shown 3 times" in text
    assert f"slack ({slack.sum()})" in text
    assert "axial force, tension + [kN]" in text


def test_the_first_loading_is_the_default_and_the_scale_a_round_number(results) -> None:
    # 20 mm on a mast of 24 m with anchors 24 m apart: 8 % of 42 m is 3.4 m, so 100 times (2 m), not 200
    assert "standing: dead\ngreatest displacement 20.0 mm, shown 100 times" in words_of(
        draw(results["standing"], "displaced")
    )


def test_colours_are_the_same_on_both_sides_of_zero(results) -> None:
    figure = draw(results["standing"], "displaced", loading="dead + wind x")
    coloured = next(c for c in axes_of(figure).collections if c.get_array() is not None)
    assert coloured.norm.vmin == -coloured.norm.vmax


def test_a_history_is_shown_at_its_greatest_displacement(results) -> None:
    result = results["lantern dropped"]
    moved = np.abs(result.values("displacement")).max(axis=(1, 2))
    assert f"at {result.time[moved.argmax()]:.4g} s" in words_of(draw(result, "displaced"))
    assert "at 1.24 s" in words_of(draw(result, "displaced", time=1.23))


def test_a_loading_without_balance_shows_nothing(results) -> None:
    text = words_of(draw(results["storm"], "displaced"))
    assert "no balance was found: there is nothing to show" in text
    assert text.count("FAILED") == 1


def test_what_is_not_complete_says_so_above_the_plot(results) -> None:
    assert draw(results["gale"], "forces").get_suptitle().startswith("FAILED: NOT A RESULT: no balance")
    assert draw(results["standing"], "forces").get_suptitle() == ""


def test_a_mode_swings_both_ways(results) -> None:
    figure = draw(results["ringing"], "mode", mode=2)
    rest, other, one = [
        np.array([p.vertices for p in c.get_paths()])
        for c in axes_of(figure).collections
        if isinstance(c, LineCollection)
    ]
    np.testing.assert_allclose((one + other) / 2.0, rest, atol=1e-12)
    assert "ringing: mode 2, 4.700 Hz" in words_of(figure)


def test_a_history_plot_has_the_peaks_of_every_computed_step(results) -> None:
    result = results["lantern dropped"]
    figure = draw(result, "history", member="guy-6-1")
    peak = result.peak("axial_force")
    row = peak[peak["member"] == "guy-6-1"][0]
    lines = axes_of(figure).get_lines()
    np.testing.assert_allclose(lines[0].get_ydata(), result.axial_force("guy-6-1") / 1e3, rtol=1e-6)
    spots = [(line.get_xdata()[0], line.get_ydata()[0]) for line in lines[1:]]
    np.testing.assert_allclose(
        spots, [(row["time_of_min"], row["min"] / 1e3), (row["time_of_max"], row["max"] / 1e3)], rtol=1e-15
    )
    assert f"to {row['max'] / 1e3:.1f} kN at {row['time_of_max']:.4g} s" in words_of(figure)


def test_a_joint_is_drawn_in_the_directions_it_moves(results) -> None:
    text = words_of(draw(results["lantern dropped"], "history", joint="m3a"))
    assert "lantern dropped: displacement of joint m3a" in text
    assert "displacement [mm]" in text
    assert "\nx from" in text
    assert "\ny from" in text
    assert "\nz from" not in text


def test_quantities_without_peaks_are_drawn_all_the_same(results) -> None:
    text = words_of(draw(results["lantern dropped"], "history", joint="m6a", quantity="velocity"))
    assert "velocity [m/s]" in text
    assert "lantern dropped: displacement of joint m6" in words_of(
        draw(results["lantern dropped"], "history")
    )


def test_the_envelope_is_over_loadings_or_every_computed_step(results) -> None:
    static = envelope(results["standing"])
    force = np.array([MAST.forces(a) for a in (0.02, 0.35, -0.2)])
    np.testing.assert_array_equal(static.low, force.min(axis=0))
    np.testing.assert_array_equal(static.high, force.max(axis=0))
    history = FakeHistory(MAST, steps=200)
    every = np.array([MAST.forces(history.amount(4.0 * k / 200)) for k in range(201)])
    np.testing.assert_array_equal(envelope(results["lantern dropped"]).high, every.max(axis=0))
    assert np.isnan(envelope(results["storm"]).low).all()


def test_the_range_of_forces_shows_the_greatest_that_can_be_read(results) -> None:
    figure = draw(results["standing"], "forces")
    labels = [label.get_text() for label in axes_of(figure).get_yticklabels()]
    whole = envelope(results["standing"])
    size = np.maximum(np.abs(whole.low), np.abs(whole.high))
    greatest = {g: max(size[whole.members.index(m)] for m in ms) for g, ms in results.groups.items()}
    order = sorted(greatest, key=lambda group: -greatest[group])
    assert labels == [f"{group} ({len(results.groups[group])})" for group in order]


def test_the_range_of_forces_opens_a_group(results) -> None:
    figure = draw(results["standing"], "forces", member="guys")
    labels = [label.get_text() for label in axes_of(figure).get_yticklabels()]
    assert sorted(labels) == sorted(results.groups["guys"])
    assert "range of axial force of guys over 3 loadings" in words_of(figure)
    assert "\ndead + wind x" in words_of(figure)  # what governs, beside a bar


def test_what_governs_a_row_is_named(results) -> None:
    row = next(bar for bar in bars(results["standing"]) if bar.name == "guys (6)")
    force = np.array([MAST.forces(a) for a in (0.02, 0.35, -0.2)])[:, MAST.ties]
    loading, guy = np.unravel_index(force.argmax(), force.shape)
    assert (row.low, row.high) == (force.min(), force.max())
    names = ["dead", "dead + wind x", "dead + wind -x"]
    assert row.governing == f"{results.groups['guys'][guy]}, {names[loading]}"
    over = next(bar for bar in bars(results["lantern dropped"], "guy-6-1"))
    peak = results["lantern dropped"].peak("axial_force")
    assert over.governing == f"at {peak[peak['member'] == 'guy-6-1']['time_of_max'][0]:.4g} s"


def test_the_longest_bar_has_room_beyond_it(results) -> None:
    axes = axes_of(draw(results["standing"], "forces"))
    low, high = axes.get_xlim()
    ends = [end for bar in axes.patches for end in (bar.get_x(), bar.get_x() + bar.get_width())]
    assert low < min(ends) - 0.02 * (high - low)
    assert high > max(ends) + 0.02 * (high - low)


def test_the_slack_plot_has_a_bar_for_each_episode(results) -> None:
    result = results["lantern dropped"]
    figure = draw(result, "slack")
    episodes = result.slack_episodes
    bars = sum(len(c.get_paths()) for c in axes_of(figure).collections)
    assert bars == len(episodes)
    hardest = episodes[np.nanargmax(episodes["snatch_force"])]
    words = f", {hardest['snatch_force'] / 1e3:.1f} kN at {hardest['time_of_snatch']:.4g} s"
    assert words in words_of(figure)


def test_a_group_in_the_slack_plot_is_shaded_by_how_many_were_slack() -> None:
    """Three ties: one slack from 1 to 4 s, one from 2 to 3 s, one never; the bar beside them cannot be."""
    kinds = [("bar", "web"), *[("tension-only", "web")] * 3]
    names = ("b", "t1", "t2", "t3")
    episodes = np.array(
        [("t1", 1.0, 4.0, 5.0, 4.5), ("t2", 2.0, 3.0, 9.0, 3.5)],
        dtype=[("member", "U8"), *((n, float) for n in ("start", "end", "snatch_force", "time_of_snatch"))],
    )
    model = SimpleNamespace(members=names, groups={"web": names}, model=lambda path: np.array(kinds)[:, 0])
    result = SimpleNamespace(
        members=names, ropes={}, results=model, members_of=lambda name: model.groups.get(name, ())
    )
    spell = _spell("web", episodes, 5.0, result)
    assert spell.label == "web (3)"
    assert list(zip(spell.start, spell.end, spell.share, strict=True)) == [
        (1.0, 2.0, 1 / 3),
        (2.0, 3.0, 2 / 3),
        (3.0, 4.0, 1 / 3),
    ]
    assert (spell.time, spell.snatch, spell.snatch_time, spell.to_the_end) == (3.0, 9.0, 3.5, False)


def test_slack_to_the_end_and_no_slack_are_said(tmp_path) -> None:
    short = FakeHistory(MAST, name="short", steps=15, duration=0.15)
    still = FakeHistory(MAST, name="still", steps=2, duration=0.001)
    with open_results(write(tmp_path / "a.h5", MAST, short, still)) as results:
        assert "%, slack to the end" in words_of(draw(results["short"], "slack"))
        assert "still: no member went slack" in words_of(draw(results["still"], "slack"))


def test_the_energy_plot_has_what_there_is(results) -> None:
    result = results["lantern dropped"]
    figure = draw(result, "energy")
    by_name = {line.get_label(): line.get_ydata() for line in axes_of(figure).get_lines()}
    stored = result.values("energy/strain") + result.values("energy/load_potential")
    both = by_name["strain and potential of loads, change"]
    # the sum of two numbers of 50 to 900 J, rounded in another order
    np.testing.assert_allclose(both, stored - stored[0], atol=1e-12)
    assert both[0] == 0.0
    np.testing.assert_array_equal(by_name["work of events"], result.values("energy/event_work"))
    assert "greatest left over 4.00e-09 J" in words_of(figure)


def test_a_history_cut_before_its_first_step_is_drawn_without_a_fault(tmp_path) -> None:
    cut = FakeHistory(MAST, steps=-1)
    with open_results(write(tmp_path / "a.h5", MAST, cut)) as results:
        for what in ("history", "energy"):
            assert "no step was" in words_of(draw(results["lantern dropped"], what))
        with pytest.raises(InputError, match="has no stored step"):
            draw(results["lantern dropped"], "displaced")


def test_plane_structures_are_seen_square_on(tmp_path) -> None:
    flat = FakeMast()
    flat.joints = {name: (x, 0.0, z) for name, (x, _, z) in flat.joints.items()}
    with open_results(write(tmp_path / "a.h5", flat, static_record(flat))) as results:
        drawing = Drawing(results["standing"])
        np.testing.assert_array_equal(drawing.seen(drawing.positions), flat.positions[:, [0, 2]])


def test_names_in_a_drawing_do_not_cover_each_other(results) -> None:
    figure = draw(results["standing"], "structure")
    figure.draw_without_rendering()
    boxes = [text.get_window_extent() for text in axes_of(figure).texts]
    assert len(boxes) > 20
    assert not any(a.overlaps(b) for k, a in enumerate(boxes) for b in boxes[:k])


@pytest.mark.parametrize(
    ("name", "what", "choices", "message"),
    [
        ("standing", "displced", {}, 'no plot "displced" (did you mean "displaced"?)'),
        (
            "ringing",
            "forces",
            {},
            '"ringing" (modes, complete) cannot give the plot "forces"; it can give struc',
        ),
        (
            "ringing",
            "mode",
            {"joint": "m0a"},
            'plot "mode" has no choice "joint" (its choices: mode, scale, view)',
        ),
        ("ringing", "structure", {"view": "left"}, 'view "left": choose front, side, top, or azimuth'),
        ("standing", "forces", {"member": "guy"}, 'no member or group "guy" (did you mean "guys"'),
        ("lantern dropped", "slack", {"member": "legs"}, '"legs" is in the model, but "lantern dropped" has'),
        ("ringing", "mode", {"mode": 3}, 'mode 3: "ringing" has modes 1 to 2'),
        ("standing", "displaced", {"loading": "ded"}, 'no loading "ded" (did you mean "dead"'),
        ("standing", "displaced", {"time": 1.0}, '(static) has no choice "time": choose a loading'),
        ("lantern dropped", "displaced", {"time": 9.0}, "time 9 s is outside what was stored: 0 to 4 s"),
        ("lantern dropped", "displaced", {"loading": "dead"}, 'has no choice "loading": choose a time'),
        ("lantern dropped", "history", {"joint": "m9"}, 'no joint "m9"'),
        (
            "lantern dropped",
            "history",
            {"joint": "m0a", "member": "guy-6-1"},
            "a joint or a member, not both",
        ),
        (
            "lantern dropped",
            "history",
            {"member": "guy-6-1", "quantity": "velocity"},
            "is of a joint: name a joint",
        ),
        (
            "lantern dropped",
            "history",
            {"quantity": "energy/kinetic"},
            "is not over time, of a joint or member",
        ),
    ],
)
def test_what_cannot_be_drawn_is_said(results, name, what, choices, message) -> None:
    with pytest.raises(InputError) as told:
        draw(results[name], what, **choices)
    assert message in str(told.value)


def test_only_three_kinds_of_file(results, tmp_path) -> None:
    figure = draw(results["standing"], "forces")
    with pytest.raises(InputError, match=r"a plot is saved as \.png, \.svg or \.pdf"):
        save(figure, tmp_path / "a.bmp")
    with pytest.raises(InputError, match="cannot be written"):
        save(figure, tmp_path / "absent" / "a.png")


def test_a_single_loading_has_bars_from_zero(tmp_path) -> None:
    record = static_record(MAST)
    one = {k: replace(f, values=f.values[:1]) for k, f in record.fields.items()}
    with open_results(write(tmp_path / "a.h5", MAST, replace(record, fields=one))) as results:
        figure = draw(results["standing"], "forces", member="guys")
    spans = sorted(
        (bar.get_x(), bar.get_x() + bar.get_width()) for bar in axes_of(figure).patches if bar.get_width()
    )
    force = MAST.forces(0.02)[MAST.ties] / 1e3
    np.testing.assert_allclose(spans, sorted((min(f, 0.0), max(f, 0.0)) for f in force.tolist()), atol=1e-12)
    assert "axial force of guys over 1 loading" in words_of(figure)


def test_nothing_found_is_drawn_without_a_fault(results, tmp_path) -> None:
    save(draw(results["storm"], "forces"), tmp_path / "a.png")


def test_supported_joints_are_marked_but_not_for_the_plane_of_a_plane_model(tmp_path) -> None:
    held = np.zeros((24, 3))
    held[:, 1] = 1.0
    held[-3:] = 1.0
    mast = FakeMast()
    mast.more_fields["supports/held"] = Field(held, "1", "held", ("joint", "direction"))
    with open_results(write(tmp_path / "a.h5", mast, static_record(mast))) as results:
        axes = axes_of(draw(results["standing"], "structure"))
    marks = next(line for line in axes.get_lines() if line.get_label() == "supported joint")
    assert len(marks.get_xdata()) == 3


def test_of_a_part_that_was_stored_only_that_part_is_drawn_displaced(tmp_path) -> None:
    joints, members = ["m6b", "m6a", "m5a"], ["ring-6a", "leg-5a", "guy-6-1"]
    rows = [list(MAST.joints).index(name) for name in joints]
    moved, force = MAST.sway(0.1)[rows][np.newaxis], np.array([[1e3, -2e3, 3e3]])
    fields = {
        "stored_joint": Field(np.array(joints), "1", "joints stored", ("stored_joint",)),
        "stored_member": Field(np.array(members), "1", "members stored", ("stored_member",)),
        "loads": Field(np.array(["dead"]), "1", "loads", ("loading",)),
        "displacement": Field(moved, "m", "displacement", ("loading", "stored_joint", "direction")),
        "axial_force": Field(force, "N", "axial force", ("loading", "stored_member")),
    }
    record = replace(static_record(MAST), fields=fields)
    with open_results(write(tmp_path / "a.h5", MAST, record)) as results:
        figure = draw(results["standing"], "displaced", scale=1.0)
        ends, place = results.ends, Drawing(results["standing"]).seen(MAST.positions + MAST.sway(0.1))
    coloured = next(c for c in axes_of(figure).collections if c.get_array() is not None)
    # the guy's anchor was not stored; members come in the order of the model
    assert sorted(coloured.get_array().tolist()) == [-2.0, 1.0]
    drawn = [ends[list(MAST.members).index(name)] for name in ("leg-5a", "ring-6a")]
    expected = {tuple(place[pair].ravel().round(9)) for pair in drawn}
    assert {tuple(p.vertices.ravel().round(9)) for p in coloured.get_paths()} == expected
