//! `materials`: the library, or one material.

use super::arguments::Output;
use super::deliver::{Exit, complain, deliver};
use crate::report::{MaterialList, MaterialSheet};
use crate::units::{self, Dimension};
use std::path::Path;

pub fn materials(formula: Option<&str>, temperature: &str, output: &Output) -> Result<Exit, Exit> {
    let nowhere = Path::new("");
    let temperature_k = match units::parse(temperature, &[Dimension::Temperature]) {
        Ok(quantity) if (0.0..=1000.0).contains(&quantity.value()) => quantity.value(),
        Ok(_) => {
            complain(&format!(
                "error: --temperature {temperature}: expected a temperature from 0 K to 1000 K"
            ));
            return Err(Exit::WrongInput);
        }
        Err(error) => {
            complain(&format!(
                "error: --temperature: {error}; expected {}, such as \"77 K\"",
                Dimension::Temperature.noun()
            ));
            return Err(Exit::WrongInput);
        }
    };
    let Some(formula) = formula else {
        let list = MaterialList::new().map_err(|error| {
            complain(&format!("error: {error}"));
            Exit::NotPossible
        })?;
        return deliver(&list, output.format, output.output.as_deref(), nowhere);
    };
    match MaterialSheet::new(formula, temperature_k) {
        Ok(sheet) => deliver(&sheet, output.format, output.output.as_deref(), nowhere),
        Err(error) => {
            complain(&format!("error: {error}"));
            if let Some(hint) = error.hint() {
                complain(&format!("help: {hint}"));
            }
            Err(Exit::WrongInput)
        }
    }
}
