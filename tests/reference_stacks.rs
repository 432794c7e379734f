//! Random stacks against levels and dipoles that an independent program computed by other methods
//! (`tests/reference/README.md`): up to nine layers, with and without field, parabolic and both energy-dependent masses.

use serde::Deserialize;
use wellwright::models::BandOperator;
use wellwright::optics::transitions;
use wellwright::structure;
use wellwright::subbands::{Accuracy, solve};

#[derive(Deserialize)]
struct Reference {
    stacks: Vec<Stack>,
}

#[derive(Deserialize)]
struct Stack {
    name: String,
    levels_ev: Vec<f64>,
    dipoles_nm: Vec<(usize, usize, f64)>,
    structure: String,
}

/// 0.001 meV, and a part in 10⁴ of a dipole; dipoles below a picometre are compared as such.
const LEVEL_TOLERANCE_EV: f64 = 1e-6;
const DIPOLE_TOLERANCE: f64 = 1e-4;
const DIPOLE_FLOOR_NM: f64 = 1e-3;

#[test]
fn levels_and_dipoles_are_those_of_the_independent_reference() {
    let reference: Reference = serde_json::from_str(include_str!("reference/stacks.json")).unwrap();
    assert!(reference.stacks.len() >= 50);
    let (mut worst_level, mut worst_dipole) = ((0.0, ""), (0.0, ""));
    for stack in &reference.stacks {
        let (file, problems) = structure::read(&stack.structure);
        let file = file.unwrap_or_else(|| panic!("{}: {problems:?}", stack.name));
        let layers = file.stack().unwrap();
        let operator = BandOperator::conduction(&layers, file.conduction.model).unwrap();
        let subbands = solve(&operator, stack.levels_ev.len(), Accuracy::default());
        for (pair, expected) in subbands.pairs.iter().zip(&stack.levels_ev) {
            let off = (pair.value - expected).abs();
            if off > worst_level.0 {
                worst_level = (off, &stack.name);
            }
        }
        for estimate in &subbands.errors_ev {
            assert!(
                *estimate <= Accuracy::default().tolerance_ev,
                "{}: error estimate {estimate}",
                stack.name
            );
        }
        let list = transitions(&subbands);
        for &(from, to, expected) in &stack.dipoles_nm {
            let own = list
                .iter()
                .find(|t| t.from + 1 == from && t.to + 1 == to)
                .unwrap();
            let off = (own.dipole_nm - expected).abs() / expected.max(DIPOLE_FLOOR_NM);
            if off > worst_dipole.0 {
                worst_dipole = (off, &stack.name);
            }
        }
        assert!(
            subbands.audit().faults().is_empty(),
            "{}: {:?}",
            stack.name,
            subbands.audit()
        );
    }
    println!(
        "{} stacks: worst level {:.1e} eV ({}), worst dipole {:.1e} ({})",
        reference.stacks.len(),
        worst_level.0,
        worst_level.1,
        worst_dipole.0,
        worst_dipole.1
    );
    assert!(worst_level.0 <= LEVEL_TOLERANCE_EV, "{worst_level:?}");
    assert!(worst_dipole.0 <= DIPOLE_TOLERANCE, "{worst_dipole:?}");
}
