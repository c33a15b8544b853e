"""The theme: every built-in material has its own colour, apart from all others."""

from __future__ import annotations

import re
from importlib.resources import files

import numpy as np
import pytest
import yaml
from skimage.color import deltaE_ciede2000, rgb2lab

from flowemu.output.theme import COLOURS, PAPER, hex_of, look_of, looks_of


def lab_of(colours: list[str]) -> np.ndarray:
    rgb = [[int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)] for colour in colours]
    return rgb2lab(np.array([rgb]))[0]


def test_every_built_in_material_has_a_colour() -> None:
    materials = yaml.safe_load(files("flowemu.data").joinpath("materials.yaml").read_text(encoding="utf-8"))
    assert set(materials) <= set(COLOURS)


def test_colours_are_at_least_fifteen_ciede2000_apart_and_five_from_paper() -> None:
    """scikit-image computes the differences."""
    lab = lab_of([look_of(material).fill for material in COLOURS])
    apart = deltaE_ciede2000(lab[:, None], lab[None])
    assert apart[np.triu_indices(len(lab), 1)].min() > 15.0
    assert deltaE_ciede2000(lab, lab_of([PAPER])).min() > 5.0


def test_ends_of_the_grey_scale_are_exact() -> None:
    """OKLab's lightness 0 is black and 1 is white, by its definition."""
    assert hex_of(0.0, 0.0, 0.0) == "#000000"
    assert hex_of(1.0, 0.0, 0.0) == "#ffffff"


def test_films_of_one_material_look_different() -> None:
    looks = looks_of(["silicon", "polysilicon", "psg", "polysilicon", "polysilicon"])
    assert len({(look.fill, look.hatch) for look in looks}) == 5
    assert looks[1] == look_of("polysilicon")


@pytest.mark.parametrize("material", ["unobtainium", "parylene", "su-8"])
def test_unknown_material_gets_a_colour_of_its_name(material: str) -> None:
    assert re.fullmatch("#[0-9a-f]{6}", look_of(material).fill)
    assert look_of(material) == look_of(material)
