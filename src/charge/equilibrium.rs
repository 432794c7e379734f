//! The loop from potential to states to charge to potential, until they agree.

use super::ChargeError;
use super::anderson::Anderson;
use super::contact::contact_fermi_ev;
use super::dopants::{Dopants, Site, levels_of_dopants};
use super::exchange::exchange_ev;
use super::fermi::{density_of_states, root_of_falling};
use super::poisson::{Filled, Poisson};
use crate::constants::{BOLTZMANN_EV_PER_K, E2_OVER_EPSILON_0, NM2_PER_CM2, NM3_PER_CM3};
use crate::models::{Band, BandOperator};
use crate::numerics::boundary_value::BoundaryValue;
use crate::numerics::eigenpairs::count_below;
use crate::numerics::mesh::Mesh;
use crate::structure::{Bending, Charge, Potential, Stack};
use crate::subbands::{self, Accuracy, Bands, Subbands, amplitudes, in_plane_mass_m0, on_mesh};
use std::sync::Arc;

/// Potentials that change by less have settled, in eV.
const SETTLED_EV: f64 = 1e-9;
const MAX_ITERATIONS: usize = 120;
/// Subbands are solved up to this many kT above the Fermi level, where they hold 1e-12 of a filled one.
const REACH_KT: f64 = 28.0;
/// No band is solved for more subbands.
const MAX_SUBBANDS: usize = 120;
/// The last of them must lie this many kT above the Fermi level: 1e-3 of a filled one is then the most that it holds.
const CUT_OFF_KT: f64 = 7.0;
/// The polynomials on which states, charge and potential meet.
const ORDER: usize = 12;
/// The levels of filled subbands are this exact on the mesh of the loop, in eV.
const MESH_TOLERANCE_EV: f64 = 1e-9;
const MAX_REFINEMENTS: usize = 3;
/// Subbands with less than this part of the carriers need no finer mesh.
const EMPTY: f64 = 1e-9;
/// The bent stack is solved this much finer than asked, for the audit of its states.
const FINER: f64 = 0.1;
/// Electron subbands beyond those of the loop: absorption into them takes part in its depolarisation.
const EMPTY_SUBBANDS: usize = 6;
/// Dopants and carriers that differ by this part are out of balance: far more than a settled potential leaves.
const UNBALANCED: f64 = 1e-8;

/// A stack with its potential, and the states in it.
#[derive(Clone, Debug)]
pub struct Solution {
    /// Carries the potential, counted from the bottom face.
    pub stack: Stack,
    pub bands: Bands,
    /// `None` where the bands stay flat.
    pub equilibrium: Option<Equilibrium>,
}

/// How dopants and carriers make up for each other.
#[derive(Clone, Debug)]
pub struct Equilibrium {
    pub fermi_ev: f64,
    /// Carriers of each solved subband in cm⁻², band by band as in the solution's bands.
    pub densities_cm2: Vec<Vec<f64>>,
    pub electrons_cm2: f64,
    pub holes_cm2: f64,
    pub ionised_donors_cm2: f64,
    pub ionised_acceptors_cm2: f64,
    /// Slopes of an electron's potential energy at the bottom and the top, the applied field included, in V/nm.
    pub end_fields_v_per_nm: [f64; 2],
    /// (N_D⁺ + p − n − N_A⁻)/(N_D⁺ + N_A⁻), what end faces carry left out: 0 where the Fermi level follows from neutrality.
    pub imbalance: f64,
    /// Whether the Fermi level follows from neutrality.
    pub is_neutral: bool,
    pub iterations: usize,
    /// By how much the potential still changed in the last iteration, in eV.
    pub residual_ev: f64,
    /// The largest part of all carriers in the last subband that was solved of a band.
    pub beyond: f64,
}

impl Equilibrium {
    pub fn is_settled(&self) -> bool {
        self.residual_ev <= SETTLED_EV && !(self.is_neutral && self.imbalance.abs() > UNBALANCED)
    }
}

/// Solves the bands of a stack, bent by charge where the file says so. A potential that the stack carries is where the
/// loop starts.
///
/// # Errors
/// When a layer does not suit the models or has no permittivity, when bands are coupled, when no carriers can make the stack neutral, or when its
/// contact has no Fermi level. A loop that did not settle is no error: see [`Equilibrium::is_settled`].
pub fn solve(
    stack: &Stack,
    charge: &Charge,
    asked: &[(Band, usize)],
    accuracy: Accuracy,
) -> Result<Solution, ChargeError> {
    let unsuitable = |(layer, reason)| ChargeError::Unsuitable { layer, reason };
    let Charge::Bent(bending) = charge else {
        return Ok(Solution {
            stack: stack.clone(),
            bands: Bands::solve(stack, asked, accuracy).map_err(unsuitable)?,
            equilibrium: None,
        });
    };
    if asked.iter().any(|(band, _)| band.coupled().is_some()) {
        return Err(ChargeError::Coupled);
    }
    let mut bare = stack.clone();
    bare.potential = None;
    let mut counts: Vec<usize> = asked.iter().map(|(_, count)| *count).collect();
    let mut problem = Problem::new(&bare, bending, asked, &counts, 0)?;
    let mut state = problem.start(stack.potential.as_deref());
    let mut anderson = Anderson::new();
    let mut refinements = 0;
    let (mut iterations, mut residual_ev) = (0, f64::INFINITY);
    let mut fermi_ev = problem.fixed_fermi_ev.unwrap_or(0.0);
    while iterations < MAX_ITERATIONS && residual_ev > SETTLED_EV {
        iterations += 1;
        let bent = problem.bent(&state);
        let (solved, filled) = problem.levels(&bent, &state, &mut counts)?;
        fermi_ev = problem.fermi_ev(&filled, &state)?;
        if problem.fixed_fermi_ev.is_none() && problem.is_cut_off(&solved, fermi_ev) {
            return Err(ChargeError::TooManySubbands { most: MAX_SUBBANDS });
        }
        if refinements < MAX_REFINEMENTS && problem.too_coarse(&solved, &filled, fermi_ev) {
            refinements += 1;
            problem = Problem::new(&bare, bending, asked, &counts, refinements)?;
            state = problem.start(bent.potential.as_deref());
            anderson = Anderson::new();
            continue;
        }
        let (mut next, moved_ev) = problem.next(&solved, &filled, &state, fermi_ev);
        fermi_ev -= moved_ev;
        let change: Vec<f64> = next.iter().zip(&state).map(|(n, s)| n - s).collect();
        residual_ev = change.iter().fold(0.0_f64, |most, c| most.max(c.abs()));
        if !residual_ev.is_finite() {
            break;
        }
        if residual_ev > SETTLED_EV {
            next = anderson.next(&state, &change);
        }
        state = next;
    }
    // Energies count from the bottom face.
    let shift_ev = problem.u(&state)[0];
    for value in &mut state[..problem.mesh.node_count()] {
        *value -= shift_ev;
    }
    let stack = problem.bent(&state);
    let more: Vec<(Band, usize)> = asked
        .iter()
        .zip(&counts)
        .map(|((band, _), count)| {
            let empty = if band.sign() > 0.0 { EMPTY_SUBBANDS } else { 0 };
            (*band, count + empty)
        })
        .collect();
    // Bent edges ask more of the states than their energies tell.
    let finer = Accuracy {
        tolerance_ev: FINER * accuracy.tolerance_ev,
    };
    let bands = Bands::solve(&stack, &more, finer).map_err(unsuitable)?;
    let filled: Vec<Vec<Filled>> = bands.alone().map(without_parts).collect();
    let all: Vec<Filled> = filled.concat();
    let fermi_ev = match problem.fixed_fermi_ev {
        Some(fixed) => fixed - shift_ev,
        None => problem
            .fermi_ev(&all, &state)
            .unwrap_or(fermi_ev - shift_ev),
    };
    if bands.alone().zip(&filled).any(|(band, own)| {
        own.len() >= MAX_SUBBANDS && problem.is_cut_off(std::slice::from_ref(band), fermi_ev)
    }) {
        return Err(ChargeError::TooManySubbands { most: MAX_SUBBANDS });
    }
    let equilibrium = problem.equilibrium(&filled, &state, fermi_ev, (iterations, residual_ev));
    Ok(Solution {
        stack,
        bands,
        equilibrium: Some(equilibrium),
    })
}

/// The states of a band, their places left out.
fn without_parts(solved: &Subbands) -> Vec<Filled> {
    let of = |index: usize| Filled {
        sign: solved.band.sign(),
        density_of_states: density_of_states(in_plane_mass_m0(solved, index)),
        level_ev: solved.pairs[index].value,
        parts: Vec::new(),
    };
    (0..solved.pairs.len()).map(of).collect()
}

/// Everything that stays while the potential changes.
///
/// A state of the loop is a list: u at the nodes and, with exchange, the energy of exchange at the nodes of each element.
struct Problem<'s> {
    stack: &'s Stack,
    bending: &'s Bending,
    asked: &'s [(Band, usize)],
    mesh: Mesh,
    poisson: Poisson,
    /// Mass and permittivity at the nodes of each element, for exchange.
    matter: Vec<(f64, f64)>,
    /// Relative permittivities at both ends.
    end_permittivities: [f64; 2],
    /// The Fermi level where a contact or a surface gives it.
    fixed_fermi_ev: Option<f64>,
    /// u at the upper end where it is held.
    top_ev: f64,
}

impl<'s> Problem<'s> {
    fn new(
        stack: &'s Stack,
        bending: &'s Bending,
        asked: &'s [(Band, usize)],
        counts: &[usize],
        refinements: usize,
    ) -> Result<Self, ChargeError> {
        let unsuitable = |(layer, reason)| ChargeError::Unsuitable { layer, reason };
        let mut pieces = vec![1; stack.layers.len()];
        for ((band, _), count) in asked.iter().zip(counts) {
            let operator = BandOperator::new(stack, *band).map_err(unsuitable)?;
            for (own, needed) in pieces.iter_mut().zip(subbands::pieces(&operator, *count)) {
                *own = needed.max(*own);
            }
        }
        pieces.iter_mut().for_each(|own| *own <<= refinements);
        let lengths: Vec<f64> = stack.layers.iter().map(|layer| layer.width_nm).collect();
        let mesh = Mesh::new(&lengths, &pieces, ORDER);
        let conduction = asked
            .iter()
            .map(|(band, _)| *band)
            .find(|band| band.sign() > 0.0)
            .ok_or(ChargeError::NotNeutral)?;
        let operator = BandOperator::new(stack, conduction).map_err(unsuitable)?;
        let mut matter = Vec::new();
        let mut permittivities = Vec::new();
        let mut donors = Vec::new();
        let mut acceptors = Vec::new();
        let mut edges_ev = Vec::new();
        for (e, element) in mesh.elements.iter().enumerate() {
            let layer = &stack.layers[element.segment];
            let uniform = stack.is_uniform(element.segment);
            let bottom = stack.material_at(element.segment, 0.0);
            for q in 0..=ORDER {
                let t = mesh.fraction(element, q);
                let material = if uniform {
                    bottom.clone()
                } else {
                    stack.material_at(element.segment, t)
                };
                let permittivity = material
                    .permittivity_static
                    .filter(|value| *value > 0.0)
                    .ok_or(ChargeError::NoPermittivity {
                        layer: element.segment,
                    })?;
                let z_nm = mesh.position(element, q);
                let edge_ev = operator.at(element.segment, t, z_nm).constant;
                let levels_ev = levels_of_dopants(bending, &material, stack, edge_ev);
                let volume = 0.5 * element.length * mesh.reference.weights[q] / NM3_PER_CM3;
                let node = e * ORDER + q;
                for (sites, density, level_ev) in [
                    (&mut donors, layer.all_donors_cm3(), levels_ev[0]),
                    (&mut acceptors, layer.all_acceptors_cm3(), levels_ev[1]),
                ] {
                    if density > 0.0 {
                        let load = density * volume;
                        sites.push(Site {
                            node,
                            load,
                            level_ev,
                        });
                    }
                }
                matter.push((material.electron_mass_m0.unwrap_or(1.0), permittivity));
                permittivities.push(permittivity);
                edges_ev.push((edge_ev, levels_ev));
            }
        }
        for plane in &stack.planes {
            let local = plane_node(&mesh, plane.layer, plane.fraction);
            let node = local / (ORDER + 1) * ORDER + local % (ORDER + 1);
            let levels_ev = edges_ev[local].1;
            for (sites, density, level_ev) in [
                (&mut donors, plane.donors_cm2, levels_ev[0]),
                (&mut acceptors, plane.acceptors_cm2, levels_ev[1]),
            ] {
                if density > 0.0 {
                    let load = density / NM2_PER_CM2;
                    sites.push(Site {
                        node,
                        load,
                        level_ev,
                    });
                }
            }
        }
        let boundary = BoundaryValue::new(&mesh, |e, q| {
            permittivities[e * (ORDER + 1) + q] / E2_OVER_EPSILON_0
        });
        let temperature_k = stack.temperature_k();
        let poisson = Poisson {
            boundary,
            dopants: [
                Dopants {
                    sites: donors,
                    charge: 1.0,
                    ionisation: bending.donors,
                    temperature_k,
                },
                Dopants {
                    sites: acceptors,
                    charge: -1.0,
                    ionisation: bending.acceptors,
                    temperature_k,
                },
            ],
            kt_ev: BOLTZMANN_EV_PER_K * temperature_k,
            held: [bending.contact, bending.surface_ev.is_some()],
        };
        let top_edge_ev = edges_ev.last().map_or(0.0, |(edge_ev, _)| *edge_ev);
        let contact_ev = bending
            .contact
            .then(|| contact_fermi_ev(stack, bending, asked, edges_ev[0].0))
            .transpose()?;
        let (fixed_fermi_ev, top_ev) = match (contact_ev, bending.surface_ev) {
            (Some(fermi_ev), Some(below_ev)) => (Some(fermi_ev), fermi_ev + below_ev - top_edge_ev),
            (Some(fermi_ev), None) => (Some(fermi_ev), 0.0),
            // The top face stays where it is, and the Fermi level is pinned to it.
            (None, Some(below_ev)) => (Some(top_edge_ev - below_ev), 0.0),
            (None, None) => (None, 0.0),
        };
        Ok(Problem {
            stack,
            bending,
            asked,
            poisson,
            end_permittivities: [permittivities[0], permittivities[permittivities.len() - 1]],
            matter,
            fixed_fermi_ev,
            top_ev,
            mesh,
        })
    }

    fn u<'v>(&self, state: &'v [f64]) -> &'v [f64] {
        &state[..self.mesh.node_count()]
    }

    /// Nothing, or what another mesh of the same layers carries.
    fn start(&self, known: Option<&Potential>) -> Vec<f64> {
        let nodes = self.mesh.node_count();
        let mut state = vec![0.0; nodes];
        let mut exchange = Vec::new();
        for (e, element) in self.mesh.elements.iter().enumerate() {
            for q in 0..=ORDER {
                let t = self.mesh.fraction(element, q);
                let [electron, hole] = known.map_or([0.0; 2], |known| {
                    [
                        known.electron_ev(element.segment, t),
                        known.hole_ev(element.segment, t),
                    ]
                });
                state[e * ORDER + q] = hole;
                exchange.push(electron - hole);
            }
        }
        // Held ends have their energies, and what lies between moves along; else energies count from the bottom.
        let bottom_off = state[0];
        let top_off = state[nodes - 1] - self.top_ev;
        let (bottom_off, top_off) = match self.poisson.held {
            [true, true] => (bottom_off, top_off),
            [false, true] => (top_off, top_off),
            [_, false] => (bottom_off, bottom_off),
        };
        let total_nm = self.stack.total_width_nm();
        for (e, element) in self.mesh.elements.iter().enumerate() {
            // A border belongs to the element above it.
            let last = e + 1 == self.mesh.elements.len();
            for q in 0..ORDER + usize::from(last) {
                let part = self.mesh.position(element, q) / total_nm;
                state[e * ORDER + q] -= bottom_off + part * (top_off - bottom_off);
            }
        }
        if self.bending.exchange {
            state.extend(exchange);
        }
        state
    }

    /// The stack with the potential of a state.
    fn bent(&self, state: &[f64]) -> Stack {
        let u = self.u(state);
        let mut hole = Vec::with_capacity(self.matter.len());
        for e in 0..self.mesh.elements.len() {
            hole.extend_from_slice(self.mesh.local(e, u));
        }
        let exchange = &state[u.len()..];
        let mut electron = hole.clone();
        for (value, extra) in electron.iter_mut().zip(exchange) {
            *value += extra;
        }
        let mut stack = self.stack.clone();
        stack.potential = Some(Arc::new(Potential::new(self.mesh.clone(), electron, hole)));
        stack
    }

    /// The states in a potential: of each band as many as were counted, and more where more are filled.
    fn levels(
        &self,
        bent: &Stack,
        state: &[f64],
        counts: &mut [usize],
    ) -> Result<(Vec<Subbands>, Vec<Filled>), ChargeError> {
        let mut bands = Vec::with_capacity(self.asked.len());
        for ((band, _), count) in self.asked.iter().zip(counts.iter()) {
            let operator = BandOperator::new(bent, *band)
                .map_err(|(layer, reason)| ChargeError::Unsuitable { layer, reason })?;
            bands.push((on_mesh(&operator, self.mesh.clone(), *count), operator));
        }
        loop {
            let filled: Vec<Filled> = bands.iter().flat_map(|(band, _)| filled(band)).collect();
            let fermi_ev = self.fermi_ev(&filled, state)?;
            let mut enough = true;
            for ((solved, operator), count) in bands.iter_mut().zip(counts.iter_mut()) {
                let top_ev = solved.band.sign() * fermi_ev + REACH_KT * self.poisson.kt_ev;
                if solved.pairs.last().is_none_or(|pair| pair.value > top_ev) {
                    continue;
                }
                let needed = (count_below(&solved.pencil, top_ev) + 1).min(MAX_SUBBANDS);
                if needed > solved.pairs.len() && needed > *count {
                    *count = needed;
                    *solved = on_mesh(operator, self.mesh.clone(), needed);
                    enough = false;
                }
            }
            if enough {
                let bands = bands.into_iter().map(|(band, _)| band).collect();
                return Ok((bands, filled));
            }
        }
    }

    fn fermi_ev(&self, filled: &[Filled], state: &[f64]) -> Result<f64, ChargeError> {
        if let Some(fixed) = self.fixed_fermi_ev {
            return Ok(fixed);
        }
        let u = self.u(state);
        let excess = |fermi_ev: f64| self.poisson.excess(filled, u, fermi_ev);
        let energies = || filled.iter().map(|state| state.sign * state.level_ev);
        let low_ev = energies().fold(f64::INFINITY, f64::min);
        let high_ev = energies().fold(f64::NEG_INFINITY, f64::max);
        let densities = filled.iter().map(|state| state.density_of_states);
        let least = densities.fold(f64::INFINITY, f64::min);
        let dopants = self.poisson.dopants.iter().flat_map(|kind| &kind.sites);
        let total: f64 = dopants.map(|site| site.load).sum();
        // All carriers in one subband.
        let room_ev = 3.0 + total / least;
        root_of_falling(excess, low_ev - room_ev, high_ev + room_ev).ok_or(ChargeError::NotNeutral)
    }

    /// Whether the highest subband that may be solved of a band is still filled.
    fn is_cut_off(&self, solved: &[Subbands], fermi_ev: f64) -> bool {
        solved.iter().any(|band| {
            let last = band.pairs.get(MAX_SUBBANDS - 1);
            last.is_some_and(|pair| {
                band.band.sign() * fermi_ev - pair.value > -CUT_OFF_KT * self.poisson.kt_ev
            })
        })
    }

    /// Whether a filled level is less exact than it should be.
    fn too_coarse(&self, solved: &[Subbands], filled: &[Filled], fermi_ev: f64) -> bool {
        let densities: Vec<f64> = filled
            .iter()
            .map(|state| state.density(fermi_ev, self.poisson.kt_ev))
            .collect();
        let all: f64 = densities.iter().sum();
        let errors = solved.iter().flat_map(|band| &band.errors_ev);
        errors
            .zip(&densities)
            .any(|(error_ev, density)| *error_ev > MESH_TOLERANCE_EV && *density > EMPTY * all)
    }

    /// The state that the charge of the solved states makes, and by how much its energies were moved for their zero.
    fn next(
        &self,
        solved: &[Subbands],
        filled: &[Filled],
        state: &[f64],
        fermi_ev: f64,
    ) -> (Vec<f64>, f64) {
        let before = self.u(state);
        let mut next = self.poisson.answer(filled, before, fermi_ev);
        let exchange = self.bending.exchange.then(|| {
            let electrons = self.poisson.electrons(filled, before, &next, fermi_ev);
            self.exchange(&solved[0], &electrons)
        });
        // Without a held end the Fermi level stayed where it was, and the potential took what neutrality asks.
        let moved_ev = if self.poisson.held == [false; 2] {
            next[0]
        } else {
            0.0
        };
        next.iter_mut().for_each(|value| *value -= moved_ev);
        next.extend(exchange.into_iter().flatten());
        (next, moved_ev)
    }

    /// The energy of exchange at the nodes of each element. `electrons` are those of each subband, were all of it there.
    fn exchange(&self, conduction: &Subbands, electrons: &[Vec<f64>]) -> Vec<f64> {
        let mut density = vec![0.0; self.matter.len()];
        for (amplitude, own) in amplitudes(conduction).iter().zip(electrons) {
            for (k, part) in amplitude.iter().enumerate() {
                let node = k / (ORDER + 1) * ORDER + k % (ORDER + 1);
                density[k] += part * part * own[node];
            }
        }
        for (e, element) in self.mesh.elements.iter().enumerate() {
            for (q, weight) in self.mesh.reference.weights.iter().enumerate() {
                density[e * (ORDER + 1) + q] /= 0.5 * element.length * weight;
            }
        }
        density
            .iter()
            .zip(&self.matter)
            .map(|(density, (mass_m0, permittivity))| {
                exchange_ev(*density, *mass_m0, *permittivity)
            })
            .collect()
    }

    fn equilibrium(
        &self,
        filled: &[Vec<Filled>],
        state: &[f64],
        fermi_ev: f64,
        (iterations, residual_ev): (usize, f64),
    ) -> Equilibrium {
        let u = self.u(state);
        let densities: Vec<Vec<f64>> = filled
            .iter()
            .map(|band| {
                let own = band.iter();
                own.map(|state| NM2_PER_CM2 * state.density(fermi_ev, self.poisson.kt_ev))
                    .collect()
            })
            .collect();
        let carriers = |sign: f64| -> f64 {
            let own = filled.iter().zip(&densities);
            own.filter(|(band, _)| band.first().is_some_and(|state| state.sign == sign))
                .map(|(_, densities)| densities.iter().sum::<f64>())
                .sum()
        };
        let (electrons_cm2, holes_cm2) = (carriers(1.0), carriers(-1.0));
        let [donors, acceptors] = self
            .poisson
            .ionised(u, fermi_ev)
            .map(|charge| NM2_PER_CM2 * charge.abs());
        let excess_cm2 = donors + holes_cm2 - electrons_cm2 - acceptors;
        let is_neutral = self.fixed_fermi_ev.is_none();
        let slope = |charge_cm2: f64, permittivity: f64| {
            E2_OVER_EPSILON_0 * charge_cm2 / NM2_PER_CM2 / permittivity
        };
        // The field inside an end face is that of the charge which the face carries.
        let [lower, upper] = self.end_permittivities;
        let own = match self.poisson.held {
            [false, false] => [0.0, 0.0],
            [true, false] => [slope(-excess_cm2, lower), 0.0],
            [false, true] => [0.0, slope(excess_cm2, upper)],
            [true, true] => self.end_slopes(u),
        };
        Equilibrium {
            fermi_ev,
            beyond: densities
                .iter()
                .filter_map(|band| band.last())
                .fold(0.0, |most: f64, last| most.max(*last))
                / (electrons_cm2 + holes_cm2).max(f64::MIN_POSITIVE),
            densities_cm2: densities,
            electrons_cm2,
            holes_cm2,
            ionised_donors_cm2: donors,
            ionised_acceptors_cm2: acceptors,
            end_fields_v_per_nm: own.map(|own| own + self.stack.field_v_per_nm),
            imbalance: excess_cm2 / (donors + acceptors).max(f64::MIN_POSITIVE),
            is_neutral,
            iterations,
            residual_ev,
        }
    }

    /// du/dz at both ends, from the polynomials.
    fn end_slopes(&self, u: &[f64]) -> [f64; 2] {
        let elements = &self.mesh.elements;
        let slope = |e: usize, q: usize| {
            let mut slopes = [0.0; ORDER + 1];
            self.mesh
                .reference
                .slopes(self.mesh.local(e, u), &mut slopes);
            2.0 / elements[e].length * slopes[q]
        };
        [slope(0, 0), slope(elements.len() - 1, ORDER)]
    }
}

/// The place in the list of all elements' nodes at which a plane of dopants lies: a border of elements.
fn plane_node(mesh: &Mesh, layer: usize, fraction: f64) -> usize {
    let first = mesh
        .elements
        .partition_point(|element| element.segment < layer);
    let own = mesh.elements[first..]
        .iter()
        .take_while(|element| element.segment == layer);
    let below = own
        .filter(|element| element.start_fraction + 0.5 * element.length_fraction < fraction)
        .count();
    match below {
        0 => first * (ORDER + 1),
        below => (first + below - 1) * (ORDER + 1) + ORDER,
    }
}

/// The states of a band as they can be filled, with their parts at the nodes of the mesh.
fn filled(solved: &Subbands) -> Vec<Filled> {
    let mesh = &solved.pencil.mesh;
    let count = mesh.order() + 1;
    let mut states = without_parts(solved);
    for (state, amplitude) in states.iter_mut().zip(amplitudes(solved)) {
        let mut parts = vec![0.0; mesh.node_count()];
        for (k, amplitude) in amplitude.iter().enumerate() {
            parts[k / count * mesh.order() + k % count] += amplitude * amplitude;
        }
        state.parts = parts;
    }
    states
}
