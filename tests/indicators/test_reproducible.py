"""The same bits on every processor: natively, for a processor without vectors, and with the libraries' plain code."""

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from reproduce import digest_libraries, digest_numbers

from scanner.compiled import cache_folder

SCRIPT = Path(__file__).with_name("reproduce.py")
FOUND = np.show_config(mode="dicts")["SIMD Extensions"].get("found", [])
PLAIN_LIBRARIES = {
    "GLIBC_TUNABLES": "glibc.cpu.hwcaps=-AVX512F,-AVX2,-AVX,-FMA,-FMA4,-ERMS,-SSE4_2,-BMI2",
    "NPY_DISABLE_CPU_FEATURES": " ".join(FOUND),
    "OPENBLAS_CORETYPE": "Prescott",
}
"""Which code the C library, numpy and its linear algebra choose when they are loaded."""
OLD_PROCESSOR = {
    "NUMBA_CPU_NAME": "x86-64",
    "NUMBA_CPU_FEATURES": "",
    "SCANNER_CACHE": str(cache_folder().parent / "generic"),
}
"""What the kernels are compiled for; that takes half a minute, once, as the folder stays."""


def digests_with(changes: dict[str, str]) -> list[str]:
    environment = {**os.environ, **changes}
    done = subprocess.run([sys.executable, SCRIPT], env=environment, capture_output=True, text=True, check=True)
    return done.stdout.split()


@pytest.mark.slow
@pytest.mark.skipif(os.uname().machine != "x86_64", reason="switches of x86-64 processors")
def test_the_numbers_do_not_depend_on_the_processor():
    numbers, libraries = digests_with({**PLAIN_LIBRARIES, **OLD_PROCESSOR})
    assert numbers == digest_numbers()
    if FOUND:  # The control: the switches do switch something, where there is something to switch.
        assert libraries != digest_libraries()
