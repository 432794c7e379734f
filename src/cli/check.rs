//! `check`: read a file without solving it.

use super::arguments::Output;
use super::deliver::{Exit, check_output, deliver};
use super::input::Input;
use crate::models::Band;
use crate::report::Check;
use std::path::Path;

pub fn check(file: &Path, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    for (band, _) in Band::of(&input.structure) {
        band.check(&input.stack)
            .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    }
    input.doubt_growth();
    deliver(
        &Check::new(&input.name, &input.structure, &input.stack),
        output.format,
        output.output.as_deref(),
        file,
    )
}
