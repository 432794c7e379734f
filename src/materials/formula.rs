//! Chemical formulas: reading them, and families that leave a fraction to a lattice match.

use super::composition::Composition;
use super::dual::Number;
use super::element::{Element, Sublattice};
use super::error::MaterialError;
use crate::diagnostics::probably_meant;

/// Fractions may miss 1 by rounding as much as this.
const SUM_TOLERANCE: f64 = 1e-6;

/// What a formula says.
#[derive(Clone, Debug, PartialEq)]
pub enum Formula {
    /// All fractions are known.
    Complete(Composition),
    /// At least one fraction is open.
    Open(Family),
}

/// An alloy with open fractions, such as `InGaAs` or `In0.7Ga0.3AsP`.
#[derive(Clone, Debug, PartialEq)]
pub struct Family {
    /// Group III first, otherwise in the order of the text.
    elements: Vec<Element>,
    /// By element; `None` where the text gives no number.
    given: [Option<f64>; 6],
}

impl Formula {
    /// Reads a formula in any order of elements.
    ///
    /// A sublattice of several elements has either all its fractions or leaves them open; where at least one fraction of
    /// the alloy stays open, a single missing number of another sublattice is the remainder to 1. Without anything open
    /// a missing number is an error, because `Al0.3GaAs` is more often a slip than meant.
    pub fn parse(text: &str) -> Result<Formula, MaterialError> {
        let text = text.trim();
        let tokens = tokens(text)?;
        let mut given = [None; 6];
        let mut elements = Vec::new();
        for (element, fraction) in tokens {
            if elements.contains(&element) {
                return Err(MaterialError::RepeatedElement {
                    text: text.to_owned(),
                    symbol: element.symbol(),
                });
            }
            if let Some(fraction) = fraction
                && !(0.0..=1.0).contains(&fraction)
            {
                return Err(MaterialError::FractionRange {
                    symbol: element.symbol(),
                    fraction,
                });
            }
            given[element.index()] = fraction;
            elements.push(element);
        }
        elements.sort_by_key(|e| e.sublattice() == Sublattice::GroupFive);
        let family = Family { elements, given };
        for missing in [Sublattice::GroupThree, Sublattice::GroupFive] {
            if family.on(missing).is_empty() {
                return Err(MaterialError::MissingSublattice {
                    text: text.to_owned(),
                    missing,
                });
            }
        }
        if family.elements.len() > 4 {
            return Err(MaterialError::TooManyElements {
                text: text.to_owned(),
                count: family.elements.len(),
            });
        }
        family.check(text)
    }
}

/// Elements with their numbers, in the order of the text.
fn tokens(text: &str) -> Result<Vec<(Element, Option<f64>)>, MaterialError> {
    let malformed = |found: &str| MaterialError::Malformed {
        text: text.to_owned(),
        found: found.to_owned(),
    };
    if text.is_empty() {
        return Err(malformed(""));
    }
    let mut found = Vec::new();
    let mut rest = text;
    while let Some(first) = rest.chars().next() {
        if !first.is_alphabetic() {
            return Err(malformed(rest));
        }
        let after_first = &rest[first.len_utf8()..];
        let lower = after_first
            .find(|c: char| !c.is_lowercase())
            .unwrap_or(after_first.len());
        let (symbol, after) = rest.split_at(first.len_utf8() + lower);
        let Some(element) = Element::from_symbol(symbol) else {
            let meant = recased(text).or_else(|| {
                let symbols = Element::ALL.map(Element::symbol);
                probably_meant(symbol, symbols).map(str::to_owned)
            });
            return Err(MaterialError::UnknownElement {
                text: text.to_owned(),
                symbol: symbol.to_owned(),
                meant,
            });
        };
        let digits = after
            .find(|c: char| !c.is_ascii_digit() && c != '.')
            .unwrap_or(after.len());
        let (number, next) = after.split_at(digits);
        let fraction = if number.is_empty() {
            None
        } else {
            Some(number.parse().map_err(|_| malformed(number))?)
        };
        found.push((element, fraction));
        rest = next;
    }
    Ok(found)
}

/// The formula with the usual upper and lower case, when that is all that was wrong.
pub(super) fn recased(text: &str) -> Option<String> {
    let lower = text.trim().to_lowercase();
    let mut rest = lower.as_str();
    let mut corrected = String::new();
    while let Some(next) = rest.chars().next() {
        if next.is_ascii_digit() || next == '.' {
            corrected.push(next);
            rest = &rest[1..];
        } else {
            let element = Element::ALL
                .into_iter()
                .find(|e| rest.starts_with(&e.symbol().to_lowercase()))?;
            corrected.push_str(element.symbol());
            rest = &rest[element.symbol().len()..];
        }
    }
    (corrected != text.trim() && Formula::parse(&corrected).is_ok()).then_some(corrected)
}

impl Family {
    /// The elements, group III first.
    pub fn elements(&self) -> &[Element] {
        &self.elements
    }

    fn on(&self, sublattice: Sublattice) -> Vec<Element> {
        let here = |e: &&Element| e.sublattice() == sublattice;
        self.elements.iter().filter(here).copied().collect()
    }

    /// The elements of a sublattice without a number, and what is left for them.
    fn open_on(&self, sublattice: Sublattice) -> (Vec<Element>, f64) {
        let mut open = self.on(sublattice);
        open.retain(|e| self.given[e.index()].is_none());
        let given: f64 = self
            .on(sublattice)
            .iter()
            .filter_map(|e| self.given[e.index()])
            .sum();
        (open, 1.0 - given)
    }

    /// True for three elements without any number, the name of a ternary of the library.
    pub fn is_ternary_name(&self) -> bool {
        self.elements.len() == 3 && self.given.iter().all(Option::is_none)
    }

    /// The formula as far as it is given.
    pub fn formula(&self) -> String {
        let write = |e: &Element| match self.given[e.index()] {
            Some(fraction) => format!("{}{fraction}", e.symbol()),
            None => e.symbol().to_owned(),
        };
        self.elements.iter().map(write).collect()
    }

    /// Sorts the formula into complete and open, with the sums checked.
    fn check(self, text: &str) -> Result<Formula, MaterialError> {
        let sublattices = [Sublattice::GroupThree, Sublattice::GroupFive];
        let mut open_fractions = 0;
        for sublattice in sublattices {
            let here = self.on(sublattice);
            let (open, rest) = self.open_on(sublattice);
            let missed = if open.is_empty() {
                rest.abs() > SUM_TOLERANCE
            } else if here.len() == 1 {
                false
            } else {
                rest < -SUM_TOLERANCE
            };
            if missed {
                let symbols: Vec<_> = here.iter().map(|e| e.symbol()).collect();
                return Err(MaterialError::FractionSum {
                    text: text.to_owned(),
                    symbols: symbols.join(" and "),
                    sum: tidy(1.0 - rest),
                });
            }
            open_fractions += open.len().saturating_sub(1);
        }
        if open_fractions > 0 {
            return Ok(Formula::Open(self));
        }
        let mut fractions = [0.0; 6];
        for sublattice in sublattices {
            let here = self.on(sublattice);
            let (open, rest) = self.open_on(sublattice);
            if let (Some(missing), true) = (open.first(), here.len() > 1) {
                let mut meant = self.clone();
                meant.given[missing.index()] = Some(tidy(rest));
                return Err(MaterialError::MissingFraction {
                    text: text.to_owned(),
                    symbol: missing.symbol(),
                    meant: meant.formula(),
                });
            }
            for element in here {
                fractions[element.index()] = self.given[element.index()].unwrap_or(1.0);
            }
        }
        Ok(Formula::Complete(Composition::new(
            self.elements,
            fractions,
        )))
    }

    /// The one open pair and the share of it at which the pair's first element stands, as a composition.
    ///
    /// # Errors
    /// When more than one fraction is open.
    pub(super) fn at<T: Number>(&self, share: T) -> Result<Composition<T>, MaterialError> {
        let mut fractions = [T::constant(0.0); 6];
        let mut open_fractions = 0;
        for sublattice in [Sublattice::GroupThree, Sublattice::GroupFive] {
            for element in self.on(sublattice) {
                if let Some(fraction) = self.given[element.index()] {
                    fractions[element.index()] = T::constant(fraction);
                }
            }
            let (open, rest) = self.open_on(sublattice);
            let rest = T::constant(rest.max(0.0));
            match open[..] {
                [] => {}
                [only] => fractions[only.index()] = rest,
                [first, second, ..] => {
                    fractions[first.index()] = rest * share;
                    fractions[second.index()] = rest * (T::constant(1.0) - share);
                }
            }
            open_fractions += open.len().saturating_sub(1);
        }
        if open_fractions > 1 {
            return Err(MaterialError::Underdetermined {
                text: self.formula(),
                open: open_fractions,
                example: self.with_one_more_fraction(),
            });
        }
        Ok(Composition {
            elements: self.elements.clone(),
            fractions,
        })
    }

    /// The formula with so many fractions added that one stays open, as an example.
    fn with_one_more_fraction(&self) -> String {
        let mut more = self.clone();
        let (fives, rest) = self.open_on(Sublattice::GroupFive);
        match fives[..] {
            [first, second] => {
                more.given[first.index()] = Some(tidy(0.6 * rest));
                more.given[second.index()] = Some(tidy(0.4 * rest));
            }
            _ => {
                let (threes, _) = self.open_on(Sublattice::GroupThree);
                for open in [threes, fives] {
                    if let [first, _, _] = open[..] {
                        more.given[first.index()] = Some(0.2);
                    }
                }
            }
        }
        more.formula()
    }

    /// The error that says that this family needs fractions.
    pub(super) fn needs_match(&self) -> MaterialError {
        let mut complete = self.clone();
        for sublattice in [Sublattice::GroupThree, Sublattice::GroupFive] {
            let (open, rest) = self.open_on(sublattice);
            let shares: &[f64] = match open.len() {
                1 => &[1.0],
                2 => &[0.3, 0.7],
                _ => &[0.2, 0.3, 0.5],
            };
            if self.on(sublattice).len() > 1 {
                for (element, share) in open.iter().zip(shares) {
                    complete.given[element.index()] = Some(tidy(share * rest));
                }
            }
        }
        MaterialError::NeedsMatch {
            text: self.formula(),
            example: complete.formula(),
        }
    }
}

/// A fraction for a message, without the noise of the last bits.
fn tidy(fraction: f64) -> f64 {
    (fraction * 1e6).round() / 1e6
}
