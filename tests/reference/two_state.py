"""Regenerates two_state.json: drivers whose two states differ in resistance, into loads that remember, by brute
force, independently of the engine.

    python3 tests/reference/two_state.py

0 to 3.3 V; open-circuit voltage v(t) = 3.3 V s(t), resistance R(t) = Rlow + (Rhigh - Rlow) s(t), s(t) straight edges
0-100 %, the rising one from time zero, 50 % points half a period apart. Loads: a capacitor with a resistor beside
it; a lossless line as a ladder of LC cells into a capacitor. Ordinary differential equations, solved by SciPy's
DOP853 from corner to corner until a period repeats; the harmonics are the plain Fourier sum of even samples.
Needs NumPy and SciPy; takes some minutes.
"""

import json
import pathlib

import numpy as np
from scipy.integrate import solve_ivp

SWING_V, CLOCK_HZ = 3.3, 25e6
PERIOD_S = 1 / CLOCK_HZ
SAMPLES = 16384
HARMONICS = 24
STILL_V = 3e-7
CELLS = (240, 480)

DRIVERS = {
    "equal edges": {"high_ohm": 40.0, "low_ohm": 12.0, "rise_s": 1e-9, "fall_s": 1e-9},
    "unequal edges": {"high_ohm": 10.0, "low_ohm": 30.0, "rise_s": 2e-9, "fall_s": 1e-9},
}
RC = {"ohm": 200.0, "farad": 10e-12}
LINE = {"ohm": 50.0, "delay_s": 1e-9, "farad": 5e-12}


class Driver:
    def __init__(self, high_ohm, low_ohm, rise_s, fall_s):
        self.high_ohm, self.low_ohm = high_ohm, low_ohm
        fall_start_s = rise_s / 2 + PERIOD_S / 2 - fall_s / 2
        self.corners_s = [0, rise_s, fall_start_s, fall_start_s + fall_s, PERIOD_S]

    def share(self, time_s):
        return np.interp(time_s, self.corners_s, [0, 1, 1, 0, 0])

    def current_a(self, time_s, pin_v):
        share = self.share(time_s)
        return (SWING_V * share - pin_v) / (self.low_ohm + (self.high_ohm - self.low_ohm) * share)

    def pin_v(self, time_s, current_a):
        share = self.share(time_s)
        return SWING_V * share - current_a * (self.low_ohm + (self.high_ohm - self.low_ohm) * share)


def settled(driver, slope, size, watched, longest_step_s):
    """One settled period of some states, sampled evenly."""
    times_s = np.arange(SAMPLES) * PERIOD_S / SAMPLES
    state, before = np.zeros(size), None
    while True:
        samples = np.empty((len(watched), SAMPLES))
        for begin_s, end_s in zip(driver.corners_s, driver.corners_s[1:]):
            inside = (times_s >= begin_s) & (times_s < end_s)
            solution = solve_ivp(
                slope,
                (begin_s, end_s),
                state,
                method="DOP853",
                t_eval=np.append(times_s[inside], end_s),
                rtol=1e-9,
                atol=1e-11,
                max_step=longest_step_s,
            )
            samples[:, inside] = solution.y[watched, :-1]
            state = solution.y[:, -1]
        if before is not None and np.abs(samples - before).max() < STILL_V:
            return times_s, samples
        before = samples


def rms(samples):
    return (np.abs(np.fft.rfft(samples)) * np.sqrt(2) / SAMPLES)[1 : HARMONICS + 1]


def into_rc(driver):
    def slope(time_s, state):
        return (driver.current_a(time_s, state) - state / RC["ohm"]) / RC["farad"]

    times_s, (voltage_v,) = settled(driver, slope, 1, [0], 20e-12)
    return rms(driver.current_a(times_s, voltage_v)), rms(voltage_v)


def into_line(driver, cells):
    inductances_h = np.full(cells + 1, LINE["ohm"] * LINE["delay_s"] / cells)
    # Half an inductance at each end, so that the cells are symmetric; states: currents, then voltages.
    inductances_h[[0, -1]] /= 2
    capacitances_f = np.full(cells + 1, LINE["delay_s"] / LINE["ohm"] / cells)
    capacitances_f[-1] = LINE["farad"]

    def slope(time_s, state):
        current_a, voltage_v = state[: cells + 1], state[cells + 1 :]
        before_v = np.append(driver.pin_v(time_s, current_a[0]), voltage_v[:-1])
        after_a = np.append(current_a[1:], 0.0)
        return np.append((before_v - voltage_v) / inductances_h, (current_a - after_a) / capacitances_f)

    _, (driver_a, end_v) = settled(driver, slope, 2 * cells + 2, [0, 2 * cells + 1], 20e-12)
    return rms(driver_a), rms(end_v)


def main():
    rows = []

    def add(name, load, currents_a, voltages_v):
        rows.append(
            {
                "driver": name,
                "load": load,
                "driver_current_a": [float(f"{value:.7g}") for value in currents_a],
                "receiver_v": [float(f"{value:.7g}") for value in voltages_v],
            }
        )

    for name, values in DRIVERS.items():
        driver = Driver(**values)
        add(name, "rc", *into_rc(driver))
        coarse, fine = [np.array(into_line(driver, cells)) for cells in CELLS]
        apart = np.abs(fine / coarse - 1).max()
        print(f"{name}: {CELLS[0]} and {CELLS[1]} cells agree to {100 * apart:.3f} %", flush=True)
        add(name, "line", *fine)
    table = {
        "from": "tests/reference/two_state.py",
        "clock_hz": CLOCK_HZ,
        "swing_v": SWING_V,
        "drivers": DRIVERS,
        "rc": RC,
        "line": LINE,
        "rows": rows,
    }
    path = pathlib.Path(__file__).with_name("two_state.json")
    path.write_text(json.dumps(table, indent=1) + "\n")


if __name__ == "__main__":
    main()
