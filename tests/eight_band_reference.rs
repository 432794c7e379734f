//! Eight coupled bands against levels that an independent program computed by other methods (`tests/reference/README.md`):
//! matched, strained, broken-gap and tilted stacks, at k∥ = 0 and three others.

#[path = "common/eight_band.rs"]
mod eight_band;

use wellwright::models::multiband::{Direction, MultibandModel, MultibandOperator};
use wellwright::structure;
use wellwright::subbands::multiband::{Band, Wanted, solve_multiband};

/// A fiftieth of the 0.05 meV that matter to a design.
const TOLERANCE_EV: f64 = 1e-6;

#[test]
fn levels_of_eight_bands_are_those_of_the_independent_reference() {
    let reference = eight_band::reference();
    assert!(reference.stacks.len() >= 6);
    let mut worst = (0.0_f64, String::new());
    for stack in &reference.stacks {
        let (file, problems) = structure::read(&stack.structure);
        let file = file.unwrap_or_else(|| panic!("{}: {problems:?}", stack.name));
        let layers = file.stack().unwrap();
        for solved in &stack.solved {
            let [kx, ky] = solved.k_per_nm;
            let direction = Direction::of(kx, ky);
            let operator =
                MultibandOperator::new(&layers, MultibandModel::EightBand, direction).unwrap();
            let wanted = Wanted {
                conduction: solved.conduction_ev.len() / 2,
                valence: solved.valence_ev.len() / 2,
            };
            let subbands = solve_multiband(&operator, f64::hypot(kx, ky), wanted, 1e-7);
            for state in &subbands.states {
                assert!(state.error_ev <= 1e-7, "{}: {state:?}", stack.name);
            }
            for (band, expected) in [
                (Band::Conduction, &solved.conduction_ev),
                (Band::Valence, &solved.valence_ev),
            ] {
                let own = subbands.states.iter().filter(|s| s.band == band);
                let mut own: Vec<f64> = own.flat_map(|s| s.energies_ev).collect();
                own.sort_by(f64::total_cmp);
                if band == Band::Valence {
                    own.reverse();
                }
                assert_eq!(own.len(), expected.len());
                for (own, expected) in own.iter().zip(expected) {
                    let off = (own - expected).abs();
                    let place = format!("{} at k = {kx}, {ky}: {own} for {expected}", stack.name);
                    assert!(off < TOLERANCE_EV, "{place}");
                    if off > worst.0 {
                        worst = (off, place);
                    }
                }
            }
        }
    }
    println!("worst difference {:.1e} eV: {}", worst.0, worst.1);
}
