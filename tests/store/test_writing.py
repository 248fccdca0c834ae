"""What stands in a results file, and that others can open it."""

from __future__ import annotations

import hashlib
import json
import os
import signal

import h5py
import numpy as np
import pytest
import xarray

from fake_mast import FakeHistory, FakeMast, modes_record, static_record
from results_files import describe, write
from tautbar.errors import InputError
from tautbar.records.fields import Field, Record
from tautbar.store import DiskFull, ResultsWriter, open_results, undisturbed

MAST = FakeMast()


@pytest.fixture(scope="module")
def path(tmp_path_factory):
    path = tmp_path_factory.mktemp("results") / "mast.h5"
    history = FakeHistory(MAST, every=3, steps=200)
    odd = static_record(MAST, "dead/live")
    return write(path, MAST, static_record(MAST), modes_record(MAST), history, odd)


def datasets(file):
    found = {}
    file.visititems(
        lambda name, thing: found.update({name: thing}) if isinstance(thing, h5py.Dataset) else None
    )
    return found


def test_every_dataset_has_its_unit_its_name_and_a_scale_on_every_axis(path) -> None:
    with h5py.File(path) as file:
        for name, dataset in datasets(file).items():
            assert {"units", "long_name"} <= set(dataset.attrs), name
            if not dataset.is_scale:
                assert all(len(axis) == 1 for axis in dataset.dims), name
                assert [axis[0].shape[0] for axis in dataset.dims] == list(dataset.shape), name


def test_no_type_that_others_cannot_read(path) -> None:
    with h5py.File(path) as file:
        for name, dataset in datasets(file).items():
            assert dataset.dtype.kind in "fiuO", name
            assert dataset.dtype != np.float16, name
            assert dataset.dtype.kind != "O" or h5py.check_string_dtype(dataset.dtype), name
        assert file.libver == ("v110", "v110") or file.libver[0] == "earliest"  # as opened, not as written


def test_the_root_says_what_it_is(path) -> None:
    with h5py.File(path) as file:
        attributes = dict(file.attrs)
    assert attributes["format"] == "tautbar results"
    assert attributes["format_version"] == 1
    assert attributes["Conventions"] == "CF-1.8"
    assert attributes["title"] == "Tide-gauge mast"
    assert set(json.loads(attributes["versions"])) == {"python", "numpy", "scipy", "h5py", "hdf5"}
    assert len(attributes["run_id"]) == 32


def test_the_model_and_its_tables_are_kept_with_their_sums(path) -> None:
    with h5py.File(path) as file:
        model, table = file["provenance/model"], file["provenance/tables/tables\u2215legs.csv"]
        for dataset in (model, table):
            text = dataset.asstr()[()]
            assert dataset.attrs["sha256"] == hashlib.sha256(text.encode()).hexdigest()
        assert file["provenance"].attrs["warnings"].tolist() == ["a warning"]


def test_a_slash_in_a_name_opens_no_group(path) -> None:
    with h5py.File(path) as file:
        assert "dead\u2215live" in file["analyses"]
    with open_results(path) as results:
        assert list(results) == ["standing", "ringing", "lantern dropped", "dead/live"]
        assert results["dead/live"].name == "dead/live"


def test_histories_are_in_blocks_with_sums_and_single_unless_asked(path, tmp_path) -> None:
    double = write(tmp_path / "d.h5", MAST, FakeHistory(MAST, precision="float64", steps=70))
    with h5py.File(path) as file, h5py.File(double) as exact:
        stored = file["analyses/lantern dropped/displacement"]
        assert stored.chunks == (64, 24, 3)
        assert stored.fletcher32
        assert stored.dtype == np.float32
        assert file["analyses/lantern dropped/time"].dtype == np.float64
        assert exact["analyses/lantern dropped/displacement"].dtype == np.float64
        assert exact["analyses/lantern dropped/displacement"].shape == (71, 24, 3)


def test_only_stored_steps_are_stored_and_all_are_in_the_ledger(path) -> None:
    with open_results(path) as results:
        result = results["lantern dropped"]
        # times are 0.02 k, computed in the same way in the history, so equal to the last bit
        np.testing.assert_array_equal(result.time, [4.0 * k / 200 for k in range(0, 201, 3)])
        assert len(result["energy/time"]) == 201
        np.testing.assert_array_equal(
            result.values("displacement"),
            np.float32([MAST.sway(FakeHistory(MAST).amount(t)) for t in result.time]),
        )


GROUPS = {
    "/": {"joint", "member", "direction", "end"},
    "model/joints": {"joint", "direction"},
    "model/members": {"member", "end"},
    "analyses/standing": {"loading", "joint", "member", "direction"},
    "analyses/standing/audit": {"loading"},
    "analyses/ringing": {"mode", "joint", "direction"},
    "analyses/ringing/audit": {"mode"},
    "analyses/lantern dropped": {"time", "joint", "member", "direction"},
    "analyses/lantern dropped/peaks/displacement": {"joint", "direction"},
    "analyses/lantern dropped/energy": {"time"},
    "analyses/lantern dropped/slack": {"episode"},
    "analyses/lantern dropped/audit": set(),
}


@pytest.mark.parametrize(("group", "coordinates"), GROUPS.items())
def test_xarray_opens_each_group_with_its_coordinates(path, group, coordinates) -> None:
    with xarray.open_dataset(path, engine="h5netcdf", group=group) as data:
        data.load()
        assert set(data.coords) == coordinates
        assert set(data.dims) == coordinates


def test_xarray_finds_values_by_name(path) -> None:
    with xarray.open_dataset(path, engine="h5netcdf", group="analyses/lantern dropped") as data:
        first = data.axial_force.sel(member="guy-6-1", time=0.0)
        assert float(first) == np.float32(
            MAST.forces(FakeHistory(MAST).amount(0.0))[list(MAST.members).index("guy-6-1")]
        )
        assert data.axial_force.attrs["units"] == "N"
        assert float(data.displacement.sel(joint="m6a", direction="x", time=0.06)) == np.float32(
            MAST.sway(FakeHistory(MAST).amount(0.06))[list(MAST.joints).index("m6a"), 0]
        )


def test_no_episode_no_loading_and_no_member_are_no_trouble(tmp_path) -> None:
    nothing = np.empty(0)
    fields = {
        "slack/start": Field(nothing, "s", "start", ("episode",)),
        "loads": Field(np.empty(0, dtype="U1"), "1", "loads", ("loading",)),
        "axial_force": Field(np.empty((0, 60)), "N", "axial force", ("loading", "member")),
    }
    path = write(tmp_path / "a.h5", MAST, Record("a", "static", "complete", "", fields=fields))
    for group in ("analyses/a", "analyses/a/slack"):
        with xarray.open_dataset(path, engine="h5netcdf", group=group) as data:
            data.load()
    with open_results(path) as results:
        assert results["a"].acting == ()
        assert results["a"]["axial_force"].shape == (0, 60)


def test_part_of_the_joints_has_a_scale_of_its_own(tmp_path) -> None:
    fields = {
        "stored_joint": Field(np.array(["m6a", "m6b"]), "1", "joints stored", ("stored_joint",)),
        "displacement": Field(np.ones((1, 2, 3)), "m", "u", ("loading", "stored_joint", "direction")),
        "peaks/displacement/max": Field(np.ones((24, 3)), "m", "u", ("joint", "direction")),
    }
    path = write(tmp_path / "a.h5", MAST, Record("a", "static", "complete", "", fields=fields))
    with open_results(path) as results:
        assert results["a"].displacement("m6b").shape == (1, 3)
        with pytest.raises(InputError, match='joint "m0a" is in the model, but "a" did not store it'):
            results["a"].displacement("m0a")


def test_an_axis_that_does_not_fit_its_scale_is_refused(tmp_path) -> None:
    fields = {
        "loading": Field(np.array(["a", "b"]), "1", "loads", ("loading",)),
        "axial_force": Field(np.ones((3, 60)), "N", "axial force", ("loading", "member")),
    }
    with pytest.raises(ValueError, match='axis "loading" has 3 places'):
        write(tmp_path / "a.h5", MAST, Record("a", "static", "complete", "", fields=fields))
    assert os.listdir(tmp_path) == []


# Keeping what is there ---------------------------------------------------------------------------


def test_an_earlier_file_is_kept(tmp_path) -> None:
    path = tmp_path / "mast.h5"
    ids = [run_id(write(path, MAST)) for _ in range(3)]
    assert run_id(path) == ids[2]
    assert run_id(tmp_path / "mast.previous.h5") == ids[1]
    assert sorted(os.listdir(tmp_path)) == ["mast.h5", "mast.previous.h5"]


def test_an_earlier_file_is_replaced_when_told(tmp_path) -> None:
    path = tmp_path / "mast.h5"
    write(path, MAST)
    write(path, MAST, overwrite=True)
    assert os.listdir(tmp_path) == ["mast.h5"]


@pytest.mark.parametrize("overwrite", [False, True])
def test_what_is_no_results_file_is_never_lost(tmp_path, overwrite) -> None:
    path = tmp_path / "mast.h5"
    path.write_text("a letter")
    for _ in range(3):
        write(path, MAST, overwrite=overwrite)
    assert (tmp_path / "mast.previous.h5").read_text() == "a letter"
    open_results(path).close()


def test_a_link_stays_a_link(tmp_path) -> None:
    (tmp_path / "store").mkdir()
    (tmp_path / "mast.h5").symlink_to(tmp_path / "store" / "mast.h5")
    write(tmp_path / "mast.h5", MAST)
    assert (tmp_path / "mast.h5").is_symlink()
    assert os.listdir(tmp_path / "store") == ["mast.h5"]


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("mast.toml", "a results file is HDF5; give it a name that ends in .h5"),
        ("legs.csv", "a results file is HDF5"),
        ("absent/mast.h5", "there is no folder"),
        (".", "this is a folder"),
    ],
)
def test_places_where_no_file_can_be(tmp_path, name, message) -> None:
    with pytest.raises(InputError, match=message) as told:
        ResultsWriter(tmp_path / name)
    assert told.value.exit_code == 2


def test_a_folder_that_may_not_be_written(tmp_path, monkeypatch) -> None:
    def refuse(*_):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr("os.open", refuse)  # tests may run as root, who may write anywhere
    with pytest.raises(InputError, match=r"cannot write in this folder \(Permission denied\)"):
        ResultsWriter(tmp_path / "a.h5")


def test_one_run_at_a_time(tmp_path) -> None:
    first = ResultsWriter(tmp_path / "a.h5")
    with pytest.raises(InputError, match="another run is writing this file"):
        ResultsWriter(tmp_path / "a.h5")
    first.start(describe(MAST))
    first.publish()
    open_results(tmp_path / "a.h5").close()


def test_a_disk_that_is_full_at_the_start(tmp_path, monkeypatch) -> None:
    def full(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("os.posix_fallocate", full)
    with pytest.raises(DiskFull, match="the disk is full"):
        ResultsWriter(tmp_path / "a.h5")
    assert os.listdir(tmp_path) == []


# Signals ------------------------------------------------------------------------------------------


def test_ctrl_c_waits_for_the_end_of_a_write() -> None:
    done = []

    def write_something() -> None:
        with undisturbed():
            os.kill(os.getpid(), signal.SIGINT)
            done.append("whole")

    with pytest.raises(KeyboardInterrupt):
        write_something()
    assert done == ["whole"]
    assert signal.getsignal(signal.SIGINT) is signal.default_int_handler


def test_a_request_to_end_goes_to_who_handles_it(monkeypatch) -> None:
    asked = []
    before = signal.signal(signal.SIGTERM, lambda number, frame: asked.append(number))
    try:
        with undisturbed(), undisturbed():
            os.kill(os.getpid(), signal.SIGTERM)
            assert asked == []
    finally:
        signal.signal(signal.SIGTERM, before)
    assert asked == [signal.SIGTERM]


def run_id(path) -> str:
    with h5py.File(path) as file:
        return str(file.attrs["run_id"])
