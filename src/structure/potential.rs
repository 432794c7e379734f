//! The energy that charge adds to the edges, as polynomials on elements of the layers.

use crate::numerics::mesh::Mesh;

/// Energies of an electron at the nodes of elements that are parts of layers: a stack whose widths change a little takes
/// them along with its layers.
#[derive(Clone, Debug)]
pub struct Potential {
    mesh: Mesh,
    /// The first element of each layer, and one more than the last of all.
    first: Vec<usize>,
    /// In eV at the nodes of each element: for electrons and, without exchange, for holes.
    electron: Vec<f64>,
    hole: Vec<f64>,
    /// Barycentric weights of the nodes.
    barycentric: Vec<f64>,
}

impl Potential {
    /// Takes the values at the nodes of each element, element by element: (order + 1) per element.
    pub fn new(mesh: Mesh, electron: Vec<f64>, hole: Vec<f64>) -> Potential {
        let layers = mesh.elements.last().map_or(0, |e| e.segment + 1);
        let first = (0..=layers)
            .map(|layer| mesh.elements.partition_point(|e| e.segment < layer))
            .collect();
        let nodes = &mesh.reference.nodes;
        let barycentric = nodes.iter().map(|x| {
            let others = nodes.iter().filter(|other| *other != x);
            1.0 / others.map(|other| x - other).product::<f64>()
        });
        Potential {
            first,
            electron,
            hole,
            barycentric: barycentric.collect(),
            mesh,
        }
    }

    /// The energy of an electron of the conduction band at fraction `t` of a layer, in eV.
    pub fn electron_ev(&self, layer: usize, t: f64) -> f64 {
        self.at(&self.electron, layer, t)
    }

    /// The energy of an electron of the valence band at fraction `t` of a layer, in eV.
    pub fn hole_ev(&self, layer: usize, t: f64) -> f64 {
        self.at(&self.hole, layer, t)
    }

    /// Second form of the barycentric formula (Berrut and Trefethen, SIAM Rev. 46, 501 (2004), eq. 4.2).
    fn at(&self, values: &[f64], layer: usize, t: f64) -> f64 {
        let (Some(&first), Some(&end)) = (self.first.get(layer), self.first.get(layer + 1)) else {
            return 0.0;
        };
        if first >= end {
            return 0.0;
        }
        let pieces = (end - first) as f64;
        let index = first + ((t * pieces).max(0.0) as usize).min(end - first - 1);
        let element = &self.mesh.elements[index];
        let x = 2.0 * (t - element.start_fraction) / element.length_fraction - 1.0;
        let nodes = &self.mesh.reference.nodes;
        let own = &values[index * nodes.len()..(index + 1) * nodes.len()];
        let (mut above, mut below) = (0.0, 0.0);
        for ((node, weight), value) in nodes.iter().zip(&self.barycentric).zip(own) {
            let distance = x - node;
            if distance.abs() < 1e-14 {
                return *value;
            }
            above += weight / distance * value;
            below += weight / distance;
        }
        above / below
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A cubic on two layers, the second of three elements, comes back at any fraction.
    #[test]
    fn polynomials_come_back_exactly() {
        let mesh = Mesh::new(&[2.0, 3.0], &[1, 3], 4);
        let cubic = |z: f64| 0.3 * z.powi(3) - z + 0.1;
        let values: Vec<f64> = mesh
            .elements
            .iter()
            .flat_map(|element| (0..5).map(|q| cubic(mesh.position(element, q))))
            .collect();
        let hole = values.iter().map(|v| 2.0 * v).collect();
        let potential = Potential::new(mesh, values, hole);
        for k in 0..=20 {
            let t = f64::from(k) / 20.0;
            let off = potential.electron_ev(0, t) - cubic(2.0 * t);
            assert!(off.abs() < 1e-12, "{t}: {off}");
            let off = potential.hole_ev(1, t) - 2.0 * cubic(2.0 + 3.0 * t);
            assert!(off.abs() < 1e-12, "{t}: {off}");
        }
    }
}
