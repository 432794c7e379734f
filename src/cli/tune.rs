//! `tune`: change a stack until it meets its aims.

use super::arguments::Format;
use super::deliver::{Exit, check_output, complain, deliver, show, write};
use super::input::Input;
use super::progress::SearchProgress;
use crate::diagnostics::Diagnostic;
use crate::report::Tuning;
use crate::structure::{self, Edits, Knob, NewWidth};
use crate::subbands::Accuracy;
use crate::tune::{self, Outcome, TuneError};
use std::path::{Path, PathBuf};

pub fn tune(file: &Path, format: Format, outputs: &[PathBuf]) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    input.without_minibands("`tune`")?;
    for output in outputs {
        check_output(Some(output), file)?;
    }
    input.with_walls("tuning solves");
    let is_structure =
        |path: &&PathBuf| path.extension().is_some_and(|e| e == "yaml" || e == "yml");
    let (structures, reports): (Vec<&PathBuf>, Vec<&PathBuf>) =
        outputs.iter().partition(is_structure);
    if structures.len() > 1 || reports.len() > 1 {
        complain(
            "error: -o may be given once for the tuned structure (.yaml or .yml) and once for the report",
        );
        return Err(Exit::WrongInput);
    }
    let progress = SearchProgress::new();
    let outcome = tune::tune(
        &input.structure,
        &input.stack,
        Accuracy::default(),
        &|stage| progress.show(stage),
    );
    drop(progress);
    let outcome = outcome.map_err(|error| match &error {
        TuneError::Charge(error) => input.uncharged(error),
        TuneError::NothingToTune => {
            let problem = Diagnostic::error("there is no `tune` block in the file")
                .expected("`tune` with `vary` and `aims`");
            show(&problem, &input.name, &input.text);
            Exit::WrongInput
        }
        TuneError::Snap(_)
        | TuneError::Unsolved
        | TuneError::NotGrowable { .. }
        | TuneError::TooManyChoices { .. } => {
            show(
                &Diagnostic::error(error.to_string()),
                &input.name,
                &input.text,
            );
            Exit::NotPossible
        }
    })?;
    let text = structure::rewrite(&input.text, &input.structure, &edits(&outcome)).map_err(
        |problems| {
            problems
                .iter()
                .for_each(|problem| show(problem, &input.name, &input.text));
            Exit::WrongInput
        },
    )?;
    let tuned = Input {
        stack: outcome.after.stack.clone(),
        ..input
    };
    let report = Tuning::new(&tuned.structure, &outcome, text.clone());
    let listed = Tuning::listed(&tuned.structure, &outcome);
    tuned.doubt_all(&outcome.after.bands, &listed);
    let exit = tuned.doubt_charge(outcome.after.equilibrium.as_ref());
    tuned.doubt_growth();
    if let Some(path) = structures.first() {
        write(path, &text, file)?;
    }
    deliver(
        &report,
        format,
        reports.first().map(|path| path.as_path()),
        file,
    )?;
    Ok(if outcome.is_reached() {
        exit
    } else {
        Exit::NotPossible
    })
}

/// The tuned numbers as edits of the file.
fn edits(outcome: &Outcome) -> Edits {
    let mut edits = Edits::default();
    for variable in &outcome.task.variables {
        let stack = &outcome.after.stack;
        match variable.knob {
            Knob::Width { entry } => {
                let whole = outcome
                    .continuous
                    .as_ref()
                    .and(stack.entry_monolayer_nm(entry));
                let width_nm = stack.entry_width_nm(entry).unwrap_or(variable.low);
                edits.widths.push((
                    entry,
                    match whole {
                        Some(monolayer_nm) => {
                            NewWidth::Monolayers((width_nm / monolayer_nm).round())
                        }
                        None => NewWidth::Length(width_nm),
                    },
                ));
            }
            Knob::Fraction { entry, .. } => {
                if let Some(composition) = stack.composition(entry) {
                    edits.compositions.push((entry, composition.clone()));
                }
            }
            Knob::Field => edits.field_v_per_nm = Some(stack.field_v_per_nm),
        }
    }
    edits
}
