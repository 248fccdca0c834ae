"""Reading a results file: what it answers, and what it says when it cannot."""

from __future__ import annotations

import os

import h5py
import numpy as np
import pytest

from fake_mast import FakeHistory, FakeMast, modes_record, static_record
from results_files import write
from tautbar.errors import InputError, ResultsError
from tautbar.store import open_results

MAST = FakeMast()


@pytest.fixture(scope="module")
def path(tmp_path_factory):
    path = tmp_path_factory.mktemp("results") / "mast.h5"
    return write(path, MAST, static_record(MAST), modes_record(MAST), FakeHistory(MAST, every=4, steps=201))


@pytest.fixture(scope="module")
def results(path):
    with open_results(path) as results:
        yield results


def test_the_model_is_there(results) -> None:
    assert results.title == "Tide-gauge mast"
    assert results.joints == tuple(MAST.joints)
    assert results.members == tuple(MAST.members)
    np.testing.assert_array_equal(results.positions, MAST.positions)
    np.testing.assert_array_equal(results.ends, MAST.ends)
    assert {name: len(members) for name, members in results.groups.items()} == {
        "legs": 18,
        "braces": 18,
        "rings": 18,
        "guys": 6,
    }
    assert results.model_text.startswith('title = "Tide-gauge mast"')
    assert results.tables == {"tables/legs.csv": "name,start,end\n"}
    assert results.warnings == ("a warning",)
    assert results.model("members/kind")[-1] == "tension-only"
    assert results.model("members/axial_stiffness")[0] == 2e7


def test_words_come_back_as_they_were(results) -> None:
    record, result = static_record(MAST), results["standing"]
    for key in ("name", "kind", "status", "outcome", "acting", "audit_lines", "warnings", "sources"):
        assert getattr(result, key) == getattr(record, key), key
    assert dict(result.settings) == record.settings
    assert result.measured_from == record.measured_from


def test_values_come_back_as_they_were(results) -> None:
    record, result = static_record(MAST), results["standing"]
    for path, field in record.fields.items():
        np.testing.assert_array_equal(result.values(path), field.values, err_msg=path)


def test_one_joint_or_member_by_name(results) -> None:
    record = static_record(MAST)
    joint, member = list(MAST.joints).index("m3b"), list(MAST.members).index("guy-3-2")
    np.testing.assert_array_equal(results["standing"].displacement("m3b"), record["displacement"][:, joint])
    np.testing.assert_array_equal(results["standing"].reaction("m3b"), record["reaction"][:, joint])
    np.testing.assert_array_equal(
        results["standing"].axial_force("guy-3-2"), record["axial_force"][:, member]
    )
    np.testing.assert_array_equal(results["ringing"].shape("m3b"), modes_record(MAST)["shape"][:, joint])
    assert (
        results["standing"].at("axial_force", loading="dead", member="guy-3-2")
        == record["axial_force"][0, member]
    )


def test_datasets_are_not_read_before_they_are_asked_for(results) -> None:
    dataset = results["lantern dropped"]["displacement"]
    assert isinstance(dataset, h5py.Dataset)
    assert dataset[10:12, 0].shape == (2, 3)


def test_peaks_are_a_table_over_every_computed_step(results) -> None:
    history = FakeHistory(MAST, steps=201)
    list(history.frames())
    record = history.record()
    table = results["lantern dropped"].peak("axial_force")
    assert table.dtype.names == ("member", "min", "time_of_min", "max", "time_of_max")
    row = table[table["member"] == "guy-6-1"][0]
    member = list(MAST.members).index("guy-6-1")
    assert row["max"] == record["peaks/axial_force/max"][member]
    assert row["time_of_max"] == record["peaks/axial_force/time_of_max"][member]
    moved = results["lantern dropped"].peak("displacement")
    assert moved.dtype.names[:2] == ("joint", "direction")
    assert len(moved) == 24 * 3
    assert moved[1].tolist()[:2] == ("m0a", "y")
    spot = moved[(moved["joint"] == "m6c") & (moved["direction"] == "x")][0]
    assert spot["min"] == record["peaks/displacement/min"][list(MAST.joints).index("m6c"), 0]


def test_slack_episodes_are_a_table_with_names(results) -> None:
    table = results["lantern dropped"].slack_episodes
    assert table.dtype.names == ("member", "start", "end", "snatch_force", "time_of_snatch")
    assert set(table["member"].tolist()) <= {name for name in MAST.members if name.startswith("guy")}
    assert (table["end"] > table["start"]).all()


def test_the_audit_is_numbers_by_name(results) -> None:
    assert results["ringing"].audit["sturm_count"] == 2
    np.testing.assert_array_equal(results["ringing"].audit["residual"], [1e-9, 2e-9])
    assert set(results["lantern dropped"].audit) == {"unaccounted"}


def test_paths_are_those_of_the_quantities(results) -> None:
    assert set(results["ringing"].paths()) == {
        "frequency", "shape", "participation_factor", "audit/sturm_count", "audit/residual", "mode",
    }  # fmt: skip
    assert "shape" in results["ringing"]
    assert "peaks" not in results["lantern dropped"]  # a group
    assert 3 not in results["ringing"]


@pytest.mark.parametrize(
    ("ask", "message"),
    [
        (lambda r: r["lantern droped"], 'no analysis "lantern droped" (did you mean "lantern dropped"?)'),
        (lambda r: r["x"], 'no analysis "x" (there is "standing", "ringing", "lantern dropped")'),
        (lambda r: r["ringing"]["shpe"], 'no quantity of "ringing" "shpe" (did you mean "shape"?)'),
        (lambda r: r["standing"].axial_force("guy-6-9"), 'no member "guy-6-9" (did you mean "guy-6-3"'),
        (
            lambda r: r["standing"].displacement("??"),
            'no joint "??" (there are 24, such as "m0a", "m0b", "m0c")',
        ),
        (lambda r: r["lantern dropped"].peak("velocity"), 'no peaks in "lantern dropped" of "velocity"'),
        (lambda r: r["ringing"].peak("velocity"), 'no peaks in "ringing" of "velocity" (there is none)'),
        (lambda r: r["standing"].at("axial_force", joint="m0a"), 'has no axis "joint", only loading, member'),
        (lambda r: r.model("members/knd"), "(did you mean"),
        (
            lambda r: r["standing"].axial_force("guys"),
            '"guys" is a group of 6 members, not one member; name one of guy-3-1, guy-3-2, guy-3-3, guy-6-1',
        ),
        (
            lambda r: r["standing"].peak("axial_force"),
            'has no peaks in time; its extremes over the loadings are in values("envelope/min")',
        ),
    ],
)
def test_unknown_names_answer_with_the_nearest(results, ask, message) -> None:
    with pytest.raises(InputError) as told:
        ask(results)
    assert message in str(told.value)
    assert told.value.exit_code == 2


def test_a_result_can_be_gone_through(results) -> None:
    result = results["ringing"]
    assert list(result) == list(result.keys()) == list(result.paths())
    assert {path: result[path].shape for path in result}["frequency"] == (2,)
    assert dict(result)["shape"] == result["shape"]


def test_names_of_an_axis_are_their_own_labels(results) -> None:
    result = results["standing"]
    assert result.axes("loading") == ("loading",)
    assert result.labels("loading", 0) == ("dead", "dead + wind x", "dead + wind -x")


def test_up_is_that_of_the_model(results) -> None:
    assert results.up == 2


@pytest.mark.parametrize(
    ("words", "up"), [("", 2), ('up = "y"', 1), ('plane = "xy"', 1), ('plane = "xz"', 2), ('up = "x"', 0)]
)
def test_up_follows_the_words_of_the_model(path, tmp_path, words, up) -> None:
    other = copy_of(path, tmp_path)
    with h5py.File(other, "r+") as file:
        file["provenance/model"][()] = words
    with open_results(other) as results:
        assert results.up == up


def test_it_is_a_mapping(results) -> None:
    assert len(results) == 3
    assert "standing" in results
    assert "x" not in results
    assert results.get("x") is None


def test_a_closed_file_says_so(path) -> None:
    with open_results(path) as results:
        assert "open" in repr(results)
        assert repr(results["ringing"]) == "<Result 'ringing': modes, complete>"
    assert "closed" in repr(results)


# Files that cannot be read ------------------------------------------------------------------------


def test_no_file(tmp_path) -> None:
    with pytest.raises(InputError, match="there is no such file"):
        open_results(tmp_path / "a.h5")
    with pytest.raises(InputError, match="this is a folder"):
        open_results(tmp_path)


def test_no_hdf5(tmp_path) -> None:
    (tmp_path / "a.h5").write_text("a letter")
    with pytest.raises(InputError, match=r"this is no results file \(not HDF5\)"):
        open_results(tmp_path / "a.h5")


def test_hdf5_of_another(tmp_path) -> None:
    h5py.File(tmp_path / "a.h5", "w").close()
    with pytest.raises(InputError, match="this is HDF5, but no results file of this program"):
        open_results(tmp_path / "a.h5")


def test_a_newer_format(path, tmp_path) -> None:
    newer = copy_of(path, tmp_path)
    with h5py.File(newer, "r+") as file:
        file.attrs["format_version"] = 2
        file.attrs["program"] = "tautbar 9.0"
    with pytest.raises(
        InputError, match=r"written in format 2 by tautbar 9\.0; this version reads up to format 1"
    ):
        open_results(newer)


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.999])
def test_a_file_cut_short(path, tmp_path, share) -> None:
    cut = copy_of(path, tmp_path)
    os.truncate(cut, int(share * cut.stat().st_size))
    with pytest.raises(ResultsError, match="the file is damaged or cut short"):
        open_results(cut)


def test_a_file_with_parts_missing(path, tmp_path) -> None:
    part = copy_of(path, tmp_path)
    with h5py.File(part, "r+") as file:
        del file["member"]
    with pytest.raises(ResultsError, match="parts of it are missing"):
        open_results(part)


def test_a_changed_byte_in_a_history_is_found(path, tmp_path) -> None:
    changed = copy_of(path, tmp_path)
    with h5py.File(changed) as file:
        place = file["analyses/lantern dropped/axial_force"].id.get_chunk_info(0).byte_offset
    with open(changed, "r+b") as raw:
        raw.seek(place + 100)
        byte = raw.read(1)
        raw.seek(place + 100)
        raw.write(bytes([byte[0] ^ 1]))
    with open_results(changed) as results, pytest.raises(ResultsError, match="axial_force is damaged"):
        results["lantern dropped"].axial_force("guy-6-1")


def copy_of(path, folder):
    copy = folder / "copy.h5"
    copy.write_bytes(path.read_bytes())
    return copy
