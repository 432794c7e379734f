//! The `charge` of a structure file, and what it cannot be combined with.

use super::charge::{Bending, Charge, Ionisation};
use super::document::{Node, Value};
use super::fields::{Checker, Fields, Limits, above, between};
use super::file::{LayerEntry, Structure, Varied};
use super::stack::Stack;
use super::sweeps::Swept;
use crate::diagnostics::Diagnostic;
use crate::units::Dimension;
use std::ops::Range;

const KEYS: [&str; 4] = ["fermi_level", "surface", "ionisation", "exchange"];
const SURFACE_LIMITS: Limits = between(-2.0, 5.0, "an energy from -2 eV to 5 eV");
const BINDING_LIMITS: Limits = between(0.0, 1.0, "an energy from 0 eV to 1 eV");
const DEGENERACY_LIMITS: Limits = above(0.0, 100.0, "above 0, of at most 100");
/// Spin; and for acceptors heavy and light holes: common practice.
const DONOR_DEGENERACY: f64 = 2.0;
const ACCEPTOR_DEGENERACY: f64 = 4.0;

/// `charge: flat`, or a mapping; `file` are the fields of the whole file.
pub(super) fn charge(checker: &mut Checker, node: &Node, file: &Fields) -> Option<Charge> {
    if matches!(node.value, Value::Scalar(_)) {
        let word = checker.word(node, &["flat"])?;
        return (word == "flat").then_some(Charge::Flat);
    }
    let fields = checker.fields(node, "`charge`", &KEYS)?;
    let mut bending = Bending {
        span: Some(checker.head(&node.span)),
        ..Bending::default()
    };
    let mut fine = true;
    let level = fields
        .get("fermi_level")
        .map(|node| checker.word(node, &["neutral", "contact"]));
    fine &= level != Some(None);
    bending.contact = level == Some(Some("contact"));
    if let Some(node) = fields.get("surface") {
        let found = checker.quantity(node, &[Dimension::Energy], SURFACE_LIMITS);
        fine &= found.is_some();
        bending.surface_ev = found.map(|found| found.value.value());
        if level == Some(Some("neutral")) {
            checker.report(
                Diagnostic::error("the Fermi level is to follow from neutrality and from the surface")
                    .at(node.span.clone())
                    .expected("`fermi_level: neutral` or `surface`, not both; the surface's own charge makes up for what the layers lack"),
            );
            fine = false;
        }
    }
    if let Some(node) = fields.get("ionisation") {
        fine &= ionisation(checker, node, &mut bending).is_some();
    }
    if let Some(node) = fields.get("exchange") {
        bending.exchange = checker.word(node, &["local density"]).is_some();
        fine &= bending.exchange;
    }
    if let Some(ends) = file.get("ends").and_then(Node::text)
        && ends != "walls"
    {
        let (key, why) = match (ends, fields.get("surface")) {
            ("periodic", Some(node)) => (&node.span, "a periodic stack has no surface"),
            _ => (&node.span, "charge is worked out between walls only"),
        };
        checker.report(
            Diagnostic::error(format!("{why}, and the file says `ends: {ends}`"))
                .at(checker.head(key))
                .expected("`ends: walls`, or `charge: flat`"),
        );
        fine = false;
    }
    fine.then_some(Charge::Bent(bending))
}

/// `ionisation: {donors: 6 meV, acceptors: {energy: 27 meV, degeneracy: 4}}`.
fn ionisation(checker: &mut Checker, node: &Node, bending: &mut Bending) -> Option<()> {
    let fields = checker.fields(node, "`ionisation`", &["donors", "acceptors"])?;
    let mut level = |key: &str, usual: f64| match fields.get(key) {
        Some(node) => dopant(checker, node, usual).map(Some),
        None => Some(None),
    };
    let donors = level("donors", DONOR_DEGENERACY);
    let acceptors = level("acceptors", ACCEPTOR_DEGENERACY);
    bending.donors = donors?;
    bending.acceptors = acceptors?;
    Some(())
}

fn dopant(checker: &mut Checker, node: &Node, usual: f64) -> Option<Ionisation> {
    let energy = |checker: &mut Checker, node: &Node| {
        let found = checker.quantity(node, &[Dimension::Energy], BINDING_LIMITS)?;
        Some(found.value.value())
    };
    if matches!(node.value, Value::Scalar(_)) {
        return Some(Ionisation {
            binding_ev: energy(checker, node)?,
            degeneracy: usual,
        });
    }
    let fields = checker.fields(node, "an ionisation", &["energy", "degeneracy"])?;
    checker.missing(&fields, "this ionisation", "energy", "6 meV");
    let degeneracy = match fields.get("degeneracy") {
        Some(node) => checker.number(node, DEGENERACY_LIMITS),
        None => Some(usual),
    };
    let binding_ev = fields.get("energy").and_then(|node| energy(checker, node));
    Some(Ionisation {
        binding_ev: binding_ev?,
        degeneracy: degeneracy?,
    })
}

/// What a file without `charge` means: with dopants and without a field, neutral stacks are bent.
pub(super) fn unstated(checker: &mut Checker, structure: &Structure, walls: bool) -> Charge {
    let Some((name, place)) = doped(structure, |entry| {
        entry.has_donors() || entry.has_acceptors()
    }) else {
        return Charge::Flat;
    };
    let is_field = |quantity: &Varied| matches!(quantity, Varied::Field { .. });
    let tuned = structure.tune.as_ref().is_some_and(|tune| {
        let mut vary = tune.vary.iter();
        vary.any(|variable| is_field(&variable.quantity))
    });
    let swept = structure
        .sweep
        .as_ref()
        .is_some_and(|sweep| matches!(&sweep.vary, Swept::Knob(quantity) if is_field(quantity)));
    let field = structure
        .field
        .as_ref()
        .map_or(0.0, |field| field.value.value());
    let coupled = structure.couples_bands();
    if field == 0.0 && !tuned && !swept && walls && !coupled {
        return Charge::Bent(Bending::default());
    }
    let (why, hint) = if coupled {
        (
            "charge is worked out with bands that are solved on their own",
            "`charge: flat` keeps them flat without this warning",
        )
    } else if walls {
        (
            "in a field, one Fermi level for the whole stack has to be asked for",
            "`charge: {fermi_level: neutral}` bends them; `charge: flat` keeps them flat without this warning",
        )
    } else {
        (
            "charge is worked out between walls only",
            "`charge: flat` keeps them flat without this warning",
        )
    };
    checker.report(
        Diagnostic::warning(format!("{name} is doped, but its bands stay flat: {why}"))
            .at(place)
            .hint(hint),
    );
    Charge::Flat
}

/// The first layer of a kind, or else the first plane of dopants, in words and with its place.
fn doped(
    structure: &Structure,
    kind: impl Fn(&LayerEntry) -> bool,
) -> Option<(String, Range<usize>)> {
    let layer = structure.entries.iter().find(|entry| kind(entry));
    layer
        .map(|entry| (entry.in_words(), entry.material.span.clone()))
        .or_else(|| {
            let plane = structure.planes.first()?;
            Some((format!("`{}`", plane.label), plane.span.clone()))
        })
}

/// Charge that no carriers can make up for, once widths are known.
pub(super) fn unfitting(structure: &Structure, stack: &Stack) -> Vec<Diagnostic> {
    let Charge::Bent(bending) = &structure.charge else {
        let spread = structure
            .tolerance
            .as_ref()
            .and_then(|stated| stated.doping);
        let words = "the spread of `doping` moves nothing, because the bands stay flat";
        let doubt = Diagnostic::warning(words).hint("`charge: {fermi_level: neutral}` bends them");
        return spread.map(|_| doubt).into_iter().collect();
    };
    let mut found = Vec::new();
    let place = |problem: Diagnostic| match &bending.span {
        Some(span) => problem.at(span.clone()),
        None => problem,
    };
    if structure.couples_bands() {
        let problem = "charge is worked out with bands that are solved on their own, and this file couples them";
        found.push(place(Diagnostic::error(problem)).expected(
            "`parabolic` or `energy-dependent` electrons and `decoupled` holes, or `charge: flat`",
        ));
    }
    if stack.field_v_per_nm != 0.0 && (bending.contact || bending.surface_ev.is_some()) {
        let what = if bending.contact {
            "the contact"
        } else {
            "the surface"
        };
        found.push(
            place(Diagnostic::error(format!(
                "{what} fixes the potential, and the file states a field too"
            )))
            .expected("no `field`, or `fermi_level: neutral`"),
        );
    }
    if bending.contact {
        let Some(bottom) = stack.layers.first() else {
            return found;
        };
        let net_cm3 = bottom.all_donors_cm3() - bottom.all_acceptors_cm3();
        let lacks_holes = net_cm3 < 0.0 && structure.valence.is_none();
        if net_cm3 == 0.0 || lacks_holes {
            let problem = if lacks_holes {
                format!(
                    "the contact `{}` is p-doped, but no valence band is solved",
                    bottom.label
                )
            } else {
                format!(
                    "the contact `{}` is not doped, so that its bulk has no Fermi level",
                    bottom.label
                )
            };
            found.push(place(Diagnostic::error(problem)).expected(if lacks_holes {
                "`valence: {model: decoupled}` under `bands`"
            } else {
                "donors in the lowest layer, or `fermi_level: neutral`"
            }));
        }
    } else if bending.surface_ev.is_none() {
        let sheets = stack.sheet_doping_cm2();
        let net_cm2 = sheets[0] - sheets[1];
        let total_cm2 = sheets[0] + sheets[1];
        // Equal amounts may differ by rounding.
        if net_cm2 < -1e-9 * total_cm2 && structure.valence.is_none() {
            let acceptors = doped(structure, LayerEntry::has_acceptors);
            let problem = Diagnostic::error(
                "the stack cannot be neutral: it has more acceptors than donors, and no valence band is solved that would hold the holes",
            )
            .expected("holes, donors, or bands without charge")
            .hint("add `valence: {model: decoupled}` under `bands`, or write `charge: flat`");
            found.push(match acceptors {
                Some((_, span)) => problem.at(span),
                None => problem,
            });
        } else if net_cm2.abs() <= 1e-9 * total_cm2 && structure.valence.is_none() {
            let problem = if total_cm2 == 0.0 {
                "nothing is doped, so that no charge bends the bands"
            } else {
                "donors and acceptors make up for each other, so that no carrier fixes the Fermi level"
            };
            let problem = place(Diagnostic::error(problem))
                .expected("dopants, a `surface` or a `contact`, or `charge: flat`");
            found.push(
                match (&bending.span, doped(structure, LayerEntry::has_donors)) {
                    (None, Some((_, span))) => problem.at(span),
                    _ => problem,
                },
            );
        }
    }
    for (index, layer) in stack.layers.iter().enumerate() {
        let known = |t: f64| stack.material_at(index, t).permittivity_static.is_some();
        if !known(0.0) || !known(1.0) {
            let problem = Diagnostic::error(format!(
                "the material of `{}` has no `permittivity_static`, which band bending needs",
                layer.label
            ))
            .expected("a material with `permittivity_static`; give it under `materials:`")
            .hint("`charge: flat` leaves the bands flat");
            let entry = structure.entries.get(layer.entry);
            found.push(match entry {
                Some(entry) => problem.at(entry.material.span.clone()),
                None => problem,
            });
            break;
        }
    }
    found
}
