"""The arrival solver beside scikit-fmm's travel time: same solids, one thread each, setup included.

Every case is timed in turns, the least of five, in the thread's own CPU time, so that a busy machine counts less. A
line per case goes to the terminal (`pytest -s`): seconds of both, their ratio, the unit E (one exact Euclidean
transform of the same solid by scipy), and the mean and greatest error of both in cells. The long cases have the mark
`long`: `pytest -s -m long tests/bench`.
"""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np
import pytest
import skfmm
from scipy import ndimage

from flowemu.kernels.march import arrival_on_grid

AT_LEAST = 2.0  # times as fast as travel_time; the goal over whole domains is three and more
TRIES = 3


def sphere(n: int) -> tuple[np.ndarray, np.ndarray]:
    """Exact distance to a sphere of 5 cells' radius near the middle, and no obstacle."""
    at = np.arange(n) - n / 2 + 0.3
    return np.sqrt(at[:, None, None] ** 2 + at[:, None] ** 2 + at**2) - 5.0, np.zeros((n, n, n), bool)


def plate(n: int) -> tuple[np.ndarray, np.ndarray]:
    """Distance from the lowest plane round a plate, one sample thick, that leaves the last quarter in x open."""
    blocked = np.zeros((n, n, n), bool)
    blocked[n // 3, :, : 3 * n // 4] = True
    k, i = np.meshgrid(np.arange(n), np.arange(n), indexing="ij")
    edge_k, edge_i = n // 3, 3 * n // 4
    shadow = (k > edge_k) & (i < edge_i)
    exact = np.where(shadow, edge_k + np.hypot(k - edge_k, i - edge_i), k) - 0.5
    return np.broadcast_to(exact[:, None], (n, n, n)).copy(), blocked


def ours(exact: np.ndarray, blocked: np.ndarray) -> np.ndarray:
    """From the sub-cell values of the samples next to the source; everything else unknown."""
    outside = (exact >= 0) & ~blocked
    start = np.where(outside & (exact < 1.0) & touching(exact < 0), exact, np.inf)
    return arrival_on_grid(start, np.where(outside, np.float32(1), np.float32(np.inf)), 1.0, 1.0, np.arange(len(exact)))


def touching(inside: np.ndarray) -> np.ndarray:
    """Samples with a neighbour inside."""
    return ndimage.binary_dilation(inside)


def theirs(exact: np.ndarray, blocked: np.ndarray) -> np.ndarray:
    field = np.ma.array(exact, mask=blocked) if blocked.any() else exact
    return np.ma.filled(skfmm.travel_time(field, np.ones_like(exact), order=2), np.inf)


def least_of_five(*jobs: Callable[[], object]) -> list[float]:
    """Seconds of each job, run in turns."""
    least = [np.inf] * len(jobs)
    for _ in range(5):
        for k, job in enumerate(jobs):
            begun = time.thread_time()
            job()
            least[k] = min(least[k], time.thread_time() - begun)
    return least


def compare(name: str, exact: np.ndarray, blocked: np.ndarray) -> float:
    """Print the case's line, check the errors, and return how many times as fast ours is."""
    outside = (exact >= 0) & ~blocked
    error, other = (np.abs(f(exact, blocked) - np.abs(exact))[outside] for f in (ours, theirs))
    a, b, unit = least_of_five(
        lambda: ours(exact, blocked),
        lambda: theirs(exact, blocked),
        lambda: ndimage.distance_transform_edt(outside),
    )
    print(
        f"\n{name} {exact.shape}: {a:.3f} s, scikit-fmm {b:.3f} s, ratio {b / a:.2f}, E {unit:.3f} s; "
        f"error {error.mean():.3f}, {error.max():.3f} against {other.mean():.3f}, {other.max():.3f} cell"
    )
    assert error.mean() <= other.mean()
    assert error.max() <= other.max()
    return b / a


@pytest.mark.parametrize("case", [sphere, plate])
def test_the_arrival_solver_is_at_least_twice_as_fast(case):
    ours(*case(16))  # compiled before the clock starts
    assert any(compare(case.__name__, *case(64)) >= AT_LEAST for _ in range(TRIES))


@pytest.mark.long
@pytest.mark.parametrize("n", [120, 160, 200])
@pytest.mark.parametrize("case", [sphere, plate])
def test_whole_domains(case, n):
    ours(*case(16))
    assert any(compare(case.__name__, *case(n)) >= AT_LEAST for _ in range(TRIES))
