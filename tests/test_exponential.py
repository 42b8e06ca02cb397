"""The package's own exponential against the one of the C library."""

from __future__ import annotations

import numpy as np

from cropstress.compiled import exponential


def test_exponential_keeps_its_error() -> None:
    """Relative error under 2e-9 from e^-700 to e^700, also where the reduction of the range changes over."""
    draw = np.random.default_rng(0)
    halves = (np.arange(-1000, 1000) + 0.5) * np.log(2.0)
    arguments = np.concatenate([draw.uniform(-699.0, 699.0, 20_000), draw.uniform(-3.0, 3.0, 20_000), halves, [0.0]])
    found = np.array([exponential(argument) for argument in arguments])
    error = np.abs(found / np.exp(arguments) - 1.0)
    assert error.max() < 2e-9
