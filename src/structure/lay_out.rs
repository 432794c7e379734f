//! A structure laid out as a stack: materials resolved, widths in nm, repeats unrolled.

use super::file::{ConductionModel, Item, LayerEntry, Spanned, Structure, ValenceModel};
use super::stack::{Content, Face, Layer, MAX_TOTAL_NM, Plane, Stack};
use crate::diagnostics::Diagnostic;
use crate::materials::{Material, MaterialError, Substance};
use std::collections::HashMap;
use std::ops::Range;

/// The temperature at which compositions are matched to the substrate, in K: that of the library's own match.
const MATCH_TEMPERATURE_K: f64 = 300.0;

impl Structure {
    /// Lays the structure out as a stack.
    ///
    /// # Errors
    /// A message for each layer whose material lacks a parameter that the strain, the model or a width in monolayers
    /// needs, and for each alloy that cannot be matched to the substrate.
    pub fn stack(&self) -> Result<Stack, Vec<Diagnostic>> {
        let mut problems = Vec::new();
        let substrate = self.substrate.as_ref().and_then(|substrate| {
            self.substrate_lattice(substrate)
                .map_err(|problem| problems.push(problem))
                .ok()
        });
        if self.substrate.is_some() && substrate.is_none() {
            return Err(problems);
        }
        let mut stack = Stack {
            layers: Vec::new(),
            planes: Vec::new(),
            potential: None,
            field_v_per_nm: self.field.as_ref().map_or(0.0, |field| field.value.value()),
            temperature_k: self.temperature_k,
            substrate: self.substrate.as_ref().map(|s| s.value.clone()),
            substrate_nm: substrate.map(|lattice| lattice.at_temperature_nm),
            library: self.library.clone(),
            contents: Vec::new(),
        };
        let mut widths_nm = Vec::new();
        for entry in &self.entries {
            match self.content(&stack, entry, substrate) {
                Ok(content) => stack.contents.push(content),
                Err(found) => {
                    problems.extend(found);
                    continue;
                }
            }
            let index = stack.contents.len() - 1;
            match stack.length_nm(index, &entry.width.value) {
                Some(width_nm) => widths_nm.push(width_nm),
                None => problems.push(no_monolayer(entry, &entry.width.span)),
            }
        }
        if !problems.is_empty() {
            return Err(problems);
        }
        stack.lay_out(self, &widths_nm);
        match self.too_thick(&stack) {
            Some(problem) => Err(vec![problem]),
            None => Ok(stack),
        }
    }

    /// A message at the layer that makes up most of a stack that is too thick.
    fn too_thick(&self, stack: &Stack) -> Option<Diagnostic> {
        let total_nm = stack.total_width_nm();
        if total_nm <= MAX_TOTAL_NM * (1.0 + 1e-9) {
            return None;
        }
        let mut share_nm = vec![0.0; self.entries.len()];
        for layer in &stack.layers {
            share_nm[layer.entry] += layer.width_nm;
        }
        let (entry, share_nm) = self
            .entries
            .iter()
            .zip(&share_nm)
            .max_by(|a, b| a.1.total_cmp(b.1))?;
        Some(
            Diagnostic::error(format!(
                "the layers are {:.0} µm thick together",
                1e-3 * total_nm
            ))
            .at(entry.width.span.clone())
            .expected(format!(
                "at most {:.0} µm in all; this layer and its copies make up {:.0} µm",
                1e-3 * MAX_TOTAL_NM,
                1e-3 * share_nm
            )),
        )
    }

    fn substrate_lattice(
        &self,
        substrate: &Spanned<Substance>,
    ) -> Result<SubstrateLattice, Diagnostic> {
        let at = |temperature_k: f64| {
            let material = self
                .library
                .material(&substrate.value, temperature_k)
                .map_err(|error| refused(&error, &substrate.span))?;
            material.lattice_constant_nm.ok_or_else(|| {
                Diagnostic::error("the substrate has no `lattice_constant`")
                    .at(substrate.span.clone())
                    .expected("a material whose lattice constant is known")
            })
        };
        Ok(SubstrateLattice {
            at_temperature_nm: at(self.temperature_k)?,
            at_match_nm: at(MATCH_TEMPERATURE_K)?,
        })
    }

    fn content(
        &self,
        stack: &Stack,
        entry: &LayerEntry,
        substrate: Option<SubstrateLattice>,
    ) -> Result<Content, Vec<Diagnostic>> {
        let face = |material: &Spanned<Substance>| -> Result<Face, Diagnostic> {
            let refuse = |error: MaterialError| refused(&error, &material.span);
            let substance = match (&material.value, substrate) {
                (Substance::Family(family), Some(substrate)) => Substance::Alloy(
                    self.library
                        .match_to(family, substrate.at_match_nm)
                        .map_err(refuse)?,
                ),
                (other, _) => other.clone(),
            };
            let face = stack.face(substance).map_err(refuse)?;
            match lacking(self, &face.free) {
                None => Ok(face),
                Some(key) => Err(Diagnostic::error(format!(
                    "the material of {} has no `{key}`, which the chosen model needs",
                    entry.in_words()
                ))
                .at(material.span.clone())
                .expected(format!(
                    "a material with `{key}`; give it under `materials:`"
                ))),
            }
        };
        let lower = face(&entry.material);
        let upper = entry.to.as_ref().map(face).transpose();
        let (lower, upper) = match (lower, upper) {
            (Ok(lower), Ok(upper)) => (lower, upper),
            (lower, upper) => {
                return Err([lower.err(), upper.err()].into_iter().flatten().collect());
            }
        };
        if let Some(Face {
            substance: Substance::Alloy(to),
            ..
        }) = &upper
            && let Substance::Alloy(from) = &lower.substance
            && let Err(error) = from.towards(to, 0.5)
        {
            let place = entry.to.as_ref().map_or(&entry.span, |to| &to.span);
            return Err(vec![refused(&error, place)]);
        }
        Ok(stack.content(lower, upper, entry.profile))
    }
}

/// The substrate's lattice constant, in nm.
#[derive(Clone, Copy)]
struct SubstrateLattice {
    at_temperature_nm: f64,
    at_match_nm: f64,
}

impl LayerEntry {
    /// The layer as it is called in a sentence.
    pub(super) fn in_words(&self) -> String {
        match &self.name {
            Some(name) => format!("layer `{name}`"),
            None => self.label.clone(),
        }
    }
}

pub(super) fn no_monolayer(entry: &LayerEntry, place: &Range<usize>) -> Diagnostic {
    Diagnostic::error(format!(
        "the monolayer of {} is unknown, because its material lacks `lattice_constant` or `elastic`",
        entry.in_words()
    ))
    .at(place.clone())
    .expected("a length such as `5.2 nm`")
}

fn refused(error: &MaterialError, place: &Range<usize>) -> Diagnostic {
    let problem = Diagnostic::error(error.to_string()).at(place.clone());
    match error.hint() {
        Some(hint) => problem.hint(hint),
        None => problem,
    }
}

/// The first parameter that the chosen models need and the material lacks.
fn lacking(structure: &Structure, material: &Material) -> Option<&'static str> {
    let mut needed = vec![
        ("conduction_edge", material.conduction_edge_ev.is_none()),
        ("electron_mass", material.electron_mass_m0.is_none()),
    ];
    let law = material.nonparabolicity_energy_ev.is_some();
    match structure.conduction.model {
        ConductionModel::EnergyDependent if !law => needed.extend([
            ("gap", material.gap_ev.is_none()),
            ("spin_orbit", material.spin_orbit_ev.is_none()),
            ("kane_energy", material.kane_energy_ev.is_none()),
        ]),
        ConductionModel::EightBand => needed.push(("gap", material.gap_ev.is_none())),
        ConductionModel::Parabolic | ConductionModel::EnergyDependent => {}
    }
    let coupled = [
        ("valence_edge", material.valence_edge_ev.is_none()),
        ("luttinger", material.luttinger.is_none()),
        ("spin_orbit", material.spin_orbit_ev.is_none()),
    ];
    match structure.valence.map(|valence| valence.model) {
        Some(ValenceModel::Decoupled) => needed.extend([
            ("valence_edge", material.valence_edge_ev.is_none()),
            ("heavy_hole_mass", material.heavy_hole_mass_m0.is_none()),
            ("light_hole_mass", material.light_hole_mass_m0.is_none()),
        ]),
        Some(ValenceModel::SixBand | ValenceModel::EightBand) => needed.extend(coupled),
        None if structure.conduction.model == ConductionModel::EightBand => needed.extend(coupled),
        None => {}
    }
    needed
        .into_iter()
        .find(|(_, lacks)| *lacks)
        .map(|(key, _)| key)
}

impl Stack {
    /// Appends the layers and planes of a structure, bottom first.
    fn lay_out(&mut self, structure: &Structure, widths_nm: &[f64]) {
        let mut order = Vec::new();
        unroll(&structure.sequence, &mut order);
        let mut copies: HashMap<Step, usize> = HashMap::new();
        for step in &order {
            *copies.entry(*step).or_default() += 1;
        }
        let mut seen: HashMap<Step, usize> = HashMap::new();
        for step in order {
            let number = seen.entry(step).or_default();
            *number += 1;
            let label = |own: &str| match copies.get(&step) {
                None | Some(1) => own.to_owned(),
                _ => format!("{own} [{number}]"),
            };
            match step {
                Step::Layer(index) => {
                    let entry = &structure.entries[index];
                    self.layers.push(Layer {
                        label: label(&entry.label),
                        entry: index,
                        width_nm: widths_nm[index],
                        donors_cm3: entry.donors_cm3,
                        acceptors_cm3: entry.acceptors_cm3,
                        sheet_donors_cm2: entry.sheet_donors_cm2,
                        sheet_acceptors_cm2: entry.sheet_acceptors_cm2,
                    });
                }
                Step::Plane(index) => {
                    let entry = &structure.planes[index];
                    self.planes.push(Plane {
                        label: label(&entry.label),
                        layer: self.layers.len(),
                        fraction: 0.0,
                        donors_cm2: entry.donors_cm2,
                        acceptors_cm2: entry.acceptors_cm2,
                    });
                }
            }
        }
        // What lies on top of all layers lies at the last one's upper face.
        for plane in &mut self.planes {
            if plane.layer == self.layers.len() {
                plane.layer = plane.layer.saturating_sub(1);
                plane.fraction = 1.0;
            }
        }
    }
}

/// A layer or a plane, by its index in the structure.
#[derive(Clone, Copy, PartialEq, Eq, Hash)]
enum Step {
    Layer(usize),
    Plane(usize),
}

/// The steps in the order of growth. The nesting is bounded by that of the text, and the number of layers was checked.
fn unroll(sequence: &[Item], order: &mut Vec<Step>) {
    for item in sequence {
        match item {
            Item::Layer(entry) => order.push(Step::Layer(*entry)),
            Item::Plane(entry) => order.push(Step::Plane(*entry)),
            Item::Repeat { count, items } => {
                let start = order.len();
                unroll(items, order);
                let end = order.len();
                for _ in 1..*count {
                    order.extend_from_within(start..end);
                }
            }
        }
    }
}
