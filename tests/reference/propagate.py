"""Exact propagation of (psi, u = A psi') over pieces of layers, by closed forms and by power series.

Pieces are so short that psi has at most one zero inside each (Sturm's comparison theorem: sqrt(max(E-C) max(1/A)) h < pi),
which is what lets `solve.py` count nodes from the signs at the ends of pieces.
"""

import math
from dataclasses import dataclass

import mpmath
import numpy as np
import scipy.special

from bands import inverse_a


@dataclass(frozen=True)
class Piece:
    layer: object
    start_nm: float  # all lengths in the number type in use
    width_nm: float
    edge_ev: float  # C at its bottom


def pieces(stack, low, high, num, barriers):
    """Splits the layers for all energies between `low` and `high`; with `barriers`, also where psi is evanescent."""
    slope = stack.field(num)
    result = []
    for (layer, bottom, top), start in zip(stack.edges(), stack.starts(num)):
        corners = [(energy, edge) for energy in (low, high) for edge in (bottom, top)]
        heaviest = max(inverse_a(layer, energy - edge + layer.shift(float)) for energy, edge in corners)
        depth = max(abs(e - c) if barriers else e - c for e, c in corners)
        count = math.ceil(math.sqrt(max(depth, 0) * heaviest) * layer.width_nm / 2.5) or 1
        if barriers and layer.gap_ev is not None and slope:
            count = max(count, near_singularity(layer, corners, float(slope)))
        width = num(layer.width_nm) / count
        for index in range(count):
            z = start + index * width
            result.append(Piece(layer, z, width, num(layer.conduction_edge_ev) + slope * z))
    return result


def near_singularity(layer, corners, slope):
    """Pieces needed so that x stays within a quarter of the way to the nearest zero of q: the series then gains two
    bits with each term."""
    roots = np.roots(layer.inverse_a(float)[1][::-1])
    distance = min(abs(energy - edge + layer.gap_ev - root) for energy, edge in corners for root in roots)
    return math.ceil(abs(slope) * layer.width_nm / (0.25 * distance))


def closed_form(stack, parts, energy, num):
    """2x2 matrices over each piece: circular, hyperbolic or Airy functions. A must be constant in each layer."""
    slope = stack.field(num)
    lib = math if num is float else mpmath
    known = {}
    matrices = []
    for part in parts:
        p, q = part.layer.inverse_a(num)
        if slope and part.layer.depth_ev is not None:
            raise ValueError("no closed form for an energy-dependent mass in a field")
        x = energy - part.edge_ev + part.layer.shift(num)
        a = sum(c * x**n for n, c in enumerate(q)) / sum(c * x**n for n, c in enumerate(p))
        h = part.width_nm
        if slope:
            # psi'' = alpha^3 (z - z0) psi; xi = alpha (z - z0)
            ratio = slope / a
            alpha = (1 if slope > 0 else -1) * lib.cbrt(abs(ratio))
            xi = (part.edge_ev - energy) / (a * alpha * alpha)
            left, right = (airy(value, num, known) for value in (xi, xi + alpha * h))
            scale = a * alpha
            matrices.append(
                (
                    lib.pi * (right[0] * left[3] - right[2] * left[1]),
                    lib.pi * (right[2] * left[0] - right[0] * left[2]) / scale,
                    lib.pi * (right[1] * left[3] - right[3] * left[1]) * scale,
                    lib.pi * (right[3] * left[0] - right[1] * left[2]),
                )
            )
            continue
        g = (part.edge_ev - energy) / a
        k = lib.sqrt(abs(g))
        if g > 0:
            c, s = lib.cosh(k * h), lib.sinh(k * h)
            matrices.append((c, s / (a * k), a * k * s, c))
        elif g < 0:
            c, s = lib.cos(k * h), lib.sin(k * h)
            matrices.append((c, s / (a * k), -a * k * s, c))
        else:
            matrices.append((num(1), h / a, num(0), num(1)))
    return matrices


def airy(xi, num, known):
    """(Ai, Ai', Bi, Bi'); the ends that two pieces share are computed once."""
    if num is float:
        return scipy.special.airy(xi)
    key = mpmath.nstr(xi, mpmath.mp.dps - 8)
    if key not in known:
        known[key] = (
            mpmath.airyai(xi),
            mpmath.airyai(xi, derivative=1),
            mpmath.airybi(xi),
            mpmath.airybi(xi, derivative=1),
        )
    return known[key]


def series(stack, parts, energy, num):
    """2x2 matrices over each piece, from power series in t = (z - start)/width."""
    slope = stack.field(num)
    matrices = []
    for part in parts:
        (psi_1, u_1), (psi_2, u_2) = expansions(part, slope, energy, num)
        matrices.append((sum(psi_1), sum(psi_2), sum(u_1), sum(u_2)))
    return matrices


def expansions(part, slope, energy, num):
    """Power series of psi and u for (psi, u) = (1, 0) and (0, 1) at the bottom of the piece.

    With x = x0 + x1 t: q(x) dpsi/dt = h p(x) u and du/dt = h (C - E) psi, term by term.
    """
    h = part.width_nm
    difference = part.edge_ev - energy
    rise = slope * h
    x0, x1 = part.layer.shift(num) - difference, -rise
    p, q = (in_t(polynomial, x0, x1) for polynomial in part.layer.inverse_a(num))
    p = [h * value / q[0] for value in p]
    q = [value / q[0] for value in q[1:]]
    while p and p[-1] == 0:
        p.pop()
    while q and q[-1] == 0:
        q.pop()
    c0, c1 = h * difference, h * rise
    small = num(2.0**-60) if num is float else mpmath.mpf(2) ** -(mpmath.mp.prec + 6)
    result = []
    for psi_0, u_0 in ((1, 0), (0, 1)):
        psi, u = [num(psi_0)], [num(u_0)]
        quiet = 0
        while quiet < 4:
            n = len(psi)
            d_psi = sum(value * u[n - 1 - k] for k, value in enumerate(p) if k < n)
            d_psi -= sum(value * (n - k) * psi[n - k] for k, value in enumerate(q, 1) if k < n)
            d_u = c0 * psi[n - 1]
            if rise and n > 1:
                d_u += c1 * psi[n - 2]
            psi.append(d_psi / n)
            u.append(d_u / n)
            quiet = quiet + 1 if abs(psi[n]) + abs(u[n]) < small else 0
            if n > 2000:
                raise ArithmeticError("a power series does not converge")
        result.append((psi, u))
    return result


def in_t(polynomial, x0, x1):
    """Coefficients in t of a polynomial of at most second degree in x = x0 + x1 t."""
    c = list(polynomial) + [0] * (3 - len(polynomial))
    return [c[0] + c[1] * x0 + c[2] * x0 * x0, (c[1] + 2 * c[2] * x0) * x1, c[2] * x1 * x1]
