//! How far each level moves per monolayer of each layer, per percent of rate and flux, and so on.

use super::followed::Followed;
use crate::structure::{Cause, Charge, Design, Stack, Structure};
use rayon::prelude::*;

/// The movement of all levels with one number of the design.
#[derive(Clone, Debug, PartialEq)]
pub struct Sensitivity {
    /// What changes: `width of well`.
    pub name: String,
    /// By how much, with its unit: `1 ML`.
    pub step: &'static str,
    pub cause: Cause,
    /// The same in the cause's unit.
    pub amount: f64,
    /// The slope of each level times the step, in eV.
    pub level_shifts_ev: Vec<f64>,
}

/// The sensitivities of a design whose levels are solved. The widths and fractions are those of the file's entries: the
/// copies of a repeat change together.
pub fn sensitivities(
    structure: &Structure,
    stack: &Stack,
    design: &Design,
    followed: &Followed,
) -> Vec<Sensitivity> {
    let mut asked: Vec<(String, &'static str, Cause, f64)> = Vec::new();
    for (entry, layer) in structure.entries.iter().enumerate() {
        let (step, amount) = match stack.entry_monolayer_nm(entry) {
            Some(monolayer_nm) => ("1 ML", monolayer_nm),
            None => ("0.1 nm", 0.1),
        };
        let name = format!("width of {}", layer.label);
        asked.push((name, step, Cause::Entry(entry), amount));
    }
    asked.push(("all growth rates".to_owned(), "1 %", Cause::Rate, 0.01));
    for element in design.elements() {
        let name = format!("{} flux", element.symbol());
        asked.push((name, "1 %", Cause::Flux(element), 0.01));
    }
    for (entry, layer) in structure.entries.iter().enumerate() {
        for cause in design.entry_fractions(entry) {
            if let Cause::Fraction { element, .. } = &cause {
                let name = format!("{} in {}", element.symbol(), layer.label);
                asked.push((name, "0.01", cause, 0.01));
            }
        }
    }
    if design.grading_nm().is_some() {
        let name = "length of interfaces".to_owned();
        asked.push((name, "0.1 nm", Cause::Grading, 0.1));
    }
    if structure.charge != Charge::Flat {
        asked.push(("doping".to_owned(), "1 %", Cause::Doping, 0.01));
    }
    asked.push(("field".to_owned(), "1 kV/cm", Cause::Field, 1e-4));
    asked.push(("temperature".to_owned(), "1 K", Cause::Temperature, 1.0));
    asked
        .into_par_iter()
        .filter_map(|(name, step, cause, amount)| {
            let slopes = followed.slopes(&structure.charge, design, &cause)?;
            Some(Sensitivity {
                name,
                step,
                amount,
                level_shifts_ev: slopes.iter().map(|slope| amount * slope).collect(),
                cause,
            })
        })
        .collect()
}
