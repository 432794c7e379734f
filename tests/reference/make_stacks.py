"""Makes stacks.json: random layer stacks with their exact levels and dipoles.

    python make_stacks.py [OUTPUT]          default: stacks.json beside this script

The same bytes come out whatever the number of cores: every stack draws from a generator seeded by its own name.

The file is an object with `about`, `hbar2_over_2m0_ev_nm2` and `stacks`, a list of objects:

    name               e.g. "kane-07"
    law                parabolic | two-band | kane
    method             how the levels were found
    field_kv_per_cm    positive raises the electron energy along +z
    layers             bottom first: width_nm, conduction_edge_ev, electron_mass_m0; two-band: nonparabolicity_energy_ev;
                       kane: gap_ev, spin_orbit_ev, kane_energy_ev, remote_band_f
    levels_ev          the lowest levels between hard walls, absolute (0 as for conduction_edge_ev), z = 0 at the bottom
    dipoles_nm         [i, j, |z_ij|] for i < j, counted from 1; for the energy-dependent laws those of the
                       multi-component state (bands.py); a dipole below 1e-12 nm, zero by symmetry, is written as 0
    structure          the same stack as a Wellwright structure file

Levels are right to better than 1e-12 eV and dipoles to better than 1e-9 relative or 1e-12 nm, whichever is larger.
In every listed level the energy stays above 0.15 of the depth of each mass law, everywhere in the stack (the gap of the
Kane law, the nonparabolicity energy of the two-band law), and neighbouring levels are at least 1 ueV apart.
"""

import json
import multiprocessing
import random
import sys
from pathlib import Path

import mpmath

from bands import K, Layer, Stack, inverse_a
from propagate import closed_form, series
from solve import Unsuitable, dipoles_closed_form, dipoles_series, levels

SEED = "wellwright reference stacks 1"
PER_FAMILY = 15
LEVELS = 6
LAYER_COUNTS = (5, 7, 9, 2, 6, 8, 3, 4)


def plan():
    """(name, law, in a field, shape) of every stack; shape is `single`, `double`, `close` or a number of layers.

    `close` is a symmetric double well whose lowest levels are 1 to 50 ueV apart.
    """
    for family, law in (("parabolic", "parabolic"), ("tilted", "parabolic"), ("two-band", "two-band"), ("kane", "kane")):
        for index in range(PER_FAMILY):
            tilted = family == "tilted" or (law != "parabolic" and index % 2 == 0)
            shape = {1: "single", 4: "double"}.get(index % 6, LAYER_COUNTS[index % 8])
            if index in (7, 13) and family == "parabolic" or index == 7 and law != "parabolic":
                shape = "close"
            yield f"{family}-{index + 1:02}", law, tilted, shape


def draw_material(rng, law, barrier):
    """The layer's numbers without its width; realistic for III-V conduction bands."""
    between = lambda low, high, digits=4: round(rng.uniform(low, high), digits)
    edge = between(0.18, 0.6) if barrier else between(0.0, 0.12)
    if law != "kane":
        numbers = {"conduction_edge_ev": edge, "electron_mass_m0": between(0.05, 0.12) if barrier else between(0.03, 0.075)}
        if law == "two-band":
            numbers["nonparabolicity_energy_ev"] = between(0.9, 2.0) if barrier else between(0.5, 1.6)
        return numbers
    while True:
        gap = between(0.9, 2.2) if barrier else between(0.45, 1.6)
        spin_orbit, kane_energy = between(0.2, 0.8), between(19.0, 29.0, 2)
        edge_term = kane_energy / 3 * (2 / gap + 1 / (gap + spin_orbit))
        inverse_mass = 1 + 2 * rng.uniform(-2.9, -0.4) + edge_term
        if inverse_mass > 0 and 0.03 <= 1 / inverse_mass <= 0.12:
            mass = round(1 / inverse_mass, 5)
            return {
                "conduction_edge_ev": edge,
                "electron_mass_m0": mass,
                "gap_ev": gap,
                "spin_orbit_ev": spin_orbit,
                "kane_energy_ev": kane_energy,
                # Such that the law returns the mass at the edge.
                "remote_band_f": (1 / mass - 1 - edge_term) / 2,
            }


def draw_stack(rng, law, tilted, shape):
    width = lambda low, high: round(rng.uniform(low, high), 6)
    material = lambda barrier: draw_material(rng, law, barrier)
    pad = lambda: width(8, 25)
    if shape == "single":
        rows = [(material(True), pad()), (material(False), width(1.5, 12)), (material(True), pad())]
    elif shape == "double":
        outer, inner = material(True), material(True)
        rows = [(outer, pad()), (material(False), width(1.5, 12)), (inner, width(0.8, 10))]
        rows += [(material(False), width(1.5, 12)), (outer, pad())]
    elif shape == "close":
        outer, well = (material(True), pad()), (material(False), width(3, 9))
        rows = [outer, well, (material(True), width(3, 10)), well, outer]
    else:
        count = shape
        barrier = count % 2 == 1 or rng.random() < 0.5
        rows = []
        for index in range(count):
            at_wall = index in (0, count - 1)
            if barrier:
                rows.append((material(True), pad() if at_wall else width(0.8, 10)))
            else:
                rows.append((material(False), width(1.5, 12)))
            # Now and then two wells or two barriers touch: a step.
            if rng.random() < 0.85:
                barrier = not barrier
    field = round(rng.uniform(-60, 100), 3) if tilted else 0.0
    return Stack(tuple(Layer(width_nm=w, **numbers) for numbers, w in rows), field)


def mass_stays_positive(stack, energies):
    """The Kane law with 1 + 2F < 0 ends at a high energy; keep well below that, with m < m0 / 2."""
    return all(
        0 < inverse_a(layer, float(energy) - edge + layer.shift(float)) * float(K) < 0.5
        for layer, *edges in stack.edges()
        for edge in edges
        for energy in (energies[0], energies[-1])
    )


def solve(job):
    name, law, tilted, shape = job
    rng = random.Random(f"{SEED} {name}")
    method, dipoles_of = (closed_form, dipoles_closed_form) if law == "parabolic" else (series, dipoles_series)
    while True:
        stack = draw_stack(rng, law, tilted, shape)
        if tilted and abs(stack.field_kv_per_cm) < 2 or stack.floor(0.15) > stack.lowest_edge() + 0.5:
            continue
        try:
            energies, reach = levels(stack, 2 if shape == "close" else LEVELS, method)
            if shape == "close":
                if not 1e-6 < energies[1] - energies[0] < 5e-5:
                    continue
                energies, reach = levels(stack, LEVELS, method)
        except Unsuitable:
            continue
        if mass_stays_positive(stack, energies) and min(b - a for a, b in zip(energies, energies[1:])) > 1e-6:
            break
    dipoles = dipoles_of(stack, energies, reach)
    if law != "parabolic":
        dipoles, overlap = dipoles
        if overlap > 1e-12:
            raise ArithmeticError(f"{name}: two states overlap by {overlap}")
    return {
        "name": name,
        "law": law,
        "method": method_text(law, tilted),
        "field_kv_per_cm": stack.field_kv_per_cm,
        "layers": [layer.numbers() for layer in stack.layers],
        "levels_ev": [rounded(energy) for energy in energies],
        "dipoles_nm": [[i, j, rounded(z) if z > 1e-12 else 0.0] for i, j, z in dipoles],
        "structure": structure(name, law, stack, len(energies)),
    }


def method_text(law, tilted):
    if law == "parabolic":
        return f"matching of {'Airy' if tilted else 'circular and hyperbolic'} functions, nodes counted, 40 digits"
    return "shooting by power series, nodes counted, 40 digits; dipoles by Gauss-Legendre quadrature"


def rounded(value):
    return float(mpmath.nstr(mpmath.mpf(value), 15))


def structure(name, law, stack, states):
    """The stack as a Wellwright structure file."""
    materials = {}
    rows = []
    for layer in stack.layers:
        keys = [f"conduction_edge: {layer.conduction_edge_ev!r} eV", f"electron_mass: {layer.electron_mass_m0!r}"]
        if layer.nonparabolicity_energy_ev is not None:
            keys.append(f"nonparabolicity_energy: {layer.nonparabolicity_energy_ev!r} eV")
        if layer.gap_ev is not None:
            keys += [f"gap: {layer.gap_ev!r} eV", f"spin_orbit: {layer.spin_orbit_ev!r} eV"]
            keys += [f"kane_energy: {layer.kane_energy_ev!r} eV", f"remote_band_f: {layer.remote_band_f!r}"]
        material = materials.setdefault("{" + ", ".join(keys) + "}", f"M{len(materials) + 1}")
        rows.append(f"  - {{material: {material}, width: {layer.width_nm!r} nm}}")
    model = "parabolic" if law == "parabolic" else "energy-dependent"
    lines = [f"title: Reference stack {name}"]
    if stack.field_kv_per_cm:
        lines.append(f"field: {stack.field_kv_per_cm!r} kV/cm")
    lines += ["ends: walls", "bands:", f"  conduction: {{model: {model}, states: {states}}}", "materials:"]
    lines += [f"  {material}: {keys}" for keys, material in materials.items()]
    return "\n".join(lines + ["layers:"] + rows) + "\n"


def document(stacks):
    """The whole file, one line for each key of a stack."""
    about = "Reference levels and dipoles of random stacks; made by make_stacks.py, which describes the format."
    blocks = (",\n".join(f"  {json.dumps(key)}: {json.dumps(value)}" for key, value in stack.items()) for stack in stacks)
    listed = ",\n".join(f" {{\n{block}\n }}" for block in blocks)
    return f'{{\n"about": {json.dumps(about)},\n"hbar2_over_2m0_ev_nm2": {float(K)!r},\n"stacks": [\n{listed}\n]\n}}\n'


def main():
    output = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).with_name("stacks.json")
    with multiprocessing.Pool() as pool:
        stacks = pool.map(solve, plan(), chunksize=1)
    output.write_text(document(stacks), encoding="utf-8")
    print(f"{len(stacks)} stacks, {sum(len(s['levels_ev']) for s in stacks)} levels -> {output}")


if __name__ == "__main__":
    main()
