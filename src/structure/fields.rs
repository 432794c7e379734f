//! Reading keys, words, numbers and quantities from nodes: each mistake becomes one message, and reading goes on.

use super::document::{Node, Value};
use super::file::Spanned;
use crate::diagnostics::{Diagnostic, probably_meant};
use crate::units::{self, Dimension, Quantity, UnitError};
use std::ops::Range;

/// Collects the messages about one file.
pub(super) struct Checker<'t> {
    pub text: &'t str,
    pub problems: Vec<Diagnostic>,
}

/// The entries of a mapping whose keys are known.
pub(super) struct Fields<'n> {
    entries: Vec<(&'n str, &'n Node)>,
    /// Keys that a misspelt one probably stands for; that they are missing is then not said again.
    meant: Vec<&'static str>,
    /// Where the mapping begins: its first line.
    pub head: Range<usize>,
}

impl<'n> Fields<'n> {
    pub fn get(&self, key: &str) -> Option<&'n Node> {
        self.entries
            .iter()
            .find(|(name, _)| *name == key)
            .map(|(_, node)| *node)
    }

    /// Whether the key is there, or a misspelt one that probably stands for it.
    pub fn has(&self, key: &str) -> bool {
        self.get(key).is_some() || self.meant.contains(&key)
    }
}

/// A closed range that a value must lie in; the lower end itself is left out when `open` is set.
#[derive(Clone, Copy)]
pub(super) struct Limits {
    pub lowest: f64,
    pub highest: f64,
    pub open: bool,
    /// The range in words.
    pub words: &'static str,
}

impl Limits {
    fn contain(&self, value: f64) -> bool {
        value <= self.highest && (value > self.lowest || (!self.open && value == self.lowest))
    }
}

/// The numbers `lowest`..`highest` of a key, in the inner unit.
pub(super) const fn above(lowest: f64, highest: f64, words: &'static str) -> Limits {
    Limits {
        lowest,
        highest,
        open: true,
        words,
    }
}

/// As [`above`], with the lower end included.
pub(super) const fn between(lowest: f64, highest: f64, words: &'static str) -> Limits {
    Limits {
        lowest,
        highest,
        open: false,
        words,
    }
}

/// For values that are judged elsewhere.
pub(super) const ANY: Limits = between(f64::MIN, f64::MAX, "any number");

/// No name, formula or quantity is longer, in bytes; comparing longer texts with what was meant takes long.
const MAX_TEXT: usize = 500;
/// So many mistakes are enough to stop reading: more than are ever shown.
const ENOUGH: usize = 200;

impl Checker<'_> {
    /// Whether enough mistakes were found, so that loops over the file's lists can end.
    pub fn is_full(&self) -> bool {
        self.problems.len() >= ENOUGH
    }

    pub fn report(&mut self, problem: Diagnostic) {
        self.problems.push(problem);
    }

    /// The first line of a range of bytes, where a message about a whole mapping or list points.
    pub fn head(&self, span: &Range<usize>) -> Range<usize> {
        let text = self.text.get(span.clone()).unwrap_or_default();
        let line = text.lines().next().unwrap_or_default().trim_end();
        span.start..span.start + line.len()
    }

    /// The entries of a mapping that may hold `keys`; `what` names it in messages.
    pub fn fields<'n>(
        &mut self,
        node: &'n Node,
        what: &str,
        keys: &[&'static str],
    ) -> Option<Fields<'n>> {
        let Value::Map(entries) = &node.value else {
            self.wrong_kind(
                node,
                &format!("{what}, a mapping with keys such as `{}`", keys[0]),
            );
            return None;
        };
        let mut fields = Fields {
            entries: Vec::new(),
            meant: Vec::new(),
            head: self.head(&node.span),
        };
        for (key, value) in entries {
            if self.is_full() {
                break;
            }
            match key.text() {
                Some(name) if keys.contains(&name) => fields.entries.push((name, value)),
                Some(name) => {
                    let meant = probably_meant(name, keys.iter().copied());
                    let problem = Diagnostic::error(format!("unknown key `{name}` in {what}"))
                        .at(key.span.clone())
                        .expected(one_of(keys));
                    self.report(match meant {
                        Some(meant) => problem.hint(format!("did you mean `{meant}`?")),
                        None if name.starts_with(|c: char| c.is_ascii_digit()) => {
                            problem.hint("a comma begins the next key; write decimals with a point, as in `5.2 nm`")
                        }
                        None => problem,
                    });
                    fields
                        .meant
                        .extend(keys.iter().filter(|key| Some(**key) == meant));
                }
                None => self.wrong_kind(key, "a key, which is a single word"),
            }
        }
        Some(fields)
    }

    /// Says that a node is of another kind than expected.
    pub fn wrong_kind(&mut self, node: &Node, expected: &str) {
        let span = match &node.value {
            Value::Null => self.place_of_nothing(&node.span),
            _ => self.head(&node.span),
        };
        self.report(
            Diagnostic::error(format!("{} stands here", node.noun()))
                .at(span)
                .expected(format!("expected {expected}")),
        );
    }

    /// An absent value has no bytes; the message then points at its key's colon.
    fn place_of_nothing(&self, span: &Range<usize>) -> Range<usize> {
        let colon = self
            .text
            .get(span.start..)
            .is_some_and(|rest| rest.starts_with(':'));
        if span.is_empty() && colon {
            span.start..span.start + 1
        } else {
            span.clone()
        }
    }

    /// Says that a mapping lacks a key that it must have.
    pub fn missing(&mut self, fields: &Fields, what: &str, key: &str, example: &str) {
        if !fields.has(key) {
            self.report(
                Diagnostic::error(format!("{what} has no `{key}`"))
                    .at(fields.head.clone())
                    .expected(format!("add `{key}: {example}`")),
            );
        }
    }

    /// A single value that is not empty.
    pub fn scalar<'n>(&mut self, node: &'n Node, expected: &str) -> Option<&'n str> {
        match &node.value {
            Value::Scalar(text) if text.len() > MAX_TEXT => {
                self.report(
                    Diagnostic::error(format!("a text of {} bytes stands here", text.len()))
                        .at(self.head(&node.span))
                        .expected(format!("expected {expected}")),
                );
                None
            }
            Value::Scalar(text) if !text.trim().is_empty() => Some(text.trim()),
            Value::Scalar(_) => {
                self.report(
                    Diagnostic::error("an empty text stands here")
                        .at(node.span.clone())
                        .expected(format!("expected {expected}")),
                );
                None
            }
            _ => {
                self.wrong_kind(node, expected);
                None
            }
        }
    }

    /// A word out of a fixed set.
    pub fn word(&mut self, node: &Node, words: &[&'static str]) -> Option<&'static str> {
        let expected = one_of(words);
        let text = self.scalar(node, &expected)?;
        let found = words.iter().find(|word| **word == text);
        if found.is_none() {
            let problem = Diagnostic::error(format!("`{text}` is not known here"))
                .at(node.span.clone())
                .expected(format!("expected {expected}"));
            self.report(match probably_meant(text, words.iter().copied()) {
                Some(meant) => problem.hint(format!("did you mean `{meant}`?")),
                None => problem,
            });
        }
        found.copied()
    }

    /// The items of a list.
    pub fn list<'n>(&mut self, node: &'n Node, expected: &str) -> Option<&'n [Node]> {
        match &node.value {
            Value::List(items) => Some(items),
            _ => {
                self.wrong_kind(node, expected);
                None
            }
        }
    }

    /// A whole number from 1 to `highest`.
    pub fn count(&mut self, node: &Node, highest: u32) -> Option<u32> {
        let expected = format!("a whole number from 1 to {highest}");
        let text = self.scalar(node, &expected)?;
        let number = text
            .parse()
            .ok()
            .filter(|number| (1..=highest).contains(number));
        if number.is_none() {
            let what = if text.bytes().all(|byte| byte.is_ascii_digit()) {
                "is out of range"
            } else {
                "is not a whole number of at least 1"
            };
            self.report(
                Diagnostic::error(format!("`{text}` {what}"))
                    .at(node.span.clone())
                    .expected(format!("expected {expected}")),
            );
        }
        number
    }

    /// A pure number within limits.
    pub fn number(&mut self, node: &Node, limits: Limits) -> Option<f64> {
        let expected = format!("a number without unit, {}", limits.words);
        let text = self.scalar(node, &expected)?;
        let problem = match units::split_number(text) {
            Some((number, "")) if limits.contain(number) => return Some(number),
            Some((_, "")) => Diagnostic::error(format!("`{text}` is out of range")),
            Some((_, rest)) => {
                Diagnostic::error(format!("`{rest}` follows a number that has no unit"))
            }
            None => Diagnostic::error(format!("`{text}` is not a number")),
        };
        self.report(
            problem
                .at(node.span.clone())
                .expected(format!("expected {expected}")),
        );
        None
    }

    /// A quantity of one of the dimensions, whose value in the inner unit lies within `limits`.
    ///
    /// A number of monolayers is only held to be positive, since its length is not known yet.
    pub fn quantity(
        &mut self,
        node: &Node,
        dimensions: &[Dimension],
        limits: Limits,
    ) -> Option<Spanned<Quantity>> {
        let expected = match dimensions {
            [first, ..] => format!("{} such as `{}`", first.noun(), first.example()),
            [] => String::new(),
        };
        let text = self.scalar(node, &expected)?;
        match units::parse(text, dimensions) {
            Ok(quantity) => {
                let value = quantity.value();
                let fits = match quantity.unit.dimension {
                    Dimension::Monolayers => value > 0.0 && value <= MAX_MONOLAYERS,
                    _ => limits.contain(value),
                };
                if !fits {
                    self.report(
                        Diagnostic::error(format!("`{text}` is out of range"))
                            .at(node.span.clone())
                            .expected(format!("expected {}", limits.words)),
                    );
                    return None;
                }
                Some(Spanned::new(quantity, node))
            }
            Err(error) => {
                let hint = match &error {
                    UnitError::UnknownUnit {
                        suggestion: Some(unit),
                        ..
                    } => Some(format!("did you mean `{unit}`?")),
                    UnitError::DecimalComma { text } => {
                        Some(format!("did you mean `{}`?", text.replacen(',', ".", 1)))
                    }
                    UnitError::MissingUnit { text } => dimensions.first().and_then(|dimension| {
                        let (_, unit) = units::split_number(dimension.example())?;
                        Some(format!("write the unit, as in `{text} {unit}`"))
                    }),
                    _ => None,
                };
                let problem = Diagnostic::error(error.to_string())
                    .at(node.span.clone())
                    .expected(format!("expected {expected}"));
                self.report(match hint {
                    Some(hint) => problem.hint(hint),
                    None => problem,
                });
                None
            }
        }
    }

    /// The two ends of a range, the lower first, both read by `read`.
    pub fn pair<T>(
        &mut self,
        node: &Node,
        example: &str,
        read: impl Fn(&mut Self, &Node) -> Option<T>,
        value: impl Fn(&T) -> f64,
    ) -> Option<[T; 2]> {
        let expected = format!("the lower and the upper bound, as in `{example}`");
        let items = self.list(node, &expected)?;
        let [low, high] = items else {
            self.report(
                Diagnostic::error(format!("{} bounds stand here", items.len()))
                    .at(self.head(&node.span))
                    .expected(format!("expected {expected}")),
            );
            return None;
        };
        let ends = (read(self, low), read(self, high));
        let (Some(low), Some(high)) = ends else {
            return None;
        };
        if value(&low) >= value(&high) {
            let what = if value(&low) == value(&high) {
                "both bounds are equal, so nothing can vary"
            } else {
                "the bounds are reversed"
            };
            self.report(
                Diagnostic::error(what)
                    .at(self.head(&node.span))
                    .expected(format!("expected {expected}")),
            );
            return None;
        }
        Some([low, high])
    }
}

/// Monolayers of at least 0.2 nm within the widest layer, 100 µm.
const MAX_MONOLAYERS: f64 = 5e5;

/// `` `a`, `b` or `c` ``.
pub(super) fn one_of(words: &[&str]) -> String {
    let quoted: Vec<String> = words.iter().map(|word| format!("`{word}`")).collect();
    match quoted.as_slice() {
        [] => String::new(),
        [only] => only.clone(),
        [first @ .., last] => format!("{} or {last}", first.join(", ")),
    }
}
