//! One period as a line whose ends meet.

use crate::models::BandOperator;
use crate::numerics::mesh::{Element, Mesh};
use crate::numerics::pencil::{Coefficient, Pencil};

/// The period is cut at this fraction of a layer. An envelope that vanishes at the cut would be one of the inner problem;
/// the golden section is worst met by nodes of any order.
const CUT: f64 = 0.381_966_011_250_105;

/// A part of a layer, from one fraction of its width to another.
#[derive(Clone, Copy, Debug)]
struct Part {
    layer: usize,
    from: f64,
    to: f64,
}

/// The period cut inside of its deepest layer, where low levels are large.
#[derive(Clone, Debug)]
pub(super) struct Cell<'s> {
    operator: &'s BandOperator<'s>,
    parts: Vec<Part>,
    pub lengths_nm: Vec<f64>,
}

impl<'s> Cell<'s> {
    pub fn new(operator: &'s BandOperator<'s>) -> Cell<'s> {
        let layers = &operator.stack().layers;
        let depth = |layer: usize| operator.at(layer, 0.5, 0.0).constant;
        let cut = (0..layers.len())
            .min_by(|a, b| {
                let deeper = depth(*a).total_cmp(&depth(*b));
                deeper.then(layers[*b].width_nm.total_cmp(&layers[*a].width_nm))
            })
            .unwrap_or(0);
        let whole = |layer| Part {
            layer,
            from: 0.0,
            to: 1.0,
        };
        let mut parts = vec![Part {
            from: CUT,
            ..whole(cut)
        }];
        parts.extend((cut + 1..layers.len()).chain(0..cut).map(whole));
        parts.push(Part {
            to: CUT,
            ..whole(cut)
        });
        let lengths_nm = parts
            .iter()
            .map(|part| (part.to - part.from) * layers[part.layer].width_nm);
        Cell {
            operator,
            lengths_nm: lengths_nm.collect(),
            parts,
        }
    }

    pub fn layers(&self) -> usize {
        self.operator.stack().layers.len()
    }

    pub fn pencil(&self, mesh: Mesh) -> Pencil {
        Pencil::new(mesh, |mesh, element, q| self.at(mesh, element, q))
    }

    /// The layer that an element belongs to, and the fraction of its width at a node.
    pub fn place(&self, mesh: &Mesh, element: &Element, q: usize) -> (usize, f64) {
        let part = self.parts[element.segment];
        let t = part.from + (part.to - part.from) * mesh.fraction(element, q);
        (part.layer, t)
    }

    fn at(&self, mesh: &Mesh, element: &Element, q: usize) -> Coefficient {
        let (layer, t) = self.place(mesh, element, q);
        // There is no field: the height does not matter.
        self.operator.at(layer, t, 0.0)
    }
}
