"""A commented survey folder to start from: small, invented, and reducible as it stands.

Every key and column is explained where it stands, with its unit and its choices.
"""

from __future__ import annotations

from pathlib import Path

from plumbwell.files.output_folder import UnfitTarget, output_folder, write_texts
from plumbwell.survey.errors import shown

SURVEY_TOML = """\
# A survey folder for Plumbwell. Everything in it is INVENTED: replace it by your own.
# Lines that start with # are comments. Keys that are commented out show their default.
#   plumbwell check FOLDER                reads it and says what wants your eye
#   plumbwell reduce FOLDER --out DIR     writes tables, summary, LAS file and figure into DIR
format = "plumbwell-survey/1"

[site]
name = "Hollow Reach 1 (invented)"
latitude = 51.3170          # deg, geodetic, WGS84, north positive
longitude = 6.0480          # deg, east positive
ground_elevation = 64.20    # m above sea level: ground above the collar; rock counts from it
collar_elevation = 64.20    # m above sea level: where the hole starts; depth and path count from it
depth_datum_height = 1.10   # m, height above the collar of the depth datum, the point from which depth is
                            # measured (rig floor, top of casing)
geoid_height = 46.0         # m, ellipsoidal height less elevation
# water_depth = 0.0         # m of sea or lake above the ground at the collar
north = "true"              # of azimuths in path.csv: "true", "grid" or "magnetic"
# north_correction = 0.0    # deg, added to azimuths; needed with "grid" and "magnetic"

[instrument.A]              # as many as were used; the column `instrument` of readings.csv names one
kind = "gravimeter"
applied = []                # what readings hold already: "tide", "tilt", "temperature", "pressure", "drift"
# scale = 1.0               # factor on every reading
# scale_sd = 0.0            # its standard deviation
# clock_ahead = 0.0         # s, instrument clock less UTC
# reading_floor = 0.002     # mGal, no single reading is believed better
# reseating_sd = 0.003      # mGal, how well a reading comes back when the instrument is set up anew at the
                            # same place (re-seating); used where the survey cannot tell it
# station_floor = 0.001     # mGal, no station is believed better
drift_rate = 0.02           # mGal/h expected; drift is the slow change of the reading while gravity stays
drift_rate_sd = 0.02        # mGal/h, how far a run's mean drift rate may be from it

# An instrument whose readings are counts of a dial or counter needs its calibration table:
# [instrument.B]
# kind = "gravimeter"
# calibration = "calibration_B.csv"   # in this folder, straight from row to row. Its lines are like
#                                     #   counter [counts],gravity [mGal]
#                                     #   3000,3164.12
#                                     #   3100,3269.57
# and the column of readings.csv is then reading [counts] instead of reading [mGal].

[[run]]                     # one trip of the instrument; optional
name = "1"                  # as in the column `run` of readings.csv
instrument = "A"
# depth_shift = 0.0         # m, added to every depth of the run
# drift_order = "auto"      # 0, 1, 2, 3 or "auto"; over the recipe's

# [[tare]]                  # tare: a sudden jump of the instrument's zero (a knock) that you know of
# run = "1"
# time = "2026-09-14T09:12:00Z"   # it counts from the first reading at or after this time; size and size_sd
#                                 # in mGal where they are known, else the survey finds them

[data]                      # a file that is named must be there; remove a line for what you do not have
readings = "readings.csv"
places = "places.csv"
path = "path.csv"
markers = "markers.csv"     # its densities act only with reference_density = "markers", far below
# ties = "ties.csv"         # station, gravity [mGal], gravity_sd [mGal]: makes gravity absolute
time_zone = "UTC"           # of times written without a zone: "UTC", an offset such as "+01:00", or the name
                            # of a place such as "Europe/Oslo" for a watch that shows local time, summer time
                            # included. A local time that the change of the clocks gives twice or never is
                            # refused: write those rows with their offset, 2026-10-25T02:30:00+02:00
barometer_elevation = 65.30 # m above sea level, or "station" when the barometer goes down with the tool

# [[log]]                   # a density log to compare with
# file = "open_hole.las"    # LAS 2.0, or CSV with a column of depth
# density = "RHOB"          # its curve

[recipe]                    # how readings become densities
depth_sd = 0.03             # m, of a station's depth, independent between stations
reference_density = "markers"  # g/cm3 of the rock between ground and station; "markers": as in markers.csv
# normal_gravity = "WGS84"  # "WGS84", "GRS80", "GRS67" or "1930"
# height_form = "closed"    # "closed" or "series"
# free_air = "normal"       # "normal", or { gradient = 0.3072, sd = 0.0004 } in mGal/m, when measured
# gradient_sd = 0.0005      # mGal/m, of the normal gradient as a model of the local one
# tide = "ephemeris"        # "ephemeris", "longman", "table" (then tide = "tide.csv" in [data]) or "none"
# tide_factor = 1.16        # on the tide of a rigid Earth
# pressure_admittance = -0.3   # uGal/hPa
# drift_order = "auto"      # "auto", 0, 1, 2 or 3: order of the polynomial in time that is each run's drift
# drift_walk = "auto"       # slow wander of the drift beyond its polynomial: "auto" keeps it where the readings
                            # ask for it, "off", "on", or its strength in mGal/h^1.5
# tares = "listed"          # jumps taken out: only those of [[tare]], or "proposed": those that are found too
# outliers = "flag"         # readings that do not fit: "flag" names and keeps them; "downweight"; "exclude"
# scale_factor = "given"    # or "estimate": from two ties or more in ties.csv
# noise = "estimate"        # "estimate" from the survey, or "as_given" by the instrument
# datum_station = "D1"      # datum: the station where relative gravity is 0; default: the column's highest
# datum_sd = 50             # mGal, of the unknown absolute level, used only without a tie
# depth_scale_sd = 0        # relative sd of the depth scale, common to all intervals
# same_place = 0.25         # m, readings nearer to one another are one station
# min_thickness = 0.5       # m, stations nearer to one another make no interval
# visit_gap = 15            # min; a visit is a series of readings at one place without moving the instrument;
                            # a longer pause ends it
# layers = "plain"          # "plain" or "none"
# layer_boundaries = "auto" # "auto" (markers if any, else stations), "stations", "markers", or a step in m
"""

PLACES = """\
# Surveyed places that are not simply a depth in the hole: levels, tunnels, base stations.
# east [m], north [m] count from the collar, elevation [m] from sea level. role: column (default) takes
# part in intervals; base is in the network only. Instead of a position a place may have a depth [m].
# A station that stands here is where this file says: its depth in readings.csv is then not used.
station,east [m],north [m],elevation [m],elevation_sd [m],role,note
PAD,6.40,-3.10,64.45,0.01,base,concrete pad beside the collar
"""

PATH = """\
# Deviation survey: measured depth from the depth datum, inclination from the vertical, azimuth from north
# clockwise. Between the points the hole follows minimum curvature. Without this file the hole is vertical.
depth [m],inclination [deg],azimuth [deg]
0.0,0.0,0.0
60.0,0.6,112.0
120.0,1.1,115.0
180.0,1.7,118.0
240.0,2.2,117.0
320.0,2.6,119.0
"""

MARKERS = """\
# Formation tops: measured depth, and optionally the density from this marker down to the next.
marker,depth [m],density [g/cm3]
Silt of Reach,1.1,1.98
Hollow Sand,54.0,2.11
Mere Clay,134.0,2.23
Ashen Lime,217.0,2.46
"""

READINGS = """\
# Readings in the order in which they were taken, a row each.
# time           ISO 8601 with its zone (Z is UTC, +02:00 is two hours ahead of it), or without one for local
#                times in the time_zone of survey.toml
# run            label of the trip
# station        label of the place; rows with the same label are the same place
# depth [m]      measured depth of the mark from the depth datum, downward positive; empty where places.csv
#                has the station, since the position given there counts and not a depth given here
# reading [mGal] or reading [counts], which needs a calibration table
# pressure [hPa] of the air, where the barometer stands
# use            yes, no or empty (yes); a row that is not used stays here, with its reason in the note
# More columns where you have them: visit, instrument, reading_sd [mGal], tide_in_reading [mGal],
# sensor_offset [m] (sensor above the mark is positive), tilt_x [arcsec], tilt_y [arcsec], temperature [degC].
time,run,station,depth [m],reading [mGal],pressure [hPa],use,note
2026-09-14T06:40:27Z,1,PAD,,3120.459,1003.1,yes,
2026-09-14T06:41:43Z,1,PAD,,3120.458,1003.1,yes,
2026-09-14T06:42:56Z,1,PAD,,3120.460,1003.1,yes,
2026-09-14T06:54:50Z,1,D1,12,3122.094,1003.0,yes,
2026-09-14T06:56:07Z,1,D1,12,3122.096,1003.0,yes,
2026-09-14T06:57:20Z,1,D1,12,3122.094,1003.0,yes,
2026-09-14T07:08:22Z,1,D2,40,3126.089,1002.9,yes,
2026-09-14T07:09:34Z,1,D2,40,3126.088,1002.9,yes,
2026-09-14T07:10:52Z,1,D2,40,3126.091,1002.9,yes,
2026-09-14T07:23:10Z,1,D3,68,3129.935,1002.9,yes,
2026-09-14T07:24:28Z,1,D3,68,3129.938,1002.8,yes,
2026-09-14T07:25:43Z,1,D3,68,3129.937,1002.8,yes,
2026-09-14T07:37:05Z,1,D4,95,3133.484,1002.8,yes,
2026-09-14T07:38:24Z,1,D4,95,3133.482,1002.8,yes,
2026-09-14T07:39:40Z,1,D4,95,3133.485,1002.8,yes,
2026-09-14T07:51:58Z,1,D5,120,3136.769,1002.7,yes,
2026-09-14T07:53:14Z,1,D5,120,3136.767,1002.7,yes,
2026-09-14T07:54:25Z,1,D5,120,3136.816,1002.7,no,winch still moving
2026-09-14T08:06:19Z,1,D6,148,3140.289,1002.6,yes,
2026-09-14T08:07:34Z,1,D6,148,3140.286,1002.6,yes,
2026-09-14T08:08:46Z,1,D6,148,3140.285,1002.6,yes,
2026-09-14T08:21:19Z,1,D7,176,3143.701,1002.5,yes,
2026-09-14T08:22:34Z,1,D7,176,3143.699,1002.5,yes,
2026-09-14T08:23:48Z,1,D7,176,3143.697,1002.5,yes,
2026-09-14T08:34:55Z,1,D8,204,3147.167,1002.4,yes,
2026-09-14T08:36:08Z,1,D8,204,3147.168,1002.4,yes,
2026-09-14T08:37:25Z,1,D8,204,3147.168,1002.4,yes,
2026-09-14T08:48:58Z,1,D9,230,3150.098,1002.4,yes,
2026-09-14T08:50:13Z,1,D9,230,3150.102,1002.3,yes,
2026-09-14T08:51:28Z,1,D9,230,3150.096,1002.3,yes,
2026-09-14T09:02:08Z,1,D10,258,3152.931,1002.3,yes,
2026-09-14T09:03:21Z,1,D10,258,3152.930,1002.3,yes,
2026-09-14T09:04:39Z,1,D10,258,3152.933,1002.3,yes,
2026-09-14T09:15:24Z,1,D11,286,3155.779,1002.2,yes,
2026-09-14T09:16:40Z,1,D11,286,3155.778,1002.2,yes,
2026-09-14T09:17:56Z,1,D11,286,3155.775,1002.2,yes,
2026-09-14T09:29:40Z,1,D12,312,3158.431,1002.1,yes,
2026-09-14T09:30:56Z,1,D12,312,3158.430,1002.1,yes,
2026-09-14T09:32:11Z,1,D12,312,3158.433,1002.1,yes,
2026-09-14T09:43:27Z,1,D9,230,3150.110,1002.0,yes,
2026-09-14T09:44:45Z,1,D9,230,3150.109,1002.0,yes,
2026-09-14T09:45:59Z,1,D9,230,3150.115,1002.0,yes,
2026-09-14T09:58:22Z,1,D6,148,3140.314,1001.9,yes,
2026-09-14T09:59:37Z,1,D6,148,3140.310,1001.9,yes,
2026-09-14T10:00:47Z,1,D6,148,3140.320,1001.9,yes,
2026-09-14T10:12:16Z,1,PAD,,3120.525,1001.9,yes,
2026-09-14T10:13:31Z,1,PAD,,3120.527,1001.9,yes,
2026-09-14T10:14:45Z,1,PAD,,3120.522,1001.8,yes,
2026-09-14T10:26:44Z,1,D1,12,3122.160,1001.8,yes,
2026-09-14T10:27:59Z,1,D1,12,3122.169,1001.8,yes,
2026-09-14T10:29:18Z,1,D1,12,3122.166,1001.8,yes,
2026-09-14T10:40:03Z,1,D3,68,3129.991,1001.7,yes,
2026-09-14T10:41:20Z,1,D3,68,3129.990,1001.7,yes,
2026-09-14T10:42:35Z,1,D3,68,3129.989,1001.7,yes,
2026-09-14T10:54:43Z,1,D10,258,3152.952,1001.6,yes,
2026-09-14T10:55:57Z,1,D10,258,3152.954,1001.6,yes,
2026-09-14T10:57:09Z,1,D10,258,3152.952,1001.6,yes,
2026-09-14T11:08:00Z,1,D12,312,3158.454,1001.5,yes,
2026-09-14T11:09:15Z,1,D12,312,3158.453,1001.5,yes,
2026-09-14T11:10:27Z,1,D12,312,3158.452,1001.5,yes,
2026-09-14T11:21:34Z,1,D7,176,3143.745,1001.5,yes,
2026-09-14T11:22:46Z,1,D7,176,3143.740,1001.5,yes,
2026-09-14T11:24:04Z,1,D7,176,3143.742,1001.4,yes,
2026-09-14T11:35:16Z,1,D4,95,3133.541,1001.4,yes,
2026-09-14T11:36:34Z,1,D4,95,3133.543,1001.4,yes,
2026-09-14T11:37:49Z,1,D4,95,3133.544,1001.4,yes,
2026-09-14T11:49:03Z,1,PAD,,3120.543,1001.3,yes,
2026-09-14T11:50:16Z,1,PAD,,3120.549,1001.3,yes,
2026-09-14T11:51:32Z,1,PAD,,3120.543,1001.3,yes,
"""

FILES = {
    "survey.toml": SURVEY_TOML,
    "readings.csv": READINGS,
    "places.csv": PLACES,
    "path.csv": PATH,
    "markers.csv": MARKERS,
}


def write_new_survey(folder: Path) -> tuple[str, ...]:
    """Write the commented survey into a new or empty folder; the names of its files.

    Parameters
    ----------
    folder : Path
        Made when it is missing.

    Raises
    ------
    UnfitTarget
        When it is a file, or a folder that holds anything.
    OSError
        When the disk refuses; nothing is then left behind.
    """
    name = shown(folder)
    try:
        target = folder.resolve()
        is_there, is_folder = target.exists(), target.is_dir()
        taken = is_folder and any(target.iterdir())
    except (ValueError, RuntimeError) as error:
        raise UnfitTarget(f'The folder "{name}" cannot be made: {error}.') from None
    if is_there and not is_folder:
        raise UnfitTarget(f'"{name}" is a file; name a new folder, nothing is overwritten.')
    if taken:
        raise UnfitTarget(
            f'"{name}" is there already and not empty; name a new folder, nothing is overwritten.'
        )
    with output_folder(target) as aside:
        write_texts(aside, FILES)
    return tuple(FILES)
