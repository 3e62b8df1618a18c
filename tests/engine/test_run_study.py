import signal
from contextlib import contextmanager

import numpy as np
import pytest
from distributed import Client, LocalCluster
from sweeps import everything, fill, grid, results

import scanner
from scanner.errors import EngineError, StoreError, StudyError
from scanner.store import StoreLock, repair, sweep_progress, verify
from scanner.study import parse_study

FAILING = """
import numpy as np

def ellipse(flat):
    if flat == 0.5:
        raise ArithmeticError("half is not my taste")
    return np.array([[0, 1.0], [0, 0], [0, 0], [0, 1.0 - flat]])
"""


@pytest.fixture(scope="module")
def client():
    """Two worker threads in this process."""
    with (
        LocalCluster(n_workers=2, threads_per_worker=1, processes=False, dashboard_address=":0") as cluster,
        Client(cluster) as client,
    ):
        yield client


@pytest.fixture(scope="module")
def computed_here(tmp_path_factory):
    path = tmp_path_factory.mktemp("here") / "grid.zarr"
    fill(path, grid())
    return results(path)


def test_one_process_a_core_by_default_gives_what_is_computed_here(computed_here, tmp_path):
    report = scanner.run_study(grid(), tmp_path / "grid.zarr")
    assert report.exit_status == 0
    assert (report.tables, report.done, report.not_convex, report.failures) == (10, 6, 4, ())
    with scanner.open_sweep(tmp_path / "grid.zarr") as tree:
        assert report.bounces == tree["bounces_used"].sum().item()
    assert report.core_hours == pytest.approx(sweep_progress(tmp_path / "grid.zarr").core_seconds / 3600, rel=1e-12)
    # Kernels are compiled by now, so that there was an estimate; 6 tables take more than a ms each and less than 100 s.
    assert 6e-3 / 3600 < report.expected_core_hours < 600 / 3600
    assert f"{report.core_hours:.3g} core-hours, {report.expected_core_hours:.3g} expected" in str(report)
    assert str(report) in (tmp_path / "grid.log").read_text()
    assert results(tmp_path / "grid.zarr") == computed_here
    assert verify(tmp_path / "grid.zarr") == []
    with scanner.open_sweep(tmp_path / "grid.zarr") as tree:
        assert tree.attrs["finished"] >= tree.attrs["started"]


def test_a_client_of_the_caller_is_used_and_left_alone(client, computed_here, tmp_path):
    scanner.run_study(grid(), tmp_path / "grid.zarr", client=client, progress=False)
    assert client.status == "running"
    assert results(tmp_path / "grid.zarr") == computed_here


def test_tables_in_rounds_are_the_same_in_any_order_and_carried_on(client, tmp_path):
    orbits = "4\ntarget_error = 0.02\nmost_per_table = 1024"
    study = grid(per_table="64", bounces="256", replicates=orbits)
    plan = fill(tmp_path / "here.zarr", study)
    fill(tmp_path / "grid.zarr", study, [len(plan.tasks) - 1])
    report = scanner.run_study(study, tmp_path / "grid.zarr", client=client, progress=False)
    assert report.exit_status == 0
    assert results(tmp_path / "grid.zarr") == results(tmp_path / "here.zarr")
    assert sweep_progress(tmp_path / "grid.zarr").orbits_settled == 10 * 1024
    with scanner.open_sweep(tmp_path / "grid.zarr") as tree:
        used = tree["orbits_used"].values
        # Four of the ten tables are not convex, and the others take different numbers of rounds.
        assert np.isnan(used).sum() == 4
        assert len(np.unique(used[np.isfinite(used)])) > 1
        assert report.bounces <= np.nansum(used) * 256
        assert ((tree["orbits/verdict"] != 0).sum("orbit").values == np.nan_to_num(used)).all()


def test_a_split_table_is_summed_up_after_its_orbits(client, tmp_path):
    study = grid(amplitude="0.05", harmonic="2", per_table="4096", bounces="16384")
    report = scanner.run_study(study, tmp_path / "one.zarr", client=client, progress=False)
    fill(tmp_path / "here.zarr", study)
    assert sweep_progress(tmp_path / "one.zarr").tasks > 2
    assert report.done == 1
    assert results(tmp_path / "one.zarr") == results(tmp_path / "here.zarr")


def test_a_finished_store_is_left_as_it_is(client, tmp_path):
    fill(tmp_path / "grid.zarr", grid())
    scanner.run_study(grid(), tmp_path / "grid.zarr", client=client, progress=False)
    before = everything(tmp_path / "grid.zarr")
    report = scanner.run_study(grid(title='"Renamed"'), tmp_path / "grid.zarr", client=client, progress=False)
    assert everything(tmp_path / "grid.zarr") == before
    assert report.done == 6
    assert "keeps the title it was made with, 'Grid'" in (tmp_path / "grid.log").read_text()


def test_another_study_is_refused_and_nothing_is_changed(client, tmp_path):
    fill(tmp_path / "grid.zarr", grid(), tasks=[0])
    before = everything(tmp_path)
    with pytest.raises(StoreError, match="holds another study"):
        scanner.run_study(grid(seed="6"), tmp_path / "grid.zarr", client=client)
    assert everything(tmp_path) == before


def test_a_study_too_large_is_refused_before_anything_is_written(client, tmp_path):
    with pytest.raises(StudyError, match="per_table"):
        scanner.run_study(grid(per_table=str(2**26)), tmp_path / "grid.zarr", client=client)
    assert list(tmp_path.iterdir()) == []


def test_a_store_named_like_its_log_is_refused(client, tmp_path):
    with pytest.raises(StoreError, match=r"give another, like \.zarr"):
        scanner.run_study(grid(), tmp_path / "grid.log", client=client)
    assert list(tmp_path.iterdir()) == []


def test_a_store_in_use_is_refused(client, tmp_path):
    fill(tmp_path / "grid.zarr", grid(), tasks=[])
    with StoreLock(tmp_path / "grid.zarr"), pytest.raises(StoreError, match="in use"):
        scanner.run_study(grid(), tmp_path / "grid.zarr", client=client)


def test_damage_is_repaired_by_the_next_sweep_alone(client, computed_here, tmp_path):
    path = tmp_path / "grid.zarr"
    scanner.run_study(grid(), path, client=client, progress=False)
    (path / "orbits/p0/c.1.0.0").write_bytes(b"")
    (path / "perimeter/c.3.0").unlink()
    repair(path)
    before = everything(path / "table_status/ledger/receipts")
    assert len(before) == 3
    scanner.run_study(grid(), path, client=client, progress=False)
    after = everything(path / "table_status/ledger/receipts")
    assert len(after) == 5
    assert {name: after[name] for name in before} == before
    assert results(path) == computed_here


def test_failed_tables_are_listed_and_do_not_stop_the_others(client, tmp_path, monkeypatch):
    (tmp_path / "failing_shapes.py").write_text(FAILING)
    monkeypatch.syspath_prepend(tmp_path)
    text = (
        grid().text.replace("radial_harmonic", "failing_shapes:ellipse").replace("harmonic = { values = [2, 3] }", "")
    )
    text = text.replace("{ start = 0.0, stop = 0.24, count = 5 }", "{ values = [0.25, 0.5] }").replace(
        "amplitude", "flat"
    )
    report = scanner.run_study(parse_study(text, allow_code=True), tmp_path / "own.zarr", client=client, progress=False)
    assert report.exit_status == 1
    assert report.done == 1
    (line,) = report.failures
    assert line.startswith("flat = 0.5: ")
    assert "half is not my taste" in line
    assert "half is not my taste" in (tmp_path / "own.log").read_text()


def test_no_scheduler_is_one_line(tmp_path):
    with pytest.raises(EngineError, match="no such scheduler file"):
        scanner.run_study(grid(), tmp_path / "grid.zarr", scheduler_file=str(tmp_path / "none.json"), progress=False)
    assert list(tmp_path.iterdir()) == []


def test_nobody_at_the_address_is_one_line(tmp_path, monkeypatch):
    monkeypatch.setattr("scanner.engine.crew.CONNECT_SECONDS", 1)
    with pytest.raises(EngineError, match=r"tcp://127.0.0.1:1: no scheduler answers there") as caught:
        scanner.run_study(grid(), tmp_path / "grid.zarr", scheduler="tcp://127.0.0.1:1", progress=False)
    assert "\n" not in str(caught.value)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("content", ["", "not json", "{}", "[]"])
def test_a_file_that_no_scheduler_wrote_is_one_line(content, tmp_path):
    file = tmp_path / "scheduler.json"
    file.write_text(content)
    with pytest.raises(EngineError, match=r"scheduler.json: not a scheduler file") as caught:
        scanner.run_study(grid(), tmp_path / "grid.zarr", scheduler_file=str(file), progress=False)
    assert "\n" not in str(caught.value)


def test_an_interrupt_before_there_are_workers_ends_the_run(tmp_path, monkeypatch):
    @contextmanager
    def hire(*_):
        signal.raise_signal(signal.SIGINT)  # as while the kernels are compiled
        yield None  # no client: nothing may be asked of it

    monkeypatch.setattr("scanner.engine.sweep.hire", hire)
    report = scanner.run_study(grid(), tmp_path / "grid.zarr", progress=False)
    assert report.exit_status == 130
    assert sweep_progress(tmp_path / "grid.zarr").tasks_finished == 0
