"""What the words of a model file become: parts in SI, worked out by hand beside each."""

from __future__ import annotations

import math
import pickle
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from tautbar.errors import InputError, ModelError
from tautbar.model import Model, read_model
from tautbar.model.parts import History, Modes, StartFrom, Static
from tautbar.model.reading import model_from_text


@pytest.fixture
def parts(gantry: str):
    return model_from_text(gantry).parts


def test_joints_of_a_plane_model_lie_in_its_plane(parts) -> None:
    assert parts.joints.names[:4] == ("A", "B", "C", "D")
    assert (parts.held_axis, parts.up) == (1, 2)
    assert list(parts.joints.x)[:4] == [0, 4, 4, 0]
    assert list(parts.joints.y)[:4] == [0, 0, 0, 0]
    assert list(parts.joints.z)[:4] == [0, 0, 2, 6]


def test_sections_take_from_their_material_what_they_do_not_say(parts) -> None:
    chord, stay = parts.sections
    assert chord.axial_stiffness == pytest.approx(210e9 * 12e-4, rel=1e-15)
    assert chord.mass_per_length == pytest.approx(7850 * 12e-4, rel=1e-15)
    assert (chord.expansion, chord.yield_strength, chord.source) == (12e-6, 355e6, "maker's sheet")
    assert (stay.axial_stiffness, stay.mass_per_length, stay.end_factor) == (18e6, 1.1, 0.9)
    assert stay.yield_strength is None


def test_chains_pairs_and_hanging_members_become_single_ones(parts) -> None:
    m = parts.members
    pieces = tuple(f"main-rope.{k}" for k in range(1, 5))
    assert m.names == ("stay-1", "bottom.1", "bottom.2", "top.1", *pieces)
    assert list(m.start) == [0, 0, 1, 3, 3, 4, 5, 6]
    assert list(m.end) == [2, 1, 2, 2, 4, 5, 6, 1]
    assert list(m.kind) == [1, 0, 0, 0, 1, 1, 1, 1]
    assert m.groups == {"bottom": (1, 2), "top": (3,), "main-rope": (4, 5, 6, 7)}
    assert m.pretension[0] == 15e3
    assert all(math.isnan(v) for v in list(m.pretension)[1:])
    (rope,) = m.hanging
    assert (rope.members, rope.joints, rope.given, rope.value) == (
        range(4, 8),
        range(4, 7),
        "unstressed_length",
        7.3,
    )
    assert parts.joints.names[4:] == ("main-rope@1", "main-rope@2", "main-rope@3")
    assert (parts.joints.x[5], parts.joints.z[5]) == (2.0, 3.0)  # the middle of the straight line


def test_supports_masses_and_load_cases(parts) -> None:
    feet, roller, spring = parts.supports
    assert (feet.joints, feet.fixed) == ((0,), (0, 1, 2))  # the third direction changes nothing
    assert roller.along == pytest.approx((0.6, 0.0, 0.8))
    assert (spring.name, spring.springs) == ("support 3", ((2, 5e6),))
    assert (parts.masses[0].joints, parts.masses[0].mass) == ((2,), 120.0)
    lanterns = parts.load_cases["lanterns"]
    assert lanterns.masses == (((1, 2), 120.0),)
    assert lanterns.forces == (((2,), (400.0, 0.0, 0.0)),)
    assert lanterns.line_loads == (((1, 2), (0.0, 0.0, -20.0)),)
    ((members, change),) = parts.load_cases["cold"].temperature_change
    assert members == tuple(range(8))
    assert change == pytest.approx(-35.0)


def test_take_up_of_a_hanging_member_is_shared_by_its_pieces(parts) -> None:
    assert parts.load_cases["tightening"].take_up == (((4, 5, 6, 7), 0.002), ((0,), 0.008))


def test_a_family_has_a_loading_for_each_choice(parts) -> None:
    family = parts.loadings["strength"]
    assert [loading.name for loading in family] == [
        "strength: lanterns 0, gale-east 1.5",
        "strength: lanterns 0, gale-west 1.5",
        "strength: lanterns 0, cold 0.9",
        "strength: lanterns 1.5, gale-east 1.5",
        "strength: lanterns 1.5, gale-west 1.5",
        "strength: lanterns 1.5, cold 0.9",
    ]
    assert family[3].factors == {"dead": 1.35, "lanterns": 1.5, "gale-east": 1.5}
    assert parts.loadings["dead"][0].factors == {"dead": 1.0}


def test_analyses_know_what_acts_and_where_they_start(parts) -> None:
    service, strength, modes, history = parts.analyses
    assert isinstance(service, Static)
    assert service.loads == parts.loadings["service"]
    assert len(strength.loads) == 7
    assert strength.loads[-1].name == "1 dead + 1 settlement + 1 tightening"
    assert isinstance(modes, Modes)
    assert (modes.start, modes.count, modes.up_to) == (StartFrom("in service"), 12, None)
    assert isinstance(history, History)
    assert (history.events, history.loads, history.duration, history.time_step) == (
        ("drop",),
        None,
        3.0,
        1e-3,
    )
    assert (history.damping.ratio, history.damping.at) == ((0.01, 0.01), (2.0, 20.0))
    pulse = parts.events["drop"]
    assert (pulse.shape, pulse.duration, pulse.start) == ("half-sine", 0.011, 0.05)
    assert pulse.forces == (((2,), (0.0, 0.0, -40e3)),)


def test_one_loading_of_a_family_can_be_named(gantry: str) -> None:
    name = "strength: lanterns 1.5, cold 0.9"
    text = gantry.replace(
        'from = "in service"\ncount', f'from = {{ analysis = "strength", loads = "{name}" }}\ncount'
    )
    text = text.replace('loads = "service"', f'loads = "{name}"')
    model = model_from_text(text)
    assert model.parts.analyses[0].loads[0].name == name
    assert model.parts.analyses[2].start == StartFrom("strength", name)


def test_modes_as_drawn_up_to_a_frequency(gantry: str) -> None:
    text = gantry.replace('from = "in service"\ncount = 12', 'from = "as drawn"\nup_to = "50 Hz"')
    modes = model_from_text(text).parts.analyses[2]
    assert modes.start.as_drawn
    assert (modes.count, modes.up_to) == (None, 50.0)


def test_every_pulse_shape_is_read(gantry: str) -> None:
    shapes = {
        "rectangle": "", "half-sine": "", "triangle": "", "sawtooth": "", "versed-sine": "", "ramp": "",
        "trapezoid": 'rise = "2 ms"\nfall = "3 ms"', "blast": "decay = 1.5",
    }  # fmt: skip
    for shape, keys in shapes.items():
        text = gantry.replace('shape = "half-sine"', f'shape = "{shape}"\n{keys}')
        assert model_from_text(text).parts.events["drop"].shape == shape
    text = gantry.replace(
        'shape = "half-sine"\nduration = "11 ms"', 'shape = "table"\ntable = [[0, 0], ["5 ms", 1]]'
    )
    pulse = model_from_text(text).parts.events["drop"]
    assert (list(pulse.times), list(pulse.factors), pulse.duration) == ([0, 0.005], [0, 1], 0.005)


def test_spring_sections_and_floating_space_models() -> None:
    model = Model(
        unsupported="allowed",
        sections={"s": {"stiffness": "40 N/mm", "mass_per_length": 0}},
        joints={"A": [0, 0, 0], "B": [0, 0, 1]},
        members=[{"name": "m", "from": "A", "to": "B", "section": "s", "kind": "compression-only"}],
    )
    section = model.parts.sections[0]
    assert (section.stiffness, section.axial_stiffness, section.mass_per_length) == (40e3, None, 0.0)
    assert model.parts.floating
    assert model.parts.held_axis is None
    assert list(model.parts.members.kind) == [2]


def test_python_data_may_be_arrays_and_tuples() -> None:
    given = {
        "sections": {"s": {"axial_stiffness": np.float64(1e7), "mass_per_length": 1}},
        "joints": {"A": np.zeros(3), "B": np.array([1, 0, 0])},
        "members": ({"name": "m", "from": "A", "to": "B", "section": "s", "pretension": None},),
        "supports": [{"joints": ("A", "B"), "fixed": ["x", "y", "z"]}],
        "load_cases": {"p": {"forces": [{"joints": ["B"], "force": np.array([1.0, 0, 0])}]}},
    }
    model = Model(**given)
    assert list(model.parts.joints.x) == [0, 1]
    assert model.parts.load_cases["p"].forces == (((1,), (1.0, 0.0, 0.0)),)
    assert model.name == "model"
    assert "[[members]]" in model.text


def test_a_model_does_not_change_and_can_be_pickled(gantry_file: Path) -> None:
    model = read_model(gantry_file)
    with pytest.raises(AttributeError, match="does not change"):
        model.parts = None  # type: ignore[assignment]
    assert pickle.loads(pickle.dumps(model)).parts == model.parts
    assert (model.name, model.folder) == ("gantry", str(gantry_file.parent))
    assert model.text == gantry_file.read_text(encoding="utf-8")


def test_the_largest_quantities_are_echoed_as_understood(gantry: str) -> None:
    assert model_from_text(gantry).echo == (
        "largest force: 40 kN (event 'drop')",
        "largest line load: 20 N/m (load case 'lanterns')",
        "longest member: 7.211 m (main-rope)",
        "largest take-up: 8 mm ('stay-1' in load case 'tightening')",
        "largest movement: 12 mm (joint 'A' in load case 'settlement')",
        "largest mass: 120 kg (joint 'C')",
    )


def test_places_are_found_by_name(gantry_file: Path) -> None:
    model = read_model(gantry_file)
    mistake = model.mistake(("analyses", "in service", "loads"), "is odd", "try another")
    assert str(mistake).splitlines()[0].endswith('analysis "in service": loads: is odd (try another)')
    assert mistake.source_line == 'loads = "service"'
    assert model.place("members", "bottom.2").path == 'member "bottom"'
    assert model.place("joints", "main-rope@2").path == 'member "main-rope"'
    assert model.place("joints", "C").source_line == 'C = ["4 m", "2 m"]'


def test_absent_and_unreadable_files(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"absent.toml: cannot be read: No such file") as caught:
        read_model(tmp_path / "absent.toml")
    assert caught.value.exit_code == 2
    with pytest.raises(InputError, match="cannot be read"):
        read_model(tmp_path)
    (tmp_path / "latin.toml").write_bytes('format = 1\ntitle = "Brücke"\n'.encode("latin-1"))
    with pytest.raises(InputError, match=r"latin.toml:2: is not in UTF-8: the byte 0xfc"):
        read_model(tmp_path / "latin.toml")


def test_a_byte_order_mark_and_windows_line_ends_are_accepted(tmp_path: Path, gantry: str) -> None:
    file = tmp_path / "windows.toml"
    file.write_bytes(b"\xef\xbb\xbf" + gantry.replace("\n", "\r\n").encode())
    assert read_model(file).parts == model_from_text(gantry).parts
    file.write_bytes(file.read_bytes().replace(b'section = "chord"', b'section = "cord"', 1))
    with pytest.raises(ModelError) as caught:
        read_model(file)
    assert caught.value.mistakes[0].line == gantry[: gantry.index('section = "chord"')].count("\n") + 1


def test_reading_a_model_loads_no_numeric_package(gantry_file: Path) -> None:
    code = (
        "import sys; from tautbar.model import read_model; read_model(sys.argv[1]);"
        "sys.exit(bool({'numpy', 'scipy', 'h5py', 'matplotlib'} & sys.modules.keys()))"
    )
    assert subprocess.run([sys.executable, "-c", code, str(gantry_file)], check=False).returncode == 0
