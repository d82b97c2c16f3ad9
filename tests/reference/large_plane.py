"""Regenerates large_plane_wire.json: a wire trace over an infinite perfect plane, by a thin-wire method of moments.

    python3 tests/reference/large_plane.py

The wire of 0.2 mm radius runs at a height over the plane and comes down to it through an upright wire at each end.
Source and load are gaps in the lower half of the uprights. The solver is momwire's (quadratic B-splines, Galerkin,
extended kernel, perfect ground by images); it knows neither transmission lines nor our closed form. The far field of
its currents and their images is summed here, and the largest over the half sphere is taken.

Prints how far halving the segments moves the fields, how far the loops lie from the small-loop formula, and how
far the rows lie from those of large_plane.json, which come from another program.
Needs NumPy and momwire (pip install momwire==0.84.3).
"""

import importlib.metadata
import json
import pathlib
import warnings

import numpy as np
from momwire import BSplineSolver

LIGHT_SPEED_M_PER_S = 299_792_458.0
ETA0_OHM = 376.730313668
RADIUS_M = 0.2e-3
# 2.5 radii: below two the thin-wire kernel no longer converges.
UPRIGHT_SEGMENT_M = 0.5e-3
SEGMENT_M = 1e-3

HEIGHTS_MM = [2]
LENGTHS_MM = [50, 100]
FREQUENCIES_HZ = [30e6, 60e6, 100e6, 200e6, 300e6, 500e6, 700e6, 1e9, 1.5e9, 2e9]
LOADS = ["matched", "cmos", "r47", "short"]

HERE = pathlib.Path(__file__).parent


def ends_ohm(load, line_ohm, frequency_hz):
    """Impedances of the source and of the load."""
    return {
        "matched": (line_ohm, line_ohm),
        "cmos": (3.0, 1 / (2j * np.pi * frequency_hz * 5e-12)),
        "r47": (47.0, line_ohm),
        "short": (3.0, 0.0),
    }[load]


def half_sphere():
    """Unit vectors a degree apart; the wire's own upright plane halves the azimuths."""
    theta, phi = np.meshgrid(np.radians(np.arange(91)), np.radians(np.arange(181)), indexing="ij")
    return np.stack([np.sin(theta) * np.cos(phi), np.sin(theta) * np.sin(phi), np.cos(theta)], -1)


def largest_field_v(frequency_hz, middles_m, moments_am):
    """Largest far field of current moments over the plane, times the distance."""
    toward = half_sphere()
    middles_m = np.vstack([middles_m, middles_m * [1, 1, -1]])
    moments_am = np.vstack([moments_am, moments_am * [-1, -1, 1]])
    wavenumber = 2 * np.pi * frequency_hz / LIGHT_SPEED_M_PER_S
    sums = np.exp(1j * wavenumber * (toward @ middles_m.T)) @ moments_am
    sums -= toward * np.sum(sums * toward, -1, keepdims=True)
    return ETA0_OHM * wavenumber / (4 * np.pi) * np.linalg.norm(sums, axis=-1).max()


def row(height_mm, length_mm, load, frequency_hz, finer=1, upright_finer=1):
    height_m, length_m = height_mm * 1e-3, length_mm * 1e-3
    corners_m = [[0, 0, 0], [0, 0, height_m], [length_m, 0, height_m], [length_m, 0, 0]]
    upright = round(height_m / UPRIGHT_SEGMENT_M * upright_finer)
    source_at_m, load_at_m = height_m / 4, length_m + 2 * height_m - height_m / 4
    solver = BSplineSolver(
        wires=[np.array(corners_m, dtype=float)],
        n_per_edge_per_wire=[[upright, round(length_m / SEGMENT_M * finer), upright]],
        feeds=[(0, source_at_m, 1.0), (0, load_at_m, 0.0)],
        wavelength=LIGHT_SPEED_M_PER_S / frequency_hz,
        wire_radius=RADIUS_M,
        ground_z=0.0,
        extended_kernel=True,
    )
    gaps = solver.compute_port_solution()
    line_ohm = 60 * np.arccosh(height_m / RADIUS_M)
    ohm = np.diag(ends_ohm(load, line_ohm, frequency_hz))
    gap_v = np.linalg.solve(np.eye(2) + ohm @ gaps.y, [1.0, 0.0])
    driver_a, load_a = np.abs(gaps.y @ gap_v)
    middles_m, moments_am, *_ = solver.element_currents(gaps.coeffs @ gap_v)
    field_v = largest_field_v(frequency_hz, middles_m, moments_am)
    return {
        "case": "large plane",
        "frequency_hz": frequency_hz,
        "driver_current_a": rounded(driver_a),
        "load_current_a": rounded(load_a),
        "field_3m_v_per_m": rounded(field_v / 3),
        "field_10m_v_per_m": rounded(field_v / 10),
        "height_mm": height_mm,
        "length_mm": length_mm,
        "load": load,
    }


def rounded(value):
    return float(f"{value:.6g}")


def key(values):
    return tuple(values[name] for name in ["height_mm", "length_mm", "load", "frequency_hz"])


def said(off_db):
    """Median, 95 % and worst, by rank as the tests do."""
    size = np.sort(np.abs(off_db))
    at = [size[int(np.ceil(share * len(size))) - 1] for share in (0.5, 0.95, 1.0)]
    return "{} rows, median {:.2f} dB, 95 % {:.2f} dB, worst {:.2f} dB".format(len(size), *at)


def fields_apart(ours, others, lowest_hz=0.0):
    theirs = {key(other): other["field_3m_v_per_m"] for other in others}
    ratios = [
        row["field_3m_v_per_m"] / theirs[key(row)] for row in ours if row["frequency_hz"] >= lowest_hz
    ]
    return 20 * np.log10(ratios)


def small_loop_off_db(row):
    """Of a shorted net against its area, its current and the image (Paul, Scully & Steffka, 3rd ed., eq. 8.12)."""
    wavenumber = 2 * np.pi * row["frequency_hz"] / LIGHT_SPEED_M_PER_S
    area_m2 = row["height_mm"] * row["length_mm"] * 1e-6
    field = 2 * ETA0_OHM * wavenumber**2 * area_m2 * row["load_current_a"] / (4 * np.pi * 3)
    return 20 * np.log10(row["field_3m_v_per_m"] / field)


def main():
    # A height of ten radii is little over a lossy soil, which it warns of; this plane is perfect.
    warnings.filterwarnings("ignore", message=".*near-ground wire")
    cases = [
        (height, length, load, frequency)
        for height in HEIGHTS_MM
        for length in LENGTHS_MM
        for load in LOADS
        for frequency in FREQUENCIES_HZ
    ]
    rows = [row(*case) for case in cases]
    for name, mesh in [("wire", {"finer": 2}), ("uprights, to 1.25 radii", {"upright_finer": 2})]:
        # The second is past the kernel's own limit, and says so.
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            finer = [row(*case, **mesh) for case in cases]
        print(f"segments halved ({name}): {said(fields_apart(rows, finer))}")

    reference = json.loads((HERE / "large_plane.json").read_text())["rows"]
    for name, table in [("here", rows), ("in large_plane.json", reference)]:
        loops = [r for r in table if r["load"] == "short" and r["frequency_hz"] == 30e6]
        off = ", ".join(f"{small_loop_off_db(r):+.2f} dB" for r in loops)
        print(f"30 MHz into a short against the small loop, {name}: {off}")
    for name, lowest_hz in [("all", 0.0), ("from 50 MHz", 50e6)]:
        print(f"against large_plane.json, {name}: {said(fields_apart(rows, reference, lowest_hz))}")

    header = {
        "what": "Full-wave results for a bare wire trace in air over an infinite perfect plane, 1 V (amplitude) "
        "source. Columns, wires and loads as in large_plane.json.",
        "how": "thin-wire method of moments, quadratic B-splines, extended kernel, perfect ground by images; wire "
        "radius 0.2 mm, segments of 1 mm along the wire and 0.5 mm up the uprights; source and load in gaps in the "
        "lower half of the uprights; far field over a grid of one degree of the half sphere.",
        "from": f"tests/reference/large_plane.py, momwire {importlib.metadata.version('momwire')}",
    }
    lines = [f"  {json.dumps(k)}: {json.dumps(v)},\n" for k, v in header.items()]
    body = ",\n".join(f"    {json.dumps(r)}" for r in rows)
    (HERE / "large_plane_wire.json").write_text("{\n" + "".join(lines) + '  "rows": [\n' + body + "\n  ]\n}\n")


if __name__ == "__main__":
    main()
