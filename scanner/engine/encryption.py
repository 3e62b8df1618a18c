"""Certificates of the study, or of dask's own configuration, for all connections alike."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import dask
from distributed import Security

from scanner.errors import EngineError
from scanner.study import Resources


@contextmanager
def certificates(resources: Resources) -> Iterator[None]:
    """Put the certificates that a study names into the configuration, where everything that connects finds them.

    Raises
    ------
    EngineError
        One of the files is not there.
    """
    with dask.config.set(_configuration(resources)):
        yield


def _configuration(resources: Resources) -> dict[str, object]:
    if resources.tls_ca is None:
        return {}
    for path in (resources.tls_ca, resources.tls_cert, resources.tls_key):
        if not Path(str(path)).is_file():
            raise EngineError(f"{path}: no such file; correct the tls keys in [resources]")
    own = {"cert": resources.tls_cert, "key": resources.tls_key}
    return {
        "distributed.comm.require-encryption": True,
        "distributed.comm.tls.ca-file": resources.tls_ca,
        **{f"distributed.comm.tls.{role}": own for role in ("client", "scheduler", "worker")},
    }


def security() -> Security | None:
    """Certificates for a scheduler and its workers as configured now; None where there are none."""
    configured = Security()
    return configured if configured.tls_ca_file and configured.tls_scheduler_cert else None


def protocol() -> str:
    """How a scheduler that is started now is spoken to."""
    return "tls" if security() else "tcp"


def command_options(role: str) -> list[str]:
    """Write the certificates configured now as options of ``dask scheduler`` or ``dask worker``."""
    configured = security()
    if configured is None:
        return []
    own = configured.get_tls_config_for_role(role)
    files = {"--tls-ca-file": own["ca_file"], "--tls-cert": own["cert"], "--tls-key": own["key"]}
    return ["--protocol", protocol(), *(word for name, path in files.items() if path for word in (name, str(path)))]
