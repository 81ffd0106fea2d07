"""Runs that one station alone joins to the rest: named with what carries the join; well-joined runs stay silent."""

import numpy as np
import pytest

from plumbwell.study.docket.joins import _cut_stations
from plumbwell.study.tables import TABLES


def of_runs(invented, *stops):
    """Readings of runs a day apart, named "X1", "X2" and so on."""
    runs = [invented.visits(one, run=f"X{n + 1}", start=24.0 * n) for n, one in enumerate(stops)]
    return [row for rows in runs for row in rows]


def visits_of(results):
    """Rows of the table of visits."""
    columns = {one.name: one.values(results) for one in TABLES["visits"].columns}
    return [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]


def test_a_run_that_one_visit_joins_to_the_rest_is_named_with_that_visit(invented, found):
    results = invented.survey(of_runs(invented, "ABCDABCD", "EAE"))
    (one,) = found(results, "run_hangs_by_one")
    assert one.severity == "look" and one.stations == (0,) and one.place == "A, 20.0 m; run X2"
    assert one.text.startswith(
        "Run X2 is joined to the rest of the network through A alone, by 1 visit in it and 2 visits in the others: ± "
    )
    assert one.text.endswith(" A bad visit there shifts everything of run X2 and nothing would show it.")
    # The readings of that visit, and the sd that one visit and the mean of two have.
    own = [n for n, row in enumerate(visits_of(results)) if row["station"] == "A" and row["run"] == "X2"]
    assert one.rows == tuple(np.flatnonzero(np.isin(results.network.visits.of_row, own)).tolist())
    at = [row for row in visits_of(results) if row["station"] == "A"]
    assert len(at) == 3 and len({round(row["level_sd"], 9) for row in at}) == 1
    sd = float(one.text.split("± ")[1].split(" µGal")[0])
    assert sd == pytest.approx(at[0]["level_sd"] * 1000.0 * np.sqrt(1.5), abs=0.05)


def test_a_bad_visit_there_does_shift_the_whole_run_and_shows_nowhere(invented, found):
    """The word of the finding: the same survey with that visit 0.5 mGal off."""
    rows = of_runs(invented, "ABCBABCB", "EDEDADED")
    clean = invented.survey(rows)
    for row in rows:
        if row["run"] == "X2" and row["station"] == "A":
            row["reading [mGal]"] = f"{float(row['reading [mGal]']) + 0.5:.4f}"
    off = invented.survey(rows)
    assert found(clean, "run_hangs_by_one")[0].severity == "look"
    moved = (off.stations.gravity.values - clean.stations.gravity.values) / 1e-5
    assert off.stations.label == ("A", "B", "C", "D", "E")
    np.testing.assert_allclose(moved, [0.0, 0.0, 0.0, -0.5, -0.5], atol=1e-6)
    np.testing.assert_allclose(
        off.network.adjustment.solution.residual, clean.network.adjustment.solution.residual, atol=1e-12
    )


def test_a_base_that_each_run_reads_often_is_told_as_a_note(invented, found):
    results = invented.survey(of_runs(invented, "ABABCABC", "ADADEADE"))
    (one,) = found(results, "run_hangs_by_one")
    assert one.severity == "note"
    assert " through A alone, by 3 visits in it and 3 visits in the others" in one.text
    assert "A bad visit among them would show" in one.text and "would shift everything of it unseen." in one.text


def test_a_base_at_both_ends_whose_visits_only_bend_the_drift_wants_a_look(invented, found):
    # Two visits of the base and each station once: the drift of the run goes through both, whatever they read.
    results = invented.survey(of_runs(invented, "ABCBAB", "ADEA"))
    (one,) = found(results, "run_hangs_by_one")
    assert one.severity == "look" and "by 2 visits in it and 2 visits in the others" in one.text


def test_runs_that_share_two_stations_and_single_runs_stay_silent(invented, found):
    assert not found(invented.survey(of_runs(invented, "ABCDABCD", "ABEABE")), "run_hangs_by_one")
    assert not found(invented.survey(), "run_hangs_by_one")


def test_a_run_at_the_base_alone_has_nothing_to_shift(invented, found):
    assert not found(invented.survey(of_runs(invented, "ABCABCABC", "A")), "run_hangs_by_one")


def test_runs_that_share_none_are_parts_and_no_join(invented, found):
    results = invented.survey(of_runs(invented, "ABABAB", "DEDEDE"))
    assert found(results, "network_parts") and not found(results, "run_hangs_by_one")


def test_a_group_of_runs_is_named_together(invented, found):
    results = invented.survey(of_runs(invented, "ABCABCABCABC", "DEDEAD", "EDEDED"))
    (one,) = found(results, "run_hangs_by_one")
    assert one.place == "A, 20.0 m; runs X2 and X3" and one.severity == "look"
    assert one.text.startswith("Runs X2 and X3 are joined to the rest of the network through A alone, by 1 visit in ")


def tied(*labels):
    rows = [f"{name},{980000 + 10 * place}.0,0.010" for place, name in enumerate(labels)]
    return {"ties.csv": "\n".join(["station,gravity [mGal],gravity_sd [mGal]", *rows]) + "\n"}


def test_ties_join_all_tied_stations(invented, found):
    rows = of_runs(invented, "ABCABCABC", "DEDEAD")
    ties = {"data": 'ties = "ties.csv"', "files": tied("B", "E")}
    assert found(invented.survey(rows), "run_hangs_by_one")
    assert not found(invented.survey(rows, **ties), "run_hangs_by_one")


def test_a_run_that_a_tie_alone_joins_hangs_by_its_tied_station(invented, found):
    rows = of_runs(invented, "ABCABCABC", "DEDDE")
    results = invented.survey(rows, data='ties = "ties.csv"', files=tied("A", "E"))
    told = found(results, "run_hangs_by_one")
    assert [one.place for one in told] == ["A, 20.0 m; run X1", "E, 220.0 m; run X2"]
    assert all(" and its tie: ± " in one.text for one in told)


def test_cut_stations_are_those_whose_loss_parts_the_graph():
    """Against losing each node in turn, on random graphs of 8 stations, 5 runs and the ties."""
    chance = np.random.default_rng(12)
    parted = 0
    for _ in range(300):
        linked = chance.random((8, 6)) < 0.22
        joins = [[8 + run for run in np.flatnonzero(row).tolist()] for row in linked]
        joins += [np.flatnonzero(column).tolist() for column in linked.T]

        def pieces(lost, joins=joins):
            left, count = {node for node in range(14) if joins[node]} - {lost}, 0
            while left:
                waiting, count = [left.pop()], count + 1
                while waiting:
                    near = left.intersection(joins[waiting.pop()])
                    left -= near
                    waiting += near
            return count

        # What hangs on nothing but the lost station is a run left alone: it counts as a piece, and does so in both.
        whole = pieces(None)
        expected = [node for node in range(8) if joins[node] and pieces(node) > whole]
        assert _cut_stations(joins, 8) == expected
        parted += len(expected)
    assert parted > 100


TARE = '[[tare]]\nrun = "X1"\ntime = "2026-05-04T{}Z"\n'


def test_the_stretch_after_a_tare_that_one_visit_joins_is_named_with_its_times(invented, found):
    # Nothing but the visit of A at 09:10 tells how much the tare at 09:05 is.
    rows = of_runs(invented, "ABCABCADEDED")
    assert not found(invented.survey(rows), "run_hangs_by_one")
    rows = of_runs(invented, "ABCBCABDEDEAED")
    results = invented.survey(rows, tables=TARE.format("09:05:00"))
    (one,) = found(results, "run_hangs_by_one")
    assert one.severity == "look" and one.stations == (0,)
    assert one.place == "A, 20.0 m; run X1 from 2026-05-04 09:05:00 UTC on"
    assert one.text.startswith(
        "Run X1 from 2026-05-04 09:05:00 UTC on is joined to the rest of the network through A alone, by 1 visit in it"
    )
    at = [n for n, row in enumerate(visits_of(results)) if row["station"] == "A"]
    assert one.rows == tuple(np.flatnonzero(results.network.visits.of_row == at[-1]).tolist())


def test_a_bad_visit_after_the_tare_does_shift_that_whole_stretch(invented, found):
    rows = of_runs(invented, "ABCBCABDEDEAED")
    clean = invented.survey(rows, tables=TARE.format("09:05:00"))
    for row in rows:
        if row["station"] == "A" and row["time"] > "2026-05-04T09:05":
            row["reading [mGal]"] = f"{float(row['reading [mGal]']) + 0.5:.4f}"
    off = invented.survey(rows, tables=TARE.format("09:05:00"))
    moved = off.stations.gravity.values - clean.stations.gravity.values
    np.testing.assert_allclose(moved / 1e-5, [0.0, 0.0, 0.0, -0.5, -0.5], atol=1e-6)


@pytest.mark.parametrize("more", ["", "size = 0.1\nsize_sd = 0.01\n"])
def test_two_stations_or_a_stated_size_join_the_stretches(invented, found, more):
    stops = "ABCBCABDEDEAED" if more else "ABCBCABDEBEAED"
    results = invented.survey(of_runs(invented, stops), tables=TARE.format("09:05:00") + more)
    assert not found(results, "run_hangs_by_one")


def test_three_stretches_are_named_with_both_their_tares(invented, found):
    tables = TARE.format("08:55:00") + TARE.format("09:45:00")
    results = invented.survey(of_runs(invented, "ABABABADADACAC"), tables=tables)
    places = [one.place for one in found(results, "run_hangs_by_one")]
    assert sorted(places) == [
        "A, 20.0 m; run X1 from 2026-05-04 08:55:00 UTC to 2026-05-04 09:45:00 UTC",
        "A, 20.0 m; run X1 from 2026-05-04 09:45:00 UTC on",
    ]


def test_a_visit_that_the_tare_falls_into_joins_both_sides_of_it(invented, found):
    # A is read from 08:40 to 08:42; what the tare at 08:41 is its own readings tell.
    results = invented.survey(of_runs(invented, "BCBCADEDE"), tables=TARE.format("08:41:00"))
    (one,) = found(results, "run_hangs_by_one")
    assert one.place == "A, 20.0 m; run X1 from 2026-05-04 08:41:00 UTC on"
    assert " through A alone, by 1 visit in it and 1 visit in the others" in one.text
