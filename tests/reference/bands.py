"""Layers, stacks and the effective-mass laws of the reference calculation.

The equation, in every layer and with psi = 0 at both ends of the stack:

    d/dz [ A(E, z) dpsi/dz ] = (C(z) - E) psi,    C(z) = conduction_edge + F z,    z = 0 at the bottom

psi and u = A psi' are continuous. 1/A is written as p(x)/q(x), two polynomials of the distance x of the energy from
an edge of the layer, so that all laws share one form:

    parabolic   A = K/m                                              x = E - C
    two-band    A = K/m(E), m(E) = m (1 + x/E')                      x = E - C
    Kane        A = K [1 + 2F + (Ep/3)(2/x + 1/(x + Delta))]         x = E - Ev, Ev = C - Eg

Every A(E) is A0 + sum_r s_r/(E - e_r), the Schur complement of a Hamiltonian with further components
phi_r = sqrt(s_r) psi'/(E - e_r); norm and dipole are those of all components together.

Units: nm, eV, m0; fields in kV/cm in the files and V/nm inside. Floats in, either floats or mpmath numbers out:
`num` is `float` or `mpmath.mpf`.
"""

from dataclasses import asdict, dataclass

# hbar^2 / (2 m0) in eV nm^2, CODATA 2022.
K = "0.03809982110968584"


@dataclass(frozen=True)
class Layer:
    width_nm: float
    conduction_edge_ev: float
    electron_mass_m0: float
    nonparabolicity_energy_ev: float | None = None
    gap_ev: float | None = None
    spin_orbit_ev: float | None = None
    kane_energy_ev: float | None = None
    remote_band_f: float | None = None

    @property
    def depth_ev(self):
        """From the edge down to where the mass law ends (A has its pole), or None for a parabolic band."""
        return self.nonparabolicity_energy_ev if self.gap_ev is None else self.gap_ev

    def shift(self, num):
        """x - (E - C)."""
        return num(0) if self.gap_ev is None else num(self.gap_ev)

    def inverse_a(self, num):
        """The coefficients of p and q, lowest power first."""
        k = num(K)
        m = num(self.electron_mass_m0)
        if self.gap_ev is not None:
            delta, ep = num(self.spin_orbit_ev), num(self.kane_energy_ev)
            far = 1 + 2 * num(self.remote_band_f)
            return (num(0), delta / k, 1 / k), (2 * ep * delta / 3, far * delta + ep, far)
        if self.nonparabolicity_energy_ev is not None:
            return (m / k, m / k / num(self.nonparabolicity_energy_ev)), (num(1),)
        return (m / k,), (num(1),)

    def components(self, num):
        """(s_r, distance of e_r below x = 0) of the further components."""
        k = num(K)
        if self.gap_ev is not None:
            ep = num(self.kane_energy_ev)
            return [(2 * k * ep / 3, num(0)), (k * ep / 3, num(self.spin_orbit_ev))]
        if self.nonparabolicity_energy_ev is not None:
            depth = num(self.nonparabolicity_energy_ev)
            return [(k / num(self.electron_mass_m0) * depth, depth)]
        return []

    def numbers(self):
        return {key: value for key, value in asdict(self).items() if value is not None}


@dataclass(frozen=True)
class Stack:
    layers: tuple[Layer, ...]
    field_kv_per_cm: float

    def field(self, num):
        """V/nm; also the slope of C in eV/nm."""
        return num(self.field_kv_per_cm) / 10000

    def starts(self, num):
        """Where each layer begins, in nm."""
        z, starts = num(0), []
        for layer in self.layers:
            starts.append(z)
            z += num(layer.width_nm)
        return starts

    def edges(self):
        """(layer, C at its bottom, C at its top) for every layer."""
        slope = self.field(float)
        return [
            (layer, layer.conduction_edge_ev + slope * z, layer.conduction_edge_ev + slope * (z + layer.width_nm))
            for layer, z in zip(self.layers, self.starts(float))
        ]

    def lowest_edge(self):
        return min(min(bottom, top) for _, bottom, top in self.edges())

    def floor(self, share):
        """The lowest energy at which every mass law stands on more than `share` of its depth, everywhere."""
        return max(
            (max(bottom, top) - (1 - share) * layer.depth_ev for layer, bottom, top in self.edges() if layer.depth_ev),
            default=float("-inf"),
        )


def inverse_a(layer, x):
    """1/A at x, in floats."""
    p, q = layer.inverse_a(float)
    return sum(c * x**n for n, c in enumerate(p)) / sum(c * x**n for n, c in enumerate(q))
