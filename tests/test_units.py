"""Quantities: values exact by definition, dimensions, and messages that say what would be right."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tautbar import units
from tautbar.units import BadQuantity, Units

SI = Units()


@pytest.mark.parametrize(
    ("text", "want", "value"),
    [
        ("12 mm", units.LENGTH, 0.012),
        ("4 in", units.LENGTH, 0.1016),
        ("12 cm²", units.AREA, 12e-4),
        ("12cm2", units.AREA, 12e-4),
        ("210 GPa", units.STRESS, 210e9),
        ("1 psi", units.STRESS, 0.45359237 * 9.80665 / 0.0254**2),
        ("3.5 kN/m", units.LINE_LOAD, 3500.0),
        ("1.2 kip", units.FORCE, 1200 * 0.45359237 * 9.80665),
        ("2 kgf", units.FORCE, 2 * 9.80665),
        ("25 kg", units.MASS, 25.0),
        ("7.85 t/m^3", units.DENSITY, 7850.0),
        ("12e-6 / K", units.EXPANSION, 12e-6),
        ("12e-6 1/K", units.EXPANSION, 12e-6),
        ("15 g", units.ACCELERATION, 15 * 9.80665),
        ("15 g", units.MASS, 0.015),
        ("1 %", units.NUMBER, 0.01),
        ("10 degC", units.TEMPERATURE, 283.15),
        ("50 degF", units.TEMPERATURE, 283.15),
        ("-35 K", units.TEMPERATURE_CHANGE, -35.0),
        ("9 degF", units.TEMPERATURE_CHANGE, 5.0),
        ("2 kg m/s^2", units.FORCE, 2.0),
        ("2 N/(m s)", units._dimension("", "", force=1, length=-1, time=-1), 2.0),
        ("2 N/m/s", units._dimension("", "", force=1, length=-1, time=-1), 2.0),
        ("3 kip-ft", units._dimension("", "", force=1, length=1), 3000 * 0.45359237 * 9.80665 * 0.3048),
    ],
)
def test_quoted_quantities_are_read_into_si(text: str, want: units.Dimension, value: float) -> None:
    # a few roundings of products: 4 units in the last place
    assert SI.read(text, want) == pytest.approx(value, rel=4 * 2.3e-16, abs=0)


@pytest.mark.parametrize(
    ("text", "want", "says"),
    [
        ("12 mm", units.AREA, "a length was given, an area is wanted"),
        ("3 lb", units.FORCE, "lb is a mass: write lbf"),
        ("3 kg", units.FORCE, "kg is a mass: write kgf"),
        ("3 kg/m", units.LINE_LOAD, "kg is a mass: write kgf"),
        ("3 ton", units.MASS, "write t, lb, tf or lbf"),
        ("1,5 m", units.LENGTH, "write decimals with a point"),
        ("1,500 N", units.FORCE, "write decimals with a point"),
        ("3 KN", units.FORCE, "did you mean 'kN'?"),
        ("3 furlongs", units.LENGTH, "unit 'furlongs' is not known"),
        ("5", units.LENGTH, "has no unit"),
        ("long", units.LENGTH, "does not start with a number"),
        ("5 N/m s", units.LINE_LOAD, "can be read in two ways"),
        ("5 N/(m s", units.LINE_LOAD, "brackets do not match"),
        ("5 m)", units.LENGTH, "brackets do not match"),
        ("5 m^400", units.LENGTH, "a power that is too high"),
        ("1 500 N", units.FORCE, "cannot be read at '500 N'"),
        ("1e999 m", units.LENGTH, "a finite value is wanted"),
        (10**400, units.LENGTH, "a finite value is wanted"),
        (math.nan, units.LENGTH, "a finite value is wanted"),
        (True, units.LENGTH, "not true"),
        ([1], units.LENGTH, "not a list"),
        ({}, units.LENGTH, "not a table"),
        (None, units.LENGTH, "not a NoneType"),
    ],
)
def test_bad_quantities_say_what_would_be_right(text: object, want: units.Dimension, says: str) -> None:
    with pytest.raises(BadQuantity) as caught:
        SI.read(text, want)
    assert says in str(caught.value)


def test_bare_numbers_are_in_the_coherent_unit() -> None:
    model = Units.of({"length": "mm", "force": "kN", "temperature": "degC"})
    assert model.read(2, units.LENGTH) == 0.002
    assert model.read(210, units.STRESS) == pytest.approx(210e9, rel=1e-15)  # kN/mm2
    assert model.read(1, units.STIFFNESS) == pytest.approx(1e6, rel=1e-15)
    assert model.read(7850, units.MASS) == 7850  # mass stays kg whatever the force is in
    assert model.read(10, units.TEMPERATURE) == 283.15
    assert model.read(10, units.TEMPERATURE_CHANGE) == 10.0
    assert model.read("2 m", units.LENGTH) == 2.0


def test_a_default_unit_of_the_wrong_kind_is_refused() -> None:
    with pytest.raises(BadQuantity, match=r"unit of a mass, but one of force is wanted \(kgf\?\)"):
        Units.of({"force": "kg"})


finite = st.floats(allow_nan=False, allow_infinity=False, min_value=-1e30, max_value=1e30)


@given(finite, st.sampled_from(["", "k", "M", "G", "m", "u", "n"]))
def test_prefixes_scale_and_the_dimension_stays(value: float, prefix: str) -> None:
    factor = {"": 1.0, "k": 1e3, "M": 1e6, "G": 1e9, "m": 1e-3, "u": 1e-6, "n": 1e-9}[prefix]
    assert SI.read(f"{value!r} {prefix}N", units.FORCE) == value * factor
    with pytest.raises(BadQuantity):
        SI.read(f"{value!r} {prefix}N", units.LENGTH)


@given(finite)
def test_bare_numbers_in_si_are_taken_as_they_are(value: float) -> None:
    assert SI.read(value, units.FORCE) == value
    assert SI.read(repr(value), units.NUMBER) == value


@given(st.text(max_size=12) | st.from_regex(r"-?[0-9]{1,3} ?[a-zA-Z0-9/*^() -]{0,8}", fullmatch=True))
def test_any_text_is_either_a_finite_quantity_or_a_told_mistake(text: str) -> None:
    try:
        value = SI.read(text, units.LENGTH)
    except BadQuantity:
        return
    assert math.isfinite(value)
