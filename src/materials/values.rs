//! All parameters of one material as a table by key, the form in which alloys are computed.

use super::definition::Setting;
use super::dual::Number;
use super::keys::{COUNT, Parameter};

/// The parameters that are known, in inner units; a key with fewer than three numbers leaves the rest zero.
#[derive(Clone, Debug)]
pub(super) struct Values<T> {
    table: [Option<[T; 3]>; COUNT],
    /// The gap at 0 K, to which the tabulated masses and Kane parameters belong.
    pub gap_0k: Option<T>,
}

impl<T: Number> Values<T> {
    pub fn empty() -> Self {
        Self {
            table: [None; COUNT],
            gap_0k: None,
        }
    }

    pub fn all(&self, parameter: Parameter) -> Option<[T; 3]> {
        self.table[parameter as usize]
    }

    /// The number of a key that has one.
    pub fn one(&self, parameter: Parameter) -> Option<T> {
        self.all(parameter).map(|[first, ..]| first)
    }

    pub fn set_all(&mut self, parameter: Parameter, components: Option<[T; 3]>) {
        self.table[parameter as usize] = components;
    }

    pub fn set(&mut self, parameter: Parameter, number: Option<T>) {
        let zero = T::constant(0.0);
        self.set_all(parameter, number.map(|n| [n, zero, zero]));
    }

    /// Combines two tables key by key; a parameter unknown in either is unknown in the result.
    pub fn zip(&self, other: &Self, combine: impl Fn(T, T) -> T) -> Self {
        let both = |a: Option<[T; 3]>, b: Option<[T; 3]>| {
            let (a, b) = (a?, b?);
            Some([
                combine(a[0], b[0]),
                combine(a[1], b[1]),
                combine(a[2], b[2]),
            ])
        };
        Self {
            table: std::array::from_fn(|i| both(self.table[i], other.table[i])),
            gap_0k: match (self.gap_0k, other.gap_0k) {
                (Some(a), Some(b)) => Some(combine(a, b)),
                _ => None,
            },
        }
    }

    pub fn map<U: Number>(&self, convert: impl Fn(T) -> U) -> Values<U> {
        Values {
            table: std::array::from_fn(|i| self.table[i].map(|c| c.map(&convert))),
            gap_0k: self.gap_0k.map(&convert),
        }
    }

    /// Fills what follows from the rest: hole masses along \[001] from the Luttinger parameters, 1/(γ₁ ∓ 2γ₂), and
    /// conduction edge = valence edge + gap.
    pub fn complete(&mut self) {
        if let Some([gamma1, gamma2, _]) = self.all(Parameter::Luttinger) {
            let two = T::constant(2.0);
            if self.one(Parameter::HeavyHoleMass).is_none() {
                self.set(Parameter::HeavyHoleMass, reciprocal(gamma1 - two * gamma2));
            }
            if self.one(Parameter::LightHoleMass).is_none() {
                self.set(Parameter::LightHoleMass, reciprocal(gamma1 + two * gamma2));
            }
        }
        if self.one(Parameter::ConductionEdge).is_none()
            && let (Some(valence), Some(gap)) =
                (self.one(Parameter::ValenceEdge), self.one(Parameter::Gap))
        {
            self.set(Parameter::ConductionEdge, Some(valence + gap));
        }
    }
}

/// The inverse of an inverse mass; a mass that would not be positive is no mass.
fn reciprocal<T: Number>(inverse: T) -> Option<T> {
    (inverse.value() > 0.0).then(|| T::constant(1.0) / inverse)
}

impl Values<f64> {
    /// Puts a user's values over the table and lets what depends on them follow: the conduction edge moves with gap and
    /// valence edge, hole masses and Luttinger parameters follow one another, unless both are given.
    pub fn apply(&mut self, settings: &[Setting]) {
        let before = [
            Parameter::Gap,
            Parameter::ValenceEdge,
            Parameter::ConductionEdge,
        ]
        .map(|p| self.one(p));
        let given = |parameter| settings.iter().any(|s| s.parameter == parameter);
        for setting in settings {
            self.set_all(setting.parameter, Some(setting.components));
        }
        if given(Parameter::Gap) {
            self.gap_0k = self.one(Parameter::Gap);
        }
        if given(Parameter::Luttinger) {
            for mass in [Parameter::HeavyHoleMass, Parameter::LightHoleMass] {
                if !given(mass) {
                    self.set(mass, None);
                }
            }
        } else if (given(Parameter::HeavyHoleMass) || given(Parameter::LightHoleMass))
            && let Some([_, gamma2, gamma3]) = self.all(Parameter::Luttinger)
            && let (Some(heavy), Some(light)) = (
                self.one(Parameter::HeavyHoleMass),
                self.one(Parameter::LightHoleMass),
            )
        {
            let luttinger = luttinger_of(heavy, light, gamma3 - gamma2);
            self.set_all(Parameter::Luttinger, Some(luttinger));
        }
        if !given(Parameter::ConductionEdge)
            && (given(Parameter::Gap) || given(Parameter::ValenceEdge))
        {
            let moved = match (
                before,
                self.one(Parameter::Gap),
                self.one(Parameter::ValenceEdge),
            ) {
                // A conduction edge that was set apart from valence edge + gap keeps its distance.
                (
                    [Some(gap), Some(valence), Some(conduction)],
                    Some(new_gap),
                    Some(new_valence),
                ) => Some(conduction + (new_gap - gap) + (new_valence - valence)),
                ([_, _, Some(conduction)], ..) => Some(conduction),
                _ => None,
            };
            self.set(Parameter::ConductionEdge, moved);
        }
        self.complete();
    }
}

/// γ₁, γ₂, γ₃ from the hole masses along \[001] and γ₃ − γ₂.
pub(super) fn luttinger_of<T: Number>(heavy: T, light: T, gamma3_less_gamma2: T) -> [T; 3] {
    let one = T::constant(1.0);
    let gamma1 = (one / light + one / heavy) / T::constant(2.0);
    let gamma2 = (one / light - one / heavy) / T::constant(4.0);
    [gamma1, gamma2, gamma2 + gamma3_less_gamma2]
}
