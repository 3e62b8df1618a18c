"""The package as a whole: what it loads, what it offers, what it may store."""

import subprocess
import sys
from pathlib import Path

import pytest

import scanner
from scanner.quantities import ORBITS, REGISTER, RESONANCES, ROOT

HEAVY = ("numpy", "numba", "scipy", "xarray", "pandas", "dask", "distributed", "zarr", "pydantic", "matplotlib")
# What both zarr 3 and netCDF-4 hold without a warning.
DTYPES = {"int8", "int16", "int32", "int64", "float32", "float64"}


@pytest.mark.parametrize("module", ["scanner", "scanner.cli"])
def test_importing_loads_nothing_heavy(module):
    """`import scanner` and `scanner --help` answer at once."""
    code = f"import {module}, sys; print(*sorted(set({HEAVY}) & set(sys.modules)))"
    answer = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert answer.stdout.split() == []


@pytest.mark.parametrize("name", scanner.__all__)
def test_every_public_name_is_a_documented_callable(name):
    found = getattr(scanner, name)
    assert callable(found)
    assert found.__doc__


def test_an_unknown_name_is_refused():
    with pytest.raises(AttributeError, match="no_such_name"):
        scanner.no_such_name  # noqa: B018


@pytest.mark.parametrize("quantity", REGISTER.values(), ids=lambda quantity: f"{quantity.group}-{quantity.name}")
def test_every_stored_quantity_is_labelled(quantity):
    attributes = quantity.attributes()
    assert attributes["long_name"]
    assert attributes["units"]
    assert quantity.dtype in DTYPES
    assert quantity.group in (ROOT, ORBITS, RESONANCES)
    assert ("orbit" in quantity.dims) == (quantity.group == ORBITS)
    assert bool({"resonance", "curve"} & set(quantity.dims)) == (quantity.group == RESONANCES)
    if quantity.flags:
        assert quantity.dtype == "int8"
        assert quantity.flags[0] == "pending"
        assert attributes["flag_values"] == list(range(len(quantity.flags)))
        assert attributes["flag_meanings"].split() == list(quantity.flags)


def test_the_lowest_version_of_every_requirement_is_told():
    script = Path(__file__).parents[1] / "scripts" / "dependencies.py"
    told = subprocess.run([sys.executable, script, "--lowest"], capture_output=True, text=True, check=True).stdout
    names = [line.partition("==")[0] for line in told.splitlines()]
    assert {"numba", "dask", "zarr", "pytest"} <= set(names)
    assert all("==" in line for line in told.splitlines())
