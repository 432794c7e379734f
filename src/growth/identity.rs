//! A short number by which a wafer can be traced to the stack that it was grown from.

use crate::structure::{Stack, Structure};
use sha2::{Digest, Sha256};
use std::fmt::Write;

/// Hexadecimal digits that are kept: 48 bits, in which a laboratory's designs do not meet by chance.
const DIGITS: usize = 12;

/// The beginning of the SHA-256 of the resolved stack: layers with their widths, doping and resolved materials, the
/// temperature, the field and the substrate's lattice constant. Names, comments, units and the way in which repeats are
/// written leave it as it is.
pub fn content_id(structure: &Structure, stack: &Stack) -> String {
    let mut text = String::new();
    // Writing to a String cannot fail.
    let _ = writeln!(
        text,
        "{:.6} K {:.9} V/nm on {:.9?} nm",
        stack.temperature_k(),
        stack.field_v_per_nm,
        stack.substrate_lattice_nm()
    );
    let mut materials: Vec<Option<String>> = vec![None; structure.entries.len()];
    for (index, layer) in stack.layers.iter().enumerate() {
        let Some(known) = materials.get_mut(layer.entry) else {
            continue;
        };
        let material = known.get_or_insert_with(|| {
            let faces: &[f64] = if stack.is_uniform(index) {
                &[0.0]
            } else {
                &[0.0, 0.5, 1.0]
            };
            let resolved = faces
                .iter()
                .map(|t| format!("{:.9?}\n", stack.material_at(index, *t)));
            hex(&Sha256::digest(resolved.collect::<String>()))
        });
        let _ = writeln!(
            text,
            "{:.6} nm {:.6e} {:.6e} cm^-3 {material}",
            layer.width_nm,
            layer.all_donors_cm3(),
            layer.all_acceptors_cm3()
        );
    }
    for plane in &stack.planes {
        let _ = writeln!(
            text,
            "plane {:.1} {:.6e} {:.6e} cm^-2",
            plane.layer as f64 + plane.fraction,
            plane.donors_cm2,
            plane.acceptors_cm2
        );
    }
    let mut id = hex(&Sha256::digest(text));
    id.truncate(DIGITS);
    id
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}
