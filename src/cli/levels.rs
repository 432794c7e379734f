//! `levels`: solve a stack.

use super::arguments::Output;
use super::cascade;
use super::deliver::{Exit, check_output, deliver};
use super::input::Input;
use super::minibands;
use crate::models::Band;
use crate::report::{ChargeReport, Levels};
use crate::structure::Ends;
use std::path::Path;

pub fn levels(file: &Path, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    if input.structure.ends == Ends::Periodic {
        return minibands::levels(&input, output, file);
    }
    let solution = input.solved(&Band::of(&input.structure))?;
    let shown = solution.bands.asked_for(&input.structure);
    input.doubt_all(&solution.bands, &shown);
    let exit = input.doubt_charge(solution.equilibrium.as_ref());
    input.doubt_growth();
    cascade::hint(&input);
    let levels = Levels::new(&input.structure, &solution.stack, &solution.bands, &shown);
    deliver(
        &levels.with_charge(ChargeReport::new(
            &solution,
            &shown,
            &input.structure.charge,
        )),
        output.format,
        output.output.as_deref(),
        file,
    )?;
    Ok(exit)
}
