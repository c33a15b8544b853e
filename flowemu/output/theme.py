"""Colours and hatches of the materials: one theme for every figure and scene.

Colours are written in OKLCH (lightness, chroma, hue in degrees), where equal steps look equally far
apart; they were spread so that no two come closer than 15 CIEDE2000 units, with each family of
materials in one region of hue: semiconductors blue-grey, glasses cyan, nitrides green, organics red.

References
----------
Ottosson, B. (2020), "A perceptual color space for image processing" (OKLab): the two matrices.
"""

from __future__ import annotations

import zlib
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

COLOURS = {
    "silicon": (0.669, 0.007, 259.0),
    "polysilicon": (0.590, 0.115, 267.0),
    "thermal oxide": (0.766, 0.121, 250.8),
    "pecvd oxide": (0.835, 0.036, 222.5),
    "lto": (0.917, 0.105, 199.4),
    "psg": (0.800, 0.119, 163.6),
    "nitride": (0.589, 0.123, 153.5),
    "low-stress nitride": (0.759, 0.165, 125.9),
    "resist": (0.703, 0.130, 17.8),
    "polyimide": (0.770, 0.120, 52.0),
    "aluminium": (0.854, 0.041, 94.5),
    "gold": (0.817, 0.157, 87.0),
    "chromium": (0.513, 0.067, 334.0),
    "titanium": (0.720, 0.100, 322.0),
    "tungsten": (0.462, 0.026, 274.2),
    "nickel": (0.638, 0.067, 101.3),
    "copper": (0.576, 0.120, 43.8),
}
HATCHES = {
    "polysilicon": "///",
    "thermal oxide": "...",
    "pecvd oxide": "..",
    "lto": "..",
    "psg": "....",
    "nitride": "xxx",
    "low-stress nitride": "xx",
    "resist": "|||",
    "polyimide": "---",
}
TURNED = {"///": ("\\\\\\", "---", "|||")}
LIGHTER = (0.0, 0.10, -0.09, 0.05)
SPARE_LIGHTNESS = 0.70
SPARE_CHROMA = 0.075
SPARE_HUES = 12
PAPER = "#ffffff"
INK = "#22262b"
MUTED = "#6b7178"
SEVERITY = {"error": "#c2182b", "warning": "#b86e00", "note": "#33658a"}

TO_CONE = np.array(
    [
        [1.0, 0.3963377774, 0.2158037573],
        [1.0, -0.1055613458, -0.0638541728],
        [1.0, -0.0894841775, -1.2914855480],
    ]
)
TO_RGB = np.array(
    [
        [4.0767416621, -3.3077115913, 0.2309699292],
        [-1.2684380046, 2.6097574011, -0.3413193965],
        [-0.0041960863, -0.7034186147, 1.7076147010],
    ]
)


@dataclass(frozen=True)
class Look:
    """How a film is drawn: its fill, outline and hatch lines as `#rrggbb`, and a matplotlib hatch."""

    fill: str
    line: str
    faint: str
    hatch: str


def hex_of(lightness: float, chroma: float, hue: float) -> str:
    """An OKLCH colour as `#rrggbb`; what no screen can show is clipped."""
    angle = np.radians(hue)
    cone = TO_CONE @ np.array([lightness, chroma * np.cos(angle), chroma * np.sin(angle)])
    linear = np.clip(TO_RGB @ cone**3, 0.0, 1.0)
    shown = np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * np.maximum(linear, 1e-9) ** (1 / 2.4) - 0.055)
    return "#" + "".join(f"{round(255 * float(channel)):02x}" for channel in shown)


def colour_of(material: str) -> tuple[float, float, float]:
    """OKLCH of a material; one that the theme does not know gets a spare hue by its name."""
    if material in COLOURS:
        return COLOURS[material]
    hue = (zlib.crc32(material.encode()) % SPARE_HUES + 0.5) * 360.0 / SPARE_HUES
    return (SPARE_LIGHTNESS, SPARE_CHROMA, hue)


def look_of(material: str, repeat: int = 0) -> Look:
    """The look of a material's film; its `repeat`-th further film is shaded and hatched otherwise."""
    lightness, chroma, hue = colour_of(material)
    lightness = float(np.clip(lightness + LIGHTER[repeat % len(LIGHTER)], 0.40, 0.95))
    hatch = HATCHES.get(material, "")
    if repeat and hatch in TURNED:
        hatch = TURNED[hatch][(repeat - 1) % len(TURNED[hatch])]
    line, faint = (hex_of(lightness - darker, 0.9 * chroma, hue) for darker in (0.26, 0.09))
    return Look(hex_of(lightness, chroma, hue), line, faint, hatch)


def looks_of(materials: Iterable[str]) -> list[Look]:
    """One look for each film of a stack, given the materials from the oldest film on."""
    seen: dict[str, int] = {}
    looks = []
    for material in materials:
        looks.append(look_of(material, seen.get(material, 0)))
        seen[material] = seen.get(material, 0) + 1
    return looks
