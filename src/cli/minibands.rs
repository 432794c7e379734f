//! `levels` and `dispersion` of a stack that repeats itself for ever.

use super::arguments::Output;
use super::deliver::{Exit, deliver, deliver_or_draw, show};
use super::input::Input;
use crate::diagnostics::Diagnostic;
use crate::models::{Band, BandOperator};
use crate::report::svg::Width;
use crate::report::{MinibandLevels, Minizone};
use crate::structure::Stack;
use crate::subbands::Accuracy;
use crate::superlattice::{Minibands, minibands};
use std::path::Path;

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
    deliver_or_draw(&report, || report.svg(Width::Page), output, file)
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
