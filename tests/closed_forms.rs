//! Levels that can be written down: `tests/reference/closed_forms.json` holds them with their formulas and sources, made
//! with 30 digits by `tests/reference/closed_forms.py`. Tolerance: 0.001 meV, and 1e-6 of a dipole.

use serde_json::Value;
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::models::BandOperator;
use wellwright::numerics::eigenpairs::lowest;
use wellwright::numerics::mesh::Mesh;
use wellwright::numerics::pencil::{Coefficient, Pencil};
use wellwright::optics::transitions;
use wellwright::structure;
use wellwright::subbands::{Accuracy, Subbands, solve};

const TOLERANCE_EV: f64 = 1e-6;

fn check(id: &str) -> Value {
    let file: Value = serde_json::from_str(include_str!("reference/closed_forms.json")).unwrap();
    let checks = file["checks"].as_array().unwrap();
    checks
        .iter()
        .find(|c| c["id"] == id)
        .unwrap_or_else(|| panic!("no check {id}"))["values"]
        .clone()
}

fn levels(id: &str) -> Vec<f64> {
    check(id)["levels_ev"]
        .as_array()
        .unwrap()
        .iter()
        .map(|v| v.as_f64().unwrap())
        .collect()
}

fn number(id: &str, key: &str) -> f64 {
    check(id)[key]
        .as_f64()
        .unwrap_or_else(|| panic!("no {key} in {id}"))
}

fn solved(text: &str, count: usize) -> Subbands {
    let (file, problems) = structure::read(text);
    let file = file.unwrap_or_else(|| panic!("{problems:?}\n{text}"));
    let stack = file.stack().unwrap();
    let operator = BandOperator::conduction(&stack, file.conduction.model).unwrap();
    solve(&operator, count, Accuracy::default())
}

/// Compares energies after taking `shift_ev` off: a field counts its energy from the bottom of the stack.
fn assert_levels(id: &str, subbands: &Subbands, shift_ev: f64) {
    for (pair, expected) in subbands.pairs.iter().zip(levels(id)) {
        let own = pair.value - shift_ev;
        assert!(
            (own - expected).abs() < TOLERANCE_EV,
            "{id}: {own} for {expected}"
        );
    }
}

fn materials(well: &str, barrier: &str) -> String {
    format!("materials:\n  W: {{conduction_edge: 0 eV, {well}}}\n  B: {{{barrier}}}\n")
}

#[test]
fn well_between_hard_walls_with_dipoles_and_sum_rule() {
    let text = "materials: {W: {conduction_edge: 0 eV, electron_mass: 0.067}}\nlayers: [{material: W, width: 10 nm}]\n";
    let subbands = solved(text, 3);
    assert_levels("1.1", &subbands, 0.0);
    let list = transitions(&subbands);
    let find = |from, to| list.iter().find(|t| (t.from, t.to) == (from, to)).unwrap();
    for (t, key) in [(find(0, 1), "z_12_nm"), (find(1, 2), "z_23_nm")] {
        let expected = number("1.1", key);
        assert!(
            (t.dipole_nm / expected - 1.0).abs() < 1e-6,
            "{key}: {} for {expected}",
            t.dipole_nm
        );
    }
    let strength = find(0, 1).normalised_strength;
    assert!(
        (strength / number("1.1", "f_12") - 1.0).abs() < 1e-6,
        "f12 = {strength}"
    );
    // Thomas–Reiche–Kuhn: the strengths from the ground state, (64/π²) n²/(n² − 1)³ for even n, add up to 1.
    let many = solved(text, 40);
    let sum: f64 = transitions(&many)
        .iter()
        .filter(|t| t.from == 0)
        .map(|t| t.normalised_strength)
        .sum();
    let strength = |n: f64| 64.0 / std::f64::consts::PI.powi(2) * n * n / (n * n - 1.0).powi(3);
    let beyond: f64 = (21..20_000).map(|k| strength(2.0 * f64::from(k))).sum();
    assert!(
        (sum + beyond - 1.0).abs() < 1e-9,
        "sum {sum} and {beyond} beyond"
    );
}

#[test]
fn finite_wells() {
    let wells = [
        ("1.2a", "6.7e-2", "0.24 eV", "0.092", 100.0, 150.0, ""),
        ("1.2b", "6.7e-2", "0.24 eV", "0.067", 100.0, 150.0, ""),
        (
            "1.3a",
            "0.067",
            "0.24 eV",
            "0.092",
            65.0,
            40.0,
            "1.519 eV/1.8 eV",
        ),
        ("1.3b", "0.067", "0.24 eV", "0.092", 65.0, 40.0, ""),
        (
            "1.3c",
            "0.043",
            "0.52 eV",
            "0.075",
            60.0,
            30.0,
            "0.79 eV/1.45 eV",
        ),
        ("1.3d", "0.043", "0.52 eV", "0.075", 60.0, 30.0, ""),
    ];
    for (id, well_mass, barrier, barrier_mass, width, pad_nm, laws) in wells {
        let (mut model, mut well_law, mut barrier_law) =
            ("parabolic", String::new(), String::new());
        if let Some((w, b)) = laws.split_once('/') {
            model = "energy-dependent";
            well_law = format!(", nonparabolicity_energy: {w}");
            barrier_law = format!(", nonparabolicity_energy: {b}");
        }
        let text = materials(
            &format!("electron_mass: {well_mass}{well_law}"),
            &format!("conduction_edge: {barrier}, electron_mass: {barrier_mass}{barrier_law}"),
        ) + &format!(
            "bands: {{conduction: {{model: {model}}}}}\nlayers:\n  - {{material: B, width: {pad_nm} nm}}\n  \
             - {{material: W, width: {width} Å}}\n  - {{material: B, width: {pad_nm} nm}}\n"
        );
        assert_levels(id, &solved(&text, levels(id).len()), 0.0);
    }
}

#[test]
fn asymmetric_and_double_wells() {
    let text = "materials:\n  L: {conduction_edge: 0.5 eV, electron_mass: 0.12}\n  W: {conduction_edge: 0 eV, electron_mass: 0.067}\n  \
                R: {conduction_edge: 0.2 eV, electron_mass: 0.085}\nlayers:\n  - {material: L, width: 20 nm}\n  - {material: W, width: 10 nm}\n  - {material: R, width: 40 nm}\n";
    assert_levels("1.4", &solved(text, 2), 0.0);
    let double = materials(
        "electron_mass: 0.067",
        "conduction_edge: 0.25 eV, electron_mass: 0.09",
    ) + "layers:\n  - {material: B, width: 40 nm}\n  - {material: W, width: 6 nm}\n  - {material: B, width: 2 nm}\n  \
           - {material: W, width: 6 nm}\n  - {material: B, width: 40 nm}\n";
    assert_levels("1.9", &solved(&double, 3), 0.0);
}

#[test]
fn wells_in_a_field() {
    for (id, field) in [("1.5a", 20.0), ("1.5b", 100.0)] {
        let text = format!(
            "field: {field} kV/cm\nmaterials: {{W: {{conduction_edge: 0 eV, electron_mass: 0.067}}}}\nlayers: [{{material: W, width: 10 nm}}]\n"
        );
        // The published zero of the field's energy is the centre of the well.
        assert_levels(id, &solved(&text, 3), field * 1e-4 * 5.0);
    }
    let triangle = "field: 50 kV/cm\nmaterials: {W: {conduction_edge: 0 eV, electron_mass: 0.067}}\nlayers: [{material: W, width: 120 nm}]\n";
    assert_levels("1.6", &solved(triangle, 4), 0.0);
}

/// −V₀ sech²(z/a): no file describes it, so the elements are given the potential itself.
#[test]
fn poeschl_teller_well() {
    let (depth, a, mass) = (0.3, 4.0, 0.067);
    let mesh = Mesh::new(&[120.0], &[40], 12);
    let frame = mesh.clone();
    let pencil = Pencil::new(mesh, |_, element, q| {
        let z = frame.position(element, q) - 60.0;
        Coefficient {
            stiffness: HBAR2_OVER_2M0 / mass,
            poles: [None; 2],
            constant: -depth / (z / a).cosh().powi(2),
        }
    });
    for (pair, expected) in lowest(&pencil, 3).iter().zip(levels("1.7")) {
        assert!(
            (pair.value - expected).abs() < TOLERANCE_EV,
            "{} for {expected}",
            pair.value
        );
    }
}

/// A parabola of quantum 10 meV: V(80 nm) = m ω² z²/2 = (ħω)² z²/(4 ħ²/2m).
#[test]
fn parabolic_grade() {
    let half_nm: f64 = 80.0;
    let edge_ev = 0.01f64.powi(2) * half_nm.powi(2) / (4.0 * HBAR2_OVER_2M0 / 0.067);
    let text = format!(
        "materials:\n  W: {{conduction_edge: 0 eV, electron_mass: 0.067}}\n  B: {{conduction_edge: {edge_ev:.15} eV, electron_mass: 0.067}}\nlayers:\n  \
         - {{material: B, to: W, profile: parabolic, width: {half_nm} nm}}\n  - {{material: W, to: B, profile: parabolic, width: {half_nm} nm}}\n"
    );
    let subbands = solved(&text, 4);
    assert_levels("1.8", &subbands, 0.0);
    let dipole = transitions(&subbands)[0].dipole_nm;
    assert!(
        (dipole / number("1.8", "z_01_nm") - 1.0).abs() < 1e-6,
        "{dipole}"
    );
}
