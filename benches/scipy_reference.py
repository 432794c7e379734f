"""Time of central differences with LAPACK's tridiagonal eigensolvers, through scipy, for comparison with Wellwright.

    pip install -r tests/reference/requirements.txt
    python benches/scipy_reference.py

The case: a double well in a field, four states with their vectors and all dipoles among them, at a worst level error of
1 ueV against Airy-function matching (tests/reference). The coarsest grid that reaches it is found first. Every interface
is a grid point; the mass between two points is the harmonic mean there (BenDaniel-Duke), which on such a grid is the mass
of the layer; a point on an interface takes its edge from both sides. The time is the median over many solves and covers the
matrix, the eigenpairs and the dipoles. The matrix is tridiagonal, so LAPACK uses one thread.
"""

import math
import sys
import time
from pathlib import Path

import numpy as np
from scipy.linalg import eigh_tridiagonal

sys.path.insert(0, str(Path(__file__).parent.parent / "tests" / "reference"))

from bands import K, Layer, Stack
from propagate import closed_form
from solve import dipoles_closed_form, levels

STATES = 4
TARGET_EV = 1e-6
BARRIER = (0.25, 0.09)
WELL = (0.0, 0.067)
CASE = Stack(
    (Layer(10.0, *BARRIER), Layer(6.0, *WELL), Layer(2.0, *BARRIER), Layer(5.0, *WELL), Layer(10.0, *BARRIER)), 20.0
)
DRIVERS = {
    "stebz": "bisection and inverse iteration",
    "stemr": "relatively robust representations, scipy's choice",
}


def solve(stack, spacing_nm, driver):
    """(levels in eV, dipoles in nm) with about that spacing, adjusted to each layer."""
    counts = [math.ceil(layer.width_nm / spacing_nm - 1e-9) for layer in stack.layers]
    width = np.repeat([layer.width_nm / count for layer, count in zip(stack.layers, counts)], counts)
    edge = np.repeat([layer.conduction_edge_ev for layer in stack.layers], counts)
    stiffness = float(K) / np.repeat([layer.electron_mass_m0 for layer in stack.layers], counts) / width
    z = np.cumsum(width)[:-1]
    share = (width[:-1] + width[1:]) / 2
    potential = (edge[:-1] * width[:-1] + edge[1:] * width[1:]) / (2 * share) + stack.field(float) * z
    diagonal = (stiffness[:-1] + stiffness[1:]) / share + potential
    beside = -stiffness[1:-1] / np.sqrt(share[:-1] * share[1:])
    values, vectors = eigh_tridiagonal(diagonal, beside, select="i", select_range=(0, STATES - 1), lapack_driver=driver)
    return values, vectors.T @ (z[:, None] * vectors)


def error(spacing_nm, exact, driver="stemr"):
    return np.max(np.abs(solve(CASE, spacing_nm, driver)[0] - exact))


def coarsest_grid(exact):
    """The largest spacing 1/n nm that reaches the target."""
    good = 1
    while error(1 / good, exact) > TARGET_EV:
        good *= 2
    bad = good // 2
    while good - bad > 1:
        middle = (good + bad) // 2
        good, bad = (middle, bad) if error(1 / middle, exact) <= TARGET_EV else (good, middle)
    return 1 / good


def main():
    energies, reach = levels(CASE, STATES, closed_form)
    exact = np.array([float(energy) for energy in energies])
    dipoles = [(i - 1, j - 1, float(z)) for i, j, z in dipoles_closed_form(CASE, energies, reach)]
    print("exact levels (eV):", "  ".join(f"{value:.15g}" for value in exact))
    spacing = coarsest_grid(exact)
    points = sum(math.ceil(layer.width_nm / spacing - 1e-9) for layer in CASE.layers) - 1
    print(f"grid: {points} points, {spacing:.5f} nm apart")
    for driver, meaning in DRIVERS.items():
        _, found = solve(CASE, spacing, driver)
        worst_dipole = max(abs(abs(found[i, j]) - z) / z for i, j, z in dipoles)
        times = []
        end = time.perf_counter() + 3
        while time.perf_counter() < end or len(times) < 51:
            start = time.perf_counter()
            solve(CASE, spacing, driver)
            times.append(time.perf_counter() - start)
        print(
            f"{driver} ({meaning}): {1e3 * np.median(times):.3f} ms a solve (median of {len(times)},"
            f" fastest {1e3 * min(times):.3f} ms), worst level error {1e6 * error(spacing, exact, driver):.3f} ueV,"
            f" worst dipole error {worst_dipole:.1e} relative"
        )


if __name__ == "__main__":
    main()
