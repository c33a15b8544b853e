"""Draws the test die of the salt-marsh buoy: `python layouts/draw_saltmarsh.py [FILE]`.

Each device is one cell with its own layers; lengths in um. The same script gives the same bytes.

    rotor   10/0 DIMPLE   11/0 PIN      12/0 ROTOR    13/0 CAP
    comb    20/0 GROUND   21/0 DIMPLE   22/0 ANCHOR   23/0 BEAM
    all     60/0 part names             61/0 die edge and writing
"""

from __future__ import annotations

import sys
from datetime import datetime
from math import pi
from pathlib import Path

import gdstk

DIMPLE, PIN, ROTOR, CAP = (10, 0), (11, 0), (12, 0), (13, 0)
C_GROUND, C_DIMPLE, C_ANCHOR, C_BEAM = (20, 0), (21, 0), (22, 0), (23, 0)
NAMES, DIE = (60, 0), (61, 0)
ROUND = 96
"""Sides of a drawn circle: a multiple of four, so that it reaches its radius along x and y."""


def main() -> None:
    """Write the die to the file named on the command line, or beside this script."""
    target = sys.argv[1] if len(sys.argv) > 1 else Path(__file__).with_name("saltmarsh.gds")
    draw().write_gds(target, timestamp=datetime(2024, 1, 1))


def draw() -> gdstk.Library:
    """The whole die: every device placed under the top cell `saltmarsh`."""
    library = gdstk.Library("saltmarsh", unit=1e-6, precision=1e-9)
    devices = [rotor(library), *combs(library)]
    top = library.new_cell("saltmarsh")
    top.add(*frame(1000, 800, 20), *gdstk.text("SALTMARSH BUOY", 40, (-440, -340), layer=DIE[0], datatype=DIE[1]))
    for device, place in zip(devices, [(-300, 100), (0, 100), (250, 100)], strict=True):
        top.add(gdstk.Reference(device, place))
    return library


def frame(width: float, height: float, line: float) -> list[gdstk.Polygon]:
    """A die edge of the given outer size, centred."""
    outer = box(-width / 2, -height / 2, width / 2, height / 2, DIE)
    inner = box(line - width / 2, line - height / 2, width / 2 - line, height / 2 - line, DIE)
    return gdstk.boolean(outer, inner, "not", layer=DIE[0], datatype=DIE[1])


def box(x0: float, y0: float, x1: float, y1: float, on: tuple[int, int]) -> gdstk.Polygon:
    """A rectangle."""
    return gdstk.rectangle((x0, y0), (x1, y1), layer=on[0], datatype=on[1])


def disc(radius: float, on: tuple[int, int], centre: complex = 0j) -> gdstk.Polygon:
    """A circle of `ROUND` sides."""
    corners = [centre + radius * pow(1j, 4 * k / ROUND) for k in range(ROUND)]
    return gdstk.Polygon(corners, layer=on[0], datatype=on[1])


def label(text: str, x: float, y: float) -> gdstk.Label:
    """A part's name at a place on the part."""
    return gdstk.Label(text, (x, y), layer=NAMES[0], texttype=NAMES[1])


# --- rotor: the flow meter's wheel, loose on a flanged pin ---


def rotor(library: gdstk.Library) -> gdstk.Cell:
    """Wheel with a bore of radius 8, eight windows, eight blades; pin of radius 4, flange of radius 11."""
    cell = library.new_cell("rotor")
    cell.add(*wheel(), disc(4, PIN), disc(11, CAP))
    cell.add(gdstk.Reference(dimple_cell(library, "rotor_dimple", 1.25, DIMPLE), (14, 0)))
    for k in range(1, 6):
        turn = k * pi / 3
        place = 14 * pow(1j, 2 * k / 3)
        cell.add(gdstk.Reference(library["rotor_dimple"], place, rotation=turn))
    cell.add(label("rotor", 23.5, 0), label("pin", 0, 0))
    return cell


def wheel() -> list[gdstk.Polygon]:
    """Web, spokes, rim and blades in one piece."""
    blades = [box(24, -1.5, 29, 1.5, ROTOR).rotate(k * pi / 4) for k in range(8)]
    windows = gdstk.boolean(disc(22, ROTOR), disc(18, ROTOR), "not")
    spokes = [box(17, -2, 23, 2, ROTOR).rotate((k + 0.5) * pi / 4) for k in range(8)]
    cut = [*gdstk.boolean(windows, spokes, "not"), disc(8, ROTOR)]
    return gdstk.boolean([disc(25, ROTOR), *blades], cut, "not", layer=ROTOR[0], datatype=ROTOR[1])


def dimple_cell(library: gdstk.Library, name: str, radius: float, on: tuple[int, int]) -> gdstk.Cell:
    """One round dimple."""
    cell = library.new_cell(name)
    cell.add(disc(radius, on))
    return cell


# --- comb: the resonator that weighs the water, on one structural level ---


def combs(library: gdstk.Library) -> list[gdstk.Cell]:
    """The resonator, and its twin that lacks the right comb's anchor."""
    shared = comb_body(library)
    opening = library.new_cell("comb_anchor")
    opening.add(box(-2, -14, 2, 14, C_ANCHOR))
    left, right = gdstk.Reference(opening, (-56, 0)), gdstk.Reference(opening, (56, 0))
    good, bad = library.new_cell("comb"), library.new_cell("comb_unanchored")
    good.add(gdstk.Reference(shared), left, right)
    bad.add(gdstk.Reference(shared), left)
    return [good, bad]


def comb_body(library: gdstk.Library) -> gdstk.Cell:
    """All of the resonator but the anchors of the two fixed combs."""
    spring, drive = comb_spring(library), comb_drive(library)
    cell = library.new_cell("comb_body")
    cell.add(*shuttle(), box(-47, -58, 47, 58, C_GROUND))
    cell.add(gdstk.Reference(spring), gdstk.Reference(spring, x_reflection=True))
    cell.add(gdstk.Reference(drive), gdstk.Reference(drive, rotation=pi))
    cell.add(label("shuttle", 5, 0), label("comb_left", -56, 0), label("comb_right", 56, 0))
    return cell


def shuttle() -> list[gdstk.Polygon]:
    """Plate 48 x 14 with five etch holes and four dimples, and the four arms that carry the springs."""
    holes = [box(x - 1.5, -1.5, x + 1.5, 1.5, C_BEAM) for x in (-20, -10, 0, 10, 20)]
    plate = gdstk.boolean(box(-24, -7, 24, 7, C_BEAM), holes, "not", layer=C_BEAM[0], datatype=C_BEAM[1])
    dimples = [box(x - 1, y - 1, x + 1, y + 1, C_DIMPLE) for x in (-15, 15) for y in (-3.5, 3.5)]
    arms = [box(x - 2, y - 8, x + 2, y + 8, C_BEAM) for x in (-22, 22) for y in (-14, 14)]
    return [*plate, *dimples, *arms]


def comb_spring(library: gdstk.Library) -> gdstk.Cell:
    """The upper folded spring: four beams 30 x 2, a truss with two dimples, two anchored pads."""
    cell = library.new_cell("comb_spring")
    beam = gdstk.FlexPath([(0, 21), (0, 53)], 2, layer=C_BEAM[0], datatype=C_BEAM[1])
    for x in (-22, -12, 12, 22):
        cell.add(beam.copy().translate(x, 0))
    cell.add(box(-24, 52, 24, 58, C_BEAM))
    for x in (-12, 12):
        cell.add(box(x - 5, 12, x + 5, 22, C_BEAM), box(x - 3, 14, x + 3, 20, C_ANCHOR))
    cell.add(*(box(x - 1, 54, x + 1, 56, C_DIMPLE) for x in (-17, 17)))
    return cell


def comb_drive(library: gdstk.Library) -> gdstk.Cell:
    """The right-hand drive: five moving and four fixed fingers, 2 wide with gaps of 2, overlap 8."""
    finger = library.new_cell("comb_finger")
    finger.add(box(0, -1, 15, 1, C_BEAM))
    cell = library.new_cell("comb_drive")
    cell.add(box(23, -3, 29, 3, C_BEAM), box(28, -18, 32, 18, C_BEAM))
    cell.add(gdstk.Reference(finger, (31, -16), columns=1, rows=5, spacing=(0, 8)))
    cell.add(gdstk.Reference(finger, (38, -12), columns=1, rows=4, spacing=(0, 8)))
    cell.add(box(52, -18, 60, 18, C_BEAM), box(50, -20, 62, 20, C_GROUND))
    return cell


if __name__ == "__main__":
    main()
