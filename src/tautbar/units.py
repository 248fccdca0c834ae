"""Quantities at the border of the program: ``"3.5 kN/m"`` to an SI float, its dimension checked.

Inside the program everything is SI (m, N, kg, s, K, rad). A bare number is taken in the coherent
unit made of the model's default units. Sources of the constants, all exact by definition: inch and
pound (international yard and pound agreement, 1959), standard gravity (3rd CGPM, 1901).
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache

Exponents = tuple[int, ...]  # of length, mass, time, temperature, angle

INCH = 0.0254  # m
POUND = 0.45359237  # kg
STANDARD_GRAVITY = 9.80665  # m/s2
POUND_FORCE = POUND * STANDARD_GRAVITY  # N
FOOT = 0.3048  # m, 12 inches
ZERO_CELSIUS = 273.15  # K


class BadQuantity(ValueError):
    """The text is no quantity of the wanted dimension; the message says what would be."""


@dataclass(frozen=True, slots=True)
class Dimension:
    """What is wanted where a quantity stands.

    ``exponents`` are of length, mass, time, temperature and angle; ``made_of`` are the powers of
    the default units ("length", "force", "mass", "time", "temperature") a bare number is given in.
    """

    name: str
    example: str
    exponents: Exponents
    made_of: tuple[tuple[str, int], ...] = ()
    absolute: bool = False  # a temperature, not a difference


_POWERS = {
    "length": (1, 0, 0, 0, 0),
    "mass": (0, 1, 0, 0, 0),
    "force": (1, 1, -2, 0, 0),
    "time": (0, 0, 1, 0, 0),
    "temperature": (0, 0, 0, 1, 0),
}
BASES = tuple(_POWERS)


def _dimension(name: str, example: str, absolute: bool = False, **powers: int) -> Dimension:
    exponents = tuple(sum(p * _POWERS[base][i] for base, p in powers.items()) for i in range(5))
    return Dimension(name, example, exponents, tuple(powers.items()), absolute)


NUMBER = _dimension("a plain number", "0.02")
LENGTH = _dimension("a length", "250 mm", length=1)
AREA = _dimension("an area", "12 cm^2", length=2)
MASS = _dimension("a mass", "25 kg", mass=1)
TIME = _dimension("a time", "10 ms", time=1)
FREQUENCY = _dimension("a frequency", "5 Hz", time=-1)
ACCELERATION = _dimension("an acceleration", "9.81 m/s^2", length=1, time=-2)
TEMPERATURE = _dimension("a temperature", "10 degC", absolute=True, temperature=1)
TEMPERATURE_CHANGE = _dimension("a temperature change", "-35 K", temperature=1)
EXPANSION = _dimension("an expansion coefficient", "12e-6 / K", temperature=-1)
FORCE = _dimension("a force", "12 kN", force=1)
STRESS = _dimension("a stress or modulus", "210 GPa", force=1, length=-2)
PRESSURE = _dimension("a pressure", "0.8 kPa", force=1, length=-2)
STIFFNESS = _dimension("a stiffness", "40 N/mm", force=1, length=-1)
LINE_LOAD = _dimension("a force per length", "0.2 kN/m", force=1, length=-1)
FORCE_DENSITY = _dimension("a force density", "2 kN/m", force=1, length=-1)
DENSITY = _dimension("a density", "7850 kg/m^3", mass=1, length=-3)
LINE_MASS = _dimension("a mass per length", "1.1 kg/m", mass=1, length=-1)

_NAMES = {  # what a wrong quantity is called; the first of equal dimensions wins
    d.exponents: d.name
    for d in reversed(
        (
            NUMBER, LENGTH, AREA, MASS, TIME, FREQUENCY, ACCELERATION, TEMPERATURE_CHANGE, EXPANSION, FORCE,
            STRESS, _dimension("a stiffness or force per length", "", force=1, length=-1), DENSITY, LINE_MASS,
            _dimension("a volume", "", length=3), _dimension("a second moment of area", "", length=4),
            _dimension("a velocity", "", length=1, time=-1),
            _dimension("a moment or energy", "", force=1, length=1),
            _dimension("a damping coefficient", "", force=1, length=-1, time=1),
            _dimension("a weight per volume", "", force=1, length=-3),
        )
    )
} | {(0, 0, 0, 0, 1): "an angle", (0, 0, -1, 0, 1): "a rotation speed"}  # fmt: skip

_L, _M, _T, _K, _A = ((*(0,) * i, 1, *(0,) * (4 - i)) for i in range(5))
_F, _P, _E = FORCE.exponents, STRESS.exponents, (2, 1, -2, 0, 0)
_UNITS: dict[str, tuple[float, Exponents]] = {
    "m": (1, _L), "in": (INCH, _L), "inch": (INCH, _L), "ft": (FOOT, _L), "yd": (3 * FOOT, _L),
    "g": (1e-3, _M), "t": (1e3, _M), "tonne": (1e3, _M), "lb": (POUND, _M), "lbm": (POUND, _M),
    "slug": (POUND_FORCE / FOOT, _M),
    "s": (1, _T), "min": (60, _T), "h": (3600, _T), "Hz": (1, (0, 0, -1, 0, 0)),
    "K": (1, _K), "degC": (1, _K), "°C": (1, _K), "degF": (5 / 9, _K), "°F": (5 / 9, _K),
    "rad": (1, _A), "deg": (math.pi / 180, _A), "°": (math.pi / 180, _A), "rev": (2 * math.pi, _A),
    "rpm": (2 * math.pi / 60, (0, 0, -1, 0, 1)),
    "N": (1, _F), "kgf": (STANDARD_GRAVITY, _F), "tf": (1e3 * STANDARD_GRAVITY, _F),
    "lbf": (POUND_FORCE, _F), "kip": (1e3 * POUND_FORCE, _F), "kips": (1e3 * POUND_FORCE, _F),
    "Pa": (1, _P), "bar": (1e5, _P), "psi": (POUND_FORCE / INCH**2, _P),
    "ksi": (1e3 * POUND_FORCE / INCH**2, _P),
    "psf": (POUND_FORCE / FOOT**2, _P), "ksf": (1e3 * POUND_FORCE / FOOT**2, _P),
    "plf": (POUND_FORCE / FOOT, STIFFNESS.exponents), "klf": (1e3 * POUND_FORCE / FOOT, STIFFNESS.exponents),
    "pcf": (POUND / FOOT**3, DENSITY.exponents),
    "J": (1, _E), "W": (1, (2, 1, -3, 0, 0)), "gn": (STANDARD_GRAVITY, ACCELERATION.exponents),
    "%": (0.01, NUMBER.exponents),
}  # fmt: skip
_PREFIXES = {
    "G": 1e9, "M": 1e6, "k": 1e3, "h": 1e2, "d": 1e-1, "c": 1e-2, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "n": 1e-9
}  # fmt: skip
_PREFIXED = frozenset({"m", "g", "s", "N", "Pa", "J", "W", "Hz", "rad", "bar"})
_OFFSETS = {"K": 0.0, "degC": ZERO_CELSIUS, "°C": ZERO_CELSIUS, "degF": ZERO_CELSIUS - 32 * 5 / 9}
_OFFSETS["°F"] = _OFFSETS["degF"]
_FORCE_FOR_MASS = {"lb": "lbf", "lbm": "lbf", "kg": "kgf", "t": "tf", "tonne": "tf", "g": "N"}
_ADVICE = {
    "ton": "a ton may be 1000 kg, 2000 lb or 2240 lb: write t, lb, tf or lbf",
    "tons": "a ton may be 1000 kg, 2000 lb or 2240 lb: write t, lb, tf or lbf",
    "C": "did you mean 'degC'?", "F": "did you mean 'degF'?",
    "kNm": "did you mean 'kN m'?", "Nm": "did you mean 'N m'?",
    "sec": "did you mean 's'?", "hr": "did you mean 'h'?", "pounds": "write lb or lbf",
}  # fmt: skip

_NUMBER = re.compile(r"\s*([+-]?(?:\d+(?:_\d+)*\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*")
_TOKEN = re.compile(r"\s*(?:([*·×/()])|([A-Za-zµ°%]+)\s*(?:(?:\^|\*\*)?\s*([-+]?\d+))?|(1)(?=\s*/))")
_TIDY = str.maketrans("²³⁴⁻¹μ", "234-1µ")


@lru_cache(maxsize=1024)
def unit(text: str) -> tuple[float, Exponents]:
    """Factor to SI and dimension of a unit such as ``kN/m``, ``kg m^2`` or ``N/(m s)``."""
    tokens = _tokens(text)
    factor, dimension, rest = _product(text, tokens)
    if rest:
        raise BadQuantity(f"unit '{text}' cannot be read (brackets do not match)")
    return factor, dimension


def _tokens(text: str) -> list[tuple[str, int]]:
    tidy = re.sub(r"(?<=[A-Za-z])-(?=[A-Za-z])", " ", text.translate(_TIDY)).strip()  # kip-ft
    found, at = [], 0
    while at < len(tidy):
        match = _TOKEN.match(tidy, at)
        if not match:
            raise BadQuantity(f"unit '{text}' cannot be read at '{tidy[at:]}'")
        operator, name, power, one = match.groups()
        if len(power or "") > 2:
            raise BadQuantity(f"unit '{text}' has a power that is too high")
        found.append((operator or name or one, int(power or 1)))
        at = match.end()
    return found


def _product(text: str, tokens: list[tuple[str, int]]) -> tuple[float, Exponents, list[tuple[str, int]]]:
    factor, dimension, sign, divided = 1.0, NUMBER.exponents, 1, False
    while tokens and tokens[0][0] != ")":
        (name, power), tokens = tokens[0], tokens[1:]
        if name == "/":
            sign, divided = -1, True
            continue
        if name in "*·×":
            continue
        if divided and sign == 1:
            raise BadQuantity(f"unit '{text}' can be read in two ways: put what divides in brackets, N/(m s)")
        if name == "(":
            f, d, tokens = _product(text, tokens)
            if not tokens:
                raise BadQuantity(f"unit '{text}' cannot be read (brackets do not match)")
            tokens = tokens[1:]
        else:
            f, d = (1.0, NUMBER.exponents) if name == "1" else _single(name)
        factor *= f ** (sign * power)
        dimension = tuple(a + sign * power * b for a, b in zip(dimension, d, strict=True))
        sign = 1
    return factor, dimension, tokens


def _single(name: str) -> tuple[float, Exponents]:
    if name in _UNITS:
        return _UNITS[name]
    if name[0] in _PREFIXES and name[1:] in _PREFIXED:
        factor, dimension = _UNITS[name[1:]]
        return _PREFIXES[name[0]] * factor, dimension
    raise BadQuantity(f"unit '{name}' is not known ({_ADVICE.get(name) or _nearest(name)})")


def _nearest(name: str) -> str:
    known = [*_UNITS, *(p + u for u in sorted(_PREFIXED) for p in "GMkcmu")]
    same = [k for k in known if k.lower() == name.lower()]
    close = same or difflib.get_close_matches(name, known, 1, 0.6)
    return (
        f"did you mean '{close[0]}'?"
        if close
        else "known are for example m, mm, in, ft, N, kN, lbf, kg, s, K, MPa"
    )


@dataclass(frozen=True, slots=True)
class Units:
    """The default units of a model: SI factor of one length, force, mass, time, temperature."""

    factors: Mapping[str, float] = field(default_factory=dict)
    names: Mapping[str, str] = field(default_factory=dict)

    @classmethod
    def of(cls, names: Mapping[str, str]) -> Units:
        """From ``{"length": "mm", "force": "kN"}``. Raises `BadQuantity` at the first bad one."""
        return cls({base: unit_factor(text, base) for base, text in names.items()}, dict(names))

    def factor(self, want: Dimension) -> float:
        """SI value of one bare unit of the dimension wanted."""
        result = 1.0
        for base, power in want.made_of:
            result *= self.factors.get(base, 1.0) ** power
        return result

    def bare(self, value: float, want: Dimension) -> float:
        """A bare number in SI."""
        offset = _OFFSETS.get(self.names.get("temperature", "K"), 0.0) if want.absolute else 0.0
        return value * self.factor(want) + offset

    def read(self, value: object, want: Dimension) -> float:
        """A number or quoted quantity in SI.

        Parameters
        ----------
        value
            Bare number (in these units) or text such as ``"12 mm"``.
        want
            The dimension it must have.

        Raises
        ------
        BadQuantity
            Wrong type, unknown unit, wrong dimension, decimal comma, or not finite.
        """
        if isinstance(value, str):
            result = _quoted(value, want)
        elif isinstance(value, bool) or not isinstance(value, int | float):
            quoted = "" if want is NUMBER else f' or a quoted quantity such as "{want.example}"'
            raise BadQuantity(f"a number{quoted} is wanted, not {say(value)}")
        else:
            result = self.bare(_as_float(value), want)
        if not math.isfinite(result):
            raise BadQuantity(f"a finite value is wanted, not {value}")
        return result


def _as_float(value: float) -> float:
    try:
        return float(value)
    except OverflowError:  # a whole number of more than 308 digits
        return math.inf


def unit_factor(text: str, base: str) -> float:
    """SI factor of a default unit; ``base`` is one of `BASES`."""
    factor, dimension = unit(text)
    if dimension != _POWERS[base]:
        raise BadQuantity(
            f"'{text}' is a unit of {_named(dimension)}, but one of {base} is wanted{_force_hint(text, base)}"
        )
    return factor


def _force_hint(text: str, base: str) -> str:
    return f" ({_FORCE_FOR_MASS[text]}?)" if base == "force" and text in _FORCE_FOR_MASS else ""


def _quoted(text: str, want: Dimension) -> float:
    match = _NUMBER.match(text)
    if not match:
        raise BadQuantity(f"'{text}' does not start with a number (write for example \"{want.example}\")")
    number, rest = float(match[1]), text[match.end() :].strip()
    if rest.startswith(","):
        raise BadQuantity(f"'{text}' has a comma: write decimals with a point, thousands without a mark")
    if not rest and want is not NUMBER:
        raise BadQuantity(
            f"'{text}' has no unit (write for example \"{want.example}\", or the number without quotes)"
        )
    if rest == "g" and want.exponents == ACCELERATION.exponents:
        return number * STANDARD_GRAVITY
    factor, dimension = unit(rest)
    if dimension != want.exponents:
        raise BadQuantity(_wrong_dimension(text, rest, dimension, want))
    return number * factor + (_OFFSETS.get(rest, 0.0) if want.absolute else 0.0)


def _named(dimension: Exponents) -> str:
    return _NAMES.get(dimension, "something else")


def _wrong_dimension(text: str, rest: str, dimension: Exponents, want: Dimension) -> str:
    message = f"'{text}': {_named(dimension)} was given, {want.name} is wanted"
    if tuple(w - d for w, d in zip(want.exponents, dimension, strict=True)) == ACCELERATION.exponents:
        mass = re.match(r"[a-z]+", rest)  # a weight written as the mass it belongs to
        better = _FORCE_FOR_MASS.get(mass[0], "") if mass else ""
        if better:
            return f"{message} ({mass[0] if mass else ''} is a mass: write {better} for the force)"
    return message if want is NUMBER else f'{message}, for example "{want.example}"'


def say(value: object) -> str:
    """What a value of the model file is, in words for a message."""
    if isinstance(value, str):
        return f"the text '{value}'"
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int | float):
        return f"the number {value!r}"
    if isinstance(value, list):
        return "a list"
    if isinstance(value, dict):
        return "a table"
    return "a date or time" if hasattr(value, "isoformat") else f"a {type(value).__name__}"
