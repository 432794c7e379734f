//! Subbands of coupled bands: six-band holes, and eight bands with the electrons among them.
//!
//! States are told by their number, counted from the gap: on a mesh the matrix has as many conduction levels as there are
//! values of the conduction function, whatever the layers (for bands in a common gap it is quasi-definite: Vanderbei,
//! SIAM J. Optim. 5, 100 (1995)). So no state is taken for one of the other band, even where the gap is broken.

use crate::constants::HBAR2_OVER_2M0;
use crate::models::multiband::{MultibandModel, MultibandOperator, Part};
use crate::numerics::curvature::curvature;
use crate::numerics::decay::decay_rates;
use crate::numerics::matrix_pencil::{MatrixCoefficient, MatrixPencil};
use crate::numerics::matrix_sensitivity::At;
use crate::numerics::mesh::Mesh;
use crate::numerics::nearest::{self, NearPair};
use std::borrow::Cow;

/// How many states of each band are wanted, counted from the gap. Six bands have no conduction states.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Wanted {
    pub conduction: usize,
    pub valence: usize,
}

/// The side of the gap.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Band {
    Conduction,
    Valence,
}

/// Parts of a state, which add up to one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Shares {
    pub conduction: f64,
    pub heavy: f64,
    pub light: f64,
    pub split_off: f64,
}

/// A pair of states that the reversal of time joins at k∥ = 0.
#[derive(Clone, Debug)]
pub struct PairState {
    pub band: Band,
    /// From 1 at the gap.
    pub number: usize,
    /// Electron energies of the two members on the absolute scale; equal at k∥ = 0, and in a stack that is its own mirror
    /// image. Where k∥ lies in no mirror plane, two neighbours in energy are taken for a pair.
    pub energies_ev: [f64; 2],
    /// Estimated discretisation error.
    pub error_ev: f64,
    /// Of the first member.
    pub shares: Shares,
}

/// The states at one k∥.
#[derive(Clone, Debug)]
pub struct MultibandSubbands {
    pub k_per_nm: f64,
    /// One problem for each part of H, or one for the whole where k∥ lies in no mirror plane.
    pub parts: Vec<PartSolution>,
    /// Conduction states upwards from the gap, then valence states downwards.
    pub states: Vec<PairState>,
}

/// The solved problem of one part of H.
#[derive(Clone, Debug)]
pub struct PartSolution {
    pub pencil: MatrixPencil,
    /// Upwards from the gap.
    pub conduction: Vec<NearPair>,
    /// Downwards from the gap.
    pub valence: Vec<NearPair>,
}

/// Orders that are tried in turn before the elements are halved.
const ORDERS: [usize; 2] = [8, 12];
const MAX_HALVINGS: usize = 3;
/// The order is raised by this much for the error estimate.
const ORDER_STEP: usize = 2;
/// Largest phase or decay exponent that one element has to follow.
const MAX_PHASE: f64 = 5.0;
const MAX_PIECES: usize = 400;
/// Elements towards a face grow by this from one to the next: half of it costs more, twice of it loses digits.
const THINNING: f64 = 6.0;
/// The band offsets that decide over the mesh are taken to be at least this, in eV.
const LEAST_DEPTH_EV: f64 = 0.15;
/// Where levels of an unknown stack are looked for first, from the edge, in eV.
const FIRST_STEP_EV: f64 = 0.05;
/// Solves at one k∥ on a mesh that is refined until the estimated errors are below the tolerance, or as fine as is
/// sensible; the errors that were reached are reported.
pub fn solve_multiband(
    operator: &MultibandOperator,
    k_per_nm: f64,
    wanted: Wanted,
    tolerance_ev: f64,
) -> MultibandSubbands {
    let lengths: Vec<f64> = operator.stack().layers.iter().map(|l| l.width_nm).collect();
    let mut pieces = pieces(operator);
    let mut halvings = 0;
    loop {
        for order in ORDERS {
            let subbands = multiband_on_mesh(
                operator,
                Mesh::of_parts(&lengths, &parts(operator, &pieces), order),
                k_per_nm,
                wanted,
            );
            let exact = subbands.states.iter().all(|s| s.error_ev <= tolerance_ev);
            if exact || (halvings == MAX_HALVINGS && order == ORDERS[ORDERS.len() - 1]) {
                return subbands;
            }
        }
        pieces.iter_mut().for_each(|n| *n *= 2);
        halvings += 1;
    }
}

/// Solves on a given mesh, with the errors estimated on a higher order.
fn multiband_on_mesh(
    operator: &MultibandOperator,
    mesh: Mesh,
    k_per_nm: f64,
    wanted: Wanted,
) -> MultibandSubbands {
    let parts = solve_parts(operator, &mesh, k_per_nm, wanted);
    let [conduction_errors, valence_errors] =
        errors_ev(operator, &parts[0], k_per_nm, kinds(operator)[0]);
    let mut states = Vec::new();
    for (band, errors_ev) in [
        (Band::Conduction, conduction_errors),
        (Band::Valence, valence_errors),
    ] {
        let per_pair = 2 / parts.len();
        for index in 0..fewest(&parts, band) / per_pair {
            let [first, second] = members(&parts, band, index);
            states.push(PairState {
                band,
                number: index + 1,
                energies_ev: [first.1.value, second.1.value],
                error_ev: errors_ev[index * per_pair],
                shares: shares(first.0, first.1),
            });
        }
    }
    MultibandSubbands {
        k_per_nm,
        parts,
        states,
    }
}

/// The estimated discretisation errors of a part's conduction and valence levels, in eV: how far each moves on elements of
/// higher order.
fn errors_ev(
    operator: &MultibandOperator,
    solved: &PartSolution,
    k_per_nm: f64,
    part: Part,
) -> [Vec<f64>; 2] {
    let mesh = &solved.pencil.mesh;
    let finer = mesh.with_order(mesh.order() + ORDER_STEP);
    let finer = pencil(operator, finer, k_per_nm, part);
    let moves = |ascending: &[NearPair]| -> Vec<f64> {
        let moves = nearest::improvements(&solved.pencil, ascending, &finer);
        moves.into_iter().map(f64::abs).collect()
    };
    let upwards: Vec<NearPair> = solved.valence.iter().rev().cloned().collect();
    let mut valence = moves(&upwards);
    valence.reverse();
    [moves(&solved.conduction), valence]
}

/// Solves the first part alone at k∥ = 0, where the second has the same levels, as [`solve_multiband`] does: the solution
/// and the errors of its conduction and valence levels.
pub(super) fn solve_centre(
    operator: &MultibandOperator,
    wanted: Wanted,
    tolerance_ev: f64,
) -> (PartSolution, [Vec<f64>; 2]) {
    let lengths: Vec<f64> = operator.stack().layers.iter().map(|l| l.width_nm).collect();
    let mut pieces = pieces(operator);
    let mut halvings = 0;
    loop {
        for order in ORDERS {
            let mesh = Mesh::of_parts(&lengths, &parts(operator, &pieces), order);
            let part = solve_part(operator, &mesh, 0.0, wanted, Part::Plus, None);
            let errors = errors_ev(operator, &part, 0.0, Part::Plus);
            let exact = errors.iter().flatten().all(|error| *error <= tolerance_ev);
            if exact || (halvings == MAX_HALVINGS && order == ORDERS[ORDERS.len() - 1]) {
                return (part, errors);
            }
        }
        pieces.iter_mut().for_each(|n| *n *= 2);
        halvings += 1;
    }
}

/// The two members of a pair with their problems.
fn members(parts: &[PartSolution], band: Band, index: usize) -> [(&MatrixPencil, &NearPair); 2] {
    let at = |part: usize, place: usize| (&parts[part].pencil, &list(&parts[part], band)[place]);
    if parts.len() == 2 {
        [at(0, index), at(1, index)]
    } else {
        [at(0, 2 * index), at(0, 2 * index + 1)]
    }
}

/// How many states of a band every part has.
pub(super) fn fewest(parts: &[PartSolution], band: Band) -> usize {
    let counts = parts.iter().map(|part| list(part, band).len());
    counts.min().unwrap_or(0)
}

pub(super) fn kinds(operator: &MultibandOperator) -> &'static [Part] {
    if operator.direction().is_mirror_plane() {
        &[Part::Plus, Part::Minus]
    } else {
        &[Part::Both]
    }
}

/// The problem of one part of H on a mesh.
pub fn pencil(operator: &MultibandOperator, mesh: Mesh, k_per_nm: f64, part: Part) -> MatrixPencil {
    let field = operator.stack().field_v_per_nm;
    on(operator, mesh, part, |layer, t, z_nm| {
        let block = operator.block(layer, t);
        block.at(k_per_nm, part, field * z_nm)
    })
}

/// The derivative of the problem of one part with respect to k∥.
pub(super) fn derivative(
    operator: &MultibandOperator,
    mesh: &Mesh,
    k_per_nm: f64,
    part: Part,
) -> MatrixPencil {
    on(operator, mesh.clone(), part, |layer, t, _| {
        let [mut slope, second] = operator.block(layer, t).orders(part);
        slope.c += 2.0 * k_per_nm * second.c;
        slope
    })
}

/// A problem with one set of coefficients per layer or place.
fn on(
    operator: &MultibandOperator,
    mesh: Mesh,
    part: Part,
    coefficient: impl Fn(usize, f64, f64) -> MatrixCoefficient,
) -> MatrixPencil {
    let frame = mesh.clone();
    let n = operator.model().components() * if part == Part::Both { 2 } else { 1 };
    MatrixPencil::new(mesh, n, |element, q| {
        Cow::Owned(coefficient(
            element.segment,
            frame.fraction(element, q),
            frame.position(element, q),
        ))
    })
}

pub(super) fn solve_parts(
    operator: &MultibandOperator,
    mesh: &Mesh,
    k_per_nm: f64,
    wanted: Wanted,
) -> Vec<PartSolution> {
    let parts = kinds(operator).iter();
    parts
        .map(|&part| solve_part(operator, mesh, k_per_nm, wanted, part, None))
        .collect()
}

/// Solves one part of H. The levels are looked for first amid those of `nearby`, a solution at a k∥ not far off, or next
/// to the edges of the stack.
pub(super) fn solve_part(
    operator: &MultibandOperator,
    mesh: &Mesh,
    k_per_nm: f64,
    wanted: Wanted,
    part: Part,
    nearby: Option<&PartSolution>,
) -> PartSolution {
    let pencil = pencil(operator, mesh.clone(), k_per_nm, part);
    let copies = if part == Part::Both { 2 } else { 1 };
    let gap = 3 * copies * (mesh.node_count() - 2);
    let [floor_ev, top_ev] = band_edges(operator);
    let guess = |levels: Option<&[NearPair]>, otherwise: f64| match levels {
        Some([.., _, _]) => levels.map_or(otherwise, amid),
        _ => otherwise,
    };
    let conduction = match operator.model() {
        MultibandModel::SixBand => Vec::new(),
        MultibandModel::EightBand => nearest::numbered(
            &pencil,
            gap..gap + copies * wanted.conduction,
            guess(nearby.map(|n| &n.conduction[..]), floor_ev + FIRST_STEP_EV),
            FIRST_STEP_EV,
        ),
    };
    let mut valence = nearest::numbered(
        &pencil,
        gap.saturating_sub(copies * wanted.valence)..gap,
        guess(nearby.map(|n| &n.valence[..]), top_ev - FIRST_STEP_EV),
        FIRST_STEP_EV,
    );
    valence.reverse();
    PartSolution {
        pencil,
        conduction,
        valence,
    }
}

/// Halfway between the two middle ones of at least two levels.
fn amid(levels: &[NearPair]) -> f64 {
    let upper = levels.len() / 2;
    0.5 * (levels[upper - 1].value + levels[upper].value)
}

/// The lowest conduction edge (NaN without) and the highest valence edge of the stack, the field included, at the faces.
fn band_edges(operator: &MultibandOperator) -> [f64; 2] {
    let stack = operator.stack();
    let faces = stack.faces_nm();
    let (mut floor, mut top) = (f64::INFINITY, f64::NEG_INFINITY);
    for layer in 0..stack.layers.len() {
        for (t, z_nm) in [(0.0, faces[layer]), (1.0, faces[layer + 1])] {
            let c = &operator.block(layer, t).c[0];
            let n = c.nrows();
            let raised = stack.field_v_per_nm * z_nm;
            floor = floor.min(c[(0, 0)] + raised);
            top = top.max(c[(n - 3, n - 3)].max(c[(n - 2, n - 2)]) + raised);
        }
    }
    [floor, top]
}

/// The elements of each layer, by start and length as fractions of it: equal ones, with thinner and thinner ones towards
/// the faces where eight bands change fast. Their own terms are small beside the coupling, so that what does not fit at an
/// interface dies out within a few hundredths of a nanometre; equal elements would miss the levels by 0.1 µeV there.
fn parts(operator: &MultibandOperator, pieces: &[usize]) -> Vec<Vec<(f64, f64)>> {
    let layers = pieces.iter().enumerate();
    layers
        .map(|(layer, &count)| {
            let mut cuts: Vec<f64> = (0..=count).map(|k| k as f64 / count as f64).collect();
            if let Some(rate) = fastest_decay(operator, layer) {
                let width_nm = operator.stack().layers[layer].width_nm;
                let mut thin = MAX_PHASE / rate / width_nm;
                while thin < 0.5 / count as f64 {
                    cuts.extend([thin, 1.0 - thin]);
                    thin *= THINNING;
                }
            }
            cuts.sort_by(f64::total_cmp);
            let elements = cuts.windows(2);
            elements.map(|ends| (ends[0], ends[1] - ends[0])).collect()
        })
        .collect()
}

/// The fastest decay of a solution in a layer of eight bands, near the conduction edge, in 1/nm.
fn fastest_decay(operator: &MultibandOperator, layer: usize) -> Option<f64> {
    if operator.model() != MultibandModel::EightBand {
        return None;
    }
    let block = operator.block(layer, 0.0);
    let at = At {
        a: &block.a,
        g: &block.g[0],
        c: &block.c[0],
        raised: 0.0,
    };
    // Heavy holes stand alone, and change no faster than the equal elements follow.
    let rate = *decay_rates(&at, block.c[0][(0, 0)], &[0, 2, 3])?.last()?;
    (rate > 0.0 && rate.is_finite()).then_some(rate)
}

/// The number of elements in each layer.
fn pieces(operator: &MultibandOperator) -> Vec<usize> {
    let stack = operator.stack();
    let [floor_ev, top_ev] = band_edges(operator);
    let mut pieces = Vec::new();
    for (layer, own) in stack.layers.iter().enumerate() {
        let block = operator.block(layer, 0.0);
        let n = block.a.nrows();
        let mut rate = 0.0_f64;
        if operator.model() == MultibandModel::EightBand {
            let depth_ev = (block.c[0][(0, 0)] - floor_ev).abs().max(LEAST_DEPTH_EV);
            // Light electrons: a twentieth of the free mass is near that of most wells.
            rate = rate.max(depth_ev * 0.05 / HBAR2_OVER_2M0);
        }
        let heavy = n - 3;
        let depth_ev = (top_ev - block.c[0][(heavy, heavy)])
            .abs()
            .max(LEAST_DEPTH_EV);
        rate = rate.max(depth_ev / block.a[(heavy, heavy)].abs());
        let count = (rate.sqrt() * own.width_nm / MAX_PHASE).ceil() as usize;
        pieces.push(count.clamp(1, MAX_PIECES));
    }
    pieces
}

pub(super) fn shares(pencil: &MatrixPencil, pair: &NearPair) -> Shares {
    let n = pencil.components();
    let mut squares = vec![0.0; n];
    for (index, x) in pair.vector.iter().enumerate() {
        squares[index % n] += x * x;
    }
    let of_block = if n.is_multiple_of(4) { 4 } else { 3 };
    let sum = |from_end: usize| -> f64 {
        let own = squares.iter().enumerate();
        own.filter(|(k, _)| k % of_block + from_end == of_block)
            .map(|(_, s)| s)
            .sum()
    };
    Shares {
        conduction: if of_block == 4 { sum(4) } else { 0.0 },
        heavy: sum(3),
        light: sum(2),
        split_off: sum(1),
    }
}

/// The in-plane mass of each pair at k∥ = 0 in free-electron masses, from the second derivative of its energy: exact
/// second-order perturbation of the discretised problem, with the sum over all other states done by a solve. Positive
/// where an electron's energy rises or a hole's falls. `None` for a state that coincides with one it couples to.
///
/// `centre` are the states at k∥ = 0.
pub fn zone_centre_masses(
    operator: &MultibandOperator,
    centre: &MultibandSubbands,
) -> Vec<Option<f64>> {
    let mesh = &centre.parts[0].pencil.mesh;
    let kind = Part::Plus;
    let solved;
    let part = if centre.parts.len() == 2 {
        &centre.parts[0]
    } else {
        let count = |band| centre.states.iter().filter(|s| s.band == band).count();
        let wanted = Wanted {
            conduction: count(Band::Conduction),
            valence: count(Band::Valence),
        };
        solved = solve_part(operator, mesh, 0.0, wanted, kind, None);
        &solved
    };
    let [first, second] = [0, 1].map(|order| {
        on(operator, mesh.clone(), kind, |layer, t, _| {
            let [first, second] = operator.block(layer, t).orders(kind);
            if order == 0 { first } else { second }
        })
    });
    masses_m0(part, &first, &second)
}

/// The in-plane masses of a part's conduction and then valence states at k∥ = 0, from the terms of first and second order
/// in k∥.
pub(super) fn masses_m0(
    part: &PartSolution,
    first: &MatrixPencil,
    second: &MatrixPencil,
) -> Vec<Option<f64>> {
    let all: Vec<&NearPair> = part.conduction.iter().chain(&part.valence).collect();
    let masses = all.iter().enumerate().map(|(index, pair)| {
        let sign = if index < part.conduction.len() {
            1.0
        } else {
            -1.0
        };
        let curvature = curvature(&part.pencil, first, second, &all, pair);
        curvature.map(|c| sign * HBAR2_OVER_2M0 / c)
    });
    masses.collect()
}

pub(super) fn list(part: &PartSolution, band: Band) -> &[NearPair] {
    match band {
        Band::Conduction => &part.conduction,
        Band::Valence => &part.valence,
    }
}
