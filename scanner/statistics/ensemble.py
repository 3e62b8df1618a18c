"""Averages over an ensemble of tables, the scatter between tables told apart from the sampling within each."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
import xarray as xr
from scipy.stats import chi2

from scanner.errors import ScannerError

Floats = npt.NDArray[np.float64]

_PARTS = {
    "mean": "mean over tables",
    "stderr": "standard error of the mean over tables",
    "between": "standard deviation between tables, sampling taken out",
    "between_low": "lower end of the interval of the standard deviation between tables",
    "between_high": "upper end of the interval of the standard deviation between tables",
    "within": "root mean square of the standard errors within tables",
    "share": "part of the variance that is between tables",
    "tables": "how many tables stand behind each number",
}


def ensemble_average(
    values: xr.DataArray, errors: xr.DataArray, over: Sequence[str], *, confidence: float = 0.95
) -> xr.Dataset:
    """Average one measured quantity over an ensemble, such as the realisations of a random family.

    Every table is one draw of the ensemble and counts the same, whatever its own error (a mean weighted by errors that
    go with the values, as those of fractions do, is biased).  The variance over tables is the variance of the ensemble
    plus the mean squared error within a table; what is left of it without the second is the random-effects estimate
    of the first by moments (Hedges, J. Educ. Stat. 8:388, 1983 [from memory]), 0 where nothing is left.

    Parameters
    ----------
    values
        The quantity, over the dimensions ``over`` and any others; NaN for a table that is not done.
    errors
        Standard error within each table, with the same dimensions.
    over
        Dimensions of the ensemble.
    confidence
        Of the interval for the standard deviation between tables, which takes the ensemble as Gaussian and the
        errors within as known.

    Returns
    -------
    Dataset
        Over the other dimensions: ``mean``; ``stderr``, which holds both kinds of scatter; ``between``,
        ``between_low``, ``between_high`` and ``within``, standard deviations in the unit of the quantity; ``share`` of
        the variance that is between; ``tables``.  NaN where fewer than two tables have numbers, but for mean and
        tables.

    Raises
    ------
    ScannerError
        A dimension is missing, the two arrays differ in shape, or the confidence makes no sense.
    """
    for name in over:
        if name not in values.dims:
            raise ScannerError(
                f"{name!r} is not a dimension of the quantity: choose from {', '.join(map(str, values.dims))}"
            )
    if not over:
        raise ScannerError("no dimension to average over: name one, for example 'realisation'")
    if values.sizes != errors.sizes:
        raise ScannerError(f"values {dict(values.sizes)} and errors {dict(errors.sizes)} must have the same dimensions")
    if not 0.0 < confidence < 1.0:
        raise ScannerError(f"confidence = {confidence} must lie between 0 and 1, for example 0.95")
    rest = [str(name) for name in values.dims if name not in over]
    arranged = [array.transpose(*rest, *over) for array in (values, errors)]
    flat = [array.values.reshape(*(array.sizes[name] for name in rest), -1) for array in arranged]
    numbers = _variance_parts(flat[0], flat[1], confidence)
    coords = {name: values.coords[name] for name in rest if name in values.coords}
    found = xr.Dataset({name: (rest, numbers[name]) for name in _PARTS}, coords=coords)
    for name, meaning in _PARTS.items():
        found[name].attrs = {"long_name": meaning, "units": "1"}
        if name not in ("share", "tables"):
            found[name].attrs["units"] = str(values.attrs.get("units", "1"))
    return found


def _variance_parts(values: Floats, errors: Floats, confidence: float) -> dict[str, npt.NDArray[np.generic]]:
    """Parts of the variance along the last axis; only tables with value and error count."""
    known = np.isfinite(values) & np.isfinite(errors)
    tables = known.sum(axis=-1)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.where(known, values, 0.0).sum(axis=-1) / tables
        freedom = np.where(tables > 1, tables - 1, np.nan)
        squares = np.where(known, (values - mean[..., None]) ** 2, 0.0).sum(axis=-1)
        within = np.where(known, errors**2, 0.0).sum(axis=-1) / tables
        total = squares / freedom
        between = np.maximum(total - within, 0.0)
        share = np.where(total > 0.0, between / total, np.where(tables > 1, 0.0, np.nan))
        tail = 0.5 * (1.0 - confidence)
        least = squares / chi2.isf(tail, freedom) - within
        most = squares / chi2.ppf(tail, freedom) - within
    return {
        "mean": mean,
        "stderr": np.sqrt(total / tables),
        "between": np.sqrt(between),
        "between_low": np.sqrt(np.maximum(least, 0.0)),
        "between_high": np.sqrt(np.maximum(most, 0.0)),
        "within": np.where(tables > 1, np.sqrt(within), np.nan),
        "share": share,
        "tables": tables,
    }
