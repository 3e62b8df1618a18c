from dataclasses import replace

import pytest

from scanner.errors import StoreError
from scanner.store import Charter, Ledger, Receipt, Seal

RECEIPT = Receipt(
    task=12,
    kind="survey",
    host="here",
    finished=1000.0,
    seconds=2.5,
    orbits=128,
    bounces=8192,
    done=1,
    not_convex=0,
    failed=1,
    failures=(((0, 3), "no such curve"),),
)
SEALS = {"area/c.0": Seal.of(b"abc")}
CHARTER = Charter("ab" * 32, "[study]", 20, 4, 64, 128, {"area/zarr.json": Seal.of(b"{}")})


@pytest.fixture
def ledger(tmp_path):
    ledger = Ledger(tmp_path)
    ledger.found(CHARTER)
    return ledger


def test_records_come_back_as_they_were_written(ledger):
    ledger.write(RECEIPT, SEALS)
    assert ledger.read(12) == RECEIPT
    assert ledger.seals(12) == SEALS
    assert ledger.charter() == CHARTER
    assert ledger.read(13) is None
    assert ledger.listed() == [12]


def test_receipts_come_in_the_order_of_their_tasks(ledger):
    for task in (15, 3, 10):
        ledger.write(replace(RECEIPT, task=task), {})
    assert [receipt.task for receipt in ledger.receipts()] == [3, 10, 15]


@pytest.mark.parametrize(
    "harm",
    [lambda text: b"", lambda text: text[:40], lambda text: text.replace(b"survey", b"Survey"), lambda text: text[:-1]],
)
def test_a_torn_or_altered_receipt_does_not_count(ledger, harm):
    ledger.write(RECEIPT, SEALS)
    path = ledger.receipt_path(12)
    path.write_bytes(harm(path.read_bytes()))
    assert ledger.read(12) is None
    assert ledger.seals(12) is None
    assert list(ledger.receipts()) == []
    assert ledger.listed() == [12]


def test_no_half_written_file_is_left(ledger):
    ledger.write(RECEIPT, SEALS)
    assert {file.name for file in ledger.folder.rglob("*")} == {"charter.json", "receipts", "000012.json"}


def test_a_later_layout_is_refused(tmp_path):
    ledger = Ledger(tmp_path)
    ledger.found(replace(CHARTER, layout=99))
    with pytest.raises(StoreError, match="layout 99"):
        ledger.charter()


def test_a_file_is_not_a_store(tmp_path):
    path = tmp_path / "file.zarr"
    path.write_text("text")
    with pytest.raises(StoreError, match="not a store of this tool"):
        Ledger(path).charter()


def test_a_foreign_file_among_the_receipts_is_none(ledger):
    ledger.write(RECEIPT, SEALS)
    ledger.receipt_path(12).with_name("000012 copy.json").write_text("{}")
    assert ledger.listed() == [12]
