//! What a structure file says of a sweep, checked: one number of the stack that goes through a range, and what is to be
//! shown on the way.

use super::charge::Charge;
use super::file::{Level, Structure, Varied};
use super::lay_out::no_monolayer;
use super::stack::Stack;
use crate::diagnostics::Diagnostic;
use std::ops::Range;

/// The `sweep` block.
#[derive(Clone, Debug, PartialEq)]
pub struct Sweep {
    pub vary: Swept,
    /// Where `vary` stands.
    pub span: Range<usize>,
    /// From one end of the range to the other, both included.
    pub points: usize,
    pub steps: Steps,
    /// Transitions that the file asks for; empty when it leaves the choice to the program.
    pub show: Vec<(Level, Level)>,
}

/// The number that is swept with its range, the lower end first.
#[derive(Clone, Debug, PartialEq)]
pub enum Swept {
    /// A width, a fraction or the field, as in tuning.
    Knob(Varied),
    Temperature {
        bounds_k: [f64; 2],
    },
    Doping {
        entry: usize,
        dopant: Doping,
        bounds_cm3: [f64; 2],
    },
}

/// Which doping of a layer.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Doping {
    Donors,
    Acceptors,
}

impl Doping {
    /// As files write it.
    pub fn word(self) -> &'static str {
        match self {
            Doping::Donors => "donors",
            Doping::Acceptors => "acceptors",
        }
    }
}

/// How the points of a sweep follow one another.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Steps {
    /// By equal differences.
    Even,
    /// By equal ratios.
    Logarithmic,
}

impl Stack {
    /// Sets the doping of a layer entry and so of all its copies, in cm⁻³.
    pub fn set_doping(&mut self, entry: usize, dopant: Doping, density_cm3: f64) {
        for layer in &mut self.layers {
            if layer.entry == entry {
                match dopant {
                    Doping::Donors => layer.donors_cm3 = density_cm3,
                    Doping::Acceptors => layer.acceptors_cm3 = density_cm3,
                }
            }
        }
    }
}

/// Messages about a sweep that only show once materials are resolved.
pub(super) fn unfitting(structure: &Structure, stack: &Stack, found: &mut Vec<Diagnostic>) {
    let Some(sweep) = &structure.sweep else {
        return;
    };
    match &sweep.vary {
        Swept::Knob(Varied::Width { entry, bounds }) => {
            if let Some(layer) = structure.entries.get(*entry)
                && bounds.iter().any(|b| stack.length_nm(*entry, b).is_none())
            {
                found.push(no_monolayer(layer, &sweep.span));
            }
        }
        Swept::Doping { .. } if structure.charge == Charge::Flat => found.push(
            Diagnostic::warning("the levels do not depend on doping, because the bands stay flat")
                .at(sweep.span.clone())
                .hint(if stack.sheet_doping_cm2() == [0.0; 2] {
                    "state a density in the layer too: charge bends the bands of a stack that is doped"
                } else {
                    "`charge: {fermi_level: neutral}` bends them"
                }),
        ),
        _ => {}
    }
}
