//! The library together with a structure's own definitions.

use super::composition::Composition;
use super::data::{self, BINARIES, BinaryData, Bowing, Entry, Known, TERNARIES, TernaryData};
use super::definition::{Definition, DefinitionProblem};
use super::dual::{Dual, Number};
use super::element::{Element, Sublattice};
use super::error::MaterialError;
use super::formula::{Family, Formula, recased};
use super::interpolation;
use super::keys::{Key, Parameter};
use super::material::Material;
use super::values::Values;
use crate::diagnostics::probably_meant;

/// The temperature at which compositions are matched, in K: wafers are compared and measured at room temperature.
const MATCH_TEMPERATURE_K: f64 = 300.0;

/// The source of what a structure gives.
pub(super) const STRUCTURE_FILE: &str = "structure file";

/// All materials that a structure may name.
#[derive(Clone, Debug, Default)]
pub struct Library {
    /// Binaries with choices of the structure, by index.
    pub(super) binaries: Vec<(usize, BinaryData)>,
    /// Ternaries with choices and bowings of the structure, by index.
    pub(super) ternaries: Vec<(usize, TernaryData)>,
    /// Definitions that put values over something: materials under names of their own, and binaries.
    pub(super) named: Vec<(String, Definition)>,
}

/// What the name of a material means.
#[derive(Clone, Debug, PartialEq)]
pub enum Substance {
    /// A material that the structure defines under a name of its own.
    Named(String),
    /// A binary or an alloy with all its fractions.
    Alloy(Composition),
    /// An alloy whose composition is left to a lattice match, see [`Library::match_to`].
    Family(Family),
}

/// Whose parameters a definition's name changes.
enum Target {
    Binary(usize),
    Ternary(usize),
    Named,
}

impl std::fmt::Display for Substance {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Substance::Named(name) => f.write_str(name),
            Substance::Alloy(composition) => f.write_str(&composition.formula()),
            Substance::Family(family) => f.write_str(&family.formula()),
        }
    }
}

impl Library {
    /// The library as published.
    pub fn new() -> Self {
        Self::default()
    }

    /// The library with a structure's definitions.
    ///
    /// # Errors
    /// Every definition that cannot hold, in the order of the definitions.
    pub fn with_definitions(
        definitions: &[(String, Definition)],
    ) -> Result<Library, Vec<DefinitionProblem>> {
        let mut library = Library::new();
        let mut problems = Vec::new();
        for (name, definition) in definitions {
            let mut report = |path: &[&'static str], error| {
                problems.push(DefinitionProblem {
                    name: name.clone(),
                    path: path.to_vec(),
                    error,
                });
            };
            match target(name) {
                Ok(target) => library.add(name, definition, target, &mut report),
                Err(error) => report(&[], error),
            }
        }
        // `like` may look ahead, so that it is followed only now.
        for (name, definition) in &library.named {
            if let Some(like) = &definition.like
                && let Err(error) = library.chain(name, like)
            {
                problems.push(DefinitionProblem {
                    name: name.clone(),
                    path: vec!["like"],
                    error,
                });
            }
        }
        if problems.is_empty() {
            Ok(library)
        } else {
            Err(problems)
        }
    }

    fn add(
        &mut self,
        name: &str,
        definition: &Definition,
        target: Target,
        report: &mut impl FnMut(&[&'static str], MaterialError),
    ) {
        let is_entry = !matches!(target, Target::Named);
        if is_entry && definition.like.is_some() {
            let name = name.to_owned();
            report(&["like"], MaterialError::LikeOnEntry { name });
        }
        let only_on_entry = |part| MaterialError::OnlyOnEntry {
            name: name.to_owned(),
            part,
        };
        if !matches!(target, Target::Ternary(_)) && !definition.bowing.is_empty() {
            report(&["bowing"], only_on_entry("`bowing`"));
        }
        match target {
            Target::Named => {
                if !definition.choices.is_empty() {
                    report(&["choose"], only_on_entry("`choose`"));
                }
                self.named.push((name.to_owned(), definition.clone()));
            }
            Target::Binary(index) => match self.binary(index).cloned() {
                Ok(mut data) => {
                    choose(name, &mut data.entries, definition, report);
                    for setting in &definition.values {
                        data.given.retain(|s| s.parameter != setting.parameter);
                        data.given.push(setting.clone());
                    }
                    self.binaries.retain(|(i, _)| *i != index);
                    self.binaries.push((index, data));
                }
                Err(error) => report(&[], error),
            },
            Target::Ternary(index) => {
                if let Some(setting) = definition.values.first() {
                    let name = name.to_owned();
                    report(
                        &[setting.parameter.key().name],
                        MaterialError::ValuesOnFamily { name },
                    );
                }
                match self.ternary_at(index).cloned() {
                    Ok(mut data) => {
                        choose(name, &mut data.entries, definition, report);
                        for setting in &definition.bowing {
                            data.entries.retain(|e| e.parameter != setting.parameter);
                            data.entries.push(Entry {
                                parameter: setting.parameter,
                                value: Bowing::Polynomial {
                                    value: setting.components[0],
                                    slope: 0.0,
                                },
                                source: STRUCTURE_FILE.to_owned(),
                                known: Known::Given,
                                note: None,
                                alternatives: Vec::new(),
                            });
                        }
                        self.ternaries.retain(|(i, _)| *i != index);
                        self.ternaries.push((index, data));
                    }
                    Err(error) => report(&[], error),
                }
            }
        }
    }

    /// Follows `like` to its end.
    fn chain(&self, name: &str, like: &str) -> Result<(), MaterialError> {
        let mut chain = vec![name.to_owned()];
        let mut next = Some(like);
        while let Some(like) = next {
            let circular = chain.iter().any(|earlier| earlier == like);
            chain.push(like.to_owned());
            if circular {
                return Err(MaterialError::Circular {
                    name: name.to_owned(),
                    chain,
                });
            }
            next = match self.find(like)? {
                Substance::Named(name) => self.definition(&name).and_then(|d| d.like.as_deref()),
                Substance::Alloy(_) => None,
                Substance::Family(family) => return Err(family.needs_match()),
            };
        }
        Ok(())
    }

    pub(super) fn definition(&self, name: &str) -> Option<&Definition> {
        let found = self.named.iter().find(|(n, _)| n == name);
        found.map(|(_, definition)| definition)
    }

    pub(super) fn binary(&self, index: usize) -> Result<&BinaryData, MaterialError> {
        match self.binaries.iter().find(|(i, _)| *i == index) {
            Some((_, data)) => Ok(data),
            None => data::binary(index),
        }
    }

    pub(super) fn ternary_at(&self, index: usize) -> Result<&TernaryData, MaterialError> {
        match self.ternaries.iter().find(|(i, _)| *i == index) {
            Some((_, data)) => Ok(data),
            None => data::ternary(index),
        }
    }

    /// The ternary between two binaries that share an element.
    pub(super) fn ternary(&self, a: usize, b: usize) -> Result<&TernaryData, MaterialError> {
        self.ternary_at(data::ternary_between(a, b)?)
    }

    /// What a material's name means: a definition's name first, then a formula.
    ///
    /// # Errors
    /// What is wrong with the formula, or the name that was probably meant.
    pub fn find(&self, text: &str) -> Result<Substance, MaterialError> {
        let text = text.trim();
        if self.definition(text).is_some() {
            return Ok(Substance::Named(text.to_owned()));
        }
        match Formula::parse(text) {
            Ok(Formula::Complete(composition)) => Ok(Substance::Alloy(composition)),
            Ok(Formula::Open(family)) => Ok(Substance::Family(family)),
            Err(error) => Err(self.probably_meant(text, error)),
        }
    }

    /// Turns the error about a text that is no formula into one about an unknown name, when a name was probably meant.
    fn probably_meant(&self, text: &str, error: MaterialError) -> MaterialError {
        if !matches!(
            error,
            MaterialError::UnknownElement { .. } | MaterialError::Malformed { .. }
        ) || recased(text).is_some()
        {
            return error;
        }
        let unknown = |meant: Option<&str>| MaterialError::UnknownMaterial {
            text: text.to_owned(),
            meant: meant.map(str::to_owned),
        };
        let named = self.named.iter().map(|(name, _)| name.as_str());
        if let Some(meant) = probably_meant(text, named) {
            return unknown(Some(meant));
        }
        let starts_with_an_element = Element::ALL.iter().any(|e| text.starts_with(e.symbol()));
        if starts_with_an_element && text.contains(|c: char| c.is_ascii_digit()) {
            return error;
        }
        let entries = BINARIES
            .iter()
            .chain(TERNARIES.iter())
            .map(|(name, _)| *name);
        match probably_meant(text, entries) {
            None if starts_with_an_element => error,
            meant => unknown(meant),
        }
    }

    /// Resolves a composition at a temperature in K. From [`Composition::along`] every parameter comes with its
    /// derivative with respect to one element's fraction.
    ///
    /// # Errors
    /// A temperature that is negative or no number.
    pub fn resolve<T: Number>(
        &self,
        composition: &Composition<T>,
        temperature_k: f64,
    ) -> Result<Material<T>, MaterialError> {
        check_temperature(temperature_k)?;
        let values = interpolation::resolve(self, composition, temperature_k)?;
        Ok(Material::from_values(&values))
    }

    /// Resolves any substance at a temperature in K.
    ///
    /// # Errors
    /// A family, which has no composition yet; a temperature that is negative or no number.
    pub fn material(
        &self,
        substance: &Substance,
        temperature_k: f64,
    ) -> Result<Material, MaterialError> {
        let values = self.values(substance, temperature_k)?;
        Ok(Material::from_values(&values))
    }

    pub(super) fn values(
        &self,
        substance: &Substance,
        temperature_k: f64,
    ) -> Result<Values<f64>, MaterialError> {
        check_temperature(temperature_k)?;
        match substance {
            Substance::Alloy(composition) => {
                interpolation::resolve(self, composition, temperature_k)
            }
            Substance::Family(family) => Err(family.needs_match()),
            Substance::Named(name) => {
                let Some(definition) = self.definition(name) else {
                    return Err(MaterialError::UnknownMaterial {
                        text: name.clone(),
                        meant: None,
                    });
                };
                let mut values = match &definition.like {
                    // `with_definitions` has refused circles.
                    Some(like) => self.values(&self.find(like)?, temperature_k)?,
                    None => Values::empty(),
                };
                values.apply(&definition.values);
                Ok(values)
            }
        }
    }

    /// The composition of a substance; that of what it is made like for a definition. `None` for a family and for a
    /// definition that is made like nothing.
    pub fn composition(&self, substance: &Substance) -> Option<Composition> {
        match substance {
            Substance::Alloy(composition) => Some(composition.clone()),
            Substance::Family(_) => None,
            Substance::Named(name) => {
                let like = self.definition(name)?.like.as_deref()?;
                self.composition(&self.find(like).ok()?)
            }
        }
    }

    /// The composition of a family with the given lattice constant at 300 K.
    ///
    /// # Errors
    /// When more than one fraction is open, and when no fraction from 0 to 1 gives that lattice constant.
    pub fn match_to(
        &self,
        family: &Family,
        lattice_constant_nm: f64,
    ) -> Result<Composition, MaterialError> {
        let at = |share: f64| -> Result<Dual, MaterialError> {
            let share = Dual {
                value: share,
                slope: 1.0,
            };
            let values = interpolation::resolve(self, &family.at(share)?, MATCH_TEMPERATURE_K)?;
            // Every table has a lattice constant, as a test holds.
            Ok(values
                .one(Parameter::LatticeConstant)
                .unwrap_or(Dual::constant(f64::NAN)))
        };
        let ends = [at(0.0)?.value, at(1.0)?.value];
        let no_match = || MaterialError::NoMatch {
            text: family.formula(),
            wanted_nm: lattice_constant_nm,
            low_nm: ends[0].min(ends[1]),
            high_nm: ends[0].max(ends[1]),
        };
        let (low, high) = (ends[0].min(ends[1]), ends[0].max(ends[1]));
        if !(lattice_constant_nm >= low && lattice_constant_nm <= high) {
            return Err(no_match());
        }
        // Straight between the ends but for a bowing that a structure may give: Newton's method is done after one or
        // few steps.
        let mut share = (lattice_constant_nm - ends[0]) / (ends[1] - ends[0]);
        if !share.is_finite() {
            return Err(no_match());
        }
        for _ in 0..20 {
            let lattice = at(share)?;
            let step = (lattice_constant_nm - lattice.value) / lattice.slope;
            if !step.is_finite() || step.abs() < 1e-14 {
                break;
            }
            share = (share + step).clamp(0.0, 1.0);
        }
        let missed_nm = (at(share)?.value - lattice_constant_nm).abs();
        if missed_nm < 1e-9 {
            let matched = family.at(share)?;
            Ok(Composition::new(matched.elements, matched.fractions))
        } else {
            Err(no_match())
        }
    }
}

fn check_temperature(temperature_k: f64) -> Result<(), MaterialError> {
    if temperature_k >= 0.0 && temperature_k.is_finite() {
        Ok(())
    } else {
        Err(MaterialError::Temperature { temperature_k })
    }
}

/// What the name of a definition refers to; whatever is no formula is a name of its own.
fn target(name: &str) -> Result<Target, MaterialError> {
    let is_formula = || MaterialError::NameIsFormula {
        name: name.to_owned(),
    };
    match Formula::parse(name) {
        Err(MaterialError::FractionSum { .. } | MaterialError::FractionRange { .. }) => {
            Err(is_formula())
        }
        Err(_) => Ok(Target::Named),
        Ok(Formula::Complete(composition)) => match composition.elements() {
            [three, five] if three.sublattice() != Sublattice::GroupFive => {
                Ok(Target::Binary(data::binary_index(*three, *five)))
            }
            _ => Err(is_formula()),
        },
        Ok(Formula::Open(family)) if family.is_ternary_name() => {
            data::ternary_index(family.elements())
                .map(Target::Ternary)
                .ok_or_else(is_formula)
        }
        Ok(Formula::Open(_)) => Err(is_formula()),
    }
}

/// Puts chosen alternatives into their places.
fn choose<V: Clone>(
    entry_name: &str,
    entries: &mut [Entry<V>],
    definition: &Definition,
    report: &mut impl FnMut(&[&'static str], MaterialError),
) {
    for (key, wanted) in &definition.choices {
        let key: &'static Key = key;
        let entry = entries.iter_mut().find(|e| e.parameter == key.parameter);
        let found = entry.as_ref().and_then(|e| {
            let alternative = e.alternatives.iter().find(|(name, _)| name == wanted);
            alternative.map(|(_, chosen)| chosen.clone())
        });
        match (entry, found) {
            (Some(entry), Some(chosen)) => {
                let alternatives = std::mem::take(&mut entry.alternatives);
                *entry = Entry {
                    alternatives,
                    ..chosen
                };
            }
            (entry, _) => {
                let names = |e: &mut Entry<V>| {
                    e.alternatives
                        .iter()
                        .map(|(name, _)| name.clone())
                        .collect()
                };
                report(
                    &["choose", key.name],
                    MaterialError::UnknownAlternative {
                        entry: entry_name.to_owned(),
                        key: key.name,
                        name: wanted.clone(),
                        available: entry.map(names).unwrap_or_default(),
                    },
                );
            }
        }
    }
}
