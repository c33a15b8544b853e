"""What an etch front runs through: films of one rate as one medium, and the nodes of their samples."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from flowemu.kernels import fronts
from flowemu.stack.topology import Topology

SLOWEST_SHARE = 1 / 50  # films slower than this share of the fastest get a front of their own


def groups_by_rate(rates: Mapping[int, float]) -> list[list[int]]:
    """Films with a rate above zero, fastest first, in groups within a factor of fifty."""
    groups: list[list[int]] = []
    for k in sorted((k for k in rates if rates[k] > 0), key=lambda k: (-rates[k], k)):
        if groups and rates[k] >= SLOWEST_SHARE * rates[groups[-1][0]]:
            groups[-1].append(k)
        else:
            groups.append([k])
    return groups


def media_of(rates: Mapping[int, float], films: Sequence[int], count: int) -> np.ndarray:
    """The first of the listed films that has each one's rate, `(count,)` int64; other films stand for themselves."""
    medium = np.arange(count)
    for k in sorted(films):
        medium[k] = min(j for j in films if rates[j] == rates[k])
    return medium


@dataclass(frozen=True, eq=False)
class Nodes:
    """(sample, film) pairs that a front can be at; see `kernels.fronts`.

    Attributes
    ----------
    own : (samples,) int32; node of a sample in its own film, -1 for none
    keys : (thin,) int64, rising; sample x films + film of the nodes beside a thin film, which come from `first_thin` on
    place : (n, 3) float32; x, y, z, um from the first sample in x and y
    stage : (films,) uint8; 1 for the films that the front etches
    medium : (films,) int64; first film of the same rate
    """

    sample: np.ndarray
    film: np.ndarray
    own: np.ndarray
    keys: np.ndarray
    first_thin: int
    place: np.ndarray
    neighbours: np.ndarray
    stage: np.ndarray
    medium: np.ndarray

    @classmethod
    def of(cls, topology: Topology, films: list[int], medium: np.ndarray) -> Nodes:
        t, grid, code = topology, topology.grid, topology.code.reshape(-1)
        stage = np.zeros(len(medium), np.uint8)
        stage[films] = 1
        sample, own = fronts.own_samples(t.code, stage)
        thin_sample, thin_film, thin_place = fronts.thin_nodes(
            t.samples, code, stage, t.open_space.reshape(-1), t.strides, t.code.shape, t.count, t.start,
            t.interval_code, t.interval_end, grid.z, grid.cell, grid.cell,
        )  # fmt: skip
        keys, first = np.unique(thin_sample * len(stage) + thin_film, return_index=True)
        _, ny, nx = t.code.shape
        place = np.empty((len(sample) + len(keys), 3), np.float32)
        place[: len(sample), 0] = (sample % nx) * grid.cell
        place[: len(sample), 1] = ((sample // nx) % ny) * grid.cell
        place[: len(sample), 2] = grid.z[sample // (ny * nx)]
        place[len(sample) :] = thin_place[first]
        node_sample = np.concatenate([sample, thin_sample[first]])
        node_film = np.concatenate([code[sample].astype(np.int64), thin_film[first]])
        neighbours = fronts.link(
            node_sample, node_film, own, keys, len(sample), code, medium, t.code.shape, t.row_of, t.count, t.start,
            t.interval_code,
        )  # fmt: skip
        return cls(node_sample, node_film, own, keys, len(sample), place, neighbours, stage, medium)


@dataclass(frozen=True, eq=False)
class Front:
    """Arrival times of one group of films, s since the etch began, inf where never reached.

    `beyond` is how much farther, um, the front has to go from a node's place to its sample.
    """

    nodes: Nodes
    time: np.ndarray
    beyond: np.ndarray
    slowness: np.ndarray
