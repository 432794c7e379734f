//! One grown wafer of a design: the stack as it becomes when rates, fluxes, compositions, interfaces and the conditions of
//! use are off by given amounts.

use super::file::Profile;
use super::grade::Law;
use super::stack::{Content, Face, Layer, Stack};
use crate::materials::{Composition, Element, Sublattice, Substance};
use std::collections::HashMap;

/// Something in which a wafer can be off; layers and entries are those of the file's stack.
#[derive(Clone, Debug, PartialEq)]
pub enum Cause {
    /// All growth rates, as a part: every width grows by it.
    Rate,
    /// The flux of a group-III element, as a part. In a layer with group-III fractions xᵢ the growth rate is
    /// Σ xᵢ (1 + δᵢ) times what it should be, and the fractions become xᵢ (1 + δᵢ)/Σ.
    Flux(Element),
    /// The width of one layer, in nm.
    Layer(usize),
    /// The width of a file's entry, and so of all its copies, in nm.
    Entry(usize),
    /// The fraction of an element in the `material` of a file's entry.
    Fraction {
        entry: usize,
        element: Element,
        host: Element,
    },
    /// The fraction of an element in all layers of an alloy.
    Alloy {
        alloy: Vec<Element>,
        element: Element,
        host: Element,
    },
    /// The length over which interfaces are graded, in nm.
    Grading,
    /// All dopants, as a part.
    Doping,
    /// The field, in V/nm.
    Field,
    /// The temperature, in K. Widths, fractions and doping stay.
    Temperature,
}

/// A wafer that cannot be: a layer without width, a fraction below zero, a material without its parameters.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct NotGrown;

/// A stack with its interfaces as they are meant to be, from which wafers are grown.
#[derive(Clone, Debug)]
pub struct Design {
    stack: Stack,
    /// Of the file's layers, interfaces drawn where they would be if abrupt.
    widths_nm: Vec<f64>,
    /// The file's entry of each of its layers.
    entries: Vec<usize>,
    /// The entries below and above each kind of graded interface.
    interfaces: Vec<(usize, usize)>,
    grading_nm: Option<f64>,
}

/// A graded interface is at least this long: shorter ones make no difference, and none at all is no layer.
const SHORTEST_NM: f64 = 1e-4;

impl Design {
    /// The design of a file's stack, interfaces graded over a length if one is given.
    ///
    /// # Errors
    /// When graded interfaces leave nothing of a layer.
    pub fn new(stack: &Stack, grading_nm: Option<f64>) -> Result<Design, NotGrown> {
        let mut design = Design {
            stack: stack.clone(),
            widths_nm: stack.layers.iter().map(|layer| layer.width_nm).collect(),
            entries: stack.layers.iter().map(|layer| layer.entry).collect(),
            interfaces: Vec::new(),
            grading_nm,
        };
        if grading_nm.is_some() {
            design.insert_interfaces();
        }
        let mut grown = design.stack.clone();
        design.grow(&mut grown, &[], &[])?;
        design.stack = grown;
        Ok(design)
    }

    /// The stack as designed, graded interfaces as layers of their own.
    pub fn stack(&self) -> &Stack {
        &self.stack
    }

    /// Takes the potential over that the design's own stack, solved, carries.
    pub fn take_potential(&mut self, solved: &Stack) {
        self.stack.potential = solved.potential.clone();
    }

    /// The length over which interfaces are graded, if they are.
    pub fn grading_nm(&self) -> Option<f64> {
        self.grading_nm
    }

    /// The width of a layer of the file's stack, in nm, measured between the middles of its interfaces.
    pub fn width_nm(&self, layer: usize) -> f64 {
        self.widths_nm[layer]
    }

    /// The group-III elements that the layers hold.
    pub fn elements(&self) -> Vec<Element> {
        let held: Vec<Composition> = self
            .faces()
            .filter_map(|face| self.stack.library.composition(&face.substance))
            .collect();
        Element::ALL
            .into_iter()
            .filter(|e| e.sublattice() == Sublattice::GroupThree)
            .filter(|e| held.iter().any(|c| c.fraction(*e) > 0.0))
            .collect()
    }

    /// Whether the layers of an entry are made of elements whose fluxes are known.
    pub fn follows_flux(&self, entry: usize) -> bool {
        self.stack.contents.get(entry).is_some_and(|content| {
            self.stack
                .library
                .composition(&content.lower.substance)
                .is_some()
        })
    }

    /// Each fraction that the alloys of the stack have, as a cause.
    pub fn alloy_fractions(&self) -> Vec<Cause> {
        let mut causes = Vec::new();
        for face in self.faces() {
            let Substance::Alloy(composition) = &face.substance else {
                continue;
            };
            let alloy = sorted(composition);
            let known = |cause: &Cause| matches!(cause, Cause::Alloy { alloy: other, .. } if *other == alloy);
            if causes.iter().any(known) {
                continue;
            }
            causes.extend(
                free_fractions(composition)
                    .into_iter()
                    .map(|(element, host)| Cause::Alloy {
                        alloy: alloy.clone(),
                        element,
                        host,
                    }),
            );
        }
        causes
    }

    /// Each fraction that the `material` of an entry has, as a cause.
    pub fn entry_fractions(&self, entry: usize) -> Vec<Cause> {
        match self.stack.composition(entry) {
            Some(composition) => free_fractions(composition)
                .into_iter()
                .map(|(element, host)| Cause::Fraction {
                    entry,
                    element,
                    host,
                })
                .collect(),
            None => Vec::new(),
        }
    }

    /// The largest amount, up or down, by which a cause can surely be off.
    pub fn room(&self, cause: &Cause) -> f64 {
        let least =
            |element: Element, host: Element, inside: &dyn Fn(usize, &Composition) -> bool| {
                self.file_contents()
                    .enumerate()
                    .flat_map(|(entry, content)| {
                        [Some(&content.lower), content.upper.as_ref()]
                            .into_iter()
                            .flatten()
                            .filter_map(move |face| match &face.substance {
                                Substance::Alloy(composition) => Some((entry, composition)),
                                _ => None,
                            })
                    })
                    .filter(|(entry, composition)| inside(*entry, composition))
                    .map(|(_, c)| c.fraction(element).min(c.fraction(host)))
                    .fold(1.0, f64::min)
            };
        match cause {
            Cause::Rate | Cause::Flux(_) | Cause::Doping => 1.0,
            Cause::Layer(layer) => self.widths_nm[*layer],
            Cause::Entry(entry) => self.stack.entry_width_nm(*entry).unwrap_or(f64::INFINITY),
            Cause::Fraction {
                entry,
                element,
                host,
            } => least(*element, *host, &|at, _| at == *entry),
            Cause::Alloy {
                alloy,
                element,
                host,
            } => least(*element, *host, &|_, composition| {
                sorted(composition) == *alloy
            }),
            Cause::Grading => self.grading_nm.unwrap_or(0.0),
            Cause::Field | Cause::Temperature => f64::INFINITY,
        }
    }

    /// Grows a wafer that is off by `amounts` of `causes`, the rest as designed. `wafer` must be a copy of the design's
    /// stack; it may have been grown before with the same causes.
    ///
    /// # Errors
    /// When there is no such wafer; `wafer` is then good for nothing but growing again.
    pub fn grow(
        &self,
        wafer: &mut Stack,
        causes: &[Cause],
        amounts: &[f64],
    ) -> Result<(), NotGrown> {
        let mut rate = 1.0;
        let mut fluxes = [1.0; Element::ALL.len()];
        let mut added_nm = vec![0.0; self.widths_nm.len()];
        let mut grading_nm = self.grading_nm;
        let mut other_materials = false;
        wafer.field_v_per_nm = self.stack.field_v_per_nm;
        wafer.temperature_k = self.stack.temperature_k;
        let mut doping = 1.0;
        for (cause, &amount) in causes.iter().zip(amounts) {
            match cause {
                Cause::Rate => rate += amount,
                Cause::Flux(element) => {
                    fluxes[*element as usize] += amount;
                    other_materials = true;
                }
                Cause::Layer(layer) => added_nm[*layer] += amount,
                Cause::Entry(entry) => {
                    for (added, _) in added_nm
                        .iter_mut()
                        .zip(&self.entries)
                        .filter(|(_, own)| *own == entry)
                    {
                        *added += amount;
                    }
                }
                Cause::Fraction { .. } | Cause::Alloy { .. } => other_materials = true,
                // The energies are even in the length, so a draw below zero stands for its size.
                Cause::Grading => grading_nm = grading_nm.map(|length| (length + amount).abs()),
                Cause::Doping => doping += amount,
                Cause::Field => wafer.field_v_per_nm += amount,
                Cause::Temperature => {
                    wafer.temperature_k = (wafer.temperature_k + amount).max(0.0);
                    other_materials = true;
                }
            }
        }
        if rate <= 0.0 || fluxes.iter().any(|flux| *flux <= 0.0) {
            return Err(NotGrown);
        }
        self.dope(wafer, doping.max(0.0));
        let mut entry_rates = vec![1.0; self.file_contents().count()];
        if other_materials {
            wafer.substrate_nm = match &wafer.substrate {
                Some(substrate) => {
                    let material = wafer.library.material(substrate, wafer.temperature_k);
                    material.map_err(|_| NotGrown)?.lattice_constant_nm
                }
                None => None,
            };
            entry_rates = self.change_materials(wafer, causes, amounts, &fluxes)?;
        }
        if self.grading_nm.is_some() {
            self.join(wafer);
        }
        self.set_widths(wafer, grading_nm, |layer| {
            self.widths_nm[layer] * rate * entry_rates[self.entries[layer]] + added_nm[layer]
        })
    }

    /// Gives a wafer so many times the design's dopants.
    fn dope(&self, wafer: &mut Stack, part: f64) {
        for (layer, designed) in wafer.layers.iter_mut().zip(&self.stack.layers) {
            layer.donors_cm3 = part * designed.donors_cm3;
            layer.acceptors_cm3 = part * designed.acceptors_cm3;
            layer.sheet_donors_cm2 = part * designed.sheet_donors_cm2;
            layer.sheet_acceptors_cm2 = part * designed.sheet_acceptors_cm2;
        }
        for (plane, designed) in wafer.planes.iter_mut().zip(&self.stack.planes) {
            plane.donors_cm2 = part * designed.donors_cm2;
            plane.acceptors_cm2 = part * designed.acceptors_cm2;
        }
    }

    /// The contents of the file's entries, without the interfaces.
    fn file_contents(&self) -> impl Iterator<Item = &Content> {
        self.stack.contents.iter().filter(|c| !c.interface)
    }

    fn faces(&self) -> impl Iterator<Item = &Face> {
        self.file_contents()
            .flat_map(|content| std::iter::once(&content.lower).chain(&content.upper))
    }

    /// Puts a layer between every two of the file's.
    fn insert_interfaces(&mut self) {
        let count = self.stack.contents.len();
        let layers = std::mem::take(&mut self.stack.layers);
        let mut kinds = HashMap::new();
        for (index, layer) in layers.iter().enumerate() {
            self.stack.layers.push(layer.clone());
            let Some(above) = layers.get(index + 1) else {
                break;
            };
            let pair = (layer.entry, above.entry);
            let kind = *kinds.entry(pair).or_insert_with(|| {
                self.interfaces.push(pair);
                self.interfaces.len() - 1
            });
            self.stack.layers.push(Layer {
                label: format!("interface of {} and {}", layer.label, above.label),
                entry: count + kind,
                width_nm: 0.0,
                donors_cm3: 0.0,
                acceptors_cm3: 0.0,
                sheet_donors_cm2: 0.0,
                sheet_acceptors_cm2: 0.0,
            });
        }
        // Planes at a face come to lie in the middle of its interface; those at an end stay there.
        for plane in &mut self.stack.planes {
            (plane.layer, plane.fraction) = match plane.layer {
                layer if plane.fraction > 0.0 => (2 * layer, plane.fraction),
                0 => (0, 0.0),
                layer => (2 * layer - 1, 0.5),
            };
        }
        self.stack.potential = None;
    }

    /// Makes the interfaces of what lies below and above them.
    fn join(&self, wafer: &mut Stack) {
        wafer.contents.retain(|content| !content.interface);
        for (below, above) in &self.interfaces {
            let below = &wafer.contents[*below];
            let interface = Content {
                lower: below.upper.as_ref().unwrap_or(&below.lower).clone(),
                upper: Some(wafer.contents[*above].lower.clone()),
                law: Law::Linear,
                profile: Profile::Linear,
                monolayer_nm: None,
                interface: true,
            };
            wafer.contents.push(interface);
        }
    }

    /// Sets the layers' widths, half of a graded interface taken from the layer on each side.
    fn set_widths(
        &self,
        wafer: &mut Stack,
        grading_nm: Option<f64>,
        width_nm: impl Fn(usize) -> f64,
    ) -> Result<(), NotGrown> {
        let Some(grading_nm) = grading_nm.map(|length| length.max(SHORTEST_NM)) else {
            for (index, layer) in wafer.layers.iter_mut().enumerate() {
                layer.width_nm = positive(width_nm(index))?;
            }
            return Ok(());
        };
        let count = wafer.layers.len();
        for (index, layer) in wafer.layers.iter_mut().enumerate() {
            layer.width_nm = if index % 2 == 1 {
                grading_nm
            } else {
                let sides = f64::from(u8::from(index > 0) + u8::from(index + 1 < count));
                positive(width_nm(index / 2) - 0.5 * sides * grading_nm)?
            };
        }
        Ok(())
    }

    /// Resolves the materials anew; the growth rate of each entry comes back as a part of what it should be.
    fn change_materials(
        &self,
        wafer: &mut Stack,
        causes: &[Cause],
        amounts: &[f64],
        fluxes: &[f64; Element::ALL.len()],
    ) -> Result<Vec<f64>, NotGrown> {
        // Faces of one material are resolved once, unless an entry is changed on its own.
        let shared = !causes.iter().any(|c| matches!(c, Cause::Fraction { .. }));
        let mut known: Vec<(&Substance, Face, f64)> = Vec::new();
        let mut rates = Vec::new();
        for (entry, designed) in self.file_contents().enumerate() {
            let grown = |face: &Face, is_lower: bool| -> Result<(Face, f64), NotGrown> {
                let found = known
                    .iter()
                    .find(|(substance, ..)| shared && **substance == face.substance);
                if let Some((_, face, rate)) = found {
                    return Ok((face.clone(), *rate));
                }
                let of_entry = is_lower.then_some(entry);
                let (substance, rate) =
                    self.substance(&face.substance, of_entry, causes, amounts, fluxes)?;
                Ok((wafer.face(substance).map_err(|_| NotGrown)?, rate))
            };
            let (lower, lower_rate) = grown(&designed.lower, true)?;
            let upper = match &designed.upper {
                Some(upper) => Some(grown(upper, false)?),
                None => None,
            };
            known.push((&designed.lower.substance, lower.clone(), lower_rate));
            rates.push(match &upper {
                Some((_, upper_rate)) => {
                    lower_rate + designed.law.mean_share() * (upper_rate - lower_rate)
                }
                None => lower_rate,
            });
            let upper = upper.map(|(face, _)| face);
            wafer.contents[entry] = wafer.content(lower, upper, designed.profile);
        }
        Ok(rates)
    }

    /// What a face is made of, and the growth rate there. `entry` is that of a face that `Cause::Fraction` speaks of.
    fn substance(
        &self,
        designed: &Substance,
        entry: Option<usize>,
        causes: &[Cause],
        amounts: &[f64],
        fluxes: &[f64; Element::ALL.len()],
    ) -> Result<(Substance, f64), NotGrown> {
        let factor = |element: Element| fluxes[element as usize];
        let Substance::Alloy(composition) = designed else {
            // The numbers of a material of the file stay; its thickness follows the elements that it is made like.
            let like = self.stack.library.composition(designed);
            let rate = like.map_or(1.0, |like| like.with_fluxes(factor).1);
            return Ok((designed.clone(), rate));
        };
        let (mut grown, rate) = composition.with_fluxes(factor);
        for (cause, &amount) in causes.iter().zip(amounts) {
            let shift = match cause {
                Cause::Fraction {
                    entry: own,
                    element,
                    host,
                } if Some(*own) == entry => Some((element, host)),
                Cause::Alloy {
                    alloy,
                    element,
                    host,
                } if sorted(composition) == *alloy => Some((element, host)),
                _ => None,
            };
            if let Some((element, host)) = shift {
                grown = grown
                    .shifted(*element, *host, amount)
                    .map_err(|_| NotGrown)?;
            }
        }
        Ok((Substance::Alloy(grown), rate))
    }
}

fn positive(width_nm: f64) -> Result<f64, NotGrown> {
    if width_nm > 0.0 {
        Ok(width_nm)
    } else {
        Err(NotGrown)
    }
}

/// The elements of an alloy in the library's order, however its formula was written.
fn sorted(composition: &Composition) -> Vec<Element> {
    let mut elements = composition.elements().to_vec();
    elements.sort();
    elements
}

/// On each sublattice every element but the most abundant, which gives way to it.
fn free_fractions(composition: &Composition) -> Vec<(Element, Element)> {
    let mut free = Vec::new();
    for sublattice in [Sublattice::GroupThree, Sublattice::GroupFive] {
        let here = || {
            let elements = composition.elements().iter().copied();
            elements.filter(move |e| e.sublattice() == sublattice)
        };
        let host = here().max_by(|a, b| {
            composition
                .fraction(*a)
                .total_cmp(&composition.fraction(*b))
        });
        if let Some(host) = host {
            free.extend(here().filter(|e| *e != host).map(|e| (e, host)));
        }
    }
    free
}
