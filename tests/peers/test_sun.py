"""The Sun of /v1/bow against skyfield; refraction against the published formulae."""

import numpy as np
from skyfield.earthlib import refract

from heaven import airless, random_place, random_time, text, timescale

QUESTIONS = 400
# The service claims 0.010 degrees up to 2045; the rest is for UTC taken as UT1, up to 0.9 s.
TOLERANCE_DEG = 0.012


def pressure_hpa(height_m):
    """ISO 2533:1975, troposphere; isothermal above 11 km is not asked for here."""
    return 1013.25 * (1 - 0.0065 * height_m / 288.15) ** 5.25588


def saemundsson_deg(airless_deg, pressure):
    """Saemundsson (1986), Sky and Telescope 72, 70, for 10 degrees Celsius, scaled by pressure."""
    return 1.02 / np.tan(np.radians(airless_deg + 10.3 / (airless_deg + 5.11))) / 60 * pressure / 1010


def test_airless_position(service, rng):
    worst = 0
    for _ in range(QUESTIONS):
        (lat, lon), time = random_place(rng), random_time(rng)
        sun = service.ask("/v1/bow", lat=lat, lon=lon, time=text(time))["sun"]
        elevation, azimuth = airless(lat, lon, timescale.from_datetime(time))
        # Near the zenith azimuth means little: what counts is the distance across the sky.
        across = abs((sun["azimuth_deg"] - azimuth + 180) % 360 - 180) * np.cos(np.radians(elevation))
        off = max(abs(sun["airless_elevation_deg"] - elevation), across)
        assert off <= TOLERANCE_DEG, f"{off} deg at {lat} {lon} {time}: {sun}, skyfield {elevation} {azimuth}"
        worst = max(worst, off)
    print(f"worst {worst:.4f} deg of {QUESTIONS}")


def test_apparent_elevation(service, rng):
    low = 0
    for _ in range(QUESTIONS):
        (lat, lon), time = random_place(rng), random_time(rng)
        eye_height_m = round(float(10 ** rng.uniform(-1, 4)), 2)
        sun = service.ask("/v1/bow", lat=lat, lon=lon, time=text(time), eye_height_m=eye_height_m)["sun"]
        elevation, apparent = sun["airless_elevation_deg"], sun["elevation_deg"]
        if elevation <= -7:
            assert abs(apparent - elevation) < 1e-9, f"lifted below the horizon: {sun}"
        elif elevation >= -1:
            pressure = pressure_hpa(eye_height_m)
            # The formula falls a hair below zero at the zenith, where there is no refraction.
            expected = elevation + max(saemundsson_deg(elevation, pressure), 0)
            assert abs(apparent - expected) < 1e-6, f"{sun} at {eye_height_m} m, expected {expected}"
            if elevation > 5:
                # Bennett (1982) the other way round, by skyfield: both are good to about 0.1 arcmin.
                assert abs(apparent - refract(elevation, 10, pressure)) < 0.2 / 60, f"{sun} at {eye_height_m} m"
            low += elevation < 10
    assert low > 0, "no low Sun among the questions"
