"""Members gathered into rows by rope and group."""

from __future__ import annotations

import pytest

from fake_mast import FakeMast, static_record
from fake_ropes import FakeBridge, hanging_record, pieces_record
from results_files import write
from tautbar.errors import InputError
from tautbar.store import open_results
from tautbar.views.rows import gather


@pytest.fixture(scope="module")
def bridge(tmp_path_factory):
    path = tmp_path_factory.mktemp("rows") / "bridge.h5"
    with open_results(write(path, FakeBridge(), hanging_record(), pieces_record())) as results:
        yield results


def names(rows):
    return [(row.name, len(row.places)) for row in rows]


def test_few_members_have_a_row_each(bridge) -> None:
    result = bridge["hanging"]
    assert names(gather(result, result.members)) == [("main.1", 1), ("main.2", 1), ("hanger", 1), ("prop", 1)]


def test_pieces_of_a_rope_stand_in_one_row(bridge) -> None:
    result = bridge["modes"]
    assert result.ropes == {"main.1": ("main.1.1", "main.1.2")}
    rows = gather(result, result.members)
    assert names(rows) == [("main.2", 1), ("hanger", 1), ("prop", 1), ("main.1", 2)]
    assert rows[-1].label == "main.1 (2)"
    assert rows[0].label == "main.2"


def test_a_group_opens_into_ropes_and_a_rope_into_pieces(bridge) -> None:
    result = bridge["modes"]
    assert names(gather(result, result.members, "main")) == [("main.2", 1), ("main.1", 2)]
    assert names(gather(result, result.members, "main.1")) == [("main.1.1", 1), ("main.1.2", 1)]
    assert names(gather(result, result.members, "main.2")) == [("main.2", 1)]


def test_many_members_are_gathered_by_group(tmp_path) -> None:
    mast = FakeMast()
    with open_results(write(tmp_path / "a.h5", mast, static_record(mast))) as results:
        result = results["standing"]
        assert names(gather(result, result.members)) == [
            ("legs", 18), ("braces", 18), ("rings", 18), ("guys", 6),
        ]  # fmt: skip
        assert len(gather(result, result.members, "legs")) == 18
        legs = results.groups["legs"]
        assert len(gather(result, [*legs, *results.groups["guys"][:6]])) == 24  # these can be read
        assert names(gather(result, [*legs, *results.groups["braces"]])) == [("legs", 18), ("braces", 18)]


def test_ropes_that_the_model_cuts_are_known_by_their_chain_of_ties(tmp_path) -> None:
    mast = FakeMast()
    mast.members = {
        "stay.1": ("anchor-1", "m1a", "tension-only", "stay"),
        "stay.2": ("m1a", "m2a", "tension-only", "stay"),
        "legs.1": ("m1a", "m2a", "bar", "legs"),
        "legs.2": ("m2a", "m3a", "bar", "legs"),
        "ties.1": ("m1a", "m2a", "tension-only", "ties"),
        "ties.2": ("m3a", "m4a", "tension-only", "ties"),
    }
    with open_results(write(tmp_path / "a.h5", mast)) as results:
        assert dict(results.ropes) == {"stay": ("stay.1", "stay.2")}


def test_names_that_give_no_row(bridge) -> None:
    result = bridge["hanging"]
    with pytest.raises(InputError, match=r'no member or group "mian" \(did you mean "main"'):
        gather(result, result.members, "mian")
    with pytest.raises(InputError, match='"hanger" is in the model, but "hanging" has nothing of it to show'):
        gather(result, ["prop"], "hanger")
