//! ħ²/2m∥ at the nodes of a solution, where it is not the mass along growth.

use crate::models::{BandOperator, InPlane};
use crate::numerics::mesh::Element;
use crate::numerics::pencil::Pencil;

/// At the nodes of each element; `None` where no node has a mass in the plane of its own.
pub type InPlaneNodes = Option<Vec<Option<InPlane>>>;

/// `place` tells the layer of a node and the part of the layer's width below it. Whatever raises the edge there (field,
/// charge) raises the edges that the mass depends on too.
pub fn in_plane(
    operator: &BandOperator,
    pencil: &Pencil,
    place: impl Fn(&Element, usize) -> (usize, f64),
) -> InPlaneNodes {
    let mesh = &pencil.mesh;
    let mut known: Option<(usize, Option<InPlane>, f64)> = None;
    let mut list = Vec::with_capacity(pencil.coefficients.len());
    for (index, element) in mesh.elements.iter().enumerate() {
        for (q, at) in pencil.at(index).iter().enumerate() {
            let (layer, t) = place(element, q);
            let (own, edge) = match known.take() {
                Some((same, own, edge)) if same == layer && operator.stack().is_uniform(layer) => {
                    (own, edge)
                }
                _ => (
                    operator.in_plane(layer, t),
                    operator.flat(layer, t).constant,
                ),
            };
            known = Some((layer, own.clone(), edge));
            let raised_ev = operator.band().sign() * (at.constant - edge);
            list.push(own.map(|in_plane| in_plane.raised(raised_ev)));
        }
    }
    list.iter().any(Option::is_some).then_some(list)
}
