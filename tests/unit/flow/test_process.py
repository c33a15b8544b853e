"""The process data: every value cited, no silent zero, forgiving names, and the flow's own data on top."""

from collections.abc import Iterator
from typing import Any

import pytest
from hypothesis import given as draw
from hypothesis import settings
from hypothesis import strategies as st

from flowemu.flow.process import CODES, ProcessDataError, UnknownNameError, load_process_data
from flowemu.flow.process_files import _read_file
from flowemu.flow.process_values import name_key, span

DATA = load_process_data()
RATES = [rate for etchant in DATA.etchants for rate in DATA.rates(etchant.name)]
NM_PER_MIN = 1e-3 / 60.0

PROMISED_MATERIALS = [
    "silicon", "polysilicon", "thermal oxide", "lto", "psg", "nitride", "low-stress nitride", "resist", "aluminium",
    "gold", "chromium", "titanium",
]  # fmt: skip
PROMISED_ETCHANTS = [
    "hf 49", "hf 10:1", "bhf 5:1", "vapour hf", "koh", "tmah", "hot phosphoric", "xef2", "o2 plasma", "oxide rie",
    "nitride rie", "poly rie", "metal rie", "deep silicon", "acetone", "piranha", "hf vapour over dish",
]  # fmt: skip


def cited_values(value: Any) -> Iterator[dict[str, Any]]:
    """Every mapping within a data file that states a value."""
    if isinstance(value, dict):
        if {"value", "rate", "code", "text"} & value.keys() and not isinstance(value.get("rate"), dict):
            yield value
        for part in value.values():
            yield from cited_values(part)
    elif isinstance(value, list):
        for part in value:
            yield from cited_values(part)


FILES = ["anneals", "etch-kinds", "etchants", "hazards", "materials", "methods", "rates-hf", "rates-wet", "rates-dry"]


@pytest.mark.parametrize("file", FILES)
def test_every_value_has_a_known_source_and_a_standing(file: str) -> None:
    values = list(cited_values(_read_file(f"{file}.yaml")))
    assert values
    for value in values:
        assert value.get("source") in DATA.sources, value
        assert value.get("standing") in ("read", "recomputed", "from memory", "unverified"), value


def test_every_source_says_how_it_was_reached() -> None:
    for source in DATA.sources.values():
        assert source.citation and source.reached


def test_a_value_of_common_practice_is_never_called_read() -> None:
    assert not [rate for rate in RATES if rate.source == "common practice" and rate.standing != "unverified"]


def test_zeros_are_stated_and_codes_alone_have_no_value() -> None:
    for rate in RATES:
        if rate.value == 0.0:
            assert rate.unit_text == "0 nm/min", rate
        if rate.code and not rate.unit_text:
            assert rate.value is None and rate.low is None and rate.high is None, rate


def test_a_film_that_peels_never_has_a_rate_of_zero() -> None:
    peels = [rate for rate in RATES if rate.code == "P"]
    assert len(peels) >= 4
    assert all(rate.value != 0.0 for rate in peels)
    assert "peels" in DATA.rate("hf 49", "resist").why_no_value


def test_spreads_hold_their_value() -> None:
    for rate in RATES:
        if rate.value is not None:
            assert rate.low is not None and rate.high is not None
            assert rate.low <= rate.value <= rate.high, rate


def test_why_there_is_no_value() -> None:
    fast = DATA.rate("hf 49", "psg", "as deposited")
    assert (fast.value, fast.code, fast.published) == (None, "F", True)
    assert fast.why_no_value == f"published only as 'F' ({CODES['F']})"
    nothing = DATA.rate("vapour hf", "thermal oxide")
    assert (nothing.value, nothing.code, nothing.published) == (None, None, False)
    assert nothing.why_no_value == "no datum"
    assert DATA.rate("hf 49", "thermal oxide").why_no_value == ""


@pytest.mark.parametrize("name", PROMISED_MATERIALS)
def test_the_promised_materials_are_there(name: str) -> None:
    assert DATA.material(name).name == name


@pytest.mark.parametrize("name", PROMISED_ETCHANTS)
def test_the_promised_etchants_are_there(name: str) -> None:
    etchant = DATA.etchant(name)
    assert etchant.name == name
    assert etchant.sides == ("both" if etchant.kind == "wet" else "front")
    assert etchant.uniformity.low == {"wet": 0.10, "vapour": 0.15, "plasma": 0.05}[etchant.kind]


@pytest.mark.parametrize(
    ("typed", "name"),
    [
        ("Low Stress_Nitride", "low-stress nitride"), ("LOW-STRESS  NITRIDE", "low-stress nitride"),
        ("Aluminum", "aluminium"), ("poly-Si", "polysilicon"), ("photoresist", "resist"),
    ],
)  # fmt: skip
def test_names_of_materials_are_forgiving(typed: str, name: str) -> None:
    assert DATA.material(typed).name == name


def test_names_of_etchants_methods_and_states_are_forgiving() -> None:
    assert DATA.etchant("HF-49").name == "hf 49"
    assert DATA.etchant("XeF2").name == "xef2"
    assert DATA.etchant("DRIE").name == "deep silicon"
    assert DATA.method("Spin-On").name == "spin"
    assert DATA.material("psg").state("As-Deposited") == "as deposited"
    assert name_key("\u00b5m") == name_key("\u03bcm") == "um"


def test_no_two_entries_share_a_name() -> None:
    for records in (DATA.materials, DATA.etchants, DATA.methods):
        keys = [name_key(name) for record in records for name in (record.name, *record.aliases)]
        assert len(keys) == len(set(keys))


def test_an_unknown_name_comes_with_its_near_miss() -> None:
    with pytest.raises(UnknownNameError, match=r"unknown material 'silcon'; did you mean 'silicon'\?") as caught:
        DATA.material("silcon")
    assert caught.value.hint == "did you mean 'silicon'?"
    with pytest.raises(UnknownNameError, match="expected one of hf 49, hf 10:1"):
        DATA.etchant("qqqq")
    with pytest.raises(UnknownNameError, match="unknown state of psg 'anealed'; did you mean 'annealed'"):
        DATA.rate("hf 49", "psg", "anealed")


def test_states_are_told_apart_only_where_the_source_does() -> None:
    assert DATA.rate("oxide rie", "psg").state == "as deposited"
    assert DATA.rate("oxide rie", "psg").value != DATA.rate("oxide rie", "psg", "annealed").value
    assert DATA.rate("o2 plasma", "resist", "hard-baked").value == DATA.rate("o2 plasma", "resist", "soft").value
    assert DATA.rate("acetone", "resist", "hard-baked").value is None


def test_the_open_dish_and_the_enclosed_gas_are_two_entries() -> None:
    assert DATA.rate("hf vapour over dish", "thermal oxide").value == pytest.approx(66 * NM_PER_MIN)
    assert DATA.rates("vapour hf") == ()


def test_anneals_change_states_from_their_temperature_on() -> None:
    assert DATA.anneal("psg", "as deposited", 899.0, 3600.0) == "as deposited"
    assert DATA.anneal("PSG", None, 900.0, 3600.0) == "annealed"
    assert DATA.anneal("psg", "as deposited", 1050.0, 0.0) == "as deposited"
    assert DATA.anneal("psg", "annealed", 1050.0, 60.0) == "annealed"
    assert DATA.anneal("resist", "soft", 115.0, 60.0) == "hard-baked"
    assert DATA.anneal("polysilicon", "n+", 1050.0, 3600.0) == "n+"
    assert DATA.anneal("silicon", None, 1050.0, 3600.0) is None


def test_glasses_need_their_coverage_stated() -> None:
    for material, method in [("psg", "lpcvd"), ("lto", "lpcvd"), ("pecvd oxide", "pecvd"), ("gold", "evaporation")]:
        assert DATA.needs_coverage(material, method)
    for material, method in [
        ("polysilicon", "lpcvd"),
        ("low-stress nitride", "lpcvd"),
        ("psg", "ald"),
        ("psg", "spin"),
    ]:
        assert not DATA.needs_coverage(material, method)


def test_methods_say_what_they_coat() -> None:
    assert (DATA.method("lpcvd").conformal, DATA.method("lpcvd").sides) == (True, "both")
    assert (DATA.method("evaporation").conformal, DATA.method("evaporation").sides) == (False, "front")
    deposit = DATA.deposit("low-stress nitride", "lpcvd")
    assert deposit is not None and span(deposit.temperature or "", "temperature") == (835.0, 835.0)


def test_cautions_end_where_to_look_further() -> None:
    for name in ("hf 49", "koh", "piranha", "vapour hf", "poly rie"):
        cautions = DATA.etchant(name).cautions
        assert cautions
        assert all(text.endswith("follow the safety data sheet, local rules and trained staff") for text in cautions)


def test_ranges_read_in_the_units_of_the_program() -> None:
    assert span("580 to 630 degC", "temperature") == (580.0, 630.0)
    assert span("30 to 60 %", "fraction") == pytest.approx((0.3, 0.6))
    with pytest.raises(ValueError, match="ends below its start"):
        span("9 to 8 nm/min", "rate")


def test_the_flow_adds_and_overrides_entries() -> None:
    data = load_process_data(
        {
            "materials": {
                "our glass": {"kind": "glass", "conductor": "no"},
                "Resist": {"temperature_limit": "140 degC"},
            },
            "etchants": {"vhf": {"conditions": "our tool"}, "our bath": {"kind": "wet"}},
            "rates": {
                "vapour hf": {"our glass": "180 nm/min"},
                "hf 49": [{"material": "psg", "rate": "1 um/min", "source": "our log", "standing": "read"}],
            },
            "anneals": [{"material": "psg", "from": "as deposited", "to": "annealed", "at_least": "850 degC"}],
        }
    )
    ours = data.rate("vapour hf", "our glass")
    assert (ours.value, ours.source, ours.standing) == (pytest.approx(180 * NM_PER_MIN), "flow", "overridden")
    assert (ours.overridden, ours.conditions) == (True, "our tool")
    assert data.rate("hf 49", "psg", "annealed").source == "our log"
    assert data.rate("hf 49", "nitride").overridden is False
    resist = data.material("resist")
    assert resist.overridden and resist.temperature_limit is not None and resist.temperature_limit.low == 140.0
    assert resist.states == ("soft", "hard-baked")
    assert data.etchant("our bath").sides == "both"
    assert data.anneal("psg", None, 850.0, 60.0) == "annealed"


def test_overrides_leave_the_built_in_data_alone() -> None:
    load_process_data({"rates": {"hf 49": {"psg": "1 um/min"}}})
    assert load_process_data().rate("hf 49", "psg").value is None


@pytest.mark.parametrize(
    ("given", "keys", "text"),
    [
        ({"rate": {}}, ("data", "rate"), "unknown section; did you mean 'rates'?"),
        ("psg", ("data",), "expected a mapping, found 'psg'"),
        ({"rates": {"hf 48": {}}}, ("data", "rates", "hf 48"), "unknown etchant 'hf 48'; did you mean 'hf 49'?"),
        (
            {"rates": {"hf 49": {"psg": "3"}}}, ("data", "rates", "hf 49", "psg"),
            "'3' has no unit; expected a rate such as '200 nm/min'",
        ),
        (
            {"rates": {"hf 49": [{"material": "psg"}]}}, ("data", "rates", "hf 49", 0),
            "expected a rate, a code or both",
        ),
        (
            {"materials": {"goo": {"kind": "gel", "conductor": "no"}}}, ("data", "materials", "goo", "kind"),
            "expected 'semiconductor', 'oxide', 'glass', 'nitride', 'metal', 'resist' or 'polymer', found 'gel'",
        ),
        (
            {"materials": {"psg": {"densty": "1"}}}, ("data", "materials", "psg", "densty"),
            "unknown setting; did you mean 'density'?",
        ),
        (
            {"etchants": {"koh": {"cautions": "none"}}}, ("data", "etchants", "koh", "cautions"),
            "unknown setting; did you mean 'conditions'?",
        ),
        (
            {"methods": {"lpcvd": {"deposits": [{"material": "goldd", "rate": "1 nm/min"}]}}},
            ("data", "methods", "lpcvd"),
            "unknown material 'goldd'; did you mean 'gold'?",
        ),
    ],
)  # fmt: skip
def test_faults_of_the_flow_lead_to_their_place(given: Any, keys: tuple[str | int, ...], text: str) -> None:
    with pytest.raises(ProcessDataError) as caught:
        load_process_data(given)
    assert (keys, text) in caught.value.problems


WORDS = st.sampled_from([
    "materials", "etchants", "methods", "rates", "anneals", "sources", "hf 49", "psg", "lpcvd", "kind", "wet", "glass",
    "conductor", "no", "state", "annealed", "rate", "3 nm/min", "9 to 2 %", "material", "from", "at_least", "",
    "1e999 um",
])  # fmt: skip
TREES = st.recursive(WORDS, lambda part: st.lists(part, max_size=3) | st.dictionaries(WORDS, part, max_size=4))


@settings(max_examples=150, deadline=None, derandomize=True)
@draw(TREES)
def test_any_section_gives_data_or_complaints(section: Any) -> None:
    try:
        assert load_process_data(section).material("silicon").name == "silicon"
    except ProcessDataError as error:
        assert error.problems and all(keys[0] == "data" and text for keys, text in error.problems)
