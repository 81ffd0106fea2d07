"""Makes the tables of the two invented sample surveys, and their truth, the same to the last byte each time.

    python sample_surveys/make_samples.py [FOLDER]

survey.toml and README.md of each are written by hand and left alone.
Normal gravity and tide come from `plumbwell.earth`. Gravity in the rock does not: a column of layers is
summed exactly here, d(delta r2)/dr = 4 pi G rho r2 layer by layer, and the path of the well is integrated
in short steps, so that the reduction has something of other make to be measured against. Everything that
is a place, a rock or an instrument in here is invented.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path

import numpy as np

from plumbwell.earth.normal_gravity import gravity_at_height
from plumbwell.earth.tide import tide_correction

G = 6.67430e-11  # m3 kg-1 s-2
SEMI_MAJOR, E2 = 6378137.0, 0.00669437999014  # WGS84
MGAL = 1e-5
EPOCH = datetime(2000, 1, 1, tzinfo=UTC)
INVENTED = (
    "# Invented data of a sample survey: no such place, rock or instrument."
    " Made by sample_surveys/make_samples.py.\n"
)
SENSOR_LEVEL = "# Elevations are those of the sensor.\n"
PLACES_HEADING = "station,east [m],north [m],elevation [m],elevation_sd [m],role,note\n"


def radii(latitude: float) -> tuple[float, float]:
    """Radii of curvature of the ellipsoid along the meridian and across it, m."""
    w = np.sqrt(1.0 - E2 * np.sin(latitude) ** 2)
    return SEMI_MAJOR * (1.0 - E2) / w**3, SEMI_MAJOR / w


@dataclass(frozen=True)
class Rock:
    """A site with its layers: `top` and `base` are depths below the ground, m, `density` g/cm3."""

    latitude: float
    longitude: float
    ground: float
    geoid: float
    anomaly: float  # mGal at the ground
    top: np.ndarray
    base: np.ndarray
    density: np.ndarray

    def radius(self, elevation):
        """Distance from the centre of curvature of the level surface at the collar, m."""
        meridian, across = radii(self.latitude)
        return 2.0 / (1.0 / meridian + 1.0 / across) + self.geoid + np.asarray(elevation, dtype=float)

    def pull(self, upper, lower):
        """Integral of rho r2 dr between two elevations, kg/m3 m3; there is no rock above the ground."""
        from_r = self.radius(np.maximum(lower, self.ground - self.base))
        to_r = self.radius(np.minimum(upper, self.ground - self.top))
        return np.sum(1000.0 * self.density * np.maximum(to_r**3 - from_r**3, 0.0)) / 3.0

    def mean(self, upper, lower):
        """Mean density between two elevations, weighted by r3, g/cm3: what an interval density is."""
        return 3.0 * self.pull(upper, lower) / (self.radius(upper) ** 3 - self.radius(lower) ** 3) / 1000.0

    def at(self, depth):
        """Density at depths below the ground, g/cm3."""
        return self.density[np.clip(np.searchsorted(self.base, depth), 0, len(self.base) - 1)]

    def place(self, east, north, elevation):
        """Latitude and longitude, rad, and height above the ellipsoid, m."""
        meridian, across = radii(self.latitude)
        height = elevation + self.geoid
        longitude = self.longitude + east / ((across + height) * np.cos(self.latitude))
        return self.latitude + north / (meridian + height), longitude, height

    def gravity(self, east, north, elevation):
        """Gravity at a position from the collar, mGal, without the tide."""
        latitude, _, height = self.place(east, north, elevation)
        r, ground = self.radius(elevation), self.radius(self.ground)
        delta = self.anomaly * MGAL * ground**2 - 4.0 * np.pi * G * self.pull(self.ground, elevation)
        return float(gravity_at_height("WGS84", latitude=latitude, height=height) + delta / r**2) / MGAL

    def tide(self, utc: datetime, position) -> float:
        """Tide correction, mGal, to be added to a reading."""
        latitude, longitude, height = self.place(*position)
        seconds = np.array([(utc - EPOCH).total_seconds()])
        position = {"latitude": latitude, "longitude": longitude, "height": height}
        return float(np.ravel(tide_correction(seconds, **position, factor=1.16))[0]) / MGAL


def beds(chance, formations, thickness: tuple[float, float], scatter: float):
    """Tops, bases and densities of thin beds that scatter about the density of each formation."""
    edges, density = [0.0], []
    for base, rho in formations:
        while edges[-1] < base:
            step = chance.uniform(*thickness)
            edges.append(base if base - edges[-1] < 1.6 * step else edges[-1] + step)
            density.append(rho + scatter * chance.standard_normal())
    return np.array(edges[:-1]), np.array(edges[1:]), np.round(np.array(density), 4)


@dataclass
class Meter:
    """An invented gravimeter on one trip: what it adds to gravity, all in mGal and hours."""

    rate: float
    bias: float
    reading_sd: float
    reseating_sd: float
    tare_time: datetime | None = None
    tare: float = 0.0
    start: datetime | None = field(default=None)

    def added(self, utc: datetime) -> float:
        """Bias, drift and tare at a time; the clock of the drift starts at the first call."""
        self.start = self.start or utc
        jump = self.tare if self.tare_time is not None and utc >= self.tare_time else 0.0
        return self.bias + self.rate * (utc - self.start).total_seconds() / 3600.0 + jump


class Truth:
    """Rows of truth.csv."""

    def __init__(self, seed: int) -> None:
        self.rows = [INVENTED, "kind,name,to,value,unit,note\n"]
        self.add("seed", "numpy RandomState", "", str(seed), "", "stream kept fixed by numpy for good")

    def add(self, kind, name, to, value, unit, note="") -> None:
        """One row."""
        self.rows.append(f"{kind},{name},{to},{value},{unit},{note}\n")

    def meter(self, run: str, meter: Meter) -> None:
        """What a meter did on a run."""
        self.add("drift_rate", run, "", f"{meter.rate:.4f}", "mGal/h", "from the first reading of the run")
        self.add("run_bias", run, "", f"{meter.bias:.6f}", "mGal", "reading less gravity at the start")
        if meter.tare_time is not None:
            self.add("tare", run, "", f"{meter.tare:.4f}", "mGal", stamp(meter.tare_time))
        self.add("reading_noise", run, "", f"{meter.reading_sd:.4f}", "mGal", "sd of one reading")
        self.add("reseating_noise", run, "", f"{meter.reseating_sd:.4f}", "mGal", "sd shared within a visit")

    def column(self, rock: Rock, stations) -> None:
        """Gravity of stations and density of intervals; `stations` is (label, stated and true position)."""
        for label, _, true in stations:
            self.add("station", label, "", f"{rock.gravity(*true):.5f}", "mGal", "at the true position")
        note = "r3-weighted mean of the beds between the stated depths"
        for (upper, above, _), (lower, below, _) in zip(stations[:-1], stations[1:], strict=True):
            self.add("interval", upper, lower, f"{rock.mean(above[2], below[2]):.6f}", "g/cm3", note)
        for top, base, rho in zip(rock.top, rock.base, rock.density, strict=True):
            self.add("bed", f"{top:.3f}", f"{base:.3f}", f"{rho:.4f}", "g/cm3", "m below the ground")


def stamp(utc: datetime, hours: int = 0) -> str:
    """A time as written: UTC with Z, or local time with its offset."""
    local = utc.astimezone(timezone(timedelta(hours=hours)))
    return local.strftime("%Y-%m-%dT%H:%M:%S") + (f"+{hours:02d}:00" if hours else "Z")


def write(folder: Path, name: str, text: str) -> None:
    """A file with plain line ends whatever the system."""
    folder.mkdir(parents=True, exist_ok=True)
    (folder / name).write_bytes(text.encode("utf-8"))


# ---------------------------------------------------------------- Tolly Bank, a well

WELL_SEED = 20260512
WELL_DATUM = 5.2  # m above the ground
FORMATIONS = (  # name, base in m below the ground, g/cm3, whether its density is stated in markers.csv
    ("Brackle Till", 38.0, 2.02, True),
    ("Ossen Sand", 150.0, 2.08, True),
    ("Pellby Clay", 372.0, 2.17, False),
    ("Hobb Marl", 566.0, 2.29, True),
    ("Sallowick Limestone", 768.0, 2.58, True),
    ("Tethering Mudstone", 1010.0, 2.44, False),
    ("Vennock Sandstone", 1278.0, 2.33, True),
    ("Old Tolly Conglomerate", 1480.0, 2.56, True),
)


def well_path():
    """Deviation survey as written (m, deg, deg): built up from 390 m, then held, turning a little."""
    depth = np.append(np.arange(0.0, 1441.0, 30.0), 1450.0)
    inclination = np.interp(depth, [0.0, 390.0, 810.0, 1450.0], [0.25, 0.45, 24.6, 25.3])
    azimuth = np.interp(depth, [0.0, 390.0, 1450.0], [96.0, 112.0, 127.0])
    wobble = np.sin(depth / 37.0)
    inclination, azimuth = inclination + 0.12 * wobble**2, azimuth + 0.6 * wobble
    return np.column_stack([depth, np.round(inclination, 2), np.round(azimuth, 2)])


def well_positions(path):
    """Depths m and (east, north, tvd) m along the hole: the tangent turns evenly between survey points."""
    step = 0.05
    direction = np.radians(path[:, 1:])
    tangent = np.column_stack([
        np.sin(direction[:, 0]) * np.sin(direction[:, 1]),
        np.sin(direction[:, 0]) * np.cos(direction[:, 1]),
        np.cos(direction[:, 0]),
    ])
    depths, places = [np.zeros(1)], [np.zeros((1, 3))]
    for row in range(len(path) - 1):
        length = path[row + 1, 0] - path[row, 0]
        angle = np.arccos(np.clip(tangent[row] @ tangent[row + 1], -1.0, 1.0))
        count = int(round(length / step))
        part = ((np.arange(count) + 0.5) / count)[:, None]
        turned = tangent[row] * (1.0 - part) + tangent[row + 1] * part
        if angle > 1e-9:
            turned = tangent[row] * np.sin((1.0 - part) * angle) + tangent[row + 1] * np.sin(part * angle)
        turned /= np.linalg.norm(turned, axis=1)[:, None]
        places.append(places[-1][-1] + np.cumsum(turned, axis=0) * (length / count))
        depths.append(path[row, 0] + length * np.arange(1, count + 1) / count)
    return np.concatenate(depths), np.concatenate(places)


def well_log(chance, rock: Rock, hole) -> str:
    """A density log in LAS 2.0: true beds, noise, a small bias, and one washed-out zone in the mudstone."""
    depth = np.round(np.arange(10.05, 1448.0, 0.15), 2)
    tvd = np.interp(depth, hole[0], hole[1][:, 2])
    washed = np.exp(-(((depth - 858.0) / 11.0) ** 4)) * (0.7 + 0.3 * np.sin(depth / 1.9) ** 2)
    density = rock.at(tvd - WELL_DATUM) + 0.004 + 0.018 * chance.standard_normal(len(depth)) - 0.21 * washed
    correction = 0.010 + 0.006 * chance.standard_normal(len(depth)) + 0.13 * washed
    caliper = 216.5 + 1.6 * chance.standard_normal(len(depth)) + 118.0 * washed
    head = f"""~Version
VERS. 2.0 : LAS 2.0
WRAP. NO  : one line a depth
~Well
STRT.M {depth[0]:.2f} : first depth
STOP.M {depth[-1]:.2f} : last depth
STEP.M 0.15 : step
NULL. -999.25 : no value
WELL. TOLLY BANK (INVENTED) : well
COMP. INVENTED : company
LOC . NO SUCH PLACE : location
FLD . TOLLY BANK : field
CTRY. NONE : country
SRVC. INVENTED : service company
UWI . NONE : well number
DATE. 2026-04-27 : date
~Curve
DEPT.M : measured depth from the rig floor
RHOB.G/CM3 : bulk density
DRHO.G/CM3 : density correction
CALI.MM : caliper
~Other
Invented data of a sample survey. Made by sample_surveys/make_samples.py.
~A  DEPT    RHOB    DRHO    CALI
"""
    rows = zip(depth, density, correction, caliper, strict=True)
    return head + "".join(f"{d:8.2f} {rho:7.4f} {drho:7.4f} {cali:7.1f}\n" for d, rho, drho, cali in rows)


def calibration_table():
    """Counter and mGal of the invented instrument: about 0.87 mGal a count, the factor changing smoothly."""
    counter = np.arange(1500.0, 3501.0, 50.0)
    x = (counter - 2500.0) / 1000.0
    factor = 0.8731 + 0.0016 * x - 0.0009 * x**2 + 0.0003 * np.sin(3.7 * x)
    steps = 50.0 * 0.5 * (factor[1:] + factor[:-1])
    return counter, np.round(1310.0 + np.concatenate([[0.0], np.cumsum(steps)]), 3)


def well_marks(hole):
    """Marked depths of stations: the sensor on each formation's base, some between, and near both ends."""
    edges = [14.0, *(base + WELL_DATUM for _, base, _, _ in FORMATIONS[:-1]), 1372.0]
    spacing = [24.0, 22.0, 37.0, 28.0, 23.0, 34.0, 27.0, 18.0]
    depth = np.interp(edges, hole[1][:, 2], hole[0]) + 0.62
    marks = [depth[0]]
    for upper, lower, wanted in zip(depth[:-1], depth[1:], spacing, strict=True):
        count = max(1, round((lower - upper) / wanted))
        for part in range(1, count + 1):
            marks.append(upper + (lower - upper) * part / count)
            if part < count:
                marks[-1] = round(marks[-1] + 0.12 * wanted * np.sin(2.1 * len(marks)))
    return np.round(marks, 1)


def well_plan(count: int) -> dict[str, list[str]]:
    """Stops of the three runs: down the upper half, down the lower half, and a second pass upward."""
    name = [f"TB-{number:02d}" for number in range(1, count + 1)]
    upper, lower = name[9], name[count // 2 + 6]
    down = [[], []]
    for half, (part, repeat) in enumerate(((name[: count // 2], upper), (name[count // 2 :], lower))):
        for number, label in enumerate(part, start=1):
            down[half].append(label)
            if number % 5 == 0 and number > 7 + 5 * half and label != repeat:
                down[half].append(repeat)
    back = []
    for number, label in enumerate(reversed(name), start=1):
        if number % 4 != 0 or label in (upper, lower):
            back.append(label)
        if number % 9 == 0 and back[-1] not in (upper, lower):
            back.append(lower if number < count * 0.6 else upper)
    return {
        "1": ["HUT", *down[0], upper, "HUT"],
        "2": ["HUT", upper, *down[1], lower, upper, "HUT"],
        "3": ["HUT", upper, *back, "HUT"],
    }


def tolly_bank(folder: Path, seed: int = WELL_SEED) -> None:
    """Writes the well survey."""
    chance = np.random.RandomState(seed)  # its streams never change between versions of numpy
    path = well_path()
    hole = well_positions(path)
    top, base, density = beds(chance, [(base, rho) for _, base, rho, _ in FORMATIONS], (3.0, 9.0), 0.022)
    rock = Rock(np.radians(55.2140), np.radians(-2.4630), 226.40, 51.3, 11.437, top, base, density)

    def at(depth):
        east, north, tvd = (float(np.interp(depth, hole[0], hole[1][:, axis])) for axis in range(3))
        return east, north, rock.ground + WELL_DATUM - tvd

    marks = well_marks(hole)
    missed = 0.04 * chance.standard_normal(len(marks))
    stations = [
        (f"TB-{number:02d}", at(mark - 0.62), at(mark - 0.62 + miss))
        for number, (mark, miss) in enumerate(zip(marks, missed, strict=True), start=1)
    ]
    hut = (14.20, -8.60, 227.32)
    true = {label: position for label, _, position in stations} | {"HUT": hut}
    mark_of = {label: f"{mark:.1f}" for (label, _, _), mark in zip(stations, marks, strict=True)}
    counter, table = calibration_table()
    bias = 2130.0 - rock.gravity(*hut)
    tare_time = datetime(2026, 5, 13, 9, 19, tzinfo=UTC)
    meters = {
        "1": Meter(0.0184, bias, 0.003, 0.004),
        "2": Meter(0.0247, bias + 0.231, 0.003, 0.004, tare_time, -0.043),
        "3": Meter(0.0121, bias + 0.418, 0.003, 0.004),
    }
    starts = {run: datetime(2026, 5, 11 + int(run), 5, 40, tzinfo=UTC) for run in meters}
    heading = "time,run,station,depth [m],sensor_offset [m],reading [counts],pressure [hPa],use,note\n"
    rows = [INVENTED, heading]

    def row(utc, run, label, seating, knock=0.0):
        meter = meters[run]
        hours = (utc - starts["1"]).total_seconds() / 3600.0
        air = 986.2 + 3.1 * np.sin(hours / 11.0 + 0.4) + 0.4 * np.sin(hours / 2.3)
        standard = 1013.25 * (1.0 - 0.0065 * 227.90 / 288.15) ** 5.2559
        value = rock.gravity(*true[label]) - rock.tide(utc, true[label]) - 0.0003 * (air - standard)
        value += meter.added(utc) + seating + meter.reading_sd * chance.standard_normal() + knock
        count = np.interp(value, table, counter)
        depth, offset = (mark_of[label], "0.62") if label in mark_of else ("", "0.00")
        use, note = ("no", "knocked by the winch; read again") if knock else ("yes", "")
        rows.append(f"{stamp(utc, 1)},{run},{label},{depth},{offset},{count:.3f},{air:.1f},{use},{note}\n")

    for run, stops in well_plan(len(marks)).items():
        utc = starts[run]
        seen: set[str] = set()
        for number, label in enumerate(stops):
            seating = meters[run].reseating_sd * chance.standard_normal()
            for again in range(5 if label == "HUT" else 4 if label in seen else 3):
                if run == "3" and number == 21 and again == 1:
                    row(utc, run, label, seating, knock=0.137)
                    utc += timedelta(seconds=int(chance.randint(80, 100)))
                row(utc, run, label, seating)
                utc += timedelta(seconds=int(chance.randint(80, 100)))
            seen.add(label)
            after = stops[min(number + 1, len(stops) - 1)]
            if "HUT" in (label, after):
                utc += timedelta(seconds=int(chance.randint(1500, 1900)))
            else:
                way = abs(float(mark_of[after]) - float(mark_of[label]))
                utc += timedelta(seconds=int(170 + way / 0.7 + chance.randint(0, 40)))

    tie_error = 0.004 * chance.standard_normal()
    truth = Truth(seed)
    for run, meter in meters.items():
        truth.meter(run, meter)
    truth.add("depth_error", "all", "", "0.04", "m", "sd of a station's mark; positive is deeper than marked")
    for (label, _, _), miss in zip(stations, missed, strict=True):
        truth.add("depth_error", label, "", f"{miss:.4f}", "m", "along the hole")
    truth.add("station", "HUT", "", f"{rock.gravity(*hut):.5f}", "mGal", "base in the site hut")
    truth.add("tie_error", "HUT", "", f"{tie_error:.4f}", "mGal", "stated less true")
    truth.column(rock, stations)

    names = [name for name, _, _, _ in FORMATIONS]
    tops = [0.0, *(base for _, base, _, _ in FORMATIONS[:-1])]
    marker_depths = np.interp(np.array(tops) + WELL_DATUM, hole[1][:, 2], hole[0])
    markers = [
        f"{name},{depth:.1f},{f'{rho:.2f}' if stated else ''}\n"
        for name, depth, (_, _, rho, stated) in zip(names, marker_depths, FORMATIONS, strict=True)
    ]
    write(folder, "readings.csv", "".join(rows))
    hut_row = f"HUT,{hut[0]:.2f},{hut[1]:.2f},{hut[2]:.2f},0.005,base,pier in the site hut\n"
    write(folder, "places.csv", INVENTED + SENSOR_LEVEL + PLACES_HEADING + hut_row)
    write(folder, "ties.csv", INVENTED + "station,gravity [mGal],gravity_sd [mGal]\n"
          f"HUT,{rock.gravity(*hut) + tie_error:.3f},0.004\n")
    write(folder, "path.csv", INVENTED + "depth [m],inclination [deg],azimuth [deg]\n"
          + "".join(f"{depth:.1f},{inclination:.2f},{azimuth:.2f}\n" for depth, inclination, azimuth in path))
    write(folder, "markers.csv", INVENTED + "marker,depth [m],density [g/cm3]\n" + "".join(markers))
    write(folder, "calibration_A.csv", INVENTED + "counter [counts],gravity [mGal]\n"
          + "".join(f"{count:.0f},{gravity:.3f}\n" for count, gravity in zip(counter, table, strict=True)))
    write(folder, "open_hole.las", well_log(chance, rock, hole))
    write(folder, "truth.csv", "".join(truth.rows))


# ---------------------------------------------------------------- Quernlow, a shaft

SHAFT_SEED = 3
LEVELS = (  # label, m below the bank, east and north of the shaft's centre, m, role, note
    ("L01", 38.46, 3.10, 1.20, "column", "first landing"),
    ("L02", 96.13, 2.80, 0.90, "column", "landing"),
    ("L03", 158.72, 24.60, -7.30, "column", "old pump gallery; 26 m from the shaft"),
    ("L04", 214.95, 3.00, 1.10, "column", "landing"),
    ("L05", 279.38, 2.90, 1.00, "column", "landing"),
    ("L06", 338.07, -31.40, 22.10, "column", "north-west gallery; 38 m from the shaft"),
    ("L07", 402.66, 3.10, 1.00, "column", "landing"),
    ("L08", 471.20, 2.70, 1.30, "column", "landing"),
    ("L09", 540.84, 51.80, 16.50, "column", "east gallery; 54 m from the shaft"),
    ("L10", 618.29, 3.00, 0.80, "column", "lowest landing"),
)
BANK = ("BANK", -0.42, -18.40, 11.70, "base", "floor of the winding house")
SHAFT_ROCK = (
    (96.0, 2.64), (214.0, 2.71), (279.5, 2.83), (402.5, 2.74), (471.0, 2.91), (541.0, 2.79), (700.0, 2.70),
)


def quernlow(folder: Path, seed: int = SHAFT_SEED) -> None:
    """Writes the shaft survey."""
    chance = np.random.RandomState(seed)
    top, base, density = beds(chance, SHAFT_ROCK, (6.0, 18.0), 0.02)
    rock = Rock(np.radians(47.3820), np.radians(9.1170), 512.80, 48.2, -14.62, top, base, density)
    stations, true = [], {"BANK": (BANK[2], BANK[3], rock.ground - BANK[1])}
    missed = 0.01 * chance.standard_normal(len(LEVELS))
    for (label, depth, east, north, _, _), miss in zip(LEVELS, missed, strict=True):
        stated, true[label] = rock.ground - depth, (east, north, rock.ground - depth - miss)
        stations.append((label, (east, north, stated), true[label]))
    names = [label for label, *_ in LEVELS]
    meters = {"1": Meter(0.0342, 4210.0 - rock.gravity(*true["BANK"]), 0.005, 0.005)}
    meters["2"] = Meter(0.0269, meters["1"].bias + 0.664, 0.005, 0.005)
    plan = {
        "1": ["BANK", *names, *names[-3::-2], "BANK"],
        "2": ["BANK", *names[1::2], *names[-2::-1], "BANK"],
    }
    rows = [INVENTED, "time,run,station,reading [mGal],tilt_x [arcsec],tilt_y [arcsec],temperature [degC]\n"]
    for run, stops in plan.items():
        meter = meters[run]
        utc = datetime(2026, 3, 2 + int(run), 7, 4, tzinfo=UTC)
        for label in stops:
            seating = meter.reseating_sd * chance.standard_normal()
            tilt = 5.0 * chance.standard_normal(2)
            for _ in range(3):
                x, y = tilt + 1.2 * chance.standard_normal(2)
                flat = np.cos(np.radians(x / 3600.0)) * np.cos(np.radians(y / 3600.0))
                value = rock.gravity(*true[label]) - rock.tide(utc, true[label]) - 980_700.0 * (1.0 - flat)
                value += meter.added(utc) + seating + meter.reading_sd * chance.standard_normal()
                warm = 14.0 + 0.01 * (rock.ground - true[label][2]) + 0.1 * chance.standard_normal()
                rows.append(f"{stamp(utc)},{run},{label},{value:.3f},{x:.1f},{y:.1f},{warm:.1f}\n")
                utc += timedelta(seconds=int(chance.randint(85, 110)))
            utc += timedelta(seconds=int(chance.randint(420, 780)))
    truth = Truth(seed)
    for run, meter in meters.items():
        truth.meter(run, meter)
    truth.add("depth_error", "all", "", "0.01", "m", "sd of a level; positive is deeper than surveyed")
    for label, miss in zip(names, missed, strict=True):
        truth.add("depth_error", label, "", f"{miss:.4f}", "m")
    truth.add("station", "BANK", "", f"{rock.gravity(*true['BANK']):.5f}", "mGal", "base")
    truth.column(rock, stations)
    places = []
    for label, depth, east, north, role, note in (BANK, *LEVELS):
        sd = "0.005" if role == "base" else "0.010"
        places.append(f"{label},{east:.2f},{north:.2f},{rock.ground - depth:.2f},{sd},{role},{note}\n")
    write(folder, "readings.csv", "".join(rows))
    write(folder, "places.csv", INVENTED + SENSOR_LEVEL + PLACES_HEADING + "".join(places))
    write(folder, "truth.csv", "".join(truth.rows))


def main(folder: Path) -> None:
    """Writes both surveys into folders of their own under `folder`."""
    tolly_bank(folder / "tolly_bank_well")
    quernlow(folder / "quernlow_shaft")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
