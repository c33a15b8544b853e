"""Distance to a wedge sharper than a right angle, where the foot on one face's plane may lie outside the solid."""

from __future__ import annotations

import numpy as np
import pytest

from flowemu.kernels.surface import wedge


@pytest.mark.parametrize("angle", [150, 120, 100, 60])
def test_the_distance_is_that_to_the_nearest_of_faces_and_edge(angle):
    """Two planes through the origin whose normals lie `angle` apart: at points all round, to 1e-6."""
    c, s = np.cos(np.radians(angle)), np.sin(np.radians(angle))
    n1, n2 = np.array([0.0, 1.0]), np.array([s, c])
    d1, d2 = np.array([-1.0, 0.0]), np.array([c, -s])  # along each face, away from the edge
    d1 = d1 if d1 @ n2 <= 0 else -d1
    d2 = d2 if d2 @ n1 <= 0 else -d2
    for turn in np.radians(np.arange(0, 360, 10)):
        p = 1.3 * np.array([np.cos(turn), np.sin(turn)])
        a, b = p @ n1, p @ n2
        if a <= 0 and b <= 0:
            continue
        exact = min(np.linalg.norm(p - max(0.0, p @ d) * d) for d in (d1, d2))
        assert wedge(a, b, c) == pytest.approx(exact, abs=1e-6)
