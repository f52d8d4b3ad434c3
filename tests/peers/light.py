#!/usr/bin/env python3
"""Holds the optics against independent libraries over random input: miepython, scipy, iapws, colour-science.

test_light.py runs the checks. By hand, with the built example as argument, for their figures or for the speed beside
miepython's numba kernel on one core, as a ratio in one run: light.py target/release/examples/light_rows [--seed N | --speed]
"""
import json
import os
import random
import subprocess
import sys
import time

os.environ["MIEPYTHON_USE_JIT"] = "1"
os.environ["NUMBA_NUM_THREADS"] = "1"

import numpy as np  # noqa: E402
import miepython  # noqa: E402

COUNT = 120


def ask(program, questions):
    lines = "\n".join(json.dumps(question) for question in questions)
    told = subprocess.run([program], input=lines, capture_output=True, text=True, check=True).stdout.splitlines()
    if len(told) != len(questions):
        sys.exit(f"{len(questions)} questions, {len(told)} answers")
    return [json.loads(line) for line in told]


def spheres(dice, program):
    """Amplitudes relative to their size over the angles: between lobes both programs carry only rounding.

    At sharp resonances of large clear spheres miepython itself is off by up to 1e-4, as sums in 50 digits show (one such
    is in tests/proofs/reference_spheres.rs), so that little more is asked of it.
    """
    questions = []
    for _ in range(COUNT):
        questions.append({
            "ask": "mie",
            "x": 10 ** dice.uniform(-1, 4),
            "n": dice.uniform(1.05, 1.6),
            "kappa": dice.choice([0.0, 0.0, 10 ** dice.uniform(-6, 0)]),
            "angles_deg": [dice.uniform(0, 180) for _ in range(5)],
        })
    worst = {"efficiencies": 0.0, "amplitudes": 0.0}
    for question, told in zip(questions, ask(program, questions)):
        m, x = complex(question["n"], -question["kappa"]), question["x"]
        q_ext, q_sca, _, g = miepython.efficiencies_mx(m, x)
        for ours, theirs in ((told["q_ext"], q_ext), (told["q_sca"], q_sca), (told["g"], g)):
            worst["efficiencies"] = max(worst["efficiencies"], abs(ours - theirs) / max(abs(theirs), 1e-9 + abs(g)))
        s1, s2 = miepython.S1_S2(m, x, np.cos(np.radians(question["angles_deg"])), norm="wiscombe")
        for ours, theirs in ((told["s1"], s1), (told["s2"], s2)):
            ours = np.array([complex(re, im) for re, im in ours])
            scale = np.maximum(np.abs(theirs), np.sqrt(np.mean(np.abs(theirs) ** 2)))
            worst["amplitudes"] = max(worst["amplitudes"], float(np.max(np.abs(ours - theirs) / scale)))
    return {"miepython efficiencies": (worst["efficiencies"], 1e-6), "miepython amplitudes": (worst["amplitudes"], 3e-4)}


def airy(dice, program):
    from scipy.special import airy as reference

    questions = [{"ask": "airy", "z": dice.uniform(-150, 8)} for _ in range(COUNT)]
    worst = 0.0
    for question, told in zip(questions, ask(program, questions)):
        ai, slope, _, _ = reference(question["z"])
        size = (1 + abs(question["z"])) ** 0.25
        worst = max(worst, abs(told["ai"] - ai) * size, abs(told["slope"] - slope) / size)
    return {"scipy Airy function": (worst, 1e-12)}


def water(dice, program):
    from iapws import IAPWS95
    from iapws._iapws import _Refractive

    questions = [
        {"ask": "index", "wavelength_um": dice.uniform(0.38, 0.75), "temperature_c": dice.uniform(0.01, 40)}
        for _ in range(COUNT // 2)
    ]
    index, density = 0.0, 0.0
    for question, told in zip(questions, ask(program, questions)):
        kelvin = question["temperature_c"] + 273.15
        rho = IAPWS95(T=kelvin, P=0.101325).rho
        index = max(index, abs(told["n"] - _Refractive(rho, kelvin, question["wavelength_um"])))
        density = max(density, abs(told["density_kg_m3"] - rho))
    return {"iapws index": (index, 2e-6), "iapws density, kg/m3": (density, 0.006)}


def colours(dice, program):
    import colour

    questions = [{"ask": "colour", "xyz": [dice.uniform(0, 1) for _ in range(3)]} for _ in range(COUNT)]
    matrix = np.asarray(colour.RGB_COLOURSPACES["sRGB"].matrix_XYZ_to_RGB)
    linear, encoded = 0.0, 0.0
    for question, told in zip(questions, ask(program, questions)):
        theirs = matrix @ np.array(question["xyz"])
        linear = max(linear, float(np.max(np.abs(theirs - told["linear_srgb"]))))
        shown = np.clip(np.array(told["linear_srgb"]), 0, 1)
        theirs = colour.models.eotf_inverse_sRGB(shown)
        encoded = max(encoded, float(np.max(np.abs(theirs - told["srgb"]))))
    return {"colour-science linear sRGB": (linear, 5e-4), "colour-science encoding": (encoded, 1e-5)}


def beams(dice, program):
    """The beam without ozone cannot be asked for, so ozone is put into the peer's sum: the rest is independent."""
    import colour

    path = os.path.join(os.path.dirname(__file__), "..", "reference", "astm_g173.csv")
    table = np.loadtxt(path, delimiter=",", skiprows=1)
    um, above = table[:, 0] / 1000, table[:, 1]
    matching = colour.MSDS_CMFS["CIE 1931 2 Degree Standard Observer"].values[: len(um)]
    # Bird and Riordan (1986), table 1.
    nm = [440, 450, 460, 470, 480, 490, 500, 510, 520, 530, 540, 550, 570, 593, 610, 630, 656, 667.6, 690, 710, 718, 724.4, 740, 752.5, 757.5, 762.5, 767.5, 780]
    per_cm = [0, .003, .006, .009, .014, .021, .03, .04, .048, .063, .075, .085, .12, .119, .12, .09, .065, .051, .028, .018, .015, .012, .01, .008, .007, .006, .005, 0]
    ozone = np.interp(um * 1000, nm, per_cm)
    questions = [
        {"ask": "beam", "elevation_deg": dice.uniform(0, 90), "aerosol_optical_depth": dice.uniform(0, 1)}
        for _ in range(COUNT)
    ]
    worst = 0.0
    for question, told in zip(questions, ask(program, questions)):
        h = question["elevation_deg"]
        mass = 1 / (np.sin(np.radians(h)) + 0.50572 * (h + 6.07995) ** -1.6364)
        # Hansen and Travis in place of Bodhaine: 0.3 % apart.
        rayleigh = 0.008569 * um**-4 * (1 + 0.0113 * um**-2 + 0.00013 * um**-4)
        aerosol = question["aerosol_optical_depth"] * (um / 0.55) ** -1.3
        layer = (1 + 22 / 6370) / np.sqrt(np.sin(np.radians(h)) ** 2 + 2 * 22 / 6370)
        through = above * np.exp(-mass * (rayleigh + aerosol) - 0.3 * layer * ozone)
        theirs = 683.002 * (through[:, None] * matching).sum(axis=0)
        allowed = 0.003 * mass * 0.25 + 0.002
        worst = max(worst, float(np.max(np.abs(told["xyz"] / theirs - 1))) / allowed)
    return {"beam with another Rayleigh law, share of what it explains": (worst, 1.0)}


CHECKS = (spheres, airy, water, colours, beams)


def speed(program):
    angles = [120 + 0.075 * step for step in range(400)]
    cosines = np.cos(np.radians(angles))
    for x in (100.0, 1000.0, 6000.0):
        repeat = max(3, int(2e5 / x))
        miepython.S1_S2(1.335 + 0j, x, cosines, norm="wiscombe")
        ours, theirs = float("inf"), float("inf")
        for _ in range(5):
            question = {"ask": "time_mie", "x": x, "n": 1.335, "angles_deg": angles, "repeat": repeat}
            ours = min(ours, ask(program, [question])[0]["seconds"])
            rounds = max(1, repeat // 10)
            start = time.perf_counter()
            for _ in range(rounds):
                miepython.S1_S2(1.335 + 0j, x, cosines, norm="wiscombe")
            theirs = min(theirs, (time.perf_counter() - start) / rounds)
        print(f"x = {x:6.0f}, 400 angles: {ours * 1e3:8.3f} ms, miepython {theirs * 1e3:8.3f} ms, {theirs / ours:5.1f} times as fast")


def main():
    program = sys.argv[1]
    if "--speed" in sys.argv:
        return speed(program)
    seed = int(sys.argv[sys.argv.index("--seed") + 1]) if "--seed" in sys.argv else random.SystemRandom().randrange(10**6)
    dice = random.Random(seed)
    bad = 0
    for check in CHECKS:
        for name, (worst, allowed) in check(dice, program).items():
            good = worst <= allowed
            bad += not good
            print(f"{'ok  ' if good else 'FAIL'} {name}: {worst:.2e} of {allowed:.0e} allowed")
    print(f"seed {seed}: {'all agree' if bad == 0 else f'{bad} disagree'}")
    return bad


if __name__ == "__main__":
    sys.exit(main())
