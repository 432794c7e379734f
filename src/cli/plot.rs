//! `plot`: a stack's band diagram, the sensitivities of its transition, or the yield.

use super::arguments::Picture;
use super::deliver::{Exit, check_output, print, show, write};
use super::input::Input;
use super::tolerance::worked_out;
use crate::charge::Solution;
use crate::diagnostics::Diagnostic;
use crate::models::{Band, BandOperator};
use crate::report::svg::{BandDiagram, FINENESS, Width, sensitivity_bars, yield_histogram};
use crate::subbands::{self, Solution as Solved, coupled_curves};
use std::path::Path;

/// As few wafers as may be sampled.
const LEAST_SAMPLES: u32 = 2;

pub fn plot(file: &Path, what: Picture, width: Width, output: Option<&Path>) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output, file)?;
    input.without_minibands("`plot`")?;
    input.with_walls("the picture shows levels");
    if what != Picture::Bands {
        input.without_coupled("tolerances are those of")?;
    }
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
    let solution = input.solved(&Band::of(&input.structure))?;
    let shown = solution.bands.asked_for(&input.structure);
    input.doubt_all(&solution.bands, &shown);
    input.doubt_charge(solution.equilibrium.as_ref());
    Ok(diagram(input, &solution, &shown).svg(width))
}

/// The band diagram of solved bands.
pub fn diagram(input: &Input, solution: &Solution, shown: &[usize]) -> BandDiagram {
    let Solution { stack, bands, .. } = solution;
    let curves = (0..bands.count()).filter_map(|band| match bands.solution(band) {
        Solved::Alone(solved) => {
            // What was solved has its operator.
            let operator = BandOperator::new(stack, solved.band).ok()?;
            Some(subbands::curves(&operator, solved, shown[band], FINENESS))
        }
        Solved::Coupled(coupled, side) => {
            Some(coupled_curves(coupled, side, shown[band], FINENESS))
        }
    });
    let curves = curves.collect();
    BandDiagram::new(&input.structure, stack, bands, curves, shown)
        .with_fermi_level(solution.equilibrium.as_ref().map(|found| found.fermi_ev))
}
