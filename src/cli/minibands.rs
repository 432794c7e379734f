//! `levels` and `dispersion` of a stack that repeats itself for ever.

use super::arguments::Output;
use super::deliver::{Exit, deliver, show, write};
use super::input::Input;
use crate::diagnostics::Diagnostic;
use crate::models::{Band, BandOperator};
use crate::report::svg::Width;
use crate::report::{MinibandLevels, Minizone};
use crate::structure::{Ends, Stack};
use crate::subbands::Accuracy;
use crate::superlattice::{Minibands, minibands};
use std::path::Path;

/// Refuses a command that knows bound levels only.
pub fn refuse_periodic(input: &Input, what: &str) -> Result<(), Exit> {
    if input.structure.ends != Ends::Periodic {
        return Ok(());
    }
    let problem = Diagnostic::error(format!("{what} does not know minibands"))
        .expected("`ends: walls`")
        .hint("`levels` and `dispersion` solve a stack with `ends: periodic`");
    show(&problem, &input.name, &input.text);
    Err(Exit::WrongInput)
}

pub fn levels(input: &Input, output: &Output, file: &Path) -> Result<Exit, Exit> {
    let (period, bands) = solved(input)?;
    input.doubt_growth();
    deliver(
        &MinibandLevels::new(&input.structure, &period, &bands),
        output.format,
        output.output.as_deref(),
        file,
    )
}

pub fn dispersion(input: &Input, points: u16, output: &Output, file: &Path) -> Result<Exit, Exit> {
    let (period, bands) = solved(input)?;
    let report = Minizone::new(&input.structure, &period, &bands, usize::from(points));
    match output.output.as_deref() {
        Some(path)
            if path
                .extension()
                .is_some_and(|e| e.eq_ignore_ascii_case("svg")) =>
        {
            write(path, &report.svg(Width::Page), file)
        }
        path => deliver(&report, output.format, path, file),
    }
}

/// The minizone for the page of a sheet.
pub fn picture(input: &Input) -> Result<String, Exit> {
    /// Wave vectors that a curve is drawn through.
    const POINTS: usize = 81;
    let (period, bands) = solved(input)?;
    Ok(Minizone::new(&input.structure, &period, &bands, POINTS).svg(Width::Page))
}

fn solved(input: &Input) -> Result<(Stack, Vec<Minibands>), Exit> {
    let period = input.structure.period(&input.stack);
    let mut solved = Vec::new();
    for (band, count) in Band::of(&input.structure) {
        let operator = BandOperator::new(&period, band)
            .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
        let found = minibands(&operator, count, Accuracy::default());
        for fault in found.audit.faults() {
            show(
                &Diagnostic::warning(format!("audit: {fault}")),
                &input.name,
                &input.text,
            );
        }
        solved.push(found);
    }
    Ok((period, solved))
}
