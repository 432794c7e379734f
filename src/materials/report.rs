//! What the library knows, as plain rows: of one material, and of all its entries.

use super::composition::Composition;
use super::data::{self, BINARIES, Entry, Known, TERNARIES, binary_index};
use super::element::{Element, Sublattice};
use super::error::MaterialError;
use super::keys::{KEYS, Parameter};
use super::library::{Library, STRUCTURE_FILE, Substance};
use std::fmt;

/// One parameter of a resolved material.
#[derive(Clone, Debug, PartialEq)]
pub struct ReportRow {
    /// The key under which a structure would give it.
    pub key: &'static str,
    /// In the inner unit of the key; two or three numbers for the keys that take so many.
    pub numbers: Vec<f64>,
    /// The symbol of that unit; empty for a pure number.
    pub unit: &'static str,
    pub origin: Origin,
    /// How the least sure of the tabulated values behind it is known; `None` when it comes from a relation or from the
    /// structure file.
    pub known: Option<Known>,
    /// Remarks of the tables, each led by the entry that it stands in.
    pub notes: Vec<String>,
    pub alternatives: Vec<Alternative>,
}

/// Where a parameter comes from.
#[derive(Clone, Debug, PartialEq)]
pub enum Origin {
    /// From the table of a binary; the key of its source, see [`citation`](super::citation).
    Tabulated(String),
    /// From tables of binaries and their bowings.
    Interpolated {
        from: Vec<&'static str>,
        sources: Vec<String>,
    },
    /// From other parameters of the material, by the relation that is named.
    Derived(&'static str),
    /// From the structure file, under this name.
    Definition(String),
}

impl fmt::Display for Origin {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Origin::Tabulated(source) => f.write_str(source),
            Origin::Interpolated { from, sources } => write!(
                f,
                "interpolated from {} ({})",
                from.join(", "),
                sources.join(", ")
            ),
            Origin::Derived(relation) => f.write_str(relation),
            Origin::Definition(name) => write!(f, "{STRUCTURE_FILE}: {name}"),
        }
    }
}

impl Origin {
    /// Keys of the sources that the value comes from.
    pub fn sources(&self) -> Vec<String> {
        match self {
            Origin::Tabulated(source) => vec![source.clone()],
            Origin::Interpolated { sources, .. } => sources.clone(),
            Origin::Derived(_) | Origin::Definition(_) => Vec::new(),
        }
    }
}

/// Another value that a structure can choose by name.
#[derive(Clone, Debug, PartialEq)]
pub struct Alternative {
    /// The binary or ternary whose definition chooses it.
    pub entry: &'static str,
    pub key: &'static str,
    pub name: String,
    pub source: String,
    pub known: Known,
    pub note: Option<String>,
}

/// What stands at a place of the library for which published values disagree.
#[derive(Clone, Debug, PartialEq)]
pub struct Selection {
    /// The binary or ternary.
    pub entry: &'static str,
    pub key: &'static str,
    /// The name of the chosen alternative; `None` for the library's own value and for one of the structure file.
    pub chosen: Option<String>,
    /// The key of the source.
    pub source: String,
    pub note: Option<String>,
    /// The names that can be chosen.
    pub names: Vec<String>,
}

/// A binary or ternary of the library.
#[derive(Clone, Debug, PartialEq)]
pub struct LibraryEntry {
    pub name: &'static str,
    /// The two binaries of a ternary; `None` for a binary.
    pub of: Option<[&'static str; 2]>,
    /// How many parameters, or bowings, its table has.
    pub count: usize,
    pub alternatives: Vec<Alternative>,
}

impl Library {
    /// Every known parameter of a substance at a temperature in K, in the order of [`KEYS`].
    ///
    /// # Errors
    /// As [`Library::material`].
    pub fn report(
        &self,
        substance: &Substance,
        temperature_k: f64,
    ) -> Result<Vec<ReportRow>, MaterialError> {
        let values = self.values(substance, temperature_k)?;
        let mut rows = Vec::new();
        for key in &KEYS {
            if let Some(numbers) = values.all(key.parameter) {
                let mut row = ReportRow {
                    key: key.name,
                    numbers: numbers[..key.components].to_vec(),
                    unit: key.unit(),
                    origin: Origin::Derived(""),
                    known: None,
                    notes: Vec::new(),
                    alternatives: Vec::new(),
                };
                self.trace(substance, key.parameter, &mut row)?;
                rows.push(row);
            }
        }
        Ok(rows)
    }

    /// Fills in where a parameter comes from.
    fn trace(
        &self,
        substance: &Substance,
        parameter: Parameter,
        row: &mut ReportRow,
    ) -> Result<(), MaterialError> {
        let composition = match substance {
            Substance::Alloy(composition) => composition,
            Substance::Family(family) => return Err(family.needs_match()),
            Substance::Named(name) => {
                let definition = self.definition(name);
                if definition.is_some_and(|d| d.gives(parameter)) {
                    row.origin = Origin::Definition(name.clone());
                    return Ok(());
                }
                let moved = |d: &super::Definition| match parameter {
                    Parameter::ConductionEdge => {
                        d.gives(Parameter::Gap) || d.gives(Parameter::ValenceEdge)
                    }
                    Parameter::HeavyHoleMass | Parameter::LightHoleMass => {
                        d.gives(Parameter::Luttinger)
                    }
                    Parameter::Luttinger => {
                        d.gives(Parameter::HeavyHoleMass) || d.gives(Parameter::LightHoleMass)
                    }
                    _ => false,
                };
                let like = definition.and_then(|d| d.like.as_deref());
                return match like {
                    Some(like) if !definition.is_some_and(moved) => {
                        self.trace(&self.find(like)?, parameter, row)
                    }
                    _ => {
                        row.origin = Origin::Derived(relation(parameter));
                        Ok(())
                    }
                };
            }
        };
        let threes: Vec<Element> = composition.on(Sublattice::GroupThree).collect();
        let fives: Vec<Element> = composition.on(Sublattice::GroupFive).collect();
        let mut binaries = Vec::new();
        for &three in &threes {
            binaries.extend(fives.iter().map(|&five| binary_index(three, five)));
        }
        if let [index] = binaries[..] {
            let table = self.binary(index)?;
            if table.given.iter().any(|s| s.parameter == parameter) {
                row.origin = Origin::Definition(table.name.to_owned());
            } else if let Some(entry) = table.entries.iter().find(|e| e.parameter == parameter) {
                add(row, table.name, entry);
                row.origin = Origin::Tabulated(entry.source.clone());
            } else {
                row.origin = Origin::Derived(relation(parameter));
            }
            return Ok(());
        }
        if matches!(parameter, Parameter::ConductionEdge | Parameter::Luttinger) {
            row.origin = Origin::Derived(match parameter {
                Parameter::Luttinger => {
                    "from heavy_hole_mass, light_hole_mass and interpolated gamma3 - gamma2"
                }
                _ => relation(parameter),
            });
            return Ok(());
        }
        // The hole masses of a binary come from its Luttinger parameters.
        let tabulated = match parameter {
            Parameter::HeavyHoleMass | Parameter::LightHoleMass => Parameter::Luttinger,
            other => other,
        };
        let mut from = Vec::new();
        let mut sources = Vec::new();
        let mut involve = |source: &str| {
            if !sources.iter().any(|s| s == source) {
                sources.push(source.to_owned());
            }
        };
        for &index in &binaries {
            let table = self.binary(index)?;
            from.push(table.name);
            if table.given.iter().any(|s| s.parameter == parameter) {
                involve(STRUCTURE_FILE);
            } else if let Some(entry) = table.entries.iter().find(|e| e.parameter == tabulated) {
                add(row, table.name, entry);
                involve(&entry.source);
            }
        }
        for (at, &a) in binaries.iter().enumerate() {
            for &b in &binaries[at + 1..] {
                // Binaries without a common element have no ternary between them.
                let Ok(index) = data::ternary_between(a, b) else {
                    continue;
                };
                let table = self.ternary_at(index)?;
                if let Some(entry) = table.entries.iter().find(|e| e.parameter == parameter) {
                    add(row, table.name, entry);
                    involve(&entry.source);
                }
            }
        }
        row.origin = Origin::Interpolated { from, sources };
        Ok(())
    }

    /// What this library takes for the valence edge wherever published values disagree, of the alloys between the
    /// binaries of a composition.
    ///
    /// # Errors
    /// Only when an embedded table cannot be read.
    pub fn offset_selections(
        &self,
        composition: &Composition,
    ) -> Result<Vec<Selection>, MaterialError> {
        let threes: Vec<Element> = composition.on(Sublattice::GroupThree).collect();
        let fives: Vec<Element> = composition.on(Sublattice::GroupFive).collect();
        let mut binaries = Vec::new();
        for &three in &threes {
            binaries.extend(fives.iter().map(|&five| binary_index(three, five)));
        }
        let mut found = Vec::new();
        for (at, &a) in binaries.iter().enumerate() {
            for &b in &binaries[at + 1..] {
                let Ok(index) = data::ternary_between(a, b) else {
                    continue;
                };
                let table = self.ternary_at(index)?;
                let entry = table.entries.iter().find(|entry| {
                    entry.parameter == Parameter::ValenceEdge
                        && (!entry.alternatives.is_empty() || entry.source == STRUCTURE_FILE)
                });
                if let Some(entry) = entry {
                    let chosen = entry.alternatives.iter().find(|(_, other)| {
                        other.value == entry.value && other.source == entry.source
                    });
                    found.push(Selection {
                        entry: table.name,
                        key: entry.parameter.key().name,
                        chosen: chosen.map(|(name, _)| name.clone()),
                        source: entry.source.clone(),
                        note: entry.note.clone(),
                        names: entry.alternatives.iter().map(|(n, _)| n.clone()).collect(),
                    });
                }
            }
        }
        Ok(found)
    }

    /// Every binary and ternary of the library, binaries first.
    ///
    /// # Errors
    /// Only when an embedded table cannot be read.
    pub fn entries(&self) -> Result<Vec<LibraryEntry>, MaterialError> {
        let mut all = Vec::new();
        for index in 0..BINARIES.len() {
            let table = self.binary(index)?;
            all.push(LibraryEntry {
                name: table.name,
                of: None,
                count: table.entries.len(),
                alternatives: table
                    .entries
                    .iter()
                    .flat_map(|e| alternatives(table.name, e))
                    .collect(),
            });
        }
        for index in 0..TERNARIES.len() {
            let table = self.ternary_at(index)?;
            all.push(LibraryEntry {
                name: table.name,
                of: Some(table.of.map(|i| BINARIES[i].0)),
                count: table.entries.len(),
                alternatives: table
                    .entries
                    .iter()
                    .flat_map(|e| alternatives(table.name, e))
                    .collect(),
            });
        }
        Ok(all)
    }
}

fn relation(parameter: Parameter) -> &'static str {
    match parameter {
        Parameter::ConductionEdge => "valence_edge + gap",
        Parameter::Luttinger => "from heavy_hole_mass and light_hole_mass",
        _ => "from luttinger",
    }
}

fn add<V>(row: &mut ReportRow, table: &'static str, entry: &Entry<V>) {
    row.known = row.known.max(Some(entry.known));
    if let Some(note) = &entry.note {
        row.notes.push(format!("{table}: {note}"));
    }
    row.alternatives.extend(alternatives(table, entry));
}

fn alternatives<V>(table: &'static str, entry: &Entry<V>) -> impl Iterator<Item = Alternative> {
    entry
        .alternatives
        .iter()
        .map(move |(name, other)| Alternative {
            entry: table,
            key: entry.parameter.key().name,
            name: name.clone(),
            source: other.source.clone(),
            known: other.known,
            note: other.note.clone(),
        })
}
