//! Checks that a solution keeps what [z, p] = iħ demands, whatever the mesh. They use the states in ways the solver does
//! not, so a fault of either shows.

use super::Subbands;
use super::state::{edge_fluxes, integrate, wall_pressures};
use crate::numerics::eigenpairs::count_below;
use crate::numerics::pencil::Pencil;
use crate::numerics::quadrature::MAX_ORDER;
use crate::numerics::sensitivity::moment;

/// Relative deviations, each the worst over the states or pairs of states.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Audit {
    /// Overlaps of different states, and norms from one.
    pub orthonormality: f64,
    /// (E_j − E_i) ⟨i|z|j⟩ against the velocity element ∫ (ψ_i A ψ_j′ − A ψ_i′ ψ_j) dz: Hamilton's equation for ż.
    pub velocity: f64,
    /// The mean force −∂H/∂z, interfaces and walls included: it vanishes in a stationary state.
    pub force: f64,
    /// ½⟨[z, [H, z]]⟩ = ⟨A⟩: the oscillator-strength sum rule with the mass that depends on position.
    pub sum_rule: f64,
    /// States returned, and states counted by inertia up to just above the last.
    pub returned: usize,
    pub counted: usize,
}

/// Velocity elements below this part of the largest possible are those of states that lie apart. Vectors hold 1e-12 of
/// other levels at most, which times the height of a stack would be seen in them.
const APART: f64 = 1e-5;
/// A deviation above this is reported as a fault.
pub const FAULT: f64 = 1e-5;

impl Audit {
    /// Of nothing at all.
    pub const CLEAN: Audit = Audit {
        orthonormality: 0.0,
        velocity: 0.0,
        force: 0.0,
        sum_rule: 0.0,
        returned: 0,
        counted: 0,
    };

    /// The worst of two, states added up.
    pub fn with(self, other: Audit) -> Audit {
        Audit {
            orthonormality: self.orthonormality.max(other.orthonormality),
            velocity: self.velocity.max(other.velocity),
            force: self.force.max(other.force),
            sum_rule: self.sum_rule.max(other.sum_rule),
            returned: self.returned + other.returned,
            counted: self.counted + other.counted,
        }
    }

    /// What is off, in words; empty when all is well.
    pub fn faults(&self) -> Vec<String> {
        let checks = [
            ("the states are not orthonormal", self.orthonormality),
            ("velocity and position do not agree", self.velocity),
            ("the mean force does not vanish", self.force),
            ("the oscillator-strength sum rule is missed", self.sum_rule),
        ];
        let mut faults: Vec<String> = checks
            .iter()
            .filter(|(_, deviation)| deviation.is_nan() || *deviation > FAULT)
            .map(|(what, deviation)| format!("{what} (relative {deviation:.1e})"))
            .collect();
        if self.returned != self.counted {
            faults.push(format!(
                "{} states were found where {} are counted",
                self.returned, self.counted
            ));
        }
        faults
    }
}

/// Nodal values of a state and of its slope, element by element.
struct Envelope {
    values: Vec<f64>,
    slopes: Vec<f64>,
}

pub(super) fn audit(subbands: &Subbands) -> Audit {
    let Subbands { pencil, pairs, .. } = subbands;
    let envelopes: Vec<Envelope> = pairs
        .iter()
        .map(|pair| envelope(pencil, &pair.vector))
        .collect();
    let mut audit = Audit {
        returned: pairs.len(),
        counted: pairs.len(),
        ..Audit::CLEAN
    };
    for (i, pair) in pairs.iter().enumerate() {
        for (j, other) in pairs.iter().enumerate().skip(i) {
            let inner = pencil.inner(pair.value, &pair.vector, other.value, &other.vector);
            audit.orthonormality = audit
                .orthonormality
                .max((inner - f64::from(u8::from(i == j))).abs());
            if i != j {
                audit.velocity = audit
                    .velocity
                    .max(velocity_deviation(subbands, &envelopes, i, j));
            }
        }
        audit.force = audit.force.max(force_deviation(subbands, &envelopes[i], i));
        audit.sum_rule = audit
            .sum_rule
            .max(sum_rule_deviation(subbands, &envelopes[i], i));
    }
    if let Some(last) = pairs.last() {
        let clear = 1e-9 * (last.value - pencil.floor()) + 1e-12;
        audit.counted = count_below(pencil, last.value + clear);
        // A degenerate partner just above the last state is not missing.
        if audit.counted > pairs.len() && count_below(pencil, last.value - clear) < pairs.len() {
            audit.counted = pairs.len();
        }
    }
    audit
}

fn envelope(pencil: &Pencil, vector: &[f64]) -> Envelope {
    let reference = pencil.mesh.reference;
    let p = reference.order;
    let mut buffer = [0.0; MAX_ORDER + 1];
    let (mut values, mut slopes) = (Vec::new(), Vec::new());
    for (e, element) in pencil.mesh.elements.iter().enumerate() {
        let local = pencil.mesh.local(e, vector);
        reference.slopes(local, &mut buffer[..=p]);
        values.extend_from_slice(local);
        slopes.extend(buffer[..=p].iter().map(|s| s * 2.0 / element.length));
    }
    Envelope { values, slopes }
}

fn velocity_deviation(subbands: &Subbands, envelopes: &[Envelope], i: usize, j: usize) -> f64 {
    let Subbands { pencil, pairs, .. } = subbands;
    let count = pencil.mesh.order() + 1;
    let (e_i, e_j) = (pairs[i].value, pairs[j].value);
    let (mut size, mut most) = (0.0, 0.0);
    let velocity = integrate(&pencil.mesh, |e, q| {
        let (k, at) = (e * count + q, &pencil.at(e)[q]);
        let forward = envelopes[i].values[k] * at.a(e_j) * envelopes[j].slopes[k];
        let backward = envelopes[i].slopes[k] * at.a(e_i) * envelopes[j].values[k];
        let weight = 0.5 * pencil.mesh.elements[e].length * pencil.mesh.reference.weights[q];
        size += weight * (forward.abs() + backward.abs());
        most += weight * (at.a(e_j) * envelopes[j].slopes[k]).powi(2);
        forward - backward
    });
    // Of states in places far apart only rounding is left: it is set against what states in one place could have.
    let size = size.max(APART * most.sqrt());
    (velocity - (e_j - e_i) * moment(pencil, &pairs[i], &pairs[j])).abs() / size
}

/// ⟨zψ| T(E) |zψ⟩ = ∫ A ψ² dz, z from the state's centre.
fn sum_rule_deviation(subbands: &Subbands, envelope: &Envelope, index: usize) -> f64 {
    let Subbands { pencil, pairs, .. } = subbands;
    let count = pencil.mesh.order() + 1;
    let energy = pairs[index].value;
    let centre = moment(pencil, &pairs[index], &pairs[index]);
    let mut size = 0.0;
    let difference = integrate(&pencil.mesh, |e, q| {
        let (k, at) = (e * count + q, &pencil.at(e)[q]);
        let element = &pencil.mesh.elements[e];
        let z = pencil.mesh.position(element, q) - centre;
        let (value, a) = (envelope.values[k], at.a(energy));
        let raised = value + z * envelope.slopes[k];
        size += 0.5
            * element.length
            * pencil.mesh.reference.weights[q]
            * a
            * (raised * raised + value * value);
        a * raised * raised + (at.constant - energy) * (z * value).powi(2) - a * value * value
    });
    difference.abs() / size
}

/// d/dz (A ψ′² + (E − C) ψ²) = (A ψ′)² (1/A)′ − C′ ψ², summed over the stack with its jumps and set against the walls.
fn force_deviation(subbands: &Subbands, envelope: &Envelope, index: usize) -> f64 {
    let Subbands { pencil, pairs, .. } = subbands;
    let reference = pencil.mesh.reference;
    let p = reference.order;
    let energy = pairs[index].value;
    let edges = edge_fluxes(subbands, index);
    let (mut sum, mut size) = (0.0, 0.0);
    let mut add = |term: f64| {
        sum += term;
        size += term.abs();
    };
    let (mut softness, mut constant) = ([0.0; MAX_ORDER + 1], [0.0; MAX_ORDER + 1]);
    let (mut softness_slope, mut constant_slope) = ([0.0; MAX_ORDER + 1], [0.0; MAX_ORDER + 1]);
    for e in 0..pencil.mesh.elements.len() {
        let nodes = pencil.at(e);
        for (q, at) in nodes.iter().enumerate() {
            softness[q] = 1.0 / at.a(energy);
            constant[q] = at.constant;
        }
        reference.slopes(&softness[..=p], &mut softness_slope[..=p]);
        reference.slopes(&constant[..=p], &mut constant_slope[..=p]);
        for q in 0..=p {
            let k = e * (p + 1) + q;
            let flux = nodes[q].a(energy) * envelope.slopes[k];
            // Half the length from the quadrature and its inverse from the slopes cancel.
            let inside =
                flux * flux * softness_slope[q] - envelope.values[k].powi(2) * constant_slope[q];
            add(reference.weights[q] * inside);
        }
        if e + 1 < pencil.mesh.elements.len() {
            let k = e * (p + 1) + p;
            let (below, above) = (&nodes[p], &pencil.at(e + 1)[0]);
            let (a_below, a_above) = (below.a(energy), above.a(energy));
            let flux = 0.5 * (edges[e].1 + edges[e + 1].0);
            add(flux * flux * (1.0 / a_above - 1.0 / a_below)
                - (above.constant - below.constant) * envelope.values[k].powi(2));
        }
    }
    let [lower, upper] = wall_pressures(subbands, index);
    add(lower);
    add(-upper);
    // The last scale keeps a force-free stack (a wide tail at rest) from dividing rounding by nothing.
    sum.abs() / size.max(1e-9)
}
