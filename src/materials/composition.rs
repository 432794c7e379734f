//! Compositions: the fractions of the elements on both sublattices.

use super::dual::{Dual, Number};
use super::element::{Element, Sublattice};
use super::error::MaterialError;
use super::formula::Formula;

/// The elements of a crystal and their fractions; those of each sublattice add up to 1.
#[derive(Clone, Debug, PartialEq)]
pub struct Composition<T = f64> {
    /// Group III first, otherwise in the order in which the user wrote them.
    pub(super) elements: Vec<Element>,
    /// By element; zero for elements that are not present.
    pub(super) fractions: [T; 6],
}

/// Decimals of a printed fraction: 10⁻⁵ of the group-III flux is far below what a growth chamber holds.
const PRINTED_DECIMALS: usize = 5;

impl Composition {
    /// Takes fractions that add up to 1 but for rounding, and lets the largest of each sublattice absorb the rounding.
    pub(super) fn new(elements: Vec<Element>, fractions: [f64; 6]) -> Self {
        let mut composition = Self {
            elements,
            fractions,
        };
        for sublattice in [Sublattice::GroupThree, Sublattice::GroupFive] {
            if let Some(host) = composition.most_abundant(sublattice, None) {
                let others = composition.sum_without(host);
                composition.fractions[host.index()] = 1.0 - others;
            }
        }
        composition
    }

    /// Reads a formula that gives every fraction; see [`Formula::parse`] for those that leave some open.
    pub fn parse(text: &str) -> Result<Composition, MaterialError> {
        match Formula::parse(text)? {
            Formula::Complete(composition) => Ok(composition),
            Formula::Open(family) => Err(family.needs_match()),
        }
    }

    fn most_abundant(&self, sublattice: Sublattice, except: Option<Element>) -> Option<Element> {
        let candidates = self.on(sublattice).filter(|e| Some(*e) != except);
        // Of equal ones the last written, the place of the host in most formulas.
        candidates.max_by(|a, b| self.fraction(*a).total_cmp(&self.fraction(*b)))
    }

    fn sum_without(&self, host: Element) -> f64 {
        let others = self.on(host.sublattice()).filter(|e| *e != host);
        others.map(|e| self.fraction(e)).sum()
    }

    /// The formula with up to five decimals, its printed fractions adding up to exactly 1; elements whose fraction
    /// prints as zero are left out.
    pub fn formula(&self) -> String {
        self.formula_to(PRINTED_DECIMALS)
    }

    /// As [`formula`](Self::formula), with up to `decimals` (at most 9) decimals.
    pub fn formula_to(&self, decimals: usize) -> String {
        let decimals = decimals.min(9);
        let printed_parts = 10_i64.pow(decimals as u32);
        let mut text = String::new();
        for sublattice in [Sublattice::GroupThree, Sublattice::GroupFive] {
            let mut parts: Vec<(Element, i64)> = self
                .on(sublattice)
                .map(|e| (e, (self.fraction(e) * printed_parts as f64).round() as i64))
                .collect();
            let excess = parts.iter().map(|(_, n)| n).sum::<i64>() - printed_parts;
            if let Some((_, largest)) = parts.iter_mut().max_by_key(|(_, n)| *n) {
                *largest -= excess;
            }
            for (element, parts) in parts.into_iter().filter(|(_, n)| *n > 0) {
                text.push_str(element.symbol());
                if parts != printed_parts {
                    let fraction = format!("0.{parts:0decimals$}");
                    text.push_str(fraction.trim_end_matches('0'));
                }
            }
        }
        text
    }

    /// The element that compensates when the fraction of `element` changes: the other one of its sublattice, or the more
    /// abundant of the two others (of equal ones the last written).
    pub fn host(&self, element: Element) -> Result<Element, MaterialError> {
        if !self.elements.contains(&element) {
            return Err(MaterialError::NoSuchElement {
                text: self.formula(),
                symbol: element.symbol(),
            });
        }
        self.most_abundant(element.sublattice(), Some(element))
            .ok_or_else(|| MaterialError::NoHost {
                text: self.formula(),
                symbol: element.symbol(),
            })
    }

    /// Sets the fraction of an element, its [`host`](Self::host) compensating.
    ///
    /// # Errors
    /// When the element is absent or alone, and when the host's fraction would become negative.
    pub fn set_fraction(&mut self, element: Element, fraction: f64) -> Result<(), MaterialError> {
        let host = self.host(element)?;
        let room = self.fraction(element) + self.fraction(host);
        // The host may come out below zero by rounding only.
        if !(fraction >= 0.0 && fraction <= room + 1e-12) {
            return Err(MaterialError::FractionRange {
                symbol: element.symbol(),
                fraction,
            });
        }
        self.fractions[element.index()] = fraction;
        self.fractions[host.index()] = (1.0 - self.sum_without(host)).max(0.0);
        Ok(())
    }

    /// The crystal with other fractions of Al, Ga and In, which add up to 1; group V stays.
    pub fn with_group_three(&self, fractions: [f64; 3]) -> Composition {
        let three = [Element::Al, Element::Ga, Element::In];
        let held = three.iter().zip(fractions).filter(|(_, f)| *f > 0.0);
        let mut elements: Vec<Element> = held.map(|(element, _)| *element).collect();
        elements.extend(self.on(Sublattice::GroupFive));
        let mut all = self.fractions;
        for (element, fraction) in three.iter().zip(fractions) {
            all[element.index()] = fraction;
        }
        Composition::new(elements, all)
    }

    /// The same composition as a function of one element's fraction, its [`host`](Self::host) compensating: what is
    /// resolved from it carries the derivative with respect to that fraction.
    pub fn along(&self, element: Element) -> Result<Composition<Dual>, MaterialError> {
        let host = self.host(element)?;
        let mut fractions = self.fractions.map(Dual::constant);
        fractions[element.index()].slope = 1.0;
        fractions[host.index()].slope = -1.0;
        Ok(Composition {
            elements: self.elements.clone(),
            fractions,
        })
    }

    /// What the same group-III sources grow when the flux of each element is multiplied by `factor`, and the factor by
    /// which the growth rate changes: the rates of the binaries add up, and so the fractions are those of the fluxes.
    /// Group V is left as it is.
    ///
    /// The factors must be positive.
    pub fn with_fluxes(&self, factor: impl Fn(Element) -> f64) -> (Composition, f64) {
        let sum: f64 = self
            .on(Sublattice::GroupThree)
            .map(|e| self.fraction(e) * factor(e))
            .sum();
        let mut changed = self.clone();
        for element in self.on(Sublattice::GroupThree) {
            changed.fractions[element.index()] = self.fraction(element) * factor(element) / sum;
        }
        (changed, sum)
    }

    /// The composition with `by` more of `element` and less of `host`, both on the same sublattice.
    ///
    /// # Errors
    /// When one of the two would become negative.
    pub fn shifted(
        &self,
        element: Element,
        host: Element,
        by: f64,
    ) -> Result<Composition, MaterialError> {
        let mut changed = self.clone();
        for (element, by) in [(element, by), (host, -by)] {
            let fraction = self.fraction(element) + by;
            if fraction.is_nan() || fraction < 0.0 {
                return Err(MaterialError::FractionRange {
                    symbol: element.symbol(),
                    fraction,
                });
            }
            changed.fractions[element.index()] = fraction;
        }
        Ok(changed)
    }

    /// The composition a share of the way from this one to another, fraction by fraction (0 here, 1 there).
    ///
    /// # Errors
    /// When the two together have more than four elements.
    pub fn towards(&self, other: &Composition, share: f64) -> Result<Composition, MaterialError> {
        let mut elements = self.elements.clone();
        elements.extend(other.elements.iter().filter(|e| !self.elements.contains(e)));
        elements.sort_by_key(|e| e.sublattice() == Sublattice::GroupFive);
        if elements.len() > 4 {
            return Err(MaterialError::TooManyElements {
                text: format!("{} to {}", self.formula(), other.formula()),
                count: elements.len(),
            });
        }
        let fractions =
            std::array::from_fn(|i| (1.0 - share) * self.fractions[i] + share * other.fractions[i]);
        Ok(Composition::new(elements, fractions))
    }
}

impl<T: Number> Composition<T> {
    /// The elements, group III first, otherwise in the order in which the user wrote them.
    pub fn elements(&self) -> &[Element] {
        &self.elements
    }

    /// The fraction of an element on its sublattice; zero when it is absent.
    pub fn fraction(&self, element: Element) -> T {
        self.fractions[element.index()]
    }

    pub(super) fn on(&self, sublattice: Sublattice) -> impl Iterator<Item = Element> {
        let here = move |e: &&Element| e.sublattice() == sublattice;
        self.elements.iter().filter(here).copied()
    }
}
