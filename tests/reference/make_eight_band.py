"""Makes eight_band.json: layer stacks with the levels of eight coupled bands at several in-plane wave vectors.

    python make_eight_band.py [OUTPUT]          default: eight_band.json beside this script

The method has nothing in common with the program's but the operator: complex 8 x 8 matrices in the cubic axes, spins along z, in the order S X Y Z (up), S X Y Z (down); polynomials of high degree (integrated Legendre functions, Gauss
quadrature, full overlap matrix), and LAPACK's dense solver. Each stack is solved with two degrees; the worst
difference is printed and must stay below 1e-7 eV.

    H_SS = Ec + kz s kz + s k^2              H_Si = i P ki, the one of Z as i (P kz + kz P)/2
    H_XX = Ev - D/3 + L kx^2 + M ky^2 + kz M kz + b (2 exx - eyy - ezz), H_YY and H_ZZ alike
    H_XY = (N+ + N-) kx ky                   H_XZ = kx N+ kz + kz N- kx, H_YZ alike
    spin-orbit: D/3 times <X|Y> = -i sz, <Y|Z> = -i sx, <Z|X> = -i sy

L = -(g1 + 4 g2), M = -(g1 - 2 g2), N = -6 g3, N- = M - 1, all in hbar^2/2m0, with the gammas less Ep/3Eg, Ep/6Eg, Ep/6Eg.
Ep is the largest for which s = m0/m - Ep (Eg + 2D/3)/(Eg (Eg + D)) is at least 1 and g1 + 4 g2 at least 0.25 after it.

The file is an object with `about` and `stacks`, a list of objects:

    name, structure    the stack as a Wellwright structure file
    solved             a list of {k_per_nm: [kx, ky], conduction_ev: [...], valence_ev: [...]}: the levels next to the gap, each
                       member of a pair listed, conduction upwards and valence downwards
"""

import json
import sys
from pathlib import Path

import numpy as np
from numpy.polynomial import legendre
from scipy.linalg import eigh

K = 0.03809982110968584  # hbar^2/2m0, eV nm^2
LEAST_CONDUCTION, LEAST_VALENCE = 1.0, 0.25
CONDUCTION, VALENCE = 3, 5  # pairs
EDGE_NM = 0.6

# Rounded values of the review of Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), at 0 to 300 K and with
# alloys mixed by hand: inputs of a comparison, nothing more. a in nm, c11 and c12 in GPa, the rest in eV and m0.
KEYS = ("a", "gap", "spin_orbit", "mass", "g1", "g2", "g3", "ev", "ac", "av", "b", "c11", "c12")
MATERIALS = {
    name: dict(zip(KEYS, values))
    for name, values in {
        "Galas": (0.565325, 1.519, 0.341, 0.067, 6.98, 2.06, 2.93, -0.80, -7.17, -1.16, -2.0, 122.1, 56.6),
        "Algaas": (0.565559, 1.937, 0.325, 0.0919, 6.014, 1.688, 2.477, -0.959, -6.71, -1.55, -2.09, 122.97, 55.64),
        "Ingaas20": (0.573426, 1.2222, 0.325, 0.0573, 7.8, 2.5, 3.35, -0.698, -7.17, -1.13, -1.96, 114.34, 54.33),
        "Ingaas53": (0.58687, 0.816, 0.33, 0.043, 11.97, 4.36, 5.14, -0.60, -6.7, -1.08, -1.89, 101.5, 50.6),
        "Alinas": (0.58687, 1.52, 0.34, 0.0733, 8.0, 2.6, 3.3, -0.80, -5.4, -1.7, -2.0, 103.0, 49.0),
        "Inas": (0.60583, 0.417, 0.39, 0.026, 20.0, 8.5, 9.2, -0.59, -5.08, -1.0, -1.8, 83.29, 45.26),
        "Gasb": (0.60959, 0.812, 0.76, 0.039, 13.4, 4.7, 6.0, -0.03, -7.5, -0.8, -2.0, 88.42, 40.26),
        "Inp": (0.58687, 1.4236, 0.108, 0.0795, 5.08, 1.60, 2.10, -0.94, -6.0, -0.6, -2.0, 101.1, 56.1),
        "Ingaas40": (0.58157, 0.95, 0.33, 0.048, 10.6, 3.7, 4.5, -0.64, -6.9, -1.1, -1.92, 106.0, 52.0),
    }.items()
}

# name, substrate, field in kV/cm, layers (material, width in nm)
STACKS = [
    ("well of GaAs in AlGaAs", "Galas", 0.0, [("Algaas", 9.0), ("Galas", 10.0), ("Algaas", 9.0)]),
    ("strained InGaAs well in GaAs", "Galas", 0.0, [("Galas", 9.0), ("Ingaas20", 8.0), ("Galas", 9.0)]),
    ("InGaAs in AlInAs on InP, two wells", "Inp", 0.0,
     [("Alinas", 7.0), ("Ingaas53", 5.0), ("Alinas", 1.5), ("Ingaas53", 3.5), ("Alinas", 7.0)]),
    ("InAs beside GaSb, broken gap", "Gasb", 0.0, [("Gasb", 8.0), ("Inas", 6.0), ("Gasb", 8.0)]),
    ("tensile InGaAs in InP", "Inp", 0.0, [("Inp", 8.0), ("Ingaas40", 9.0), ("Inp", 8.0)]),
    ("stepped strained well in a field", "Galas", 50.0,
     [("Galas", 8.0), ("Ingaas20", 6.0), ("Galas", 1.2), ("Ingaas20", 3.0), ("Algaas", 8.0)]),
]
VECTORS = [(0.0, 0.0), (0.3, 0.0), (-0.25, 0.25), (0.15, 0.45)]


def reduced(m):
    """s, Ep and the gammas in use."""
    per_kane = (m["gap"] + 2 * m["spin_orbit"] / 3) / (m["gap"] * (m["gap"] + m["spin_orbit"]))
    kane = min((1 / m["mass"] - LEAST_CONDUCTION) / per_kane, (m["g1"] + 4 * m["g2"] - LEAST_VALENCE) * m["gap"])
    part = kane / m["gap"]
    return 1 / m["mass"] - kane * per_kane, kane, m["g1"] - part / 3, m["g2"] - part / 6, m["g3"] - part / 6


def matrices(m, a_substrate, kx, ky):
    """A, B, C of H = kz A kz + kz B + B^+ kz + C."""
    s, kane, g1, g2, g3 = reduced(m)
    lx, mx, n = -(g1 + 4 * g2), -(g1 - 2 * g2), -6 * g3
    n_minus = mx - 1
    n_plus = n - n_minus
    p = np.sqrt(K * kane)
    in_plane = (a_substrate - m["a"]) / m["a"]
    strain = np.array([in_plane, in_plane, -2 * m["c12"] / m["c11"] * in_plane])
    trace = strain.sum()
    squares = np.array([kx * kx, ky * ky])
    A, B, C = (np.zeros((4, 4), complex) for _ in range(3))
    A[0, 0], A[1, 1], A[2, 2], A[3, 3] = K * s, K * mx, K * mx, K * lx
    C[0, 0] = m["ev"] + m["gap"] + m["ac"] * trace + K * s * squares.sum()
    for i in range(3):
        own = sum((lx if j == i else mx) * squares[j] for j in range(2))
        C[1 + i, 1 + i] = m["ev"] - m["av"] * trace - m["spin_orbit"] / 3 + K * own + m["b"] * (3 * strain[i] - trace)
    for i, k in ((1, kx), (2, ky)):
        C[0, i], C[i, 0] = 1j * p * k, -1j * p * k
        B[i, 3], B[3, i] = K * n_minus * k, K * n_plus * k
    C[1, 2] = C[2, 1] = K * n * kx * ky
    B[0, 3], B[3, 0] = 0.5j * p, -0.5j * p
    A, B, C = (np.kron(np.eye(2), x) for x in (A, B, C))
    sx, sy, sz = np.array([[0, 1], [1, 0]]), np.array([[0, -1j], [1j, 0]]), np.diag([1, -1])
    for i, j, sigma in ((1, 2, sz), (2, 3, sx), (3, 1, sy)):
        pair = np.zeros((4, 4))
        pair[i, j] = 1
        term = np.kron(-1j * sigma, pair) * m["spin_orbit"] / 3
        C += term + term.conj().T
    return A, B, C


def real_form(A, B, C):
    """A, iB and C after a change of phases and spin axes that makes them real, which saves time in the dense solver."""
    spins = np.array([[-1j, -1], [1, 1j]]) / np.sqrt(2)
    U = np.kron(spins, np.diag([1, 1j, 1j, 1]))
    turned = [U.conj().T @ x @ U for x in (A, 1j * B, C)]
    assert all(np.abs(x.imag).max() < 1e-12 for x in turned)
    return [x.real for x in turned]


def functions(degree):
    """Values and slopes on [-1, 1] of the two linear functions and the integrated Legendre polynomials, at Gauss points."""
    points, weights = legendre.leggauss(degree + 2)
    values, slopes = [0.5 * (1 - points), 0.5 * (1 + points)], [np.full_like(points, -0.5), np.full_like(points, 0.5)]
    for j in range(1, degree):
        unit = lambda n: legendre.legval(points, [0] * n + [1])
        values.append((unit(j + 1) - unit(j - 1)) / np.sqrt(4 * j + 2))
        slopes.append(np.sqrt(j + 0.5) * unit(j))
    return points, weights, np.array(values), np.array(slopes)


def pieces(layers, finer):
    """(material, width, degree): every layer with a thin piece at both faces, where light holes follow a step at once."""
    for name, width in layers:
        if width < 3 * EDGE_NM:
            yield name, width, 16 + finer
        else:
            yield name, EDGE_NM, 9 + finer
            yield name, width - 2 * EDGE_NM, int(8 + finer + width)
            yield name, EDGE_NM, 9 + finer


def levels(stack, kx, ky, finer):
    """The levels next to the gap in ascending order, members of pairs listed."""
    _, substrate, field_kv_per_cm, layers = stack
    field = 1e-4 * field_kv_per_cm
    a_substrate = MATERIALS[substrate]["a"]
    parts = list(pieces(layers, finer))
    # Borders first, then the inner functions of each piece.
    next_inner = len(parts) - 1
    count = next_inner + sum(degree - 1 for *_, degree in parts)
    H, S = np.zeros((count, 8, count, 8)), np.zeros((count, count))
    height = 0.0
    for index, (name, width, degree) in enumerate(parts):
        A, G, C = real_form(*matrices(MATERIALS[name], a_substrate, kx, ky))
        x, w, f, df = functions(degree)
        w, df, z = w * width / 2, df * 2 / width, height + (1 + x) * width / 2
        rows = [index - 1, index] + list(range(next_inner, next_inner + degree - 1))
        kept = [r for r, row in enumerate(rows) if not (row == -1 or (r == 1 and index == len(parts) - 1))]
        f, df = f[kept], df[kept]
        rows = np.array(rows)[kept]
        stiffness, mixed, mass = (df * w) @ df.T, (df * w) @ f.T, (f * w) @ f.T
        potential = field * (f * w * z) @ f.T
        local = np.einsum("ab,ij->aibj", stiffness, A)
        local += np.einsum("ab,ij->aibj", mixed, G) + np.einsum("ba,ji->aibj", mixed, G)
        local += np.einsum("ab,ij->aibj", mass, C) + np.einsum("ab,ij->aibj", potential, np.eye(8))
        H[rows[:, None], :, rows[None, :], :] += local.transpose(0, 2, 1, 3)
        S[np.ix_(rows, rows)] += mass
        height += width
        next_inner += degree - 1
    # Orthonormal functions instead of the overlap matrix.
    own = np.linalg.inv(np.linalg.cholesky(S))
    H = np.einsum("ac,cidj->aidj", own, H, optimize=True)
    H = np.einsum("aidj,bd->aibj", H, own, optimize=True).reshape(8 * count, 8 * count)
    gap = 6 * count
    return eigh(H, eigvals_only=True, subset_by_index=(gap - 2 * VALENCE, gap + 2 * CONDUCTION - 1))


def structure(stack):
    name, substrate, field, layers = stack
    lines = [f"title: {name}", f"substrate: {substrate}"]
    if field:
        lines.append(f"field: {field!r} kV/cm")
    lines += ["bands: {conduction: {model: parabolic, states: 1}}", "materials:"]
    for material in dict.fromkeys([substrate] + [m for m, _ in layers]):
        m = MATERIALS[material]
        lines.append(
            f"  {material}: {{lattice_constant: {m['a']!r} nm, gap: {m['gap']!r} eV, spin_orbit: {m['spin_orbit']!r} eV, "
            f"electron_mass: {m['mass']!r}, luttinger: [{m['g1']!r}, {m['g2']!r}, {m['g3']!r}], valence_edge: {m['ev']!r} eV, "
            f"hydrostatic_conduction: {m['ac']!r} eV, hydrostatic_valence: {m['av']!r} eV, shear_b: {m['b']!r} eV, "
            f"elastic: [{m['c11']!r} GPa, {m['c12']!r} GPa, 50 GPa]}}"
        )
    lines.append("layers:")
    lines += [f"  - {{material: {material}, width: {width!r} nm}}" for material, width in layers]
    return "\n".join(lines) + "\n"


def main():
    output = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).with_name("eight_band.json")
    worst = (0.0, "")
    stacks = []
    for stack in STACKS:
        solved = []
        for kx, ky in VECTORS:
            coarse, fine = (levels(stack, kx, ky, finer) for finer in (3, 7))
            worst = max(worst, (float(np.abs(coarse - fine).max()), f"{stack[0]}, k = {kx}, {ky}"))
            rounded = [round(float(e), 8) for e in fine]
            solved.append({
                "k_per_nm": [kx, ky],
                "conduction_ev": rounded[2 * VALENCE:],
                "valence_ev": rounded[: 2 * VALENCE][::-1],
            })
        stacks.append({"name": stack[0], "structure": structure(stack), "solved": solved})
    print(f"worst difference between two degrees {worst[0]:.1e} eV: {worst[1]}")
    if worst[0] > 1e-7:
        sys.exit("not converged")
    blocks = []
    for stack in stacks:
        rows = ",\n".join(f"   {json.dumps(row)}" for row in stack["solved"])
        blocks.append(
            f' {{\n  "name": {json.dumps(stack["name"])},\n  "structure": {json.dumps(stack["structure"])},\n'
            f'  "solved": [\n{rows}\n  ]\n }}'
        )
    about = "Reference levels of eight coupled bands; made by make_eight_band.py, which describes model and format."
    text = f'{{\n"about": {json.dumps(about)},\n"stacks": [\n' + ",\n".join(blocks) + "\n]\n}\n"
    output.write_text(text, encoding="utf-8")
    print(f"{len(stacks)} stacks -> {output}")


if __name__ == "__main__":
    main()
