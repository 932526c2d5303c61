"""The bracketing solver on functions with known roots."""

from __future__ import annotations

import numpy as np
import pytest

from service.assess.distance import falling_root


def test_known_roots() -> None:
    """ln(c/z) falls through zero at c; brackets of very different widths and an open end."""
    c = np.array([1.0, 1e-6, 123.456, 1e9, 5.0])
    low = np.array([0.5, 1e-12, 100.0, 1.0, 5.0])
    high = np.array([2.0, 1.0, np.inf, np.inf, 5.0])
    assert falling_root(lambda k, z: np.log(c[k] / z), low, high) == pytest.approx(c, rel=1e-12)


def test_steep_and_flat_functions() -> None:
    """z^-20 = 1 and a function with a kink, by bisection where interpolation fails."""
    low, high = np.array([0.1, 0.5]), np.array([10.0, 4.0])

    def excess(k: np.ndarray, z: np.ndarray) -> np.ndarray:
        return np.where(k == 0, z**-20.0 - 1.0, np.where(z < 3.0, 1e-9 * (3.0 - z), -1e6 * (z - 3.0)))

    assert falling_root(excess, low, high) == pytest.approx([1.0, 3.0], rel=1e-9)


def test_never_falls_is_infinite() -> None:
    root = falling_root(lambda k, z: np.ones(len(k)), np.array([1.0]), np.array([np.inf]))
    assert np.isinf(root[0])


def test_inputs_are_left_alone() -> None:
    low, high = np.array([1.0]), np.array([np.inf])
    falling_root(lambda k, z: 10.0 - z, low, high)
    assert low[0] == 1.0
    assert np.isinf(high[0])
