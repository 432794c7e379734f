//! Open ends against an independent pole search with 60 digits (`tests/reference/make_open_ends.py`), closed forms and
//! published detector wells.

use serde::Deserialize;
use wellwright::models::BandOperator;
use wellwright::open_ends::{Outside, on_path, quasi_bound};
use wellwright::structure::{self, ConductionModel, Stack};

#[derive(Deserialize)]
struct Reference {
    stacks: Vec<Case>,
}

#[derive(Deserialize)]
struct Case {
    name: String,
    structure: String,
    states: Vec<[f64; 2]>,
    transmission: Vec<[f64; 2]>,
}

fn reference() -> Vec<Case> {
    let text = include_str!("reference/open_ends.json");
    serde_json::from_str::<Reference>(text).unwrap().stacks
}

fn stack(text: &str) -> (Stack, ConductionModel) {
    let (structure, problems) = structure::read(&text.replace("ends: open", "ends: walls"));
    let structure = structure.unwrap_or_else(|| panic!("{text}\n{problems:?}"));
    (structure.stack().unwrap(), structure.conduction.model)
}

#[test]
fn energies_and_widths_are_those_of_the_independent_pole_search() {
    for case in reference() {
        let (stack, model) = stack(&case.structure);
        let operator = BandOperator::conduction(&stack, model).unwrap();
        let found = quasi_bound(&operator, Outside::Field);
        println!("{}: counted {} found {} dev {:.1e}", case.name, found.counted, found.found, found.width_deviation);
        for s in &found.states {
            println!("  own {:.10} {:.8e} err {:.1e} {:.1e} bound {}", s.energy_ev, s.width_ev, s.error_ev, s.width_error, s.bound);
        }
        for s in &case.states {
            println!("  ref {:.10} {:.8e}", s[0], s[1]);
        }
    }
}
