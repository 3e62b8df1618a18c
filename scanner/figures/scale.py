"""One swept parameter as an axis: where its values stand, how far a cell reaches, straight or logarithmic."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np
import xarray as xr

from scanner.figures.labels import parameter_label
from scanner.quantities import DONE, TABLE_STATUS

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.axis import Axis


@dataclass(frozen=True)
class Scale:
    """Positions and cell edges of a parameter's values along an axis.

    ``positions`` has one entry a value and ``edges`` one more; values that are words have ``words`` at them.
    """

    name: str
    positions: np.ndarray
    edges: np.ndarray
    logarithmic: bool
    whole: bool
    words: tuple[str, ...] = ()

    def dress(self, axes: Axes, side: Literal["x", "y"]) -> None:
        """Give one side of the axes its label, limits, ticks and kind of scale."""
        axis: Axis = axes.xaxis if side == "x" else axes.yaxis
        if self.logarithmic:
            (axes.set_xscale if side == "x" else axes.set_yscale)("log")
        (axes.set_xlim if side == "x" else axes.set_ylim)(self.edges[0], self.edges[-1])
        axis.set_label_text(parameter_label(self.name))
        if self.words:
            axis.set_ticks(self.positions, self.words)
        elif self.whole and not self.logarithmic:
            from matplotlib.ticker import MaxNLocator  # here, as scales are of use without matplotlib

            axis.set_major_locator(MaxNLocator(integer=True, nbins=8))


def scale_of(data: xr.Dataset | xr.DataArray, name: str) -> Scale:
    """Find the axis that suits the values of one dimension."""
    values = data[name].values
    if values.dtype.kind not in "iuf":
        positions = np.arange(len(values))
        return Scale(name, positions, np.arange(len(values) + 1) - 0.5, False, True, tuple(map(str, values)))
    positions, whole = values.astype(float), values.dtype.kind in "iu"
    if len(positions) == 1:
        return Scale(name, positions, positions[0] + np.array([-0.5, 0.5]), False, whole)
    logarithmic = _is_geometric(positions)
    middle = np.sqrt(positions[1:] * positions[:-1]) if logarithmic else 0.5 * (positions[1:] + positions[:-1])
    first, last = (
        (positions[0] ** 2 / middle[0], positions[-1] ** 2 / middle[-1])
        if logarithmic
        else (2 * positions[0] - middle[0], 2 * positions[-1] - middle[-1])
    )
    edges = np.concatenate([[first], middle, [last]])
    return Scale(name, positions, edges, logarithmic, whole)


def _is_geometric(values: np.ndarray) -> bool:
    """Tell whether positive values grow by one factor rather than by one step."""
    if len(values) < 3 or (values <= 0).any() or (np.diff(values) <= 0).any():
        return False
    factors, steps = np.diff(np.log(values)), np.diff(values)
    return bool(np.ptp(factors) < 1e-6 * factors.mean() and np.ptp(steps) > 1e-6 * steps.mean())


def spans_without_numbers(status: np.ndarray, scale: Scale) -> Iterator[tuple[str, float, float]]:
    """Yield the stretches of the axis whose tables are not done: the status, and from where to where."""
    start = 0
    for stop in range(1, len(status) + 1):
        if stop == len(status) or status[stop] != status[start]:
            if status[start] != DONE:
                yield TABLE_STATUS[status[start]], float(scale.edges[start]), float(scale.edges[stop])
            start = stop
