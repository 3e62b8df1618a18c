"""Families of the user's own: a function named ``module:function``, from parameters to samples or coefficients."""

from __future__ import annotations

import importlib
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np

from scanner.errors import TableError
from scanner.tables.boundary import FloatArray
from scanner.tables.curve import MOST_HARMONICS, ROUNDING, Curve, series_of_samples, trim, unresolved_part

FEWEST_SAMPLES = 16
MOST_SAMPLES = 8 * MOST_HARMONICS

SAMPLE_TOLERANCE = 1e-12
"""What the last quarter of the harmonics of samples may add up to: above rounding in the user's own arithmetic."""


def user_curve(name: str, /, **parameters: float) -> Curve:
    """Call the user's function and take what it gives.

    The function takes the parameters by keyword and returns one of

    - an array of shape (n, 2) or (2, n), n from 16: points at equal steps of a smooth periodic parameter, once round
      in either direction, the first one not repeated;
    - an array of shape (4, K + 1): Fourier coefficients as in ``Table.harmonics``.

    Raises
    ------
    TableError
        One line: no such function, an error in it, or a result that is not a closed curve to the tolerance.
    """
    function = find_function(name)
    try:
        returned = np.array(function(**parameters), dtype=np.float64)
    except Exception as error:
        raise TableError(f"the function raised {_told(error)}") from None
    if not np.isfinite(returned).all():
        raise TableError("the function returned numbers that are not finite")
    if returned.ndim == 2 and returned.shape[0] == 4 and returned.shape[1] >= 2:
        return _curve_of_coefficients(returned)
    if returned.ndim == 2 and 2 in returned.shape and max(returned.shape) >= FEWEST_SAMPLES:
        return _curve_of_samples(np.ascontiguousarray(returned if returned.shape[0] == 2 else returned.T))
    raise TableError(
        f"the function returned an array of shape {returned.shape}, must be (n, 2) samples with n at least "
        f"{FEWEST_SAMPLES} or (4, K + 1) coefficients"
    )


def find_function(name: str) -> Callable[..., object]:
    """Import ``module:function``, the module installed or in the current folder.

    Raises
    ------
    TableError
        One line: the module or the function is not there, or importing it fails.
    """
    module_name, _, function_name = name.partition(":")
    sys.path.append(str(Path.cwd()))
    try:
        module = importlib.import_module(module_name)
    except Exception as error:
        raise TableError(f"module {module_name} cannot be imported: {_told(error)}") from None
    finally:
        sys.path.pop()
    function = getattr(module, function_name, None)
    if not callable(function):
        raise TableError(f"module {module_name} has no function {function_name}")
    found: Callable[..., object] = function
    return found


def _curve_of_coefficients(harmonics: FloatArray) -> Curve:
    if harmonics.shape[1] > MOST_HARMONICS + 1:
        raise TableError(f"the function returned {harmonics.shape[1] - 1} harmonics, must be at most {MOST_HARMONICS}")
    harmonics[[1, 3], 0] = 0.0
    _require_extent(harmonics)
    return Curve(trim(harmonics))


def _curve_of_samples(samples: FloatArray) -> Curve:
    x, y = samples
    if len(x) > MOST_SAMPLES:
        raise TableError(f"the function returned {len(x)} samples, must be at most {MOST_SAMPLES}")
    if x[0] == x[-1] and y[0] == y[-1]:
        raise TableError("the last sample repeats the first; leave it out")
    harmonics = series_of_samples(x, y, (len(x) - 1) // 2)
    _require_extent(harmonics)
    error = unresolved_part(harmonics)
    harmonics = trim(harmonics)
    if error > SAMPLE_TOLERANCE or harmonics.shape[1] > MOST_HARMONICS + 1:
        raise TableError(
            f"the last quarter of the harmonics of the {len(x)} samples adds up to {error:.2g} of the largest, must be "
            f"at most {SAMPLE_TOLERANCE:g}, with at most {MOST_HARMONICS} harmonics: give more samples"
        )
    return Curve(harmonics, max(ROUNDING, error))


def _require_extent(harmonics: FloatArray) -> None:
    if not np.any(harmonics[:, 1:]):
        raise TableError("the function returned a single point")


def _told(error: Exception) -> str:
    lines = str(error).splitlines()
    return f"{type(error).__name__}: {lines[0]}" if lines else type(error).__name__
