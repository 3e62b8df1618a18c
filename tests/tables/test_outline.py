import numpy as np
import pytest

from scanner.errors import TableError
from scanner.tables import build_table

RNG = np.random.default_rng(5)


def oval(angles):
    """An ellipse with semi-axes 3 and 2 about (50, -20), tilted, with a wave of 2 % on its radius."""
    r = 1 + 0.02 * np.cos(3 * angles + 0.3)
    x, y = 3 * r * np.cos(angles), 2 * r * np.sin(angles)
    return 50 + 0.8 * x - 0.6 * y, -20 + 0.6 * x + 0.8 * y


def distance_to_oval(x, y):
    u, v = 0.8 * (x - 50) + 0.6 * (y + 20), -0.6 * (x - 50) + 0.8 * (y + 20)
    angles = np.arctan2(v / 2, u / 3)
    along = np.array(oval(angles)) - np.array([[50], [-20]])
    return np.abs(np.hypot(x - 50, y + 20) - np.hypot(*along))


def write(path, x, y, header=""):
    np.savetxt(path, np.column_stack([x, y]), header=header, fmt="%.17g")
    return str(path)


def test_exact_points_give_the_outline(tmp_path):
    angles = np.sort(RNG.uniform(0, 2 * np.pi, 300))
    table = build_table("outline_file", file=write(tmp_path / "points", *oval(angles)), amplitude=1.0)
    assert distance_to_oval(*table.point(np.linspace(0, 1, 200))).max() < 1e-9
    assert table.residual < 1e-9
    assert table.is_convex


@pytest.mark.parametrize("noise", [1e-4, 1e-3, 1e-2])
def test_noise_is_smoothed_and_stated(tmp_path, noise):
    angles = np.arange(400) / 400 * 2 * np.pi
    x, y = (row + noise * RNG.normal(size=400) for row in oval(angles))
    table = build_table("outline_file", file=write(tmp_path / "points", x, y), amplitude=1.0)
    # Noise along the boundary does not count: the residual is that across it, 400 values give it to 1 / sqrt(800).
    assert table.residual == pytest.approx(noise, rel=5 / np.sqrt(800))
    # About 10 of 400 degrees of freedom take up noise.
    assert np.sqrt((distance_to_oval(*table.point(np.linspace(0, 1, 200))) ** 2).mean()) < 0.3 * noise
    assert table.harmonics.shape[1] < 15


def test_amplitude_goes_from_the_best_fit_ellipse_through_the_outline_and_beyond(tmp_path):
    file = write(tmp_path / "points", *oval(np.arange(100) / 100 * 2 * np.pi))
    ellipse, outline, beyond = (build_table("outline_file", file=file, amplitude=a) for a in (0.0, 1.0, 2.0))
    assert ellipse.harmonics.shape == (4, 2)
    # The wave leaves the ellipse as it is but for the square of 2 %.
    assert ellipse.area == pytest.approx(6 * np.pi, rel=1e-3)
    assert np.hypot(*(ellipse.harmonics[[0, 2], 0] - [50, -20])) < 1e-3
    undeformed = np.zeros_like(outline.harmonics)
    undeformed[:, :2] = ellipse.harmonics
    # Exact but for the rounding of numbers up to 50.
    assert beyond.harmonics == pytest.approx(2 * outline.harmonics - undeformed, abs=1e-13)


def test_the_ellipse_does_not_depend_on_where_points_are_dense(tmp_path):
    even, uneven = np.arange(200) / 200, np.arange(200) / 200
    uneven = uneven + 0.1 * np.sin(2 * np.pi * uneven)
    tables = [
        build_table("outline_file", file=write(tmp_path / str(i), *oval(2 * np.pi * turns)), amplitude=0.0)
        for i, turns in enumerate((even, uneven))
    ]
    # Both fits are to the same smooth curve; their linear systems lose half a dozen digits of 1e-15.
    assert tables[0].harmonics == pytest.approx(tables[1].harmonics, abs=1e-9)


def test_points_of_an_ellipse_give_the_ellipse(tmp_path):
    angles = np.arange(40) / 40 * 2 * np.pi
    file = write(tmp_path / "points", 2 * np.cos(angles), np.sin(angles))
    table = build_table("outline_file", file=file, amplitude=1.0)
    assert table.harmonics[:, :2] == pytest.approx(np.array([[0, 2], [0, 0], [0, 0], [0, 1]]), abs=1e-14)
    assert table.harmonics.shape == (4, 2)


def test_direction_closing_point_commas_and_comments_do_not_matter(tmp_path):
    x, y = oval(np.arange(64) / 64 * 2 * np.pi)
    plain = build_table("outline_file", file=write(tmp_path / "plain", x, y), amplitude=1.0)
    lines = [f"{a!r},\t{b!r}  # a point" for a, b in zip(x.tolist(), y.tolist(), strict=True)][::-1]
    (tmp_path / "other").write_text("\ufeff# taken by hand\n\n" + "\n".join([*lines, lines[0]]), encoding="utf-8")
    other = build_table("outline_file", file=str(tmp_path / "other"), amplitude=1.0)
    s = np.linspace(0, 1, 50)
    assert np.array(other.point(s)) == pytest.approx(np.array(plain.point(s)), abs=1e-11)


def test_a_table_is_identified_by_the_contents_of_its_file(tmp_path):
    x, y = oval(np.arange(64) / 64 * 2 * np.pi)
    first, second = (
        build_table("outline_file", file=write(tmp_path / name, x, y), amplitude=1.0) for name in ("one", "two")
    )
    other = build_table("outline_file", file=write(tmp_path / "three", 2 * x, y), amplitude=1.0)
    assert first.identity == second.identity
    assert first.identity != other.identity


ROUND = np.arange(64) / 64 * 2 * np.pi
BAD = {
    "a letter": ("1 2\n3 x\n", "line 2 must be two finite numbers"),
    "three columns": ("1 2 3\n", "line 1 must be two finite numbers"),
    "not finite": ("1 nan\n", "line 1 must be two finite numbers"),
    "empty": ("", "0 different points, must be 16 to 20000"),
    "few": ("0 0\n1 0\n1 1\n", "3 different points"),
}


@pytest.mark.parametrize(("text", "message"), BAD.values(), ids=BAD)
def test_bad_files_are_refused_in_one_line(tmp_path, text, message):
    (tmp_path / "points").write_text(text)
    with pytest.raises(TableError, match=message) as caught:
        build_table("outline_file", file=str(tmp_path / "points"), amplitude=1.0)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("x", "y", "message"),
    [
        (np.sin(2 * ROUND + 0.1), np.sin(ROUND + 0.05), "crosses itself"),
        (np.cos(2 * ROUND), np.sin(2 * ROUND) * (1 + 0.1 * np.cos(ROUND + 0.1)), "crosses itself"),
        (np.cos(ROUND[:40]), np.sin(ROUND[:40]), "leave a gap"),
        (ROUND, 2 * ROUND, "enclose no area"),
        (np.cos(ROUND), 1e-9 * np.sin(ROUND), "enclose no area"),
        (
            np.concatenate([np.cos(ROUND[:56]), 0.7 * np.cos(ROUND[55::-1])]),
            np.concatenate([np.sin(ROUND[:56]), 0.7 * np.sin(ROUND[55::-1])]),
            "seen from its centre",
        ),
    ],
    ids=["eight", "twice round", "gap", "line", "almost a line", "crescent"],
)
def test_outlines_that_are_no_tables_are_refused(tmp_path, x, y, message):
    with pytest.raises(TableError, match=message) as caught:
        build_table("outline_file", file=write(tmp_path / "points", x, y), amplitude=1.0)
    assert "\n" not in str(caught.value)


def test_a_missing_file_and_a_folder_are_refused(tmp_path):
    for path in (tmp_path / "nothing", tmp_path):
        with pytest.raises(TableError, match="cannot be read"):
            build_table("outline_file", file=str(path), amplitude=1.0)


def test_an_outline_with_a_dent_is_a_table_that_is_not_convex(tmp_path):
    r = 1 - 0.3 * np.exp(-(((ROUND - np.pi) / 0.3) ** 2))
    table = build_table(
        "outline_file", file=write(tmp_path / "points", r * np.cos(ROUND), r * np.sin(ROUND)), amplitude=1
    )
    assert not table.is_convex
    assert table.curvature_min < 0
