//! The swept number: its values, and the stack at each of them.

use super::NotSolved;
use crate::structure::{Doping, Knob, MAX_TOTAL_NM, Stack, Steps, Structure, Sweep, Swept, Varied};
use crate::units::{Dimension, Quantity};

/// What is swept, from where to where, in the unit in which it is shown.
#[derive(Clone, Debug, PartialEq)]
pub struct Axis {
    /// `width of well`.
    pub name: String,
    /// Empty for a fraction.
    pub unit: &'static str,
    /// Name and unit as a column of numbers is called: `width_nm`.
    pub column: &'static str,
    pub low: f64,
    pub high: f64,
    pub steps: Steps,
    turned: Turned,
    /// Inner units per shown unit.
    factor: f64,
}

#[derive(Clone, Copy, Debug, PartialEq)]
enum Turned {
    Knob(Knob),
    Temperature,
    Doping { entry: usize, dopant: Doping },
}

impl Axis {
    /// `None` for what the reader refuses: a width in monolayers of unknown height, fractions of cells.
    pub fn new(structure: &Structure, stack: &Stack, sweep: &Sweep) -> Option<Axis> {
        let label = |entry: usize| structure.entries.get(entry).map_or("layer", |e| &e.label);
        let axis = |name, unit, column, [low, high]: [f64; 2], turned, factor| Axis {
            name,
            unit,
            column,
            low,
            high,
            steps: sweep.steps,
            turned,
            factor,
        };
        Some(match &sweep.vary {
            Swept::Knob(Varied::Width { entry, bounds }) => {
                let [low, high] = bounds;
                let turned = Turned::Knob(Knob::Width { entry: *entry });
                let name = format!("width of {}", label(*entry));
                let number = |bound: &Quantity| bound.number;
                let nm = |bound: &Quantity| bound.value();
                match low.unit.dimension {
                    Dimension::Monolayers => {
                        let factor = stack.entry_monolayer_nm(*entry)?;
                        let range = [number(low), number(high)];
                        axis(name, "ML", "width_ML", range, turned, factor)
                    }
                    _ => axis(name, "nm", "width_nm", [nm(low), nm(high)], turned, 1.0),
                }
            }
            Swept::Knob(Varied::Fraction {
                entry,
                element,
                bounds,
            }) => {
                let knob = Knob::Fraction {
                    entry: *entry,
                    element: *element,
                };
                let name = format!("fraction of {} in {}", element.symbol(), label(*entry));
                axis(name, "", "fraction", *bounds, Turned::Knob(knob), 1.0)
            }
            Swept::Knob(Varied::FractionOfCells { .. }) => return None,
            Swept::Knob(Varied::Field { bounds_v_per_nm }) => {
                let range = bounds_v_per_nm.map(|v_per_nm| 1e4 * v_per_nm);
                let turned = Turned::Knob(Knob::Field);
                axis(
                    "field".to_owned(),
                    "kV/cm",
                    "field_kV_cm",
                    range,
                    turned,
                    1e-4,
                )
            }
            Swept::Temperature { bounds_k } => {
                let name = "temperature".to_owned();
                axis(
                    name,
                    "K",
                    "temperature_K",
                    *bounds_k,
                    Turned::Temperature,
                    1.0,
                )
            }
            Swept::Doping {
                entry,
                dopant,
                bounds_cm3,
            } => {
                let (entry, dopant) = (*entry, *dopant);
                let column = match dopant {
                    Doping::Donors => "donors_cm3",
                    Doping::Acceptors => "acceptors_cm3",
                };
                let name = format!("{} of {}", dopant.word(), label(entry));
                let turned = Turned::Doping { entry, dopant };
                axis(name, "cm^-3", column, *bounds_cm3, turned, 1.0)
            }
        })
    }

    /// The value at a part of the way, from 0 at the lower to 1 at the upper end. The ends are met exactly.
    pub fn value(&self, part: f64) -> f64 {
        let (low, high) = (self.low, self.high);
        if part >= 1.0 {
            return high;
        }
        if part <= 0.0 {
            return low;
        }
        match self.steps {
            Steps::Even => low + part * (high - low),
            Steps::Logarithmic => low * (high / low).powf(part),
        }
    }

    /// The stack at a value. Compositions and the other widths in nm stay as they are.
    ///
    /// # Errors
    /// A composition or a temperature that the library refuses, or layers that are too thick together.
    pub fn stack(&self, base: &Stack, value: f64) -> Result<Stack, NotSolved> {
        let inner = self.factor * value;
        if self.turned == Turned::Temperature {
            return Ok(base.at_temperature(inner)?);
        }
        let mut stack = base.clone();
        match self.turned {
            Turned::Knob(Knob::Fraction { entry, element }) => {
                stack.set_fraction(entry, element, inner)?;
            }
            Turned::Knob(knob) => knob.set(&mut stack, inner),
            Turned::Doping { entry, dopant } => stack.set_doping(entry, dopant, inner),
            Turned::Temperature => {}
        }
        // The reader holds the file's own stack to the same.
        if stack.total_width_nm() > MAX_TOTAL_NM * (1.0 + 1e-9) {
            return Err(NotSolved::TooThick);
        }
        Ok(stack)
    }
}
