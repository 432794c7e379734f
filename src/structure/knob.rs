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
            Knob::Width { entry } => stack.width_nm(entry),
            Knob::Fraction { entry, element } => stack.fraction(entry, element),
            Knob::Field => Some(stack.field_v_per_nm),
        }
    }

    /// Sets the number.
    pub fn set(self, stack: &mut Stack, value: f64) {
        match self {
            Knob::Width { entry } => stack.set_width(entry, value),
            Knob::Fraction { entry, element } => stack.set_fraction(entry, element, value),
            Knob::Field => stack.field_v_per_nm = value,
        }
    }
}
