//! The `layers` of a structure file, and the materials they name.

use super::document::{Node, line_of};
use super::fields::{Checker, Fields, Limits, between};
use super::file::{Item, LayerEntry, PlaneEntry, Profile, Spanned};
use crate::diagnostics::Diagnostic;
use crate::materials::{Library, Substance};
use crate::units::Dimension;
use std::collections::HashMap;

/// Bounds that keep sizes within what can be grown and solved; common practice.
pub(super) const WIDTH_LIMITS: Limits = between(0.01, 1e5, "a width from 0.01 nm to 100 µm");
pub(super) const FIELD_LIMITS: Limits = between(-1.0, 1.0, "a field from -10 MV/cm to 10 MV/cm");
pub(super) const DOPING_LIMITS: Limits = between(0.0, 1e22, "from 0 to 1e22 cm^-3");
const SHEET_LIMITS: Limits = between(0.0, 1e15, "from 0 to 1e15 cm^-2");
const MAX_REPEATS: u32 = 10_000;
/// How many layers the stack may have with its repeats laid out.
pub(super) const MAX_LAYERS: usize = 20_000;

const LAYER_KEYS: [&str; 12] = [
    "material",
    "width",
    "name",
    "donors",
    "acceptors",
    "to",
    "profile",
    "match",
    "sheet_donors",
    "sheet_acceptors",
    "repeat",
    "layers",
];

/// The layers as far as they could be read.
pub(super) struct Layers {
    /// Name and content of each entry; a mistaken layer keeps its name, so that `tune` can still refer to it.
    pub entries: Vec<(Option<String>, Option<LayerEntry>)>,
    pub planes: Vec<PlaneEntry>,
    pub sequence: Vec<Item>,
}

/// What the materials of layers are read against.
pub(super) struct Known<'k> {
    pub library: &'k Library,
    /// The names of the file's own materials whose definitions are mistaken; nothing more is said about their use.
    pub mistaken: &'k [String],
    pub has_substrate: bool,
}

pub(super) fn layers(checker: &mut Checker, node: &Node, known: &Known) -> Option<Layers> {
    let mut reader = LayerReader {
        known,
        entries: Vec::new(),
        planes: Vec::new(),
        names: HashMap::new(),
    };
    let (sequence, total) = reader.items(checker, node)?;
    if reader.entries.is_empty() && !reader.planes.is_empty() {
        checker.report(
            Diagnostic::error("there is no layer, only planes of dopants")
                .at(checker.head(&node.span))
                .expected("a layer such as `{material: GaAs, width: 5.2 nm}`"),
        );
    }
    if total > MAX_LAYERS {
        checker.report(
            Diagnostic::error(format!(
                "the stack has {total} layers once its repeats are laid out"
            ))
            .at(checker.head(&node.span))
            .expected(format!("at most {MAX_LAYERS}")),
        );
    }
    Some(Layers {
        entries: reader.entries,
        planes: reader.planes,
        sequence,
    })
}

struct LayerReader<'k> {
    known: &'k Known<'k>,
    entries: Vec<(Option<String>, Option<LayerEntry>)>,
    planes: Vec<PlaneEntry>,
    /// Where each name stands first.
    names: HashMap<String, usize>,
}

impl LayerReader<'_> {
    /// A list of layers and repeats, and how many layers it is when laid out.
    fn items(&mut self, checker: &mut Checker, node: &Node) -> Option<(Vec<Item>, usize)> {
        let nodes = checker.list(node, "a list of layers, the lowest first")?;
        if nodes.is_empty() {
            checker.report(
                Diagnostic::error("there is no layer")
                    .at(node.span.clone())
                    .expected("a list such as `[{material: GaAs, width: 5.2 nm}]`"),
            );
        }
        let mut items = Vec::new();
        let mut total = 0_usize;
        for node in nodes {
            if checker.is_full() {
                break;
            }
            if let Some((item, layers)) = self.item(checker, node) {
                items.push(item);
                total = total.saturating_add(layers);
            }
        }
        Some((items, total))
    }

    fn item(&mut self, checker: &mut Checker, node: &Node) -> Option<(Item, usize)> {
        let fields = checker.fields(node, "a layer", &LAYER_KEYS)?;
        let alone = !fields.has("repeat") && !fields.has("layers");
        let is_sheet = fields.has("sheet_donors") || fields.has("sheet_acceptors");
        if alone && is_sheet && !fields.has("material") && !fields.has("width") {
            let plane = self.plane(checker, node, &fields)?;
            self.planes.push(plane);
            // A plane counts as a layer where their number is bounded.
            return Some((Item::Plane(self.planes.len() - 1), 1));
        }
        if alone {
            return Some((Item::Layer(self.layer(checker, node, &fields)), 1));
        }
        if let Some(key) = LAYER_KEYS[..10].iter().find(|key| fields.has(key)) {
            checker.report(
                Diagnostic::error(format!("`{key}` stands beside `repeat` and `layers`"))
                    .at(fields.head.clone())
                    .expected("a repeat holds layers; what a layer is stands in its own entry"),
            );
        }
        checker.missing(&fields, "this repeat", "repeat", "30");
        checker.missing(
            &fields,
            "this repeat",
            "layers",
            "[{material: GaAs, width: 5.2 nm}]",
        );
        let count = fields
            .get("repeat")
            .and_then(|node| checker.count(node, MAX_REPEATS));
        let (items, layers) = self.items(checker, fields.get("layers")?)?;
        let count = count?;
        Some((
            Item::Repeat { count, items },
            layers.saturating_mul(count as usize),
        ))
    }

    /// Dopants per area between two layers.
    fn plane(&mut self, checker: &mut Checker, node: &Node, fields: &Fields) -> Option<PlaneEntry> {
        if let Some(key) = ["donors", "acceptors", "to", "profile", "match"]
            .iter()
            .find(|key| fields.has(key))
        {
            checker.report(
                Diagnostic::error(format!("`{key}` stands in a plane of dopants"))
                    .at(fields.head.clone())
                    .expected("`sheet_donors` or `sheet_acceptors` with `name`; a layer has `material` and `width` too"),
            );
        }
        let name = fields.get("name").and_then(|node| self.name(checker, node));
        let donors_cm2 = density(checker, fields, "sheet_donors");
        let acceptors_cm2 = density(checker, fields, "sheet_acceptors");
        Some(PlaneEntry {
            label: name.unwrap_or_else(|| format!("plane {}", self.planes.len() + 1)),
            donors_cm2: donors_cm2?,
            acceptors_cm2: acceptors_cm2?,
            span: node.span.clone(),
        })
    }

    /// Reads a layer and returns its index.
    fn layer(&mut self, checker: &mut Checker, node: &Node, fields: &Fields) -> usize {
        let index = self.entries.len();
        let name = fields.get("name").and_then(|node| self.name(checker, node));
        let label = name
            .clone()
            .unwrap_or_else(|| format!("layer {}", index + 1));
        let entry = self.content(checker, node, fields, name.clone(), label);
        self.entries.push((name, entry));
        index
    }

    fn name(&mut self, checker: &mut Checker, node: &Node) -> Option<String> {
        let name = checker.scalar(node, "a name such as `well`")?.to_owned();
        if let Some(first) = self.names.get(&name) {
            let line = line_of(checker.text, *first);
            checker.report(
                Diagnostic::error(format!("two layers are named `{name}`"))
                    .at(node.span.clone())
                    .expected(format!(
                        "another name; the first `{name}` is on line {line}"
                    )),
            );
        } else {
            self.names.insert(name.clone(), node.span.start);
        }
        Some(name)
    }

    fn content(
        &self,
        checker: &mut Checker,
        node: &Node,
        fields: &Fields,
        name: Option<String>,
        label: String,
    ) -> Option<LayerEntry> {
        checker.missing(fields, "this layer", "material", "Al0.26Ga0.74As");
        checker.missing(fields, "this layer", "width", "5.2 nm");
        let matched = match fields.get("match") {
            Some(node) => checker.word(node, &["substrate"]).is_some(),
            None => fields.has("match"),
        };
        if matched
            && !self.known.has_substrate
            && let Some(node) = fields.get("match")
        {
            checker.report(
                Diagnostic::error("this layer is to match the substrate, but the file names none")
                    .at(node.span.clone())
                    .expected("a line such as `substrate: InP` at the top of the file"),
            );
        }
        let material = fields
            .get("material")
            .and_then(|node| substance(checker, node, self.known, matched));
        let to = match fields.get("to") {
            Some(node) => substance(checker, node, self.known, matched).map(Some),
            None => Some(None),
        };
        let is_open = |found: Option<&Spanned<Substance>>| {
            found.is_some_and(|found| matches!(found.value, Substance::Family(_)))
        };
        if let (Some(node), Some(material), Some(to)) = (fields.get("match"), &material, &to)
            && !is_open(Some(material))
            && !is_open(to.as_ref())
        {
            checker.report(
                Diagnostic::error("this layer leaves no fraction open to match the substrate")
                    .at(node.span.clone())
                    .expected(
                        "an alloy without numbers, such as `material: InGaAs`, or no `match`",
                    ),
            );
        }
        let width = fields.get("width").and_then(|node| {
            checker.quantity(
                node,
                &[Dimension::Length, Dimension::Monolayers],
                WIDTH_LIMITS,
            )
        });
        let profile = match fields.get("profile") {
            Some(node) => {
                let word = checker.word(node, &["linear", "parabolic"]);
                if !fields.has("to") {
                    checker.report(
                        Diagnostic::error("a profile needs a second material to go to")
                            .at(node.span.clone())
                            .expected("`to: GaAs` in the same layer"),
                    );
                }
                word
            }
            None => Some("linear"),
        };
        let donors_cm3 = density(checker, fields, "donors");
        let acceptors_cm3 = density(checker, fields, "acceptors");
        let sheet_donors_cm2 = density(checker, fields, "sheet_donors");
        let sheet_acceptors_cm2 = density(checker, fields, "sheet_acceptors");
        Some(LayerEntry {
            name,
            label,
            material: material?,
            width: width?,
            to: to?,
            profile: if profile? == "parabolic" {
                Profile::Parabolic
            } else {
                Profile::Linear
            },
            donors_cm3: donors_cm3?,
            acceptors_cm3: acceptors_cm3?,
            sheet_donors_cm2: sheet_donors_cm2?,
            sheet_acceptors_cm2: sheet_acceptors_cm2?,
            span: node.span.clone(),
        })
    }
}

/// The density of dopants that a key states, per volume or, for a sheet, per area; 0 without the key.
fn density(checker: &mut Checker, fields: &Fields, key: &str) -> Option<f64> {
    let (dimension, limits) = if key.starts_with("sheet_") {
        (Dimension::SheetDensity, SHEET_LIMITS)
    } else {
        (Dimension::VolumeDensity, DOPING_LIMITS)
    };
    match fields.get(key) {
        Some(node) => checker
            .quantity(node, &[dimension], limits)
            .map(|found| found.value.value()),
        None => Some(0.0),
    }
}

/// A material by formula or by name; an alloy with open fractions only where these are `matched` to the substrate.
pub(super) fn substance(
    checker: &mut Checker,
    node: &Node,
    known: &Known,
    matched: bool,
) -> Option<Spanned<Substance>> {
    let expected = "a formula such as `Al0.26Ga0.74As`, or the name of a material of this file";
    let text = checker.scalar(node, expected)?;
    let found = known.library.find(text);
    if known.mistaken.iter().any(|name| name == text) && !matches!(found, Ok(Substance::Alloy(_))) {
        return None;
    }
    let error = match found {
        Ok(family @ Substance::Family(_)) if !matched => {
            // The library says which fractions it would need.
            known.library.material(&family, 0.0).err()?
        }
        Ok(substance) => return Some(Spanned::new(substance, node)),
        Err(error) => error,
    };
    let problem = Diagnostic::error(error.to_string())
        .at(node.span.clone())
        .expected(format!("expected {expected}"));
    checker.report(match error.hint() {
        Some(hint) => problem.hint(hint),
        None => problem,
    });
    None
}
