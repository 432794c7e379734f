//! How the electrons' own field moves the absorption between subbands.
//!
//! Light shifts all electrons of a subband at once, and their charge pulls back: ω̃² = ω²(1 + α) with
//! α = 2 (e²/ε₀) N ∫ I²/ε dz / E for one transition, I(z) = ∫ ψ_i ψ_j from the bottom up to z (Allen, Tsui and Vinter, Solid
//! State Commun. 20, 425 (1976)). Several transitions feel each other's fields: the squared energies of absorption are
//! eigenvalues of E_ν² δ_νμ + 2 (e²/ε₀) √(E_ν Δn_ν E_μ Δn_μ) ∫ I_ν I_μ/ε dz (Ando, Fowler and Stern, Rev. Mod. Phys. 54, 437
//! (1982), section IV.B; exchange, which counteracts, is left out). In a parabolic well one line is left, at the bare
//! energy, however many electrons there are (Brey, Johnson and Halperin, Phys. Rev. B 40, 10647 (1989)).

use crate::constants::{E2_OVER_EPSILON_0, NM2_PER_CM2};
use crate::numerics::quadrature::MAX_ORDER;
use crate::structure::Stack;
use crate::subbands::Subbands;
use nalgebra::{DMatrix, SymmetricEigen};

/// Transitions between fillings that differ by less than this part of all electrons move nothing.
const EMPTY: f64 = 1e-6;
/// As many transitions are coupled at most, those with the largest strength times electrons.
const MAX_TRANSITIONS: usize = 200;

/// A transition from a subband to an emptier one above it; levels counted from 0.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Shifted {
    pub from: usize,
    pub to: usize,
    /// The distance of the levels.
    pub bare_ev: f64,
    /// With the field of this transition alone.
    pub alone_ev: f64,
    /// The absorption to which this transition contributes most, all fields included.
    pub coupled_ev: f64,
}

/// A line of absorption for light polarised along growth.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Line {
    pub energy_ev: f64,
    /// Of the whole absorption between the solved subbands.
    pub share: f64,
    /// The transition that contributes most to it.
    pub from: usize,
    pub to: usize,
}

/// Transitions with their shifts, by the lower and then the upper level, and the lines of absorption by energy.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Depolarisation {
    pub transitions: Vec<Shifted>,
    pub lines: Vec<Line>,
}

/// The absorption of a solved conduction band with so many electrons per cm² in its subbands. Permittivities are the
/// static ones.
pub fn depolarisation(stack: &Stack, subbands: &Subbands, densities_cm2: &[f64]) -> Depolarisation {
    let all: f64 = densities_cm2.iter().sum();
    let (weights, permittivities) = nodes(stack, subbands);
    let integral = |f: &dyn Fn(usize) -> f64| -> f64 {
        weights.iter().enumerate().map(|(k, w)| w * f(k)).sum()
    };
    let count = subbands.pairs.len().min(densities_cm2.len());
    let mut found: Vec<Transition> = Vec::new();
    for from in 0..count {
        for to in from + 1..count {
            let excess_cm2 = densities_cm2[from] - densities_cm2[to];
            if all > 0.0 && excess_cm2 > EMPTY * all {
                let charge = charge_below(subbands, from, to);
                found.push(Transition {
                    from,
                    to,
                    energy_ev: subbands.pairs[to].value - subbands.pairs[from].value,
                    excess: excess_cm2 / NM2_PER_CM2,
                    dipole_nm: integral(&|k| charge[k]),
                    charge,
                });
            }
        }
    }
    found.sort_by(|a, b| b.weight().powi(2).total_cmp(&a.weight().powi(2)));
    found.truncate(MAX_TRANSITIONS);
    found.sort_by_key(|t| (t.from, t.to));
    let size = found.len();
    if size == 0 {
        return Depolarisation::default();
    }
    let mut matrix = DMatrix::zeros(size, size);
    for (a, one) in found.iter().enumerate() {
        for (b, other) in found.iter().enumerate().take(a + 1) {
            let overlap = integral(&|k| one.charge[k] * other.charge[k] / permittivities[k]);
            let strength = (one.energy_ev * one.excess * other.energy_ev * other.excess).sqrt();
            let mut element = 2.0 * E2_OVER_EPSILON_0 * strength * overlap;
            if a == b {
                element += one.energy_ev * one.energy_ev;
            }
            matrix[(a, b)] = element;
            matrix[(b, a)] = element;
        }
    }
    let alone: Vec<f64> = (0..size).map(|a| matrix[(a, a)].max(0.0).sqrt()).collect();
    let modes = SymmetricEigen::new(matrix);
    let energies_ev: Vec<f64> = modes
        .eigenvalues
        .iter()
        .map(|e| e.max(0.0).sqrt())
        .collect();
    let part = |a: usize, mode: usize| modes.eigenvectors[(a, mode)];
    let largest = |list: &mut dyn Iterator<Item = (usize, f64)>| {
        list.max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()))
            .map_or(0, |(index, _)| index)
    };
    let transitions = found.iter().enumerate().map(|(a, transition)| Shifted {
        from: transition.from,
        to: transition.to,
        bare_ev: transition.energy_ev,
        alone_ev: alone[a],
        coupled_ev: energies_ev[largest(&mut (0..size).map(|mode| (mode, part(a, mode))))],
    });
    let strengths: Vec<f64> = (0..size)
        .map(|mode| {
            let sum: f64 = found
                .iter()
                .enumerate()
                .map(|(a, transition)| transition.weight() * part(a, mode))
                .sum();
            sum * sum
        })
        .collect();
    let whole: f64 = strengths.iter().sum();
    let mut lines: Vec<Line> = (0..size)
        .map(|mode| {
            let most = &found[largest(&mut (0..size).map(|a| (a, part(a, mode))))];
            Line {
                energy_ev: energies_ev[mode],
                share: if whole > 0.0 {
                    strengths[mode] / whole
                } else {
                    0.0
                },
                from: most.from,
                to: most.to,
            }
        })
        .collect();
    lines.sort_by(|a, b| a.energy_ev.total_cmp(&b.energy_ev));
    Depolarisation {
        transitions: transitions.collect(),
        lines,
    }
}

struct Transition {
    from: usize,
    to: usize,
    energy_ev: f64,
    /// Electrons below less those above, in 1/nm².
    excess: f64,
    /// −⟨from|z|to⟩.
    dipole_nm: f64,
    /// I at the nodes of each element.
    charge: Vec<f64>,
}

impl Transition {
    /// The root of its absorption.
    fn weight(&self) -> f64 {
        (self.energy_ev * self.excess).sqrt() * self.dipole_nm
    }
}

/// Quadrature weights in nm and permittivities at the nodes of each element.
fn nodes(stack: &Stack, subbands: &Subbands) -> (Vec<f64>, Vec<f64>) {
    let mesh = &subbands.pencil.mesh;
    let (mut weights, mut permittivities) = (Vec::new(), Vec::new());
    for element in &mesh.elements {
        let uniform = stack.is_uniform(element.segment);
        let bottom = stack.material_at(element.segment, 0.0).permittivity_static;
        for (q, weight) in mesh.reference.weights.iter().enumerate() {
            let here = if uniform {
                bottom
            } else {
                let t = mesh.fraction(element, q);
                stack.material_at(element.segment, t).permittivity_static
            };
            weights.push(0.5 * element.length * weight);
            permittivities.push(here.unwrap_or(f64::INFINITY));
        }
    }
    (weights, permittivities)
}

/// I(z), all components of the states included: by the continuity of charge (ψ_i′ A ψ_j − ψ_i A ψ_j′)/(E_j − E_i).
fn charge_below(subbands: &Subbands, from: usize, to: usize) -> Vec<f64> {
    let (pencil, mesh) = (&subbands.pencil, &subbands.pencil.mesh);
    let (lower, upper) = (&subbands.pairs[from], &subbands.pairs[to]);
    let p = mesh.order();
    let mut slopes = [[0.0; MAX_ORDER + 1]; 2];
    let mut charge = Vec::with_capacity(pencil.coefficients.len());
    for (e, element) in mesh.elements.iter().enumerate() {
        let values = [lower, upper].map(|pair| mesh.local(e, &pair.vector));
        for (slopes, values) in slopes.iter_mut().zip(values) {
            mesh.reference.slopes(values, &mut slopes[..=p]);
        }
        for (q, at) in pencil.at(e).iter().enumerate() {
            let scale = 2.0 / element.length / (upper.value - lower.value);
            let forward = slopes[0][q] * at.a(lower.value) * values[1][q];
            let backward = values[0][q] * at.a(upper.value) * slopes[1][q];
            charge.push(scale * (forward - backward));
        }
    }
    charge
}
