"""Crown, feet and visible share of /v1/bow against a circle sampled point by point with numpy."""

import numpy as np
import pytest

from heaven import dip_deg, random_place, random_time, text

POINTS = 400_000
QUESTIONS = 150


def vector(azimuth_deg, elevation_deg):
    azimuth, elevation = np.radians(azimuth_deg), np.radians(elevation_deg)
    return np.array([np.cos(elevation) * np.sin(azimuth), np.cos(elevation) * np.cos(azimuth), np.sin(elevation)])


def circle(centre, radius_deg):
    """Azimuth and elevation round the circle, from its lowest point over left, top and right, seen facing the centre."""
    right = np.cross(centre, [0, 0, 1])
    right /= np.linalg.norm(right)
    top = np.cross(right, centre)
    angle = np.linspace(-np.pi, np.pi, POINTS + 1)
    radius = np.radians(radius_deg)
    points = np.cos(radius) * centre[:, None] + np.sin(radius) * (
        np.cos(angle) * top[:, None] + np.sin(angle) * right[:, None]
    )
    elevation = np.degrees(np.arctan2(points[2], np.hypot(points[0], points[1])))
    return np.degrees(np.arctan2(points[0], points[1])) % 360, elevation


def apart(a, b):
    return abs((a - b + 180) % 360 - 180)


def check(bow, antisolar, horizon, where):
    """`horizon` gives the elevation of the horizon by azimuth."""
    centre = vector(antisolar["azimuth_deg"], antisolar["elevation_deg"])
    azimuth, elevation = circle(centre, bow["radius_deg"]["red"])
    clearance = elevation - horizon(azimuth)
    visible = clearance >= 0
    share = visible[:-1].mean()
    crossings = np.count_nonzero(visible[1:] != visible[:-1])
    # Each crossing may fall anywhere within its interval.
    assert abs(bow["visible_arc_fraction"] - share) <= (crossings + 1) / POINTS, f"{where}: {share} {bow}"
    if abs(clearance).min() < 1e-3 and crossings == 0:
        return None
    assert bow["above_horizon"] == bool(visible.any()), f"{where}: {bow}"
    if not visible.any():
        assert bow["feet"] is None, f"{where}: {bow}"
        assert abs(bow["below_horizon_by_deg"] + clearance.max()) < 1e-3, f"{where}: {clearance.max()} {bow}"
        return False
    crown = np.flatnonzero(visible)[np.argmax(elevation[visible])]
    assert abs(bow["crown"]["elevation_deg"] - elevation[crown]) < 2e-3, f"{where}: {elevation[crown]} {bow}"
    if visible[0]:
        assert bow["feet"] is None, f"{where}: {bow}"
        return True
    first, last = np.flatnonzero(visible)[[0, -1]]
    for name, index in (("left_azimuth_deg", first), ("right_azimuth_deg", last)):
        step = max(apart(azimuth[index], azimuth[index - 1]), apart(azimuth[index], azimuth[index + 1]))
        assert apart(bow["feet"][name], azimuth[index]) <= 1.01 * step, f"{where}: {name} {azimuth[index]} {bow}"
    return True


def test_level_horizon(service, rng):
    seen = 0
    for _ in range(QUESTIONS):
        (lat, lon), time = random_place(rng), random_time(rng, 1950, 2099)
        eye_height_m = round(float(10 ** rng.uniform(-1, 4.3)), 1)
        answer = service.ask("/v1/bow", lat=lat, lon=lon, time=text(time), eye_height_m=eye_height_m)
        dip = dip_deg(eye_height_m)
        for bow in answer["bows"]:
            seen += check(bow, answer["antisolar_point"], lambda _: -dip, f"{lat} {lon} {eye_height_m} m {time}") is True
    assert seen > QUESTIONS // 4, "too few bows among the questions"


@pytest.mark.parametrize("site", ["gull-stairs", "tarn-light", "high-saddle"])
def test_demo_sites(service, rng, site):
    (entry,) = [s for s in service.ask("/v1/sites")["sites"] if s["name"] == site]
    skyline = np.array(entry["skyline"])
    dip = dip_deg(entry["eye_height_m"])

    def horizon(azimuth):
        return np.interp(azimuth, skyline[:, 0], skyline[:, 1], period=360) if len(skyline) else -dip

    seen = 0
    for _ in range(QUESTIONS):
        time = random_time(rng)
        answer = service.ask("/v1/bow", site=site, time=text(time))
        for bow in answer["bows"]:
            seen += check(bow, answer["antisolar_point"], horizon, f"{site} {time}") is True
    assert seen > QUESTIONS // 4, "too few bows among the questions"
