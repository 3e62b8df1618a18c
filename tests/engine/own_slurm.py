"""A real Slurm of this test's own: one controller and two nodes, all on the loopback address of this machine."""

from __future__ import annotations

import os
import secrets
import shutil
import socket
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from pathlib import Path

from slow_sweep import wait_until

PROGRAMS = ("munged", "slurmctld", "slurmd", "sbatch", "scancel", "squeue", "sinfo")
NODES = ("n1", "n2")

CONFIGURATION = """
ClusterName=test
SlurmctldHost={host}(127.0.0.1)
SlurmctldPort={controller}
SlurmUser=root
SlurmdUser=root
AuthType=auth/munge
AuthInfo=socket={folder}/munge.socket
CommunicationParameters=NoCtldInAddrAny,NoInAddrAny
StateSaveLocation={folder}/state
SlurmdSpoolDir={folder}/%n
SlurmctldPidFile={folder}/slurmctld.pid
SlurmdPidFile={folder}/%n.pid
SlurmctldLogFile={folder}/slurmctld.log
SlurmdLogFile={folder}/%n.log
ProctrackType=proctrack/linuxproc
TaskPlugin=task/none
MpiDefault=none
JobAcctGatherType=jobacct_gather/linux
JobAcctGatherParams=OverMemoryKill
AccountingStorageType=accounting_storage/none
SelectType=select/cons_tres
SelectTypeParameters=CR_Core_Memory
SchedulerParameters=batch_sched_delay=0,sched_interval=1,sched_min_interval=0,bf_interval=1
SlurmdParameters=config_overrides
DefMemPerCPU=256
ReturnToService=2
KillWait=2
SlurmdTimeout=30
{nodes}
PartitionName=normal Nodes={names} Default=YES MaxTime=INFINITE State=UP
"""


def why_no_slurm() -> str | None:
    """Say what is missing here for a Slurm of one's own; None where nothing is."""
    if os.geteuid() != 0:
        return "only root can start a Slurm of its own"
    missing = [program for program in PROGRAMS if shutil.which(program) is None]
    return f"{', '.join(missing)} not installed" if missing else None


@contextmanager
def own_slurm() -> Iterator[dict[str, str]]:
    """Start a Slurm in a temporary folder and stop it: gives the environment that makes commands use it."""
    with tempfile.TemporaryDirectory(prefix="slurm-") as folder, ExitStack() as stack:
        Path(folder).chmod(0o711)  # The socket of munge must be within everybody's reach.
        yield stack.enter_context(_running(Path(folder)))


@contextmanager
def _running(folder: Path) -> Iterator[dict[str, str]]:
    controller, *ports = _free_ports(1 + len(NODES))
    host = socket.gethostname()
    nodes = "\n".join(
        f"NodeName={name} NodeHostname={host} NodeAddr=127.0.0.1 Port={port} CPUs=4 RealMemory=8000"
        for name, port in zip(NODES, ports, strict=True)
    )
    configuration = folder / "slurm.conf"
    configuration.write_text(
        CONFIGURATION.format(host=host, folder=folder, controller=controller, nodes=nodes, names=",".join(NODES))
    )
    (folder / "cgroup.conf").write_text("CgroupPlugin=cgroup/v1\n")  # else a mounted tree of control groups is wanted
    key = folder / "munge.key"
    key.write_bytes(secrets.token_bytes(1024))
    key.chmod(0o600)
    for name in ("state", *NODES):
        (folder / name).mkdir()
    environment = {**os.environ, "SLURM_CONF": str(configuration)}
    munge = [f"--{what}-file={folder}/munge.{what.split('-')[0]}" for what in ("key", "pid", "log", "seed")]
    with ExitStack() as stack:
        stack.enter_context(_daemon("munged", "--foreground", f"--socket={folder}/munge.socket", *munge))
        wait_until((folder / "munge.socket").exists)
        stack.enter_context(_daemon("slurmctld", "-D", "-c", "-f", str(configuration), environment=environment))
        for name in NODES:
            stack.enter_context(_daemon("slurmd", "-D", "-N", name, "-f", str(configuration), environment=environment))
        wait_until(lambda: len(ask(environment, "sinfo", "-h", "-N", "-t", "idle").splitlines()) == len(NODES))
        try:
            yield environment
        finally:
            ask(environment, "scancel", "--user=root")
            wait_until(lambda: not ask(environment, "squeue", "-h"))


def ask(environment: dict[str, str], *command: str) -> str:
    """Run a command of Slurm: what it printed."""
    done = subprocess.run(command, env=environment, timeout=20, capture_output=True, text=True, check=False)
    return done.stdout.strip()


@contextmanager
def _daemon(*command: str, environment: dict[str, str] | None = None) -> Iterator[None]:
    process = subprocess.Popen(command, env=environment, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    try:
        yield
    finally:
        process.terminate()
        try:
            process.wait(20)
        except subprocess.TimeoutExpired:
            process.kill()
            process.wait()


def _free_ports(count: int) -> list[int]:
    """Find free ports; all are held until all are found."""
    with ExitStack() as stack:
        sockets = [stack.enter_context(socket.socket()) for _ in range(count)]
        for each in sockets:
            each.bind(("127.0.0.1", 0))
        return [each.getsockname()[1] for each in sockets]
