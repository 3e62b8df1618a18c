import pickle
import time

import numpy as np
import pytest

import scanner
from scanner.errors import TableError
from scanner.tables import FAMILIES, build_table

BAD = [
    ("elipse", {}, "family 'elipse' is not known: use one of ellipse, radial_harmonic"),
    ("ellipse", {}, "ellipse needs parameter eccentricity"),
    ("ellipse", {"eccentricity": 1.0}, r"eccentricity = 1.0 must be in \[0, 1\)"),
    ("ellipse", {"eccentricity": -0.1}, r"must be in \[0, 1\)"),
    ("ellipse", {"eccentricity": "0.5"}, "eccentricity = '0.5' must be a number"),
    ("ellipse", {"eccentricity": True}, "must be a number"),
    ("ellipse", {"eccentricity": None}, "must be a number"),
    ("ellipse", {"eccentricity": float("nan")}, "must be in"),
    ("ellipse", {"eccentricity": 0.5, "amplitude": 0.1}, "ellipse has no parameter amplitude .* it takes eccentricity"),
    ("ellipse", {"eccentricity": 0.999999}, "arc length needs more than 4096 harmonics.*lower the eccentricity"),
    ("radial_harmonic", {"amplitude": 0.1, "harmonic": 2.0}, "harmonic = 2.0 must be a whole number"),
    ("radial_harmonic", {"amplitude": 0.1, "harmonic": 0}, r"harmonic = 0 must be in \[1, 511\]"),
    ("radial_harmonic", {"amplitude": 10**400, "harmonic": 2}, r"must be in \[-10, 10\]"),
    ("curvature_harmonic", {"amplitude": 0.1, "harmonic": 1}, r"must be in \[2, 511\]"),
    ("lame", {"exponent": 1.0, "aspect": 1.0}, r"exponent = 1.0 must be in \[1.4, 32\]"),
    ("lame", {"exponent": 2.0, "aspect": 0.0}, "aspect = 0.0 must be in"),
    ("outline_file", {"file": 3, "amplitude": 1.0}, "file = 3 must be text"),
    (
        "normal_harmonic",
        {"eccentricity": 0.99999, "amplitude": 1e-9, "harmonic": 2, "phase": 0.0},
        "needs more than 512 harmonics to reach 1e-14 relative; lower the eccentricity",
    ),
]


@pytest.mark.parametrize(("family", "parameters", "message"), BAD)
def test_bad_parameters_are_refused_in_one_line(family, parameters, message):
    with pytest.raises(TableError, match=message) as caught:
        build_table(family, **parameters)
    assert "\n" not in str(caught.value)
    assert family in str(caught.value)


def test_numbers_of_numpy_are_taken_and_stored_as_plain_ones():
    table = build_table("radial_harmonic", amplitude=np.float64(0.1), harmonic=np.int64(2))
    assert table.parameters == {"amplitude": 0.1, "harmonic": 2}
    assert [type(value) for value in table.parameters.values()] == [float, int]
    assert build_table("ellipse", eccentricity=0).parameters == {"eccentricity": 0.0}


def test_identity_is_stable_text_in_alphabetical_order():
    table = build_table("radial_harmonic", harmonic=2, amplitude=0.1)
    assert table.identity == "radial_harmonic(amplitude=0.1, harmonic=2)"


def test_a_table_can_be_sent_to_another_process():
    table = build_table("radial_harmonic", amplitude=0.1, harmonic=2)
    copy = pickle.loads(pickle.dumps(table))
    assert np.array_equal(copy.harmonics, table.harmonics)
    assert (copy.identity, copy.parameters, copy.perimeter) == (table.identity, table.parameters, table.perimeter)


def test_a_table_shows_what_it_is():
    shown = repr(scanner.build_table("limacon", quadratic=0.1))
    assert shown.startswith("<Table limacon, quadratic=0.1: perimeter 6.")
    assert shown.endswith("2 harmonics, convex>")


def test_families_are_those_of_the_documentation():
    assert set(FAMILIES) == {
        "ellipse",
        "radial_harmonic",
        "normal_harmonic",
        "confocal_harmonic",
        "support_harmonic",
        "curvature_harmonic",
        "limacon",
        "lame",
        "random_harmonic",
        "outline_file",
    }


def test_analytic_tables_are_built_in_well_under_a_millisecond():
    build_table("radial_harmonic", amplitude=0.1, harmonic=2)
    durations = []
    for amplitude in np.linspace(0, 0.15, 50):
        start = time.perf_counter()
        build_table("radial_harmonic", amplitude=amplitude, harmonic=2)
        durations.append(time.perf_counter() - start)
    assert np.median(durations) < 1e-3  # about 0.1 ms on an idle machine
