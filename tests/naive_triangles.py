"""The distance of a point to a triangle, in pieces: its plane where the foot lies inside, else its three sides."""

from __future__ import annotations

import numpy as np


def distance_to_segment(point: np.ndarray, a: np.ndarray, b: np.ndarray) -> float:
    """Distance of a point to the straight line from a to b and no farther."""
    run = b - a
    length = float(run @ run)
    share = min(1.0, max(0.0, float((point - a) @ run) / length)) if length > 0 else 0.0
    return float(np.linalg.norm(point - a - share * run))


def distance_to_triangle(point: np.ndarray, triangle: np.ndarray) -> float:
    """Distance of a point `(3,)` to a triangle `(3, 3)`; the twin of the closest point in `kernels.starts`."""
    a, b, c = triangle
    sides = min(distance_to_segment(point, *pair) for pair in ((a, b), (b, c), (c, a)))
    normal = np.cross(b - a, c - a)
    size = float(np.linalg.norm(normal))
    if size < 1e-12:
        return sides
    unit = normal / size
    foot = point - ((point - a) @ unit) * unit
    turns = [float(np.cross(q - p, foot - p) @ unit) for p, q in ((a, b), (b, c), (c, a))]
    return float(abs((point - a) @ unit)) if min(turns) >= 0 else sides
