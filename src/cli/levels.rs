//! `levels`: solve a stack.

use super::arguments::Output;
use super::deliver::{Exit, check_output, deliver};
use super::input::Input;
use crate::models::BandOperator;
use crate::report::Levels;
use crate::subbands::{self, Accuracy};
use std::path::Path;

pub fn levels(file: &Path, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    let operator = BandOperator::conduction(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let states = input.structure.conduction.states;
    let subbands = subbands::solve(&operator, states, Accuracy::default());
    input.doubt(&subbands, states);
    deliver(
        &Levels::new(&input.structure, &input.stack, &subbands, states),
        output.format,
        output.output.as_deref(),
        file,
    )
}
