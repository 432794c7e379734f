//! What is known of one state.

use super::Subbands;
use super::multiband::Shares;
use crate::constants::HBAR2_OVER_2M0;
use crate::numerics::mesh::Mesh;
use crate::numerics::pencil::Pencil;
use crate::numerics::quadrature::MAX_ORDER;

/// What keeps a state in the stack.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Hold {
    /// Both outer barriers: the energy lies below them everywhere.
    Bound,
    /// Both outer barriers, but the field lowers one of them below the energy further out: the state can tunnel.
    Leaky,
    /// Only the walls at the ends: the energy lies above the lower of the two outer barrier edges.
    Walls,
}

/// One subband at zero in-plane momentum.
#[derive(Clone, Debug)]
pub struct State {
    pub energy_ev: f64,
    /// Distance from the band's edge where it is nearest to the gap in the stack, the field included: upwards in the
    /// conduction band, downwards for holes.
    pub from_edge_ev: f64,
    /// Estimated discretisation error of the energy.
    pub error_ev: f64,
    /// 1/m∥ is the mean of 1/m(E, z) in the state: the curvature of the subband at its edge, in free-electron masses.
    /// For holes on their own that of the diagonal approximation, counted positive. Of coupled bands the curvature at
    /// k∥ = 0: negative where a hole's energy rises or an electron's falls, 0 where two levels that coincide leave in
    /// straight lines.
    pub in_plane_mass_m0: f64,
    /// Mean position above the bottom of the stack.
    pub centre_nm: f64,
    /// Standard deviation of the position.
    pub extent_nm: f64,
    /// The layer that holds most of the state, and how much of it.
    pub layer: usize,
    pub layer_share: f64,
    pub hold: Hold,
    /// How far the energy would fall if the walls stood at infinity: first order in the walls' pressure. Zero unless
    /// the state is bound.
    pub wall_shift_ev: f64,
    /// What the state is made of, where bands are coupled.
    pub shares: Option<Shares>,
}

/// The probability density at the nodes of each element, in 1/nm: all components of the state together.
pub(super) fn density(subbands: &Subbands, index: usize) -> Vec<f64> {
    let Subbands { pencil, pairs, .. } = subbands;
    let reference = pencil.mesh.reference;
    let p = reference.order;
    let pair = &pairs[index];
    let mut density = Vec::with_capacity(pencil.coefficients.len());
    if pencil.is_linear() {
        for e in 0..pencil.mesh.elements.len() {
            density.extend(pencil.mesh.local(e, &pair.vector).iter().map(|v| v * v));
        }
        return density;
    }
    let mut slopes = [0.0; MAX_ORDER + 1];
    for (e, element) in pencil.mesh.elements.iter().enumerate() {
        let values = pencil.mesh.local(e, &pair.vector);
        reference.slopes(values, &mut slopes[..=p]);
        let scale = 2.0 / element.length;
        for (q, at) in pencil.at(e).iter().enumerate() {
            let slope = scale * slopes[q];
            density
                .push(values[q] * values[q] + at.divided(pair.value, pair.value) * slope * slope);
        }
    }
    density
}

/// Σ over the nodes of weight × f(element, local node).
pub(super) fn integrate(mesh: &Mesh, mut f: impl FnMut(usize, usize) -> f64) -> f64 {
    let mut sum = 0.0;
    for (e, element) in mesh.elements.iter().enumerate() {
        for (q, w) in mesh.reference.weights.iter().enumerate() {
            sum += 0.5 * element.length * w * f(e, q);
        }
    }
    sum
}

/// The lower of the two outer barrier edges, each taken at its highest point: below it a classical particle is turned
/// back on both sides. For holes on the scale of minus the energy.
pub(super) fn lower_outer_edge_ev(pencil: &Pencil) -> f64 {
    let elements = &pencil.mesh.elements;
    let highest = |segment: usize| {
        let own = elements
            .iter()
            .enumerate()
            .filter(|(_, e)| e.segment == segment);
        own.flat_map(|(index, _)| pencil.at(index))
            .map(|c| c.constant)
            .fold(f64::NEG_INFINITY, f64::max)
    };
    let last = elements.last().map_or(0, |e| e.segment);
    highest(0).min(highest(last))
}

/// 1/m∥ as the mean of 1/m(E, z) in the state.
pub fn in_plane_mass_m0(subbands: &Subbands, index: usize) -> f64 {
    let Subbands { pencil, pairs, .. } = subbands;
    let pair = &pairs[index];
    let kinetic = integrate(&pencil.mesh, |e, q| {
        let value = pencil.mesh.local(e, &pair.vector)[q];
        let own = subbands.in_plane.as_ref();
        let own = own.and_then(|nodes| nodes[e * (pencil.mesh.order() + 1) + q].as_ref());
        let stiffness = own.map_or_else(
            || pencil.at(e)[q].a(pair.value),
            |in_plane| in_plane.at(pair.value),
        );
        stiffness * value * value
    });
    HBAR2_OVER_2M0 / kinetic
}

pub(super) fn describe(subbands: &Subbands, index: usize) -> State {
    let pencil = &subbands.pencil;
    let pair = &subbands.pairs[index];
    // The solver's eigenvalue: minus the energy for holes.
    let level_ev = pair.value;
    let place = place(&pencil.mesh, &density(subbands, index));
    let (first, last) = (
        pencil.coefficients[0],
        pencil.coefficients[pencil.coefficients.len() - 1],
    );
    let hold = if level_ev > lower_outer_edge_ev(pencil) {
        Hold::Walls
    } else if level_ev > first.constant.min(last.constant) {
        Hold::Leaky
    } else {
        Hold::Bound
    };
    let wall_shift_ev = if hold == Hold::Bound {
        let pressures = wall_pressures(subbands, index);
        [first, last]
            .iter()
            .zip(pressures)
            // The envelope falls by exp(−κ d): a wall moved out by d works against a pressure falling as exp(−2 κ d).
            .map(|(c, pressure)| {
                pressure / (2.0 * ((c.constant - level_ev) / c.a(level_ev)).sqrt())
            })
            .sum()
    } else {
        0.0
    };
    State {
        energy_ev: subbands.energy_ev(index),
        from_edge_ev: level_ev - pencil.floor(),
        error_ev: subbands.errors_ev[index],
        in_plane_mass_m0: in_plane_mass_m0(subbands, index),
        centre_nm: place.centre_nm,
        extent_nm: place.extent_nm,
        layer: place.layer,
        layer_share: place.layer_share,
        hold,
        wall_shift_ev,
        shares: None,
    }
}

/// Where a probability density lies.
pub(super) struct Place {
    pub centre_nm: f64,
    pub extent_nm: f64,
    pub layer: usize,
    pub layer_share: f64,
}

/// Mean position, its standard deviation and the layer that holds most of a density, given at the nodes of each element.
pub(super) fn place(mesh: &Mesh, density: &[f64]) -> Place {
    let at = |e: usize, q: usize| density[e * (mesh.order() + 1) + q];
    let position = |e: usize, q: usize| mesh.position(&mesh.elements[e], q);
    let centre_nm = integrate(mesh, |e, q| at(e, q) * position(e, q));
    let variance = integrate(mesh, |e, q| at(e, q) * (position(e, q) - centre_nm).powi(2));
    let layers = mesh.elements.last().map_or(0, |e| e.segment + 1);
    let mut shares = vec![0.0; layers];
    integrate(mesh, |e, q| {
        let element = &mesh.elements[e];
        shares[element.segment] += 0.5 * element.length * mesh.reference.weights[q] * at(e, q);
        0.0
    });
    let (layer, layer_share) = shares
        .iter()
        .copied()
        .enumerate()
        .max_by(|a, b| a.1.total_cmp(&b.1))
        .unwrap_or((0, 0.0));
    Place {
        centre_nm,
        extent_nm: variance.max(0.0).sqrt(),
        layer,
        layer_share,
    }
}

/// −dE/dL at the lower and the upper wall: A ψ′² there, eV/nm.
pub(super) fn wall_pressures(subbands: &Subbands, index: usize) -> [f64; 2] {
    let coefficients = &subbands.pencil.coefficients;
    let energy_ev = subbands.pairs[index].value;
    let fluxes = edge_fluxes(subbands, index);
    let pressure =
        |flux: Option<f64>, at: usize| flux.map_or(0.0, |f| f * f / coefficients[at].a(energy_ev));
    [
        pressure(fluxes.first().map(|f| f.0), 0),
        pressure(fluxes.last().map(|f| f.1), coefficients.len() - 1),
    ]
}

/// A ψ′ at the bottom and the top of every element, from the equation tested with the edge's own polynomial: more exact
/// than the slope of the interpolated envelope, and the same on both sides of an edge.
pub(super) fn edge_fluxes(subbands: &Subbands, index: usize) -> Vec<(f64, f64)> {
    let pencil = &subbands.pencil;
    let pair = &subbands.pairs[index];
    let reference = pencil.mesh.reference;
    let p = reference.order;
    let mut slopes = [0.0; MAX_ORDER + 1];
    let mut tested = [0.0; MAX_ORDER + 1];
    let elements = pencil.mesh.elements.iter().enumerate();
    elements
        .map(|(e, element)| {
            let (values, nodes) = (pencil.mesh.local(e, &pair.vector), pencil.at(e));
            reference.slopes(values, &mut slopes[..=p]);
            for q in 0..=p {
                let w = reference.weights[q];
                slopes[q] *= 2.0 / element.length * w * nodes[q].a(pair.value);
                tested[q] = 0.5 * element.length * w * (nodes[q].constant - pair.value) * values[q];
            }
            reference.add_slopes_transposed(&slopes[..=p], &mut tested[..=p]);
            (-tested[0], tested[p])
        })
        .collect()
}
