"""A small survey folder that is right, for tests to spoil."""

TOML = """\
format = "plumbwell-survey/1"

[site]
name = "Hollow Fell 1"
latitude = 54.5
longitude = -3.0
ground_elevation = 180.0

[data]
readings = "readings.csv"
"""
READINGS = """\
time,station,depth [m],reading [mGal]
2026-05-04T09:00:00Z,A,100.0,4000.010
2026-05-04T09:20:00Z,B,120.0,4001.900
2026-05-04T09:40:00Z,A,100.0,4000.020
"""
