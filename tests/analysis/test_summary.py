"""The summary's rows, on invented numbers."""

from __future__ import annotations

import numpy as np
import pytest
from synthetic import invented_sweep

from scanner.analysis import average_tables, failures, summarise
from scanner.analysis.summary import count_statuses, horizon_drift, largest_drift

SWEPT = {"amplitude": np.linspace(0.0, 0.12, 7).tolist(), "harmonic": [2, 3]}


def test_one_row_a_table_in_the_order_of_the_grid():
    tree = invented_sweep(SWEPT)
    rows = summarise(tree.to_dataset())
    assert len(rows) == 14
    assert rows.columns[:3].tolist() == ["amplitude", "harmonic", "table_status"]
    assert rows["harmonic"].tolist() == [2, 3] * 7
    row = rows[(rows["amplitude"] == SWEPT["amplitude"][3]) & (rows["harmonic"] == 3)].iloc[0]
    assert row["regular_volume_fraction"] == tree["regular_volume_fraction"].values[3, 1]
    assert row["table_status"] == "done"
    assert np.isnan(rows["lyapunov_per_bounce"][rows["table_status"] == "not_convex"]).all()


def test_drift_is_the_quarter_less_the_whole():
    root = invented_sweep(SWEPT).to_dataset()
    by_horizon = root["regular_area_fraction_by_horizon"].values
    np.testing.assert_array_equal(horizon_drift(root).values, by_horizon[..., 1] - by_horizon[..., 3])
    assert "2048 bounces" in horizon_drift(root).attrs["long_name"]
    assert largest_drift(root) == pytest.approx(np.nanmax(abs(by_horizon[..., 1] - by_horizon[..., 3])), rel=1e-15)


def test_a_study_of_one_table_is_one_row():
    rows = summarise(invented_sweep({}).to_dataset())
    assert len(rows) == 1
    assert rows.columns[0] == "table_status"


def test_averages_say_how_many_tables_stand_behind_them():
    rows = summarise(average_tables(invented_sweep(SWEPT).to_dataset(), ["harmonic"]))
    assert rows["tables_averaged"].tolist()[:2] == [2, 2]


def test_failures_are_those_that_failed_or_are_not_convex():
    root = invented_sweep(SWEPT).to_dataset()
    root["table_status"].values[0, 1] = 3
    root["table_status"].values[1, 1] = 0
    rows = failures(root, {(0, 1): "it would not close"})
    assert rows.iloc[0].tolist() == [0.0, 3, "failed", "it would not close"]
    assert set(rows["reason"][1:]) == {""}
    assert set(rows["table_status"]) == {"failed", "not_convex"}
    counts = count_statuses(root)
    assert counts["pending"] == counts["failed"] == 1
    assert sum(counts.values()) == 14
    assert len(rows) == counts["failed"] + counts["not_convex"]


def test_a_single_table_that_failed_is_listed_with_its_reason():
    root = invented_sweep({}).to_dataset()
    root["table_status"].values[()] = 3
    assert failures(root, {(): "it would not close"}).iloc[0].tolist() == ["failed", "it would not close"]
