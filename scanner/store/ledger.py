"""What is finished: one small durable receipt a task, written after everything the task wrote.

A missing chunk says nothing (it reads as "not done" and so does a lost one), so that receipts alone decide.
They live in a folder of the ``table_status`` array: zarr looks for no members inside an array, so that every reader
stays free of warnings, and a store that is moved or copied takes them along.

A compacted store is finished for good: all its receipts are in one file, and another one seals its shards.
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import asdict, dataclass
from pathlib import Path, PurePosixPath
from typing import Any

from scanner import __version__
from scanner.errors import StoreError
from scanner.store.durable import Seal, write_durably
from scanner.store.swap import refuse_left_aside

LEDGER = Path("table_status") / "ledger"
CHARTER = "charter.json"
LAYOUT = 2
"""Raised when what this version writes cannot be read by the one before; stores of lower layouts are still read."""


@dataclass(frozen=True)
class Charter:
    """What a store was made for; written once, never changed.

    Attributes
    ----------
    fingerprint, study
        Of the study, and its text.
    tasks, tables, orbits, bounces
        Tasks and tables in all, orbits of a table and bounces of an orbit.
    template
        Seals of every file the store was made with (array metadata and coordinates) but the root's own metadata,
        which also holds the time of completion.
    root
        That metadata as it was made, to tell damage and to mend it.
    version, numerics
        Which version of the package made the store, and which code its numbers come from.
    compacted
        Whether the store is finished and compacted: whole shards instead of the chunks of tasks.
    layout
        Version of the layout of files; 1 had neither of the last four.
    """

    fingerprint: str
    study: str
    tasks: int
    tables: int
    orbits: int
    bounces: int
    template: Mapping[str, Seal]
    root: str = ""
    version: str = ""
    numerics: str = ""
    compacted: bool = False
    layout: int = LAYOUT


@dataclass(frozen=True)
class Receipt:
    """Proof that a task is finished, and what came out.

    ``orbits`` counts the orbits it settles, ``bounces`` what was really computed for them; ``failures`` lists tables
    by their index in the grid with a one-line reason; ``tables`` says in words which tables it is about.
    """

    task: int
    kind: str
    host: str
    finished: float
    seconds: float
    orbits: int
    bounces: int
    done: int
    not_convex: int
    failed: int
    failures: tuple[tuple[tuple[int, ...], str], ...]
    tables: str = ""


@dataclass(frozen=True)
class Looseness:
    """What a compacted store was before, and what mends it.

    Attributes
    ----------
    charter, metadata
        Its charter then, and the metadata of its arrays by the names of files.
    compacted_metadata
        The same of the compacted store.
    """

    charter: Charter
    metadata: Mapping[str, str]
    compacted_metadata: Mapping[str, str]


def _seal_lines(*records: object) -> bytes:
    """Write records one a line, and a checksum of them all below."""
    body = b"".join(json.dumps(record, separators=(",", ":")).encode() + b"\n" for record in records)
    return body + _checksum_line(body)


def _sealed_lines(path: Path) -> list[bytes] | None:
    """Read such lines without their checksum; None where the file is missing, torn or altered."""
    try:
        content = path.read_bytes()
    except (FileNotFoundError, NotADirectoryError, IsADirectoryError):
        return None
    body = content[: -len(_checksum_line(b""))]
    return body.splitlines() if content == body + _checksum_line(body) else None


def _checksum_line(body: bytes) -> bytes:
    return Seal.of(body).digest.encode() + b"\n"


class Ledger:
    """The charter and the receipts of one store."""

    def __init__(self, store: Path) -> None:
        self.store = store
        self.folder = store / LEDGER
        self._receipts = self.folder / "receipts"
        self._gathered = self.folder / "receipts.json"
        self._shards = self.folder / "shards.json"
        self._before = self.folder / "before.json"
        self._charter: Charter | None = None

    def found(self, charter: Charter) -> None:
        """Begin a ledger in a store that is being made, or give one its charter back."""
        self._receipts.mkdir(parents=True, exist_ok=True)
        write_durably(self.folder / CHARTER, _seal_lines(asdict(charter)))

    def found_compacted(
        self, charter: Charter, receipts: Iterable[Receipt], shards: Mapping[str, Seal], before: Looseness
    ) -> None:
        """Begin the ledger of a compacted store that is being made; the files it seals must be there already."""
        self.folder.mkdir(parents=True)
        write_durably(self._gathered, _seal_lines(*map(asdict, receipts)))
        write_durably(self._shards, _seal_lines(shards))
        write_durably(self._before, _seal_lines(asdict(before)))
        write_durably(self.folder / CHARTER, _seal_lines(asdict(charter)))

    def is_founded(self) -> bool:
        """Whether there is a sound charter."""
        return _sealed_lines(self.folder / CHARTER) is not None

    def is_gathered(self) -> bool:
        """Whether the receipts are those of a compacted store, whatever the charter says."""
        return self._gathered.exists()

    def charter(self) -> Charter:
        """Read what the store was made for.

        Raises
        ------
        StoreError
            The path is missing, is no store of this tool, or was written in a layout not known here.
        """
        if self._charter is None:
            self._charter = self._read_charter()
        return self._charter

    def _read_charter(self) -> Charter:
        refuse_left_aside(self.store)
        if not self.store.exists():
            raise StoreError(f"{self.store}: there is no such store; `scanner sweep STUDY --store PATH` makes one")
        lines = _sealed_lines(self.folder / CHARTER)
        if lines is None:
            remedy = "the same `scanner sweep` writes it again" if self.folder.is_dir() else "give another path"
            raise StoreError(f"{self.store}: not a store of this tool, or its charter is damaged; {remedy}")
        record = json.loads(lines[0])
        if record["layout"] > LAYOUT:
            made_by = record.get("version") or "a later version"
            raise StoreError(
                f"{self.store}: made by scanner {made_by} in layout {record['layout']}, this is scanner {__version__} "
                f"and reads layouts up to {LAYOUT}; install scanner {made_by} or later"
            )
        return _charter(record)

    def receipt_path(self, task: int) -> Path:
        """Where the receipt of a task is or will be."""
        return self._receipts / f"{task:06d}.json"

    def write(self, receipt: Receipt, seals: Mapping[str, Seal]) -> None:
        """Put a receipt on the disk; the files it seals, by their names in the store, must be there already."""
        record = {**asdict(receipt), "study": self.charter().fingerprint}
        self._receipts.mkdir(exist_ok=True)  # where it was lost
        write_durably(self.receipt_path(receipt.task), _seal_lines(record, seals))

    def read(self, task: int) -> Receipt | None:
        """Read the receipt of a task, or None where there is no sound one."""
        lines = self._receipt_lines(task)
        if lines is None:
            return None
        return _receipt(lines[0])

    def seals(self, task: int) -> dict[str, Seal] | None:
        """Read what a task wrote: seals by the names of files; None where there is no sound receipt."""
        lines = self._receipt_lines(task)
        return None if lines is None else _seals(json.loads(lines[1]))

    def _receipt_lines(self, task: int) -> list[bytes] | None:
        """Read a receipt, unless it is torn or belongs to another task or another study."""
        lines = _sealed_lines(self.receipt_path(task))
        if lines is None:
            return None
        record: dict[str, Any] = json.loads(lines[0])
        charter = self.charter()
        belongs = record["task"] == task < charter.tasks and record.get("study", "") in ("", charter.fingerprint)
        return lines if belongs else None

    def listed(self) -> list[int]:
        """Tasks that have a receipt, sound or not, in order."""
        return sorted(int(path.stem) for path in self._receipts.glob("*.json") if path.stem.isdecimal())

    def shards(self) -> dict[str, Seal] | None:
        """Read what a compacted store consists of: seals by the names of files; None where that is damaged."""
        lines = _sealed_lines(self._shards)
        return None if lines is None else _seals(json.loads(lines[0]))

    def looseness(self) -> Looseness | None:
        """Read what a compacted store was before; None where that is damaged."""
        lines = _sealed_lines(self._before)
        if lines is None:
            return None
        record = json.loads(lines[0])
        return Looseness(**{**record, "charter": _charter(record["charter"])})

    def damaged_parts(self) -> list[str]:
        """Name the files of a compacted store's ledger that are damaged."""
        parts = (self._gathered, self._shards, self._before)
        return [str(part.relative_to(self.store)) for part in parts if _sealed_lines(part) is None]

    def receipts(self) -> Iterator[Receipt]:
        """All sound receipts, in the order of their tasks.

        Raises
        ------
        StoreError
            The store is compacted, and the one file of its receipts is damaged.
        """
        if self.charter().compacted:
            lines = _sealed_lines(self._gathered)
            if lines is None:
                raise StoreError(f"{self._gathered}: damaged; take that file from a backup of the compacted store")
            yield from map(_receipt, lines)
            return
        for task in self.listed():
            receipt = self.read(task)
            if receipt is not None:
                yield receipt


def _charter(record: dict[str, Any]) -> Charter:
    return Charter(**{**record, "template": _seals(record["template"])})


def _receipt(line: bytes) -> Receipt:
    record = json.loads(line)
    record.pop("study", None)
    failures = tuple((tuple(index), reason) for index, reason in record["failures"])
    return Receipt(**{**record, "failures": failures})


def _seals(record: dict[str, list[int | str]]) -> dict[str, Seal]:
    """Read seals by names; none but of files inside the store, whoever wrote them."""
    inside = (name for name in record if not {"..", "/"} & set(PurePosixPath(name).parts))
    return {name: Seal(*record[name]) for name in inside}  # type: ignore[arg-type]
