"""The librational part of an ellipse in closed form: the truth that errors are held against."""

import math

import numpy as np
from scipy.integrate import quad
from scipy.special import ellipe


def section_part(eccentricity):
    return eccentricity / ellipe(eccentricity**2)


def shell_part(eccentricity):
    def across(psi):
        u = eccentricity * abs(math.cos(psi)) / math.hypot(math.cos(psi), minor * math.sin(psi))
        return 2 / math.pi * (u * math.sqrt(1 - u * u) + math.asin(u))

    minor = math.sqrt(1 - eccentricity**2)
    return quad(across, 0, 2 * math.pi)[0] / (2 * math.pi)


def start_of(table, s, p):
    """Whether an orbit of an ellipse librates, and the mean of its chords before and after the start.

    It does where (1 - p^2)(sin^2 phi + b^2 cos^2 phi) exceeds b^2, phi the eccentric angle.
    """
    squared = 1.0 - table.parameters["eccentricity"] ** 2
    phi = 2 * np.pi * table.turns_from_arc(s)
    x, y = np.cos(phi), np.sqrt(squared) * np.sin(phi)
    along_x, along_y = -np.sin(phi), np.sqrt(squared) * np.cos(phi)
    speed, cosine = np.hypot(along_x, along_y), np.sqrt(1 - p**2)
    chord = np.zeros_like(p)
    for q in (p, -p):
        dx, dy = (q * along_x - cosine * along_y) / speed, (q * along_y + cosine * along_x) / speed
        chord -= (x * dx + y * dy / squared) / (dx**2 + dy**2 / squared)
    return (1 - p**2) * speed**2 > squared, chord
