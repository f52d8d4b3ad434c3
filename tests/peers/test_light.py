"""The optics beside miepython 3.3.0, scipy 1.17.1, iapws 1.5.5 and colour-science 0.4.7 (light.py), and /v1/light over real
sockets beside miepython's spheres, summed over drops and the Sun's disc here."""

import random

import numpy as np
import pytest

import light
from conftest import BINARY, SEED
from test_radii import air

PROGRAM = BINARY.parent / "examples" / "light_rows"


@pytest.mark.parametrize("check", light.CHECKS, ids=lambda check: check.__name__)
def test_optics(check):
    for name, (worst, allowed) in check(random.Random(SEED), PROGRAM).items():
        print(f"{name}: {worst:.2e} of {allowed:.0e} allowed")
        assert worst <= allowed, f"{name}: {worst} of {allowed} allowed"


def index_in_air(wavelength_um, temperature_c):
    from iapws import IAPWS95
    from iapws._iapws import _Refractive

    density = IAPWS95(T=temperature_c + 273.15, P=0.101325).rho
    return _Refractive(density, temperature_c + 273.15, wavelength_um) / air(wavelength_um)


def under_the_sun(angles_deg, values, wanted_deg, diameter_deg=0.533):
    """Mean over the Sun's disc: by strips across it, each weighted by its length."""
    offsets = np.linspace(-0.5, 0.5, 201)[1:-1] * diameter_deg
    chords = np.sqrt(0.25 * diameter_deg**2 - offsets**2)
    return sum(w * np.interp(wanted_deg + d, angles_deg, values) for d, w in zip(offsets, chords)) / chords.sum()


def test_light_in_one_wavelength(service, rng):
    """Radii from 4 to 140 um: on both sides of where the service goes over from exact spheres to the theory of bows."""
    for radius_um in (*10 ** rng.uniform(np.log10(4), np.log10(100), 4), 115.0, 130.0):
        radius_um, wavelength_um = round(float(radius_um), 2), round(float(rng.uniform(0.4, 0.7)), 3)
        temperature_c = round(float(rng.uniform(1, 30)), 1)
        told = service.ask(
            "/v1/light", sun_elevation_deg=20, drop_radius_um=radius_um, wavelength_um=wavelength_um, water_temperature_c=temperature_c
        )
        m = complex(index_in_air(wavelength_um, temperature_c), 0)
        scattering_deg = np.arange(119.5, 150.51, 0.025)
        cosines = np.cos(np.radians(scattering_deg))
        tangential, radial, scattered = np.zeros_like(cosines), np.zeros_like(cosines), 0.0
        for apart in np.linspace(-2.5, 2.5, 301):
            radius, weight = radius_um * (1 + 0.03 * apart), np.exp(-0.5 * apart**2)
            x = 2 * np.pi * radius / wavelength_um
            s1, s2 = light.miepython.S1_S2(m, x, cosines, norm="wiscombe")
            _, q_sca, _, _ = light.miepython.efficiencies_mx(m, x)
            tangential += weight * np.abs(s1) ** 2
            radial += weight * np.abs(s2) ** 2
            scattered += weight * x**2 * q_sca
        wanted = 180 - np.array(told["angle_deg"])
        tangential, radial = (under_the_sun(scattering_deg, 4 * each / scattered, wanted) for each in (tangential, radial))
        theirs, ours = 0.5 * (tangential + radial), np.array(told["phase_function"])
        off = np.max(np.abs(ours - theirs)) / np.max(theirs)
        degree = np.max(np.abs(np.array(told["degree_of_polarisation"]) - (tangential - radial) / (tangential + radial)))
        print(f"{radius_um} um, {wavelength_um} um: within {off:.4f} of the peak, degree of polarisation within {degree:.3f}")
        assert off < 0.03 and degree < 0.15, told["drops"]
