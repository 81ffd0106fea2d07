"""The real window about a survey whose drift the readings leave open: stations without gravity in every stage."""

from __future__ import annotations

import numpy as np
import pytest

from invented_surveys import Invented
from plumbwell.desk.stages import states
from plumbwell.desk.stages.depth_tracks import reduction_tracks
from plumbwell.desk.stages.time_series import drift_plots

TARES = '[[tare]]\nrun = "1"\ntime = "2026-05-04T08:33:00Z"\n[[tare]]\nrun = "1"\ntime = "2026-05-04T08:33:30Z"\n'


@pytest.mark.parametrize(("order", "tables"), [(3, ""), (1, TARES)], ids=["a bent drift", "two tares in one gap"])
def test_what_the_readings_leave_open_is_shown_in_every_stage(driven, tmp_path, order, tables):
    invented = Invented(tmp_path / "survey")
    invented.folder.mkdir()
    rows = invented.visits("ABCDE") + invented.visits("ABABAB", run="2", start=5.0)
    window = driven()
    window.open(invented.written(rows, recipe=f'tide = "none"\ndrift_order = {order}', tables=tables))
    results = window.document.results
    assert "rank_lost" in [one.code for one in results.findings]
    without = np.isnan(results.stations.gravity.values)
    assert without.tolist() == [False, False, order == 3, order == 3, order == 3]
    for stage in states.STAGES:
        window.stage(stage)
        window.picture(tmp_path / f"{stage}.png")
    first = next(panel for panel in drift_plots(window.work.shown)[0].panels if "1" in panel.name)
    assert bool(first.lines) == (order == 1)
    bars = next(track.bars for track in reduction_tracks(window.work.shown, 1) if track.bars)
    # A datum has no sd, and with two tares E is one.
    has_sd = results.stations.gravity_sd.values > 0.0
    assert [bar.depth for bar in bars] == results.stations.located.mark_depth.values[has_sd].tolist()
    assert has_sd.tolist() == [False, True, order == 1, order == 1, False]
    densities = window.strip_densities
    assert [one is None or np.isnan(one) for one in densities] == np.isnan(results.intervals.density.values).tolist()
