//! A few modules of a cascade in a field, between pads of their highest barrier: the least of the cascade in which a module
//! does not feel the ends.
//!
//! Upstream every barrier stands higher than the one before, so nothing is lost by ending there. Downstream they fall until
//! a state of the module lies above them: it can leave, and no stationary state is exactly its own. The pad there is level
//! and as high as the module's own highest edge, so that the window adds no states to those of its modules.

use crate::models::{BandOperator, raised};
use crate::numerics::eigenpairs::{Eigenpair, between};
use crate::numerics::mesh::Mesh;
use crate::numerics::pencil::Pencil;
use crate::structure::Stack;
use crate::subbands::{self, InPlaneNodes, pieces_up_to};

/// Width of each pad: envelopes that reach an end of the window have died out long before.
const PAD_NM: f64 = 20.0;

/// How many modules stand before and behind the one that counts, in the direction in which electrons lose energy.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Neighbours {
    pub upstream: usize,
    pub downstream: usize,
}

/// A window of modules, one of which counts.
#[derive(Clone, Debug)]
pub(super) struct Window<'s> {
    /// Of the stack of one module.
    operator: &'s BandOperator<'s>,
    /// The layer of the module that each segment is, pads included.
    layers: Vec<usize>,
    lengths_nm: Vec<f64>,
    pieces: Vec<usize>,
    pub modules: usize,
    /// Modules below the one that counts.
    below: usize,
    pub period_nm: f64,
}

impl<'s> Window<'s> {
    /// The operator is that of one module, whose top and bottom layers follow one another in the cascade.
    pub fn new(
        operator: &'s BandOperator<'s>,
        neighbours: Neighbours,
        field_v_per_nm: f64,
    ) -> Window<'s> {
        let module = operator.stack();
        let highest = (0..module.layers.len())
            .map(|layer| (layer, operator.at(layer, 0.5, 0.0).constant))
            .max_by(|a, b| a.1.total_cmp(&b.1).then(b.0.cmp(&a.0)))
            .map_or(0, |(layer, _)| layer);
        let modules = neighbours.upstream + 1 + neighbours.downstream;
        let below = if field_v_per_nm < 0.0 {
            neighbours.upstream
        } else {
            neighbours.downstream
        };
        let mut layers = vec![highest];
        let mut lengths_nm = vec![PAD_NM];
        for _ in 0..modules {
            layers.extend(0..module.layers.len());
            lengths_nm.extend(module.layers.iter().map(|layer| layer.width_nm));
        }
        layers.push(highest);
        lengths_nm.push(PAD_NM);
        let mut window = Window {
            operator,
            pieces: vec![1; layers.len()],
            layers,
            lengths_nm,
            modules,
            below,
            period_nm: module.total_width_nm(),
        };
        let sample = window.pencil(field_v_per_nm, 2);
        let [_, top_ev] = window.middle_edges_ev(&sample);
        let own = pieces_up_to(&sample, top_ev);
        // All copies alike: a module's nodes are those of the next one, moved by a period.
        let count = module.layers.len();
        for segment in 1..window.pieces.len() - 1 {
            let alike = (0..modules).map(|copy| own[1 + copy * count + (segment - 1) % count]);
            window.pieces[segment] = alike.max().unwrap_or(1);
        }
        for pad in [0, own.len() - 1] {
            window.pieces[pad] = own[pad];
        }
        window
    }

    fn module(&self) -> &'s Stack {
        self.operator.stack()
    }

    /// Twice as many elements everywhere.
    pub fn halve(&mut self) {
        self.pieces.iter_mut().for_each(|n| *n *= 2);
    }

    /// The height of the window's bottom above the lower face of the module: negative.
    pub fn bottom_nm(&self) -> f64 {
        -(PAD_NM + self.below as f64 * self.period_nm)
    }

    /// The highest edge of the module in a field, in eV.
    fn top_ev(&self, field_v_per_nm: f64) -> f64 {
        let mut top_ev = f64::NEG_INFINITY;
        let mut z_nm = 0.0;
        for (layer, own) in self.module().layers.iter().enumerate() {
            for t in [0.0, 1.0] {
                let edge_ev = self.operator.at(layer, t, 0.0).constant;
                top_ev = top_ev.max(edge_ev + field_v_per_nm * (z_nm + t * own.width_nm));
            }
            z_nm += own.width_nm;
        }
        top_ev
    }

    /// The problem in a field. The field's energy is zero at the lower face of the module.
    pub fn pencil(&self, field_v_per_nm: f64, order: usize) -> Pencil {
        let bottom_nm = self.bottom_nm();
        let last = self.layers.len() - 1;
        let first_face_nm = bottom_nm + PAD_NM;
        let last_face_nm = first_face_nm + self.modules as f64 * self.period_nm;
        let top_ev = self.top_ev(field_v_per_nm);
        let mesh = Mesh::new(&self.lengths_nm, &self.pieces, order);
        Pencil::new(mesh, |mesh, element, q| {
            let layer = self.layers[element.segment];
            let own = self.operator.at(layer, mesh.fraction(element, q), 0.0);
            let face_nm = match element.segment {
                0 => first_face_nm,
                segment if segment == last => last_face_nm,
                _ => {
                    let z_nm = bottom_nm + mesh.position(element, q);
                    return raised(own, field_v_per_nm * z_nm);
                }
            };
            let level_ev = (own.constant + field_v_per_nm * face_nm).max(top_ev);
            raised(own, level_ev - own.constant)
        })
    }

    /// The masses in the plane of that problem.
    pub fn in_plane(&self, pencil: &Pencil) -> InPlaneNodes {
        subbands::in_plane(self.operator, pencil, |element, q| {
            (
                self.layers[element.segment],
                pencil.mesh.fraction(element, q),
            )
        })
    }

    /// The segments of the module.
    pub fn middle(&self) -> std::ops::Range<usize> {
        let count = self.module().layers.len();
        let first = 1 + self.below * count;
        first..first + count
    }

    /// The module of a segment, counted from the one that counts; `None` for a pad.
    pub fn module_of(&self, segment: usize) -> Option<isize> {
        let count = self.module().layers.len();
        let copy = (segment.checked_sub(1)?) / count;
        (copy < self.modules).then(|| copy as isize - self.below as isize)
    }

    /// The layer of the module that a segment is.
    pub fn layer_of(&self, segment: usize) -> usize {
        self.layers[segment]
    }

    /// The lowest and the highest band edge of the module, the field included, in eV.
    pub fn middle_edges_ev(&self, pencil: &Pencil) -> [f64; 2] {
        let middle = self.middle();
        let own = pencil.mesh.elements.iter().enumerate();
        let edges = own
            .filter(|(_, element)| middle.contains(&element.segment))
            .flat_map(|(index, _)| pencil.at(index))
            .map(|c| c.constant);
        edges.fold([f64::INFINITY, f64::NEG_INFINITY], |[low, high], c| {
            [low.min(c), high.max(c)]
        })
    }

    /// How many nodes a period is.
    fn period_nodes(&self, order: usize) -> usize {
        self.middle()
            .map(|segment| self.pieces[segment])
            .sum::<usize>()
            * order
    }

    /// The overlap of the conduction band's envelopes of one state with another, moved by whole periods first.
    pub fn overlap_moved(
        &self,
        pencil: &Pencil,
        state: &Eigenpair,
        other: &Eigenpair,
        periods: isize,
    ) -> f64 {
        let shift = periods * self.period_nodes(pencil.mesh.order()) as isize;
        let weights = pencil.weights();
        let (mut product, mut norm, mut other_norm) = (0.0, 0.0, 0.0);
        for (k, weight) in weights.iter().enumerate() {
            norm += weight * state.vector[k] * state.vector[k];
            other_norm += weight * other.vector[k] * other.vector[k];
            let there = usize::try_from(k as isize + shift).ok();
            if let Some(value) = there.and_then(|at| other.vector.get(at)) {
                product += weight * state.vector[k] * value;
            }
        }
        product / (norm * other_norm).sqrt()
    }

    /// All states of the window between two energies.
    pub fn states(&self, pencil: &Pencil, [low_ev, high_ev]: [f64; 2]) -> Vec<Eigenpair> {
        between(pencil, low_ev, high_ev)
    }
}
