"""What makes a figure legible: nothing written is cut off, and labels of ticks do not run into each other."""

from __future__ import annotations

import itertools

from matplotlib.text import Text


def assert_legible(figure):
    """Lay the figure out as it would be saved and look at every text of it."""
    figure.set_dpi(100)
    figure.canvas.draw()
    renderer = figure.canvas.get_renderer()
    for text in figure.findobj(Text):
        if text.get_visible() and text.get_text():
            box = text.get_window_extent(renderer)
            inside = box.x0 > -1 and box.y0 > -1 and box.x1 < figure.bbox.x1 + 1 and box.y1 < figure.bbox.y1 + 1
            assert inside or _is_beyond_the_axis(text, figure), text.get_text()
    for legend in figure.legends:
        box = legend.get_window_extent(renderer)
        assert -1 < box.x0 < box.x1 < figure.bbox.x1 + 1
    for axes in figure.axes:
        labels = [label for label in axes.get_xticklabels() if label.get_text() and not label.get_rotation()]
        boxes = sorted((label.get_window_extent(renderer) for label in labels), key=lambda box: box.x0)
        boxes = [box for box in boxes if box.width and axes.bbox.x0 - 1 < (box.x0 + box.x1) / 2]
        for left, right in itertools.pairwise(boxes):
            assert left.x1 < right.x0


def notes_of(figure):
    """What stands below the title, as one line."""
    (notes,) = (text for text in figure.texts if text.get_gid() == "notes")
    return notes.get_text().replace("\u00a0", " ").replace("\n", " ")


def _is_beyond_the_axis(text, figure):
    """Ticks outside the limits of their axis exist but are never drawn."""
    return any(
        text in axis.get_ticklabels(which="both")
        and not min(axis.get_view_interval()) <= place <= max(axis.get_view_interval())
        for axes in figure.axes
        for axis, place in ((axes.xaxis, text.get_position()[0]), (axes.yaxis, text.get_position()[1]))
    )
