//! From binaries to ternaries and quaternaries.

use super::composition::Composition;
use super::data::{Bowing, binary_index};
use super::dual::Number;
use super::element::{Element, Sublattice};
use super::error::MaterialError;
use super::keys::Parameter;
use super::library::Library;
use super::values::{Values, luttinger_of};

/// Below this product of its fractions a pair of a quaternary is at one of its ends.
const CORNER: f64 = 1e-12;

/// All parameters of a composition at a temperature.
pub(super) fn resolve<T: Number>(
    library: &Library,
    composition: &Composition<T>,
    temperature_k: f64,
) -> Result<Values<T>, MaterialError> {
    let threes: Vec<Element> = composition.on(Sublattice::GroupThree).collect();
    let fives: Vec<Element> = composition.on(Sublattice::GroupFive).collect();
    if let ([three], [five]) = (&threes[..], &fives[..]) {
        let values = library
            .binary(binary_index(*three, *five))?
            .values(temperature_k);
        return Ok(values.map(T::constant));
    }
    let mut ends = Vec::with_capacity(4);
    for &three in &threes {
        for &five in &fives {
            let index = binary_index(three, five);
            let mut values = library.binary(index)?.values(temperature_k);
            into_alloy_form(&mut values);
            ends.push((index, values.map(T::constant)));
        }
    }
    let alloy = Alloy { library, ends };
    let fraction = |e: &Element| composition.fraction(*e);
    let mut values = match (&threes[..], &fives[..]) {
        ([a, b], [c]) => alloy.ternary(binary_index(*a, *c), binary_index(*b, *c), fraction(a))?,
        ([c], [a, b]) => alloy.ternary(binary_index(*c, *a), binary_index(*c, *b), fraction(a))?,
        ([a, b], [c, d]) => alloy.two_and_two([*a, *b], [*c, *d], fraction(a), fraction(c))?,
        ([a, b, c], [d]) => alloy.three_and_one(
            [a, b, c].map(|e| binary_index(*e, *d)),
            [a, b, c].map(fraction),
        )?,
        ([d], [a, b, c]) => alloy.three_and_one(
            [a, b, c].map(|e| binary_index(*d, *e)),
            [a, b, c].map(fraction),
        )?,
        _ => {
            return Err(MaterialError::TooManyElements {
                text: composition.elements.iter().map(|e| e.symbol()).collect(),
                count: composition.elements.len(),
            });
        }
    };
    from_alloy_form(&mut values);
    Ok(values)
}

/// The form in which alloys are interpolated: γ₃ − γ₂ in place of the Luttinger parameters (γ₁ and γ₂ come back from
/// the hole masses), and in place of the conduction edge its distance from valence edge + gap, which is zero unless a
/// definition sets the edge.
fn into_alloy_form(values: &mut Values<f64>) {
    if let Some([_, gamma2, gamma3]) = values.all(Parameter::Luttinger) {
        values.set(Parameter::Luttinger, Some(gamma3 - gamma2));
    }
    let apart = match edge_and_gap(values) {
        Some(sum) => values.one(Parameter::ConductionEdge).map(|edge| edge - sum),
        None => None,
    };
    values.set(Parameter::ConductionEdge, apart);
}

fn from_alloy_form<T: Number>(values: &mut Values<T>) {
    let luttinger = match (
        values.one(Parameter::HeavyHoleMass),
        values.one(Parameter::LightHoleMass),
        values.one(Parameter::Luttinger),
    ) {
        (Some(heavy), Some(light), Some(difference)) => {
            Some(luttinger_of(heavy, light, difference))
        }
        _ => None,
    };
    values.set_all(Parameter::Luttinger, luttinger);
    let edge = match (edge_and_gap(values), values.one(Parameter::ConductionEdge)) {
        (Some(sum), Some(apart)) => Some(sum + apart),
        _ => None,
    };
    values.set(Parameter::ConductionEdge, edge);
}

fn edge_and_gap<T: Number>(values: &Values<T>) -> Option<T> {
    Some(values.one(Parameter::ValenceEdge)? + values.one(Parameter::Gap)?)
}

/// The remote-band parameter with which the Kane relation 1/m = 1 + 2F + E_P (E_g + 2Δ/3)/(E_g (E_g + Δ)) at 0 K gives
/// the electron mass (Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), eq. 2.15).
fn fitted_remote_band_f<T: Number>(values: &Values<T>) -> Option<T> {
    let number = T::constant;
    let gap = values.gap_0k?;
    let split = values.one(Parameter::SpinOrbit)?;
    let kane = values.one(Parameter::KaneEnergy)?;
    let mass = values.one(Parameter::ElectronMass)?;
    let coupled = kane * (gap + number(2.0 / 3.0) * split) / (gap * (gap + split));
    Some((number(1.0) / mass - number(1.0) - coupled) / number(2.0))
}

/// The binaries at the ends of an alloy, in alloy form.
struct Alloy<'a, T> {
    library: &'a Library,
    ends: Vec<(usize, Values<T>)>,
}

impl<T: Number> Alloy<'_, T> {
    fn end(&self, index: usize) -> Result<&Values<T>, MaterialError> {
        let found = self.ends.iter().find(|(i, _)| *i == index);
        // Every caller asks for binaries made of the alloy's own elements.
        found
            .map(|(_, values)| values)
            .ok_or_else(|| MaterialError::Data {
                file: "materials".to_owned(),
                message: format!("binary {index} is not part of the alloy"),
            })
    }

    /// The ternary with a fraction x of the binary `a`.
    fn ternary(&self, a: usize, b: usize, x: T) -> Result<Values<T>, MaterialError> {
        let one = T::constant(1.0);
        let data = self.library.ternary(a, b)?;
        // The bowing is a function of the fraction of the table's first binary.
        let (a, b, x) = if data.of == [a, b] {
            (a, b, x)
        } else {
            (b, a, one - x)
        };
        let (first, second) = (self.end(a)?, self.end(b)?);
        let rest = one - x;
        let mut values = mean(first, second, x);
        let mut fitted = false;
        for entry in &data.entries {
            match entry.value {
                Bowing::Polynomial { value, slope } => {
                    let bow = x * rest * (T::constant(value) + T::constant(slope) * x);
                    let straight = values.one(entry.parameter);
                    values.set(entry.parameter, straight.map(|p| p - bow));
                    if entry.parameter == Parameter::Gap {
                        values.gap_0k = values.gap_0k.map(|gap| gap - bow);
                    }
                }
                Bowing::Fitted => fitted = true,
            }
        }
        if fitted {
            // Tabulated binaries miss the relation by up to 0.13 %; what they miss is kept, so that the alloy goes over
            // into them.
            let missed = |end: &Values<T>| {
                Some(end.one(Parameter::RemoteBandF)? - fitted_remote_band_f(end)?)
            };
            if let (Some(fit), Some(p), Some(q)) =
                (fitted_remote_band_f(&values), missed(first), missed(second))
            {
                values.set(Parameter::RemoteBandF, Some(fit + x * p + rest * q));
            }
        }
        Ok(values)
    }

    /// A(x) B(1−x) C(y) D(1−y): the bilinear mean of the four binaries and on it the bowing of the four ternaries, each
    /// in proportion to the fraction of the element that stays (Moon, Antypas and James, J. Electron. Mater. 3, 635
    /// (1974)). Every ternary contains the bilinear mean once, so that one of the two is taken off.
    fn two_and_two(
        &self,
        [a, b]: [Element; 2],
        [c, d]: [Element; 2],
        x: T,
        y: T,
    ) -> Result<Values<T>, MaterialError> {
        let across = |five: Element| (binary_index(a, five), binary_index(b, five));
        let along = |three: Element| (binary_index(three, c), binary_index(three, d));
        let ternary = |(p, q): (usize, usize), share: T| self.ternary(p, q, share);
        let straight = |(p, q): (usize, usize), share: T| self.straight(p, q, share);
        let first = mean(&ternary(across(c), x)?, &ternary(across(d), x)?, y);
        let second = mean(&ternary(along(a), y)?, &ternary(along(b), y)?, x);
        let bilinear = mean(&straight(across(c), x)?, &straight(across(d), x)?, y);
        let sum = first.zip(&second, |p, q| p + q);
        Ok(sum.zip(&bilinear, |p, q| p - q))
    }

    /// A(x) B(y) C(z) D with x + y + z = 1, or the same with three elements of group V: the linear mean of the three
    /// binaries and on it x y C for each pair, C being the pair's bowing at the middle of its fractions, u = (1 + x − y)/2
    /// (Donati, Kaspi and Malloy, J. Appl. Phys. 94, 5814 (2003)).
    fn three_and_one(
        &self,
        [a, b, c]: [usize; 3],
        [x, y, z]: [T; 3],
    ) -> Result<Values<T>, MaterialError> {
        let one = T::constant(1.0);
        let [first, second, third] = [self.end(a)?, self.end(b)?, self.end(c)?];
        let mut sum = first
            .zip(second, |p, q| x * p + y * q)
            .zip(third, |p, q| p + z * q);
        for (a, b, x, y) in [(a, b, x, y), (b, c, y, z), (a, c, x, z)] {
            let u = (one + x - y) / T::constant(2.0);
            let whole = u * (one - u);
            // At an end of the pair its bowing vanishes as the smaller fraction; there the pair is taken by itself.
            let (u, weight) = if whole.value() > CORNER {
                (u, x * y / whole)
            } else if x.value() > y.value() {
                (one - y, one)
            } else {
                (x, one)
            };
            let bow = self
                .ternary(a, b, u)?
                .zip(&self.straight(a, b, u)?, |p, q| weight * (p - q));
            sum = sum.zip(&bow, |p, q| p + q);
        }
        Ok(sum)
    }

    fn straight(&self, a: usize, b: usize, x: T) -> Result<Values<T>, MaterialError> {
        Ok(mean(self.end(a)?, self.end(b)?, x))
    }
}

/// The linear mean with a fraction x of the first.
fn mean<T: Number>(first: &Values<T>, second: &Values<T>, x: T) -> Values<T> {
    let rest = T::constant(1.0) - x;
    first.zip(second, |p, q| x * p + rest * q)
}
