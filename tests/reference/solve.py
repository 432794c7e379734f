"""Levels, states and dipoles from the propagation of `propagate.py`.

Shooting from the bottom wall, the number of nodes of psi(z; E) is the number of levels below E (Sturm), so levels are
bracketed one by one and none is missed however close two of them lie. Each is located in double precision and then
refined by the secant rule with 40 digits. A state is glued from the solutions of both walls where |psi_bottom psi_top|,
the diagonal of the Green function, is largest; its nodes are counted again.
"""

import mpmath
import numpy as np
from mpmath import mpf

from bands import K
from propagate import closed_form, expansions, pieces, series

mpmath.mp.dps = 40


class Unsuitable(Exception):
    """The stack leaves the range in which its mass laws hold."""


def shoot(matrices, num):
    """(psi at the top wall, number of nodes between the walls)."""
    psi, u, nodes = num(0), num(1), 0
    for m11, m12, m21, m22 in matrices:
        after = m11 * psi + m12 * u
        nodes += psi * after < 0
        psi, u = after, m21 * psi + m22 * u
    return psi, nodes


def levels(stack, wanted, method):
    """The lowest `wanted` levels in eV as mpmath numbers, with the two ends of the searched range."""
    barriers = method is series
    low = max(stack.lowest_edge(), stack.floor(0.15))

    def shot(energy, parts):
        return shoot(method(stack, parts, energy, float), float)

    reach = 0.125
    while True:
        high = low + reach
        parts = pieces(stack, low, high, float, barriers)
        if shot(high, parts)[1] >= wanted:
            break
        reach *= 2
        if reach > 8:
            raise Unsuitable("too few levels")
    if shot(low, parts)[1]:
        raise Unsuitable("a level lies below the range of the mass law")

    seen = {low: 0, high: shot(high, parts)[1]}
    rough = []
    for index in range(wanted):
        while True:
            a = max(energy for energy, nodes in seen.items() if nodes <= index)
            b = min(energy for energy, nodes in seen.items() if nodes > index)
            if seen[a] == index and seen[b] == index + 1:
                break
            middle = (a + b) / 2
            if not a < middle < b:
                raise Unsuitable("two levels coincide")
            seen[middle] = shot(middle, parts)[1]
        rough.append(by_nodes(lambda energy: shot(energy, parts), a, b, index))

    exact_parts = pieces(stack, low, high, mpf, barriers)
    refined = []
    for start in rough:
        refined.append(secant(lambda energy: shoot(method(stack, exact_parts, energy, mpf), mpf)[0], mpf(start)))
    return refined, (low, high)


def by_nodes(shot, a, b, index):
    """A root of psi(top; E) in [a, b], where the nodes rise from `index` to `index + 1`; regula falsi with halving."""
    fa, fb = shot(a)[0], shot(b)[0]
    for step in range(200):
        if b - a < 1e-13:
            break
        middle = (a + b) / 2 if step % 3 == 2 else (a * fb - b * fa) / (fb - fa)
        if not a < middle < b:
            middle = (a + b) / 2
            if not a < middle < b:
                break
        value, nodes = shot(middle)
        if nodes <= index:
            if step % 3 != 2 and value * fa > 0:
                fb /= 2
            a, fa = middle, value
        else:
            if step % 3 != 2 and value * fb > 0:
                fa /= 2
            b, fb = middle, value
    return (a + b) / 2


def secant(f, start):
    x0, x1 = start, start + mpf(10) ** -13
    f0, f1 = f(x0), f(x1)
    for _ in range(12):
        if f1 == f0:
            return x1
        x2 = x1 - f1 * (x1 - x0) / (f1 - f0)
        if abs(x2 - start) > 1e-9:
            raise ArithmeticError("the refinement left its level")
        if abs(x2 - x1) < mpf(10) ** -24:
            # The next step would be smaller than 1e-36 eV: the rule squares its error, nearly.
            return x2
        x0, f0, x1, f1 = x1, f1, x2, f(x2)
    raise ArithmeticError("the refinement of a level does not settle")


def state(matrices, index):
    """(psi, u) at the ends of all pieces, not normalised; `index` counts from 0."""
    up = [(mpf(0), mpf(1))]
    for m11, m12, m21, m22 in matrices:
        psi, u = up[-1]
        up.append((m11 * psi + m12 * u, m21 * psi + m22 * u))
    down = [(mpf(0), mpf(1))]
    for m11, m12, m21, m22 in reversed(matrices):
        psi, u = down[-1]
        down.append((m22 * psi - m12 * u, m11 * u - m21 * psi))
    down.reverse()
    joint = max(range(1, len(matrices)), key=lambda p: abs(up[p][0] * down[p][0]))
    ratio = up[joint][0] / down[joint][0]
    values = up[:joint] + [(ratio * psi, ratio * u) for psi, u in down[joint:]]
    inner = [psi for psi, _ in values[1:-1]]
    nodes = sum(a * b < 0 for a, b in zip(inner, inner[1:]))
    if nodes != index:
        raise ArithmeticError(f"state {index + 1} has {nodes} nodes")
    return values


def dipoles_closed_form(stack, energies, reach):
    """|<i|z|j>| for parabolic layers, as mpmath numbers, from the values at the ends of pieces alone.

    With W = psi_i u_j - psi_j u_i and delta = E_i - E_j, W' = delta psi_i psi_j in every layer, hence
    delta int z psi_i psi_j = [z W] - int W; and with R = psi_i psi_j, P = u_i u_j, E the mean energy,
    P' = (C - E) A R' - (delta/2) W, hence int W = (2/delta) ([(C - E) A R - P] - F A int R).
    Norms likewise: (u^2)' = (C - E) A (psi^2)'.
    """
    parts = pieces(stack, *reach, mpf, False)
    slope = stack.field(mpf)
    ends = []
    for index, energy in enumerate(energies):
        values = state(closed_form(stack, parts, energy, mpf), index)
        norm = mpf(0)
        for part, (psi_0, u_0), (psi_1, u_1) in zip(parts, values, values[1:]):
            a = mpf(K) / mpf(part.layer.electron_mass_m0)
            c_0 = part.edge_ev - energy
            c_1 = c_0 + slope * part.width_nm
            if slope:
                norm += (c_1 * psi_1**2 - c_0 * psi_0**2) / slope - (u_1**2 - u_0**2) / (slope * a)
            else:
                invariant = u_0**2 - c_0 * a * psi_0**2
                norm += (psi_1 * u_1 - psi_0 * u_0 - invariant * part.width_nm / a) / (2 * c_0)
        scale = 1 / mpmath.sqrt(norm)
        ends.append([(psi * scale, u * scale) for psi, u in values])

    def element(i, j):
        delta = energies[i] - energies[j]
        mean = (energies[i] + energies[j]) / 2
        total = mpf(0)
        for p, part in enumerate(parts):
            a = mpf(K) / mpf(part.layer.electron_mass_m0)
            w, zw, g = [], [], []
            for side, z in ((p, part.start_nm), (p + 1, part.start_nm + part.width_nm)):
                (psi_i, u_i), (psi_j, u_j) = ends[i][side], ends[j][side]
                c = part.edge_ev + slope * (z - part.start_nm)
                w.append(psi_i * u_j - psi_j * u_i)
                zw.append(z * w[-1])
                g.append((c - mean) * a * psi_i * psi_j - u_i * u_j)
            integral_w = 2 / delta * (g[1] - g[0] - slope * a * (w[1] - w[0]) / delta)
            total += (zw[1] - zw[0] - integral_w) / delta
        return abs(total)

    return pairs(len(energies), element)


def dipoles_series(stack, energies, reach):
    """|z_ij| of the multi-component states, by Gauss-Legendre quadrature of the power series; also the worst overlap
    of two different states, which the multi-component form makes zero."""
    parts = pieces(stack, *reach, mpf, True)
    slope = stack.field(mpf)
    nodes, weights = np.polynomial.legendre.leggauss(24)
    t, weights = (nodes + 1) / 2, weights / 2
    z = np.concatenate([float(part.start_nm) + float(part.width_nm) * t for part in parts])
    weight = np.concatenate([float(part.width_nm) * weights for part in parts])
    most = max(len(part.layer.components(float)) for part in parts)
    states = []
    for index, energy in enumerate(energies):
        basis = [expansions(part, slope, energy, mpf) for part in parts]
        matrices = [(sum(a[0]), sum(b[0]), sum(a[1]), sum(b[1])) for a, b in basis]
        values = state(matrices, index)
        largest = max(abs(psi) for psi, _ in values)
        fields = np.zeros((1 + most, len(z)))
        for p, (part, (psi_0, u_0), (first, second)) in enumerate(zip(parts, values, basis)):
            at = slice(p * len(t), (p + 1) * len(t))
            psi, u = (
                np.polynomial.polynomial.polyval(t, combined(first[k], second[k], psi_0 / largest, u_0 / largest))
                for k in (0, 1)
            )
            x = float(energy - part.edge_ev + part.layer.shift(mpf)) - float(slope * part.width_nm) * t
            slope_of_psi = u * inverse_a_values(part.layer, x)
            fields[0, at] = psi
            for r, (s, below) in enumerate(part.layer.components(float)):
                fields[1 + r, at] = np.sqrt(s) * slope_of_psi / (x + below)
        fields /= np.sqrt(np.sum(weight * np.sum(fields**2, axis=0)))
        states.append(fields)

    def element(i, j):
        return abs(np.sum(weight * z * np.sum(states[i] * states[j], axis=0)))

    overlap = max(
        (abs(np.sum(weight * np.sum(states[i] * states[j], axis=0))) for i in range(len(states)) for j in range(i)),
        default=0.0,
    )
    return pairs(len(energies), element), overlap


def inverse_a_values(layer, x):
    p, q = layer.inverse_a(float)
    return np.polynomial.polynomial.polyval(x, p) / np.polynomial.polynomial.polyval(x, q)


def combined(first, second, alpha, beta):
    length = max(len(first), len(second))
    first = first + [0] * (length - len(first))
    second = second + [0] * (length - len(second))
    return [float(alpha * a + beta * b) for a, b in zip(first, second)]


def pairs(count, element):
    """[i, j, value] for all i < j, counted from 1."""
    return [[i + 1, j + 1, element(i, j)] for i in range(count) for j in range(i + 1, count)]
