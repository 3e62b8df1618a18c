"""Two hosts on one machine: network namespaces of their own, and a cable between them that can be pulled."""

from __future__ import annotations

import os
import shutil
import subprocess
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager

NEAR, FAR = "10.99.0.1", "10.99.0.2"


def why_no_hosts() -> str | None:
    """Say what is missing here; None where nothing is."""
    if os.geteuid() != 0:
        return "only root can make network namespaces"
    if shutil.which("ip") is None:
        return "ip (of iproute2) not installed"
    name = f"probe-{os.getpid()}"
    refused = subprocess.run(["ip", "netns", "add", name], capture_output=True, check=False, text=True)
    if refused.returncode:
        return f"network namespaces cannot be made here ({refused.stderr.strip()})"
    _ip("netns", "delete", name)
    return None


class Hosts:
    """Two namespaces, ``near`` and ``far``."""

    def __init__(self) -> None:
        self.near, self.far = f"near-{os.getpid()}", f"far-{os.getpid()}"

    def on(self, host: str) -> list[str]:
        """Words that, put before a command, run it on that host."""
        return ["ip", "netns", "exec", host]

    def pull_the_cable(self) -> None:
        """Cut the far host off: nobody is told, packets are lost in silence."""
        _ip("-n", self.far, "link", "set", "cable", "down")


@contextmanager
def two_hosts() -> Iterator[Hosts]:
    """Make two hosts and take them away."""
    hosts = Hosts()
    with ExitStack() as stack:
        for host in (hosts.near, hosts.far):
            _ip("netns", "add", host)
            stack.callback(_ip, "netns", "delete", host)
            _ip("-n", host, "link", "set", "lo", "up")
        _ip("-n", hosts.near, "link", "add", "cable", "type", "veth", "peer", "name", "cable", "netns", hosts.far)
        for host, address in ((hosts.near, NEAR), (hosts.far, FAR)):
            _ip("-n", host, "address", "add", f"{address}/24", "dev", "cable")
            _ip("-n", host, "link", "set", "cable", "up")
        yield hosts


def _ip(*words: str) -> None:
    subprocess.run(["ip", *words], check=True, capture_output=True)
