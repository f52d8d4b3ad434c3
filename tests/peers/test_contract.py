"""Every answer against /openapi.json: the document by openapi-spec-validator, the answers by jsonschema (2020-12).

The schemas are closed for the check: a field that is served but not described is a failure too.
"""

import copy
from datetime import datetime

import pytest
from jsonschema import Draft202012Validator
from jsonschema.validators import validator_for
from openapi_spec_validator import validate
from referencing import Registry, Resource
from referencing.jsonschema import DRAFT202012

from heaven import random_place, random_time, text

checker = Draft202012Validator.FORMAT_CHECKER


@checker.checks("date-time", raises=ValueError)
def is_utc(value):
    assert not isinstance(value, str) or value.endswith("Z"), f"{value} is not in UTC"
    return not isinstance(value, str) or bool(datetime.fromisoformat(value))


def references(node, within=False):
    """Names of the schemas that are parts of an allOf: they are closed by what they are part of, and so are their choices."""
    if isinstance(node, dict):
        if within and "$ref" in node:
            yield node["$ref"].rpartition("/")[2]
        for key, value in node.items():
            yield from references(value, key == "allOf")
    elif isinstance(node, list):
        for value in node:
            yield from references(value, within)


class Contract:
    """The served document, ready to check answers."""

    def __init__(self, document):
        self.document = document
        closed = copy.deepcopy(document)
        schemas = document["components"]["schemas"]
        parts = set(references(document))
        while more := {name for part in parts for name in references({"allOf": schemas[part].get("oneOf", [])})} - parts:
            parts |= more
        for name, schema in closed["components"]["schemas"].items():
            if name not in parts and ("properties" in schema or "allOf" in schema):
                schema["unevaluatedProperties"] = False
        resource = Resource.from_contents(closed, default_specification=DRAFT202012)
        self.registry = Registry().with_resource("urn:document", resource)

    def check(self, path, answer):
        """Status, media type and body are as described."""
        responses = self.document["paths"][path]["get"]["responses"]
        status = str(answer.status_code)
        assert status in responses, f"{answer.url}: {status} is not described: {answer.text[:300]}"
        media = answer.headers["content-type"].partition(";")[0]
        assert media in responses[status]["content"], f"{answer.url}: {media} is not described for {status}"
        escaped = f"{path.replace('/', '~1')}/get/responses/{status}/content/{media.replace('/', '~1')}/schema"
        schema = {"$ref": f"urn:document#/paths/{escaped}"}
        validator = Draft202012Validator(schema, registry=self.registry, format_checker=checker)
        errors = [f"{error.json_path}: {error.message[:300]}" for error in validator.iter_errors(answer.json())]
        assert not errors, f"{answer.url}: {errors[:5]}"
        return answer.json()


@pytest.fixture(scope="module")
def contract(service):
    return Contract(service.ask("/openapi.json"))


def test_document(service, contract):
    validate(contract.document)
    for name, schema in contract.document["components"]["schemas"].items():
        validator_for(schema, default=Draft202012Validator).check_schema(schema)
        assert "description" in schema or name == "Limit", f"{name} is not explained"
    for path, operations in contract.document["paths"].items():
        assert service.get(path).status_code != 404, f"{path} is described but not served"
        for parameter in operations["get"].get("parameters", []):
            assert parameter["description"], f"{path}: {parameter['name']} is not explained"


@pytest.mark.parametrize("path", ["/v1/sites", "/v1/feeds", "/healthz", "/readyz"])
def test_plain_answers(service, contract, path):
    answer = service.get(path)
    assert answer.status_code == 200
    contract.check(path, answer)


def test_bow(service, contract, rng):
    for site in ("gull-stairs", "tarn-light", "high-saddle"):
        contract.check("/v1/bow", service.get("/v1/bow", {"site": site}))
    for _ in range(200):
        (lat, lon), time = random_place(rng), random_time(rng, 1950, 2099)
        query = {"lat": lat, "lon": lon, "time": text(time), "eye_height_m": round(float(10 ** rng.uniform(-1, 4.3)), 2)}
        query["water"] = str(rng.choice(["fresh", "sea"]))
        query["water_temperature_c"] = round(float(rng.uniform(0, 30)), 2)
        answer = service.get("/v1/bow", query)
        assert answer.status_code == 200, f"{answer.url}: {answer.text}"
        body = contract.check("/v1/bow", answer)
        assert (body["observer"]["lat"], body["observer"]["lon"], body["time"]) == (lat, lon, text(time))


def test_outlook(service, contract, rng):
    questions = [{"site": site} for site in ("gull-stairs", "tarn-light", "high-saddle")]
    for _ in range(20):
        lat, lon = random_place(rng)
        query = {"lat": lat, "lon": lon, "hours": int(rng.integers(1, 49)), "step_min": int(rng.integers(5, 60))}
        questions.append(query | {"threshold": round(float(rng.uniform(0, 1)), 3), "from": text(random_time(rng, 1950, 2099))})
    for query in questions:
        answer = service.get("/v1/outlook", query)
        assert answer.status_code == 200, f"{answer.url}: {answer.text}"
        body = contract.check("/v1/outlook", answer)
        hours, step_min = query.get("hours", 48), query.get("step_min", 5)
        assert len(body["steps"]) == hours * 60 // step_min + 1


def test_light(service, contract, rng):
    for _ in range(60):
        query = {"sun_elevation_deg": round(float(rng.uniform(-0.5, 90)), 2), "lit_optical_depth": round(float(10 ** rng.uniform(-3, 1.7)), 3)}
        drops = [{}, {"rain_mm_h": round(float(10 ** rng.uniform(-1.3, 2.3)), 3)}, {"drop_radius_um": round(float(10 ** rng.uniform(0, 3.4)), 2)}]
        drops += [{"fog": fog} for fog in ("radiation", "advection", "drizzle")]
        query |= drops[rng.integers(len(drops))]
        query |= [{}, {"wavelength_um": round(float(rng.uniform(0.4, 0.7)), 4)}][rng.integers(2)]
        query |= [{}, {"water": "sea", "water_temperature_c": round(float(rng.uniform(0, 30)), 2)}][rng.integers(2)]
        answer = service.get("/v1/light", query)
        assert answer.status_code == 200, f"{answer.url}: {answer.text}"
        body = contract.check("/v1/light", answer)
        assert len(body["angle_deg"]) == 601 and ("phase_function" in body) == ("wavelength_um" in query)


PLACE = {"lat": "50", "lon": "4"}
BAD = [
    ({}, {"lat", "lon"}),
    ({"lat": "50"}, {"lon"}),
    ({"lat": "", "lon": ""}, {"lat", "lon"}),
    ({"lat": "NaN", "lon": "inf"}, {"lat", "lon"}),
    ({"lat": "90.0001", "lon": "-180.1"}, {"lat", "lon"}),
    ({"lat": "north", "lon": "1e400"}, {"lat", "lon"}),
    (PLACE | {"lat": ["1", "2"]}, {"lat"}),
    (PLACE | {"site": "gull-stairs"}, {"lat", "lon"}),
    ({"site": "nowhere"}, {"site"}),
    (PLACE | {"eye_height_m": "-0.1"}, {"eye_height_m"}),
    (PLACE | {"water": "oil"}, {"water"}),
    (PLACE | {"water_temperature_c": "41"}, {"water_temperature_c"}),
    (PLACE | {"water": "sea", "water_temperature_c": "30.1"}, {"water_temperature_c"}),
    (PLACE | {"latt": "1"}, {"latt"}),
]
BAD_BOW = [({**PLACE, "time": time}, {"time"}) for time in ("", "noon", "1949-12-31T23:59:59Z", "2100-01-02T00:00:00Z")]
BAD_OUTLOOK = [
    (PLACE | {"from": "yesterday", "hours": "0.5", "step_min": "61", "threshold": "1.1"},
     {"from", "hours", "step_min", "threshold"}),
    (PLACE | {"hours": "241"}, {"hours"}),
    (PLACE | {"feed": "nobody"}, {"feed"}),
]

SUN = {"sun_elevation_deg": "20"}
BAD_LIGHT = [
    ({}, {"sun_elevation_deg"}),
    ({"sun_elevation_deg": "-0.6"}, {"sun_elevation_deg"}),
    (SUN | {"rain_mm_h": "0", "wavelength_um": "0.3", "lit_optical_depth": "0"}, {"rain_mm_h", "wavelength_um", "lit_optical_depth"}),
    (SUN | {"drop_radius_um": "1e9"}, {"drop_radius_um"}),
    (SUN | {"fog": "mist", "aerosol_optical_depth": "-1"}, {"fog", "aerosol_optical_depth"}),
    (SUN | {"fog": "drizzle", "rain_mm_h": "1"}, {"fog"}),
    (SUN | {"lat": "1"}, {"lat"}),
]


@pytest.mark.parametrize(
    "path, query, fields",
    [("/v1/light", *bad) for bad in BAD_LIGHT]
    + [("/v1/bow", *bad) for bad in BAD + BAD_BOW]
    + [("/v1/outlook", *bad) for bad in BAD + BAD_OUTLOOK]
    + [(path, {"lat": "1"}, {"lat"}) for path in ("/v1/sites", "/v1/feeds")],
)
def test_bad_queries(service, contract, path, query, fields):
    answer = service.get(path, query)
    assert answer.status_code == 400, f"{answer.url}: {answer.status_code} {answer.text[:300]}"
    assert answer.headers["content-type"] == "application/problem+json"
    problem = contract.check(path, answer)
    assert {error["field"] for error in problem["errors"]} == fields, f"{answer.url}: {problem}"
    assert problem["status"] == 400


def test_other_paths_and_methods(service, contract):
    schema = {"$ref": "urn:document#/components/schemas/ProblemBody"}
    validator = Draft202012Validator(schema, registry=contract.registry, format_checker=checker)
    missing = service.get("/v1/nothing")
    refused = [service.session.request(m, service.url + "/v1/bow") for m in ("POST", "PUT", "DELETE", "PATCH")]
    for answer, status in [(missing, 404)] + [(r, 405) for r in refused]:
        assert answer.status_code == status, f"{answer.request.method} {answer.url}: {answer.status_code}"
        assert answer.headers["content-type"] == "application/problem+json"
        validator.validate(answer.json())
        assert status != 405 or "GET" in answer.headers["allow"]
