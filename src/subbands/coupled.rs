//! Coupled bands as levels: the states of one member of each pair at k∥ = 0, where both members have the same energy.

use super::audit::Audit;
use super::multiband::{
    Band as Side, PartSolution, Shares, Wanted, masses_m0, shares, solve_centre,
};
use super::state::{self, Hold, State};
use super::strengths::{Strength, strengths};
use super::{Accuracy, envelope};
use crate::models::Unsuitable;
use crate::models::multiband::{
    BlockCoefficient, Direction, MultibandModel, MultibandOperator, Part,
};
use crate::numerics::decay::decay_rates;
use crate::numerics::matrix_pencil::MatrixPencil;
use crate::numerics::matrix_sensitivity::{At, moment};
use crate::numerics::mesh::Mesh;
use crate::numerics::nearest::NearPair;
use crate::numerics::quadrature::MAX_ORDER;
use crate::structure::Stack;
use nalgebra::DMatrix;
use std::borrow::Cow;
use std::sync::OnceLock;

/// The solved coupled bands of a stack.
#[derive(Clone, Debug)]
pub struct Coupled {
    pub model: MultibandModel,
    /// One member of each pair.
    pub part: PartSolution,
    /// Estimated discretisation errors of the conduction and of the valence levels, eV.
    errors_ev: [Vec<f64>; 2],
    field_v_per_nm: f64,
    /// The coefficients of each uniform layer, and of each node in graded ones.
    blocks: Vec<Block>,
    /// Which block stands at each node of each element.
    places: Vec<usize>,
    masses_m0: OnceLock<Vec<f64>>,
}

#[derive(Clone, Debug)]
struct Block {
    coefficient: BlockCoefficient,
    edges: Edges,
}

/// Band edges in eV.
#[derive(Clone, Copy, Debug)]
struct Edges {
    conduction: Option<f64>,
    heavy: f64,
    /// With the part of the split-off band that strain mixes in.
    light: f64,
}

/// The edge that a state is held by.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Edge {
    Conduction,
    Heavy,
    Light,
}

impl Edge {
    fn sign(self) -> f64 {
        match self {
            Edge::Conduction => 1.0,
            Edge::Heavy | Edge::Light => -1.0,
        }
    }
}

impl Edges {
    fn of(block: &BlockCoefficient) -> Edges {
        let c = &block.c[0];
        let [h, l, s] = [3, 2, 1].map(|from_end| c.nrows() - from_end);
        let (mean, half) = (0.5 * (c[(l, l)] + c[(s, s)]), 0.5 * (c[(l, l)] - c[(s, s)]));
        Edges {
            conduction: (h > 0).then(|| c[(0, 0)]),
            heavy: c[(h, h)],
            light: mean + half.hypot(c[(l, s)]),
        }
    }

    /// The edge counted away from the gap, in eV: upwards for electrons, downwards for holes.
    fn height(&self, edge: Edge) -> f64 {
        match edge {
            Edge::Conduction => self.conduction.unwrap_or(f64::INFINITY),
            Edge::Heavy => -self.heavy,
            Edge::Light => -self.light,
        }
    }
}

impl Coupled {
    /// Solves for so many levels of each side of the gap.
    ///
    /// # Errors
    /// The number of the first layer whose material does not suit the model, with the reason.
    pub fn solve(
        stack: &Stack,
        model: MultibandModel,
        wanted: Wanted,
        accuracy: Accuracy,
    ) -> Result<Coupled, (usize, Unsuitable)> {
        let operator = MultibandOperator::new(stack, model, Direction::ALONG_100)
            .map_err(|(layer, reason)| (layer, reason.into()))?;
        let (part, errors_ev) = solve_centre(&operator, wanted, accuracy.tolerance_ev);
        let mesh = &part.pencil.mesh;
        let mut blocks: Vec<Block> = Vec::new();
        let mut places = Vec::with_capacity(mesh.elements.len() * (mesh.order() + 1));
        let mut uniform: Option<usize> = None;
        for element in &mesh.elements {
            let layer = element.segment;
            for q in 0..=mesh.order() {
                if uniform != Some(layer) {
                    let t = mesh.fraction(element, q);
                    let coefficient = operator.block(layer, t).into_owned();
                    let edges = Edges::of(&coefficient);
                    blocks.push(Block { coefficient, edges });
                    uniform = stack.is_uniform(layer).then_some(layer);
                }
                places.push(blocks.len() - 1);
            }
        }
        Ok(Coupled {
            model,
            part,
            errors_ev,
            field_v_per_nm: stack.field_v_per_nm,
            blocks,
            places,
            masses_m0: OnceLock::new(),
        })
    }

    /// The levels of one side, from the gap.
    pub fn pairs(&self, side: Side) -> &[NearPair] {
        match side {
            Side::Conduction => &self.part.conduction,
            Side::Valence => &self.part.valence,
        }
    }

    /// All levels, those of the conduction band first.
    pub fn all_pairs(&self) -> Vec<&NearPair> {
        self.part
            .conduction
            .iter()
            .chain(&self.part.valence)
            .collect()
    }

    pub fn pencil(&self) -> &MatrixPencil {
        &self.part.pencil
    }

    fn mesh(&self) -> &Mesh {
        &self.part.pencil.mesh
    }

    /// What the energy of light between two states is set against: E_P in use where the layer is at its bottom, in eV.
    /// `None` for six bands.
    pub fn kane_energy_ev(&self, layer: usize) -> Option<f64> {
        let element = self
            .mesh()
            .elements
            .iter()
            .position(|e| e.segment == layer)?;
        let block = &self.blocks[self.places[element * (self.mesh().order() + 1)]];
        (self.model == MultibandModel::EightBand).then(|| block.coefficient.kane_energy_ev())
    }

    /// The edge of the band in each layer at its bottom, the field left out: conduction, heavy and light holes, in eV.
    pub fn layer_edges_ev(&self) -> Vec<[f64; 3]> {
        let per_element = self.mesh().order() + 1;
        let mut edges = Vec::new();
        for (index, element) in self.mesh().elements.iter().enumerate() {
            if element.segment == edges.len() {
                let own = self.blocks[self.places[index * per_element]].edges;
                let conduction = own.conduction.unwrap_or(f64::INFINITY);
                edges.push([conduction, own.heavy, own.light]);
            }
        }
        edges
    }

    /// The coefficients at a node of an element.
    pub fn at(&self, element: usize, q: usize) -> At<'_> {
        let mesh = self.mesh();
        let block = &self.blocks[self.places[element * (mesh.order() + 1) + q]].coefficient;
        At {
            a: &block.a,
            g: &block.g[0],
            c: &block.c[0],
            raised: self.field_v_per_nm * mesh.position(&mesh.elements[element], q),
        }
    }

    /// What is known of each state of one side, those nearest the gap first.
    pub fn states(&self, side: Side) -> Vec<State> {
        let masses_m0 = self.masses_m0.get_or_init(|| self.in_plane_masses_m0());
        let offset = match side {
            Side::Conduction => 0,
            Side::Valence => self.part.conduction.len(),
        };
        let sign = own_edges(side)[0].sign();
        let floor_ev = sign * self.edge_ev(side);
        let pairs = self.pairs(side).iter().enumerate();
        pairs
            .map(|(index, pair)| {
                let shares = shares(&self.part.pencil, pair);
                let place = state::place(self.mesh(), &self.density(side, index));
                let held = self.held_by(side, &shares);
                let hold = self.hold(&held, pair.value);
                let wall_shift_ev = match hold {
                    Hold::Bound => self.wall_shift_ev(pair, held[0]),
                    Hold::Leaky | Hold::Walls => 0.0,
                };
                State {
                    energy_ev: pair.value,
                    from_edge_ev: sign * pair.value - floor_ev,
                    error_ev: self.errors_ev[usize::from(side == Side::Valence)][index],
                    in_plane_mass_m0: masses_m0[offset + index],
                    centre_nm: place.centre_nm,
                    extent_nm: place.extent_nm,
                    layer: place.layer,
                    layer_share: place.layer_share,
                    hold,
                    wall_shift_ev,
                    shares: Some(shares),
                }
            })
            .collect()
    }

    /// Second derivatives at k∥ = 0; see [`State::in_plane_mass_m0`].
    fn in_plane_masses_m0(&self) -> Vec<f64> {
        let [first, second] = [0, 1].map(|order| self.order(order));
        let masses = masses_m0(&self.part, &first, &second).into_iter();
        masses.map(|mass| mass.unwrap_or(0.0)).collect()
    }

    /// The term of first (0) or second order (1) in k∥.
    fn order(&self, order: usize) -> MatrixPencil {
        let mut places = self.places.iter();
        MatrixPencil::new(self.mesh().clone(), self.model.components(), |_, _| {
            let place = places.next().copied().unwrap_or(0);
            let [first, second] = self.blocks[place].coefficient.orders(Part::Plus);
            Cow::Owned(if order == 0 { first } else { second })
        })
    }

    /// How light couples each pair of a conduction and a valence state at k∥ = 0.
    pub fn interband_strengths(&self) -> Vec<Strength> {
        strengths(&self.part, &self.order(0))
    }

    /// The probability density at the nodes of each element, in 1/nm: all functions of the state together.
    pub fn density(&self, side: Side, index: usize) -> Vec<f64> {
        let functions = self.functions(side, index);
        let mesh = self.mesh();
        let mut density = Vec::with_capacity(self.places.len());
        for e in 0..mesh.elements.len() {
            let p = mesh.order();
            density.extend(
                (e * p..=(e + 1) * p)
                    .map(|node| functions.iter().map(|f| f[node] * f[node]).sum::<f64>()),
            );
        }
        density
    }

    /// The edge of one side where it is nearest to the other, with the field, in eV.
    pub fn edge_ev(&self, side: Side) -> f64 {
        let edges = own_edges(side);
        let heights = edges.iter().flat_map(|&edge| self.heights(edge));
        edges[0].sign() * heights.fold(f64::INFINITY, f64::min)
    }

    /// The edges of one side with the field at the nodes of each element, in eV: that of electrons, or those of heavy and
    /// of light holes.
    pub fn edge_lines_ev(&self, side: Side) -> Vec<Vec<f64>> {
        let line = |&edge: &Edge| -> Vec<f64> {
            let heights = self.heights(edge);
            heights.map(|height| edge.sign() * height).collect()
        };
        own_edges(side).iter().map(line).collect()
    }

    /// What part of a state each of its [`functions`](Self::functions) holds.
    pub fn shares(&self, side: Side, index: usize) -> Vec<f64> {
        let own = shares(&self.part.pencil, &self.pairs(side)[index]);
        let all = [own.conduction, own.heavy, own.light, own.split_off];
        all[all.len() - self.model.components()..].to_vec()
    }

    /// The values of a state's functions at all nodes: (conduction,) heavy, light, split-off.
    pub fn functions(&self, side: Side, index: usize) -> Vec<Vec<f64>> {
        let vector = &self.pairs(side)[index].vector;
        let components = 0..self.model.components();
        components
            .map(|k| self.part.pencil.function(vector, k))
            .collect()
    }

    /// |⟨i|z|j⟩| of two states of one side, in nm.
    pub fn dipole_nm(&self, side: Side, i: usize, j: usize) -> f64 {
        let pairs = self.pairs(side);
        moment(&self.part.pencil, &pairs[i].vector, &pairs[j].vector).abs()
    }

    /// The overlaps of a conduction state's conduction function with a valence state's functions of each kind of hole, added
    /// up in square: the square root of that.
    pub fn interband_overlap(&self, conduction: usize, valence: usize) -> f64 {
        let n = self.part.pencil.components();
        let (upper, lower) = (
            self.part.conduction[conduction].vector.chunks_exact(n),
            self.part.valence[valence].vector.chunks_exact(n),
        );
        let mut overlaps = vec![0.0; n];
        for (upper, lower) in upper.zip(lower) {
            for (sum, hole) in overlaps[1..].iter_mut().zip(&lower[1..]) {
                *sum += upper[0] * hole;
            }
        }
        overlaps.iter().map(|o| o * o).sum::<f64>().sqrt()
    }

    /// √(w ρ) of every state of one side at the nodes of each element.
    pub(super) fn amplitudes(&self, side: Side) -> Vec<Vec<f64>> {
        let states = 0..self.pairs(side).len();
        states
            .map(|index| envelope::amplitude(self.mesh(), self.density(side, index)))
            .collect()
    }

    /// As [`layer_envelopes`](super::layer_envelopes), a state's functions one after the other.
    pub(super) fn layer_envelopes(&self, side: Side, stack: &Stack) -> Vec<Vec<f64>> {
        let states = 0..self.pairs(side).len();
        states
            .map(|index| {
                let functions = self.functions(side, index);
                let functions: Vec<&[f64]> = functions.iter().map(|f| &f[..]).collect();
                envelope::layer_values(self.mesh(), &functions, stack).concat()
            })
            .collect()
    }

    /// An edge with the field at all nodes, counted away from the gap.
    fn heights(&self, edge: Edge) -> impl Iterator<Item = f64> + '_ {
        let per_element = self.mesh().order() + 1;
        self.places.iter().enumerate().map(move |(node, &place)| {
            let raised = self.at(node / per_element, node % per_element).raised;
            self.blocks[place].edges.height(edge) + edge.sign() * raised
        })
    }

    /// The edges whose barriers a state meets, its own first. At k∥ = 0 heavy holes are coupled to nothing.
    fn held_by(&self, side: Side, shares: &Shares) -> Vec<Edge> {
        match (side, self.model) {
            (Side::Conduction, _) => vec![Edge::Conduction, Edge::Light],
            (Side::Valence, _) if shares.heavy > 0.5 => vec![Edge::Heavy],
            (Side::Valence, MultibandModel::SixBand) => vec![Edge::Light],
            (Side::Valence, MultibandModel::EightBand) => vec![Edge::Light, Edge::Conduction],
        }
    }

    /// What keeps a state of this energy in the stack.
    fn hold(&self, edges: &[Edge], energy_ev: f64) -> Hold {
        let mut hold = Hold::Bound;
        for &edge in edges {
            let level_ev = edge.sign() * energy_ev;
            let heights: Vec<f64> = self.heights(edge).collect();
            if level_ev > self.lower_outer_ev(edge) {
                return Hold::Walls;
            }
            if level_ev > heights[0].min(heights[heights.len() - 1]) {
                hold = Hold::Leaky;
            }
        }
        hold
    }

    /// The lower of the two outer barriers, each at its highest point, counted away from the gap.
    fn lower_outer_ev(&self, edge: Edge) -> f64 {
        let elements = &self.mesh().elements;
        let last = elements.last().map_or(0, |e| e.segment);
        let per_element = self.mesh().order() + 1;
        let highest = |segment: usize| {
            self.heights(edge)
                .enumerate()
                .filter(|(node, _)| elements[node / per_element].segment == segment)
                .fold(f64::NEG_INFINITY, |highest, (_, height)| {
                    highest.max(height)
                })
        };
        highest(0).min(highest(last))
    }

    /// Number of states of one side that lie nearer to the gap than both outer barriers; of holes those above the highest
    /// outer valence edge.
    pub fn bound_count(&self, side: Side) -> usize {
        let pencil = &self.part.pencil;
        let gap = self.gap_number();
        match side {
            Side::Conduction => pencil
                .count_below(self.lower_outer_ev(Edge::Conduction))
                .saturating_sub(gap),
            Side::Valence => {
                let edge_ev = -self
                    .lower_outer_ev(Edge::Heavy)
                    .min(self.lower_outer_ev(Edge::Light));
                gap.saturating_sub(pencil.count_below(edge_ev))
            }
        }
    }

    /// How many levels the matrix has below the gap.
    fn gap_number(&self) -> usize {
        3 * (self.mesh().node_count() - 2)
    }

    /// How far a bound level would move towards the gap if the walls stood at infinity: ψ′·A ψ′ there is their pressure,
    /// which falls as exp(−2κd) when a wall moves out by d, with κ the slowest decay of the outer layer's bulk.
    fn wall_shift_ev(&self, pair: &NearPair, own: Edge) -> f64 {
        let mesh = self.mesh();
        let n = self.part.pencil.components();
        let functions: Vec<Vec<f64>> = (0..n)
            .map(|k| self.part.pencil.function(&pair.vector, k))
            .collect();
        let last = mesh.elements.len() - 1;
        let mut slopes = [0.0; MAX_ORDER + 1];
        let mut shift_ev = 0.0;
        for (element, q) in [(0, 0), (last, mesh.order())] {
            let scale = 2.0 / mesh.elements[element].length;
            let slope: Vec<f64> = functions
                .iter()
                .map(|f| {
                    let local = mesh.local(element, f);
                    mesh.reference.slopes(local, &mut slopes[..local.len()]);
                    scale * slopes[q]
                })
                .collect();
            let at = self.at(element, q);
            let pressure = form(at.a, &slope, &slope);
            let kappa = slowest_decay(&at, pair.value, own);
            shift_ev += kappa.map_or(0.0, |kappa| own.sign() * pressure / (2.0 * kappa));
        }
        shift_ev.max(0.0)
    }

    /// Checks of the solution against the commutation rule. The mean force is not among them.
    pub fn audit(&self) -> Audit {
        let pairs = self.all_pairs();
        let mesh = self.mesh();
        let p = mesh.order();
        let states: Vec<Vec<Nodal>> = pairs.iter().map(|pair| self.nodal(pair)).collect();
        let speeds: Vec<f64> = states.iter().map(|nodal| self.speed(nodal)).collect();
        let mut audit = Audit {
            returned: pairs.len(),
            counted: pairs.len(),
            ..Audit::CLEAN
        };
        for i in 0..pairs.len() {
            for j in i..pairs.len() {
                let inner: f64 = pairs[i]
                    .vector
                    .iter()
                    .zip(&pairs[j].vector)
                    .map(|(x, y)| x * y)
                    .sum();
                let wanted = f64::from(u8::from(i == j));
                audit.orthonormality = audit.orthonormality.max((inner - wanted).abs());
                if i == j {
                    continue;
                }
                // ⟨i|[H, z]|j⟩ = ∫ ψ_i′·A ψ_j − ψ_i·A ψ_j′ + ψ_i·(Gᵀ − G) ψ_j.
                let velocity = state::integrate(mesh, |e, q| {
                    let (x, y) = (&states[i][e * (p + 1) + q], &states[j][e * (p + 1) + q]);
                    let at = self.at(e, q);
                    let terms = [
                        form(at.a, &x.slopes, &y.values),
                        -form(at.a, &x.values, &y.slopes),
                        form(at.g, &y.values, &x.values),
                        -form(at.g, &x.values, &y.values),
                    ];
                    terms.iter().sum()
                });
                let dipole = moment(&self.part.pencil, &pairs[i].vector, &pairs[j].vector);
                let off = (velocity - (pairs[i].value - pairs[j].value) * dipole).abs();
                // Against what each moves itself: heavy holes have no velocity to anything else.
                audit.velocity = audit.velocity.max(off / (speeds[i] * speeds[j]).sqrt());
            }
            audit.sum_rule = audit
                .sum_rule
                .max(self.sum_rule_deviation(pairs[i], &states[i]));
        }
        let gap = self.gap_number();
        let counted = |side: Side| {
            let pairs = self.pairs(side);
            let Some(last) = pairs.last() else {
                return 0;
            };
            let clear = 1e-9 * (1.0 + last.value.abs());
            let up_to = |beyond: f64| match side {
                Side::Conduction => self
                    .part
                    .pencil
                    .count_below(last.value + beyond)
                    .saturating_sub(gap),
                Side::Valence => {
                    gap.saturating_sub(self.part.pencil.count_below(last.value - beyond))
                }
            };
            let counted = up_to(clear);
            // A coincident level just beyond the last is not missing.
            match counted > pairs.len() && up_to(-clear) < pairs.len() {
                true => pairs.len(),
                false => counted,
            }
        };
        audit.counted = counted(Side::Conduction) + counted(Side::Valence);
        audit
    }

    /// ∫ |ψ·A ψ′| + |ψ·G ψ| dz, function by function: the size of a state's velocity.
    fn speed(&self, nodal: &[Nodal]) -> f64 {
        let mesh = self.mesh();
        state::integrate(mesh, |e, q| {
            let at = self.at(e, q);
            let Nodal { values, slopes } = &nodal[e * (mesh.order() + 1) + q];
            let sizes = |list: &[f64]| list.iter().map(|v| v.abs()).collect::<Vec<f64>>();
            let (values, slopes) = (sizes(values), sizes(slopes));
            form(&at.a.abs(), &values, &slopes) + form(&at.g.abs(), &values, &values)
        })
    }

    /// ⟨zψ| H − E |zψ⟩ = ∫ ψ·A ψ dz, z from the state's centre.
    fn sum_rule_deviation(&self, pair: &NearPair, nodal: &[Nodal]) -> f64 {
        let mesh = self.mesh();
        let centre = moment(&self.part.pencil, &pair.vector, &pair.vector);
        let mut size = 0.0;
        let difference = state::integrate(mesh, |e, q| {
            let at = self.at(e, q);
            let Nodal { values, slopes } = &nodal[e * (mesh.order() + 1) + q];
            let z = mesh.position(&mesh.elements[e], q) - centre;
            let lifted: Vec<f64> = values.iter().map(|v| z * v).collect();
            let slope: Vec<f64> = values.iter().zip(slopes).map(|(v, s)| v + z * s).collect();
            let square: f64 = lifted.iter().map(|v| v * v).sum();
            let terms = [
                form(at.a, &slope, &slope),
                2.0 * form(at.g, &slope, &lifted),
                form(at.c, &lifted, &lifted) + (at.raised - pair.value) * square,
                -form(at.a, values, values),
            ];
            let weight = 0.5 * mesh.elements[e].length * mesh.reference.weights[q];
            size += weight * terms.iter().map(|t| t.abs()).sum::<f64>();
            terms.iter().sum()
        });
        difference.abs() / size
    }

    /// Functions and slopes of a state at the nodes of each element.
    fn nodal(&self, pair: &NearPair) -> Vec<Nodal> {
        let mesh = self.mesh();
        let (n, p) = (self.part.pencil.components(), mesh.order());
        let mut list = vec![
            Nodal {
                values: vec![0.0; n],
                slopes: vec![0.0; n],
            };
            self.places.len()
        ];
        let mut slopes = [0.0; MAX_ORDER + 1];
        for k in 0..n {
            let function = self.part.pencil.function(&pair.vector, k);
            for (e, element) in mesh.elements.iter().enumerate() {
                let local = mesh.local(e, &function);
                mesh.reference.slopes(local, &mut slopes[..=p]);
                for q in 0..=p {
                    let node = &mut list[e * (p + 1) + q];
                    node.values[k] = local[q];
                    node.slopes[k] = 2.0 / element.length * slopes[q];
                }
            }
        }
        list
    }
}

/// The edges that belong to one side of the gap.
fn own_edges(side: Side) -> &'static [Edge] {
    match side {
        Side::Conduction => &[Edge::Conduction],
        Side::Valence => &[Edge::Heavy, Edge::Light],
    }
}

/// A state at one node.
#[derive(Clone, Debug)]
struct Nodal {
    values: Vec<f64>,
    slopes: Vec<f64>,
}

/// x · M y.
fn form(matrix: &DMatrix<f64>, x: &[f64], y: &[f64]) -> f64 {
    let mut sum = 0.0;
    for (c, y) in y.iter().enumerate() {
        for (r, x) in x.iter().enumerate() {
            sum += x * matrix[(r, c)] * y;
        }
    }
    sum
}

/// The smallest κ with which a state of this energy decays as exp(−κz) in a bulk. Heavy holes stand alone.
fn slowest_decay(at: &At, energy_ev: f64, own: Edge) -> Option<f64> {
    let n = at.a.nrows();
    let heavy = n - 3;
    let kept: Vec<usize> = match own {
        Edge::Heavy => vec![heavy],
        Edge::Conduction | Edge::Light => (0..n).filter(|&k| k != heavy).collect(),
    };
    let slowest = *decay_rates(at, energy_ev, &kept)?.first()?;
    (slowest > 0.0 && slowest.is_finite()).then_some(slowest)
}
