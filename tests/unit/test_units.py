"""Units: text to numbers in the program's own units, and complaints that say what was expected."""

from __future__ import annotations

import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from flowemu import units


@pytest.mark.parametrize(
    ("text", "kind", "value"),
    [
        ("2 um", "length", 2.0),
        ("2um", "length", 2.0),
        ("-0.5 um", "length", -0.5),
        ("+.5 um", "length", 0.5),
        ("5e-1 um", "length", 0.5),
        ("100 mm", "length", 1e5),
        ("250 nm", "length", 0.25),
        ("1 \u00b5m", "length", 1.0),
        ("1 \u03bcm", "length", 1.0),
        ("1000 \u00c5", "length", 0.1),
        ("1000 A", "length", 0.1),
        ("12 min", "time", 720.0),
        ("2 h", "time", 7200.0),
        ("60 nm/min", "rate", 1e-3),
        ("60 nm / min", "rate", 1e-3),
        ("3.6 um/h", "rate", 1e-3),
        ("10 A/s", "rate", 1e-3),
        ("80 degC", "temperature", 80.0),
        ("353.15 K", "temperature", 80.0),
        ("20 %", "fraction", 0.2),
        ("180%", "fraction", 1.8),
        ("88 deg", "angle", 88.0),
        ("30 wt%", "concentration", 30.0),
    ],
)
def test_good_quantities(text: str, kind: str, value: float) -> None:
    assert units.parse(text, kind) == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "kind", "says"),
    [
        ("2", "length", "'2' has no unit; expected a length such as '2 um'"),
        ("2 min", "length", "'2 min' is a time; expected a length such as '2 um'"),
        ("2 um", "rate", "'2 um' is a length; expected a rate such as '200 nm/min'"),
        ("20 %", "angle", "'20 %' is a share; expected an angle such as '88 deg'"),
        ("2 umm", "length", "'2 umm' has an unknown unit 'umm'; did you mean 'um'?"),
        ("2 UM", "length", "'2 UM' has an unknown unit 'UM'; did you mean 'um'?"),
        ("2 furlong", "length", "'2 furlong' has an unknown unit 'furlong'; expected a length such as '2 um'"),
        ("um", "length", "'um' is not a number with a unit; expected a length such as '2 um'"),
        ("1,5 um", "length", "such as '2 um' (decimals are written with a point)"),
        ("nan um", "length", "'nan um' is not a number with a unit"),
        ("1e999 um", "length", "'1e999 um' is too large a number"),
        ("", "length", "'' is not a number with a unit"),
    ],
)
def test_bad_quantities_say_what_was_expected(text: str, kind: str, says: str) -> None:
    with pytest.raises(ValueError, match=re.escape(says)):
        units.parse(text, kind)


def test_a_bare_number_takes_the_unit_that_it_is_offered() -> None:
    assert units.parse("2", "length", bare="um") == 2.0
    assert units.parse("2 mm", "length", bare="um") == 2000.0


@given(st.text(max_size=20), st.sampled_from(units.KINDS))
def test_any_text_gives_a_finite_number_or_a_complaint(text: str, kind: str) -> None:
    try:
        assert math.isfinite(units.parse(text, kind))
    except ValueError as error:
        assert str(error)


@given(st.floats(-1e6, 1e6), st.sampled_from(["length", "time", "temperature", "angle", "concentration", "rate"]))
def test_what_is_shown_reads_back(value: float, kind: str) -> None:
    """`show` keeps three figures."""
    assert units.parse(units.show(value, kind), kind) == pytest.approx(value, rel=6e-3, abs=1e-12)


@pytest.mark.parametrize(
    ("value", "kind", "text"),
    [
        (2.3, "length", "2.3 um"),
        (0.05, "length", "50 nm"),
        (525.0, "length", "525 um"),
        (1e5, "length", "100 mm"),
        (0.0, "length", "0 um"),
        (45.0, "time", "45 s"),
        (720.0, "time", "12 min"),
        (0.2, "fraction", "20 %"),
        (3600 / 60 * 1e-3, "rate", "3600 nm/min"),
    ],
)
def test_shown_in_the_units_of_the_trade(value: float, kind: str, text: str) -> None:
    assert units.show(value, kind) == text


@given(st.sampled_from(units.KINDS))
def test_the_schema_pattern_takes_the_example_and_not_a_bare_number(kind: str) -> None:
    assert re.search(units.pattern(kind), units.example(kind))
    assert not re.search(units.pattern(kind), "2")
