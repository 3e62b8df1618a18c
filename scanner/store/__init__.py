"""The zarr store of a sweep: its layout, its receipts, its health."""

from scanner.store.durable import Seal, compare
from scanner.store.health import Damage, remove_leftovers, repair, verify
from scanner.store.ledger import Charter, Ledger, Receipt
from scanner.store.lock import StoreLock
from scanner.store.opening import open_sweep
from scanner.store.progress import SweepProgress, list_failures, sweep_progress
from scanner.store.regions import Regions, open_regions
from scanner.store.template import is_vacant, note_finish, prepare_store

__all__ = [
    "Charter",
    "Damage",
    "Ledger",
    "Receipt",
    "Regions",
    "Seal",
    "StoreLock",
    "SweepProgress",
    "compare",
    "is_vacant",
    "list_failures",
    "note_finish",
    "open_regions",
    "open_sweep",
    "prepare_store",
    "remove_leftovers",
    "repair",
    "sweep_progress",
    "verify",
]
