//! `transmission`: the part of an electron stream that crosses a stack.

use super::arguments::Output;
use super::deliver::{Exit, check_output, complain, deliver, show, write};
use super::input::Input;
use crate::diagnostics::Diagnostic;
use crate::models::BandOperator;
use crate::open_ends::{self, edges_ev, leads_ev};
use crate::report::Transmission;
use crate::report::svg::Width;
use crate::units::{self, Dimension};
use std::path::Path;

/// The curve ends this far above the highest edge.
const ABOVE_EDGES_EV: f64 = 0.1;
/// No one-band model holds further above the edge.
const HIGHEST_EV: f64 = 10.0;

pub fn transmission(
    file: &Path,
    (from, to, points): (Option<&str>, Option<&str>, u16),
    output: &Output,
) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    input.conduction_only("electrons cross in")?;
    input.flat_only("electrons cross");
    let operator = BandOperator::conduction(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let [floor_ev, ceiling_ev] = edges_ev(&operator);
    let [lower, upper] = leads_ev(&operator);
    let open_ev = lower.max(upper);
    let low_ev = energy("--from", from)?.map_or(open_ev, |ev| floor_ev + ev);
    let high_ev = energy("--to", to)?.map_or(ceiling_ev + ABOVE_EDGES_EV, |ev| floor_ev + ev);
    if high_ev <= low_ev {
        complain(&format!(
            "error: the energies run from {:.1} to {:.1} meV: expected --to above --from",
            1e3 * (low_ev - floor_ev),
            1e3 * (high_ev - floor_ev)
        ));
        return Err(Exit::WrongInput);
    }
    if high_ev <= open_ev {
        complain(&format!(
            "error: no electrons cross below {:.1} meV, the edge of the higher lead: expected --to above it",
            1e3 * (open_ev - floor_ev)
        ));
        return Err(Exit::WrongInput);
    }
    let count = usize::from(points);
    let solved = open_ends::transmission(&operator, [low_ev, high_ev], count);
    let report = Transmission::new(&input.structure, &input.stack, floor_ev, &solved, count);
    for fault in report.faults() {
        let words = format!("audit: {fault}");
        show(&Diagnostic::warning(words), &input.name, &input.text);
    }
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

/// An energy given on the command line, in eV.
pub fn energy(option: &str, text: Option<&str>) -> Result<Option<f64>, Exit> {
    let Some(text) = text else { return Ok(None) };
    match units::parse(text, &[Dimension::Energy]) {
        Ok(quantity) if (0.0..=HIGHEST_EV).contains(&quantity.value()) => {
            Ok(Some(quantity.value()))
        }
        Ok(_) => {
            complain(&format!(
                "error: {option} {text}: expected an energy from 0 to {HIGHEST_EV} eV"
            ));
            Err(Exit::WrongInput)
        }
        Err(error) => {
            complain(&format!(
                "error: {option}: {error}; expected one such as \"150 meV\""
            ));
            Err(Exit::WrongInput)
        }
    }
}
