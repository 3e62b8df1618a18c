"""Code named in a study file runs on a worker only where that was allowed."""

from dataclasses import replace

import pytest
from distributed import Client, LocalCluster
from sweeps import grid, order_for

from scanner.engine.work import run_task
from scanner.errors import StudyError
from scanner.store import prepare_store
from scanner.study import make_plan, parse_study

CODE = """
from pathlib import Path

Path(__file__).with_name("imported").touch()

def circle(size):
    return [[0, size], [0, 0], [0, 0], [0, size]]
"""


@pytest.mark.slow
def test_a_worker_process_refuses_code_that_was_not_allowed(tmp_path, monkeypatch):
    (tmp_path / "trusted_shapes.py").write_text(CODE)
    monkeypatch.chdir(tmp_path)
    text = grid(amplitude="0.05", harmonic="2").text.replace("radial_harmonic", "trusted_shapes:circle")
    text = text.replace("harmonic = 2\n", "").replace("amplitude", "size")
    study = parse_study(text, allow_code=True)
    prepare_store(tmp_path / "s.zarr", make_plan(study))
    (tmp_path / "imported").unlink()
    order = order_for(tmp_path / "s.zarr", study)
    with (
        LocalCluster(n_workers=1, threads_per_worker=1, processes=True, dashboard_address=":0") as cluster,
        Client(cluster) as client,
    ):
        refused = client.submit(run_task, replace(order, allow_code=False), 0, pure=False)
        with pytest.raises(StudyError, match="--allow-code"):
            refused.result(timeout=60)
        assert not (tmp_path / "imported").exists()
        assert client.submit(run_task, order, 0, pure=False).result(timeout=60).done == 1
        assert (tmp_path / "imported").exists()
