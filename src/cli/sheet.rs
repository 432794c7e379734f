//! `sheet`: the growth sheet of a stack.

use super::arguments::{Format, SheetFormat};
use super::deliver::{Exit, check_output, deliver, print, show, write};
use super::input::Input;
use super::tolerance::worked_out;
use crate::diagnostics::Diagnostic;
use crate::growth;
use crate::models::BandOperator;
use crate::report::Sheet;
use crate::report::svg::{BandDiagram, FINENESS, Width, sensitivity_bars, yield_histogram};
use crate::subbands::{self, Accuracy};
use std::path::Path;

/// The page samples wafers of stacks up to this size: larger ones would keep the reader waiting.
const MOST_SAMPLED_LAYERS: usize = 60;

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
    let operator = BandOperator::conduction(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let aims = input.structure.tune.iter().flat_map(|tune| &tune.aims);
    let highest = aims.map(|aim| aim.from.index.max(aim.to.index)).max();
    let states = input.structure.conduction.states.max(highest.unwrap_or(0));
    let subbands = subbands::solve(&operator, states, Accuracy::default());
    input.doubt(&subbands, states);
    let sheet = Sheet::new(
        &input.structure,
        growth,
        &input.stack,
        &plan,
        &subbands,
        states,
    );
    let page = output.is_some_and(|path| {
        path.extension()
            .is_some_and(|e| e.eq_ignore_ascii_case("html"))
    });
    let text = match format.unwrap_or(if page {
        SheetFormat::Html
    } else {
        SheetFormat::Table
    }) {
        SheetFormat::Html => {
            let curves = subbands::curves(&operator, &subbands, states, FINENESS);
            let diagram =
                BandDiagram::new(&input.structure, &input.stack, &subbands, curves, states);
            let mut pictures = vec![(
                "Band edge and squared envelopes at their energies".to_owned(),
                diagram.svg(Width::Page),
            )];
            let layers = input.stack.layers.len();
            if input.structure.tolerance.is_some() && layers > MOST_SAMPLED_LAYERS {
                let left_out = format!(
                    "the yield of {layers} layers is not sampled for the page: `plot --what yield` draws it in its own time"
                );
                show(&Diagnostic::warning(left_out), &input.name, &input.text);
            } else if input.structure.tolerance.is_some() {
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
