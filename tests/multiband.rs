//! Six and eight coupled bands: against the bulk matrix, one band, published wells, and themselves turned.

use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::models::multiband::{Direction, MultibandModel, MultibandOperator};
use wellwright::structure;
use wellwright::subbands::multiband::{
    Band, MultibandSubbands, Wanted, solve_multiband, zone_centre_masses,
};

const TOLERANCE_EV: f64 = 1e-8;

fn stack_of(text: &str) -> structure::Stack {
    let (file, problems) = structure::read(text);
    file.unwrap_or_else(|| panic!("{problems:?}")).stack().unwrap()
}

fn solved(
    text: &str,
    model: MultibandModel,
    direction: Direction,
    k_per_nm: f64,
    wanted: Wanted,
) -> MultibandSubbands {
    let stack = stack_of(text);
    let operator = MultibandOperator::new(&stack, model, direction).unwrap();
    solve_multiband(&operator, k_per_nm, wanted, TOLERANCE_EV)
}

fn valence_mev(subbands: &MultibandSubbands) -> Vec<f64> {
    let states = subbands.states.iter().filter(|s| s.band == Band::Valence);
    states.map(|s| -1e3 * s.energies_ev[0]).collect()
}

/// A layer between walls with γ = 6.98, 2.06, 2.93 and a split-off band so far away that four bands are left.
const LUTTINGER_WELL: &str = "bands: {conduction: {model: parabolic, states: 1}}\nmaterials:\n  \
    Well: {conduction_edge: 1.5 eV, electron_mass: 0.067, valence_edge: 0 eV, spin_orbit: 1000000 eV, luttinger: [6.98, 2.06, 2.93]}\n\
    layers:\n  - {material: Well, width: 10 nm}\n";

/// Hard-wall well of the 4 × 4 Luttinger matrix in the axial approximation, γ = 6.98, 2.06, 2.93, 10 nm: computed from
/// the stated inputs by independent code, converged to 1e-5 meV.
#[test]
fn hard_wall_luttinger_well_in_the_axial_approximation() {
    let wanted = Wanted { conduction: 0, valence: 5 };
    for (k, expected) in [
        (0.0, vec![10.75446, 41.73935, 43.01785, 96.79016, 166.95739]),
        (0.1, vec![13.36917, 34.15419, 54.69644, 94.33786, 170.80328]),
        (0.2, vec![19.24134, 31.52911, 70.6697, 89.91175]),
        (0.3, vec![22.2039, 38.0322, 88.2244, 89.7181]),
        (0.5, vec![28.24393, 52.76129, 99.2034, 132.4899]),
    ] {
        let subbands = solved(LUTTINGER_WELL, MultibandModel::SixBand, Direction::AXIAL, k, wanted);
        let own = valence_mev(&subbands);
        println!("k {k}: {own:?}");
        for (own, expected) in own.iter().zip(&expected) {
            assert!((own - expected).abs() < 1e-4, "k {k}: {own} for {expected}");
        }
    }
}
