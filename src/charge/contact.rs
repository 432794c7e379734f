//! The Fermi level of a contact.

use super::ChargeError;
use super::dopants::{Dopants, Site, levels_of_dopants};
use super::fermi::{BulkBand, bulk_fermi_ev};
use crate::constants::NM3_PER_CM3;
use crate::materials::hole_edges;
use crate::models::Band;
use crate::structure::{Bending, Stack};

/// The Fermi level of the lowest layer's bulk, in eV: parabolic bands of its own masses. `edge_ev` is its conduction edge.
pub fn contact_fermi_ev(
    stack: &Stack,
    bending: &Bending,
    asked: &[(Band, usize)],
    edge_ev: f64,
) -> Result<f64, ChargeError> {
    let layer = stack.layers.first().ok_or(ChargeError::NoContact)?;
    let material = stack.material_at(0, 0.0);
    let holes = asked.iter().any(|(band, _)| band.sign() < 0.0);
    let valence = hole_edges(&material, stack.substrate_lattice_nm()).filter(|_| holes);
    let valence = valence.map(|edges| {
        let mass = |mass: Option<f64>| mass.unwrap_or(0.0).powf(1.5);
        let both = mass(material.heavy_hole_mass_m0) + mass(material.light_hole_mass_m0);
        BulkBand {
            edge_ev: edges.heavy_ev.max(edges.light_ev),
            mass_m0: both.powf(2.0 / 3.0),
        }
    });
    let conduction = BulkBand {
        edge_ev,
        mass_m0: material.electron_mass_m0.unwrap_or(1.0),
    };
    let levels_ev = levels_of_dopants(bending, &material, stack, edge_ev);
    let temperature_k = stack.temperature_k();
    let kinds = [
        (layer.all_donors_cm3(), 1.0, bending.donors, levels_ev[0]),
        (
            layer.all_acceptors_cm3(),
            -1.0,
            bending.acceptors,
            levels_ev[1],
        ),
    ]
    .map(|(density, charge, ionisation, level_ev)| Dopants {
        sites: vec![Site {
            node: 0,
            load: density / NM3_PER_CM3,
            level_ev,
        }],
        charge,
        ionisation,
        temperature_k,
    });
    let excess = |fermi_ev: f64| {
        let mut sum = 0.0;
        for kind in &kinds {
            kind.each(|_| 0.0, fermi_ev, |_, charge, _| sum += charge);
        }
        sum
    };
    bulk_fermi_ev(conduction, valence, excess, temperature_k).ok_or(ChargeError::NoContact)
}
