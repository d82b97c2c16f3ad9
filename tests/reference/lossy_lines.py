"""Regenerates lossy_lines.json: lossy microstrips and nets over them, independently of the engine.

    python3 tests/reference/lossy_lines.py

Impedance and dielectric attenuation are those of scikit-rf's MLine (Hammerstad & Jensen, Djordjevic-Svensson
permittivity). scikit-rf's own conductor loss is left out: its formula differs by design from ours, the
incremental-inductance rule, and the two are not to be compared. That rule is instead applied here to MLine's
impedance in air, and gives the table's `skin_ohm_per_m` in R(f) = dc + skin sqrt(j f / 1 Hz) per metre. The nets are plain ABCD matrices in NumPy,
the line's checked against scikit-rf's DefinedGammaZ0: a driver of some ohms, the line, a capacitance.
Needs NumPy and scikit-rf (pip install scikit-rf).
"""

import json
import pathlib
import warnings

import numpy as np
import skrf
from scipy.constants import c, epsilon_0, mu_0

MIL_M = 25.4e-6
COPPER_S_PER_M = 5.8e7
LOW_HZ, HIGH_HZ, STATED_HZ = 1e4, 1e12, 1e9
LINE_HZ = [30e6, 100e6, 300e6, 1e9, 3e9, 6e9]

TRACES = {
    "4 mil over 4 mil": {
        "width_m": 4 * MIL_M,
        "height_m": 4 * MIL_M,
        "copper_m": 35e-6,
        "permittivity": 4.3,
        "loss_tangent": 0.02,
    },
    "8 mil over 12 mil": {
        "width_m": 8 * MIL_M,
        "height_m": 12 * MIL_M,
        "copper_m": 18e-6,
        "permittivity": 3.9,
        "loss_tangent": 0.012,
    },
}
LOADS = {"driver_ohm": 3.0, "load_f": 5e-12}
NETS = [
    {"trace": "4 mil over 4 mil", "length_m": 0.15, **LOADS, "clock_hz": 48e6, "top_hz": 1e9},
    {"trace": "8 mil over 12 mil", "length_m": 0.4, **LOADS, "clock_hz": 133e6, "top_hz": 6e9},
]


def permittivity(trace, frequency_hz):
    """Djordjevic et al. 2001, its value and loss tangent as stated at 1 GHz."""
    relaxation = lambda f: np.log((HIGH_HZ + 1j * f) / (LOW_HZ + 1j * f))
    er = trace["permittivity"]
    slope = -er * trace["loss_tangent"] / relaxation(STATED_HZ).imag
    above = er - slope * relaxation(STATED_HZ).real
    return above + slope * relaxation(np.asarray(frequency_hz))


def microstrip(frequency_hz, width_m, height_m, copper_m, permittivity, loss_tangent):
    frequency = skrf.Frequency.from_f(np.asarray(frequency_hz), unit="Hz")
    return skrf.media.MLine(
        frequency,
        w=width_m,
        h=height_m,
        t=copper_m,
        ep_r=permittivity,
        tand=loss_tangent,
        rho=1 / COPPER_S_PER_M,
        model="hammerstadjensen",
        disp="none",
        diel="djordjevicsvensson",
        f_low=LOW_HZ,
        f_high=HIGH_HZ,
        f_epr_tand=STATED_HZ,
    )


def air_ohm(trace, recession_m):
    """Impedance in air with every conductor's face receding."""
    n = recession_m
    line = microstrip(
        [1e9], trace["width_m"] - 2 * n, trace["height_m"] + 2 * n, trace["copper_m"] - 2 * n, 1.0, 0.0
    )
    return float(np.real(line.z0_characteristic[0]))


def skin_ohm_per_m(trace):
    """Of R(f) = dc + skin sqrt(j f / 1 Hz): surface impedance over eta0 times the growth of the impedance in air."""
    small_m = 1e-3 * min(trace["width_m"], trace["copper_m"])
    growth_ohm_per_m = (air_ohm(trace, small_m) - air_ohm(trace, -small_m)) / (2 * small_m)
    surface_ohm = np.sqrt(2 * np.pi * mu_0 / COPPER_S_PER_M)
    return growth_ohm_per_m * surface_ohm / np.sqrt(mu_0 / epsilon_0)


def line_of(trace, frequency_hz):
    """Series impedance and shunt admittance per metre."""
    frequency_hz = np.asarray(frequency_hz)
    omega = 2 * np.pi * frequency_hz
    air, skin = air_ohm(trace, 0.0), skin_ohm_per_m(trace)
    dc = 1 / (COPPER_S_PER_M * trace["width_m"] * trace["copper_m"])
    er = permittivity(trace, frequency_hz)
    # MLine's own share of the field in the board, at the stated permittivity.
    stated = microstrip([STATED_HZ], **trace)
    filling = (np.real(stated.ep_reff_f[0]) - 1) / (trace["permittivity"] - 1)
    effective = 1 + filling * (er - 1)
    series = dc + skin * np.sqrt(1j * frequency_hz) + 1j * omega * air / c
    shunt = 1j * omega * effective / (air * c)
    return dc, skin, series, shunt


def net(values):
    trace, length_m = TRACES[values["trace"]], values["length_m"]
    frequency_hz = values["clock_hz"] * np.arange(1, int(values["top_hz"] / values["clock_hz"]) + 1, 2)
    _, _, series, shunt = line_of(trace, frequency_hz)
    gamma, line_ohm = np.sqrt(series * shunt), np.sqrt(series / shunt)
    angle = gamma * length_m
    line = np.array([[np.cosh(angle), line_ohm * np.sinh(angle)], [np.sinh(angle) / line_ohm, np.cosh(angle)]])
    line = np.moveaxis(line, -1, 0)
    media = skrf.media.DefinedGammaZ0(
        skrf.Frequency.from_f(frequency_hz, unit="Hz"), z0_port=50, z0=line_ohm, gamma=gamma
    )
    assert np.allclose(media.line(length_m, "m").a, line, rtol=1e-9)
    ones, zeros = np.ones_like(frequency_hz), np.zeros_like(frequency_hz)
    load_s = 2j * np.pi * frequency_hz * values["load_f"]
    driver = np.moveaxis(np.array([[ones, values["driver_ohm"] * ones], [zeros, ones]]), -1, 0)
    load = np.moveaxis(np.array([[ones, zeros], [load_s, ones]]), -1, 0)
    whole = driver @ line @ load
    # The far end is open behind the capacitance.
    load_per_source = 1 / whole[:, 0, 0]
    current_per_source = whole[:, 1, 0] / whole[:, 0, 0]
    rows = [
        {"harmonic": int(round(f / values["clock_hz"])), "receiver": pair(h), "driver_s": pair(y)}
        for f, h, y in zip(frequency_hz, load_per_source, current_per_source)
    ]
    return {**values, "rows": rows}


def pair(value):
    return [float(f"{value.real:.9g}"), float(f"{value.imag:.9g}")]


def trace_table(name, trace):
    media = microstrip(LINE_HZ, **trace)
    dc, skin, series, shunt = line_of(trace, LINE_HZ)
    gamma, line_ohm = np.sqrt(series * shunt), np.sqrt(series / shunt)
    rows = [
        {
            "frequency_hz": f,
            "lossless_copper_ohm": float(np.real(media.z0_characteristic[k])),
            "dielectric_np_per_m": float(media.alpha_dielectric[k]),
            "resistance_ohm_per_m": float(series[k].real),
            "inductance_h_per_m": float(series[k].imag / (2 * np.pi * f)),
            "conductance_s_per_m": float(shunt[k].real),
            "capacitance_f_per_m": float(shunt[k].imag / (2 * np.pi * f)),
            "propagation_per_m": pair(gamma[k]),
            "impedance_ohm": pair(line_ohm[k]),
        }
        for k, f in enumerate(LINE_HZ)
    ]
    return {"name": name, **trace, "dc_ohm_per_m": float(dc), "skin_ohm_per_m": float(skin), "rows": rows}


def main():
    # They are about the conductor loss that is not used, and about air, whose dielectric loss is none.
    warnings.simplefilter("ignore", RuntimeWarning)
    table = {
        "from": f"tests/reference/lossy_lines.py, scikit-rf {skrf.__version__}",
        "traces": [trace_table(name, trace) for name, trace in TRACES.items()],
        "nets": [net(values) for values in NETS],
    }
    path = pathlib.Path(__file__).with_name("lossy_lines.json")
    path.write_text(json.dumps(table, indent=1) + "\n")


if __name__ == "__main__":
    main()
