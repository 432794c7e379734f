//! Stacks repeated for ever against closed forms: Kronig and Penney (Proc. R. Soc. A 130, 499 (1931)) with masses that
//! differ, free electrons, tight binding, standing waves of finite stacks.

mod common;

use common::{Bench, list, number};
use std::f64::consts::PI;
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::models::BandOperator;
use wellwright::structure::{self, Stack, Structure};
use wellwright::subbands::{Accuracy, solve};
use wellwright::superlattice::{Minibands, Zone, density_of_states, minibands};

fn read(text: &str) -> (Structure, Stack) {
    let (structure, problems) = structure::read(text);
    let structure = structure.unwrap_or_else(|| panic!("{problems:?}\n{text}"));
    let stack = structure.stack().unwrap();
    (structure, stack)
}

fn solved(text: &str) -> Minibands {
    let (structure, stack) = read(text);
    let period = structure.period(&stack);
    let operator = BandOperator::conduction(&period, structure.conduction.model).unwrap();
    minibands(&operator, structure.conduction.states, Accuracy::default())
}

/// Well and barrier in nm, eV and free-electron masses.
#[derive(Clone, Copy)]
struct KronigPenney {
    well_nm: f64,
    barrier_nm: f64,
    height_ev: f64,
    masses: [f64; 2],
}

impl KronigPenney {
    fn file(&self, states: usize) -> String {
        format!(
            "ends: periodic\nbands: {{conduction: {{states: {states}}}}}\nmaterials:\n  \
             W: {{conduction_edge: 0 eV, electron_mass: {}}}\n  B: {{conduction_edge: {} eV, electron_mass: {}}}\n\
             layers:\n  - {{material: B, width: {} nm}}\n  - {{material: W, width: {} nm}}\n",
            self.masses[0], self.height_ev, self.masses[1], self.barrier_nm, self.well_nm
        )
    }

    fn period_nm(&self) -> f64 {
        self.well_nm + self.barrier_nm
    }

    /// cos q d = cos ka cosh κb + ½ (η − 1/η) sin ka sinh κb with η = κ m_w/(k m_b), and its continuation above the barrier.
    fn cosine(&self, energy_ev: f64) -> f64 {
        let [well, barrier] = self.masses;
        let k = (well * energy_ev / HBAR2_OVER_2M0).sqrt();
        let below = self.height_ev - energy_ev;
        let kappa = (barrier * below.abs() / HBAR2_OVER_2M0).sqrt();
        let eta = kappa * well / (k * barrier);
        let (sin, cos) = (k * self.well_nm).sin_cos();
        let b = kappa * self.barrier_nm;
        if below > 0.0 {
            cos * b.cosh() + 0.5 * (eta - 1.0 / eta) * sin * b.sinh()
        } else {
            cos * b.cos() - 0.5 * (eta + 1.0 / eta) * sin * b.sin()
        }
    }

    /// ħ²/(∂²E/∂q²) at an edge: −cos q d/(d F/dE) is ∂²E/∂(q d)², with F the cosine above.
    fn mass(&self, energy_ev: f64) -> f64 {
        let h = 1e-5;
        let slope = (8.0 * (self.cosine(energy_ev + h) - self.cosine(energy_ev - h))
            - (self.cosine(energy_ev + 2.0 * h) - self.cosine(energy_ev - 2.0 * h)))
            / (12.0 * h);
        let bend = -self.cosine(energy_ev).signum() / slope * self.period_nm().powi(2);
        2.0 * HBAR2_OVER_2M0 / bend
    }
}

const SHORT: KronigPenney = KronigPenney {
    well_nm: 4.0,
    barrier_nm: 2.0,
    height_ev: 0.2866,
    masses: [0.067, 0.096],
};
const WIDE: KronigPenney = KronigPenney {
    well_nm: 9.7,
    barrier_nm: 1.7,
    height_ev: 0.2591,
    masses: [0.067, 0.0919],
};

/// Band edges of the closed form, found to 14 digits by independent arithmetic.
#[test]
fn band_edges_are_those_of_kronig_and_penney() {
    let cases = [
        (
            SHORT,
            [
                0.074233189571702,
                0.14236641378014,
                0.31788860110272,
                0.58923695089372,
            ],
        ),
        (
            WIDE,
            [
                0.023671415949787,
                0.040831588825258,
                0.10112916032735,
                0.16413059969287,
            ],
        ),
    ];
    for (case, exact) in cases {
        let found = solved(&case.file(2));
        let edges = found.minibands.iter().flat_map(|band| &band.edges);
        for (edge, exact) in edges.zip(exact) {
            assert!(
                (edge.energy_ev - exact).abs() < 1e-9,
                "{} for {exact}",
                edge.energy_ev
            );
            assert!(edge.error_ev < 1e-8);
            let mass = edge.mass_m0.unwrap();
            let expected = case.mass(exact);
            assert!(
                (mass / expected - 1.0).abs() < 1e-6,
                "mass {mass} for {expected}"
            );
        }
        assert!(found.audit.faults().is_empty(), "{:?}", found.audit);
    }
}

#[test]
fn every_phase_lies_on_the_closed_form() {
    for case in [SHORT, WIDE] {
        let found = solved(&case.file(4));
        let phases: Vec<f64> = (0..=12).map(|k| PI * f64::from(k) / 12.0).collect();
        for band in found.dispersed(&phases) {
            for (energy_ev, phase) in band.energies_ev.iter().zip(&phases) {
                let cosine = case.cosine(*energy_ev);
                assert!(
                    (cosine - phase.cos()).abs() < 1e-6,
                    "{cosine} for {}",
                    phase.cos()
                );
            }
        }
    }
}

/// 97 Å GaAs / 17 Å Al0.3Ga0.7As: a miniband of about 18 meV (Waschke et al., Phys. Rev. Lett. 70, 3319 (1993), from
/// memory).
#[test]
fn the_miniband_of_a_bloch_oscillator_is_as_wide_as_published() {
    let width = 1e3 * solved(&WIDE.file(1)).minibands[0].width_ev();
    assert!((width - 18.0).abs() < 1.5, "{width}");
    let library = solved(
        "substrate: GaAs\ntemperature: 10 K\nends: periodic\nlayers:\n  - {material: GaAs, width: 9.7 nm}\n  - {material: Al0.3Ga0.7As, width: 1.7 nm}\n",
    );
    let width = 1e3 * library.minibands[0].width_ev();
    assert!((width - 18.0).abs() < 1.5, "{width}");
}

/// One material has no gaps: E = ħ²q²/2m folded into the minizone, and the density of states of three dimensions,
/// (2m/ħ²)^{3/2} √E/2π² with both spins.
#[test]
fn one_material_is_free() {
    let mass = 0.067;
    let text = format!(
        "ends: periodic\nbands: {{conduction: {{states: 4}}}}\nmaterials:\n  W: {{conduction_edge: 0.1 eV, electron_mass: {mass}}}\n\
         layers:\n  - {{material: W, width: 7 nm}}\n  - {{material: W, width: 5 nm}}\n"
    );
    let found = solved(&text);
    assert!(found.audit.faults().is_empty(), "{:?}", found.audit);
    let energy = |phase: f64| 0.1 + HBAR2_OVER_2M0 / mass * (phase / 12.0).powi(2);
    for (n, band) in found.minibands.iter().enumerate() {
        assert!(band.gap_ev < 2e-8, "gap {}", band.gap_ev);
        let near = energy(PI * n as f64);
        assert!((band.edges[0].energy_ev - near).abs() < 1e-8);
        assert!((band.edges[1].energy_ev - energy(PI * (n + 1) as f64)).abs() < 1e-8);
    }
    assert!((found.minibands[0].edges[0].mass_m0.unwrap() / mass - 1.0).abs() < 1e-9);
    for (n, band) in found.dispersed(&[0.7, 2.0]).iter().enumerate() {
        for (energy_ev, phase) in band.energies_ev.iter().zip([0.7, 2.0]) {
            let folded = if n % 2 == 0 { phase } else { -phase };
            let unfolded = folded + 2.0 * PI * n.div_ceil(2) as f64;
            assert!((energy_ev - energy(unfolded)).abs() < 1e-8);
        }
    }
    for above in [0.02, 0.1, 0.3] {
        let density = density_of_states(&found, &[0.1 + above])[0].per_volume;
        let exact = 1e21 * (mass / HBAR2_OVER_2M0).powf(1.5) * above.sqrt() / (2.0 * PI * PI);
        assert!(
            (density / exact - 1.0).abs() < 1e-9,
            "{density:e} for {exact:e}"
        );
    }
}

/// In every gap the density is that of as many two-dimensional subbands as there are minibands below:
/// m/πħ² = 2.7988008505e13 /eV cm² for m = 0.067.
#[test]
fn each_miniband_holds_one_subband_per_period() {
    let case = KronigPenney {
        masses: [0.067; 2],
        ..SHORT
    };
    let found = solved(&case.file(3));
    for (n, band) in found.minibands.iter().take(2).enumerate() {
        let gap = band.edges[1].energy_ev + 0.5 * band.gap_ev;
        let density = density_of_states(&found, &[gap])[0].per_period;
        let exact = 2.7988008505e13 * (n + 1) as f64;
        assert!((density / exact - 1.0).abs() < 1e-7, "{density:e}");
    }
    // Half of the phases lie below the energy at a quarter of the zone's circumference.
    let half = found.dispersed(&[0.5 * PI])[0].energies_ev[0];
    let density = density_of_states(&found, &[half])[0].per_period;
    assert!((density / (0.5 * 2.7988008505e13) - 1.0).abs() < 1e-7);
    let first = solved(&SHORT.file(1)).minibands[0]
        .edges
        .map(|edge| edge.energy_ev);
    let density = |ev| density_of_states(&solved(&SHORT.file(1)), &[ev])[0].per_period;
    assert_eq!(density(first[0] - 1e-3), 0.0);
}

/// ħ²/m* = ħ²/m − Σ 2 |⟨n|∂H/∂k|j⟩|²/(E_j − E_n) for one mass m (Luttinger and Kohn, Phys. Rev. 97, 869 (1955)).
#[test]
fn transitions_give_the_mass_by_the_sum_rule() {
    let case = KronigPenney {
        masses: [0.067; 2],
        ..SHORT
    };
    let found = solved(&case.file(14));
    for zone in [Zone::Centre, Zone::Border] {
        let edges = &found.minibands[0].edges;
        let edge = edges.iter().find(|edge| edge.zone == zone).unwrap();
        let own = found
            .transitions
            .iter()
            .filter(|t| t.from == 0 && t.zone == zone);
        let lost: f64 = own
            .map(|t| t.momentum_ev * HBAR2_OVER_2M0 / t.energy_ev)
            .sum();
        let bend = 2.0 * HBAR2_OVER_2M0 / 0.067 - 2.0 * lost;
        let mass = 2.0 * HBAR2_OVER_2M0 / bend;
        assert!(
            (mass / edge.mass_m0.unwrap() - 1.0).abs() < 2e-4,
            "{mass} for {edge:?}"
        );
    }
}

/// Far apart wells: a cosine whose width is twice the splitting of two of them (4t against 2t).
#[test]
fn far_wells_are_tightly_bound() {
    let case = KronigPenney {
        well_nm: 6.0,
        barrier_nm: 12.0,
        height_ev: 0.25,
        masses: [0.067, 0.09],
    };
    let found = solved(&case.file(1));
    let [e0, e1, e2] = {
        let band = &found.dispersed(&[0.0, PI / 3.0, PI])[0].energies_ev;
        [band[0], band[1], band[2]]
    };
    assert!(((e1 - e0) / (e2 - e0) - 0.25).abs() < 1e-3);
    let pair = "bands: {conduction: {states: 2}}\nmaterials:\n  W: {conduction_edge: 0 eV, electron_mass: 0.067}\n  \
                B: {conduction_edge: 0.25 eV, electron_mass: 0.09}\nlayers:\n  - {material: B, width: 30 nm}\n  - {material: W, width: 6 nm}\n  \
                - {material: B, width: 12 nm}\n  - {material: W, width: 6 nm}\n  - {material: B, width: 30 nm}\n";
    let (structure, stack) = read(pair);
    let operator = BandOperator::conduction(&stack, structure.conduction.model).unwrap();
    let levels = solve(&operator, 2, Accuracy::default()).pairs;
    let splitting = levels[1].value - levels[0].value;
    assert!(
        ((e2 - e0) / (2.0 * splitting) - 1.0).abs() < 2e-3,
        "{} {splitting}",
        e2 - e0
    );
}

/// N mirror-symmetric periods between walls on their mirror planes: standing waves with q d = π j/N, whatever the mass law
/// and however the layers are graded.
#[test]
fn standing_waves_of_a_finite_stack_lie_on_the_dispersion() {
    let layers = "  - repeat: 8\n    layers:\n      - {material: Al0.3Ga0.7As, width: 0.9 nm}\n      \
                  - {material: Al0.3Ga0.7As, to: GaAs, width: 1.5 nm}\n      - {material: GaAs, width: 4 nm}\n      \
                  - {material: GaAs, to: Al0.3Ga0.7As, width: 1.5 nm}\n      - {material: Al0.3Ga0.7As, width: 0.9 nm}\n";
    let head = "substrate: GaAs\ntemperature: 77 K\nbands: {conduction: {model: energy-dependent, states: 15}}\n";
    let (structure, stack) = read(&format!("{head}layers:\n{layers}"));
    let operator = BandOperator::conduction(&stack, structure.conduction.model).unwrap();
    let finite = solve(&operator, 15, Accuracy::default()).pairs;
    let found = solved(
        &format!("{head}ends: periodic\nlayers:\n{layers}").replace("states: 15", "states: 2"),
    );
    let phases: Vec<f64> = (1..8).map(|j| PI * f64::from(j) / 8.0).collect();
    for (n, band) in found.dispersed(&phases).iter().enumerate() {
        let mut energies = band.energies_ev.clone();
        energies.sort_by(f64::total_cmp);
        for energy_ev in energies {
            let nearest = finite
                .iter()
                .map(|pair| (pair.value - energy_ev).abs())
                .fold(f64::INFINITY, f64::min);
            assert!(
                nearest < 2e-8,
                "miniband {}: {energy_ev} is {nearest} off",
                n + 1
            );
        }
    }
}

/// A crystal has no first layer: where its period is cut, in a layer, in a grade or at a border, changes nothing. And a
/// period that holds another one twice folds its minibands (Brillouin): bands 2n − 1 and 2n touch, and their outer edges
/// are those of band n, masses too.
#[test]
fn where_a_period_is_cut_changes_nothing_and_two_of_them_fold() {
    let head = "ends: periodic
bands: {conduction: {model: energy-dependent, states: STATES}}
materials:
  W: {conduction_edge: 0.0 eV, electron_mass: 0.05, nonparabolicity_energy: 1.0 eV}
  M: {conduction_edge: 0.15 eV, electron_mass: 0.065, nonparabolicity_energy: 1.25 eV}
  B: {conduction_edge: 0.3 eV, electron_mass: 0.08, nonparabolicity_energy: 1.5 eV}
layers:
";
    let of = |layers: &[&str], states: usize| {
        let lines = layers
            .iter()
            .map(|layer| format!("  - {{material: {layer}}}\n"));
        let lines: String = lines.collect();
        solved(&format!("{head}{lines}").replace("STATES", &states.to_string()))
    };
    let whole = ["W, width: 6 nm", "W, to: B, width: 4 nm", "B, width: 2 nm"];
    let one = of(&whole, 4);
    let cuts: [&[&str]; 3] = [
        &["B, width: 2 nm", "W, width: 6 nm", "W, to: B, width: 4 nm"],
        &["W, width: 1.7 nm", whole[1], whole[2], "W, width: 4.3 nm"],
        &[
            "M, to: B, width: 2 nm",
            whole[2],
            whole[0],
            "W, to: M, width: 2 nm",
        ],
    ];
    for cut in cuts {
        let other = of(cut, 4);
        for (a, b) in one.minibands.iter().zip(&other.minibands) {
            for (a, b) in a.edges.iter().zip(&b.edges) {
                assert!((a.energy_ev - b.energy_ev).abs() < 1e-10);
                assert!((a.mass_m0.unwrap() / b.mass_m0.unwrap() - 1.0).abs() < 1e-8);
                assert!((a.in_plane_mass_m0 - b.in_plane_mass_m0).abs() < 1e-10);
                assert_eq!(a.zone, b.zone);
            }
        }
    }
    let twice = of(&[whole, whole].concat(), 8);
    for (n, band) in one.minibands.iter().enumerate() {
        let [lower, upper] = [&twice.minibands[2 * n], &twice.minibands[2 * n + 1]];
        let (touching, above) = (lower.edges[1].energy_ev, upper.edges[0].energy_ev);
        assert!((above - touching).abs() < 1e-9);
        for (found, expected) in [lower.edges[0], upper.edges[1]].iter().zip(&band.edges) {
            assert!((found.energy_ev - expected.energy_ev).abs() < 1e-10);
            assert!((found.mass_m0.unwrap() / expected.mass_m0.unwrap() - 1.0).abs() < 1e-8);
        }
    }
}

/// Holes are the other way up, and the group velocity is the slope of the energy.
#[test]
fn holes_have_minibands_too() {
    let found = Bench::new();
    found.write(
        "a.yaml",
        "substrate: GaAs\nends: periodic\nbands: {conduction: {states: 1}, valence: {states: 1}}\nlayers:\n  - {material: GaAs, width: 4 nm}\n  - {material: Al0.3Ga0.7As, width: 2 nm}\n",
    );
    let json = found
        .run(&[
            "dispersion",
            "a.yaml",
            "--points",
            "201",
            "--format",
            "json",
        ])
        .code(0)
        .json();
    let names: Vec<&str> = list(&json, "minibands")
        .iter()
        .map(|m| m["band"].as_str().unwrap())
        .collect();
    assert_eq!(names, ["conduction", "heavy-hole", "light-hole"]);
    for (band, rises) in [("conduction", true), ("heavy-hole", false)] {
        let points: Vec<_> = list(&json, "points")
            .iter()
            .filter(|p| p["band"] == band)
            .collect();
        let energy = |k: usize| number(points[k], "energy_eV");
        assert_eq!(energy(200) > energy(0), rises);
        let slope = (energy(101) - energy(99))
            / (number(points[101], "q_per_nm") - number(points[99], "q_per_nm"));
        // ħ = 6.582119569e-16 eV s (CODATA 2022).
        let velocity = 1e-9 * slope / 6.582_119_569e-16;
        assert!((number(points[100], "velocity_m_s") / velocity - 1.0).abs() < 1e-3);
    }
}

#[test]
fn what_a_period_cannot_be_is_told() {
    let bench = Bench::new();
    let layers =
        "layers:\n  - {material: GaAs, width: 4 nm}\n  - {material: Al0.3Ga0.7As, width: 2 nm}\n";
    bench.write(
        "field.yaml",
        format!("field: 10 kV/cm\nends: periodic\n{layers}"),
    );
    let told = bench.run(&["levels", "field.yaml"]).code(2).stderr;
    assert!(
        told.contains("field.yaml:1:8") && told.contains("wellwright cascade"),
        "{told}"
    );
    bench.write("a.yaml", format!("ends: periodic\n{layers}"));
    for command in ["tune", "tolerance", "sweep", "plot"] {
        let told = bench.run(&[command, "a.yaml"]).code(2).stderr;
        assert!(told.contains("does not know minibands"), "{told}");
    }
    bench.run(&["check", "a.yaml"]).code(0);
    bench.run(&["dispersion", "a.yaml", "-o", "a.svg"]).code(0);
    let drawn = bench.read("a.svg");
    assert_eq!(
        drawn.matches("<path").count(),
        5,
        "four minibands and one density"
    );
}
