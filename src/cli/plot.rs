//! `plot`: the band diagram of a stack.

use super::deliver::{Exit, check_output, print, write};
use super::input::Input;
use crate::models::BandOperator;
use crate::report::svg::{BandDiagram, FINENESS, Width};
use crate::subbands::{self, Accuracy};
use std::path::Path;

pub fn plot(file: &Path, width: Width, output: Option<&Path>) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output, file)?;
    input.without_holes("the picture shows");
    let operator = BandOperator::conduction(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let states = input.structure.conduction.states;
    let subbands = subbands::solve(&operator, states, Accuracy::default());
    input.doubt(&subbands, states);
    let curves = subbands::curves(&operator, &subbands, states, FINENESS);
    let diagram = BandDiagram::new(&input.structure, &input.stack, &subbands, curves, states);
    let picture = diagram.svg(width);
    match output {
        Some(path) => write(path, &picture, file),
        None => print(&picture),
    }
}
