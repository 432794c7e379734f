//! What a structure says about materials: its own ones, and changes to the library.

use super::error::MaterialError;
use super::keys::{Key, Parameter};

/// A value that a user gives for one key, in inner units.
#[derive(Clone, Debug, PartialEq)]
pub struct Setting {
    pub(super) parameter: Parameter,
    pub(super) components: [f64; 3],
}

/// The definition under one name of a structure's `materials:`.
///
/// - Under a name of its own: a material, made `like` another one or from its values alone.
/// - Under a binary (`GaAs`): values and choices change the library, also for the alloys of that binary.
/// - Under an alloy family (`InGaAs`): `bowing` and choices change its interpolation.
///
/// A gap or lattice constant that is given holds at the working temperature: it follows no temperature law. A given
/// `conduction_edge` wins over valence edge + gap; otherwise a given gap or valence edge moves the conduction edge.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Definition {
    /// The material to start from: a formula with fractions, a binary or another definition's name.
    pub(super) like: Option<String>,
    pub(super) values: Vec<Setting>,
    pub(super) bowing: Vec<Setting>,
    pub(super) choices: Vec<(&'static Key, String)>,
}

/// A definition that cannot hold, with its place.
#[derive(Clone, Debug, PartialEq)]
pub struct DefinitionProblem {
    /// The name of the definition.
    pub name: String,
    /// The place below the name, such as `["choose", "valence_edge"]`; empty for the definition itself.
    pub path: Vec<&'static str>,
    pub error: MaterialError,
}

impl Definition {
    /// A definition that starts from another material; `Definition::default()` starts from nothing, or from the library
    /// entry that it changes.
    pub fn like(material: &str) -> Self {
        Self {
            like: Some(material.to_owned()),
            ..Self::default()
        }
    }

    /// Gives a parameter a value, in the inner unit of its key (nm, eV, GPa, or a pure number).
    ///
    /// # Errors
    /// An unknown key, the wrong count of numbers, a number outside the key's range.
    pub fn set(&mut self, key: &str, numbers: &[f64]) -> Result<(), MaterialError> {
        let key = Key::find(key)?;
        let setting = Setting {
            parameter: key.parameter,
            components: key.components_of(numbers)?,
        };
        replace(&mut self.values, setting);
        Ok(())
    }

    /// Gives an alloy family the bowing C of P(x) = x P(A) + (1 − x) P(B) − x(1 − x) C, in the inner unit of the key.
    ///
    /// # Errors
    /// An unknown key, a key of several numbers, a number that is not finite or wider than the key's whole range.
    pub fn set_bowing(&mut self, key: &str, bowing: f64) -> Result<(), MaterialError> {
        let key = Key::find(key)?;
        if key.components != 1 {
            return Err(MaterialError::NoBowing { key: key.name });
        }
        let widest = key.range.1 - key.range.0;
        if !(-widest..=widest).contains(&bowing) {
            return Err(MaterialError::OutOfRange {
                key: key.name,
                number: bowing,
                unit: key.unit(),
                range: (-widest, widest),
            });
        }
        let setting = Setting {
            parameter: key.parameter,
            components: [bowing, 0.0, 0.0],
        };
        replace(&mut self.bowing, setting);
        Ok(())
    }

    /// Chooses one of the library's alternatives for a parameter (or for its bowing, in an alloy family).
    ///
    /// # Errors
    /// An unknown key; whether the alternative exists is found out by `Library::with_definitions`.
    pub fn choose(&mut self, key: &str, alternative: &str) -> Result<(), MaterialError> {
        self.choices.push((Key::find(key)?, alternative.to_owned()));
        Ok(())
    }

    /// True when the definition itself gives this parameter.
    pub(super) fn gives(&self, parameter: Parameter) -> bool {
        self.values.iter().any(|s| s.parameter == parameter)
    }
}

fn replace(settings: &mut Vec<Setting>, setting: Setting) {
    settings.retain(|s| s.parameter != setting.parameter);
    settings.push(setting);
}
