//! What a growth uses up, and how often its shutters move.

use super::rows::{LayerRow, Row};
use crate::constants::NM2_PER_CM2;
use crate::materials::Element;
use crate::structure::{Growth, Stack};

/// One shutter over the whole growth.
#[derive(Clone, Debug, PartialEq)]
pub struct ShutterUse {
    /// The cell's name, or the dopant's symbol.
    pub name: String,
    /// The calibrated rate in monolayers per second; `None` for a dopant.
    pub rate_ml_per_s: Option<f64>,
    /// In 0.01 s.
    pub open_cs: u64,
    /// How often it opens; it closes as often.
    pub openings: u64,
}

/// One element over the whole growth, as the layers are designed.
#[derive(Clone, Debug, PartialEq)]
pub struct MaterialTotal {
    pub element: String,
    /// As many whole monolayers' worth of atoms; `None` for a dopant.
    pub monolayers: Option<f64>,
    pub atoms_per_cm2: f64,
}

const CM_PER_NM: f64 = 1e-7;

/// The layers of the rows, one per entry of the file.
pub fn by_entry(rows: &[Row]) -> Vec<&LayerRow> {
    rows.iter()
        .filter_map(|row| match row {
            Row::Layer(layer) => Some(layer),
            _ => None,
        })
        .collect()
}

/// The shutters, group-III cells first; group V stays open throughout.
pub fn shutters(growth: &Growth, rows: &[Row], stack: &Stack) -> Vec<ShutterUse> {
    let by_entry = by_entry(rows);
    let symbol = |species: &Option<crate::structure::Spanned<crate::structure::Dopant>>,
                  otherwise: &str| {
        species
            .as_ref()
            .map_or(otherwise.to_owned(), |s| s.value.symbol.to_owned())
    };
    let cells = growth.cells.iter();
    let mut uses: Vec<ShutterUse> = cells
        .map(|cell| (cell.name.clone(), Some(cell.rate_ml_per_s)))
        .chain([
            (symbol(&growth.donors, "donors"), None),
            (symbol(&growth.acceptors, "acceptors"), None),
        ])
        .map(|(name, rate_ml_per_s)| ShutterUse {
            name,
            rate_ml_per_s,
            open_cs: 0,
            openings: 0,
        })
        .collect();
    let (donors, acceptors) = (growth.cells.len(), growth.cells.len() + 1);
    let open: Vec<Vec<usize>> = by_entry
        .iter()
        .map(|row| {
            let mut open = row.filling.cells();
            open.extend((row.donors_cm3 > 0.0).then_some(donors));
            open.extend((row.acceptors_cm3 > 0.0).then_some(acceptors));
            open
        })
        .collect();
    let mut before: &[usize] = &[];
    let mut planes = stack.planes.iter().peekable();
    for (index, layer) in stack.layers.iter().enumerate() {
        // All cells close for a plane of dopants. How long its shutter is open is not known.
        while let Some(plane) =
            planes.next_if(|plane| plane.layer <= index && plane.fraction <= 0.0)
        {
            uses[donors].openings += u64::from(plane.donors_cm2 > 0.0);
            uses[acceptors].openings += u64::from(plane.acceptors_cm2 > 0.0);
            before = &[];
        }
        let (Some(now), Some(row)) = (open.get(layer.entry), by_entry.get(layer.entry)) else {
            continue;
        };
        for &shutter in now {
            uses[shutter].open_cs = uses[shutter].open_cs.saturating_add(row.own.time_cs);
            uses[shutter].openings += u64::from(!before.contains(&shutter));
        }
        before = now;
    }
    for plane in planes {
        uses[donors].openings += u64::from(plane.donors_cm2 > 0.0);
        uses[acceptors].openings += u64::from(plane.acceptors_cm2 > 0.0);
    }
    let is_cell = |index: usize| index < growth.cells.len();
    let kept = uses.into_iter().enumerate();
    kept.filter(|(index, shutter)| is_cell(*index) || shutter.openings > 0)
        .map(|(_, shutter)| shutter)
        .collect()
}

/// The elements of the crystal, then the dopants.
pub fn materials(growth: &Growth, rows: &[Row], stack: &Stack) -> Vec<MaterialTotal> {
    let by_entry = by_entry(rows);
    let mut copies = vec![0_u32; by_entry.len()];
    let mut first = vec![None; by_entry.len()];
    for (index, layer) in stack.layers.iter().enumerate() {
        if let Some(count) = copies.get_mut(layer.entry) {
            *count += 1;
            first[layer.entry].get_or_insert(index);
        }
    }
    let mut monolayers = [0.0; 6];
    let (mut donors_cm2, mut acceptors_cm2) = (0.0, 0.0);
    for (entry, row) in by_entry.iter().enumerate() {
        let count = f64::from(copies[entry]);
        let Some(layer) = first[entry] else { continue };
        let at = |t: f64| stack.composition_at(layer, t);
        if let (Some(lower), Some(middle), Some(upper)) = (at(0.0), at(0.5), at(1.0)) {
            for (sum, element) in monolayers.iter_mut().zip(Element::ALL) {
                // Simpson's rule is exact for fractions that are at most quadratic in the height.
                let [a, b, c] = [&lower, &middle, &upper].map(|c| c.fraction(element));
                *sum += count * row.monolayers * (a + 4.0 * b + c) / 6.0;
            }
        }
        let width_cm = count * row.own.width_nm() * CM_PER_NM;
        donors_cm2 += row.donors_cm3 * width_cm;
        acceptors_cm2 += row.acceptors_cm3 * width_cm;
    }
    for plane in &stack.planes {
        donors_cm2 += plane.donors_cm2;
        acceptors_cm2 += plane.acceptors_cm2;
    }
    let sites_per_cm2 = stack
        .substrate_lattice_nm()
        .map_or(0.0, |a| 2.0 / (a * a) * NM2_PER_CM2);
    let mut totals: Vec<MaterialTotal> = Element::ALL
        .into_iter()
        .zip(monolayers)
        .filter(|(_, sum)| *sum > 0.0)
        .map(|(element, sum)| MaterialTotal {
            element: element.symbol().to_owned(),
            monolayers: Some(sum),
            atoms_per_cm2: sum * sites_per_cm2,
        })
        .collect();
    for (species, word, sum) in [
        (&growth.donors, "donors", donors_cm2),
        (&growth.acceptors, "acceptors", acceptors_cm2),
    ] {
        if sum > 0.0 {
            totals.push(MaterialTotal {
                element: species
                    .as_ref()
                    .map_or(word.to_owned(), |s| s.value.symbol.to_owned()),
                monolayers: None,
                atoms_per_cm2: sum,
            });
        }
    }
    totals
}
