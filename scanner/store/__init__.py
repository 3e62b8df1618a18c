"""The zarr store of a sweep: its layout, its receipts, its health."""

from scanner.store.compaction import Compaction, compact_store
from scanner.store.durable import Seal, compare
from scanner.store.health import Damage, refuse_losses, remove_leftovers, repair, verify
from scanner.store.ledger import Charter, Ledger, Receipt
from scanner.store.lock import StoreLock
from scanner.store.metadata import enclosing_store
from scanner.store.opening import open_sweep
from scanner.store.progress import SweepProgress, list_failures, sweep_progress
from scanner.store.pulse import Pulse, read_pulse, write_pulse
from scanner.store.regions import Regions, open_regions
from scanner.store.template import check_numerics, is_vacant, note_finish, prepare_store, stored_title

__all__ = [
    "Charter",
    "Compaction",
    "Damage",
    "Ledger",
    "Pulse",
    "Receipt",
    "Regions",
    "Seal",
    "StoreLock",
    "SweepProgress",
    "check_numerics",
    "compact_store",
    "compare",
    "enclosing_store",
    "is_vacant",
    "list_failures",
    "note_finish",
    "open_regions",
    "open_sweep",
    "prepare_store",
    "read_pulse",
    "refuse_losses",
    "remove_leftovers",
    "repair",
    "stored_title",
    "sweep_progress",
    "verify",
    "write_pulse",
]
