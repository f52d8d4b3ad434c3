"""The Sun by skyfield 1.55 with the JPL ephemeris DE421 (Folkner et al. 2009), which skyfield-data 7.0.0 carries, and
what the answers share: dip, random places and times."""

from datetime import datetime, timedelta, timezone

import numpy as np
from skyfield.api import Loader, wgs84
from skyfield_data import get_skyfield_data_path

load = Loader(get_skyfield_data_path(), verbose=False, expire=False)
timescale = load.timescale(builtin=True)
bodies = load("de421.bsp")
EARTH, SUN = bodies["earth"], bodies["sun"]

# IUGG 1980, mean radius; refraction coefficient 0.13 (common practice in surveying).
EARTH_RADIUS_M = 6_371_008.8 / (1 - 0.13)


def observer(lat, lon):
    return EARTH + wgs84.latlon(lat, lon)


def airless(lat, lon, moment):
    """Elevation and azimuth of the Sun's centre without air, degrees."""
    elevation, azimuth, _ = observer(lat, lon).at(moment).observe(SUN).apparent().altaz()
    return elevation.degrees, azimuth.degrees


def dip_deg(eye_height_m):
    return np.degrees(np.arccos(EARTH_RADIUS_M / (EARTH_RADIUS_M + eye_height_m)))


def random_place(rng):
    """Even over the sphere, rounded as people type."""
    return round(float(np.degrees(np.arcsin(rng.uniform(-1, 1)))), 4), round(float(rng.uniform(-180, 180)), 4)


def random_time(rng, first=2003, last=2045):
    """A whole second of the years in which DE421 and the service were compared."""
    begin, end = datetime(first, 1, 1, tzinfo=timezone.utc), datetime(last, 1, 1, tzinfo=timezone.utc)
    return begin + timedelta(seconds=int(rng.integers(0, (end - begin).total_seconds())))


def text(moment):
    return moment.strftime("%Y-%m-%dT%H:%M:%SZ")
