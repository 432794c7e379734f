//! The `tolerance` part of a structure file.

use super::document::{Node, Value, line_of};
use super::fields::{Checker, Fields, Limits, above, between, one_of};
use super::file::{BandName, Spanned, Structure};
use super::lay_out::no_monolayer;
use super::read_aims::{ENERGY_LIMITS, WAVELENGTH_LIMITS, is_lower_first, level};
use super::read_tune::element;
use super::spreads::{Grading, Radial, Tolerance, Window};
use super::stack::Stack;
use super::wafer::Design;
use crate::constants::HC_EV_UM;
use crate::diagnostics::Diagnostic;
use crate::materials::{Element, Sublattice};
use crate::units::{Dimension, Quantity};

/// What the spreads are called in messages: the keys that make wafers differ.
const SPREADS: [&str; 8] = [
    "rate",
    "flux",
    "jitter",
    "composition",
    "grading",
    "doping",
    "field",
    "temperature",
];
/// The elements whose fluxes set the growth rate.
const FLUXES: [Element; 3] = [Element::Al, Element::Ga, Element::In];
const DEFAULT_SAMPLES: u32 = 10_000;
const MAX_SAMPLES: u32 = 100_000;
const DEFAULT_SEED: u64 = 1;
const MAX_WINDOWS: usize = 100;

const PART_LIMITS: Limits = above(0.0, 1.0, "a standard deviation above 0 %, at most 100 %");
const LENGTH_LIMITS: Limits = above(0.0, 100.0, "more than 0 nm, at most 100 nm");
const FRACTION_LIMITS: Limits = above(0.0, 1.0, "a standard deviation above 0, at most 1");
const FIELD_LIMITS: Limits = above(
    0.0,
    0.1,
    "a standard deviation above 0 kV/cm, at most 1000 kV/cm",
);
const TEMPERATURE_LIMITS: Limits = above(
    0.0,
    1000.0,
    "a standard deviation above 0 K, at most 1000 K",
);
const DROP_LIMITS: Limits = between(-0.5, 0.5, "from -50 % to 50 %");
const RADIUS_LIMITS: Limits = above(0.0, 1e9, "more than 0 mm, at most 1 m");

/// Reads `tolerance`; `solved` are the bands that levels may belong to.
pub(super) fn tolerance(
    checker: &mut Checker,
    node: &Node,
    solved: &[BandName],
) -> Option<Tolerance> {
    const KEYS: [&str; 12] = [
        "rate",
        "flux",
        "jitter",
        "composition",
        "grading",
        "doping",
        "field",
        "temperature",
        "samples",
        "seed",
        "window",
        "radial",
    ];
    let fields = checker.fields(node, "`tolerance`", &KEYS)?;
    let spread = SPREADS.iter().any(|key| fields.has(key));
    if !spread && !fields.has("radial") {
        checker.report(
            Diagnostic::error("`tolerance` holds nothing by which wafers differ")
                .at(fields.head.clone())
                .expected(format!("one of {}, or `radial`", one_of(&SPREADS))),
        );
    }
    let mut value = |key: &str, dimension, limits| {
        fields
            .get(key)
            .map(|node| Some(checker.quantity(node, &[dimension], limits)?.value.value()))
    };
    let rate = value("rate", Dimension::Percentage, PART_LIMITS);
    let doping = value("doping", Dimension::Percentage, PART_LIMITS);
    let field = value("field", Dimension::Field, FIELD_LIMITS);
    let temperature = value("temperature", Dimension::Temperature, TEMPERATURE_LIMITS);
    let flux = fields.get("flux").map(|node| flux(checker, node));
    let jitter = fields.get("jitter").map(|node| jitter(checker, node));
    let composition = fields.get("composition").map(|node| {
        let value = checker.number(node, FRACTION_LIMITS)?;
        Some(Spanned::new(value, node))
    });
    let grading = fields.get("grading").map(|node| grading(checker, node));
    let samples = match fields.get("samples") {
        Some(node) => checker.count(node, MAX_SAMPLES),
        None => Some(DEFAULT_SAMPLES),
    };
    let seed = match fields.get("seed") {
        Some(node) => checker.count(node, u32::MAX).map(u64::from),
        None => Some(DEFAULT_SEED),
    };
    let windows = fields
        .get("window")
        .map(|node| windows(checker, node, solved));
    let radial = fields.get("radial").map(|node| radial(checker, node));
    let tolerance = Tolerance {
        rate: settled(rate)?,
        flux: settled(flux)?.unwrap_or_default(),
        jitter: settled(jitter)?,
        composition: settled(composition)?,
        grading: settled(grading)?,
        doping: settled(doping)?,
        field_v_per_nm: settled(field)?,
        temperature_k: settled(temperature)?,
        samples: samples? as usize,
        seed: seed?,
        windows: settled(windows)?.unwrap_or_default(),
        radial: settled(radial)?,
    };
    if !tolerance.windows.is_empty() && !tolerance.has_spreads() && tolerance.radial.is_none() {
        checker.report(
            Diagnostic::error("there is a window, but nothing by which wafers differ")
                .at(fields.head)
                .expected("a spread, such as `rate: 0.7 %`"),
        );
        return None;
    }
    Some(tolerance)
}

/// `None` when the key was there but mistaken.
fn settled<T>(read: Option<Option<T>>) -> Option<Option<T>> {
    match read {
        Some(None) => None,
        Some(found) => Some(found),
        None => Some(None),
    }
}

/// `{Ga: 0.5 %, Al: 1 %}`.
fn flux(checker: &mut Checker, node: &Node) -> Option<Vec<Spanned<(Element, f64)>>> {
    let Value::Map(entries) = &node.value else {
        checker.wrong_kind(
            node,
            "fluxes with their spreads, as in `{Ga: 0.5 %, Al: 1 %}`",
        );
        return None;
    };
    if entries.is_empty() {
        checker.report(
            Diagnostic::error("`flux` names no element")
                .at(node.span.clone())
                .expected("expected fluxes with their spreads, as in `{Ga: 0.5 %, Al: 1 %}`"),
        );
        return None;
    }
    let mut found = Some(Vec::new());
    for (key, value) in entries {
        if checker.is_full() {
            return None;
        }
        let element = element(checker, key, &FLUXES).filter(|element| {
            let of_group_three = element.sublattice() == Sublattice::GroupThree;
            if !of_group_three {
                checker.report(
                    Diagnostic::error(format!("{} is a group-V element", element.symbol()))
                        .at(key.span.clone())
                        .expected("expected `Al`, `Ga` or `In`: their fluxes set the growth rate"),
                );
            }
            of_group_three
        });
        let part = checker.quantity(value, &[Dimension::Percentage], PART_LIMITS);
        match (element, part, &mut found) {
            (Some(element), Some(part), Some(list)) => {
                list.push(Spanned::new((element, part.value.value()), key));
            }
            _ => found = None,
        }
    }
    found
}

/// `0.3 ML`, `0.1 nm` or `1 %`.
fn jitter(checker: &mut Checker, node: &Node) -> Option<Spanned<Quantity>> {
    let dimensions = [
        Dimension::Monolayers,
        Dimension::Length,
        Dimension::Percentage,
    ];
    let quantity = checker.quantity(node, &dimensions, LENGTH_LIMITS)?;
    if quantity.value.unit.dimension == Dimension::Percentage && quantity.value.value() > 1.0 {
        checker.report(
            Diagnostic::error(format!("`{}` is out of range", quantity.value))
                .at(node.span.clone())
                .expected(format!("expected {}", PART_LIMITS.words)),
        );
        return None;
    }
    Some(quantity)
}

/// `0.5 nm` or `{length: 0.5 nm, spread: 0.1 nm}`.
fn grading(checker: &mut Checker, node: &Node) -> Option<Grading> {
    let length = |checker: &mut Checker, node: &Node| {
        let length = checker.quantity(node, &[Dimension::Length], LENGTH_LIMITS)?;
        Some(length.value.value())
    };
    let span = checker.head(&node.span);
    if !matches!(node.value, Value::Map(_)) {
        return Some(Grading {
            length_nm: length(checker, node)?,
            spread_nm: 0.0,
            span,
        });
    }
    let fields = checker.fields(node, "`grading`", &["length", "spread"])?;
    checker.missing(&fields, "`grading`", "length", "0.5 nm");
    let length_nm = fields.get("length").and_then(|node| length(checker, node));
    let spread_nm = match fields.get("spread") {
        Some(node) => length(checker, node),
        None => Some(0.0),
    };
    let (length_nm, spread_nm) = (length_nm?, spread_nm?);
    if spread_nm > length_nm {
        checker.report(
            Diagnostic::error("the spread of the grading length is over 100 % of it")
                .at(span)
                .expected("a spread of at most the length itself"),
        );
        return None;
    }
    Some(Grading {
        length_nm,
        spread_nm,
        span,
    })
}

/// One window, or a list of them.
fn windows(checker: &mut Checker, node: &Node, solved: &[BandName]) -> Option<Vec<Window>> {
    let Value::List(items) = &node.value else {
        return Some(vec![window(checker, node, solved)?]);
    };
    if items.is_empty() || items.len() > MAX_WINDOWS {
        checker.report(
            Diagnostic::error(format!("{} windows stand here", items.len()))
                .at(checker.head(&node.span))
                .expected(format!("expected 1 to {MAX_WINDOWS} windows")),
        );
        return None;
    }
    let mut found: Vec<(usize, Window)> = Vec::new();
    let mut complete = true;
    for item in items {
        let Some(next) = window(checker, item, solved) else {
            complete = false;
            continue;
        };
        let pair = |window: &Window| (window.from, window.to);
        if let Some((line, _)) = found.iter().find(|(_, other)| pair(other) == pair(&next)) {
            checker.report(
                Diagnostic::error(format!(
                    "the window on line {line} is about the same transition"
                ))
                .at(checker.head(&item.span))
                .expected("one window for each"),
            );
            complete = false;
        }
        found.push((line_of(checker.text, item.span.start), next));
    }
    complete.then(|| found.into_iter().map(|(_, window)| window).collect())
}

/// `{from: conduction 1, to: conduction 2, wavelength: [8.4 µm, 8.8 µm]}`, or the same with `energy`.
fn window(checker: &mut Checker, node: &Node, solved: &[BandName]) -> Option<Window> {
    let fields = checker.fields(node, "a window", &["from", "to", "wavelength", "energy"])?;
    checker.missing(&fields, "this window", "from", "conduction 1");
    checker.missing(&fields, "this window", "to", "conduction 2");
    let from = fields
        .get("from")
        .and_then(|node| level(checker, node, solved));
    let to = fields
        .get("to")
        .and_then(|node| level(checker, node, solved));
    let bounds = window_bounds(checker, &fields);
    let (from, to) = (from?, to?);
    if from == to {
        let place = fields.get("to").map(|node| node.span.clone());
        checker.report(
            Diagnostic::error("this window goes from a level to itself")
                .at(place.unwrap_or(fields.head))
                .expected("another level than `from`"),
        );
        return None;
    }
    let (energies_ev, as_wavelength) = bounds?;
    let (from, to) = if is_lower_first(from, to) {
        (from, to)
    } else {
        (to, from)
    };
    Some(Window {
        from,
        to,
        energies_ev,
        as_wavelength,
    })
}

/// The bounds as energies, and whether they were wavelengths.
fn window_bounds(checker: &mut Checker, fields: &Fields) -> Option<([f64; 2], bool)> {
    let (key, dimension, limits, example) = match (fields.has("wavelength"), fields.has("energy")) {
        (true, false) => (
            "wavelength",
            Dimension::Length,
            WAVELENGTH_LIMITS,
            "[8.4 µm, 8.8 µm]",
        ),
        (false, true) => (
            "energy",
            Dimension::Energy,
            ENERGY_LIMITS,
            "[140 meV, 148 meV]",
        ),
        _ => {
            checker.report(
                Diagnostic::error("a window holds either wavelengths or energies")
                    .at(fields.head.clone())
                    .expected(
                        "one of `wavelength: [8.4 µm, 8.8 µm]`, `energy: [140 meV, 148 meV]`",
                    ),
            );
            return None;
        }
    };
    let [low, high] = checker.pair(
        fields.get(key)?,
        example,
        |checker, node| Some(checker.quantity(node, &[dimension], limits)?.value.value()),
        |value| *value,
    )?;
    Some(if key == "energy" {
        ([low, high], false)
    } else {
        ([1e3 * HC_EV_UM / high, 1e3 * HC_EV_UM / low], true)
    })
}

/// `{drop: 4 %, radius: 35 mm}`.
fn radial(checker: &mut Checker, node: &Node) -> Option<Radial> {
    let fields = checker.fields(node, "`radial`", &["drop", "radius"])?;
    checker.missing(&fields, "`radial`", "drop", "4 %");
    checker.missing(&fields, "`radial`", "radius", "35 mm");
    let mut value = |key: &str, dimension, limits| {
        let node = fields.get(key)?;
        Some(checker.quantity(node, &[dimension], limits)?.value.value())
    };
    let drop = value("drop", Dimension::Percentage, DROP_LIMITS);
    let radius_nm = value("radius", Dimension::Length, RADIUS_LIMITS);
    Some(Radial {
        drop: drop?,
        radius_mm: radius_nm? * 1e-6,
    })
}

/// What of `tolerance` does not fit the stack.
pub(super) fn unfitting(structure: &Structure, stack: &Stack, found: &mut Vec<Diagnostic>) {
    let Some(tolerance) = &structure.tolerance else {
        return;
    };
    let design = match Design::new(stack, None) {
        Ok(design) => design,
        Err(_) => return,
    };
    let grown = design.elements();
    for flux in &tolerance.flux {
        let (element, _) = flux.value;
        if !grown.contains(&element) {
            let symbols: Vec<&str> = grown.iter().map(|element| element.symbol()).collect();
            let problem = Diagnostic::error(format!("no layer holds {}", element.symbol()))
                .at(flux.span.clone());
            found.push(if symbols.is_empty() {
                problem.expected("no `flux`: the file's own materials name no elements")
            } else {
                problem.expected(format!("expected {}", one_of(&symbols)))
            });
        }
    }
    if !tolerance.flux.is_empty() && !grown.is_empty() {
        for entry in structure
            .entries
            .iter()
            .enumerate()
            .filter(|(index, _)| !design.follows_flux(*index))
            .map(|(_, entry)| entry)
        {
            found.push(
                Diagnostic::warning(format!(
                    "{} does not follow `flux`: its material is given by numbers, not by elements",
                    entry.in_words()
                ))
                .at(entry.material.span.clone()),
            );
        }
    }
    if let Some(composition) = &tolerance.composition
        && design.alloy_fractions().is_empty()
    {
        found.push(
            Diagnostic::error("no layer is an alloy whose fractions could be off")
                .at(composition.span.clone())
                .expected("no `composition`"),
        );
    }
    if let Some(jitter) = &tolerance.jitter
        && jitter.value.unit.dimension == Dimension::Monolayers
        && let Some((_, entry)) = structure
            .entries
            .iter()
            .enumerate()
            .find(|(index, _)| stack.length_nm(*index, &jitter.value).is_none())
    {
        found.push(
            no_monolayer(entry, &jitter.span)
                .expected("a length such as `0.1 nm`, or a percentage"),
        );
    }
    if let Some(grading) = &tolerance.grading
        && Design::new(stack, Some(grading.length_nm)).is_err()
    {
        let narrowest = stack
            .layers
            .iter()
            .min_by(|a, b| a.width_nm.total_cmp(&b.width_nm));
        let name = narrowest.map_or("a layer", |layer| layer.label.as_str());
        found.push(
            Diagnostic::error(format!(
                "interfaces graded over {} nm leave nothing of `{name}`",
                grading.length_nm
            ))
            .at(grading.span.clone())
            .expected("a length below that of every layer"),
        );
    }
}
