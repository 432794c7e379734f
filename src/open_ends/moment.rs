//! Elements of the position between outgoing states: bilinear, without conjugation, what lies outside included.

use super::line::Line;
use crate::numerics::complex_banded::{C64, I, ONE};
use crate::numerics::open_pencil::{End, OpenPencil, Raised, product};
use crate::numerics::outgoing::Outgoing;
use crate::numerics::pencil::Coefficient;

/// ⟨i|z − origin|j⟩ in nm, with all components of the states where the mass depends on energy.
pub fn moment(line: &Line, i: &Outgoing, j: &Outgoing, origin_nm: f64) -> C64 {
    let image = line.pencil.weighted(i.value, j.value, &j.vector, |e, q| {
        line.position_nm(e, q) - origin_nm
    });
    let mut sum = product(&i.vector, &image);
    let last = line.pencil.size() - 1;
    let p = line.pencil.mesh.order();
    let ends = [
        (0, line.position_nm(0, 0), -1.0),
        (last, line.position_nm(last / p - 1, p), 1.0),
    ];
    for (end, (node, z_nm, outwards)) in line.pencil.ends.iter().zip(ends) {
        let End::Flat(lead) = end else { continue };
        let (k_i, k_j) = (wave_number(lead, i.value), wave_number(lead, j.value));
        let flat = Raised {
            own: *lead,
            raise: C64::from(0.0),
        };
        // ∫ (z + s) exp(i (k_i + k_j) s) ds, continued from waves that die out.
        let reach = I / (k_i + k_j);
        let components = ONE - flat.divided(i.value, j.value) * k_i * k_j;
        let outside = reach * (z_nm - origin_nm) + outwards * reach * reach;
        sum += i.vector[node] * j.vector[node] * components * outside;
    }
    sum
}

/// k of a wave that leaves through a flat end, or dies out there, in 1/nm.
pub fn wave_number(lead: &Coefficient, energy: C64) -> C64 {
    let flat = Raised {
        own: *lead,
        raise: C64::from(0.0),
    };
    crate::numerics::open_pencil::conductance(lead, energy).0 / flat.a(energy)
}

/// ∫ over the elements of a range, of f(element, local node) on the real line.
pub fn integrate(
    pencil: &OpenPencil,
    [from, to]: [usize; 2],
    mut f: impl FnMut(usize, usize) -> f64,
) -> f64 {
    let mut sum = 0.0;
    for e in from..to {
        let half = 0.5 * pencil.mesh.elements[e].length;
        for (q, w) in pencil.mesh.reference.weights.iter().enumerate() {
            sum += half * w * f(e, q);
        }
    }
    sum
}
