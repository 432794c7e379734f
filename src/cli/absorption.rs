//! `absorption`: the spectrum from one level into all others and the continuum.

use super::arguments::Output;
use super::deliver::{Exit, check_output, complain, deliver_or_draw, show};
use super::input::Input;
use super::transmission::energy;
use crate::diagnostics::Diagnostic;
use crate::models::BandOperator;
use crate::open_ends::{self, edges_ev};
use crate::report::Absorption;
use crate::report::svg::Width;
use std::path::Path;

/// The spectrum begins at a photon energy where no detector works any more.
const LOWEST_EV: f64 = 0.01;
/// It ends at this multiple of the height of the highest edge above the lowest.
const BEYOND_EDGES: f64 = 1.5;
/// A broadening wider than this is none of a well.
const WIDEST_EV: f64 = 0.2;

/// What the user may set.
pub struct Range<'a> {
    pub level: u8,
    pub broadening: &'a str,
    pub from: Option<&'a str>,
    pub to: Option<&'a str>,
    pub points: u16,
}

pub fn absorption(file: &Path, range: &Range, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    input.without_minibands("`absorption`")?;
    input.conduction_only("the spectrum is that of")?;
    input.with_flat_bands("the spectrum is that of");
    let operator = BandOperator::conduction(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let [floor_ev, ceiling_ev] = edges_ev(&operator);
    let broadening_ev = energy("--broadening", Some(range.broadening))?.unwrap_or_default();
    if broadening_ev > WIDEST_EV {
        complain(&format!(
            "error: --broadening {}: expected a full width up to {WIDEST_EV} eV",
            range.broadening
        ));
        return Err(Exit::WrongInput);
    }
    let low_ev = energy("--from", range.from)?.unwrap_or(LOWEST_EV);
    let high_ev = energy("--to", range.to)?
        .unwrap_or_else(|| (BEYOND_EDGES * (ceiling_ev - floor_ev)).max(3.0 * low_ev));
    if low_ev <= 0.0 || high_ev <= low_ev {
        complain("error: expected photon energies with --from above 0 and --to above --from");
        return Err(Exit::WrongInput);
    }
    let last = f64::from(range.points - 1);
    let energies_ev: Vec<f64> = (0..range.points)
        .map(|k| low_ev + (high_ev - low_ev) * f64::from(k) / last)
        .collect();
    let level = usize::from(range.level);
    let solved =
        open_ends::absorption(&operator, level, &energies_ev, broadening_ev).map_err(|reason| {
            show(
                &Diagnostic::error(reason.to_string()),
                &input.name,
                &input.text,
            );
            Exit::NotPossible
        })?;
    let report = Absorption::new(
        &input.structure,
        &input.stack,
        level,
        broadening_ev,
        &solved,
    );
    for fault in report.faults() {
        let words = format!("audit: {fault}");
        show(&Diagnostic::warning(words), &input.name, &input.text);
    }
    deliver_or_draw(&report, || report.svg(Width::Page), output, file)
}
