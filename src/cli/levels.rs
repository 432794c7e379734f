//! `levels`: solve a stack.

use super::arguments::Output;
use super::cascade;
use super::deliver::{Exit, check_output, deliver};
use super::input::Input;
use super::minibands;
use crate::models::Band;
use crate::report::Levels;
use crate::structure::Ends;
use crate::subbands::{Accuracy, Bands};
use std::path::Path;

pub fn levels(file: &Path, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    if input.structure.ends == Ends::Periodic {
        return minibands::levels(&input, output, file);
    }
    let bands = Bands::solve(
        &input.stack,
        &Band::of(&input.structure),
        Accuracy::default(),
    )
    .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let shown = bands.asked_for(&input.structure);
    input.doubt_all(&bands, &shown);
    input.doubt_growth();
    cascade::hint(&input);
    deliver(
        &Levels::new(&input.structure, &input.stack, &bands, &shown),
        output.format,
        output.output.as_deref(),
        file,
    )
}
