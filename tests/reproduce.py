"""Print a hash of all numbers of a few orbits on a few tables; run in processes that see different processors.

A second line is the hash of what libraries give that do choose their code by processor.
"""

import hashlib
import math

import numpy as np

from scanner.indicators import orbit_numbers
from scanner.measure import section_points, table_numbers
from scanner.tables import build_table

TABLES = (
    ("radial_harmonic", {"amplitude": 0.06, "harmonic": 2}),
    ("limacon", {"quadratic": 0.2}),
    ("normal_harmonic", {"eccentricity": 0.5, "amplitude": 0.01, "harmonic": 4, "phase": 0.3}),
)
ORBITS, BOUNCES, REPLICATES = 128, 1024, 2


def digest_numbers() -> str:
    """Hash every bit of what is measured."""
    digest = hashlib.sha256()
    for family, parameters in TABLES:
        table = build_table(family, **parameters)
        s, p = section_points(table, 7, REPLICATES, ORBITS, 0, ORBITS)
        numbers = orbit_numbers(table, s, p, BOUNCES)
        for found in ({"s": s, "p": p}, numbers, table_numbers(table, numbers, REPLICATES)):
            for name, values in sorted(found.items()):
                digest.update(name.encode())
                digest.update(np.ascontiguousarray(values).tobytes())
    return digest.hexdigest()


def digest_libraries() -> str:
    """Hash what the C library and numpy make of exponentials and sines."""
    x = np.linspace(0.1, 30.0, 20001)
    plain = np.array([math.exp(value) + math.sin(value) for value in x])
    return hashlib.sha256(plain.tobytes() + np.exp(x).tobytes() + np.sin(x).tobytes() + (x @ x).tobytes()).hexdigest()


if __name__ == "__main__":
    print(digest_numbers(), digest_libraries())
