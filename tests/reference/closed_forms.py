"""Makes closed_forms.json: levels that have a closed form or a one-line transcendental equation, with 30 digits.

    python closed_forms.py [OUTPUT]         default: closed_forms.json beside this script

Each check is an object with `id`, `name`, `inputs`, `formula`, `source`, `values` (at the CODATA 2022 constant, 16
digits). Every transcendental equation is written in its phase form, phase(E) = n pi, whose left side rises with E: the
n-th root is the n-th level, so none is missed.

`EARLIER` holds digits of an earlier calculation, made independently of this one with the CODATA 2018 constant; the script
recomputes every value at that constant and stops when one does not round to the printed digits.
"""

import json
import sys
from pathlib import Path

import mpmath
from mpmath import mp, mpf

from bands import K

mp.dps = 34
# hbar^2/(2 m0) in eV nm^2 from h and e (exact) and the electron mass of CODATA 2018 in kg.
EARLIER_K = mpf("6.62607015e-34") ** 2 / (8 * mp.pi**2 * mpf("9.1093837015e-31") * mpf("1.602176634e-19")) * 10**18
BEN_DANIEL_DUKE = "continuity of psi and psi'/m: D. J. BenDaniel, C. B. Duke, Phys. Rev. 152, 683 (1966)"
KANE_TWO_BAND = (
    "m(E) = m (1 + (E - Ec)/E'): two-band limit of E. O. Kane, J. Phys. Chem. Solids 1, 249 (1957); in wells"
    " G. Bastard, Wave Mechanics Applied to Semiconductor Heterostructures (1988), ch. III (from memory)"
)


class Side:
    """A layer at one energy: edge, mass and, for the two-band law, E'."""

    def __init__(self, edge, mass, two_band=None):
        self.edge, self.mass, self.two_band = mpf(edge), mpf(mass), two_band and mpf(two_band)

    def a(self, energy, k):
        mass = self.mass * (1 + (energy - self.edge) / self.two_band) if self.two_band else self.mass
        return k / mass

    def wave(self, energy, k):
        """sqrt(|E - edge| / A): the wave number in the well, the decay constant in the barrier."""
        return mpmath.sqrt(abs(energy - self.edge) / self.a(energy, k))


def rising_root(phase, target, low, high):
    """Where phase(E) reaches the target, or None."""
    f = lambda energy: phase(energy) - target
    eps = mpf(10) ** -28
    low, high = low + eps, high - eps
    if f(low) > 0 or f(high) < 0:
        return None
    for _ in range(40):
        middle = (low + high) / 2
        low, high = (middle, high) if f(middle) < 0 else (low, middle)
    root = mpmath.findroot(f, (low, high), solver="secant", tol=mpf(10) ** -60, verify=False)
    if not low - eps <= root <= high + eps:
        raise ArithmeticError("the refinement left its bracket")
    return root


def well_levels(k, width, well, left, right):
    """Bound levels: k w = (n - 1) pi + atan(lambda_l A_l / (k A_w)) + atan(lambda_r A_r / (k A_w))."""

    def phase(energy):
        inner = well.wave(energy, k) * well.a(energy, k)
        ends = sum(mpmath.atan(side.wave(energy, k) * side.a(energy, k) / inner) for side in (left, right))
        return well.wave(energy, k) * mpf(width) - ends

    return collect(phase, well.edge, min(left.edge, right.edge))


def collect(phase, low, high):
    found = []
    while (root := rising_root(phase, len(found) * mp.pi, low, high)) is not None:
        found.append(root)
    return found


def double_well_levels(k, width, gap, well, barrier):
    """Even (tanh) and odd (coth) levels of two equal wells, each by k w = (n - 1) pi + atan(outer) + atan(inner)."""
    levels = []
    for inner_wave in (mpmath.tanh, mpmath.coth):

        def phase(energy):
            ratio = barrier.wave(energy, k) * barrier.a(energy, k) / (well.wave(energy, k) * well.a(energy, k))
            inner = ratio * inner_wave(barrier.wave(energy, k) * mpf(gap) / 2)
            return well.wave(energy, k) * mpf(width) - mpmath.atan(ratio) - mpmath.atan(inner)

        levels += collect(phase, well.edge, barrier.edge)
    return sorted(levels)


def infinite_well(k):
    width, mass = mpf(10), mpf("0.067")
    levels = [k / mass * (n * mp.pi / width) ** 2 for n in (1, 2, 3)]
    z_12, z_23 = 16 * width / (9 * mp.pi**2), 48 * width / (25 * mp.pi**2)
    f_12 = mass / k * (levels[1] - levels[0]) * z_12**2
    return {"levels_ev": levels, "z_12_nm": z_12, "z_23_nm": z_23, "f_12": f_12}


def infinite_well_in_field(k, field_kv_per_cm):
    """det [Ai, Bi] at both walls; the field is zero at the centre of the well."""
    width, mass, slope = mpf(10), mpf("0.067"), mpf(field_kv_per_cm) / 10000
    length = mpmath.cbrt(k / mass / slope)
    xi = lambda z, energy: z / length - energy / (slope * length)

    def phase(energy):
        # With Ai = M sin(theta), Bi = M cos(theta) the determinant vanishes where theta advances by n pi.
        ends = [xi(z, energy) for z in (-width / 2, width / 2)]
        return airy_phase(ends[0]) - airy_phase(ends[1])

    return {"levels_ev": [rising_root(phase, n * mp.pi, mpf("0.001"), mpf(1)) for n in (1, 2, 3)]}


def airy_phase(xi):
    """theta with tan(theta) = Ai/Bi, continuous and falling with xi; 0 at large xi. Its multiples of pi are zeros of Ai."""
    angle = mpmath.atan2(mpmath.airyai(xi), mpmath.airybi(xi))
    if xi > -1:
        return angle
    # Asymptotically pi/4 + (2/3) |xi|^(3/2), good enough to choose the turn.
    guess = mp.pi / 4 + 2 * mpmath.power(-xi, mpf(3) / 2) / 3
    return angle + 2 * mp.pi * mpmath.nint((guess - angle) / (2 * mp.pi))


def triangular(k):
    mass, slope = mpf("0.067"), mpf("0.005")
    scale = mpmath.cbrt(k * slope**2 / mass)
    return {"levels_ev": [-mpmath.airyaizero(n) * scale for n in (1, 2, 3, 4)]}


def poeschl_teller(k):
    depth, length, mass = mpf("0.3"), mpf(4), mpf("0.067")
    s = (mpmath.sqrt(1 + 4 * depth * length**2 * mass / k) - 1) / 2
    count = int(mpmath.ceil(s))
    return {"s": s, "levels_ev": [-k / (mass * length**2) * (s - n) ** 2 for n in range(count)]}


def parabola(k):
    quantum, mass = mpf("0.010"), mpf("0.067")
    return {"levels_ev": [(n + mpf(1) / 2) * quantum for n in range(4)], "z_01_nm": mpmath.sqrt(k / (mass * quantum))}


def single(width, well, left, right=None):
    return lambda k: {"levels_ev": well_levels(k, width, Side(*well), Side(*left), Side(*(right or left)))}


# id, name, inputs, formula, source, function of K
CHECKS = [
    (
        "1.1",
        "well between hard walls",
        "10 nm, 0.067 m0",
        "E_n = K (n pi/L)^2/m; z_12 = 16 L/(9 pi^2); z_23 = 48 L/(25 pi^2); f_12 = (m/K) E_21 z_12^2 = 256/(27 pi^2)",
        "any textbook of quantum mechanics; e.g. L. D. Landau, E. M. Lifshitz, Quantum Mechanics, section 22",
        infinite_well,
    ),
    (
        "1.2a",
        "finite well, two masses",
        "10 nm, barrier 0.24 eV, masses 0.067/0.092 m0",
        "k w = (n - 1) pi + 2 atan(lambda A_b/(k A_w))",
        BEN_DANIEL_DUKE,
        single("10", ("0", "0.067"), ("0.24", "0.092")),
    ),
    (
        "1.2b",
        "finite well, one mass",
        "10 nm, barrier 0.24 eV, mass 0.067 m0",
        "k w = (n - 1) pi + 2 atan(lambda A_b/(k A_w))",
        BEN_DANIEL_DUKE,
        single("10", ("0", "0.067"), ("0.24", "0.067")),
    ),
    (
        "1.3a",
        "finite well, two-band law",
        "6.5 nm, barrier 0.24 eV, masses 0.067/0.092 m0, E' 1.519/1.8 eV",
        "k w = (n - 1) pi + 2 atan(lambda A_b/(k A_w)), A = K/m(E)",
        KANE_TWO_BAND,
        single("6.5", ("0", "0.067", "1.519"), ("0.24", "0.092", "1.8")),
    ),
    (
        "1.3b",
        "the same, parabolic",
        "6.5 nm, barrier 0.24 eV, masses 0.067/0.092 m0",
        "k w = (n - 1) pi + 2 atan(lambda A_b/(k A_w))",
        BEN_DANIEL_DUKE,
        single("6.5", ("0", "0.067"), ("0.24", "0.092")),
    ),
    (
        "1.3c",
        "finite well, two-band law, narrow gap",
        "6 nm, barrier 0.52 eV, masses 0.043/0.075 m0, E' 0.79/1.45 eV",
        "k w = (n - 1) pi + 2 atan(lambda A_b/(k A_w)), A = K/m(E)",
        KANE_TWO_BAND,
        single("6", ("0", "0.043", "0.79"), ("0.52", "0.075", "1.45")),
    ),
    (
        "1.3d",
        "the same, parabolic",
        "6 nm, barrier 0.52 eV, masses 0.043/0.075 m0",
        "k w = (n - 1) pi + 2 atan(lambda A_b/(k A_w))",
        BEN_DANIEL_DUKE,
        single("6", ("0", "0.043"), ("0.52", "0.075")),
    ),
    (
        "1.4",
        "asymmetric well",
        "10 nm, 0.067 m0; left 0.5 eV, 0.12 m0; right 0.2 eV, 0.085 m0",
        "k w = (n - 1) pi + atan(lambda_l A_l/(k A_w)) + atan(lambda_r A_r/(k A_w))",
        BEN_DANIEL_DUKE,
        single("10", ("0", "0.067"), ("0.5", "0.12"), ("0.2", "0.085")),
    ),
    (
        "1.5a",
        "well between hard walls in a field",
        "10 nm, 0.067 m0, 20 kV/cm, field energy zero at the centre",
        "Ai(xi_1) Bi(xi_2) = Ai(xi_2) Bi(xi_1), xi = (F z - E)/(F l), l^3 = K/(m F)",
        "Airy functions: M. Abramowitz, I. A. Stegun, Handbook of Mathematical Functions, 10.4; the well:"
        " G. Bastard, E. E. Mendez, L. L. Chang, L. Esaki, Phys. Rev. B 28, 3241 (1983)",
        lambda k: infinite_well_in_field(k, 20),
    ),
    (
        "1.5b",
        "the same, strong field",
        "10 nm, 0.067 m0, 100 kV/cm, field energy zero at the centre",
        "as 1.5a",
        "as 1.5a",
        lambda k: infinite_well_in_field(k, 100),
    ),
    (
        "1.6",
        "triangular well at a hard wall",
        "50 kV/cm, 0.067 m0",
        "E_n = -a_n (K F^2/m)^(1/3), a_n the zeros of Ai",
        "zeros of Ai: M. Abramowitz, I. A. Stegun, Handbook of Mathematical Functions, 10.4.94",
        triangular,
    ),
    (
        "1.7",
        "Poeschl-Teller well",
        "-V0/cosh^2(z/a), V0 = 0.3 eV, a = 4 nm, 0.067 m0",
        "E_n = -K/(m a^2) (s - n)^2, s (s + 1) = V0 m a^2/K, n = 0, 1, ...",
        "G. Poeschl, E. Teller, Z. Phys. 83, 143 (1933); L. D. Landau, E. M. Lifshitz, Quantum Mechanics, section 23,"
        " problem 5 (from memory)",
        poeschl_teller,
    ),
    (
        "1.8",
        "parabolic well",
        "quantum 10 meV, 0.067 m0",
        "E_n = (n + 1/2) hw; z_01 = sqrt(K/(m hw))",
        "any textbook of quantum mechanics; e.g. L. D. Landau, E. M. Lifshitz, Quantum Mechanics, section 23",
        parabola,
    ),
    (
        "1.9",
        "symmetric double well",
        "6/2/6 nm, barriers 0.25 eV, masses 0.067/0.09 m0",
        "k w = (n - 1) pi + atan(r) + atan(r tanh(lambda b/2)) even, coth odd; r = lambda A_b/(k A_w)",
        BEN_DANIEL_DUKE,
        lambda k: {"levels_ev": double_well_levels(k, "6", "2", Side("0", "0.067"), Side("0.25", "0.09"))},
    ),
]

EARLIER = {
    "1.1": {
        "levels_ev": ["0.05612390486817", "0.22449561947268", "0.50511514381353"],
        "z_12_nm": "1.8012654869749",
        "z_23_nm": "1.9453667259329",
        "f_12": "0.96067492638661",
    },
    "1.2a": {"levels_ev": ["0.030207485146977", "0.11856972403956", "0.23740171140852"]},
    "1.2b": {"levels_ev": ["0.032443664848926", "0.12434517805208", "0.23794261040531"]},
    "1.3a": {"levels_ev": ["0.055372427628108", "0.19170699439869"]},
    "1.3b": {"levels_ev": ["0.054416938387514", "0.20081073015185"]},
    "1.3c": {"levels_ev": ["0.10335304406161", "0.3338433317657"]},
    "1.3d": {"levels_ev": ["0.098795372140607", "0.38832836534761"]},
    "1.4": {"levels_ev": ["0.031515820991685", "0.1238049929257"]},
    "1.5a": {"levels_ev": ["0.056046741123417", "0.22451861701645", "0.50512885512606"]},
    "1.5b": {"levels_ev": ["0.054206226569685", "0.22505951209959", "0.50545756433981"]},
    "1.6": {"levels_ev": ["0.056640512292263", "0.099030330986769", "0.13373523192501", "0.16440759790591"]},
    "1.7": {"s": "2.4480475747887", "levels_ev": ["-0.21299423993058", "-0.074523597740958", "-0.0071347114497442"]},
    "1.8": {"z_01_nm": "7.5409153767119"},
    "1.9": {"levels_ev": ["0.052199251364393", "0.070800104806982", "0.20802343283591"]},
}


def compare_with_earlier(identifier, values):
    """The worst difference in units of the last printed digit."""
    worst = mpf(0)
    for key, printed in EARLIER[identifier].items():
        texts, numbers = (printed, values[key]) if isinstance(printed, list) else ([printed], [values[key]])
        if len(texts) != len(numbers):
            raise SystemExit(f"{identifier}: {len(numbers)} values for {key} instead of {len(texts)}")
        for text, number in zip(texts, numbers):
            unit = mpf(10) ** -len(text.partition(".")[2])
            worst = max(worst, abs(number - mpf(text)) / unit)
    return worst


def plain(value):
    return [plain(item) for item in value] if isinstance(value, list) else float(mpmath.nstr(value, 16))


def main():
    output = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).with_name("closed_forms.json")
    checks = []
    for identifier, name, inputs, formula, source, function in CHECKS:
        units = compare_with_earlier(identifier, function(EARLIER_K))
        print(f"{identifier:5} {name}: {float(units):.2f} of the last earlier digit")
        if not units <= 0.51:
            raise SystemExit(f"{identifier}: differs from the earlier calculation")
        values = {key: plain(value) for key, value in function(mpf(K)).items()}
        checks.append(
            {"id": identifier, "name": name, "inputs": inputs, "formula": formula, "source": source, "values": values}
        )
    about = "Closed-form levels, made by closed_forms.py, which describes the format. K = hbar^2/2m0."
    document = {"about": about, "hbar2_over_2m0_ev_nm2": float(K), "checks": checks}
    output.write_text(json.dumps(document, indent=1) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
