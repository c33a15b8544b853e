"""Published rates and what follows from them alone: times to clear, losses and selectivities.

Sources: WGW03 is Williams, Gupta, Wasilik, J. MEMS 12(6), 761-778, 2003 (from a public copy of its tables); WM96 is
Williams, Muller, J. MEMS 5(4), 256-269, 1996 (from memory); BURNS11 is Burns, ch. 8 of the MEMS Materials and
Processes Handbook, Springer 2011, table 8.19; UCSB is the UCSB Nanofab wiki. Tolerances are on the arithmetic, not
on how well a bath repeats.
"""

import pytest

from flowemu.flow.process import load_process_data
from flowemu.flow.process_values import span

DATA = load_process_data()

# etchant, material, state, nm/min, source, standing
PUBLISHED = [
    ("hf 49", "thermal oxide", None, 2300, "wgw03", "read"),
    ("hf 10:1", "thermal oxide", None, 23, "wgw03", "read"),
    ("hf 10:1", "lto", "annealed", 34, "wgw03", "read"),
    ("hf 10:1", "nitride", None, 1.1, "wgw03", "read"),
    ("hf 25:1", "thermal oxide", None, 9.7, "wgw03", "read"),
    ("hf 100:1", "thermal oxide", None, 2.3, "wgw03", "read"),
    ("bhf 5:1", "thermal oxide", None, 100, "wgw03", "read"),
    ("bhf 5:1", "resist", None, 0, "wgw03", "read"),
    ("hf vapour over dish", "lto", "annealed", 78, "wgw03", "read"),
    ("hot phosphoric", "low-stress nitride", None, 2.7, "wgw03", "read"),
    ("hot phosphoric", "psg", "annealed", 1.8, "wgw03", "read"),
    ("xef2", "silicon", None, 460, "wgw03", "read"),
    ("xef2", "tungsten", None, 80, "wgw03", "read"),
    ("o2 plasma", "polyimide", None, 370, "wgw03", "read"),
    ("aluminium etch", "polysilicon", None, 1.2, "burns11", "read"),
    ("hf 49", "psg", "annealed", 3600, "wm96", "from memory"),
    ("hf 49", "nitride", None, 14, "wm96", "from memory"),
    ("hf 49", "low-stress nitride", None, 5.2, "wm96", "from memory"),
    ("hf 49", "polysilicon", "n+", 0, "wm96", "from memory"),
    ("bhf 5:1", "psg", "annealed", 440, "wm96", "from memory"),
    ("poly rie", "polysilicon", "n+", 570, "wm96", "from memory"),
    ("oxide rie", "psg", "as deposited", 730, "wm96", "unverified"),
]


def nm_per_min(etchant: str, material: str, state: str | None = None) -> float:
    """The rate in nm/min, as the tables print it."""
    value = DATA.rate(etchant, material, state).value
    assert value is not None
    return value * 60e3


@pytest.mark.parametrize(("etchant", "material", "state", "expected", "source", "standing"), PUBLISHED)
def test_row_of_the_table(
    etchant: str, material: str, state: str | None, expected: float, source: str, standing: str
) -> None:
    """Each row as its source prints it; exact but for rounding."""
    rate = DATA.rate(etchant, material, state)
    assert nm_per_min(etchant, material, state) == pytest.approx(expected, rel=1e-9)
    assert (rate.source, rate.standing) == (source, standing)


@pytest.mark.parametrize(
    ("etchant", "material", "state", "code"),
    [
        ("hf 49", "psg", "as deposited", "F"),  # WM96, from memory
        ("hf 49", "titanium", None, "F"),  # WM96, from memory
        ("hf 10:1", "silicon", None, "S"),  # WGW03, read
        ("hf 10:1", "pecvd oxide", "as deposited", "W"),  # WGW03, read
        ("hf vapour over dish", "copper", None, "R"),  # WGW03, read
        ("hf vapour over dish", "aluminium", None, "A"),  # WM96, from memory
        ("hf vapour over dish", "resist", None, "P"),  # WGW03, read: peels, what stays is not etched
    ],
)
def test_code_without_a_number_is_no_rate(etchant: str, material: str, state: str | None, code: str) -> None:
    rate = DATA.rate(etchant, material, state)
    assert (rate.code, rate.value) == (code, None)


@pytest.mark.parametrize(
    ("etchant", "material", "code", "expected"),
    [("hot phosphoric", "resist", "P", 120.0), ("bhf 5:1", "copper", "R", 5.0)],  # WGW03, read
)
def test_code_beside_a_number_keeps_both(etchant: str, material: str, code: str, expected: float) -> None:
    assert DATA.rate(etchant, material).code == code
    assert nm_per_min(etchant, material) == pytest.approx(expected)


@pytest.mark.parametrize(("etchant", "minutes"), [("hf 10:1", 21.7), ("hf 25:1", 51.5), ("hf 100:1", 217.0)])
def test_diluted_hf_clears_half_a_micrometre(etchant: str, minutes: float) -> None:
    """WGW03: thermal oxide at 23, 9.7 and 2.3 nm/min; times to the printed figures, 0.3 %."""
    assert 500.0 / nm_per_min(etchant, "thermal oxide") == pytest.approx(minutes, rel=3e-3)


def test_bhf_undercut_with_overetch() -> None:
    """WGW03: 500 nm of thermal oxide at 100 nm/min and 20 % overetch is 6.0 min, 600 nm at the top edge; 3 %."""
    minutes = 1.2 * 500.0 / nm_per_min("bhf 5:1", "thermal oxide")
    assert minutes == pytest.approx(6.0, rel=0.03)
    assert minutes * nm_per_min("bhf 5:1", "thermal oxide") == pytest.approx(600.0, rel=0.03)


def test_bhf_selectivity_of_deposited_over_thermal_oxide() -> None:
    """WGW03: 490 and 240 against 100 nm/min, exactly 4.9 and 2.4."""
    thermal = nm_per_min("bhf 5:1", "thermal oxide")
    assert nm_per_min("bhf 5:1", "pecvd oxide", "as deposited") / thermal == pytest.approx(4.9, rel=1e-9)
    assert nm_per_min("bhf 5:1", "pecvd oxide", "annealed") / thermal == pytest.approx(2.4, rel=1e-9)


def test_hot_phosphoric_strips_nitride_from_oxide() -> None:
    """WGW03: 150 nm of nitride at 4.5 nm/min takes 33.3 min, in which oxide at 0.18 nm/min loses 6.0 nm; 2 %."""
    minutes = 150.0 / nm_per_min("hot phosphoric", "nitride")
    assert minutes == pytest.approx(33.3, rel=0.02)
    assert minutes * nm_per_min("hot phosphoric", "thermal oxide") == pytest.approx(6.0, rel=0.02)


def test_aluminium_etch_beside_nickel_and_copper() -> None:
    """BURNS11: 200 nm of aluminium at 540 nm/min takes 22 s; nickel loses 11 nm, copper 1.07 um; 3 %."""
    minutes = 200.0 / nm_per_min("aluminium etch", "aluminium")
    assert minutes * 60.0 == pytest.approx(22.0, rel=0.03)
    assert minutes * nm_per_min("aluminium etch", "nickel") == pytest.approx(11.0, rel=0.03)
    assert minutes * nm_per_min("aluminium etch", "copper") == pytest.approx(1070.0, rel=0.03)


def test_xef2_releases_polysilicon() -> None:
    """WGW03: 2 um at 180 nm/min takes 11.1 min; nitride at 12 nm/min loses 133 nm and thermal oxide none; 2 %."""
    minutes = 2000.0 / nm_per_min("xef2", "polysilicon")
    assert minutes == pytest.approx(11.1, rel=0.02)
    assert minutes * nm_per_min("xef2", "nitride") == pytest.approx(133.0, rel=0.02)
    assert nm_per_min("xef2", "thermal oxide") == 0.0


def test_oxygen_plasma_ashes_resist_and_polyimide() -> None:
    """WGW03: 1 um of resist at 300 nm/min takes 3.33 min, in which polyimide loses 1.23 um; 1 %."""
    minutes = 1000.0 / nm_per_min("o2 plasma", "resist")
    assert minutes == pytest.approx(3.33, rel=0.01)
    assert minutes * nm_per_min("o2 plasma", "polyimide") == pytest.approx(1230.0, rel=0.01)


def test_deep_etch_through_a_wafer_and_its_resist() -> None:
    """UCSB: 525 um at 4.25 um/min takes 123.5 min; at a selectivity of 60 the resist loses 8.75 um; 1 %."""
    minutes = 525e3 / nm_per_min("deep silicon", "silicon")
    assert minutes == pytest.approx(123.5, rel=0.01)
    assert minutes * nm_per_min("deep silicon", "resist") == pytest.approx(8750.0, rel=0.01)


def test_furnace_nitride_growth() -> None:
    """MEMS Exchange catalogue entry P3684: 200 nm at 3.5 nm/min takes 57 min; 1 %."""
    deposit = DATA.deposit("nitride", "lpcvd")
    assert deposit is not None and deposit.rate is not None
    assert 200.0 / (span(deposit.rate, "rate")[0] * 60e3) == pytest.approx(57.0, rel=0.01)
