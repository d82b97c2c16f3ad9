"""Regenerates the values of the clamped net from a stiff LC ladder, independently of the engine.

    python3 tests/reference/clamped_net.py

0 to 3.3 V through 3 ohm, straight 0-100 % edges of 1 ns, 25 MHz, 50 % between the 50 % points; a
lossless line of 65 ohm and 1 ns as a ladder of LC cells; 5 pF with a clamp to 0 V and one to 3.3 V, each a
junction i = Is (exp((v - i R) / Vt) - 1) at 300 K that drops 0.707 V at 1 mA, behind R = 10 ohm.
Needs numpy and scipy; takes some minutes.
"""

import numpy as np
from scipy.integrate import solve_ivp
from scipy.sparse import lil_matrix
from scipy.special import lambertw

SWING_V, SOURCE_OHM, EDGE_S, CLOCK_HZ = 3.3, 3.0, 1e-9, 25e6
LINE_OHM, FLIGHT_S, INPUT_F = 65.0, 1e-9, 5e-12
KNEE_V, CLAMP_OHM, THERMAL_V = 0.707, 10.0, 0.025852
SATURATION_A = 1e-3 / np.expm1(KNEE_V / THERMAL_V)
PERIOD_S = 1 / CLOCK_HZ
PERIODS, SAMPLES = 4, 32768


def source_v(time_s):
    time_s = np.mod(time_s, PERIOD_S)
    corners_s = [0, EDGE_S, PERIOD_S / 2, PERIOD_S / 2 + EDGE_S, PERIOD_S]
    return np.interp(time_s, corners_s, [0, SWING_V, SWING_V, 0, 0])


def junction_a(voltage_v):
    """Current of a clamp: w + ln w = x with w = (i + Is) R / Vt."""
    voltage_v = np.asarray(voltage_v, dtype=float)
    x = np.log(SATURATION_A * CLAMP_OHM / THERMAL_V)
    x = x + (voltage_v + SATURATION_A * CLAMP_OHM) / THERMAL_V
    w = np.real(lambertw(np.exp(np.minimum(x, 500.0))))
    return w * THERMAL_V / CLAMP_OHM - SATURATION_A


def solve(cells):
    """One settled period: receiver voltage and driver current."""
    inductance_h = LINE_OHM * FLIGHT_S / cells
    capacitance_f = FLIGHT_S / LINE_OHM / cells
    # Half an inductance at each end, so that the cells are symmetric; voltages v, currents i.
    inductances_h = np.full(cells + 1, inductance_h)
    inductances_h[[0, -1]] /= 2
    capacitances_f = np.full(cells + 1, capacitance_f)
    capacitances_f[-1] = INPUT_F

    def slope(time_s, state):
        current_a, voltage_v = state[: cells + 1], state[cells + 1 :]
        driver_v = source_v(time_s) - SOURCE_OHM * current_a[0]
        before_v = np.concatenate(([driver_v], voltage_v[:-1]))
        clamp_a = junction_a(voltage_v[-1] - SWING_V) - junction_a(-voltage_v[-1])
        after_a = np.append(current_a[1:], clamp_a)
        return np.concatenate(
            ((before_v - voltage_v) / inductances_h, (current_a - after_a) / capacitances_f)
        )

    size = 2 * cells + 2
    pattern = lil_matrix((size, size))
    for cell in range(cells + 1):
        pattern[cell, [cell, cells + 1 + cell]] = 1
        pattern[cells + 1 + cell, [cell, cells + 1 + cell]] = 1
        if cell > 0:
            pattern[cell, cells + cell] = 1
            pattern[cells + cell, cell] = 1
    state = np.zeros(size)
    times_s = np.arange(SAMPLES) * PERIOD_S / SAMPLES
    # The corners of the source are where the integration has to start anew.
    corners_s = [0, EDGE_S, PERIOD_S / 2, PERIOD_S / 2 + EDGE_S, PERIOD_S]
    for _ in range(PERIODS):
        receiver_v, driver_a = np.empty(SAMPLES), np.empty(SAMPLES)
        for begin_s, end_s in zip(corners_s, corners_s[1:]):
            inside = (times_s >= begin_s) & (times_s < end_s)
            solution = solve_ivp(
                slope,
                (begin_s, end_s),
                state,
                method="BDF",
                t_eval=np.append(times_s[inside], end_s),
                rtol=1e-7,
                atol=1e-9,
                max_step=EDGE_S / 20,
                jac_sparsity=pattern,
            )
            receiver_v[inside] = solution.y[-1, :-1]
            driver_a[inside] = solution.y[0, :-1]
            state = solution.y[:, -1]
    return receiver_v, driver_a


def main():
    for cells in (120, 240):
        receiver_v, driver_a = solve(cells)
        low_a, high_a = junction_a(-receiver_v), junction_a(receiver_v - SWING_V)
        step_s = PERIOD_S / SAMPLES
        # Each heats while it conducts; the upper one's drop is over the supply.
        power_w = np.mean(low_a * -receiver_v), np.mean(high_a * (receiver_v - SWING_V))
        rms_a = np.abs(np.fft.rfft(driver_a)) * np.sqrt(2) / SAMPLES
        print(f"{cells} cells")
        print(f"  receiver {receiver_v.min():.4f} .. {receiver_v.max():.4f} V")
        print(f"  clamp peaks, low and high: {1e3 * low_a.max():.2f}, {1e3 * high_a.max():.2f} mA")
        print(f"  charge: {1e12 * low_a.sum() * step_s:.2f}, {1e12 * high_a.sum() * step_s:.2f} pC an edge")
        print(f"  mean power: {1e3 * power_w[0]:.4f}, {1e3 * power_w[1]:.4f} mW")
        levels = ", ".join(f"{20 * np.log10(rms_a[n] * 1e6):.2f}" for n in range(1, 20, 2))
        print(f"  driver current, harmonics 1, 3 .. 19, dBuA rms: {levels}", flush=True)


if __name__ == "__main__":
    main()
