//! Minibands of a period that is repeated for ever: energies against the Bloch phase φ = q d, masses along growth from
//! exact second derivatives, and transitions at the centre and the border of the minizone.
//!
//! In one dimension each miniband rises or falls from φ = 0 to φ = π (Kohn, Phys. Rev. 115, 809 (1959)), so its edges are
//! its energies there. Momentum from the velocity: ⟨i|∂H/∂k|j⟩ = ∫ (ψ_i* A ψ_j′ − A ψ_i*′ ψ_j) dz up to a factor i, which in
//! a bounded stack is (E_j − E_i) ⟨i|z|j⟩; so z means this element over the energy.

use super::cell::Cell;
use crate::constants::{H_EV_PER_THZ, HBAR2_OVER_2M0, HC_EV_UM};
use crate::models::{Band, BandOperator};
use crate::numerics::mesh::Mesh;
use crate::numerics::pencil::Pencil;
use crate::numerics::quadrature::MAX_ORDER;
use crate::numerics::quasiperiodic::{Condensed, Wave, bracket, level};
use crate::subbands::{self, Accuracy, InPlaneNodes, pieces_up_to};
use std::f64::consts::PI;

/// A gap below this is none: no more is known of two energies that are each exact to a hundredth of a µeV.
pub const NO_GAP_EV: f64 = 2e-8;
/// The same for levels so high above the floor that rounding is more.
fn smallest_gap_ev(above_floor_ev: f64) -> f64 {
    NO_GAP_EV.max(1e-9 * above_floor_ev)
}

/// A miniband narrower than this is flat: rounding leaves nothing of its masses.
pub const FLAT_EV: f64 = 1e-11;
/// Orders of the elements, each with the one that tells its error.
const ORDERS: [[usize; 2]; 2] = [[8, 10], [12, 14]];
/// Halvings of the elements after which the error that is reached is reported as it is.
const MOST_HALVINGS: usize = 4;
/// Where states are taken of minibands that touch: this phase off the touching point.
const INSIDE: f64 = 1e-2;
/// Phases from the centre to the border of the minizone at which in-plane masses are taken for the density of states.
pub(super) const SAMPLES: usize = 64;

/// A place of the minizone.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Zone {
    Centre,
    Border,
}

impl Zone {
    pub fn phase(self) -> f64 {
        match self {
            Zone::Centre => 0.0,
            Zone::Border => PI,
        }
    }
}

/// One edge of a miniband.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Edge {
    /// On the absolute scale.
    pub energy_ev: f64,
    pub error_ev: f64,
    pub zone: Zone,
    /// ħ²/(∂²E/∂q²) in free-electron masses, for holes that of the hole: negative at the edge far from the band gap.
    /// `None` where the miniband touches its neighbour, or is flat.
    pub mass_m0: Option<f64>,
    /// Whether the miniband touches its neighbour here.
    pub touching: bool,
    /// 1/m∥ is the mean of 1/m(E, z) in the state.
    pub in_plane_mass_m0: f64,
}

/// A miniband.
#[derive(Clone, Debug, PartialEq)]
pub struct Miniband {
    /// The edge nearer to the band gap, and the other.
    pub edges: [Edge; 2],
    /// To the next miniband, counted away from the band gap.
    pub gap_ev: f64,
    /// The layer that holds most of the state at the nearer edge, and how much of it.
    pub layer: usize,
    pub layer_share: f64,
}

impl Miniband {
    pub fn width_ev(&self) -> f64 {
        (self.edges[1].energy_ev - self.edges[0].energy_ev).abs()
    }
}

/// A pair of minibands at the centre or the border of the minizone, `from` nearer to the band gap; from 0.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MinibandTransition {
    pub from: usize,
    pub to: usize,
    pub zone: Zone,
    pub energy_ev: f64,
    /// |⟨from|∂H/∂k|to⟩| / energy.
    pub dipole_nm: f64,
    /// 2 m₀ E |z|²/ħ².
    pub oscillator_strength: f64,
    /// 2 |p|²/m₀, in eV.
    pub momentum_ev: f64,
}

impl MinibandTransition {
    pub fn wavelength_um(&self) -> f64 {
        HC_EV_UM / self.energy_ev
    }
}

/// Relative deviations of what must hold, the worst over the minibands.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ZoneAudit {
    /// The mean velocity of a state against ∂E/∂ħq, half-way to the border.
    pub velocity: f64,
    /// Overlaps of different states at the centre.
    pub orthonormality: f64,
    /// Whether the levels counted in every gap are the minibands below it.
    pub counted: bool,
}

/// A deviation above this is a fault.
const FAULT: f64 = 1e-5;

impl ZoneAudit {
    /// What is off, in words; empty when all is well.
    pub fn faults(&self) -> Vec<String> {
        let mut faults = Vec::new();
        for (what, deviation) in [
            (
                "velocity and slope of a miniband do not agree",
                self.velocity,
            ),
            ("the states are not orthonormal", self.orthonormality),
        ] {
            if deviation.is_nan() || deviation > FAULT {
                faults.push(format!("{what} (relative {deviation:.1e})"));
            }
        }
        if !self.counted {
            faults.push("the levels counted in a gap are not the minibands below it".to_owned());
        }
        faults
    }
}

/// The minibands of one band, those nearest to its gap first.
#[derive(Clone, Debug)]
pub struct Minibands {
    pub band: Band,
    pub period_nm: f64,
    pub minibands: Vec<Miniband>,
    pub transitions: Vec<MinibandTransition>,
    pub audit: ZoneAudit,
    /// The band's edge nearest to its gap.
    pub edge_ev: f64,
    pub(super) pencil: Pencil,
    /// ħ²/2m∥ at the nodes of each element, where it is not the pencil's A.
    in_plane: InPlaneNodes,
    /// Of one miniband more than is listed, in the solver's sign: at the centre and at the border.
    pub(super) levels: Vec<[f64; 2]>,
}

/// A miniband against the phase.
#[derive(Clone, Debug)]
pub struct Dispersed {
    pub energies_ev: Vec<f64>,
    /// Group velocity in m/s.
    pub velocities_m_s: Vec<f64>,
}

/// The `count` minibands nearest to the gap of a band.
pub fn minibands(operator: &BandOperator, count: usize, accuracy: Accuracy) -> Minibands {
    let cell = Cell::new(operator);
    let solved = solve(&cell, count, accuracy);
    let sign = operator.band().sign();
    let mut waves = [Vec::new(), Vec::new()];
    let mut edges: Vec<[Edge; 2]> = Vec::new();
    let pencil = &solved.pencil;
    let own = subbands::in_plane(operator, pencil, |element, q| {
        cell.place(&pencil.mesh, element, q)
    });
    let in_plane = |wave: &Wave| {
        let along = in_plane_mean(&solved.pencil, &own, wave);
        HBAR2_OVER_2M0 / along
    };
    let period_nm: f64 = cell.lengths_nm.iter().sum();
    for band in 0..count {
        let pair = [0, 1].map(|at| {
            let zone = [Zone::Centre, Zone::Border][at];
            let value = solved.levels[band][at];
            let below = band.checked_sub(1).map(|b| value - solved.levels[b][at]);
            let above = solved.levels[band + 1][at] - value;
            let smallest_ev = smallest_gap_ev(value - solved.pencil.floor());
            let touching = below.is_some_and(|gap| gap < smallest_ev) || above < smallest_ev;
            let condensed = Condensed::at(&solved.pencil, value);
            let wave = if touching {
                // The two states are not told apart here, but are a little inside.
                let phase = (zone.phase() - INSIDE).abs();
                let near = level(&solved.pencil, band + 1, phase, solved.range);
                Condensed::at(&solved.pencil, near).wave(near, phase)
            } else {
                condensed.wave(value, zone.phase())
            };
            let flat = (solved.levels[band][0] - solved.levels[band][1]).abs() < FLAT_EV;
            let curvature = condensed.curvature(zone.phase()) * period_nm * period_nm;
            let mass = 2.0 * HBAR2_OVER_2M0 / curvature;
            let edge = Edge {
                energy_ev: sign * value,
                error_ev: solved.errors_ev[band][at],
                zone,
                touching,
                mass_m0: (!touching && !flat && mass.is_finite()).then_some(mass),
                in_plane_mass_m0: in_plane(&wave),
            };
            waves[at].push(wave);
            edge
        });
        let [centre, border] = pair;
        let falls = solved.levels[band][0] > solved.levels[band][1];
        edges.push(if falls {
            [border, centre]
        } else {
            [centre, border]
        });
    }
    let nearest = |band: usize| solved.levels[band][0].min(solved.levels[band][1]);
    let minibands = edges.iter().enumerate().map(|(band, edges)| {
        let at = usize::from(edges[0].zone == Zone::Border);
        let far = sign * edges[1].energy_ev;
        let gap_ev = nearest(band + 1) - far;
        let smallest_ev = smallest_gap_ev(far - solved.pencil.floor());
        let (layer, layer_share) = fullest_layer(&cell, &solved.pencil, &waves[at][band]);
        Miniband {
            edges: *edges,
            gap_ev: if gap_ev < smallest_ev { 0.0 } else { gap_ev },
            layer,
            layer_share,
        }
    });
    let minibands: Vec<Miniband> = minibands.collect();
    let mut transitions = Vec::new();
    for (at, zone) in [Zone::Centre, Zone::Border].into_iter().enumerate() {
        let touches = |band: usize| {
            edges[band]
                .iter()
                .any(|edge| edge.zone == zone && edge.touching)
        };
        for from in 0..count {
            for to in from + 1..count {
                if touches(from) || touches(to) {
                    continue;
                }
                let (lower, upper) = (&waves[at][from], &waves[at][to]);
                let energy_ev = upper.value - lower.value;
                let velocity = velocity(&solved.pencil, lower, upper);
                if !velocity.is_finite() {
                    // A period far below an atom's size: its waves are lost in rounding.
                    continue;
                }
                let dipole_nm = velocity.abs() / energy_ev;
                transitions.push(MinibandTransition {
                    from,
                    to,
                    zone,
                    energy_ev,
                    dipole_nm,
                    oscillator_strength: energy_ev * dipole_nm * dipole_nm / HBAR2_OVER_2M0,
                    momentum_ev: velocity * velocity / HBAR2_OVER_2M0,
                });
            }
        }
    }
    let mut found = Minibands {
        band: operator.band(),
        period_nm,
        edge_ev: sign * solved.pencil.floor(),
        audit: ZoneAudit {
            velocity: 0.0,
            orthonormality: 0.0,
            counted: true,
        },
        minibands,
        transitions,
        pencil: solved.pencil,
        in_plane: own,
        levels: solved.levels,
    };
    found.audit = found.audited(&waves[0]);
    found
}

struct Solved {
    pencil: Pencil,
    levels: Vec<[f64; 2]>,
    errors_ev: Vec<[f64; 2]>,
    /// Holds all of these levels.
    range: [f64; 2],
}

/// The levels at the centre and the border, of one miniband more than asked for, on a mesh that is fine enough.
fn solve(cell: &Cell, count: usize, accuracy: Accuracy) -> Solved {
    let segments = cell.lengths_nm.len();
    let sample = cell.pencil(Mesh::new(&cell.lengths_nm, &vec![1; segments], 2));
    let mut pieces = pieces_up_to(&sample, sample.weyl_estimate(count as f64 + 2.0));
    let mut halvings = 0;
    loop {
        for orders in ORDERS {
            let [coarse, fine] = orders.map(|order| {
                let pencil = cell.pencil(Mesh::new(&cell.lengths_nm, &pieces, order));
                let range = bracket(&pencil, count + 1);
                let levels: Vec<[f64; 2]> = (1..=count + 1)
                    .map(|k| {
                        [Zone::Centre, Zone::Border]
                            .map(|zone| level(&pencil, k, zone.phase(), range))
                    })
                    .collect();
                (pencil, levels, range)
            });
            let errors_ev: Vec<[f64; 2]> = coarse
                .1
                .iter()
                .zip(&fine.1)
                .map(|(a, b)| [0, 1].map(|at| (a[at] - b[at]).abs()))
                .collect();
            let listed = errors_ev[..count].iter().flatten();
            let exact = listed.into_iter().all(|e| *e <= accuracy.tolerance_ev);
            if exact || (halvings == MOST_HALVINGS && orders == ORDERS[1]) {
                return Solved {
                    pencil: fine.0,
                    levels: fine.1,
                    errors_ev,
                    range: fine.2,
                };
            }
        }
        pieces.iter_mut().for_each(|n| *n *= 2);
        halvings += 1;
    }
}

impl Minibands {
    /// Every miniband at these phases, each from 0 to π.
    pub fn dispersed(&self, phases: &[f64]) -> Vec<Dispersed> {
        let sign = self.band.sign();
        // From eV nm to m/s: over ħ in eV s, and nm to m.
        let to_m_s = 1e-9 * 1e12 * 2.0 * PI / H_EV_PER_THZ;
        let bands = 0..self.minibands.len();
        bands
            .map(|band| {
                let mut dispersed = Dispersed {
                    energies_ev: Vec::new(),
                    velocities_m_s: Vec::new(),
                };
                for &phase in phases {
                    let value = self.value(band, phase);
                    dispersed.energies_ev.push(sign * value);
                    let slope = match phase {
                        p if p <= 0.0 || p >= PI => 0.0,
                        p => Condensed::at(&self.pencil, value).slope(p),
                    };
                    dispersed
                        .velocities_m_s
                        .push(sign * slope * self.period_nm * to_m_s);
                }
                dispersed
            })
            .collect()
    }

    /// A miniband's level at a phase, in the solver's sign.
    fn value(&self, band: usize, phase: f64) -> f64 {
        let [centre, border] = self.levels[band];
        if phase <= 0.0 {
            return centre;
        }
        if phase >= PI {
            return border;
        }
        let spare = 1e-9 + 1e-6 * (centre - border).abs();
        let range = [centre.min(border) - spare, centre.max(border) + spare];
        level(&self.pencil, band + 1, phase, range)
    }

    /// The in-plane mass of a miniband at a phase.
    pub(super) fn in_plane_mass_m0(&self, band: usize, phase: f64) -> f64 {
        let value = self.value(band, phase);
        let wave = Condensed::at(&self.pencil, value).wave(value, phase);
        HBAR2_OVER_2M0 / in_plane_mean(&self.pencil, &self.in_plane, &wave)
    }

    fn audited(&self, centre: &[Wave]) -> ZoneAudit {
        let mut audit = ZoneAudit {
            velocity: 0.0,
            orthonormality: 0.0,
            counted: true,
        };
        let phase = 0.5 * PI;
        for band in 0..self.minibands.len() {
            let value = self.value(band, phase);
            let condensed = Condensed::at(&self.pencil, value);
            let wave = condensed.wave(value, phase);
            let slope = condensed.slope(phase) * self.period_nm;
            let (mean, size) = mean_velocity(&self.pencil, &wave);
            audit.velocity = audit.velocity.max((mean - slope).abs() / size);
            let miniband = &self.minibands[band];
            if miniband.gap_ev > 0.0 {
                let edge = self.band.sign() * miniband.edges[1].energy_ev;
                let inside = Condensed::at(&self.pencil, edge + 0.5 * miniband.gap_ev);
                audit.counted &= [0.0, PI].iter().all(|p| inside.count(*p) == band + 1);
            }
            let touches = |band: usize| {
                let edges = &self.minibands[band].edges;
                edges.iter().any(|edge| edge.touching)
            };
            for other in 0..band {
                if !touches(band) && !touches(other) {
                    let (a, b) = (&centre[band], &centre[other]);
                    let overlap = self.pencil.inner(a.value, &a.real, b.value, &b.real);
                    audit.orthonormality = audit.orthonormality.max(overlap.abs());
                }
            }
        }
        audit
    }
}

/// Calls `visit` with every node's weight, element and number, and the values and slopes of two waves' parts there.
fn for_each_node(
    pencil: &Pencil,
    [x, y]: [&[f64]; 2],
    mut visit: impl FnMut(f64, usize, usize, [f64; 2], [f64; 2]),
) {
    let reference = pencil.mesh.reference;
    let p = reference.order;
    let (mut x_slopes, mut y_slopes) = ([0.0; MAX_ORDER + 1], [0.0; MAX_ORDER + 1]);
    for (e, element) in pencil.mesh.elements.iter().enumerate() {
        let (x, y) = (pencil.mesh.local(e, x), pencil.mesh.local(e, y));
        reference.slopes(x, &mut x_slopes[..=p]);
        reference.slopes(y, &mut y_slopes[..=p]);
        let scale = 2.0 / element.length;
        for q in 0..=p {
            let weight = 0.5 * element.length * reference.weights[q];
            let slopes = [scale * x_slopes[q], scale * y_slopes[q]];
            visit(weight, e, q, [x[q], y[q]], slopes);
        }
    }
}

/// ∫ (ψ_i A ψ_j′ − A ψ_i′ ψ_j) dz of two real waves, in eV nm.
fn velocity(pencil: &Pencil, i: &Wave, j: &Wave) -> f64 {
    let mut sum = 0.0;
    for_each_node(pencil, [&i.real, &j.real], |w, e, q, values, slopes| {
        let at = &pencil.at(e)[q];
        sum += w * (values[0] * at.a(j.value) * slopes[1] - slopes[0] * at.a(i.value) * values[1]);
    });
    sum
}

/// ⟨∂H/∂k⟩ = 2 ∫ A Im(ψ* ψ′) dz, and the same with all terms taken positive, in eV nm.
fn mean_velocity(pencil: &Pencil, wave: &Wave) -> (f64, f64) {
    let (mut sum, mut size) = (0.0, 0.0);
    for_each_node(pencil, [&wave.real, &wave.imaginary], |w, e, q, v, s| {
        let a = w * 2.0 * pencil.at(e)[q].a(wave.value);
        sum += a * (v[0] * s[1] - v[1] * s[0]);
        size += a * ((v[0] * s[1]).abs() + (v[1] * s[0]).abs());
    });
    (sum, size.max(f64::MIN_POSITIVE))
}

/// The mean of ħ²/2m∥ in a wave, in eV nm².
fn in_plane_mean(pencil: &Pencil, own: &InPlaneNodes, wave: &Wave) -> f64 {
    let nodes = pencil.mesh.order() + 1;
    let mut sum = 0.0;
    for_each_node(pencil, [&wave.real, &wave.imaginary], |w, e, q, v, _| {
        let own = own.as_ref().and_then(|list| list[e * nodes + q].as_ref());
        let along = own.map_or_else(
            || pencil.at(e)[q].a(wave.value),
            |in_plane| in_plane.at(wave.value),
        );
        sum += w * along * (v[0] * v[0] + v[1] * v[1]);
    });
    sum
}

/// The layer with the largest share of a wave, all components together.
fn fullest_layer(cell: &Cell, pencil: &Pencil, wave: &Wave) -> (usize, f64) {
    let mut shares = vec![0.0; cell.layers()];
    for_each_node(pencil, [&wave.real, &wave.imaginary], |w, e, q, v, s| {
        let element = &pencil.mesh.elements[e];
        let (layer, _) = cell.place(&pencil.mesh, element, q);
        let b = pencil.at(e)[q].divided(wave.value, wave.value);
        shares[layer] += w * (v[0] * v[0] + v[1] * v[1] + b * (s[0] * s[0] + s[1] * s[1]));
    });
    let largest = shares.iter().copied().enumerate();
    largest
        .max_by(|a, b| a.1.total_cmp(&b.1))
        .unwrap_or((0, 0.0))
}
