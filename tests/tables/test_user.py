import numpy as np
import pytest

from scanner.errors import TableError
from scanner.tables import build_table

SOURCE = """
import numpy as np

def angles(n):
    return 2 * np.pi * np.arange(n) / n

def samples(amplitude, harmonic, n=128):
    r = 1 + amplitude * np.cos(harmonic * angles(n))
    return np.column_stack([r * np.cos(angles(n)), r * np.sin(angles(n))])

def pair(n):
    return np.cos(angles(n)), 0.8 * np.sin(angles(n))

def clockwise(n):
    return np.cos(angles(n)), -0.8 * np.sin(angles(n))

def coefficients(quadratic):
    return [[0, 1, quadratic], [0, 0, 0], [0, 0, 0], [0, 1, quadratic]]

def rough(n):
    return np.cos(angles(n)), np.abs(np.sin(angles(n))) * np.sin(angles(n))

def closed(n):
    turns = np.linspace(0, 2 * np.pi, n)
    return np.cos(turns), np.sin(np.mod(turns, 2 * np.pi) % (2 * np.pi - 1e-9))

def fails(x):
    raise ValueError("two\\nlines")

def infinite():
    return [[0, np.inf], [0, 0], [0, 0], [0, 1]]

def point():
    return np.zeros((64, 2))

def text():
    return "circle"

def odd():
    return np.zeros((5, 7))

def many():
    return np.ones((4, 900))

constant = 3
"""


@pytest.fixture
def module(tmp_path, monkeypatch):
    (tmp_path / "own_tables.py").write_text(SOURCE)
    (tmp_path / "broken_tables.py").write_text("import a_module_that_is_not_there\n")
    monkeypatch.chdir(tmp_path)
    return "own_tables"


def test_samples_make_the_table_of_the_built_in_family(module):
    own = build_table(f"{module}:samples", allow_code=True, amplitude=0.1, harmonic=2)
    built_in = build_table("radial_harmonic", amplitude=0.1, harmonic=2)
    assert own.harmonics == pytest.approx(built_in.harmonics, abs=1e-15)
    assert own.parameters == {"amplitude": 0.1, "harmonic": 2}
    assert own.identity == f"{module}:samples(amplitude=0.1, harmonic=2)"


def test_coefficients_make_the_table_of_the_built_in_family(module):
    own = build_table(f"{module}:coefficients", allow_code=True, quadratic=0.2)
    assert np.array_equal(own.harmonics, build_table("limacon", quadratic=0.2).harmonics)


@pytest.mark.parametrize("n", [16, 33, 1000])
def test_any_number_of_samples_in_either_direction_will_do(module, n):
    tables = [build_table(f"{module}:{name}", allow_code=True, n=n) for name in ("pair", "clockwise")]
    for table in tables:
        assert table.area == pytest.approx(0.8 * np.pi, rel=1e-15)
        assert table.is_convex
        assert table.harmonics.shape == (4, 2)


def test_code_does_not_run_unless_allowed(module):
    with pytest.raises(TableError, match="--allow-code"):
        build_table(f"{module}:samples", amplitude=0.1, harmonic=2)


@pytest.mark.parametrize(
    ("function", "parameters", "message"),
    [
        ("own_tables:rough", {"n": 100}, "give more samples"),
        ("own_tables:closed", {"n": 100}, "last sample repeats the first|give more samples"),
        ("own_tables:fails", {"x": 1.0}, "raised ValueError: two$"),
        ("own_tables:fails", {"y": 1.0}, "raised TypeError"),
        ("own_tables:fails", {"x": "one"}, "must be a finite number"),
        ("own_tables:fails", {"x": float("nan")}, "must be a finite number"),
        ("own_tables:infinite", {}, "not finite"),
        ("own_tables:point", {}, "single point|repeats the first"),
        ("own_tables:text", {}, "raised ValueError"),
        ("own_tables:odd", {}, r"shape \(5, 7\)"),
        ("own_tables:many", {}, "899 harmonics, must be at most 512"),
        ("own_tables:pair", {"n": 5000}, "5000 samples, must be at most"),
        ("own_tables:nothing", {}, "no function nothing"),
        ("own_tables:constant", {}, "no function constant"),
        ("missing_tables:f", {}, "missing_tables cannot be imported"),
        ("broken_tables:f", {}, "a_module_that_is_not_there"),
        ("own_tables:", {}, "no function"),
        (":f", {}, "cannot be imported"),
    ],
)
def test_what_cannot_be_used_is_refused_in_one_line(module, function, parameters, message):
    with pytest.raises(TableError, match=message) as caught:
        build_table(function, allow_code=True, **parameters)
    assert "\n" not in str(caught.value)
