"""Sunrise and sunset of /v1/outlook against skyfield's almanac."""

from datetime import datetime, timedelta

from skyfield import almanac

from heaven import SUN, airless, dip_deg, observer, random_place, random_time, text, timescale

QUESTIONS = 40
HOURS = 72
# Upper limb and 34 arcmin of refraction (The Nautical Almanac), lowered by the dip of the eye.
CONVENTION_DEG = -50 / 60
FASTEST_DEG_S = 360 / 86164.1
# 5 s where the Sun goes straight down; proportionally more where it slants: the same error in elevation.
TOLERANCE_DEG = 5 * FASTEST_DEG_S


def reference(lat, lon, begin, horizon_deg):
    """(time, name, rate in deg/s) of every rising and setting."""
    place = observer(lat, lon)
    span = timescale.from_datetime(begin), timescale.from_datetime(begin + timedelta(hours=HOURS))
    events = []
    for name, find in (("sunrise", almanac.find_risings), ("sunset", almanac.find_settings)):
        # A Sun that only turns at the horizon is marked False there and is no crossing.
        for moment, crosses in zip(*find(place, SUN, *span, horizon_degrees=horizon_deg)):
            if crosses:
                around = [airless(lat, lon, moment + timedelta(seconds=s))[0] for s in (-15, 15)]
                events.append((moment.utc_datetime(), name, abs(around[1] - around[0]) / 30))
    return sorted(events)


def graces(lat, lon, begin, horizon_deg):
    """Whether the Sun turns round so near to the horizon that a crossing may be on either side of the tolerance."""
    minutes = timescale.from_datetimes([begin + timedelta(minutes=m) for m in range(HOURS * 60 + 1)])
    elevation = airless(lat, lon, minutes)[0] - horizon_deg
    turns = (elevation[1:-1] - elevation[:-2]) * (elevation[2:] - elevation[1:-1]) <= 0
    near_turn = abs(elevation[1:-1][turns]).min(initial=90) < 2 * TOLERANCE_DEG
    return near_turn or min(abs(elevation[0]), abs(elevation[-1])) < 2 * TOLERANCE_DEG


def test_sunrise_and_sunset(service, rng):
    compared, worst = 0, 0
    for _ in range(QUESTIONS):
        (lat, lon), begin = random_place(rng), random_time(rng)
        eye_height_m = round(float(10 ** rng.uniform(0, 4)), 1)
        horizon_deg = CONVENTION_DEG - dip_deg(eye_height_m)
        answer = service.ask(
            "/v1/outlook", lat=lat, lon=lon, eye_height_m=eye_height_m, hours=HOURS, step_min=60, **{"from": text(begin)}
        )
        assert abs(answer["observer"]["horizon"]["dip_deg"] - dip_deg(eye_height_m)) < 1e-6
        found = [
            (datetime.fromisoformat(e["time"]), e["event"])
            for e in answer["sky_events"]
            if e["event"] in ("sunrise", "sunset")
        ]
        expected = reference(lat, lon, begin, horizon_deg)
        where = f"{lat} {lon} {eye_height_m} m from {begin}: {found}, skyfield {expected}"
        if [name for _, name in found] != [name for _, name, _ in expected]:
            assert graces(lat, lon, begin, horizon_deg), where
            continue
        for (time, _), (wanted, _, rate) in zip(found, expected):
            off_deg = abs((time - wanted).total_seconds()) * rate
            assert off_deg <= TOLERANCE_DEG, f"{off_deg / rate:.1f} s off at {where}"
            worst = max(worst, off_deg / FASTEST_DEG_S)
            compared += 1
    assert compared > QUESTIONS, "too few risings among the questions"
    print(f"worst {worst:.2f} s of a Sun going straight down, {compared} events")
