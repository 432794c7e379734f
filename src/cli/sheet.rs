//! `sheet`: the growth sheet of a stack.

use super::arguments::{Format, SheetFormat};
use super::deliver::{Exit, check_output, deliver, ends_in, print, show, write};
use super::input::Input;
use super::minibands;
use super::plot::diagram;
use super::tolerance::worked_out;
use crate::diagnostics::Diagnostic;
use crate::growth;
use crate::models::Band;
use crate::optics::photoluminescence;
use crate::report::Sheet;
use crate::report::svg::{Width, sensitivity_bars, yield_histogram};
use crate::structure::{Ends, Level};
use crate::subbands::Accuracy;
use crate::tolerance;
use std::path::Path;

/// The page samples wafers of stacks up to this size: larger ones would keep the reader waiting.
const MOST_SAMPLED_LAYERS: usize = 60;

/// Photoluminescence is measured in liquid nitrogen and at room temperature, in K.
const BENCH_K: [f64; 2] = [77.0, 300.0];

pub fn sheet(
    file: &Path,
    format: Option<SheetFormat>,
    output: Option<&Path>,
) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output, file)?;
    input.with_walls("the levels of the sheet are solved");
    let plan = growth::plan(&input.structure, &input.stack);
    let (plan, growth) = match (plan, &input.structure.growth) {
        (Ok(plan), Some(growth)) => (plan, growth),
        (Err(problem), _) => {
            show(&problem, &input.name, &input.text);
            return Err(Exit::WrongInput);
        }
        // A plan is made of a `growth` block.
        (Ok(_), None) => return Err(Exit::WrongInput),
    };
    let aims = input.structure.tune.iter().flat_map(|tune| &tune.aims);
    let named: Vec<Level> = aims.flat_map(|aim| [aim.from, aim.to]).collect();
    let mut asked = Band::holding(&input.structure, &named);
    // A period repeated for ever has minibands, and no levels to list.
    let periodic = input.structure.ends == Ends::Periodic;
    if periodic {
        asked.truncate(1);
        asked[0].1 = 0;
    }
    let solution = input.solved(&asked)?;
    let bands = &solution.bands;
    let mut shown = bands.asked_for(&input.structure);
    for (band, shown) in shown.iter_mut().enumerate() {
        let own = named.iter().filter(|l| l.band == bands.band(band).name());
        let highest = own.map(|level| level.index).max().unwrap_or(0);
        *shown = (*shown).max(highest).min(bands.level_count(band));
    }
    input.doubt_all(bands, &shown);
    input.doubt_charge(solution.equilibrium.as_ref());
    let mut peaks = Vec::new();
    for temperature_k in BENCH_K.into_iter().filter(|_| !periodic) {
        let charge = &input.structure.charge;
        let accuracy = Accuracy::default();
        let peak = photoluminescence(&input.stack, charge, &asked, temperature_k, accuracy);
        peaks.extend(peak.map_err(|error| input.uncharged(&error))?);
    }
    let sheet = Sheet::new(
        &input.structure,
        growth,
        &input.stack,
        &plan,
        (bands, &shown),
        &peaks,
    );
    let page = output.is_some_and(|path| ends_in(path, "html"));
    let text = match format.unwrap_or(if page {
        SheetFormat::Html
    } else {
        SheetFormat::Table
    }) {
        SheetFormat::Html => {
            let mut pictures = Vec::new();
            if periodic {
                pictures.push((
                    "Minibands along growth and their density of states".to_owned(),
                    minibands::picture(&input)?,
                ));
            } else {
                pictures.push((
                    "Band edges and squared envelopes at their energies".to_owned(),
                    diagram(&input, &solution, &shown).svg(Width::Page),
                ));
            }
            let layers = input.stack.layers.len();
            // Tolerances are those of levels that were solved on their own.
            let toleranced = input.structure.tolerance.is_some() && !periodic;
            let names_coupled = input.structure.tolerance.iter().any(|tolerance| {
                tolerance::coupled_level(&input.structure, &tolerance.windows).is_some()
            });
            let sampled = toleranced && bands.conduction().is_some() && !names_coupled;
            if toleranced && !sampled {
                let left_out = "the page has no yield: bands are coupled, and tolerances are those of bands that are solved on their own";
                show(&Diagnostic::warning(left_out), &input.name, &input.text);
            } else if sampled && layers > MOST_SAMPLED_LAYERS {
                let left_out = format!(
                    "the yield of {layers} layers is not sampled for the page: `plot --what yield` draws it in its own time"
                );
                show(&Diagnostic::warning(left_out), &input.name, &input.text);
            } else if sampled {
                let outcome = worked_out(&input, None, None)?;
                if let Some(bars) = sensitivity_bars(&input.structure, &outcome) {
                    pictures.push((
                        "How far the transition moves".to_owned(),
                        bars.svg(Width::Page),
                    ));
                }
                if let Some(histogram) = yield_histogram(&input.structure, &outcome) {
                    pictures.push((
                        "What a run of wafers will do".to_owned(),
                        histogram.svg(Width::Page),
                    ));
                }
            }
            sheet.html(&pictures)
        }
        SheetFormat::Table => return deliver(&sheet, Format::Table, output, file),
        SheetFormat::Csv => return deliver(&sheet, Format::Csv, output, file),
        SheetFormat::Json => return deliver(&sheet, Format::Json, output, file),
    };
    match output {
        Some(path) => write(path, &text, file),
        None => print(&text),
    }
}
