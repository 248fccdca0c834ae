"""CSV tables: units in heads, separators, every bad cell with its row, and many rows."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from tautbar.errors import Mistake, ModelError
from tautbar.model import Model, read_model
from tautbar.model.reading import model_from_text

HEAD = """
[tables]
joints = "joints.csv"
members = "members.csv"
[units]
force = "kN"
[sections.s]
axial_stiffness = "10 MN"
mass_per_length = 2
[[supports]]
joints = ["a"]
fixed = ["x", "y", "z"]
"""
JOINTS = "joint,x [mm],y,z\na,0,0,0\nb,1500,0,0\nc,1500,2 ft,0\nd,0,0,3\n"
MEMBERS = """member,from,to,kind,section,pretension,pieces,sag [mm]
m.1,a,b,,s,,,
m.2,b,c,bar,s,5,,
tie,a,c,tension-only,s,"800 N",,

rope,a,d,hanging,s,3,4,
"""


def read(joints: str = JOINTS, members: str = MEMBERS, head: str = HEAD) -> Model:
    return model_from_text(head, {"joints.csv": joints, "members.csv": members}, file="big/model.toml")


def mistakes(**tables: str) -> tuple[Mistake, ...]:
    with pytest.raises(ModelError) as caught:
        read(**tables)
    return caught.value.mistakes


def test_columns_are_read_in_their_own_or_the_models_units() -> None:
    parts = read().parts
    assert parts.joints.names[:4] == ("a", "b", "c", "d")
    assert list(parts.joints.x)[:4] == [0, 1.5, 1.5, 0]
    assert list(parts.joints.y)[:4] == [0, 0, 0.6096, 0]
    assert parts.members.names == ("m.1", "m.2", "tie", "rope.1", "rope.2", "rope.3", "rope.4")
    assert list(parts.members.pretension)[1:3] == [5000.0, 800.0]
    assert list(parts.members.kind)[:4] == [0, 0, 1, 1]
    assert parts.members.groups["m"] == (0, 1)
    assert (parts.members.hanging[0].given, parts.members.hanging[0].value) == ("pretension", 3000.0)


@pytest.mark.parametrize("separator", [";", "\t"])
def test_other_separators_and_windows_lines(separator: str) -> None:
    other = [t.replace(",", separator).replace("\n", "\r\n") for t in (JOINTS, MEMBERS)]
    assert read(*other).parts == read().parts


def test_plain_tables_mean_the_same_as_tables_read_row_by_row() -> None:
    plain = "member,from,to,section\nm.1,a,b,s\nm.2,b,c,s\nm.3,c,d,s\n"
    with_rope = plain + "m.4,a,c,s\n"
    by_rows = "member,from,to,kind,section,pieces\n" + "".join(
        f"{n},{a},{b},bar,{s},\n" for n, a, b, s in (line.split(",") for line in plain.splitlines()[1:])
    )
    rope = "rope,a,d,hanging,s,3,4,\n"
    heads = "member,from,to,kind,section,pretension,pieces,sag\n"
    rows = [line.split(",") for line in with_rope.splitlines()[1:]]
    long = heads + "".join(f"{n},{a},{b},bar,{s},,,\n" for n, a, b, s in rows) + rope
    bulk, slow = read(members=with_rope).parts.members, read(members=long).parts.members
    assert read(members=plain).parts == read(members=by_rows).parts
    for column in ("start", "end", "kind", "section"):
        assert list(getattr(bulk, column)) == list(getattr(slow, column))[:4]
    assert bulk.names == slow.names[:4]


@pytest.mark.parametrize(
    ("old", "new", "line", "caret", "path", "says"),
    [
        ("b,1500,0,0", "b,1500,0", 3, "b,", 'joint "b"', "3 cells, 4 are wanted"),
        ("b,1500", "b,15OO", 3, "15OO", 'joint "b": x', "unit 'OO' is not known"),
        ("b,1500,0", "b,1500,nan", 3, "nan", 'joint "b": y', "a finite value is wanted, not nan"),
        ("b,1500,0", "b,,0", 3, ",0,0", 'joint "b": x', "the cell is empty"),
        ("b,1500,0", "b,1500,2 kg", 3, "2 kg", 'joint "b": y', "a mass was given, a length is wanted"),
        ("d,0,0,3", "b,0,0,3", 5, "b,", 'joint "b"', "the name 'b' is used twice for joints"),
        ("d,0,0,3", "d,1500,0,0", 5, "d,", 'joint "d"', "in the same place as joint 'b'"),
        ("d,0,0,3", "d*,0,0,3", 5, "d*", 'joint "d*"', "is no name"),
        ("x [mm]", "x [kg]", 1, "x [kg]", "tables.joints: x", "a length is wanted"),
        ("x [mm]", "x [mn]", 1, "x [mn]", "tables.joints: x", "unit 'mn' is not known"),
        (",y,", ",why,", 1, "why", "tables.joints: why", "there is no column 'why'"),
        (",y,", ",z,", 1, "z", "tables.joints: z", "two columns 'z'"),
    ],
)
def test_bad_joint_rows(old: str, new: str, line: int, caret: str, path: str, says: str) -> None:
    says = (
        {"does not fit": "cannot be read"}.get(says, says) if "15OO" not in new else "unit 'OO' is not known"
    )
    found = [m for m in mistakes(joints=JOINTS.replace(old, new, 1)) if m.path == path and says in m.what]
    assert found, mistakes(joints=JOINTS.replace(old, new, 1))
    assert (found[0].file, found[0].line) == ("big/joints.csv", line)
    assert found[0].source_line[found[0].column - 1 :].startswith(caret)


@pytest.mark.parametrize(
    ("old", "new", "line", "caret", "path", "says"),
    [
        ("m.1,a,b", "m.1,a,q", 2, "q", 'member "m.1": to', "there is no joint 'q'"),
        ("m.1,a,b", "m.1,b,b", 2, "m.1", 'member "m.1"', "both its ends are at joint 'b'"),
        ("m.1,a,b", "m.2,a,b", 3, "m.2", 'member "m.2"', "used twice for members"),
        ("b,c,bar,s", "b,c,bar,t", 3, "t,5", 'member "m.2": section', "there is no section 't'"),
        ("b,c,bar", "b,c,baar", 3, "baar", 'member "m.2": kind', "did you mean 'bar'?"),
        ("s,5,", 's,"5 m",', 3, '"5 m"', 'member "m.2": pretension', "a force is wanted"),
        ("hanging,s,3,4", "hanging,s,3,four", 6, "four", 'member "rope": pieces', "not 'four'"),
        ("hanging,s,3,4", "hanging,s,3,1", 6, "1", 'member "rope": pieces', "from 2 to 10000"),
        ("hanging,s,3,4", "hanging,s,,", 6, "rope", 'member "rope"', "must say how long it is"),
        ("hanging,s,3,4,", "hanging,s,3,4,-5", 6, "-5", 'member "rope": sag', "must be above 0, is -5"),
        (
            "hanging,s,3,4,",
            "hanging,s,3,4,50",
            6,
            "50",
            'member "rope": sag',
            "pretension and sag are given",
        ),
        ("m.1,a,b,,s", "m.1,a,,,s", 2, ",,s", 'member "m.1": to', "the cell is empty"),
    ],
)
def test_bad_member_rows(old: str, new: str, line: int, caret: str, path: str, says: str) -> None:
    told = mistakes(members=MEMBERS.replace(old, new, 1))
    found = [m for m in told if m.path == path and says in f"{m.what} {m.hint}"]
    assert found, "\n".join(map(str, told))
    assert (found[0].file, found[0].line) == ("big/members.csv", line)
    assert found[0].source_line[found[0].column - 1 :].startswith(caret)


def test_a_missing_column_is_told_with_those_there_are() -> None:
    told = mistakes(members="member,from,section\nm,a,s\n")
    assert any(m.what == "column 'to' is missing" and "member, from, section" in m.hint for m in told)


def test_rows_are_counted_by_lines_where_quoted_cells_run_over_several() -> None:
    members = 'member,from,to,section,note\nm.1,a,b,s,"two\nlines"\nm.2,b,q,s,\n'
    assert next(m for m in mistakes(members=members) if "joint 'q'" in m.what).line == 4


def test_a_wholly_wrong_column_is_told_of_a_few_times_only() -> None:
    rows = "".join(f"j{i},x,0,0\n" for i in range(500))
    told = [m for m in mistakes(joints="joint,x,y,z\n" + rows) if m.path.endswith(": x")]
    assert len(told) == 21
    assert "479 more rows like it" in told[-1].what


def test_tables_are_written_into_the_toml_text() -> None:
    model = read()
    text = model.to_toml()
    assert "tables" not in text
    assert Model(**tomllib.loads(text)).parts == model.parts
    assert dict(model.files) == {"joints.csv": JOINTS, "members.csv": MEMBERS}


def test_a_pulse_may_be_a_table_in_a_file(tmp_path: Path, gantry: str) -> None:
    (tmp_path / "pulse.csv").write_text("time [ms],factor\n0,0\n2,1\n5,0\n")
    text = gantry.replace('shape = "half-sine"\nduration = "11 ms"', 'shape = "table"\ntable = "pulse.csv"')
    file = tmp_path / "gantry.toml"
    file.write_text(text)
    model = read_model(file)
    pulse = model.parts.events["drop"]
    assert (list(pulse.times), list(pulse.factors)) == ([0, 0.002, 0.005], [0, 1, 0])
    assert pulse.duration == 0.005
    assert Model(**tomllib.loads(model.to_toml())).parts == model.parts
    (tmp_path / "pulse.csv").write_text("time [ms],factor\n0,0\n2,high\n5,0\n")
    with pytest.raises(ModelError) as caught:
        read_model(file)
    mistake = caught.value.mistakes[0]
    assert (mistake.line, mistake.column, mistake.path) == (3, 3, 'event "drop": table: factor')
    assert mistake.file == str(tmp_path / "pulse.csv")


OF_ALL = """
[load_cases.gale]
wind = [ { members = ["*"], toward = [1, 0, 0], pressure = 1 } ]
[[analyses]]
name = "shape"
kind = "form-finding"
loads = "gale"
without = ["m.1"]
force_densities = [ { members = ["*"], value = 1 } ]
[[analyses]]
name = "lengths"
kind = "tune"
loads = "gale"
adjust = ["*"]
targets = [ { members = ["*"], tension = 1 } ]
[[analyses]]
name = "losses"
kind = "static"
loads = "gale"
lose_in_turn = ["*"]
"""


def test_a_large_grid_is_read_and_checked_whole() -> None:
    """About 38,000 rows: the counts are those of a cubic grid, worked out by hand."""
    n = 22
    name = "J{}-{}-{}".format
    cells = [(i, j, k) for i in range(n) for j in range(n) for k in range(n)]
    joints = ["joint,x [mm],y [mm],z [mm]", *(f"{name(*c)},{c[0]}500,{c[1]}500,{c[2]}500" for c in cells)]
    members = ["member,from,to,kind,section"]
    for i, j, k in cells:
        for a, b, c in ((i + 1, j, k), (i, j + 1, k), (i, j, k + 1)):
            if max(a, b, c) < n:
                members.append(f"m.{len(members)},{name(i, j, k)},{name(a, b, c)},bar,s")
    head = HEAD.replace('["a"]', '["J*-*-0"]').replace("_length = 2", "_length = 2\nwind_width = 1") + OF_ALL
    model = read("\n".join(joints), "\n".join(members), head)
    assert len(model.parts.joints) == n**3
    assert len(model.parts.members) == 3 * n * n * (n - 1)
    assert len(model.parts.supports[0].joints) == n * n
    shape, lengths, losses = model.parts.analyses
    assert len(shape.force_densities[0][0]) == len(model.parts.members) - 1
    assert len(lengths.targets[0].members) == len(losses.lose_in_turn) == len(model.parts.members)
    assert sum(model.parts.joints.x) == pytest.approx(n * n * sum(i + 0.5 for i in range(n)))
    bad = "\n".join(members).replace(name(21, 21, 21), name(21, 21, 99))
    with pytest.raises(ModelError) as caught:
        read("\n".join(joints), bad, head)
    lonely, *unknown = sorted(caught.value.mistakes, key=lambda m: m.what != "no member goes to this joint")
    assert lonely.line == len(joints)
    assert [m.line for m in unknown] == [i for i, row in enumerate(bad.split("\n"), 1) if "-99," in row]
