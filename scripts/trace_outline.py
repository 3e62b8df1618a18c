"""The outline that stands for a measured one in ``configs/``: an oval of invented shape, traced with an unsteady hand.

python scripts/trace_outline.py > configs/measured_outline.txt
"""

from __future__ import annotations

import numpy as np

SEED = 20261205
POINTS = 400
SEMI_AXES = (52.0, 46.0)
CENTRE = (310.0, 245.0)
TILT = 0.35
"""Radians between the long axis and x."""
NOISE = 0.04
"""Standard deviation of each coordinate, in the unit of the outline."""
BUMPS = {3: (0.09, 0.7), 4: (0.06, 2.1), 5: (0.03, 4.0)}
"""Waves by which the oval is no ellipse: height along the radius, and phase in radians."""


def trace_outline() -> np.ndarray:
    """Points once round, shape (2, POINTS), unevenly spaced and with noise, to a hundredth of the unit."""
    generator = np.random.default_rng(SEED)
    places = (np.arange(POINTS) + generator.uniform(-0.3, 0.3, POINTS)) / POINTS
    angles = 2.0 * np.pi * places
    heights = sum(height * np.cos(wave * angles + phase) for wave, (height, phase) in BUMPS.items())
    x, y = ((axis + heights) * part for axis, part in zip(SEMI_AXES, (np.cos(angles), np.sin(angles)), strict=True))
    turned = np.array([np.cos(TILT) * x - np.sin(TILT) * y, np.sin(TILT) * x + np.cos(TILT) * y])
    noise = generator.normal(0.0, NOISE, turned.shape)
    return np.round(turned + np.array(CENTRE)[:, None] + noise, 2)


def main() -> None:
    """Print the points as the text file that a study reads."""
    print("# An oval traced by hand, in micrometres: x and y of each point, once round")
    for x, y in trace_outline().T:
        print(f"{x:.2f} {y:.2f}")


if __name__ == "__main__":
    main()
