"""Makes open_ends.json: stacks that let electrons out, with their complex levels and their transmission.

    python make_open_ends.py [OUTPUT]          default: open_ends.json beside this script

Another method than the program's: (psi, A psi') is carried across each layer exactly, by exponentials without a field and
by Airy functions with one, and matched to outgoing waves outside. The roots E - i Gamma/2 of the mismatch are found by
the secant method in the complex plane from a grid of starts, and refined with 50 digits, so that widths far below the
rounding of double precision have all their digits.

Without a field the outermost material goes on, flat; with one the field goes on too. The wave that leaves downhill is
Bi + i Ai of an argument that falls outwards, that which dies out uphill is Ai (Abramowitz & Stegun 1964, 10.4.60 ff.).
`transmission` lists [E, T] between flat leads at the potential of each end.

Each stack is an object with `name`, `structure` (a Wellwright structure file), `states` as [E eV, Gamma eV] and
`transmission`. States wider than 100 meV, and such above the range searched, are left out. `wells` are symmetric wells with
`strengths`, [photon energy in eV, oscillator strength per eV] from the ground state into the continuum.
"""

import json
import sys
from pathlib import Path

from mpmath import mp, mpc, mpf

K = "0.03809982110968584"  # hbar^2 / (2 m0) in eV nm^2, CODATA 2022, as text for all digits
DIGITS = 50
WIDEST_EV = 0.1


class Layer:
    """One layer; `law` is () or (E',), the two-band law, or (gap, spin-orbit, Kane energy, F)."""

    def __init__(self, width_nm, edge_ev, mass, *law):
        self.given = (width_nm, edge_ev, mass, *law)

    def a(self, energy, raised=0):
        _, edge, mass, *law = (mpf(str(x)) for x in self.given)
        edge += raised
        if len(law) == 4:
            gap, delta, kane, f = law
            above = energy - edge + gap
            return mpf(K) * (1 + 2 * f + kane / 3 * (2 / above + 1 / (above + delta)))
        if law:
            return mpf(K) / mass / (1 + (energy - edge) / law[0])
        return mpf(K) / mass

    def edge(self):
        return mpf(str(self.given[1]))

    def width(self):
        return mpf(str(self.given[0]))

    def material(self):
        _, edge, mass, *law = self.given
        text = f"conduction_edge: {edge} eV, electron_mass: {mass}"
        if len(law) == 4:
            text += f", gap: {law[0]} eV, spin_orbit: {law[1]} eV, kane_energy: {law[2]} eV, remote_band_f: {law[3]}"
        elif law:
            text += f", nonparabolicity_energy: {law[0]} eV"
        return text


def root(value):
    """The square root of a wave that leaves, or dies out: its cut runs straight down."""
    return mp.sqrt(value) if value.real > 0 else mpc(0, 1) * mp.sqrt(-value)


def flat_cross(layer, energy, raised, psi, u, steps=1):
    """Carries (psi, u = A psi') across a flat layer."""
    a = layer.a(energy, raised)
    k = mp.sqrt((energy - layer.edge() - raised) / a)
    c, s = mp.cos(k * layer.width()), mp.sin(k * layer.width())
    return psi * c + u * s / (a * k), -psi * a * k * s + u * c


def airy(xi):
    return mp.airyai(xi), mp.airyai(xi, derivative=1), mp.airybi(xi), mp.airybi(xi, derivative=1)


def scaled(layer, energy, field, z):
    """xi of the Airy equation at z, with its slope: A psi'' = (edge + field z - E) psi."""
    a = layer.a(energy)
    slope = mp.cbrt(abs(field) / a) * (1 if field > 0 else -1)
    return slope * (z + (layer.edge() - energy) / field), slope, a


def tilted_cross(layer, energy, field, z, psi, u):
    bottom, slope, a = scaled(layer, energy, field, z)
    top = bottom + slope * layer.width()
    ai, ai1, bi, bi1 = airy(bottom)
    d = u / (a * slope)
    # The Wronskian of Ai and Bi is 1/pi.
    x, y = mp.pi * (psi * bi1 - d * bi), mp.pi * (d * ai - psi * ai1)
    ai, ai1, bi, bi1 = airy(top)
    return x * ai + y * bi, a * slope * (x * ai1 + y * bi1)


def outside(layer, energy, field, z):
    """(psi, A psi') of what is allowed outside, by the direction in which the potential rises there."""
    xi, slope, a = scaled(layer, energy, field, z)
    ai, ai1, bi, bi1 = airy(xi)
    up = (ai, a * slope * ai1)
    down = (bi + mpc(0, 1) * ai, a * slope * (bi1 + mpc(0, 1) * ai1))
    return up, down


def mismatch(layers, field, energy):
    first, last = layers[0], layers[-1]
    if field == 0:
        psi, u = mpf(1), -mpc(0, 1) * first.a(energy) * root((energy - first.edge()) / first.a(energy))
        for layer in layers:
            psi, u = flat_cross(layer, energy, 0, psi, u)
        return u - mpc(0, 1) * last.a(energy) * root((energy - last.edge()) / last.a(energy)) * psi
    up, down = outside(first, energy, field, mpf(0))
    psi, u = down if field > 0 else up
    z = mpf(0)
    for layer in layers:
        psi, u = tilted_cross(layer, energy, field, z, psi, u)
        z += layer.width()
    up, down = outside(last, energy, field, z)
    end, flux = up if field > 0 else down
    return u * end - psi * flux


def transmission(layers, field, energy):
    """Between flat leads: psi = t exp(i k z) at the top, carried down to the incoming and the reflected wave."""
    total = sum(layer.width() for layer in layers)
    first, last = layers[0], layers[-1]
    a_top, a_bottom = last.a(energy, field * total), first.a(energy)
    k_top = mp.sqrt((energy - last.edge() - field * total) / a_top)
    k_bottom = mp.sqrt((energy - first.edge()) / a_bottom)
    # Carried upwards as two columns, then solved for r and t.
    columns = []
    for psi, u in ((mpf(1), mpf(0)), (mpf(0), mpf(1))):
        z = mpf(0)
        for layer in layers:
            if field == 0:
                psi, u = flat_cross(layer, energy, 0, psi, u)
            else:
                psi, u = tilted_cross(layer, energy, field, z, psi, u)
            z += layer.width()
        columns.append((psi, u))
    i = mpc(0, 1)
    m = mp.matrix([[columns[0][0], columns[1][0]], [columns[0][1], columns[1][1]]])
    start = m * mp.matrix([1, i * a_bottom * k_bottom])
    back = m * mp.matrix([1, -i * a_bottom * k_bottom])
    # start + r back = t (1, i A k)
    end = mp.matrix([1, i * a_top * k_top])
    r = (start[1] * end[0] - start[0] * end[1]) / (back[0] * end[1] - back[1] * end[0])
    t = start[0] + r * back[0]
    return abs(t) ** 2 * a_top * k_top / (a_bottom * k_bottom)


def states(layers, field, search):
    low, high, starts, depths = search
    found = []
    for depth in depths:
        for step in range(starts):
            guess = mpc(low + (high - low) * (step + 0.5) / starts, -depth)
            mp.dps = 16 if field else 24
            try:
                value = mp.findroot(lambda e: mismatch(layers, field, e), (guess, guess + mpf("1e-4")), tol=1e-16 if field else 1e-30, maxsteps=10)
            except (ValueError, ZeroDivisionError):
                continue
            if not (low < value.real < high and -WIDEST_EV / 2 < value.imag < 1e-12):
                continue
            if any(abs(value - other) < 1e-10 for other in found):
                continue
            mp.dps = DIGITS
            value = mp.findroot(lambda e: mismatch(layers, field, e), (value, value * (1 + mpf("1e-15"))), tol=mpf(10) ** (-35), maxsteps=20, verify=False)
            found.append(value)
    mp.dps = DIGITS
    found.sort(key=lambda value: value.real)
    return [[float(value.real), max(0.0, float(-2 * value.imag))] for value in found]


def strength(layers, photon):
    """df/d(photon energy) in 1/eV from the ground state of a symmetric well into the odd states of the continuum.

    By quadrature over standing waves N sin(k |z| + d) outside, with N^2 = 1/(2 pi A k): one per unit of energy, in all
    components together. The barriers go on outside.
    """
    outer, well, _ = layers
    half = well.width() / 2
    barrier = outer.edge()

    def bound(energy):
        q, kappa = mp.sqrt((energy - well.edge()) / well.a(energy)), mp.sqrt((barrier - energy) / outer.a(energy))
        return q, kappa, well.a(energy) * q * mp.sin(q * half) - outer.a(energy) * kappa * mp.cos(q * half)

    low, high = well.edge() + mpf("1e-6"), barrier - mpf("1e-6")
    top = well.edge() + well.a(low) * (mp.pi / (2 * half)) ** 2
    ground = mp.findroot(lambda e: bound(e)[2], (low, min(high, top)), solver="anderson", tol=1e-30, verify=False)
    q0, kappa, _ = bound(ground)
    energy = ground + photon
    q, k = mp.sqrt((energy - well.edge()) / well.a(energy)), mp.sqrt((energy - barrier) / outer.a(energy))
    # (psi, A psi') at the border of the well: sin inside is matched to c sin(k s) + d cos(k s) outside.
    d = mp.sin(q * half)
    c = well.a(energy) * q * mp.cos(q * half) / (outer.a(energy) * k)
    unit = 1 / mp.sqrt(2 * mp.pi * outer.a(energy) * k * (c * c + d * d))

    def divided(layer, e, f):
        return -mp.diff(layer.a, e) if e == f else -(layer.a(e) - layer.a(f)) / (e - f)

    def inside(f, g, e):
        return f[0] * g[0] + divided(well, ground, e) * f[1] * g[1]

    def outside(f, g, e):
        return f[0] * g[0] + divided(outer, ground, e) * f[1] * g[1]

    ground_in = lambda z: (mp.cos(q0 * z), -q0 * mp.sin(q0 * z))
    tail = mp.cos(q0 * half)
    ground_out = lambda s: (tail * mp.exp(-kappa * s), -kappa * tail * mp.exp(-kappa * s))
    free_in = lambda z: (mp.sin(q * z), q * mp.cos(q * z))
    free_out = lambda s: (c * mp.sin(k * s) + d * mp.cos(k * s), k * (c * mp.cos(k * s) - d * mp.sin(k * s)))
    end = 60 / kappa
    pieces = [end * n / 12 for n in range(13)]
    norm = 2 * (
        mp.quad(lambda z: inside(ground_in(z), ground_in(z), ground), [0, half])
        + mp.quad(lambda s: outside(ground_out(s), ground_out(s), ground), pieces)
    )
    element = 2 * unit * (
        mp.quad(lambda z: z * inside(ground_in(z), free_in(z), energy), [0, half])
        + mp.quad(lambda s: (half + s) * outside(ground_out(s), free_out(s), energy), pieces)
    )
    return photon * element**2 / norm / mpf(K)


def structure(name, layers, field_kv_per_cm):
    model = "energy-dependent" if len(layers[0].given) > 3 else "parabolic"
    materials = list(dict.fromkeys(layer.material() for layer in layers))
    lines = [f"title: Reference stack {name}"]
    if field_kv_per_cm:
        lines.append(f"field: {field_kv_per_cm} kV/cm")
    lines += ["ends: open", "bands:", f"  conduction: {{model: {model}, states: 8}}", "materials:"]
    lines += [f"  M{n + 1}: {{{text}}}" for n, text in enumerate(materials)]
    lines.append("layers:")
    lines += [
        f"  - {{material: M{materials.index(layer.material()) + 1}, width: {layer.given[0]} nm}}" for layer in layers
    ]
    return "\n".join(lines) + "\n"


def cases():
    """Name, layers, field in kV/cm, (low, high, starts, depths) of the search, energies for the transmission."""
    gaas, algaas = (0.0, 0.067), (0.23, 0.092)
    yield "double barrier", [Layer(3, *gaas), Layer(3, *algaas), Layer(5, *gaas), Layer(3, *algaas), Layer(3, *gaas)], 0, (
        0.01, 0.33, 12, (0.0, 0.01)), [0.01, 0.05, 0.08, 0.15, 0.25, 0.4]
    lower, higher = (0.05, 0.075), (0.3, 0.1)
    yield "double barrier between unlike leads", [
        Layer(4, *gaas), Layer(4, *algaas), Layer(6, *gaas), Layer(2.5, *higher), Layer(4, *lower)], 0, (
        0.01, 0.39, 12, (0.0, 0.01)), [0.06, 0.1, 0.2, 0.35]
    yield "thick barriers", [Layer(2, *gaas), Layer(25, *algaas), Layer(7, *gaas), Layer(30, *algaas), Layer(2, *gaas)], 0, (
        0.01, 0.2, 12, (0.0,)), [0.02, 0.1, 0.2]
    well, barrier = (0.0, 0.043, 0.79), (0.52, 0.075, 1.45)
    yield "double barrier, two-band law", [
        Layer(3, *well), Layer(2.5, *barrier), Layer(5, *well), Layer(2, *barrier), Layer(3, *well)], 0, (
        0.01, 0.6, 12, (0.0, 0.02)), [0.05, 0.12, 0.3, 0.6]
    high = (0.35, 0.065, 1.3)
    yield "double barrier, one lead above the levels", [
        Layer(1.5, *high), Layer(1, *barrier), Layer(7, *well), Layer(2, *barrier), Layer(3, *well)], 0, (
        0.01, 0.6, 9, (0.0, 0.01)), [0.4, 0.5]
    kane_well, kane_barrier = (0.0, 0.067, 1.519, 0.341, 28.8, -1.94), (0.25, 0.09, 1.9, 0.33, 26.0, -1.6)
    yield "detector well, Kane's law", [Layer(20, *kane_barrier), Layer(5, *kane_well), Layer(20, *kane_barrier)], 0, (
        0.01, 0.345, 8, (0.0, 0.03)), [0.26, 0.28, 0.33]
    yield "well in a field", [Layer(8, *algaas), Layer(6, *gaas), Layer(8, *algaas)], 150, (
        0.15, 0.45, 3, (0.0, 0.02)), [0.6, 0.7]
    yield "well in a weak field", [Layer(10, 0.15, 0.08), Layer(5, *gaas), Layer(10, 0.15, 0.08)], -20, (
        0.02, 0.06, 2, (0.0,)), [0.2, 0.3]
    yield "double well in a field", [
        Layer(6, *algaas), Layer(4, *gaas), Layer(2, *algaas), Layer(6, *gaas), Layer(6, *algaas)], 80, (
        0.1, 0.36, 5, (0.0,)), [0.45, 0.5]


def detector_wells():
    """Name, layers and photon energies above the edge of the continuum."""
    barrier, well = (0.21, 0.089), (0.0, 0.067)
    yield "detector well", [Layer(15, *barrier), Layer(4, *well), Layer(15, *barrier)], [0.14, 0.2, 0.4]
    barrier, well = (0.3, 0.08, 1.5), (0.0, 0.05, 1.1)
    yield "detector well, two-band law", [Layer(15, *barrier), Layer(4.5, *well), Layer(15, *barrier)], [0.25, 0.4]


def main():
    output = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).with_name("open_ends.json")
    mp.dps = DIGITS
    stacks = []
    for name, layers, field_kv_per_cm, search, energies in cases():
        field = mpf(str(field_kv_per_cm)) / 10**4
        stacks.append({
            "name": name,
            "structure": structure(name, layers, field_kv_per_cm),
            "states": states(layers, field, search),
            "transmission": [[e, float(transmission(layers, field, mpf(str(e))))] for e in energies],
        })
    wells = []
    mp.dps = 16
    for name, layers, photons in detector_wells():
        wells.append({
            "name": name,
            "structure": structure(name, layers, 0),
            "strengths": [[e, float(strength(layers, mpf(str(e))))] for e in photons],
        })
    about = "Complex levels and transmission of stacks with open ends; made by make_open_ends.py"
    output.write_text(json.dumps({"about": about, "stacks": stacks, "wells": wells}, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
