import numpy as np
import pytest

from scanner import build_table, trace
from scanner.errors import TableError


def test_chords_join_the_bounces() -> None:
    table = build_table("limacon", quadratic=0.2)
    orbit = trace(table, [0.1, 0.6], [0.3, -0.7], bounces=50)
    assert orbit.sizes == {"orbit": 2, "bounce": 51}
    steps = np.hypot(orbit.x.diff("bounce"), orbit.y.diff("bounce"))
    assert np.isnan(orbit.chord.isel(bounce=0)).all()
    # Coordinates of order one, rounded.
    assert steps.values == pytest.approx(orbit.chord.isel(bounce=slice(1, None)).values, abs=1e-14)
    x, y = table.point(orbit.s.values.ravel())
    assert x == pytest.approx(orbit.x.values.ravel(), abs=1e-13)
    assert y == pytest.approx(orbit.y.values.ravel(), abs=1e-13)
    assert orbit.p.isel(bounce=0).values.tolist() == [0.3, -0.7]
    assert orbit.status.values.tolist() == [0, 0]


def test_the_axis_of_an_ellipse_is_an_orbit() -> None:
    orbit = trace(build_table("ellipse", eccentricity=0.6), 0.25, 0.0, bounces=6)
    assert orbit.y.values[0] == pytest.approx([0.8, -0.8] * 3 + [0.8], abs=1e-14)
    assert orbit.s.values[0] == pytest.approx([0.25, 0.75] * 3 + [0.25], abs=1e-14)


@pytest.mark.parametrize(
    ("s", "p", "bounces", "words"),
    [
        (0.1, 1.0, 5, r"p = 1\.0 is outside"),
        (np.nan, 0.0, 5, "not finite"),
        ([0.1, 0.2], [0.1, 0.2, 0.3], 5, "one shape"),
        ([], [], 5, "at least one"),
        (0.1, 0.0, 0, "at least 1"),
    ],
)
def test_bad_starts_are_refused(s: object, p: object, bounces: int, words: str) -> None:
    with pytest.raises(TableError, match=words):
        trace(build_table("ellipse", eccentricity=0.5), s, p, bounces)  # type: ignore[arg-type]


def test_tables_that_are_not_convex_are_refused() -> None:
    with pytest.raises(TableError, match="convex"):
        trace(build_table("radial_harmonic", amplitude=0.3, harmonic=2), 0.1, 0.2, 5)
