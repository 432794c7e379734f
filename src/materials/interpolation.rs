//! From binaries to ternaries and quaternaries.

use super::composition::Composition;
use super::data::{Bowing, binary_index};
use super::dual::Number;
use super::element::{Element, Sublattice};
use super::error::MaterialError;
use super::keys::Parameter;
use super::library::Library;
use super::values::{Values, luttinger_of};

/// Below this sum of its weights a quaternary is taken to first order about the binary that it then is.
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
        let mut values = first.zip(second, |p, q| x * p + rest * q);
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

    /// A(x) B(1−x) C(y) D(1−y): Glisson and others, J. Electron. Mater. 7, 1 (1978), eq. 1.
    fn two_and_two(
        &self,
        [a, b]: [Element; 2],
        [c, d]: [Element; 2],
        x: T,
        y: T,
    ) -> Result<Values<T>, MaterialError> {
        let one = T::constant(1.0);
        let across = |five: Element| self.ternary(binary_index(a, five), binary_index(b, five), x);
        let along =
            |three: Element| self.ternary(binary_index(three, c), binary_index(three, d), y);
        let (wx, wy) = (x * (one - x), y * (one - y));
        if (wx + wy).value() < CORNER {
            let three = if x.value() > 0.5 { a } else { b };
            let five = if y.value() > 0.5 { c } else { d };
            let corner = self.end(binary_index(three, five))?;
            let sum = across(five)?.zip(&along(three)?, |p, q| p + q);
            return Ok(sum.zip(corner, |p, q| p - q));
        }
        Ok(weighted_mean([
            (wx * y, across(c)?),
            (wx * (one - y), across(d)?),
            (wy * x, along(a)?),
            (wy * (one - x), along(b)?),
        ]))
    }

    /// A(x) B(y) C(1−x−y) D, or the same with three elements of group V: Williams and others, J. Electron. Mater. 7,
    /// 639 (1978). Each ternary is taken at the middle of its fractions, (1 + x − y)/2.
    fn three_and_one(
        &self,
        [a, b, c]: [usize; 3],
        [x, y, z]: [T; 3],
    ) -> Result<Values<T>, MaterialError> {
        let one = T::constant(1.0);
        if (x * y + y * z + x * z).value() < CORNER {
            let mut order = [(a, x), (b, y), (c, z)];
            order.sort_by(|p, q| q.1.value().total_cmp(&p.1.value()));
            let [(corner, _), (second, u), (third, v)] = order;
            let sum = self
                .ternary(corner, second, one - u)?
                .zip(&self.ternary(corner, third, one - v)?, |p, q| p + q);
            return Ok(sum.zip(self.end(corner)?, |p, q| p - q));
        }
        let middle = |p: T, q: T| (one + p - q) / T::constant(2.0);
        Ok(weighted_mean([
            (x * y, self.ternary(a, b, middle(x, y))?),
            (y * z, self.ternary(b, c, middle(y, z))?),
            (x * z, self.ternary(a, c, middle(x, z))?),
        ]))
    }
}

fn weighted_mean<T: Number, const N: usize>(parts: [(T, Values<T>); N]) -> Values<T> {
    let mut total: Option<(T, Values<T>)> = None;
    for (weight, values) in parts {
        let scaled = values.map(|p| weight * p);
        total = Some(match total {
            None => (weight, scaled),
            Some((sum, mean)) => (sum + weight, mean.zip(&scaled, |p, q| p + q)),
        });
    }
    let (sum, values) = total.unwrap_or((T::constant(1.0), Values::empty()));
    values.map(|p| p / sum)
}
