//! The `materials` of a structure file: the user's own ones, and changes to the library.

use super::document::{Node, Value};
use super::fields::{Checker, Fields};
use crate::diagnostics::Diagnostic;
use crate::materials::{Definition, DefinitionProblem, KEYS, Key, Library, MaterialError};

/// More are no design; the limit bounds the time that `like` takes to follow.
const MAX_MATERIALS: usize = 100;

/// What `materials` comes to.
#[derive(Default)]
pub(super) struct Materials {
    pub library: Library,
    /// The names of definitions with a mistake, which the library lacks.
    pub mistaken: Vec<String>,
}

pub(super) fn materials(checker: &mut Checker, node: &Node) -> Materials {
    let Value::Map(entries) = &node.value else {
        checker.wrong_kind(
            node,
            "materials by name, as in `Barrier: {conduction_edge: 0.23 eV}`",
        );
        return Materials::default();
    };
    if entries.len() > MAX_MATERIALS {
        checker.report(
            Diagnostic::error(format!("there are {} materials", entries.len()))
                .at(checker.head(&node.span))
                .expected(format!("at most {MAX_MATERIALS}")),
        );
        return Materials::default();
    }
    let mut mistaken = Vec::new();
    let mut definitions = Vec::new();
    for (key, content) in entries {
        let Some(name) = checker.scalar(key, "the name of a material") else {
            continue;
        };
        match definition(checker, content, name) {
            Some(definition) => definitions.push((name.to_owned(), definition)),
            None => mistaken.push(name.to_owned()),
        }
    }
    // A definition made like a mistaken one is left out in silence, since its own words may be right.
    let like = |name: &str| {
        let (_, content) = entries.iter().find(|(key, _)| is_named(key, name))?;
        let Value::Map(entries) = &content.value else {
            return None;
        };
        entries
            .iter()
            .find(|(key, _)| is_named(key, "like"))?
            .1
            .text()
    };
    while let Some(at) = definitions.iter().position(|(name, _)| {
        like(name).is_some_and(|like| mistaken.iter().any(|name| name == like.trim()))
    }) {
        mistaken.push(definitions.remove(at).0);
    }
    let mut library = Library::with_definitions(&definitions);
    if let Err(problems) = &library {
        for problem in problems {
            refused(checker, entries, problem);
        }
        mistaken.extend(definitions.into_iter().map(|(name, _)| name));
        library = Ok(Library::new());
    }
    Materials {
        library: library.unwrap_or_default(),
        mistaken,
    }
}

/// Reads one definition; `None` when anything in it is mistaken.
fn definition(checker: &mut Checker, node: &Node, name: &str) -> Option<Definition> {
    let before = checker.problems.len();
    let mut keys = vec!["like", "choose", "bowing"];
    keys.extend(KEYS.iter().map(|key| key.name));
    let fields = checker.fields(node, &format!("the material `{name}`"), &keys)?;
    let mut definition = match fields.get("like") {
        Some(node) => Definition::like(checker.scalar(node, "the material to start from")?),
        None => Definition::default(),
    };
    for key in &KEYS {
        if let Some(node) = fields.get(key.name)
            && let Some(numbers) = numbers(checker, node, key)
            && let Err(error) = definition.set(key.name, &numbers)
        {
            report(checker, node, &error);
        }
    }
    if let Some(node) = fields.get("bowing") {
        for (key, node) in by_key(checker, node, "`bowing`") {
            if let Some(number) = number(checker, node, key)
                && let Err(error) = definition.set_bowing(key.name, number)
            {
                report(checker, node, &error);
            }
        }
    }
    if let Some(node) = fields.get("choose") {
        for (key, node) in by_key(checker, node, "`choose`") {
            if let Some(alternative) = checker.scalar(node, "the name of an alternative value")
                && let Err(error) = definition.choose(key.name, alternative)
            {
                report(checker, node, &error);
            }
        }
    }
    (checker.problems.len() == before).then_some(definition)
}

/// The entries of a mapping by parameter.
fn by_key<'n>(checker: &mut Checker, node: &'n Node, what: &str) -> Vec<(&'static Key, &'n Node)> {
    let keys: Vec<&'static str> = KEYS.iter().map(|key| key.name).collect();
    let fields: Option<Fields> = checker.fields(node, what, &keys);
    let Some(fields) = fields else {
        return Vec::new();
    };
    KEYS.iter()
        .filter_map(|key| Some((key, fields.get(key.name)?)))
        .collect()
}

/// The numbers of a parameter, in its inner unit.
fn numbers(checker: &mut Checker, node: &Node, key: &Key) -> Option<Vec<f64>> {
    if key.components == 1 {
        return Some(vec![number(checker, node, key)?]);
    }
    let expected = format!("a list of {} values", key.components);
    let items = checker.list(node, &expected)?;
    if items.len() != key.components {
        checker.report(
            Diagnostic::error(format!("`{}` has {} values", key.name, items.len()))
                .at(checker.head(&node.span))
                .expected(format!("expected {expected}")),
        );
        return None;
    }
    let found: Vec<Option<f64>> = items
        .iter()
        .map(|item| number(checker, item, key))
        .collect();
    found.into_iter().collect()
}

/// One number of a parameter, in its inner unit; whether it makes sense, the definition finds out.
fn number(checker: &mut Checker, node: &Node, key: &Key) -> Option<f64> {
    match key.dimension {
        Some(dimension) => {
            let found = checker.quantity(node, &[dimension], super::fields::ANY)?;
            Some(found.value.value())
        }
        None => checker.number(node, super::fields::ANY),
    }
}

fn is_named(key: &Node, name: &str) -> bool {
    key.text().map(str::trim) == Some(name)
}

fn report(checker: &mut Checker, node: &Node, error: &MaterialError) {
    let problem = Diagnostic::error(error.to_string()).at(checker.head(&node.span));
    checker.report(match error.hint() {
        Some(hint) => problem.hint(hint),
        None => problem,
    });
}

/// Reports what the library says about a definition, at its place.
fn refused(checker: &mut Checker, entries: &[(Node, Node)], problem: &DefinitionProblem) {
    let Some((name, content)) = entries.iter().find(|(key, _)| is_named(key, &problem.name)) else {
        return;
    };
    let mut place = name;
    let mut node = content;
    for step in &problem.path {
        let Value::Map(entries) = &node.value else {
            break;
        };
        let Some((_, value)) = entries.iter().find(|(key, _)| is_named(key, step)) else {
            break;
        };
        (place, node) = (value, value);
    }
    report(checker, place, &problem.error);
}
