"""Self-consistent subbands of five doped stacks by central differences: makes charge.json.

    python make_charge.py OUT

Independent of the program: a uniform grid whose nodes hit every interface, fluxes on its cells, LAPACK's tridiagonal
eigensolver, Poisson's equation by summing the charge from the bottom up, and Anderson mixing of the bare fixed point. Each
stack is solved on 0.1, 0.05 and 0.025 nm and extrapolated, the error being even in the step.

Each case has the levels and the Fermi level in meV from the lowest level, the electrons' electrostatic energy in meV at
each face from the bottom face, and electrons per cm2 in each level.
"""

import json
import sys

import numpy as np
from scipy.linalg import eigh_tridiagonal, lstsq
from scipy.optimize import brentq

KINETIC = 0.03809982110968584  # hbar^2/2m0, eV nm^2 (CODATA 2022)
COULOMB = 4 * np.pi * 1.4399645469  # e^2/eps0, eV nm
BOLTZMANN = 8.617333262e-5  # eV/K
STATES = 14

# Layers: material, nm, donors and acceptors per cm3. Planes: face, donors per cm2.
GAAS, ALGAAS = ("Well", 0.0, 0.067, 12.9), ("Barrier", 0.25, 0.0919, 12.0)
SAME = ("Barrier", 0.25, 0.0919, 12.9)
CASES = [
    dict(name="symmetric, no temperature", kelvin=0,
         layers=[(SAME, 2.5, 0, 0), (SAME, 17.5, 0, 0), (GAAS, 15, 0, 0), (SAME, 17.5, 0, 0), (SAME, 2.5, 0, 0)],
         planes=[(1, 2.5e11), (4, 2.5e11)]),
    dict(name="doped on one side", kelvin=77,
         layers=[(ALGAAS, 10, 0, 0), (ALGAAS, 10, 1e18, 0), (ALGAAS, 10, 0, 0), (GAAS, 20, 0, 0), (ALGAAS, 20, 0, 0)],
         planes=[]),
    dict(name="one plane in one material", kelvin=300,
         layers=[(GAAS, 30, 0, 0), (GAAS, 30, 0, 0)], planes=[(1, 3e12)]),
    dict(name="exchange", kelvin=20, exchange=True,
         layers=[(ALGAAS, 15, 0, 0), (ALGAAS, 10, 0, 0), (GAAS, 15, 0, 0), (ALGAAS, 20, 0, 0)], planes=[(1, 8e11)]),
    dict(name="heterojunction with acceptors", kelvin=4,
         layers=[(GAAS, 50, 0, 1e16), (ALGAAS, 10, 0, 0), (ALGAAS, 20, 0, 0)], planes=[(2, 7e11)]),
]


def structure(case):
    """The case as a structure file."""
    materials = sorted({layer[0] for layer in case["layers"]})
    lines = [f"temperature: {case['kelvin']} K"]
    if case.get("exchange"):
        lines.append("charge: {exchange: local density}")
    lines.append("materials:")
    for name, edge, mass, permittivity in materials:
        lines.append(f"  {name}: {{conduction_edge: {edge} eV, electron_mass: {mass}, permittivity_static: {permittivity}}}")
    lines.append("layers:")
    for index, (material, width, donors, acceptors) in enumerate(case["layers"]):
        lines += [f"  - {{sheet_donors: {sheet:e} cm^-2}}" for face, sheet in case["planes"] if face == index]
        doping = f", donors: {donors:e} cm^-3" if donors else ""
        doping += f", acceptors: {acceptors:e} cm^-3" if acceptors else ""
        lines.append(f"  - {{material: {material[0]}, width: {width} nm{doping}}}")
    return "\n".join(lines) + "\n"


def filling(x, kt):
    """kT ln(1 + exp(x/kT))."""
    if kt == 0:
        return np.maximum(x, 0)
    return np.maximum(x, 0) + kt * np.log1p(np.exp(-np.abs(x) / kt))


def exchange(density, mass, permittivity):
    """Hedin and Lundqvist (1971) in the form of Stern and Das Sarma, Phys. Rev. B 30, 840 (1984)."""
    bohr = 0.052917721 * permittivity / mass
    rydberg = 13.605693 * mass / permittivity**2
    r_s = (4 / 3 * np.pi * bohr**3 * np.maximum(density, 1e-60)) ** (-1 / 3)
    x = r_s / 21
    return -(1 + 0.7734 * x * np.log1p(1 / x)) * 2 / (np.pi * (4 / (9 * np.pi)) ** (1 / 3) * r_s) * rydberg


def solve(case, step):
    counts = [round(layer[1] / step) for layer in case["layers"]]
    faces = np.concatenate([[0], np.cumsum(counts)])
    cells = lambda column: np.repeat([layer[0][column] for layer in case["layers"]], counts)
    edge, mass, permittivity = cells(1), cells(2), cells(3)
    nodes = faces[-1] + 1
    shared = lambda cell: np.concatenate([[cell[0] / 2], (cell[1:] + cell[:-1]) / 2, [cell[-1] / 2]])
    net = np.repeat([1e-21 * (layer[2] - layer[3]) for layer in case["layers"]], counts)
    dopants = step * shared(net)
    for face, sheet in case["planes"]:
        dopants[faces[face]] += 1e-14 * sheet
    total = dopants.sum()
    kt = BOLTZMANN * case["kelvin"]
    hopping = KINETIC / mass / step**2
    outer = lambda cell: np.concatenate([[cell[0]], (cell[1:] + cell[:-1]) / 2, [cell[-1]]])
    edges = outer(edge)

    def image(u, known):
        extra = known
        potential = edges + u + known
        diagonal = (hopping[1:] + hopping[:-1]) + potential[1:-1]
        levels, vectors = eigh_tridiagonal(diagonal, -hopping[1:-1], select="i", select_range=(0, STATES - 1))
        squares = np.zeros((nodes, STATES))
        squares[1:-1] = vectors**2 / step
        inverse = ((squares[1:] + squares[:-1]) / 2 / mass[:, None]).sum(axis=0) * step
        states = 1 / inverse / (2 * np.pi * KINETIC)
        excess = lambda fermi: total - (states * filling(fermi - levels, kt)).sum()
        fermi = brentq(excess, levels[0] - 2, levels[-1] + 2, xtol=1e-15, rtol=1e-14)
        sheets = states * filling(fermi - levels, kt)
        density = squares @ sheets
        flux = np.cumsum(dopants - step * density)[:-1]
        moved = np.concatenate([[0], np.cumsum(COULOMB * flux / permittivity * step)])
        if case.get("exchange"):
            below = exchange(density[1:], mass, permittivity), exchange(density[:-1], mass, permittivity)
            extra = np.concatenate([[below[1][0]], (below[0][:-1] + below[1][1:]) / 2, [below[0][-1]]])
        return moved, extra, levels, fermi, sheets

    x = np.zeros(2 * nodes)
    history = []
    for _ in range(200):
        moved, extra, levels, fermi, sheets = image(x[:nodes], x[nodes:])
        residual = np.concatenate([moved, extra]) - x
        if np.abs(residual).max() < 1e-11:
            break
        history = history[-8:] + [(x, residual)]
        mixing = 0.3
        if len(history) > 1:
            dx = np.array([b[0] - a[0] for a, b in zip(history, history[1:])]).T
            dr = np.array([b[1] - a[1] for a, b in zip(history, history[1:])]).T
            shares = lstsq(dr, residual, cond=1e-12)[0]
            x = x + mixing * residual - (dx + mixing * dr) @ shares
        else:
            x = x + mixing * residual
    else:
        raise SystemExit(f"{case['name']}: not settled, {np.abs(residual).max():.1e} eV")
    return np.concatenate([1e3 * (levels[:4] - levels[0]), [1e3 * (fermi - levels[0])], 1e3 * moved[faces], 1e14 * sheets[:4]])


def extrapolated(case):
    coarse, middle, fine = (solve(case, step) for step in (0.1, 0.05, 0.025))
    first, second = (4 * middle - coarse) / 3, (4 * fine - middle) / 3
    return (16 * second - first) / 15, np.abs(second - first)


def main():
    cases = []
    for case in CASES:
        values, doubt = extrapolated(case)
        print(f"{case['name']}: extrapolations differ by {doubt[:-4].max():.1e} meV", file=sys.stderr)
        cases.append(dict(
            name=case["name"],
            structure=structure(case),
            levels_mev=[float(f"{v:.7f}") for v in values[:4]],
            fermi_mev=float(f"{values[4]:.7f}"),
            edges_mev=[float(f"{v:.7f}") for v in values[5:-4]],
            densities_cm2=[float(f"{v:.7e}") for v in values[-4:]],
        ))
    with open(sys.argv[1], "w", encoding="utf-8") as out:
        json.dump(cases, out, indent=1)
        out.write("\n")


if __name__ == "__main__":
    main()
