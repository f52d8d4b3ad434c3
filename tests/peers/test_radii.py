"""Radii of /v1/bow: refractive index by the package iapws (R9-97 with the density of IAPWS-95), air by Ciddor (1996),
and the ray of stationary deviation by search instead of the closed form."""

import numpy as np
from iapws import IAPWS95
from iapws._iapws import _Refractive
from scipy.optimize import minimize_scalar

WAVELENGTHS_UM = {"red": 0.700, "green": 0.550, "violet": 0.400}
TOLERANCE_DEG = 0.001


def air(wavelength_um):
    """Standard dry air: Ciddor (1996), Applied Optics 35, 1566, eq. 1."""
    square = wavelength_um**-2
    return 1 + 1e-8 * (5_792_105 / (238.0185 - square) + 167_917 / (57.362 - square))


def radius_deg(index, order):
    """Descartes (1637): angle between the antisolar point and the ray whose deviation is stationary."""

    def deviation(incidence):
        return 2 * (incidence - np.arcsin(np.sin(incidence) / index)) + order * (
            np.pi - 2 * np.arcsin(np.sin(incidence) / index)
        )

    turn = minimize_scalar(deviation, bounds=(0.5, 1.55), method="bounded", options={"xatol": 1e-10})
    return abs(180 - np.degrees(turn.fun) % 360)


def test_radii(service, rng):
    temperatures = [0.01, 40, *(round(float(t), 2) for t in rng.uniform(0.01, 40, 30))]
    for temperature_c in temperatures:
        density = IAPWS95(T=temperature_c + 273.15, P=0.101325).rho
        bows = service.ask("/v1/bow", lat=0, lon=0, water_temperature_c=temperature_c)["bows"]
        assert [bow["order"] for bow in bows] == [1, 2]
        for bow in bows:
            for name, wavelength_um in WAVELENGTHS_UM.items():
                index = _Refractive(density, temperature_c + 273.15, wavelength_um) / air(wavelength_um)
                expected = radius_deg(index, bow["order"])
                off = abs(bow["radius_deg"][name] - expected)
                assert off < TOLERANCE_DEG, f"order {bow['order']} {name} {temperature_c} Cel: {bow}, {expected}"
