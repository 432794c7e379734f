//! `levels`: solve a stack.

use super::arguments::Output;
use super::deliver::{Exit, check_output, deliver, show};
use super::input::Input;
use crate::diagnostics::Diagnostic;
use crate::models::{Band, BandOperator};
use crate::open_ends::{self, Outside};
use crate::report::{Levels, OpenLevels};
use crate::structure::Ends;
use crate::subbands::{Accuracy, Bands};
use std::path::Path;

pub fn levels(file: &Path, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    if input.structure.ends == Ends::Open {
        return open(&input, file, output);
    }
    let bands = Bands::solve(
        &input.stack,
        &Band::of(&input.structure),
        Accuracy::default(),
    )
    .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let shown = bands.asked_for(&input.structure);
    input.doubt_all(&bands, &shown);
    input.doubt_growth();
    deliver(
        &Levels::new(&input.structure, &input.stack, &bands, &shown),
        output.format,
        output.output.as_deref(),
        file,
    )
}

/// The levels of a stack that lets electrons out.
fn open(input: &Input, file: &Path, output: &Output) -> Result<Exit, Exit> {
    let operator = BandOperator::conduction(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let solved = open_ends::quasi_bound(&operator, Outside::Field);
    let warn = |words: String| show(&Diagnostic::warning(words), &input.name, &input.text);
    let asked = input.structure.conduction.states;
    let widest_mev = 1e3 * solved.widest_ev;
    let shown = &solved.states[..asked.min(solved.states.len())];
    if shown.is_empty() {
        let words = format!(
            "nothing holds an electron: no level up to the highest band edge is narrower than {widest_mev:.0} meV"
        );
        show(&Diagnostic::error(words), &input.name, &input.text);
        return Err(Exit::NotPossible);
    }
    if shown.iter().all(|state| state.bound) {
        warn(
            "all levels listed lie below the edges outside, and there is no field: nothing can leave, and open ends say no more than walls do"
                .to_owned(),
        );
    } else if shown.len() < asked {
        let why = match solved.leads_ev {
            Some(_) => "higher",
            None => {
                "above the end that the field raises, where a wave runs up the slope outside and comes back"
            }
        };
        warn(format!(
            "{} of the {asked} levels asked for are there; others are wider than {widest_mev:.0} meV, or {why}",
            shown.len()
        ));
    }
    let report = OpenLevels::new(&input.structure, &input.stack, &solved);
    for fault in report.faults() {
        warn(format!("audit: {fault}"));
    }
    input.doubt_growth();
    deliver(&report, output.format, output.output.as_deref(), file)
}
