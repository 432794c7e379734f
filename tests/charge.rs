//! Self-consistent bands against independent numbers and closed forms.

mod common;

use std::sync::Arc;
use wellwright::charge::{self, Solution};
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::growth::{Row, plan};
use wellwright::models::Band;
use wellwright::numerics::mesh::Mesh;
use wellwright::optics::depolarisation;
use wellwright::structure::{self, Potential, Stack, Structure};
use wellwright::subbands::{Accuracy, Bands};
use wellwright::tolerance::tolerance;
use wellwright::tune::tune;

fn read(text: &str) -> Structure {
    let (structure, problems) = structure::read(text);
    structure.unwrap_or_else(|| panic!("{problems:#?}"))
}

fn solved(text: &str) -> Solution {
    let structure = read(text);
    let stack = structure.stack().unwrap();
    charge::solve(
        &stack,
        &structure.charge,
        &Band::of(&structure),
        Accuracy::default(),
    )
    .unwrap()
}

/// The reference of a symmetric modulation-doped well, 150 Å and 250 meV deep, with ε = 12.9 throughout, at T = 0: donors
/// as two sheets 175 Å outside the well's faces, walls 200 Å outside. Energies in meV from the potential in the well's
/// middle. Independent code on finite elements, its mesh halved: moved by less than 1e-4 meV.
#[test]
fn symmetric_wells_have_the_reference_levels() {
    let of = |sheet: f64, mass: f64| {
        format!(
            "temperature: 0 K
bands: {{conduction: {{states: 3}}}}
materials:
  Well: {{conduction_edge: 0 eV, electron_mass: 0.067, permittivity_static: 12.9}}
  Barrier: {{conduction_edge: 0.25 eV, electron_mass: {mass}, permittivity_static: 12.9}}
layers:
  - {{material: Barrier, width: 25 Å}}
  - {{sheet_donors: {sheet:e} cm^-2}}
  - {{material: Barrier, width: 175 Å}}
  - {{material: Well, width: 150 Å}}
  - {{material: Barrier, width: 175 Å}}
  - {{sheet_donors: {sheet:e} cm^-2}}
  - {{material: Barrier, width: 25 Å}}
",
            sheet = 0.5 * sheet
        )
    };
    let cases = [
        (1e10, 0.067, [17.1477, 67.8144, 148.2983], None),
        (1e10, 0.0919, [16.2457, 64.8016, 143.8011], None),
        (2e11, 0.067, [15.7319, 64.7856, 144.7534], Some(7.146)),
        (2e11, 0.0919, [14.8069, 61.7683, 140.3889], Some(7.146)),
        (5e11, 0.067, [13.5083, 60.0900, 139.2542], Some(17.865)),
        (5e11, 0.0919, [12.5502, 57.0798, 135.1372], None),
        (1e12, 0.067, [9.8473, 52.5186, 130.2295], Some(35.730)),
        (1e12, 0.0919, [8.8440, 49.5589, 126.7054], None),
    ];
    for (sheet, mass, levels, fermi) in cases {
        let solution = solved(&of(sheet, mass));
        let equilibrium = solution.equilibrium.unwrap();
        println!(
            "{sheet:e} {mass}: {} iterations {:e}",
            equilibrium.iterations, equilibrium.residual_ev
        );
        let potential = solution.stack.potential.as_ref().unwrap();
        let middle = potential.electron_ev(2, 0.5);
        let conduction = solution.bands.conduction().unwrap();
        for (k, level) in levels.iter().enumerate() {
            let found = 1e3 * (conduction.energy_ev(k) - middle);
            println!("  {found:.4} {level}");
            assert!(
                (found - level).abs() < 0.02,
                "{sheet:e} {mass}: {found} for {level}"
            );
        }
        if let Some(fermi) = fermi {
            let found = 1e3 * (equilibrium.fermi_ev - conduction.energy_ev(0));
            println!("  {found:.4} {fermi}");
        }
        println!(
            "  edge {:.4}",
            1e3 * (potential.electron_ev(2, 0.0) - middle)
        );
    }
}

/// A structure of one material, bands flat without charge.
const UNIFORM: &str = "
materials:
  One: {conduction_edge: 0 eV, electron_mass: 0.067, permittivity_static: 12.9}
";

/// e²/ε₀ in eV nm, from CODATA 2018 as in the reference's constants.
const E2_OVER_EPSILON_0: f64 = 18.095_128_22;

/// Fang and Howard, Phys. Rev. Lett. 16, 797 (1966), with the numbers of Stern, Phys. Rev. B 5, 4891 (1972): electrons
/// against a hard wall, N_s = 5e11 and N_depl = 5e10 cm⁻². The trial function (b³/2)^½ z exp(−bz/2) has the energy per
/// electron ħ²b²/8m + (3e²/εb)(N_depl + 11 N_s/32), with b = 0.320229359445/nm; that of the ground state is lower.
#[test]
fn fang_and_howard_lie_just_above() {
    let solution = solved(&format!(
        "temperature: 0 K\nbands: {{conduction: {{states: 2}}}}{UNIFORM}
layers:
  - {{sheet_donors: 5.5e11 cm^-2}}
  - {{material: One, width: 80 nm}}
  - {{sheet_acceptors: 5e10 cm^-2}}
"
    ));
    let found = solution.equilibrium.unwrap();
    assert!(found.densities_cm2[0][1] == 0.0);
    assert!((found.densities_cm2[0][0] / 5e11 - 1.0).abs() < 1e-10);
    let fermi_mev = 1e3 * (found.fermi_ev - solution.bands.conduction().unwrap().energy_ev(0));
    assert!((fermi_mev - 17.86479).abs() < 1e-4, "{fermi_mev}");
    let conduction = solution.bands.conduction().unwrap();
    let state = &conduction.states()[0];
    let mesh = &conduction.pencil.mesh;
    let potential = solution.stack.potential.as_ref().unwrap();
    let parts = &wellwright::subbands::amplitudes(conduction)[0];
    let mean_ev: f64 = parts
        .chunks_exact(mesh.order() + 1)
        .zip(&mesh.elements)
        .flat_map(|(parts, element)| {
            parts.iter().enumerate().map(move |(q, part)| {
                part * part * potential.electron_ev(element.segment, mesh.fraction(element, q))
            })
        })
        .sum();
    let depletion_ev = E2_OVER_EPSILON_0 / 12.9 * 5e-4 * state.centre_nm;
    // The electrons' energy with each other is counted once.
    let total_ev = state.energy_ev - 0.5 * (mean_ev - depletion_ev);
    let (b, k) = (0.320_229_359_445, 0.038_099_821 / 0.067);
    let trial_ev =
        k * b * b / 4.0 + 3.0 * E2_OVER_EPSILON_0 / 12.9 / b * (5e-4 + 11.0 / 32.0 * 5e-3);
    println!("Fang and Howard {trial_ev} eV, ground state {total_ev} eV");
    assert!(total_ev < trial_ev, "{total_ev} {trial_ev}");
    // z exp(−(bz)^1.5/2) is nearer to it (Takada and Uemura, J. Phys. Soc. Jpn 43, 139 (1977), from memory): its energy is
    // 42.9192 meV at the best b, by numerical integration.
    assert!(
        total_ev < 0.042_919_2 && total_ev > 0.995 * 0.042_919_2,
        "{total_ev}"
    );
    // Their level itself, E0 = 66.3215 meV, is no bound.
    assert!(
        (1e3 * state.energy_ev - 66.32).abs() < 3.0,
        "{}",
        state.energy_ev
    );
}

/// e² N d/ε across donors and electrons that lie d apart, however the electrons are spread: 70.14 meV for 5e11 cm⁻² at
/// 100 Å with ε = 12.9. Exact, from Gauss's law; d is that of the electrons' centre.
#[test]
fn a_double_layer_has_the_step_of_gauss() {
    let solution = solved(
        "temperature: 0 K
materials:
  Well: {conduction_edge: 0 eV, electron_mass: 0.067, permittivity_static: 12.9}
  Barrier: {conduction_edge: 0.5 eV, electron_mass: 0.067, permittivity_static: 12.9}
layers:
  - {material: Barrier, width: 10 nm}
  - {sheet_donors: 5e11 cm^-2}
  - {material: Barrier, width: 7 nm}
  - {material: Well, width: 6 nm}
  - {material: Barrier, width: 20 nm}
",
    );
    let found = solution.equilibrium.as_ref().unwrap();
    let centre_nm: f64 = solution
        .bands
        .conduction()
        .unwrap()
        .states()
        .iter()
        .zip(&found.densities_cm2[0])
        .map(|(state, density)| state.centre_nm * density / found.electrons_cm2)
        .sum();
    let potential = solution.stack.potential.as_ref().unwrap();
    let step_mev = 1e3 * (potential.electron_ev(3, 1.0) - potential.electron_ev(0, 0.0));
    let exact_mev = 70.14 * (centre_nm - 10.0) / 10.0;
    assert!(
        (step_mev / exact_mev - 1.0).abs() < 1e-4,
        "{step_mev} {exact_mev}"
    );
    assert!((centre_nm - 20.0).abs() < 0.5, "{centre_nm}");
    assert!(found.end_fields_v_per_nm == [0.0, 0.0]);
}

/// Allen, Tsui and Vinter, Solid State Commun. 20, 425 (1976), for a hard-wall well of 100 Å with 1e12 cm⁻²: S = 5L/9π²,
/// α = 2 e² N S/(ε E₂₁) = 0.093791 and √(1 + α) E₂₁ = 176.0906 meV. In closed form.
#[test]
fn a_hard_wall_well_absorbs_at_its_depolarised_energy() {
    let solution = solved(&format!(
        "temperature: 0 K\ncharge: flat{UNIFORM}\nlayers: [{{material: One, width: 10 nm}}]\n"
    ));
    let answer = depolarisation(
        &solution.stack,
        solution.bands.conduction().unwrap(),
        &[1e12, 0.0, 0.0, 0.0],
    );
    let first = answer.transitions[0];
    assert!((1e3 * first.alone_ev - 176.0906).abs() < 1e-3, "{first:?}");
    // The transition to level 4 pushes it down a little, and takes little of the absorption.
    assert!(first.coupled_ev < first.alone_ev && first.coupled_ev > first.bare_ev);
    let shares: f64 = answer.lines.iter().map(|line| line.share).sum();
    assert!((shares - 1.0).abs() < 1e-12);
}

/// A parabolic well absorbs at its bare ħω = 10 meV, however many electrons fill it and flatten it: Brey, Johnson and
/// Halperin, Phys. Rev. B 40, 10647 (1989). The parabola ½mω²z² reaches 158.2667 meV 60 nm from its middle.
#[test]
fn a_parabolic_well_absorbs_at_its_bare_energy() {
    for sheet in [1e10, 1e11, 3e11] {
        let solution = solved(&format!(
            "temperature: 4 K
bands: {{conduction: {{states: 8}}}}
materials:
  Well: {{conduction_edge: 0 eV, electron_mass: 0.067, permittivity_static: 12.9}}
  Barrier: {{conduction_edge: 0.1582667 eV, electron_mass: 0.067, permittivity_static: 12.9}}
layers:
  - {{sheet_donors: {half:e} cm^-2}}
  - {{material: Barrier, to: Well, profile: parabolic, width: 60 nm}}
  - {{material: Well, to: Barrier, profile: parabolic, width: 60 nm}}
  - {{sheet_donors: {half:e} cm^-2}}
",
            half = 0.5 * sheet
        ));
        let found = solution.equilibrium.as_ref().unwrap();
        assert!(found.is_settled());
        let conduction = solution.bands.conduction().unwrap();
        let answer = depolarisation(&solution.stack, conduction, &found.densities_cm2[0]);
        let main = answer
            .lines
            .iter()
            .max_by(|a, b| a.share.total_cmp(&b.share))
            .unwrap();
        let bare_mev = 1e3 * (conduction.energy_ev(1) - conduction.energy_ev(0));
        println!(
            "{sheet:e}: levels {bare_mev:.3} meV apart, absorption at {:.4} meV, {:.4} of it",
            1e3 * main.energy_ev,
            main.share
        );
        assert!((1e3 * main.energy_ev - 10.0).abs() < 0.1, "{main:?}");
        assert!(main.share > 0.99, "{main:?}");
        if sheet > 2e11 {
            assert!(bare_mev < 5.0, "{bare_mev}");
        }
    }
}

/// The limit of no temperature is reached smoothly: with 18 meV of filling, 0.1 K leaves nothing to be seen.
#[test]
fn zero_temperature_is_a_limit() {
    // The materials themselves change a little with temperature.
    let at = |kelvin: f64| {
        let text = HETEROJUNCTION.replace("SHEET", "5e11");
        let solution = solved(&text.replace("KELVIN", &kelvin.to_string()));
        let first_ev = solution.bands.conduction().unwrap().energy_ev(0);
        solution.equilibrium.unwrap().fermi_ev - first_ev
    };
    let (cold, warmer) = (at(0.0), at(0.1));
    assert!((cold - warmer).abs() < 1e-9, "{cold} {warmer}");
}

/// Few electrons are spread as Boltzmann says: n₂/n₁ = (m₂/m₁) exp(−E₂₁/kT), k_B = 8.617333262e-5 eV/K.
#[test]
fn few_electrons_follow_boltzmann() {
    let solution = solved(&DOPED_WELL.replace("SHEET", "1e7").replace("KELVIN", "300"));
    let found = solution.equilibrium.unwrap();
    let conduction = solution.bands.conduction().unwrap();
    let gap_ev = conduction.energy_ev(1) - conduction.energy_ev(0);
    let states = conduction.states();
    let masses = states[1].in_plane_mass_m0 / states[0].in_plane_mass_m0;
    let exact = masses * (-gap_ev / (8.617_333_262e-5 * 300.0)).exp();
    let ratio = found.densities_cm2[0][1] / found.densities_cm2[0][0];
    assert!((ratio / exact - 1.0).abs() < 1e-4, "{ratio} {exact}");
}

const DOPED_WELL: &str = "
temperature: KELVIN K
bands: {conduction: {model: energy-dependent, states: 2}}
layers:
  - {material: Al0.3Ga0.7As, width: 20 nm}
  - {material: GaAs, width: 8 nm, sheet_donors: SHEET cm^-2}
  - {material: Al0.3Ga0.7As, width: 20 nm}
";
const MODULATED_WELL: &str = "
temperature: KELVIN K
layers:
  - {material: Al0.3Ga0.7As, width: 15 nm}
  - {material: Al0.3Ga0.7As, width: 10 nm, sheet_donors: SHEET cm^-2}
  - {material: Al0.3Ga0.7As, width: 15 nm}
  - {material: GaAs, width: 20 nm}
  - {material: Al0.3Ga0.7As, width: 30 nm}
";
const HETEROJUNCTION: &str = "
temperature: KELVIN K
layers:
  - {material: GaAs, width: 60 nm}
  - {material: Al0.3Ga0.7As, width: 15 nm}
  - {sheet_donors: SHEET cm^-2}
  - {material: Al0.3Ga0.7As, width: 25 nm}
";
const DELTA: &str = "
temperature: KELVIN K
layers:
  - {material: GaAs, width: 40 nm}
  - {sheet_donors: SHEET cm^-2}
  - {material: GaAs, width: 40 nm}
";
const COUPLED: &str = "
temperature: KELVIN K
bands: {conduction: {model: energy-dependent, states: 3}}
layers:
  - {material: Al0.3Ga0.7As, width: 20 nm}
  - {material: GaAs, width: 8 nm}
  - {material: Al0.3Ga0.7As, width: 2 nm}
  - {material: GaAs, width: 7.8 nm}
  - {material: Al0.3Ga0.7As, width: 5 nm}
  - {material: Al0.3Ga0.7As, width: 15 nm, sheet_donors: SHEET cm^-2}
";
const HOLES: &str = "
substrate: GaAs
temperature: KELVIN K
bands: {valence: {model: decoupled, states: 3}}
layers:
  - {material: Al0.3Ga0.7As, width: 15 nm}
  - {sheet_acceptors: SHEET cm^-2}
  - {material: Al0.3Ga0.7As, width: 10 nm}
  - {material: In0.15Ga0.85As, width: 10 nm}
  - {material: Al0.3Ga0.7As, width: 20 nm}
";
/// Under a pinned surface; the doping decides whether the channel holds electrons at all.
const PINNED: &str = "
temperature: KELVIN K
charge: {surface: 0.7 eV}
layers:
  - {material: GaAs, width: 50 nm}
  - {material: Al0.3Ga0.7As, width: 10 nm}
  - {sheet_donors: SHEET cm^-2}
  - {material: Al0.3Ga0.7As, width: 25 nm}
  - {material: GaAs, width: 5 nm}
";
const CONTACT: &str = "
temperature: KELVIN K
charge: {fermi_level: contact, surface: 0.6 eV}
layers:
  - {material: GaAs, width: 60 nm, donors: 5e17 cm^-3}
  - {material: Al0.2Ga0.8As, width: 20 nm}
  - {material: GaAs, width: 10 nm, sheet_donors: SHEET cm^-2}
  - {material: Al0.2Ga0.8As, width: 30 nm}
";
const FROZEN: &str = "
temperature: KELVIN K
charge: {ionisation: {donors: 6 meV}}
layers:
  - {material: Al0.3Ga0.7As, width: 15 nm}
  - {material: Al0.3Ga0.7As, width: 10 nm, sheet_donors: SHEET cm^-2}
  - {material: Al0.3Ga0.7As, width: 10 nm}
  - {material: GaAs, width: 12 nm}
  - {material: Al0.3Ga0.7As, width: 20 nm}
";
const EXCHANGE: &str = "
temperature: KELVIN K
charge: {exchange: local density}
layers:
  - {material: Al0.3Ga0.7As, width: 20 nm}
  - {sheet_donors: SHEET cm^-2}
  - {material: Al0.3Ga0.7As, width: 15 nm}
  - {material: GaAs, width: 15 nm}
  - {material: Al0.3Ga0.7As, width: 30 nm}
";

/// Every structure settles, whatever its doping and temperature, and neutral ones are neutral.
#[test]
fn every_doping_settles_at_every_temperature() {
    let mut most = 0;
    let mut wrong = Vec::new();
    for (name, text) in [
        ("doped well", DOPED_WELL),
        ("modulated well", MODULATED_WELL),
        ("heterojunction", HETEROJUNCTION),
        ("delta", DELTA),
        ("coupled", COUPLED),
        ("holes", HOLES),
        ("pinned", PINNED),
        ("contact", CONTACT),
        ("frozen", FROZEN),
        ("exchange", EXCHANGE),
    ] {
        for sheet in ["1e9", "1e10", "1e11", "1e12", "1e13"] {
            for kelvin in ["4", "20", "77", "300"] {
                let start = std::time::Instant::now();
                let solution = solved(&text.replace("SHEET", sheet).replace("KELVIN", kelvin));
                let found = solution.equilibrium.unwrap();
                println!(
                    "{name} {sheet} {kelvin} K: {} iterations, {:.0e} eV, balance {:.0e}, {} levels, beyond {:.0e}, n {:.3e}, {:?}",
                    found.iterations,
                    found.residual_ev,
                    found.imbalance,
                    found.densities_cm2[0].len(),
                    found.beyond,
                    found.electrons_cm2,
                    start.elapsed()
                );
                let mut faults = solution.bands.conduction().unwrap().audit().faults();
                if !found.is_settled() {
                    faults.push(format!("not settled: {:e} eV", found.residual_ev));
                }
                if found.is_neutral && found.imbalance.abs() > 1e-10 {
                    faults.push(format!("out of balance by {:e}", found.imbalance));
                }
                wrong.extend(
                    faults
                        .iter()
                        .map(|fault| format!("{name} {sheet} {kelvin}: {fault}")),
                );
                most = most.max(found.iterations);
            }
        }
    }
    assert!(wrong.is_empty(), "{wrong:#?}");
    println!("at most {most} iterations");
}

/// Ionised donors as their statistics count them in the potential that came out, summed over a fine ruler.
#[test]
fn donors_are_ionised_as_their_level_says() {
    let text = FROZEN.replace("SHEET", "1e12").replace("KELVIN", "40");
    let solution = solved(&text);
    let found = solution.equilibrium.unwrap();
    let potential = solution.stack.potential.as_ref().unwrap();
    let edge_ev = solution
        .stack
        .material_at(1, 0.5)
        .conduction_edge_ev
        .unwrap();
    let count = 20_000;
    let ionised: f64 = (0..count)
        .map(|k| {
            let level_ev =
                edge_ev - 0.006 + potential.electron_ev(1, (f64::from(k) + 0.5) / f64::from(count));
            1e12 / f64::from(count)
                / (1.0 + 2.0 * ((found.fermi_ev - level_ev) / (8.617_333_262e-5 * 40.0)).exp())
        })
        .sum();
    println!("{} of 1e12 ionised", found.ionised_donors_cm2);
    assert!(
        (ionised / found.ionised_donors_cm2 - 1.0).abs() < 1e-6,
        "{ionised}"
    );
    assert!(found.ionised_donors_cm2 < 0.9e12);
}

/// A surface pins the Fermi level at its distance below the edge, and holds the charge that the layers lack.
#[test]
fn a_pinned_surface_is_where_it_should_be() {
    let solution = solved(&PINNED.replace("SHEET", "3e12").replace("KELVIN", "77"));
    let found = solution.equilibrium.as_ref().unwrap();
    let potential = solution.stack.potential.as_ref().unwrap();
    let edge_ev = solution
        .stack
        .material_at(3, 1.0)
        .conduction_edge_ev
        .unwrap();
    let below_ev = edge_ev + potential.electron_ev(3, 1.0) - found.fermi_ev;
    assert!((below_ev - 0.7).abs() < 1e-9, "{below_ev}");
    assert!(potential.electron_ev(0, 0.0).abs() < 1e-12);
    assert!(found.electrons_cm2 > 1e11 && found.electrons_cm2 < 3e12);
    // Gauss: the field under the surface is that of its electrons.
    let permittivity = solution
        .stack
        .material_at(3, 1.0)
        .permittivity_static
        .unwrap();
    let exact = E2_OVER_EPSILON_0 * 1e-14 * (3e12 - found.electrons_cm2) / permittivity;
    let near = (potential.electron_ev(3, 1.0) - potential.electron_ev(3, 0.999)) / 0.005;
    assert!((near / exact - 1.0).abs() < 1e-3, "{near} {exact}");
    assert!((found.end_fields_v_per_nm[1] / exact - 1.0).abs() < 1e-6);
}

/// Levels, fillings and edges of an independent program (central differences, extrapolated): tests/reference/make_charge.py.
#[test]
fn an_independent_program_agrees() {
    #[derive(serde::Deserialize)]
    struct Case {
        name: String,
        structure: String,
        levels_mev: Vec<f64>,
        fermi_mev: f64,
        edges_mev: Vec<f64>,
        densities_cm2: Vec<f64>,
    }
    let cases: Vec<Case> = serde_json::from_str(include_str!("reference/charge.json")).unwrap();
    assert!(cases.len() >= 4);
    for case in cases {
        let solution = solved(&case.structure);
        let found = solution.equilibrium.unwrap();
        let conduction = solution.bands.conduction().unwrap();
        let first_ev = conduction.energy_ev(0);
        let mut worst = 0.0_f64;
        let mut near = |what: &str, found: f64, exact: f64, tolerance: f64| {
            worst = worst.max((found - exact).abs());
            assert!(
                (found - exact).abs() < tolerance,
                "{} {what}: {found} for {exact}",
                case.name
            );
        };
        for (k, level) in case.levels_mev.iter().enumerate() {
            near(
                "level",
                1e3 * (conduction.energy_ev(k) - first_ev),
                *level,
                2e-3,
            );
        }
        near(
            "Fermi level",
            1e3 * (found.fermi_ev - first_ev),
            case.fermi_mev,
            2e-3,
        );
        let potential = solution.stack.potential.as_ref().unwrap();
        let middle = case.edges_mev.len() - 1;
        for (layer, edge) in case.edges_mev.iter().enumerate().take(middle) {
            near("edge", 1e3 * potential.hole_ev(layer, 0.0), *edge, 2e-3);
        }
        near(
            "edge",
            1e3 * potential.hole_ev(middle - 1, 1.0),
            case.edges_mev[middle],
            2e-3,
        );
        println!("{}: within {worst:.1e} meV", case.name);
        for (k, density) in case.densities_cm2.iter().enumerate() {
            let off = (found.densities_cm2[0][k] - density) / found.electrons_cm2;
            assert!(off.abs() < 1e-4, "{}: {off}", case.name);
        }
    }
}

/// Slopes of tolerance with the charge's answer, against full solves of files that say other widths.
#[test]
fn charge_answers_to_widths() {
    let with = |nm: f64| {
        read(&format!(
            "substrate: GaAs\ntemperature: 77 K\nbands: {{conduction: {{states: 3}}}}\nlayers:
  - {{material: Al0.3Ga0.7As, width: 10 nm}}
  - {{material: Al0.3Ga0.7As, width: 10 nm, sheet_donors: 1e12 cm^-2}}
  - {{material: Al0.3Ga0.7As, width: 10 nm}}
  - {{name: well, material: GaAs, width: {nm} nm}}
  - {{material: Al0.3Ga0.7As, width: 30 nm}}
tolerance: {{jitter: 0.05 nm, samples: 400}}
"
        ))
    };
    let structure = with(12.0);
    let stack = structure.stack().unwrap();
    let outcome = tolerance(&structure, &stack, None, Accuracy::default(), &|_| {}).unwrap();
    let of = |nm: f64| {
        let structure = with(nm);
        let stack = structure.stack().unwrap();
        let solution = charge::solve(
            &stack,
            &structure.charge,
            &Band::of(&structure),
            Accuracy::default(),
        )
        .unwrap();
        [0, 1, 2].map(|k| solution.bands.conduction().unwrap().energy_ev(k))
    };
    // Five points: what curves is left out to the fourth order.
    let step = 0.05;
    let at = [-2.0, -1.0, 1.0, 2.0].map(|k| of(12.0 + k * step));
    let found = outcome
        .sensitivities
        .iter()
        .find(|s| s.name == "width of well")
        .unwrap();
    for (k, shift_ev) in found.level_shifts_ev.iter().enumerate() {
        let [a, b, c, d] = at.map(|levels| levels[k]);
        let exact = (a - 8.0 * b + 8.0 * c - d) / (12.0 * step);
        let slope = shift_ev / found.amount;
        println!("slope {slope} eV/nm, off by {:.1e}", slope - exact);
        assert!(
            (slope - exact).abs() < 1e-5 * exact.abs() + 1e-7,
            "{k}: {slope} {exact}"
        );
    }
    let doping = outcome
        .sensitivities
        .iter()
        .find(|s| s.name == "doping")
        .unwrap();
    assert!(doping.level_shifts_ev[1] - doping.level_shifts_ev[0] != 0.0);
    // Sampled wafers follow the slopes, charge included.
    let sampled = outcome.sampled.unwrap();
    let first = &sampled.transitions[0];
    let ratio = first.energy_ev.deviation / first.linear_deviation_ev;
    assert!((ratio - 1.0).abs() < 0.1, "{ratio}");
}

/// Slopes of tuning on a charged stack against files with other values: good to 1e-5.
#[test]
fn tuning_knows_the_answer_of_the_charge() {
    let text = "substrate: GaAs
temperature: 77 K
bands: {conduction: {model: energy-dependent, states: 2}}
layers:
  - {material: Al0.3Ga0.7As, width: 20 nm}
  - {name: well, material: GaAs, width: 6.6 nm, sheet_donors: 1e12 cm^-2}
  - {material: Al0.3Ga0.7As, width: 20 nm}
tune:
  vary: [{layer: well, width: [5 nm, 9 nm]}]
  aims:
    - {from: conduction 1, to: conduction 2, energy: 125 meV}
    - {from: conduction 1, to: conduction 2, maximize: dipole, weight: 0.01}
";
    let structure = read(text);
    let stack = structure.stack().unwrap();
    let outcome = tune(&structure, &stack, Accuracy::default(), &|_| {}).unwrap();
    assert!(outcome.is_reached());
    let slopes = outcome.task.value_slopes(&outcome.before);
    let of = |nm: f64| {
        let mut stack = stack.clone();
        stack.set_width(1, nm);
        outcome.task.design(stack, None).unwrap().values
    };
    // Five points, an eighth of the curvature's error.
    let step = 0.05;
    let values = [-2.0, -1.0, 1.0, 2.0].map(|k| of(6.6 + k * step));
    for row in 0..2 {
        let [a, b, c, d] = [0, 1, 2, 3].map(|k| values[k][row]);
        let exact = (a - 8.0 * b + 8.0 * c - d) / (12.0 * step);
        let off = slopes[(row, 0)] / exact - 1.0;
        println!("slope off by {off:.1e}");
        assert!(off.abs() < 1e-5, "{row}: {} {exact}", slopes[(row, 0)]);
    }
}

/// What a file may say and may not.
#[test]
fn files_are_told_what_charge_needs() {
    let said = |text: &str| {
        let (structure, problems) = structure::read(text);
        let words: Vec<String> = problems
            .iter()
            .map(|p| p.render("f", text, false))
            .collect();
        (structure, words.join("\n"))
    };
    let well = |head: &str, doping: &str| {
        format!(
            "{head}layers:\n  - {{material: Al0.3Ga0.7As, width: 20 nm}}\n  - {{name: well, material: GaAs, width: 8 nm{doping}}}\n  - {{material: Al0.3Ga0.7As, width: 20 nm}}\n"
        )
    };
    let doped = ", donors: 1e17 cm^-3";
    for (text, wanted) in [
        (well("field: 5 kV/cm\n", doped), "warning: layer `well` is doped, but its bands stay flat"),
        (well("charge: {surface: 0.7 eV, fermi_level: neutral}\n", doped), "not both"),
        (well("charge: {surface: 0.7}\n", doped), "has no unit"),
        (well("charge: {surfce: 0.7 eV}\n", doped), "did you mean `surface`?"),
        (well("charge: {fermi_level: contct}\n", doped), "did you mean `contact`?"),
        (well("charge: {fermi_level: contact}\n", doped), "is not doped, so that its bulk has no Fermi level"),
        (well("field: 5 kV/cm\ncharge: {surface: 0.7 eV}\n", doped), "the file states a field too"),
        (well("charge: {}\n", ""), "nothing is doped"),
        (well("charge: {exchange: none}\n", doped), "`local density`"),
        (well("charge: {ionisation: {donors: {degeneracy: 0, energy: 6 meV}}}\n", doped), "out of range"),
        (well("charge: {ionisation: {donors: {}}}\n", doped), "this ionisation has no `energy`"),
        (well("charge: bent\n", doped), "expected `flat`"),
        (well("ends: periodic\ncharge: {surface: 0.7 eV}\n", doped), "a periodic stack has no surface"),
        (well("", ", acceptors: 1e17 cm^-3"), "the stack cannot be neutral"),
        (well("", ", donors: 1e17 cm^-3, acceptors: 1e17 cm^-3"), "make up for each other"),
        (well("", ", sheet_donors: 1e17 cm^-3"), "density per volume"),
        (well("", ", sheet_donors: 1e17 cm^-2"), "out of range"),
        ("layers: [{sheet_donors: 1e11 cm^-2}]\n".to_owned(), "there is no layer, only planes"),
        ("layers: [{material: GaAs, width: 5 nm}, {sheet_donors: 1e11 cm^-2, donors: 1e17 cm^-3}]\n".to_owned(), "stands in a plane of dopants"),
        ("materials: {M: {conduction_edge: 0 eV, electron_mass: 0.1}}\nlayers: [{material: M, width: 5 nm, donors: 1e17 cm^-3}]\n".to_owned(), "has no `permittivity_static`"),
    ] {
        let (_, words) = said(&text);
        assert!(words.contains(wanted), "{text}\n{words}");
    }
    for text in [
        well("field: 5 kV/cm\ncharge: flat\n", doped),
        well("field: 5 kV/cm\ncharge: {fermi_level: neutral}\n", doped),
        well("", doped),
        well("charge: {surface: 0.7 eV}\n", ""),
    ] {
        let (structure, words) = said(&text);
        assert!(structure.is_some() && words.is_empty(), "{text}\n{words}");
    }
}

/// Nothing that is too much takes long or is taken for a result.
#[test]
fn what_is_too_much_is_refused() {
    for (layer, what) in [
        (
            "width: 100 µm, donors: 1e18 cm^-3",
            "more than 120 subbands",
        ),
        ("width: 10 µm, donors: 1e20 cm^-3", "more than 120 subbands"),
        ("width: 8 nm, donors: 1e-300 cm^-3", "cannot be neutral"),
    ] {
        let structure = read(&format!("layers: [{{material: GaAs, {layer}}}]\n"));
        let stack = structure.stack().unwrap();
        let bands = Band::of(&structure);
        let error =
            charge::solve(&stack, &structure.charge, &bands, Accuracy::default()).unwrap_err();
        assert!(error.to_string().contains(what), "{error}");
    }
}

/// Ten wells far apart, each with its own plane: every one keeps its electrons, and the audit knows states that lie apart.
#[test]
fn wells_far_apart_keep_their_electrons() {
    let solution = solved(
        "temperature: 4 K
layers:
  - {material: Al0.3Ga0.7As, width: 40 nm}
  - repeat: 10
    layers:
      - {material: GaAs, width: 5 nm}
      - {material: Al0.3Ga0.7As, width: 20 nm}
      - {sheet_donors: 3e11 cm^-2}
      - {material: Al0.3Ga0.7As, width: 20 nm}
",
    );
    let found = solution.equilibrium.as_ref().unwrap();
    assert!(found.is_settled());
    let faults = solution.bands.conduction().unwrap().audit().faults();
    assert!(faults.is_empty(), "{faults:?}");
    // Inner wells see the same on either side; of the outer ones each side's plane has a half.
    let inner = &found.densities_cm2[0][..10];
    assert!(inner.iter().all(|n| *n > 1e11), "{inner:?}");
    assert!((found.electrons_cm2 / 3e12 - 1.0).abs() < 1e-10);
}

/// A pinned surface of a thick doped crystal at 0 K: multiplied with du/dz, Poisson's equation has the first integral
/// ε E²/2 = e² N (φ + E_F) − p, with the pressure p = 2/5 N E_F of the bulk's electrons (Schottky's depletion, Sze 1981, with
/// the electrons' own share). The quantum edge of the depletion layer moves the field by less than 2e-4.
#[test]
fn a_pinned_surface_has_the_field_of_schottky() {
    for (cm3, height_ev, width_nm) in [(1e18, 0.7, 110), (5e17, 0.6, 150), (2e18, 0.8, 90)] {
        let solution = solved(&format!(
            "temperature: 0 K
charge: {{fermi_level: contact, surface: {height_ev} eV}}
materials: {{Crystal: {{conduction_edge: 0 eV, electron_mass: 0.067, permittivity_static: 12.9}}}}
layers:
  - {{material: Crystal, width: {width_nm} nm, donors: {cm3:e} cm^-3}}
"
        ));
        let density = 1e-21 * cm3;
        let squared = (3.0 * std::f64::consts::PI.powi(2) * density).powf(2.0 / 3.0);
        let fermi_ev = HBAR2_OVER_2M0 / 0.067 * squared;
        let found = solution.equilibrium.unwrap();
        assert!(found.is_settled() && (found.fermi_ev - fermi_ev).abs() < 1e-9);
        let exact =
            (2.0 * E2_OVER_EPSILON_0 / 12.9 * density * (height_ev + 0.6 * fermi_ev)).sqrt();
        let ratio = found.end_fields_v_per_nm[1] / exact;
        // The electron's energy rises towards the surface.
        assert!((ratio - 1.0).abs() < 2e-4, "{cm3:e}: {ratio}");
    }
}

/// What raises all edges alike raises all levels and changes nothing else: strained layers with both mass laws, graded ones,
/// holes, and a bent potential on top.
#[test]
fn a_potential_that_is_the_same_everywhere_only_raises() {
    let structure = read(
        "substrate: GaAs
temperature: 300 K
bands:
  conduction: {model: energy-dependent, states: 3}
  valence: {model: decoupled, states: 3}
layers:
  - {material: Al0.3Ga0.7As, width: 12 nm, donors: 1e18 cm^-3}
  - {material: In0.2Ga0.8As, width: 8 nm}
  - {material: In0.2Ga0.8As, to: Al0.3Ga0.7As, width: 5 nm}
  - {material: Al0.3Ga0.7As, width: 12 nm}
",
    );
    let accuracy = Accuracy::default();
    let asked = Band::of(&structure);
    let stack = structure.stack().unwrap();
    let mut bent = charge::solve(&stack, &structure.charge, &asked, accuracy)
        .unwrap()
        .stack;
    let solve = |stack: &Stack| Bands::solve(stack, &asked, accuracy).unwrap();
    let before = solve(&bent);
    let shift_ev = 0.3;
    let known = bent.potential.clone().unwrap();
    let lengths: Vec<f64> = bent.layers.iter().map(|layer| layer.width_nm).collect();
    let mesh = Mesh::new(&lengths, &[4; 4], 12);
    let at = |of: &dyn Fn(usize, f64) -> f64| -> Vec<f64> {
        let nodes = mesh
            .elements
            .iter()
            .flat_map(|element| (0..=12).map(|q| (element.segment, mesh.fraction(element, q))));
        nodes.map(|(layer, t)| of(layer, t)).collect()
    };
    let raised = |shift_ev: f64| {
        let own = at(&|layer, t| known.hole_ev(layer, t) + shift_ev);
        Some(Arc::new(Potential::new(mesh.clone(), own.clone(), own)))
    };
    bent.potential = raised(0.0);
    let again = solve(&bent);
    bent.potential = raised(shift_ev);
    let after = solve(&bent);
    for band in 0..before.count() {
        let states = [&before, &again, &after].map(|bands| bands.states(band));
        for ((first, one), other) in states[0].iter().zip(&states[1]).zip(&states[2]) {
            assert!((one.energy_ev - first.energy_ev).abs() < 1e-7);
            let moved_ev = other.energy_ev - one.energy_ev - shift_ev;
            assert!(moved_ev.abs() < 1e-9, "{band}: {moved_ev}");
            let mass = other.in_plane_mass_m0 / one.in_plane_mass_m0;
            assert!((mass - 1.0).abs() < 1e-8, "{band}: {mass}");
            assert!((other.centre_nm - one.centre_nm).abs() < 1e-7);
        }
        let dipole = |bands: &Bands| bands.dipole_nm(band, 0, 1);
        assert!((dipole(&after) - dipole(&again)).abs() < 1e-7);
    }
}

/// A field over a neutral stack is the field at both of its ends.
#[test]
fn a_field_stays_outside() {
    let solution = solved(
        "temperature: 77 K\nfield: 10 kV/cm\ncharge: {fermi_level: neutral}\nlayers:\n  - {material: Al0.3Ga0.7As, width: 20 nm}\n  - {material: GaAs, width: 8 nm, donors: 5e17 cm^-3}\n  - {material: Al0.3Ga0.7As, width: 20 nm}\n",
    );
    let found = solution.equilibrium.unwrap();
    for field in found.end_fields_v_per_nm {
        assert!((field - 1e-3).abs() < 1e-12);
    }
    let potential = solution.stack.potential.as_ref().unwrap();
    let slope = |layer: usize, t: f64| {
        (potential.electron_ev(layer, t + 1e-4) - potential.electron_ev(layer, t)) / 2e-3
    };
    assert!(slope(0, 0.0).abs() < 1e-8 && slope(2, 0.9999).abs() < 1e-8);
}

/// A page for the grower shows planes of dopants, and the content id knows them.
#[test]
fn planes_of_dopants_are_grown() {
    let of = |planes: &str| {
        let text = format!(
            "substrate: GaAs\nlayers:\n  - {{material: GaAs, width: 10 nm}}\n  - repeat: 3\n    layers:\n      - {{material: Al0.3Ga0.7As, width: 5 nm}}\n{planes}      - {{material: Al0.3Ga0.7As, width: 5 nm}}\n      - {{material: GaAs, width: 8 nm}}\n  - {{material: Al0.3Ga0.7As, width: 10 nm}}\ngrowth: {{rates: {{Ga: 0.7 ML/s, Al: 0.3 ML/s}}, dopants: {{donors: Si}}}}\n"
        );
        let structure = read(&text);
        let stack = structure.stack().unwrap();
        (plan(&structure, &stack).unwrap(), stack, structure)
    };
    let (without, ..) = of("");
    let (planned, stack, structure) = of("      - {name: spike, sheet_donors: 5e11 cm^-2}\n");
    let (more, ..) = of("      - {name: spike, sheet_donors: 6e11 cm^-2}\n");
    assert!(planned.content_id != without.content_id && planned.content_id != more.content_id);
    assert_eq!(stack.planes.len(), 3);
    assert_eq!(stack.planes[2].label, "spike [3]");
    assert_eq!(stack.planes[0].layer, 2);
    let rows: Vec<&Row> = planned
        .rows
        .iter()
        .filter(|row| matches!(row, Row::Plane(_)))
        .collect();
    let [Row::Plane(plane)] = rows[..] else {
        panic!("{rows:?}")
    };
    assert_eq!((plane.donors_cm2, plane.depth), (5e11, 1));
    assert!((plane.after.width_nm() - 15.0).abs() < 1e-9);
    // Three stops of growth: the dopant opens three times, and so do the cells after it.
    let opened = |planned: &wellwright::growth::Plan, name: &str| {
        planned
            .shutters
            .iter()
            .find(|s| s.name == name)
            .unwrap()
            .openings
    };
    assert_eq!(opened(&planned, "Si"), 3);
    assert_eq!(opened(&planned, "Al"), opened(&without, "Al") + 3);
    let silicon = planned
        .materials
        .iter()
        .find(|m| m.element == "Si")
        .unwrap();
    assert!((silicon.atoms_per_cm2 / 1.5e12 - 1.0).abs() < 1e-12);
    let bench = common::Bench::new();
    let text = "substrate: GaAs\nlayers:\n  - {material: GaAs, width: 10 nm}\n  - {name: spike, sheet_donors: 5e11 cm^-2}\n  - {material: GaAs, width: 10 nm}\ngrowth: {rates: {Ga: 0.7 ML/s}, dopants: {donors: Si}}\n";
    bench.write("delta.yaml", text);
    let ran = bench.run(&["sheet", "delta.yaml"]).code(0);
    assert!(
        ran.stdout.contains("growth stops") && ran.stdout.contains("Si 5e11 cm^-2"),
        "{}",
        ran.stdout
    );
    let ran = bench
        .run(&["sheet", "delta.yaml", "--format", "html"])
        .code(0);
    assert!(ran.stdout.contains("growth stops") && ran.stdout.contains("Si 5e11 cm^-2"));
    assert_eq!(structure.planes.len(), 1);
}

/// What a user sees of charge.
#[test]
fn reports_tell_of_charge() {
    let bench = common::Bench::new();
    bench.write(
        "well.yaml",
        MODULATED_WELL
            .replace("SHEET", "1e12")
            .replace("KELVIN", "77"),
    );
    let ran = bench.run(&["levels", "well.yaml"]).code(0);
    for words in [
        "Fermi level",
        "carriers cm⁻²",
        "coupled meV",
        "iterations",
        "Strongest lines",
    ] {
        assert!(ran.stdout.contains(words), "{words}\n{}", ran.stdout);
    }
    assert_eq!(ran.stderr.matches("is doped").count(), 0, "{}", ran.stderr);
    let json: serde_json::Value = serde_json::from_str(
        &bench
            .run(&["levels", "well.yaml", "--format", "json"])
            .code(0)
            .stdout,
    )
    .unwrap();
    let electrons = json["charge"]["electrons_cm2"].as_f64().unwrap();
    assert!((electrons / 1e12 - 1.0).abs() < 1e-9);
    let ran = bench
        .run(&["levels", "well.yaml", "--format", "csv"])
        .code(0);
    assert!(
        ran.stdout.contains("band,index,density_cm2,share"),
        "{}",
        ran.stdout
    );
    let ran = bench.run(&["plot", "well.yaml"]).code(0);
    assert!(ran.stdout.contains("fermi-level") && ran.stdout.contains("Fermi level at"));
}

/// Nothing that takes flat bands takes them in silence.
#[test]
fn commands_that_leave_charge_out_say_so() {
    let bench = common::Bench::new();
    bench.write(
        "well.yaml",
        "substrate: GaAs
temperature: 77 K
layers:
  - {material: Al0.3Ga0.7As, width: 12 nm, donors: 1e18 cm^-3}
  - {material: GaAs, width: 9 nm}
  - {material: Al0.3Ga0.7As, width: 15 nm}
",
    );
    let commands: [&[&str]; 3] = [
        &["absorption", "well.yaml"],
        &["transmission", "well.yaml", "--points", "5"],
        &[
            "dispersion",
            "well.yaml",
            "--model",
            "six-band",
            "--points",
            "2",
        ],
    ];
    for command in commands {
        let told = bench.run(command).code(0).stderr;
        assert!(
            told.contains("charge bends the bands of this file"),
            "{told}"
        );
    }
}
