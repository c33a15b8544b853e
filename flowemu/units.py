"""Text with a unit to a number and back; the only place that knows unit names.

Inside the program a length is in um, a time in s, a rate in um/s, a temperature in degC, an angle in deg, a share in
parts of one and a concentration in wt%. A units library would add 0.4 s to the start of every command; the trade's
few units are a table.
"""

from __future__ import annotations

import math
import re
from functools import cache

from flowemu.errors import near_miss

_LENGTH = {
    "um": 1.0, "\u00b5m": 1.0, "\u03bcm": 1.0, "nm": 1e-3, "mm": 1e3, "cm": 1e4, "m": 1e6,
    "\u00c5": 1e-4, "\u212b": 1e-4, "A": 1e-4, "pm": 1e-6, "mil": 25.4,
}  # fmt: skip
_TIME = {"s": 1.0, "sec": 1.0, "ms": 1e-3, "min": 60.0, "h": 3600.0, "hr": 3600.0, "d": 86400.0}
_FACTORS = {
    "length": _LENGTH,
    "time": _TIME,
    "rate": {f"{top}/{below}": up / down for top, up in _LENGTH.items() for below, down in _TIME.items()},
    "temperature": {"degC": 1.0, "\u00b0C": 1.0, "C": 1.0, "K": 1.0},
    "fraction": {"%": 0.01},
    "angle": {"deg": 1.0, "\u00b0": 1.0, "rad": 180.0 / math.pi},
    "concentration": {"wt%": 1.0},
}
_EXAMPLES = {
    "length": "2 um",
    "time": "12 min",
    "rate": "200 nm/min",
    "temperature": "80 degC",
    "fraction": "20 %",
    "angle": "88 deg",
    "concentration": "30 wt%",
}
_NAMES = {"fraction": "share"}
_KELVIN = 273.15
_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_SPLIT = re.compile(rf"\s*({_NUMBER})\s*(.*?)\s*", re.DOTALL)
KINDS = tuple(_FACTORS)


def parse(text: str, kind: str, bare: str | None = None) -> float:
    """The number that `text` stands for, in the program's own unit of its kind.

    Parameters
    ----------
    text : str
        Such as `2 um`, `12 min`, `80 degC`, `20 %`, `230 nm/min`.
    kind : str
        One of `KINDS`.
    bare : str or None
        The unit of a number that carries none; left out, such a number is an error.

    Raises
    ------
    ValueError
        With a text that says what was found and what was expected.
    """
    match = _SPLIT.fullmatch(text)
    if match is None:
        raise ValueError(f"'{text}' is not a number with a unit; expected {expected(kind)}{_comma(text)}")
    unit = re.sub(r"\s*/\s*", "/", match[2]) or bare or ""
    value = float(match[1]) * _factor(text, unit, kind)
    if unit == "K":
        value -= _KELVIN
    if not math.isfinite(value):
        raise ValueError(f"'{text}' is too large a number")
    return value


def _factor(text: str, unit: str, kind: str) -> float:
    factors = _FACTORS[kind]
    if unit in factors:
        return factors[unit]
    if not unit:
        raise ValueError(f"'{text}' has no unit; expected {expected(kind)}")
    for other, known in _FACTORS.items():
        if unit in known:
            raise ValueError(f"'{text}' is {_article(other)}; expected {expected(kind)}")
    close = near_miss(unit, factors)
    tail = f"did you mean '{close}'?" if close else f"expected {expected(kind)}"
    raise ValueError(f"'{text}' has an unknown unit '{unit}'; {tail}{_comma(text)}")


def _comma(text: str) -> str:
    return " (decimals are written with a point)" if re.match(r"\s*[+-]?[0-9]+,[0-9]", text) else ""


def _article(kind: str) -> str:
    name = _NAMES.get(kind, kind)
    return f"an {name}" if name[0] in "aeiou" else f"a {name}"


def expected(kind: str) -> str:
    """What a value of this kind looks like, for a complaint: `a length such as '2 um'`."""
    return f"{_article(kind)} such as '{_EXAMPLES[kind]}'"


def example(kind: str) -> str:
    """One good value of this kind."""
    return _EXAMPLES[kind]


@cache
def pattern(kind: str, signed: bool = True) -> str:
    """A regular expression for the values of this kind, in the dialect of JSON Schema."""
    number = _NUMBER if signed else _NUMBER.replace("[+-]?", "[+]?", 1)
    if kind == "rate":
        units = rf"(?:{_choice(_LENGTH)})\s*/\s*(?:{_choice(_TIME)})"
    else:
        units = _choice(_FACTORS[kind])
    return rf"^\s*{number}\s*(?:{units})\s*$"


def _choice(units: dict[str, float]) -> str:
    return "|".join(re.escape(unit) for unit in sorted(units, key=len, reverse=True))


def show(value: float, kind: str) -> str:
    """The number as text with a unit that an engineer would choose, to three figures."""
    if kind == "length":
        return _scaled(value, (("mm", 1e3), ("um", 0.1), ("nm", 0.0)), _LENGTH)
    if kind == "time":
        return _scaled(value, (("h", 7200.0), ("min", 90.0), ("s", 0.0)), _TIME)
    if kind == "rate":
        return f"{_figures(value / _FACTORS['rate']['nm/min'])} nm/min"
    unit = next(iter(_FACTORS[kind]))
    return f"{value / _FACTORS[kind][unit]:.4g} {unit}"


def _scaled(value: float, choices: tuple[tuple[str, float], ...], factors: dict[str, float]) -> str:
    zero = choices[1][0] if factors is _LENGTH else choices[-1][0]
    unit = next(name for name, least in choices if abs(value) >= least) if value else zero
    return f"{_figures(value / factors[unit])} {unit}"


def _figures(value: float) -> str:
    """Three figures, and no power of ten for large numbers."""
    return f"{value:.3g}" if abs(value) < 1000.0 else f"{value:.0f}"
