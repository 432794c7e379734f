//! The same wafer at another temperature.

use super::stack::Stack;
use crate::materials::MaterialError;

impl Stack {
    /// The stack at another temperature in K; compositions and widths in nm stay.
    ///
    /// # Errors
    /// A temperature that is negative or no number.
    pub fn at_temperature(&self, temperature_k: f64) -> Result<Stack, MaterialError> {
        let mut other = self.clone();
        other.temperature_k = temperature_k;
        if let Some(substrate) = &self.substrate {
            let material = self.library.material(substrate, temperature_k)?;
            other.substrate_nm = material.lattice_constant_nm;
        }
        for (place, content) in self.contents.iter().enumerate() {
            let face = |old: &super::stack::Face| other.face(old.substance.clone());
            let (lower, upper) = (
                face(&content.lower)?,
                content.upper.as_ref().map(face).transpose()?,
            );
            let mut changed = other.content(lower, upper, content.profile);
            changed.interface = content.interface;
            other.contents[place] = changed;
        }
        Ok(other)
    }
}
