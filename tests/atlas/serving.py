"""The command that serves an atlas, in a process of its own."""

from __future__ import annotations

import os
import re
import signal
import subprocess
import sys
from contextlib import contextmanager


@contextmanager
def served(*arguments, folder=None):
    """Serve an atlas as a user does, at any port that is free; gives its address."""
    command = [sys.executable, "-m", "scanner", "atlas", *map(str, arguments), "--port", "0"]
    environment = {**os.environ, "PYTHONUNBUFFERED": "1", "PYTHONPATH": os.pathsep.join(filter(None, sys.path))}
    pipes = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE, "text": True}
    with subprocess.Popen(command, cwd=folder, env=environment, **pipes) as process:
        try:
            line = process.stdout.readline()
            yield re.search(r"http://\S+", line)[0]
        finally:
            process.send_signal(signal.SIGINT)
            _, complaints = process.communicate(timeout=30)
    assert process.returncode == 0
    assert complaints == ""
