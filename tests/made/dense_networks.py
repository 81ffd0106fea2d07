"""The network by dense algebra: every unknown of plain rows in one matrix, inverted as a whole.

The noise components are taken from a result under test; all else is built anew and shares nothing with the reduction.
"""

from dataclasses import dataclass

import numpy as np

HOUR = 3600.0


@dataclass
class Dense:
    """Gain of all unknowns from readings, ties and priors, and what the rows are."""

    used: list
    stations: list
    kinds: list
    at_rows: np.ndarray
    mean: np.ndarray
    whole: np.ndarray
    variance: np.ndarray
    values: np.ndarray
    gain: np.ndarray
    visit: np.ndarray
    n_ties: int

    def column(self, kind):
        return [n for n, one in enumerate(self.kinds) if one[0] == kind]


def ways_to_read(rows, orders, tares):
    """Unknowns of the border, their regressors at the used rows, and what is known of drift."""
    used = sorted((row for row in rows if row.use), key=lambda row: row.time)
    runs = sorted({row.run for row in used}, key=lambda run: min(row.time for row in used if row.run == run))
    first = {run: min(row.time for row in used if row.run == run) for run in runs}
    length = {run: max(row.time for row in used if row.run == run) - first[run] for run in runs}
    kinds, columns = [], []
    for run in runs:
        mine = np.array([row.run == run for row in used], dtype=float)
        kinds.append(("bias", run, 0))
        columns.append(mine)
        past = np.array([(row.time - first[row.run]) / HOUR for row in used])
        for power in range(1, orders[run] + 1):
            kinds.append(("drift", run, power))
            columns.append(mine * past**power)
    known = np.zeros(len(used))
    for number, tare in enumerate(tares):
        after = np.array([row.run == tare.run and row.time >= tare.time for row in used], dtype=float)
        if tare.size is not None and tare.size_sd is None:
            known += tare.size * after
        else:
            kinds.append(("tare", tare.run, number))
            columns.append(after)
    return used, runs, first, length, kinds, columns, known


def dense_network(rows, results, *, orders, instruments, tares=(), ties=None, drop=()):
    """The whole network by one singular value decomposition of its whitened design."""
    used, runs, first, length, kinds, columns, known = ways_to_read(rows, orders, tares)
    stations = list(results.stations.label)
    by_name = {one.name: one for one in instruments}
    for run in runs:
        if orders[run] == 0:
            rate = by_name[next(row.instrument for row in used if row.run == run)].drift_rate
            known = known + [rate * (row.time - first[run]) if row.run == run else 0.0 for row in used]
    at_station = np.array([[row.station == name for name in stations] for row in used], dtype=float)
    border = [n for n, kind in enumerate(kinds) if kind[0] not in drop]
    kinds = [("station", name, 0) for name in stations] + [kinds[n] for n in border]
    whole = np.column_stack([at_station, *(columns[n] for n in border)])
    visit, number, before = [], {}, {}
    for n, row in enumerate(used):
        last = before.get(row.run)
        if last is None or used[last].station != row.station or row.time - used[last].time > 900.0:
            number[row.run] = max(visit, default=-1) + 1
        visit.append(number[row.run])
        before[row.run] = n
    visit = np.array(visit)
    adjustment = results.network.adjustment
    index = {id(row): n for n, row in enumerate(rows)}
    by_row = np.full(len(rows), np.nan)
    by_row[adjustment.visits.rows] = adjustment.noise.sd
    e = by_row[[index[id(row)] for row in used]]
    seat_of = adjustment.reseating.variance[adjustment.visits.of_row[[index[id(row)] for row in used]]]
    mean = np.zeros((visit.max() + 1, len(used)))
    mean[visit, np.arange(len(used))] = 1.0 / e**2
    weight = mean.sum(axis=1)
    mean /= weight[:, None]
    seat = np.array([seat_of[visit == v][0] for v in range(len(mean))])
    design, variance, values = [mean @ whole], [1.0 / weight + seat], [mean @ ([row.reading for row in used] - known)]
    for name, (gravity, sd) in (ties or {}).items():
        design.append(np.array([[kind == ("station", name, 0) for kind in kinds]], dtype=float))
        variance.append([sd**2])
        values.append([gravity])
    for run in runs:
        meter = by_name[next(row.instrument for row in used if row.run == run)]
        powers = [(n, kind[2]) for n, kind in enumerate(kinds) if kind[:2] == ("drift", run)]
        if powers:
            line = np.zeros((1, len(kinds)))
            for n, power in powers:
                line[0, n] = (length[run] / HOUR) ** power / length[run]
            design.append(line)
            variance.append([meter.drift_rate_sd**2])
            values.append([meter.drift_rate])
    for n, kind in enumerate(kinds):
        if kind[0] == "tare" and tares[kind[2]].size is not None:
            design.append(np.eye(len(kinds))[n : n + 1])
            variance.append([tares[kind[2]].size_sd ** 2])
            values.append([tares[kind[2]].size])
    design, variance, values = np.vstack(design), np.concatenate(variance), np.concatenate(values)
    white = design / np.sqrt(variance)[:, None]
    scale = 1.0 / np.linalg.norm(white, axis=0)
    gain = scale[:, None] * np.linalg.pinv(white * scale, rcond=1e-11) / np.sqrt(variance)
    spread = np.zeros((len(values), len(used) + len(values) - len(mean)))
    spread[: len(mean), : len(used)] = mean
    spread[len(mean) :, len(used) :] = np.eye(len(values) - len(mean))
    known_values = np.concatenate([[row.reading for row in used] - known, values[len(mean) :]])
    one_v = np.zeros((spread.shape[1],) * 2)
    one_v[: len(used), : len(used)] = np.diag(e**2) + seat_of[:, None] * (visit[:, None] == visit)
    one_v[len(used) :, len(used) :] = np.diag(variance[len(mean) :])
    return Dense(
        used=used, stations=stations, kinds=kinds, at_rows=whole, mean=mean, whole=spread, variance=one_v,
        values=known_values, gain=gain @ spread, visit=visit, n_ties=len(ties or {}),
    ), known
