"""What a study asks for, and, apart from it, where it runs."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Annotated, Literal

from pydantic import Field, field_validator, model_validator

from scanner.indicators.schedule import MINIMUM_BOUNCES
from scanner.quantities import LARGEST_SEED, rotations_up_to
from scanner.study.card import describe_study, study_card
from scanner.study.messages import Section, shown

MOST_ORBITS = 2**30
MOST_BOUNCES = 10_000_000
MOST_REPLICATES = 1024
SMALLEST_ERROR, LARGEST_ERROR = 1e-6, 0.5
LARGEST_PERIOD = 32
MOST_WORKERS = 100_000
SMALLEST_MEMORY = 500_000_000
"""Bytes a worker may need; see the limits in ``scanner.study.limits``."""

UNITS = {"MB": 10**6, "MiB": 2**20, "GB": 10**9, "GiB": 2**30, "TB": 10**12, "TiB": 2**40}

TLS_KEYS = ("tls_ca", "tls_cert", "tls_key")
PATH_KEYS = ("scheduler_file", *TLS_KEYS)
"""Keys of [resources] that hold the path of a file."""

Number = int | float
Value = int | float | str
Lines = Annotated[tuple[str, ...], Field(strict=False)]


def _plain(text: str) -> bool:
    """Tell whether a text is one line of printable characters."""
    return text.isprintable() and text.strip() != ""


class Heading(Section):
    """Table [study] of the study file."""

    title: str = Field(
        max_length=200, description="one line of plain text, up to 200 characters", examples=["My study"]
    )
    seed: int = Field(ge=0, le=LARGEST_SEED, description="a whole number from 0 to 2^63 - 1", examples=[1])

    @field_validator("title")
    @classmethod
    def _check_title(cls, title: str) -> str:
        if not _plain(title):
            raise ValueError
        return title


class Orbits(Section):
    """Table [orbits] of the study file: what is sampled on every table."""

    per_table: int = Field(ge=2, le=MOST_ORBITS, description="a whole number from 2 to 2^30", examples=[1024])
    bounces: int = Field(
        ge=MINIMUM_BOUNCES,
        le=MOST_BOUNCES,
        description=f"a whole number from {MINIMUM_BOUNCES} to {MOST_BOUNCES}",
        examples=[8192],
    )
    replicates: int = Field(
        8, ge=2, le=MOST_REPLICATES, description=f"a whole number from 2 to {MOST_REPLICATES}", examples=[8]
    )
    target_error: float | None = Field(
        None,
        ge=SMALLEST_ERROR,
        le=LARGEST_ERROR,
        description=f"a number from {SMALLEST_ERROR} to {LARGEST_ERROR}",
        examples=[0.002],
    )
    most_per_table: int | None = Field(
        None, ge=2, le=MOST_ORBITS, description="a whole number from 2 to 2^30", examples=[16384]
    )
    adaptive: bool = Field(True, description="true or false", examples=[True])
    exponent_bounces: int | None = Field(
        None,
        ge=MINIMUM_BOUNCES,
        le=MOST_BOUNCES,
        description=f"a whole number from {MINIMUM_BOUNCES} to {MOST_BOUNCES}",
        examples=[2048],
    )

    @model_validator(mode="after")
    def _check_together(self) -> Orbits:
        self._check_division("per_table", self.per_table)
        if self.exponent_bounces is not None and not self.adaptive:
            raise ValueError(
                f"exponent_bounces = {self.exponent_bounces} does nothing with adaptive = false, where every orbit "
                "gets all the bounces; remove one of them"
            )
        if self.exponent_bounces is not None and self.exponent_bounces > self.bounces:
            raise ValueError(
                f"exponent_bounces = {self.exponent_bounces} must be at most bounces = {self.bounces}; lower it"
            )
        if self.most_per_table is None:
            if self.target_error is not None:
                raise ValueError(
                    f"target_error = {shown(self.target_error)} needs a bound on the orbits of a table; "
                    f"add for instance most_per_table = {16 * self.per_table}"
                )
            return self
        if self.target_error is None:
            raise ValueError(
                f"most_per_table = {self.most_per_table} does nothing without target_error; "
                "add for instance target_error = 0.002, or remove it"
            )
        self._check_division("most_per_table", self.most_per_table)
        if self.most_per_table < self.per_table:
            raise ValueError(
                f"most_per_table = {self.most_per_table} must be at least per_table = {self.per_table}, "
                "which is the first round; raise it"
            )
        return self

    def _check_division(self, key: str, orbits: int) -> None:
        share, rest = divmod(orbits, self.replicates)
        if rest:
            fitting = [count * self.replicates for count in (share, share + 1) if count > 0]
            raise ValueError(
                f"{key} = {orbits} must be a multiple of replicates = {self.replicates}; "
                f"write {key} = {' or '.join(map(str, fitting))}"
            )

    @property
    def room(self) -> int:
        """Orbits of a table that there is room for: the most it can get."""
        return self.most_per_table or self.per_table


class Resonances(Section):
    """Table [resonances] of the study file: which periodic orbits are sought on every table; none without it."""

    period_max: int = Field(
        ge=2, le=LARGEST_PERIOD, description=f"a whole number from 2 to {LARGEST_PERIOD}", examples=[8]
    )


class Resources(Section):
    """Table [resources] of the study file: where it runs.  Never changes a result, nor the fingerprint.

    Attributes
    ----------
    runner
        "local", "scheduler" (one that is running already) or a batch system.
    workers
        Number of worker processes; None for one per core, or as many as the scheduler has.
    scheduler, scheduler_file
        Address of the running scheduler, or the file that holds it; at most one of them.
    interface, host
        Network interface that scheduler and workers use, and the address of the scheduler where it is not that of the
        interface.  Without them everything stays on the loopback address, where other hosts cannot reach it.
    tls_ca, tls_cert, tls_key
        Paths of a certificate authority, a certificate and its key; with them all connections are encrypted, and
        whoever has no certificate of that authority is turned away.
    account, queue, walltime, memory, directives
        What a job of the batch system asks for; ``memory`` is that of one worker.
    setup
        Shell lines that prepare the environment before a worker starts.
    """

    runner: Literal["local", "scheduler", "slurm", "pbs", "lsf", "sge"] = Field(
        "local", description="one of local, scheduler, slurm, pbs, lsf, sge", examples=["local"]
    )
    workers: int | None = Field(
        None, ge=1, le=MOST_WORKERS, description=f"a whole number from 1 to {MOST_WORKERS}", examples=[2]
    )
    scheduler: str | None = Field(
        None,
        pattern=r"^([a-z]+://)?[^\s/:]+:\d{1,5}$",
        description="an address like tcp://host:8786",
        examples=["tcp://host:8786"],
    )
    scheduler_file: str | None = Field(
        None, description="the path of a scheduler file, as one line of text", examples=["scheduler.json"]
    )
    interface: str | None = Field(
        None, pattern=r"^[A-Za-z0-9_.:@-]{1,32}$", description="the name of a network interface", examples=["ib0"]
    )
    host: str | None = Field(
        None, pattern=r"^[A-Za-z0-9_.:-]{1,255}$", description="the name or address of a host", examples=["login1"]
    )
    tls_ca: str | None = Field(None, description="the path of a file, as one line of text", examples=["ca.pem"])
    tls_cert: str | None = Field(None, description="the path of a file, as one line of text", examples=["cert.pem"])
    tls_key: str | None = Field(None, description="the path of a file, as one line of text", examples=["key.pem"])
    account: str | None = Field(None, pattern=r"^\S+$", description="a name without spaces", examples=["physics"])
    queue: str | None = Field(None, pattern=r"^\S+$", description="a name without spaces", examples=["normal"])
    walltime: str | None = Field(
        None,
        pattern=r"^(\d{1,3}-)?\d{1,3}:[0-5]\d:[0-5]\d$",
        description="a time like 12:00:00 or 2-00:00:00 (days-hours:minutes:seconds)",
        examples=["12:00:00"],
    )
    memory: str | None = Field(
        None,
        pattern=r"^\d{1,9}(\.\d{1,3})? ?([MGT]i?B)$",
        description="a size for one worker like 2GB or 1500MB, at least 500MB",
        examples=["2GB"],
    )
    directives: Lines = Field((), description="a list of lines of text", examples=[["--constraint=avx2"]])
    setup: Lines = Field((), description="a list of shell lines", examples=[["module load python"]])

    @field_validator(*PATH_KEYS)
    @classmethod
    def _check_line(cls, text: str | None) -> str | None:
        if text is not None and not _plain(text):
            raise ValueError
        return text

    @field_validator("directives", "setup")
    @classmethod
    def _check_lines(cls, lines: tuple[str, ...]) -> tuple[str, ...]:
        if not all(map(_plain, lines)):
            raise ValueError
        return lines

    @field_validator("memory")
    @classmethod
    def _check_memory(cls, memory: str | None) -> str | None:
        if memory is not None and _bytes_of(memory) < SMALLEST_MEMORY:
            raise ValueError
        return memory

    @model_validator(mode="after")
    def _check_together(self) -> Resources:
        given = self.model_fields_set
        if self.scheduler and self.scheduler_file:
            raise ValueError(
                f"scheduler = {shown(self.scheduler)} and scheduler_file = {shown(self.scheduler_file)} "
                "must not both be given; keep one of them"
            )
        missing = sorted(set(TLS_KEYS) - given)
        if 0 < len(missing) < len(TLS_KEYS):
            raise ValueError(f"{missing[0]} must be given beside the other tls keys; add it, or remove them all")
        unused = sorted(given - {"runner", "workers", *TLS_KEYS})
        if unused and "runner" not in given:
            wanted = "scheduler" if unused[-1].startswith("scheduler") else "slurm"
            raise ValueError(f'runner must be given beside {unused[-1]}; add for instance runner = "{wanted}"')
        return self

    @property
    def memory_bytes(self) -> int | None:
        """Memory of one worker in bytes, None where it was left to the batch system."""
        return None if self.memory is None else _bytes_of(self.memory)

    @property
    def walltime_seconds(self) -> int | None:
        """Longest duration of a job in seconds, None where it was left to the batch system."""
        if self.walltime is None:
            return None
        days, _, clock = self.walltime.rpartition("-")
        hours, minutes, seconds = map(int, clock.split(":"))
        return 86400 * int(days or 0) + 3600 * hours + 60 * minutes + seconds


def _bytes_of(memory: str) -> int:
    """Read a size like 2GB."""
    digits = memory.rstrip("MGTiB ")
    return int(float(digits) * UNITS[memory[len(digits) :].strip()])


@dataclass(frozen=True, repr=False)
class Study:
    """A valid study.

    Attributes
    ----------
    title, seed, family
        As written.
    fixed
        Parameters with one value.  The path of an outline is absolute.
    swept
        Values of every swept parameter, increasing; in the order written, which is that of the dimensions.
    orbits
        ``per_table``, ``bounces`` and ``replicates``; with ``target_error`` tables get more orbits than ``per_table``,
        up to ``most_per_table``, until it is met.
    resources
        Where it runs.
    text
        The study file as written.
    folder
        Absolute path of the folder where relative paths in the text start, to read it again elsewhere.
    allow_code
        Whether a ``module:function`` family may run.
    resonances
        ``period_max``, or None where no periodic orbits are wanted.
    sources
        SHA-256 of the contents of the file outside the study that decides a result, if there is one: of an outline
        under ``file``, of the module of a function of the user's own under ``family``.
    """

    title: str
    seed: int
    family: str
    fixed: Mapping[str, Value]
    swept: Mapping[str, tuple[Number, ...]]
    orbits: Orbits
    resources: Resources
    text: str
    folder: str
    allow_code: bool
    sources: Mapping[str, str]
    resonances: Resonances | None = None

    def __repr__(self) -> str:
        """Say what is asked, without the text."""
        return describe_study(self)

    def _repr_html_(self) -> str:
        return study_card(self)

    @property
    def rotations(self) -> list[tuple[int, int]]:
        """Rotations (p, q) whose periodic orbits are wanted."""
        return rotations_up_to(self.resonances.period_max) if self.resonances else []

    @cached_property
    def fingerprint(self) -> str:
        """SHA-256, in hexadecimal, of everything that decides a result; the title and the resources do not.

        A file outside the study counts by its contents, not by its path.
        """
        deciding = {
            "seed": self.seed,
            "family": self.family,
            "fixed": {**self.fixed, **self.sources},
            "swept": [[name, list(values)] for name, values in self.swept.items()],
            "orbits": self.orbits.model_dump(exclude_none=True),
            **({"resonances": self.resonances.model_dump()} if self.resonances else {}),
        }
        return hashlib.sha256(json.dumps(deciding, sort_keys=True, allow_nan=False).encode()).hexdigest()
