//! One number of a stack that tuning and tolerance vary.

use super::Stack;
use crate::materials::Element;

/// What is varied. An entry is a layer as the file writes it: all copies of a repeat vary together.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Knob {
    /// Width in nm.
    Width { entry: usize },
    /// Fraction of an element in the entry's `material`; the host of that sublattice compensates.
    Fraction { entry: usize, element: Element },
    /// Field in V/nm.
    Field,
}

impl Knob {
    /// The number as it stands in a stack; `None` when the stack has no such entry or element.
    pub fn value(self, stack: &Stack) -> Option<f64> {
        match self {
            Knob::Width { entry } => stack.entry_width_nm(entry),
            Knob::Fraction { entry, element } => {
                stack.composition(entry).map(|c| c.fraction(element))
            }
            Knob::Field => Some(stack.field_v_per_nm),
        }
    }

    /// Sets the number.
    pub fn set(self, stack: &mut Stack, value: f64) {
        match self {
            Knob::Width { entry } => stack.set_width(entry, value),
            Knob::Fraction { entry, element } => {
                // Refused only outside what the sublattice can hold; the stack then stays as it is.
                let _ = stack.set_fraction(entry, element, value);
            }
            Knob::Field => stack.field_v_per_nm = value,
        }
    }
}

impl Stack {
    /// Width of a layer entry in nm.
    pub fn entry_width_nm(&self, entry: usize) -> Option<f64> {
        self.layers
            .iter()
            .find(|layer| layer.entry == entry)
            .map(|layer| layer.width_nm)
    }

    /// Height of a monolayer of a layer entry in nm, on the substrate if there is one.
    pub fn entry_monolayer_nm(&self, entry: usize) -> Option<f64> {
        self.monolayer_nm(self.layers.iter().position(|layer| layer.entry == entry)?)
    }
}
