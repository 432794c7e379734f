//! `plot`: a stack's band diagram, the sensitivities of its transition, or the yield.

use super::arguments::Picture;
use super::deliver::{Exit, check_output, print, show, write};
use super::input::Input;
use super::tolerance::worked_out;
use crate::diagnostics::Diagnostic;
use crate::models::BandOperator;
use crate::report::svg::{BandDiagram, FINENESS, Width, sensitivity_bars, yield_histogram};
use crate::subbands::{self, Accuracy};
use std::path::Path;

/// As few wafers as may be sampled.
const LEAST_SAMPLES: u32 = 2;

pub fn plot(file: &Path, what: Picture, width: Width, output: Option<&Path>) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output, file)?;
    input.with_walls("the picture shows levels");
    input.without_holes("the picture shows");
    let picture = match what {
        Picture::Bands => Some(bands(&input, width)?),
        Picture::Sensitivities => {
            // The bars show nothing of the samples.
            let outcome = worked_out(&input, Some(LEAST_SAMPLES), None)?;
            sensitivity_bars(&input.structure, &outcome).map(|bars| bars.svg(width))
        }
        Picture::Yield => {
            let outcome = worked_out(&input, None, None)?;
            yield_histogram(&input.structure, &outcome).map(|histogram| histogram.svg(width))
        }
    };
    let Some(picture) = picture else {
        let why = if input.structure.tolerance.is_none() {
            "the file has no `tolerance` block"
        } else {
            "no transition of the file varies"
        };
        let nothing = Diagnostic::error(format!("there is nothing to draw: {why}"))
            .expected("a `tolerance` block with spreads, and two levels");
        show(&nothing, &input.name, &input.text);
        return Err(Exit::WrongInput);
    };
    match output {
        Some(path) => write(path, &picture, file),
        None => print(&picture),
    }
}

fn bands(input: &Input, width: Width) -> Result<String, Exit> {
    let operator = BandOperator::conduction(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let states = input.structure.conduction.states;
    let subbands = subbands::solve(&operator, states, Accuracy::default());
    input.doubt(&subbands, states);
    let curves = subbands::curves(&operator, &subbands, states, FINENESS);
    let diagram = BandDiagram::new(&input.structure, &input.stack, &subbands, curves, states);
    Ok(diagram.svg(width))
}
