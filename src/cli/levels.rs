//! `levels`: solve a stack.

use super::arguments::Output;
use super::cascade;
use super::deliver::{Exit, check_output, deliver, show};
use super::input::Input;
use super::minibands;
use crate::diagnostics::Diagnostic;
use crate::models::{Band, BandOperator};
use crate::open_ends::{self, Outside, Wanted};
use crate::report::{ChargeReport, Levels, OpenLevels};
use crate::structure::Ends;
use std::path::Path;

pub fn levels(file: &Path, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    match input.structure.ends {
        Ends::Walls => {}
        Ends::Open => return open(&input, file, output),
        Ends::Periodic => return minibands::levels(&input, output, file),
    }
    let solution = input.solved(&Band::of(&input.structure))?;
    let shown = solution.bands.asked_for(&input.structure);
    input.doubt_all(&solution.bands, &shown);
    let exit = input.doubt_charge(solution.equilibrium.as_ref());
    input.doubt_growth();
    cascade::hint(&input);
    let levels = Levels::new(&input.structure, &solution.stack, &solution.bands, &shown);
    deliver(
        &levels.with_charge(ChargeReport::new(
            &solution,
            &shown,
            &input.structure.charge,
        )),
        output.format,
        output.output.as_deref(),
        file,
    )?;
    Ok(exit)
}

/// The levels of a stack that lets electrons out.
fn open(input: &Input, file: &Path, output: &Output) -> Result<Exit, Exit> {
    let operator = BandOperator::conduction(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let asked = input.structure.conduction.states;
    let solved = open_ends::quasi_bound(&operator, Outside::Field, &Wanted::lowest(asked));
    let warn = |words: String| show(&Diagnostic::warning(words), &input.name, &input.text);
    let report = OpenLevels::new(&input.structure, &input.stack, &solved);
    let widest_mev = 1e3 * solved.widest_ev;
    let shown = &solved.states[..asked.min(solved.states.len())];
    if shown.is_empty() {
        let words = if solved.complete {
            format!(
                "nothing holds an electron: no level up to the highest band edge is narrower than {widest_mev:.0} meV"
            )
        } else {
            report.faults().join("; ")
        };
        show(&Diagnostic::error(words), &input.name, &input.text);
        return Err(Exit::NotPossible);
    }
    if shown.iter().all(|state| state.bound) {
        warn(
            "all levels listed lie below the edges outside, and there is no field: nothing can leave, and open ends say no more than walls do"
                .to_owned(),
        );
    }
    if shown.len() < asked && solved.complete && !shown.iter().all(|state| state.bound) {
        let why = match solved.leads_ev {
            Some(_) => "higher",
            None => {
                "above the end that the field raises, where a wave runs up the slope outside and comes back"
            }
        };
        let words = format!(
            "{} of the {asked} levels asked for are there; others are wider than {widest_mev:.0} meV, or {why}",
            shown.len()
        );
        let doubt = Diagnostic::warning(words)
            .hint("`transmission` finds the resonances of the stack between flat contacts");
        show(&doubt, &input.name, &input.text);
    }
    for fault in report.faults() {
        warn(format!("audit: {fault}"));
    }
    input.doubt_growth();
    deliver(&report, output.format, output.output.as_deref(), file)
}
