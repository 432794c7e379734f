//! The whole of a structure file: text in, checked structure and messages out.

use super::charge::Charge;
use super::document::{self, Node, Value};
use super::fields::{Checker, Fields, Limits};
use super::file::{
    BandName, ConductionBand, ConductionModel, Ends, Spanned, Structure, ValenceBand, ValenceModel,
};
use super::read_layers::{self, FIELD_LIMITS, Known};
use super::rewrite::FreeLine;
use super::{read_charge, read_growth, read_materials, read_sweep, read_tolerance, read_tune};
use crate::diagnostics::{Diagnostic, Severity};
use crate::units::Dimension;

const KEYS: [&str; 13] = [
    "title",
    "substrate",
    "temperature",
    "field",
    "ends",
    "bands",
    "materials",
    "layers",
    "charge",
    "tune",
    "growth",
    "tolerance",
    "sweep",
];
pub(super) const TEMPERATURE_LIMITS: Limits =
    super::fields::between(0.0, 1000.0, "a temperature from 0 K to 1000 K");
const DEFAULT_TEMPERATURE_K: f64 = 300.0;
const DEFAULT_STATES: u32 = 4;
/// More messages than this help nobody.
const MAX_MESSAGES: usize = 50;

/// Reads and checks a structure file.
///
/// The structure is there when no message is an error. The messages, errors and warnings, come in the order of the file;
/// all mistakes are reported, up to the fiftieth.
pub fn read(text: &str) -> (Option<Structure>, Vec<Diagnostic>) {
    let root = match document::parse(text) {
        Ok(root) => root,
        Err(problems) => return (None, problems),
    };
    let mut checker = Checker {
        text,
        problems: Vec::new(),
    };
    let structure = structure(&mut checker, &root);
    let mut problems = checker.problems;
    let wrong = |problems: &[Diagnostic]| {
        problems
            .iter()
            .any(|problem| problem.severity == Severity::Error)
    };
    let structure = structure.filter(|_| !wrong(&problems));
    if let Some(structure) = &structure {
        match structure.stack() {
            Ok(stack) => {
                problems.extend(super::doubts::doubts(structure, &stack));
                problems.extend(read_charge::unfitting(structure, &stack));
                problems.extend(super::period::not_periodic(structure));
                if let Some(growth) = &structure.growth {
                    problems.extend(read_growth::of_stack(growth, structure, &stack));
                }
            }
            Err(errors) => problems.extend(errors),
        }
    }
    let structure = structure.filter(|_| !wrong(&problems));
    problems.sort_by_key(|problem| problem.span.as_ref().map_or(0, |span| span.start));
    if problems.len() > MAX_MESSAGES {
        let more = problems.len() - MAX_MESSAGES;
        // Errors must not be cut off by warnings that stand before them.
        problems.sort_by_key(|problem| problem.severity == Severity::Warning);
        problems.truncate(MAX_MESSAGES);
        let rest = format!("{more} more messages are left out");
        problems.push(match structure {
            Some(_) => Diagnostic::warning(rest),
            None => Diagnostic::error(rest),
        });
    }
    (structure, problems)
}

fn structure(checker: &mut Checker, root: &Node) -> Option<Structure> {
    if root.value == Value::Null {
        checker.report(
            Diagnostic::error("the file is empty")
                .at(0..0)
                .expected("a structure with at least `layers:`"),
        );
        return None;
    }
    let fields = checker.fields(root, "a structure file", &KEYS)?;
    let title = fields
        .get("title")
        .and_then(|node| checker.scalar(node, "a title"))
        .map(str::to_owned);
    let materials = match fields.get("materials") {
        Some(node) => read_materials::materials(checker, node),
        None => read_materials::Materials::default(),
    };
    let known = Known {
        library: &materials.library,
        mistaken: &materials.mistaken,
        has_substrate: fields.has("substrate"),
    };
    let substrate = fields
        .get("substrate")
        .map(|node| read_layers::substance(checker, node, &known, false));
    let temperature = fields
        .get("temperature")
        .map(|node| checker.quantity(node, &[Dimension::Temperature], TEMPERATURE_LIMITS));
    let field = fields
        .get("field")
        .map(|node| checker.quantity(node, &[Dimension::Field], FIELD_LIMITS));
    let ends = fields
        .get("ends")
        .map_or(Ends::Walls, |node| ends(checker, node));
    let (conduction, valence) = match fields.get("bands") {
        Some(node) => bands(checker, node),
        None => (conduction_default(), None),
    };
    let more_bands = valence.is_some() || conduction.model == ConductionModel::EightBand;
    if let (Ends::Open, true, Some(node)) = (ends, more_bands, fields.get("ends")) {
        checker.report(
            Diagnostic::error("`ends: open` is available for a conduction band on its own only")
                .at(node.span.clone())
                .expected("`walls`, or no `valence` under `bands`"),
        );
    }
    let solved = match valence.map(|valence| valence.model) {
        Some(ValenceModel::Decoupled) => &BandName::ALL[..],
        Some(ValenceModel::SixBand | ValenceModel::EightBand) => {
            &[BandName::Conduction, BandName::Valence]
        }
        None => &[BandName::Conduction],
    };
    checker.missing(
        &fields,
        "the file",
        "layers",
        "[{material: GaAs, width: 5.2 nm}]",
    );
    let layers = fields
        .get("layers")
        .and_then(|node| read_layers::layers(checker, node, &known));
    let entries = layers.as_ref().map_or(&[][..], |layers| &layers.entries);
    let tune = fields
        .get("tune")
        .and_then(|node| read_tune::tune(checker, node, entries, solved));
    let growth = fields.get("growth").map(|node| {
        if !fields.has("substrate") {
            checker.report(
                Diagnostic::error("`growth` needs a substrate, on which monolayers are counted")
                    .at(key_span(root, "growth").unwrap_or_default())
                    .expected("a line such as `substrate: GaAs` at the top of the file"),
            );
            return None;
        }
        let chamber = read_growth::Chamber {
            known: &known,
            substrate: substrate.as_ref().and_then(Option::as_ref),
            entries,
        };
        read_growth::growth(checker, node, &chamber)
    });
    if let Some(tune) = &tune
        && !fields.has("growth")
    {
        read_growth::needed_by(checker, tune);
    }
    let tolerance = fields
        .get("tolerance")
        .and_then(|node| read_tolerance::tolerance(checker, node, solved));
    let sweep = fields
        .get("sweep")
        .and_then(|node| read_sweep::sweep(checker, node, entries, solved));
    let charge = fields
        .get("charge")
        .map(|node| read_charge::charge(checker, node, &fields));
    let layers = layers?;
    let mut structure = Structure {
        title,
        substrate: settled(substrate)?,
        temperature_k: settled(temperature)?
            .map_or(DEFAULT_TEMPERATURE_K, |found| found.value.value()),
        field: settled(field)?,
        ends,
        conduction,
        valence,
        library: materials.library,
        entries: layers
            .entries
            .into_iter()
            .map(|(_, entry)| entry)
            .collect::<Option<_>>()?,
        planes: layers.planes,
        sequence: layers.sequence,
        charge: settled(charge)?.unwrap_or(Charge::Flat),
        tune,
        growth: settled(growth)?,
        tolerance,
        sweep,
        field_line: free_line(checker.text, root),
    };
    if !fields.has("charge") {
        let walls = fields
            .get("ends")
            .and_then(Node::text)
            .is_none_or(|ends| ends == "walls");
        structure.charge = read_charge::unstated(checker, &structure, walls);
    }
    Some(structure)
}

/// `None` when the key was there but mistaken.
fn settled<T>(read: Option<Option<T>>) -> Option<Option<T>> {
    match read {
        Some(None) => None,
        Some(found) => Some(found),
        None => Some(None),
    }
}

fn key_span(root: &Node, name: &str) -> Option<std::ops::Range<usize>> {
    let Value::Map(entries) = &root.value else {
        return None;
    };
    entries
        .iter()
        .find(|(key, _)| key.text() == Some(name))
        .map(|(key, _)| key.span.clone())
}

fn ends(checker: &mut Checker, node: &Node) -> Ends {
    match checker.word(node, &["walls", "open", "periodic"]) {
        Some("open") => Ends::Open,
        Some("periodic") => Ends::Periodic,
        _ => Ends::Walls,
    }
}

fn conduction_default() -> ConductionBand {
    ConductionBand {
        model: ConductionModel::Parabolic,
        states: DEFAULT_STATES as usize,
    }
}

/// `bands:`; what is mistaken in it has been reported and stays at its default.
fn bands(checker: &mut Checker, node: &Node) -> (ConductionBand, Option<ValenceBand>) {
    let Some(fields) = checker.fields(node, "`bands`", &["conduction", "valence"]) else {
        return (conduction_default(), None);
    };
    let conduction = fields
        .get("conduction")
        .map(|node| band(checker, node, "`conduction`", CONDUCTION_MODELS));
    let valence = fields
        .get("valence")
        .map(|node| band(checker, node, "`valence`", VALENCE_MODELS));
    let sides = [&conduction, &valence].map(|side| side.as_ref().and_then(|s| s.model.clone()));
    // Eight bands are one problem: what one side says holds for both.
    let eight_band = sides
        .iter()
        .flatten()
        .any(|model| model.value == EIGHT_BAND);
    for (model, (side, other)) in sides
        .iter()
        .zip([("conduction", "valence"), ("valence", "conduction")])
    {
        if let Some(model) = model
            && eight_band
            && model.value != EIGHT_BAND
        {
            checker.report(
                Diagnostic::error(format!(
                    "`{EIGHT_BAND}` solves electrons and holes as one problem, but `{side}` asks for `{}` where `{other}` asks for `{EIGHT_BAND}`",
                    model.value
                ))
                .at(model.span.clone())
                .expected(format!("`{EIGHT_BAND}` for both, or no `model` here")),
            );
        }
    }
    for (side, model) in [&conduction, &valence].into_iter().zip(&sides) {
        let coupled = eight_band || model.as_ref().is_some_and(|model| model.value == SIX_BAND);
        if let Some(side) = side
            && let Some(span) = &side.states_span
            && coupled
            && side.states > read_tune::MAX_COUPLED_LEVELS as usize
        {
            let most = read_tune::MAX_COUPLED_LEVELS;
            checker.report(
                Diagnostic::error(format!(
                    "{} levels are too many for coupled bands",
                    side.states
                ))
                .at(span.clone())
                .expected(format!("at most {most}")),
            );
        }
    }
    let default = conduction_default();
    let [conduction_model, valence_model] = sides.map(|model| model.map(|model| model.value));
    let conduction = ConductionBand {
        model: match conduction_model {
            _ if eight_band => ConductionModel::EightBand,
            Some("energy-dependent") => ConductionModel::EnergyDependent,
            _ => default.model,
        },
        states: conduction.map_or(default.states, |side| side.states),
    };
    let valence = valence.map(|side| ValenceBand {
        model: match valence_model {
            _ if eight_band => ValenceModel::EightBand,
            Some(SIX_BAND) => ValenceModel::SixBand,
            _ => ValenceModel::Decoupled,
        },
        states: side.states,
    });
    (conduction, valence)
}

const SIX_BAND: &str = "six-band";
const EIGHT_BAND: &str = "eight-band";
const CONDUCTION_MODELS: &[&str] = &["parabolic", "energy-dependent", EIGHT_BAND];
const VALENCE_MODELS: &[&str] = &["decoupled", SIX_BAND, EIGHT_BAND];

/// One side of the gap as it is written.
struct WrittenBand {
    model: Option<Spanned<&'static str>>,
    states: usize,
    states_span: Option<std::ops::Range<usize>>,
}

fn band(
    checker: &mut Checker,
    node: &Node,
    name: &str,
    models: &'static [&'static str],
) -> WrittenBand {
    let Some(fields) = checker.fields(node, name, &["model", "states"]) else {
        return WrittenBand {
            model: None,
            states: DEFAULT_STATES as usize,
            states_span: None,
        };
    };
    let model = fields.get("model").and_then(|node| {
        let word = checker.word(node, models)?;
        Some(Spanned::new(word, node))
    });
    WrittenBand {
        model,
        states: states(checker, &fields),
        states_span: fields.get("states").map(|node| node.span.clone()),
    }
}

/// The number of levels asked for.
fn states(checker: &mut Checker, fields: &Fields) -> usize {
    let stated = fields
        .get("states")
        .and_then(|node| checker.count(node, read_tune::MAX_LEVELS));
    stated.unwrap_or(DEFAULT_STATES) as usize
}

/// The line after the title, substrate and temperature, or else the file's first key.
fn free_line(text: &str, root: &Node) -> Option<FreeLine> {
    let Value::Map(entries) = &root.value else {
        return None;
    };
    let (first, _) = entries.first()?;
    if text.get(root.span.clone())?.starts_with('{') || root.shared {
        return None;
    }
    let line_start = text[..first.span.start].rfind('\n').map_or(0, |at| at + 1);
    let indentation = text.get(line_start..first.span.start)?;
    if !indentation.trim_matches([' ', '\u{feff}']).is_empty() {
        return None;
    }
    let last = entries
        .iter()
        .filter(|(key, value)| {
            matches!(key.text(), Some("title" | "substrate" | "temperature")) && !value.shared
        })
        .map(|(key, value)| key.span.end.max(value.span.end))
        .max();
    let at = match last {
        None => first.span.start - indentation.trim_start_matches('\u{feff}').len(),
        Some(end) if text[..end].ends_with('\n') => end,
        Some(end) => end + text[end..].find('\n').map_or(text.len() - end, |at| at + 1),
    };
    Some(FreeLine {
        at,
        indentation: indentation.trim_start_matches('\u{feff}').to_owned(),
    })
}
