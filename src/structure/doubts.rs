//! What only shows once materials are resolved: doubts about the physics, and bounds of tuning that do not fit.

use super::file::{ConductionModel, LayerEntry, Structure, Variable, Varied};
use super::lay_out::no_monolayer;
use super::read_tolerance;
use super::stack::Stack;
use super::sweeps;
use crate::diagnostics::Diagnostic;
use crate::materials::{Material, Valley, hole_edges, strain};
use crate::units::Dimension;
use std::ops::Range;

/// How far the tables may put a side valley from where it is: that of AlGaAs crosses at an Al fraction of 0.37 ± 0.015 in
/// measurements and 0.417 in the usual tables, some 50 meV.
const VALLEY_UNCERTAINTY_EV: f64 = 0.05;
/// The strain beyond which coherent layers of useful width are not grown; common practice.
const DOUBTFUL_STRAIN: f64 = 0.05;

/// Messages, mostly warnings, about a structure and its stack.
pub(super) fn doubts(structure: &Structure, stack: &Stack) -> Vec<Diagnostic> {
    let mut found = Vec::new();
    let mut seen = vec![false; structure.entries.len()];
    for (index, layer) in stack.layers.iter().enumerate() {
        if let (Some(seen), Some(entry)) = (
            seen.get_mut(layer.entry),
            structure.entries.get(layer.entry),
        ) && !*seen
        {
            *seen = true;
            of_layer(entry, index, stack, &mut found);
        }
    }
    found.extend(broken_gap(structure, stack));
    if let Some(tune) = &structure.tune {
        for variable in &tune.vary {
            of_variable(
                structure,
                stack,
                variable,
                tune.snap_to_monolayers,
                &mut found,
            );
        }
    }
    read_tolerance::unfitting(structure, stack, &mut found);
    sweeps::unfitting(structure, stack, &mut found);
    found
}

/// A doubt about bands that are solved apart although one layer's valence edge lies above another's conduction edge.
fn broken_gap(structure: &Structure, stack: &Stack) -> Option<Diagnostic> {
    // A parabolic electron on its own may be counted on a scale of the user's own.
    match structure.conduction.model {
        ConductionModel::EightBand => return None,
        ConductionModel::Parabolic if structure.valence.is_none() => return None,
        ConductionModel::Parabolic | ConductionModel::EnergyDependent => {}
    }
    let faces = |layer: usize| {
        let ends: &[f64] = if stack.is_uniform(layer) {
            &[0.0]
        } else {
            &[0.0, 1.0]
        };
        ends.iter().map(move |t| stack.material_at(layer, *t))
    };
    let layers = || (0..stack.layers.len()).flat_map(|layer| faces(layer).map(move |m| (layer, m)));
    let (lowest, conduction_ev) = layers()
        .filter_map(|(layer, material)| Some((layer, material.conduction_edge_ev?)))
        .min_by(|a, b| a.1.total_cmp(&b.1))?;
    let (highest, valence_ev) = layers()
        .filter_map(|(layer, material)| {
            let edges = hole_edges(&material, stack.substrate_lattice_nm())?;
            Some((layer, edges.heavy_ev.max(edges.light_ev)))
        })
        .max_by(|a, b| a.1.total_cmp(&b.1))?;
    if valence_ev <= conduction_ev {
        return None;
    }
    let entry = |layer: usize| structure.entries.get(stack.layers[layer].entry);
    let (electrons, holes) = (entry(lowest)?, entry(highest)?);
    Some(
        Diagnostic::warning(format!(
            "the valence edge of {} lies {:.0} meV above the conduction edge of {}: a broken gap, in which electrons and holes mix",
            holes.in_words(),
            1e3 * (valence_ev - conduction_ev),
            electrons.in_words()
        ))
        .at(place(holes))
        .hint("bands that are solved apart miss that, whatever the mass of the electron; `conduction: {model: eight-band}` under `bands:` solves them together"),
    )
}

/// Where a message about a layer points.
fn place(entry: &LayerEntry) -> Range<usize> {
    entry.material.span.clone()
}

fn of_layer(entry: &LayerEntry, layer: usize, stack: &Stack, found: &mut Vec<Diagnostic>) {
    let faces: &[f64] = if stack.is_uniform(layer) {
        &[0.0]
    } else {
        &[0.0, 1.0]
    };
    let name = entry.in_words();
    let worst = faces
        .iter()
        .filter_map(|t| side_valley(&stack.material_at(layer, *t)))
        .min_by(|(_, a), (_, b)| a.total_cmp(b));
    if let Some((valley, above_ev)) = worst
        && above_ev < VALLEY_UNCERTAINTY_EV
    {
        let valley = valley.symbol();
        let mev = 1e3 * above_ev;
        let message = if above_ev < 0.0 {
            format!(
                "{name} is indirect: its {valley} valley lies {:.0} meV below Γ",
                -mev
            )
        } else {
            format!("{name} is nearly indirect: its {valley} valley lies only {mev:.0} meV above Γ")
        };
        found.push(Diagnostic::warning(message).at(place(entry)).hint(
            if above_ev.abs() < VALLEY_UNCERTAINTY_EV {
                "levels are those of Γ; where the valleys cross is known to some 50 meV"
            } else {
                "levels are those of Γ; electrons can leave through the side valley"
            },
        ));
    }
    if let Some(lattice) = stack.substrate_lattice_nm() {
        let strains: Vec<Option<f64>> = faces
            .iter()
            .map(|t| Some(strain(&stack.material_at(layer, *t), lattice)?.in_plane))
            .collect();
        if strains.contains(&None) {
            found.push(
                Diagnostic::warning(format!(
                    "{name} is taken as unstrained, because its material lacks `lattice_constant` or `elastic`"
                ))
                .at(place(entry)),
            );
        }
        let most = strains.into_iter().flatten().fold(0.0_f64, |most, next| {
            if next.abs() > most.abs() { next } else { most }
        });
        if most.abs() > DOUBTFUL_STRAIN {
            found.push(
                Diagnostic::warning(format!(
                    "{name} is strained by {:.1} %, which hardly grows without dislocations",
                    1e2 * most
                ))
                .at(place(entry)),
            );
        }
    }
    let width_nm = stack.layers.get(layer).map_or(0.0, |layer| layer.width_nm);
    if let Some(monolayer) = stack.monolayer_nm(layer)
        // A width of one monolayer may come out smaller by rounding.
        && width_nm < monolayer * (1.0 - 1e-6)
    {
        found.push(
            Diagnostic::warning(format!(
                "{name} is thinner than one monolayer ({monolayer:.4} nm)"
            ))
            .at(entry.width.span.clone()),
        );
    }
}

/// The lower side valley and how far it lies above Γ, in eV.
fn side_valley(material: &Material) -> Option<(Valley, f64)> {
    let gap = material.gap_ev?;
    [
        (Valley::X, material.gap_x_ev),
        (Valley::L, material.gap_l_ev),
    ]
    .into_iter()
    .filter_map(|(valley, side)| Some((valley, side? - gap)))
    .min_by(|(_, a), (_, b)| a.total_cmp(b))
}

fn of_variable(
    structure: &Structure,
    stack: &Stack,
    variable: &Variable,
    snap: bool,
    found: &mut Vec<Diagnostic>,
) {
    let outside = |what: String, value: f64, bounds: [f64; 2]| {
        let slack = 1e-9 * (bounds[1] - bounds[0]);
        (value < bounds[0] - slack || value > bounds[1] + slack).then(|| {
            Diagnostic::warning(format!("{what} lies outside its bounds"))
                .at(variable.span.clone())
                .hint("tuning starts at the nearer bound")
        })
    };
    match &variable.quantity {
        Varied::Width { entry, bounds } => {
            let Some(layer) = structure.entries.get(*entry) else {
                return;
            };
            let nm = |length| stack.length_nm(*entry, length);
            let (Some(low), Some(high), Some(width)) =
                (nm(&bounds[0]), nm(&bounds[1]), nm(&layer.width.value))
            else {
                found.push(no_monolayer(layer, &variable.span));
                return;
            };
            match stack.entry_monolayer_nm(*entry) {
                None if snap && bounds[0].unit.dimension != Dimension::Monolayers => found.push(
                    no_monolayer(layer, &variable.span)
                        .expected("a known monolayer, because of `snap: monolayer`"),
                ),
                Some(monolayer)
                    if snap && !holds_whole_number(low / monolayer, high / monolayer) =>
                {
                    found.push(
                        Diagnostic::error(format!(
                            "the bounds on the width of {} hold no whole number of monolayers",
                            layer.in_words()
                        ))
                        .at(variable.span.clone())
                        .expected(format!(
                            "room for one, because of `snap: monolayer`; they are {:.2} and {:.2} monolayers",
                            low / monolayer,
                            high / monolayer
                        )),
                    );
                }
                _ => {}
            }
            found.extend(outside(
                format!("the width {} of {}", layer.width.value, layer.in_words()),
                width,
                [low, high],
            ));
        }
        Varied::Fraction {
            entry,
            element,
            bounds,
        } => {
            if let (Some(layer), Some(composition)) =
                (structure.entries.get(*entry), stack.composition(*entry))
            {
                found.extend(outside(
                    format!(
                        "the fraction of {} in {}",
                        element.symbol(),
                        layer.in_words()
                    ),
                    composition.fraction(*element),
                    *bounds,
                ));
            }
        }
        Varied::FractionOfCells { .. } => {}
        Varied::Field { bounds_v_per_nm } => {
            found.extend(outside(
                "the field".to_owned(),
                stack.field_v_per_nm,
                *bounds_v_per_nm,
            ));
        }
    }
}

/// Whether a whole number from 1 lies between two numbers, of which whole ones may be off by rounding.
fn holds_whole_number(low: f64, high: f64) -> bool {
    const ROUNDING: f64 = 1e-9;
    (low - ROUNDING).ceil().max(1.0) <= (high + ROUNDING).floor()
}
