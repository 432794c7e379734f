//! Numbers that carry a derivative.

use std::ops::{Add, Div, Mul, Neg, Sub};

/// What the resolution of a material needs of a number: arithmetic, and a way in and out.
pub trait Number:
    Copy
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Div<Output = Self>
    + Neg<Output = Self>
{
    /// The number without any dependence on the variable.
    fn constant(value: f64) -> Self;
    /// The number without its derivative.
    fn value(self) -> f64;
    /// The square root; of a negative number it is no number.
    fn sqrt(self) -> Self;
}

impl Number for f64 {
    fn constant(value: f64) -> Self {
        value
    }
    fn value(self) -> f64 {
        self
    }
    fn sqrt(self) -> Self {
        f64::sqrt(self)
    }
}

/// A value with its derivative with respect to one variable.
///
/// Here the variable is the fraction of one element, the host of its sublattice compensating, so that `slope` is the
/// change of a parameter per unit of that fraction.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Dual {
    pub value: f64,
    pub slope: f64,
}

impl Number for Dual {
    fn constant(value: f64) -> Self {
        Dual { value, slope: 0.0 }
    }
    fn value(self) -> f64 {
        self.value
    }
    fn sqrt(self) -> Self {
        let root = self.value.sqrt();
        // Where the root is zero it has no slope; a number that is always zero has none either.
        let slope = if root > 0.0 {
            0.5 * self.slope / root
        } else {
            0.0
        };
        Dual { value: root, slope }
    }
}

impl Add for Dual {
    type Output = Dual;
    fn add(self, other: Dual) -> Dual {
        Dual {
            value: self.value + other.value,
            slope: self.slope + other.slope,
        }
    }
}

impl Sub for Dual {
    type Output = Dual;
    fn sub(self, other: Dual) -> Dual {
        Dual {
            value: self.value - other.value,
            slope: self.slope - other.slope,
        }
    }
}

impl Mul for Dual {
    type Output = Dual;
    fn mul(self, other: Dual) -> Dual {
        Dual {
            value: self.value * other.value,
            slope: self.slope * other.value + self.value * other.slope,
        }
    }
}

impl Div for Dual {
    type Output = Dual;
    fn div(self, other: Dual) -> Dual {
        let value = self.value / other.value;
        Dual {
            value,
            slope: (self.slope - value * other.slope) / other.value,
        }
    }
}

impl Neg for Dual {
    type Output = Dual;
    fn neg(self) -> Dual {
        Dual {
            value: -self.value,
            slope: -self.slope,
        }
    }
}
