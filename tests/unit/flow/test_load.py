"""Reading a whole flow: typed sections and steps, and every fault located and hinted."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from flowemu.errors import InputError
from flowemu.flow.load import load_flow
from tests.unit.flow.flows import GOOD, complaints, folder_with_layout, read


def test_a_good_flow_in_the_programs_own_units(tmp_path: Path) -> None:
    flow = read(GOOD, tmp_path)
    assert (flow.title, flow.about) == ("Small", "A plate over a glass.")
    assert flow.layout.window is not None
    assert flow.layout.window.box == (-10.0, -10.0, 10.0, 10.0)
    assert flow.masks == {"ANCHOR": (10, 0), "PLATE": (11, 0)}
    assert flow.layout_path == (tmp_path / "die.gds").resolve()
    assert (flow.wafer.depth, flow.wafer.thickness, flow.wafer.orientation) == (3.0, 525.0, "100")
    assert [step.verb for step in flow.steps][:4] == ["deposit", "pattern", "etch", "strip"]
    glass, hole, etch = (flow.steps[i].settings for i in (0, 1, 2))
    assert (glass.thickness, glass.coverage) == (2.0, 0.6)
    assert (hole.resist.thickness, hole.resist.material, hole.keeps_drawn, hole.wall) == (2.0, "resist", False, 90.0)
    assert (etch.etchant, etch.clears, etch.over) == ("oxide rie", ("glass",), 0.2)
    assert flow.steps[3].settings.film == "resist"
    assert (flow.steps[5].settings.temperature, flow.steps[5].settings.time) == (1050.0, 3600.0)
    assert flow.steps[7].settings.stated_rate("x", "PSG") == pytest.approx(2e-3 / 60)
    assert flow.steps[10].settings.stated_amount() == ("frees", ("plate",))
    assert [e.kind for e in flow.expect] == ["held", "thickness"]
    assert flow.expect[1].subject.at_least == 1.9


def test_steps_are_found_by_number_and_name(tmp_path: Path) -> None:
    flow = read(GOOD, tmp_path)
    assert [flow.find_step(text) for text in ("0", "11", "plate film")] == [0, 11, 5]
    with pytest.raises(InputError, match=re.escape("there is no step '12'; the flow has steps 0 to 11")):
        flow.find_step("12")
    with pytest.raises(InputError, match="did you mean 'plate film'"):
        flow.find_step("plate filn")


def test_a_fault_of_a_step_names_it(tmp_path: Path) -> None:
    flow = read(GOOD, tmp_path)
    assert str(flow.step_fault(flow.steps[2], "with", "no rate")).endswith("small.yaml:14:18: step 3 (etch): no rate")
    assert str(flow.step_fault(flow.steps[2], None, "no rate")).endswith("small.yaml:14:5: step 3 (etch): no rate")


@pytest.mark.parametrize(
    ("good", "bad", "says"),
    [
        ("over: 20 %", "ovr: 20 %", "14:44: step 3 (etch): unknown setting 'ovr'; did you mean 'over'?"),
        ("flow: Small\n", "", "1:1: missing section 'flow'"),
        ("grid:", "gird:", "10:1: unknown section 'gird'; did you mean 'grid'?"),
        ("cell: 0.5 um", "cell: 0 um", "10:14: grid.cell: '0 um' is below 0.1 nm"),
        ("open: drawn", "open: down", "13:35: step 2 (pattern): open: unknown word 'down'; did you mean 'drawn'?"),
        ("over: 20 %", "over: 20 %, time: 2 min", "14:5: step 3 (etch): expected exactly one of time, depth"),
        ("clears: glass, over", "time: 3 min, over", "14:5: step 3 (etch): 'over' may only follow clears or until"),
        ("11/0", "11", "7:32: layout.masks.PLATE: expected layer/datatype such as '10/0', found '11'"),
        ("masks: {", "masks: {'?': 1/0, ", "7:11: layout.masks.?: '?' is not a name"),
        ("10 um]\n", "10 um, 3 um]\n", "6:11: layout.window: expected a box such as"),
        ('"100"', "101", "9:41: wafer.orientation: expected an orientation, one of 100, 110, 111, found '101'"),
        ("- inspect:", "- inspect: {figure: x}", "21:15: step 10 (inspect): unknown setting 'figure'"),
        ("- inspect:", "- inspekt", "21:5: step 10: unknown step 'inspekt'; did you mean 'inspect'?"),
        ("- inspect:", "- grind: {}", "21:5: step 10: step kind 'grind' is not built yet"),
        ("- strip: resist", "- strip:", "15:5: step 4 (strip): missing setting 'film'"),
        ("coverage: 60 %", "coverage: 160 %", "12:85: step 1 (deposit): coverage: '160 %' is above 100 %"),
        ("coverage: 60 %", "coverage: ~", "step 1 (deposit): coverage: no value"),
        ("held: {part", "held: {prt", "24:12: expect[1].held: unknown setting 'prt'; did you mean 'part'?"),
        (", at_least: 1.9 um", "", "25:16: expect[2].thickness: expected at_least, at_most or both"),
        ("die.gds", "dye.gds", "4:9: layout.file: there is no file 'dye.gds'; did you mean 'die.gds'?"),
        ("die.gds", "../die.gds", "4:9: layout.file: '../die.gds' leaves the project folder"),
    ],
)
def test_one_slip_gives_one_located_line(good: str, bad: str, says: str, tmp_path: Path) -> None:
    assert good in GOOD
    lines = complaints(GOOD.replace(good, bad, 1), tmp_path)
    assert len(lines) == 1
    assert says in lines[0]


@pytest.mark.parametrize(
    ("good", "bad", "says"),
    [
        ("mask: PLATE", "mask: PLAT", "mask: mask 'PLAT' is not declared under layout.masks; did you mean 'PLATE'?"),
        ("align: ANCHOR", "align: PLATE", "mask 'PLATE' is not on the wafer yet; possible are ANCHOR, bare"),
        ("film: poly, mat", "film: glass, mat", "film: step 1 already put down a film named 'glass'"),
        ("film: glass", "film: wafer", "film: the name 'wafer' is taken, for the wafer's own film"),
        (
            "clears: glass",
            "clears: poly",
            "there is no film 'poly' at this step; there are wafer, glass, resist",
        ),
        ("film: poly, at: [0 um, 0 um]}}", "film: pol, at: [0 um, 0 um]}}", "no step puts down a film 'pol'; did you"),
        ("frees: [plate]", "frees: [plato]", "frees: there is no part 'plato' under parts; did you mean 'plate'?"),
        ("held: {part: plate", "held: {part: x", "expect[1].held.part: there is no part 'x' under parts"),
        ("- inspect:", "- strip: resist", "there is no film 'resist' at this step any more"),
        ("- inspect:", "- inspect: {name: plate film}", "name: 'plate film' is already the name of step 5"),
        ("material: psg", "material: psb", "material: unknown material 'psb'; did you mean 'psg'?"),
        ("state: n+", "state: p+", "material: unknown state of polysilicon 'p+'"),
        ("with: poly rie", "with: poly rei", "with: unknown etchant 'poly rei'; did you mean 'poly rie'?"),
        ("with: hf 49, frees: [plate]", "with: koh, clears: glass", "the crystal etch of 'koh' is not built yet"),
        ("rates: {psg", "rates: {psgg", "rates: unknown material 'psgg'; did you mean 'psg'?"),
        ("with: hf 49, frees: [plate]", "with: hf 49, clears: poly", "'hf 49' does not etch film 'poly'"),
        (
            "with: hf 49, frees: [plate]",
            "with: vapour hf, clears: glass",
            "no rate for film 'glass' (psg, annealed)",
        ),
        ("coverage: 60 %", "planarisation: 60 %", "planarisation: a film by 'lpcvd' does not level"),
    ],
)
def test_the_order_of_steps_and_the_trades_names_are_checked(good: str, bad: str, says: str, tmp_path: Path) -> None:
    assert good in GOOD
    assert any(says in line for line in complaints(GOOD.replace(good, bad, 1), tmp_path))


def test_all_faults_come_at_once(tmp_path: Path) -> None:
    bad = GOOD.replace("0.5 um", "0.5").replace("psg, thickness", "psg, thicknes").replace("open: drawn", "open: drwn")
    assert [line.split(":")[0] for line in complaints(bad, tmp_path)] == ["10", "12", "13"]


def test_window_with_mirrors(tmp_path: Path) -> None:
    bad = GOOD.replace("[-10 um, -10 um, 10 um, 10 um]", "{box: [0 um, 0 um, 9 um, 9 um], symmetry: [left, botom]}")
    assert "layout.window.symmetry[2]: unknown word 'botom'; did you mean 'bottom'?" in complaints(bad, tmp_path)[0]


def test_limits_and_waivers(tmp_path: Path) -> None:
    extra = "limits: {foot: {warning: 1.5 um}, unmeant_loss: {error: [30 %, 50 nm], note: off}}\n"
    flow = read(GOOD + extra, tmp_path)
    assert flow.limit("foot", "warning") == (("length", 1.5),)
    assert flow.limit("unmeant_loss", "error") == (("fraction", 0.3), ("length", 0.05))
    assert flow.limit("unmeant_loss", "note") == ()
    assert flow.limit("foot", "error") is None
    bad = "limits: {foot: {warning: 30 s}, fot: {}}\naccept: [{code: x, part: plate, reason: r, by: me, date: today}]\n"
    lines = complaints(GOOD + bad, tmp_path)
    assert "limits: foot.warning: expected a length such as '2 um' or a share such as '20 %' or 'off'" in lines[0]
    assert "limits: unknown setting 'fot'; did you mean 'foot'?" in lines[1]
    assert "accept[1].date: expected a date such as '2026-03-31', found 'today'" in lines[2]


def test_own_process_data_are_read_and_located(tmp_path: Path) -> None:
    own = GOOD + "data:\n  rates:\n    vapour hf: {psg: 180 nm/mn}\n"
    assert any(line.startswith("28:") and "data.rates" in line for line in complaints(own, tmp_path))


def test_files_that_cannot_be_read(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="the flow file cannot be read: no such file"):
        load_flow(tmp_path / "none.yaml")
    with pytest.raises(InputError, match="the flow file cannot be read: is a directory"):
        load_flow(tmp_path)


def test_another_folder_can_be_allowed(tmp_path: Path) -> None:
    inner = tmp_path / "inner"
    inner.mkdir()
    folder_with_layout(inner)
    (tmp_path / "far.gds").write_bytes(b"")
    path = inner / "small.yaml"
    path.write_text(GOOD.replace("die.gds", "../far.gds"))
    with pytest.raises(InputError, match="--allow DIR"):
        load_flow(path)
    assert load_flow(path, allow=[tmp_path]).layout_path == (tmp_path / "far.gds").resolve()


def test_a_link_does_not_lead_out_of_the_project(tmp_path: Path) -> None:
    inner = tmp_path / "inner"
    inner.mkdir()
    folder_with_layout(inner)
    (tmp_path / "far.gds").write_bytes(b"")
    (inner / "link.gds").symlink_to(tmp_path / "far.gds")
    path = inner / "small.yaml"
    path.write_text(GOOD.replace("die.gds", "link.gds"))
    with pytest.raises(InputError, match="leaves the project folder"):
        load_flow(path)
