"""What a worker does before its first task."""

import os
import platform
import subprocess
import sys

import pytest

FAULTS = """
import resource
import sys

import numpy as np

from scanner.engine.work import keep_freed_memory

if sys.argv[1] == "kept":
    keep_freed_memory()


def fill():
    for _ in range(20):
        np.ones(2**18)  # 2 MB: 512 pages


fill()
before = resource.getrusage(resource.RUSAGE_SELF).ru_minflt
fill()
print(resource.getrusage(resource.RUSAGE_SELF).ru_minflt - before)
"""


@pytest.mark.skipif(platform.libc_ver()[0] != "glibc", reason="asks the GNU C library to keep memory")
def test_freed_memory_is_kept_for_the_next_table() -> None:
    # As dask starts its workers.
    environment = {**os.environ, "MALLOC_TRIM_THRESHOLD_": "65536"}

    def faults(how: str) -> int:
        command = [sys.executable, "-c", FAULTS, how]
        return int(subprocess.run(command, env=environment, capture_output=True, text=True, check=True).stdout)

    # 20 times 512 pages if all is given back, and not even one array's worth if it is kept.
    assert faults("given back") > 20 * 500
    assert faults("kept") < 500
