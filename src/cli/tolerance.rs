//! `tolerance`: how far transitions move, and what share of wafers will do.

use super::arguments::Output;
use super::deliver::{Exit, check_output, deliver, show};
use super::input::Input;
use super::progress::SearchProgress;
use super::threads::pool;
use crate::diagnostics::Diagnostic;
use crate::report::Tolerances;
use crate::subbands::Accuracy;
use crate::tolerance::{self, Outcome, ToleranceError};
use std::path::Path;

pub fn tolerance(
    file: &Path,
    samples: Option<u32>,
    threads: Option<u16>,
    output: &Output,
) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    input.without_minibands("`tolerance`")?;
    input.with_walls("tolerances are those of levels");
    input.without_coupled("tolerances are those of")?;
    if input.structure.tolerance.is_none() {
        let doubt = Diagnostic::warning("there is no `tolerance` block, so nothing is sampled")
            .expected("`tolerance` with spreads such as `rate: 0.7 %`");
        show(&doubt, &input.name, &input.text);
    }
    let outcome = worked_out(&input, samples, threads)?;
    let bands = outcome.abrupt.alone();
    let listed: Vec<usize> = bands
        .map(|solved| {
            let own = outcome.levels.iter();
            own.filter(|level| level.band == solved.band.name()).count()
        })
        .collect();
    input.doubt_all(&outcome.abrupt, &listed);
    deliver(
        &Tolerances::new(&input.structure, &input.stack, &outcome),
        output.format,
        output.output.as_deref(),
        file,
    )
}

/// The tolerances of a file, with progress shown and mistakes told.
pub fn worked_out(
    input: &Input,
    samples: Option<u32>,
    threads: Option<u16>,
) -> Result<Outcome, Exit> {
    let pool = pool(threads)?;
    let progress = SearchProgress::new();
    let outcome = pool.install(|| {
        tolerance::tolerance(
            &input.structure,
            &input.stack,
            samples.map(|samples| samples as usize),
            Accuracy::default(),
            &|done| progress.say(format!("{done} wafers")),
        )
    });
    drop(progress);
    outcome.map_err(|error| match &error {
        ToleranceError::Unsuitable { layer, reason } => input.unsuitable(*layer, reason),
        ToleranceError::Charge(error) => input.uncharged(error),
        ToleranceError::Interface { .. } | ToleranceError::NoLayer => {
            let mut problem = Diagnostic::error(error.to_string());
            let grading = input.structure.tolerance.as_ref();
            if let Some(grading) = grading.and_then(|tolerance| tolerance.grading.as_ref()) {
                problem = problem.at(grading.span.clone());
            }
            show(&problem, &input.name, &input.text);
            Exit::WrongInput
        }
        ToleranceError::Coupled { .. } => {
            let problem = Diagnostic::error(error.to_string()).hint(
                "`valence: {model: decoupled}` solves heavy and light holes each on their own",
            );
            show(&problem, &input.name, &input.text);
            Exit::WrongInput
        }
        ToleranceError::NoLevel { .. } => {
            show(
                &Diagnostic::error(error.to_string()),
                &input.name,
                &input.text,
            );
            Exit::NotPossible
        }
    })
}
