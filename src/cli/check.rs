//! `check`: read a file without solving it.

use super::deliver::{Exit, print};
use super::input::Input;
use crate::models::{Band, BandOperator};
use std::path::Path;

pub fn check(file: &Path) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    for (band, _) in Band::of(&input.structure) {
        BandOperator::new(&input.stack, band)
            .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    }
    let (layers, width) = (input.stack.layers.len(), input.stack.total_width_nm());
    let tuning = if input.structure.tune.is_some() {
        ", with a tune block"
    } else {
        ""
    };
    print(&format!(
        "{}: {layers} layers, {width:.2} nm{tuning}; no mistakes\n",
        input.name
    ))
}
