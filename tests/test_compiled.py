"""Kernels compiled for a processor without vectors: all of them by the warm-up, and with the bits they have here."""

import os
import platform
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from reproduce import digest_libraries, digest_numbers

from scanner.engine.warmth import COMPILE

SCRIPT = Path(__file__).with_name("reproduce.py")
FOUND = np.show_config(mode="dicts")["SIMD Extensions"].get("found", [])
PLAIN_LIBRARIES = {
    "GLIBC_TUNABLES": "glibc.cpu.hwcaps=-AVX512F,-AVX2,-AVX,-FMA,-FMA4,-ERMS,-SSE4_2,-BMI2",
    "NPY_DISABLE_CPU_FEATURES": " ".join(FOUND),
    "OPENBLAS_CORETYPE": "Prescott",
}
"""Which code the C library, numpy and its linear algebra choose when they are loaded."""
OLD_PROCESSOR = {"NUMBA_CPU_NAME": "x86-64", "NUMBA_CPU_FEATURES": ""} if platform.machine() == "x86_64" else {}
"""What the kernels are compiled for."""
ALL_KERNELS = """
import sys
import scanner
from numba.core.dispatcher import Dispatcher
table = scanner.build_table('radial_harmonic', amplitude=0.1, harmonic=2)
survey = scanner.survey_table(table, orbits=128, bounces=1024, replicates=2)
assert survey['librational_area_fraction'] > 0, 'the kernels of islands have not been used'
resonances = scanner.survey_resonances(table)
assert (resonances['curve_fate'] == 2).all(), 'the kernels of resonances have not been used'
rooms = [module for name, module in sys.modules.items() if name.startswith('scanner')]
kernels = {item for room in rooms for item in vars(room).values() if isinstance(item, Dispatcher)}
assert any(kernel.stats.cache_hits for kernel in kernels)
missed = [kernel.__name__ for kernel in kernels if kernel.stats.cache_misses]
assert not missed, missed
"""

# One process for all: what is compiled here takes a minute.
pytestmark = [pytest.mark.slow, pytest.mark.xdist_group("compiled")]


@pytest.fixture(scope="module")
def old_processor(tmp_path_factory):
    """Environment in which the warm-up has compiled what it does, in a folder of its own."""
    environment = {**os.environ, **OLD_PROCESSOR, "SCANNER_CACHE": str(tmp_path_factory.mktemp("kernels"))}
    for part in COMPILE.values():
        subprocess.run([sys.executable, "-c", part], check=True, env=environment)
    return environment


def test_what_is_compiled_is_all_that_a_study_needs(old_processor):
    subprocess.run([sys.executable, "-c", ALL_KERNELS], check=True, env=old_processor)


@pytest.mark.skipif(not OLD_PROCESSOR, reason="switches of x86-64 processors")
def test_the_numbers_do_not_depend_on_the_processor(old_processor):
    environment = {**old_processor, **PLAIN_LIBRARIES}
    done = subprocess.run([sys.executable, SCRIPT], env=environment, capture_output=True, text=True, check=True)
    numbers, libraries = done.stdout.split()
    assert numbers == digest_numbers()
    if FOUND:  # The control: the switches do switch something, where there is something to switch.
        assert libraries != digest_libraries()
