"""What is finished: one small durable receipt a task, written after everything the task wrote.

A missing chunk says nothing (it reads as "not done" and so does a lost one), so that receipts alone decide.
They live in a folder of the ``table_status`` array: zarr looks for no members inside an array, so that every reader
stays free of warnings, and a store that is moved or copied takes them along.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass
from pathlib import Path

from scanner.errors import StoreError
from scanner.store.durable import Seal, write_durably

LEDGER = Path("table_status") / "ledger"
LAYOUT = 1


@dataclass(frozen=True)
class Charter:
    """What a store was made for; written once, never changed.

    ``template`` seals every file the store was made with (array metadata and coordinates) but the root's own
    metadata, which also holds the times of the run.
    """

    fingerprint: str
    study: str
    tasks: int
    tables: int
    orbits: int
    bounces: int
    template: Mapping[str, Seal]
    layout: int = LAYOUT


@dataclass(frozen=True)
class Receipt:
    """Proof that a task is finished, and what came out.

    ``orbits`` counts the orbits it settles, ``bounces`` what was really computed for them; ``failures`` lists tables
    by their index in the grid with a one-line reason.
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


def _seal_lines(*records: object) -> bytes:
    """Write records one a line, and a checksum of them all below."""
    body = b"".join(json.dumps(record, separators=(",", ":")).encode() + b"\n" for record in records)
    return body + _checksum_line(body)


def _sealed_lines(path: Path) -> list[bytes] | None:
    """Read such lines without their checksum; None where the file is missing, torn or altered."""
    try:
        content = path.read_bytes()
    except (FileNotFoundError, NotADirectoryError):
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

    def found(self, charter: Charter) -> None:
        """Begin a ledger in a store that is being made."""
        self._receipts.mkdir(parents=True)
        write_durably(self.folder / "charter.json", _seal_lines(asdict(charter)))

    def charter(self) -> Charter:
        """Read what the store was made for.

        Raises
        ------
        StoreError
            The path is missing, is no store of this tool, or was written in a layout not known here.
        """
        if not self.store.exists():
            raise StoreError(f"{self.store}: there is no such store; `scanner sweep STUDY --store PATH` makes one")
        lines = _sealed_lines(self.folder / "charter.json")
        if lines is None:
            raise StoreError(f"{self.store}: not a store of this tool, or its charter is damaged; give another path")
        record = json.loads(lines[0])
        if record["layout"] != LAYOUT:
            raise StoreError(
                f"{self.store}: written in layout {record['layout']}, this version reads layout {LAYOUT}; "
                "use the version named in its attributes"
            )
        return Charter(**{**record, "template": _seals(record["template"])})

    def receipt_path(self, task: int) -> Path:
        """Where the receipt of a task is or will be."""
        return self._receipts / f"{task:06d}.json"

    def write(self, receipt: Receipt, seals: Mapping[str, Seal]) -> None:
        """Put a receipt on the disk; the files it seals, by their names in the store, must be there already."""
        write_durably(self.receipt_path(receipt.task), _seal_lines(asdict(receipt), seals))

    def read(self, task: int) -> Receipt | None:
        """Read the receipt of a task, or None where there is no sound one."""
        lines = _sealed_lines(self.receipt_path(task))
        if lines is None:
            return None
        record = json.loads(lines[0])
        failures = tuple((tuple(index), reason) for index, reason in record["failures"])
        return Receipt(**{**record, "failures": failures})

    def seals(self, task: int) -> dict[str, Seal] | None:
        """Read what a task wrote: seals by the names of files; None where there is no sound receipt."""
        lines = _sealed_lines(self.receipt_path(task))
        return None if lines is None else _seals(json.loads(lines[1]))

    def listed(self) -> list[int]:
        """Tasks that have a receipt, sound or not, in order."""
        return sorted(int(path.stem) for path in self._receipts.glob("*.json") if path.stem.isdecimal())

    def receipts(self) -> Iterator[Receipt]:
        """All sound receipts, in the order of their tasks."""
        for task in self.listed():
            receipt = self.read(task)
            if receipt is not None:
                yield receipt


def _seals(record: dict[str, list[int | str]]) -> dict[str, Seal]:
    return {name: Seal(*seal) for name, seal in record.items()}  # type: ignore[arg-type]
