"""Checks stacks.json against methods that share nothing, or little, with those that made it.

    python cross_check.py [STACKS]          default: stacks.json beside this script

1. Every level: the Pruefer angle at the top wall, integrated layer by layer with an explicit Runge-Kutta method of order
   8 (scipy's DOP853), is below n pi at E_n - 1e-10 eV and above it at E_n + 1e-10 eV. This proves the number of the
   level as well.
2. Levels again, by the other kind of propagation where there is one: power series for parabolic layers, closed forms for
   energy-dependent masses without field.
3. Dipoles of parabolic stacks: quadrature of the power series against the closed forms.
4. Dipoles of the energy-dependent laws: the multi-component Hamiltonian itself, discretised by central differences
   (psi on nodes, phi_r between them) on layer-aligned grids and extrapolated to spacing zero.
5. The solver of stacks.json on the wells of closed_forms.json, with barriers so wide that the walls do not matter.

Exit code 1 when a difference is beyond its tolerance.
"""

import json
import math
import multiprocessing
import sys
from pathlib import Path

import numpy as np
import scipy.integrate
import scipy.linalg

from bands import K, Layer, Stack
from propagate import closed_form, series
from solve import dipoles_closed_form, dipoles_series, levels

LEVEL_MARGIN_EV = 1e-10
MARGIN_SHARES = (1.0, 0.1, 0.01)  # the smallest that holds is reported
LEVEL_TOLERANCE_EV = 1e-12
CLOSED_FORM_TOLERANCE = 1e-13  # eV for levels, nm for dipoles
DIPOLE_TOLERANCE = 1e-9
DIPOLE_FLOOR_NM = 1e-11
DIFFERENCES_TOLERANCE = 5e-7
DIFFERENCES_FLOOR_NM = 5e-7


def top_angles(stack, energies):
    """The Pruefer angle at the top wall: psi = r sin(angle), A psi' = S r cos(angle)."""
    scale = 0.1  # S in eV nm; any positive number will do
    angle = np.zeros(len(energies))
    slope = stack.field(float)
    for layer, bottom, _ in stack.edges():
        p, q = (np.array(c) for c in layer.inverse_a(float))

        def rate(z, y, bottom=bottom, layer=layer, p=p, q=q):
            kinetic = energies - (bottom + slope * z)
            x = kinetic + layer.shift(float)
            inverse_a = np.polynomial.polynomial.polyval(x, p) / np.polynomial.polynomial.polyval(x, q)
            return scale * inverse_a * np.cos(y) ** 2 + kinetic / scale * np.sin(y) ** 2

        angle = scipy.integrate.solve_ivp(
            rate, (0.0, layer.width_nm), angle, method="DOP853", rtol=1e-12, atol=1e-13
        ).y[:, -1]
    return angle


def differences(stack, energies, per_nm):
    """|z_ij| of the multi-component Hamiltonian by central differences.

    With the components phi eliminated, the equation for psi on the nodes is a tridiagonal eigenproblem that is nonlinear
    in E; Newton's method from the reference level gives the eigenpair of the discretised Hamiltonian next to it.
    """
    cells = []
    slope = stack.field(float)
    for (layer, bottom, _), start in zip(stack.edges(), stack.starts(float)):
        count = math.ceil(layer.width_nm * per_nm)
        width = layer.width_nm / count
        offset = (np.arange(count) + 0.5) * width
        cells.append((layer, np.full(count, width), start + offset, bottom + slope * offset))
    widths = np.concatenate([c[1] for c in cells])
    middles = np.concatenate([c[2] for c in cells])
    edges = np.concatenate([c[3] for c in cells])
    nodes = np.concatenate([[0.0], np.cumsum(widths)])[1:-1]
    most = max(len(layer.components(float)) for layer, *_ in cells)
    s, pole = np.zeros((most, len(widths))), np.zeros((most, len(widths)))
    constant = np.zeros(len(widths))
    at = 0
    for layer, width, _, edge in cells:
        here = slice(at, at + len(width))
        at += len(width)
        if layer.gap_ev is not None:
            constant[here] = float(K) * (1 + 2 * layer.remote_band_f)
        for r, (strength, below) in enumerate(layer.components(float)):
            s[r, here] = strength
            pole[r, here] = edge - layer.shift(float) - below
    # Potential energy at a node: half a cell from each side, each with its own edge at the node.
    left, right = edges[:-1] + slope * widths[:-1] / 2, edges[1:] - slope * widths[1:] / 2
    mass = (widths[:-1] + widths[1:]) / 2
    potential = (left * widths[:-1] + right * widths[1:]) / 2
    states = []
    for energy in energies:
        psi = np.sin(np.pi * nodes / nodes[-1] * (len(states) + 1) * 0.997)
        value = float(energy)
        for step in range(30):
            a = (constant + np.sum(s / (value - pole), axis=0)) / widths
            bands = np.zeros((3, len(nodes)))
            bands[0, 1:] = bands[2, :-1] = -a[1:-1]
            bands[1] = a[:-1] + a[1:] + potential - value * mass
            if step == 0:
                # Two rounds at the reference energy to turn psi towards its state.
                for _ in range(2):
                    psi = scipy.linalg.solve_banded((1, 1), bands, mass * psi)
                    psi /= np.sqrt(np.sum(mass * psi**2))
            # Newton for the nonlinear eigenproblem: the derivative of the matrix by E is -(mass + that of phi).
            gradient = np.diff(np.concatenate([[0.0], psi, [0.0]])) / widths
            flow = np.sum(s / (value - pole) ** 2, axis=0) * gradient
            metric = mass * psi + flow[:-1] - flow[1:]
            turned = scipy.linalg.solve_banded((1, 1), bands, metric)
            change = np.dot(psi, metric) / np.dot(metric, turned)
            psi = turned / np.sqrt(np.sum(mass * turned**2))
            value += change
            if abs(change) < 1e-11:
                # The error squares with each step.
                break
        else:
            raise ArithmeticError(f"{energy}: the central differences do not settle ({change})")
        gradient = np.diff(np.concatenate([[0.0], psi, [0.0]])) / widths
        phi = np.sqrt(s) * gradient / (value - pole)
        norm = np.sqrt(np.sum(mass * psi**2) + np.sum(widths * phi**2))
        states.append((psi / norm, phi / norm, value))
    moment = widths * middles
    # int z over the half cells around a node
    nodal = (nodes**2 - (nodes - widths[:-1] / 2) ** 2 + (nodes + widths[1:] / 2) ** 2 - nodes**2) / 2
    count = len(states)
    dipoles = [
        np.sum(nodal * states[i][0] * states[j][0]) + np.sum(moment * states[i][1] * states[j][1])
        for i in range(count)
        for j in range(i + 1, count)
    ]
    return np.abs(dipoles), np.array([value for *_, value in states])


def check(entry):
    """(name, {check: difference as a share of its tolerance})."""
    stack = Stack(tuple(Layer(**numbers) for numbers in entry["layers"]), entry["field_kv_per_cm"])
    found = np.array(entry["levels_ev"])
    count = len(found)
    number = np.arange(1, count + 1)
    shares = {"angle": math.inf}
    margins = [LEVEL_MARGIN_EV * share for share in MARGIN_SHARES]
    angles = top_angles(stack, np.concatenate([found + sign * margin for margin in margins for sign in (-1, 1)])) / np.pi
    for share, (below, above) in zip(MARGIN_SHARES, angles.reshape(len(margins), 2, count)):
        if np.all(below < number) and np.all(above > number):
            shares["angle"] = share
    parabolic = entry["law"] == "parabolic"
    if parabolic or not stack.field_kv_per_cm:
        again, reach = levels(stack, count, series if parabolic else closed_form)
        difference = max(abs(float(a) - b) for a, b in zip(again, found))
        shares["propagation"] = difference / LEVEL_TOLERANCE_EV
    dipoles = np.array([z for *_, z in entry["dipoles_nm"]])
    if parabolic:
        others = np.array([z for *_, z in dipoles_series(stack, again, reach)[0]])
        shares["quadrature"] = float(np.max(np.abs(others - dipoles) / (DIPOLE_TOLERANCE * dipoles + DIPOLE_FLOOR_NM)))
    else:
        coarse, fine, finest = (differences(stack, found, per_nm) for per_nm in (40, 80, 160))
        first = [fine[k] + (fine[k] - coarse[k]) / 3 for k in (0, 1)]
        second = [finest[k] + (finest[k] - fine[k]) / 3 for k in (0, 1)]
        others = second[0] + (second[0] - first[0]) / 15
        # What is left is rounding, most in a pair of close levels, whose states mix easily.
        shares["differences"] = float(
            np.max(np.abs(others - dipoles) / (DIFFERENCES_TOLERANCE * dipoles + DIFFERENCES_FLOOR_NM))
        )
    return entry["name"], shares


def closed_form_stacks():
    """(id in closed_forms.json, stack, energy of the field at the origin of that check)."""

    def well(law, width, inner, outer, pad=60.0):
        return Stack((law(pad, *outer), law(width, *inner), law(pad, *outer)), 0.0)

    def kane(width, edge, mass, depth):
        # Without spin-orbit splitting and with 1 + 2F = 0 the Kane law is the two-band law of E' = Eg.
        return Layer(width, edge, mass, None, depth, 0.0, depth / mass, -0.5)

    yield "1.1", Stack((Layer(10.0, 0.0, 0.067),), 0.0), 0.0
    # The highest level lies 2 meV below the barrier and reaches far into it.
    yield "1.2a", well(Layer, 10.0, (0.0, 0.067), (0.24, 0.092), 250.0), 0.0
    yield "1.2b", well(Layer, 10.0, (0.0, 0.067), (0.24, 0.067), 250.0), 0.0
    for law in (Layer, kane):
        yield "1.3a", well(law, 6.5, (0.0, 0.067, 1.519), (0.24, 0.092, 1.8)), 0.0
        yield "1.3c", well(law, 6.0, (0.0, 0.043, 0.79), (0.52, 0.075, 1.45)), 0.0
    yield "1.3b", well(Layer, 6.5, (0.0, 0.067), (0.24, 0.092)), 0.0
    yield "1.3d", well(Layer, 6.0, (0.0, 0.043), (0.52, 0.075)), 0.0
    yield "1.4", Stack((Layer(60.0, 0.5, 0.12), Layer(10.0, 0.0, 0.067), Layer(60.0, 0.2, 0.085)), 0.0), 0.0
    yield "1.5a", Stack((Layer(10.0, 0.0, 0.067),), 20.0), 0.01
    yield "1.5b", Stack((Layer(10.0, 0.0, 0.067),), 100.0), 0.05
    yield "1.6", Stack((Layer(100.0, 0.0, 0.067),), 50.0), 0.0
    pad, inner = Layer(60.0, 0.25, 0.09), Layer(6.0, 0.0, 0.067)
    yield "1.9", Stack((pad, inner, Layer(2.0, 0.25, 0.09), inner, pad), 0.0), 0.0


def against_closed_form(job):
    """Worst difference of levels in eV and of dipoles in nm, over both kinds of propagation, and the number of levels."""
    (_, stack, offset), values = job
    expected = values["levels_ev"]
    worst = 0.0
    for method in (closed_form, series):
        found, reach = levels(stack, len(expected), method)
        worst = max([worst] + [abs(float(a) - offset - b) for a, b in zip(found, expected)])
        if "z_12_nm" in values:
            closed = method is closed_form
            dipoles = dipoles_closed_form(stack, found, reach) if closed else dipoles_series(stack, found, reach)[0]
            (_, _, z_12), _, (_, _, z_23) = dipoles
            worst = max(worst, abs(float(z_12) - values["z_12_nm"]), abs(float(z_23) - values["z_23_nm"]))
    return worst, 2 * len(expected)


def main():
    path = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).with_name("stacks.json")
    stacks = json.loads(path.read_text(encoding="utf-8"))["stacks"]
    path = Path(__file__).with_name("closed_forms.json")
    checks = {check["id"]: check["values"] for check in json.loads(path.read_text(encoding="utf-8"))["checks"]}
    with multiprocessing.Pool() as pool:
        results = pool.map(check, stacks, chunksize=1)
        jobs = [(job, checks[job[0]]) for job in closed_form_stacks()]
        closed = pool.map(against_closed_form, jobs, chunksize=1)
    worst = max(difference for difference, _ in closed)
    count = sum(levels for _, levels in closed)
    print(f"{count:3} levels with closed forms, worst difference {worst:.2e} eV or nm, of {CLOSED_FORM_TOLERANCE:g}")
    failed = not worst <= CLOSED_FORM_TOLERANCE
    texts = {
        "angle": f"Pruefer angle, of {LEVEL_MARGIN_EV:g} eV",
        "propagation": f"other propagation, of {LEVEL_TOLERANCE_EV:g} eV",
        "quadrature": f"dipoles by quadrature, of {DIPOLE_TOLERANCE:g} |z| + {DIPOLE_FLOOR_NM:g} nm",
        "differences": f"dipoles of all components, of {DIFFERENCES_TOLERANCE:g} |z| + {DIFFERENCES_FLOOR_NM:g} nm",
    }
    for key, text in texts.items():
        shares = [(shares[key], name) for name, shares in results if key in shares]
        worst, name = max(shares)
        print(f"{len(shares):3} stacks, worst share {worst:.2e} ({name}): {text}")
        for share, name in shares:
            if not share <= 1:
                failed = True
                print(f"FAILED: {name}: {share:.2e}")
    sys.exit(failed)


if __name__ == "__main__":
    main()
