"""Values carried outward, against a plain twin and against fields that they must go on."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels.carry import MOST_BENT, UNKNOWN, carried

ACROSS = [(0, 0, -1), (0, 0, 1), (0, -1, 0), (0, 1, 0), (-1, 0, 0), (1, 0, 0)]


def led_on(value: np.ndarray, known: np.ndarray, place: tuple, step: tuple, zc: np.ndarray, dx: float) -> float | None:
    """The twin of one axis: the curve through up to three known samples, at the place before them."""
    points = []
    for k in range(1, 4):
        at = tuple(p + k * s for p, s in zip(place, step, strict=True))
        if any(a < 0 or a >= n for a, n in zip(at, value.shape, strict=True)) or not known[at]:
            break
        points.append((abs(zc[at[0]] - zc[place[0]]) + dx * (abs(at[1] - place[1]) + abs(at[2] - place[2])), value[at]))
    if len(points) < 2:
        return float(points[0][1]) if points else None
    (a, u), (b, v) = points[:2]
    slope = (u - v) / (b - a)
    if len(points) == 3:
        c, w = points[2]
        slope += np.clip((slope - (v - w) / (c - b)) / (c - a), -MOST_BENT / a, MOST_BENT / a) * b
    return float(u + np.clip(slope, -1, 1) * a)


def twin(value: np.ndarray, known: np.ndarray, zc: np.ndarray, dx: float, rings: int) -> tuple[np.ndarray, np.ndarray]:
    value, ring = value.astype(float), np.where(known, 0, UNKNOWN)
    for r in range(1, rings + 1):
        old, there = value.copy(), ring < r
        for place in zip(*np.nonzero(~there), strict=True):
            near = tuple(slice(max(p - 1, 0), min(p + 2, n)) for p, n in zip(place, value.shape, strict=True))
            if not there[near].any():
                continue
            if r == 1:
                found = [led_on(old, there, place, step, zc, dx) for step in ACROSS]
            else:
                ends = [tuple(p + s for p, s in zip(place, step, strict=True)) for step in ACROSS]
                inside = [e for e in ends if all(0 <= a < n for a, n in zip(e, value.shape, strict=True))]
                found = [float(old[e]) for e in inside if there[e]]
            found = [f for f in found if f is not None]
            if not found:
                apart = sum(np.abs(g - p) for g, p in zip(np.mgrid[near], place, strict=True))
                least = apart[there[near]].min()
                found = list(old[near][there[near] & (apart == least)])
            value[place], ring[place] = np.mean(found), r
    return value, ring


def test_it_is_the_plain_twins_on_random_values():
    """To rounding, on graded z and with gaps of every kind."""
    rng = np.random.default_rng(4)
    for share in (0.05, 0.3, 0.7):
        shape = (7, 6, 9)
        known = rng.random(shape) < share
        zc = np.cumsum(rng.uniform(0.7, 1.3, shape[0]))
        value = np.where(known, rng.normal(size=shape), 0).astype(np.float32)
        wanted, ring_wanted = twin(value, known, zc, 1.1, 3)
        ring = carried(value, known, zc, 1.1, 3)
        assert np.array_equal(ring, ring_wanted)
        assert np.allclose(value[ring < UNKNOWN], wanted[ring < UNKNOWN], atol=1e-5)


@pytest.mark.parametrize("slope", [0.0, 0.4, -0.9])
def test_a_level_fields_slope_goes_on_for_a_ring(slope):
    """A distance that falls along z is led on exactly one sample beyond, and from there as it is."""
    zc = np.cumsum(np.full(12, 0.5)) + np.linspace(0, 0.3, 12)
    field = np.broadcast_to((slope * zc)[:, None, None], (12, 3, 3)).astype(np.float32)
    known = np.zeros(field.shape, bool)
    known[3:8] = True
    value = np.where(known, field, 0).astype(np.float32)
    carried(value, known, zc, 0.5, 2)
    assert value[8] == pytest.approx(field[8], abs=1e-6)
    assert value[2] == pytest.approx(field[2], abs=1e-6)
    assert value[9] == pytest.approx(field[8], abs=1e-6)


def test_a_round_front_goes_on_bent():
    """Distance from a line 3 cells away, one sample beyond the known ones: to 0.1 cell, where flat is 0.2 off."""
    x, z = np.arange(14.0), np.arange(10.0)
    field = np.hypot(x[None, None, :] - 3.0, z[:, None, None] - 7.4).astype(np.float32)
    known = np.zeros(field.shape, bool)
    known[:7] = True
    value = np.where(known, field, 0).astype(np.float32)
    carried(value, known, z, 1.0, 1)
    at = np.s_[7, 0, 6:12]
    assert np.abs(value[at] - field[at]).max() < 0.1
    assert np.abs(field[6, 0, 6:12] - field[at]).max() > 0.2
