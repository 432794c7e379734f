//! Text to a tree of nodes that know where they stand in it.
//!
//! The tree keeps every scalar as the user wrote it (`0.26`, `no`, `1e3`), because what a scalar means depends on the key
//! it belongs to, and because tuned values are written back over exactly those bytes.

use crate::diagnostics::Diagnostic;
use serde::de::{Deserialize, Deserializer, MapAccess, SeqAccess, Visitor};
use std::collections::{HashMap, HashSet};
use std::fmt;
use std::ops::Range;

/// The largest text that is read, in bytes. A stack of some ten thousand layers is far below it.
pub const MAX_BYTES: usize = 2 << 20;
/// The deepest nesting; the format itself needs about a dozen levels, nested repeats included.
const MAX_DEPTH: usize = 64;
/// How many values the text may hold, keys among them; a layer has some ten.
const MAX_NODES: usize = 120_000;
/// How many values may come through aliases.
const MAX_REPEATED: usize = 50_000;

/// One value of the text.
#[derive(Clone, Debug, PartialEq)]
pub struct Node {
    pub value: Value,
    /// The bytes of the value, quotation marks included. A list or mapping reaches to the end of its last value.
    pub span: Range<usize>,
    /// Whether an alias or a merge key makes this value stand for more than one place, so that a change of its bytes
    /// would change more than this node.
    pub shared: bool,
}

/// What a node is.
#[derive(Clone, Debug, PartialEq)]
pub enum Value {
    Null,
    /// The text of a scalar without quotation marks.
    Scalar(String),
    List(Vec<Node>),
    Map(Vec<(Node, Node)>),
}

impl Node {
    /// What the node is, for messages.
    pub fn noun(&self) -> &'static str {
        match self.value {
            Value::Null => "nothing",
            Value::Scalar(_) => "a single value",
            Value::List(_) => "a list",
            Value::Map(_) => "a mapping of keys to values",
        }
    }

    /// The scalar's text, if the node is one.
    pub fn text(&self) -> Option<&str> {
        match &self.value {
            Value::Scalar(text) => Some(text),
            _ => None,
        }
    }
}

/// The text of a file: UTF-8 of bounded size, without a byte order mark.
///
/// # Errors
/// One message when the bytes are too many, hold control characters that no text file has or are not UTF-8.
pub fn decode(bytes: &[u8]) -> Result<&str, Diagnostic> {
    if bytes.len() > MAX_BYTES {
        return Err(too_large());
    }
    if bytes.starts_with(b"\xff\xfe") || bytes.starts_with(b"\xfe\xff") {
        return Err(Diagnostic::error("the file is in UTF-16")
            .expected("a YAML text in UTF-8")
            .hint("save the file as UTF-8 in the editor"));
    }
    if bytes.iter().any(|byte| *byte < b'\t') {
        return Err(
            Diagnostic::error("this is a binary file, not a structure file")
                .expected("a YAML text in UTF-8"),
        );
    }
    match std::str::from_utf8(bytes) {
        Ok(text) => Ok(text.strip_prefix('\u{feff}').unwrap_or(text)),
        Err(error) => {
            let good = &bytes[..error.valid_up_to()];
            let line = 1 + good.iter().filter(|byte| **byte == b'\n').count();
            Err(Diagnostic::error(format!(
                "the file is not UTF-8: byte {} on line {line} belongs to no character",
                error.valid_up_to() + 1
            ))
            .expected("a YAML text in UTF-8")
            .hint("save the file as UTF-8 in the editor"))
        }
    }
}

fn too_large() -> Diagnostic {
    Diagnostic::error(format!(
        "the file has more than the {MAX_BYTES} bytes that a structure file may have"
    ))
}

/// Reads a YAML text into a tree.
///
/// # Errors
/// One message with its place for a text that is not YAML, is nested or repeated beyond all bounds, or holds more than
/// one document; a message for each key that a mapping has twice.
pub fn parse(text: &str) -> Result<Node, Vec<Diagnostic>> {
    if text.len() > MAX_BYTES {
        return Err(vec![too_large()]);
    }
    let options = serde_yaml::options! {
        budget: serde_yaml::budget! {
            max_depth: MAX_DEPTH,
            max_nodes: MAX_NODES,
            enforce_alias_anchor_ratio: false,
            flow_nesting_limit: MAX_DEPTH,
        },
        duplicate_keys: serde_yaml::options::DuplicateKeyPolicy::PassThrough,
        alias_limits: serde_yaml::alias_limits! {
            max_total_replayed_events: MAX_REPEATED,
            max_replay_stack_depth: MAX_DEPTH,
        },
        non_finite_float_policy: serde_yaml::options::NonFiniteFloatPolicy::PassThrough,
        with_snippet: false,
    };
    let raw: Raw = serde_yaml::from_str_with_options(text, options)
        .map_err(|error| vec![syntax_error(text, &error)])?;
    let mut problems = Vec::new();
    let mut reader = Reader {
        text,
        problems: &mut problems,
        repeated: HashSet::new(),
    };
    let mut node = reader.node(raw);
    let repeated = reader.repeated;
    if !repeated.is_empty() {
        mark_shared(&mut node, &repeated);
    }
    if problems.is_empty() {
        Ok(node)
    } else {
        Err(problems)
    }
}

/// A value with its places, as the parser hands it over.
struct Raw(serde_yaml::Spanned<RawValue>);

enum RawValue {
    Null,
    /// A scalar whose type the parser inferred; its text is read from the source.
    Inferred,
    Text(String),
    List(Vec<Raw>),
    Map(Vec<(Raw, Raw)>),
}

impl<'de> Deserialize<'de> for Raw {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        serde_yaml::Spanned::deserialize(deserializer).map(Raw)
    }
}

impl<'de> Deserialize<'de> for RawValue {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_any(RawVisitor)
    }
}

struct RawVisitor;

impl<'de> Visitor<'de> for RawVisitor {
    type Value = RawValue;

    fn expecting(&self, f: &mut fmt::Formatter) -> fmt::Result {
        f.write_str("a value")
    }

    fn visit_unit<E>(self) -> Result<RawValue, E> {
        Ok(RawValue::Null)
    }

    fn visit_bool<E>(self, _: bool) -> Result<RawValue, E> {
        Ok(RawValue::Inferred)
    }

    fn visit_i64<E>(self, _: i64) -> Result<RawValue, E> {
        Ok(RawValue::Inferred)
    }

    fn visit_u64<E>(self, _: u64) -> Result<RawValue, E> {
        Ok(RawValue::Inferred)
    }

    fn visit_i128<E>(self, _: i128) -> Result<RawValue, E> {
        Ok(RawValue::Inferred)
    }

    fn visit_u128<E>(self, _: u128) -> Result<RawValue, E> {
        Ok(RawValue::Inferred)
    }

    fn visit_f64<E>(self, _: f64) -> Result<RawValue, E> {
        Ok(RawValue::Inferred)
    }

    fn visit_str<E>(self, text: &str) -> Result<RawValue, E> {
        Ok(RawValue::Text(text.to_owned()))
    }

    fn visit_string<E>(self, text: String) -> Result<RawValue, E> {
        Ok(RawValue::Text(text))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<RawValue, A::Error> {
        let mut list = Vec::new();
        while let Some(item) = items.next_element()? {
            list.push(item);
        }
        Ok(RawValue::List(list))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<RawValue, A::Error> {
        let mut map = Vec::new();
        while let Some(entry) = entries.next_entry()? {
            map.push(entry);
        }
        Ok(RawValue::Map(map))
    }
}

/// Turns the parser's tree into ours, with places in bytes.
struct Reader<'a> {
    text: &'a str,
    problems: &'a mut Vec<Diagnostic>,
    /// Where the values begin that aliases and merge keys repeat.
    repeated: HashSet<usize>,
}

impl Reader<'_> {
    fn node(&mut self, Raw(raw): Raw) -> Node {
        let aliased = raw.referenced != raw.defined;
        if aliased {
            self.repeated
                .insert(byte_range(self.text, &raw.defined).start);
        }
        let mut span = byte_range(self.text, &raw.referenced);
        let value = match raw.value {
            RawValue::Null => Value::Null,
            RawValue::Inferred => {
                let place = byte_range(self.text, &raw.defined);
                Value::Scalar(self.text.get(place).unwrap_or_default().trim().to_owned())
            }
            RawValue::Text(text) => Value::Scalar(text),
            RawValue::List(items) => {
                let items: Vec<Node> = items.into_iter().map(|item| self.node(item)).collect();
                if !aliased && let Some(last) = items.last() {
                    span.end = span.end.max(last.span.end);
                }
                Value::List(items)
            }
            RawValue::Map(entries) => {
                let entries: Vec<(Node, Node)> = entries
                    .into_iter()
                    .map(|(key, value)| (self.node(key), self.node(value)))
                    .collect();
                if !aliased {
                    self.find_doubles(&entries);
                }
                // Entries taken over by a merge key come last and stand elsewhere, so the end is searched among all.
                if !aliased {
                    for (key, value) in &entries {
                        span.end = span.end.max(key.span.end).max(value.span.end);
                    }
                }
                Value::Map(entries)
            }
        };
        Node {
            value,
            span,
            shared: aliased,
        }
    }

    fn find_doubles(&mut self, entries: &[(Node, Node)]) {
        let mut seen: HashMap<&str, usize> = HashMap::new();
        for (key, _) in entries {
            let Some(name) = key.text() else { continue };
            match seen.get(name) {
                Some(first) => {
                    let line = line_of(self.text, *first);
                    self.problems.push(
                        Diagnostic::error(format!("the key `{name}` stands here a second time"))
                            .at(key.span.clone())
                            .expected(format!("each key once; the first one is on line {line}")),
                    );
                }
                None => {
                    seen.insert(name, key.span.start);
                }
            }
        }
    }
}

/// Marks the nodes that stand at a place which is repeated elsewhere.
fn mark_shared(node: &mut Node, repeated: &HashSet<usize>) {
    node.shared |= repeated.contains(&node.span.start);
    match &mut node.value {
        Value::List(items) => {
            for item in items {
                mark_shared(item, repeated);
            }
        }
        Value::Map(entries) => {
            for (key, value) in entries {
                mark_shared(key, repeated);
                mark_shared(value, repeated);
            }
        }
        Value::Null | Value::Scalar(_) => {}
    }
}

/// The line of a byte, counted from 1.
pub fn line_of(text: &str, at: usize) -> usize {
    1 + text.as_bytes()[..at.min(text.len())]
        .iter()
        .filter(|byte| **byte == b'\n')
        .count()
}

fn byte_range(text: &str, location: &serde_yaml::Location) -> Range<usize> {
    let span = location.span();
    let at = |bytes: Option<u64>| bytes.and_then(|bytes| usize::try_from(bytes).ok());
    let start = at(span.byte_offset()).unwrap_or(0).min(text.len());
    let end = start
        .saturating_add(at(span.byte_len()).unwrap_or(0))
        .min(text.len());
    start..end
}

/// The byte at a line and column, both counted from 1 and the column in characters.
fn byte_at(text: &str, line: u64, column: u64) -> usize {
    let skipped = usize::try_from(line.saturating_sub(1)).unwrap_or(usize::MAX);
    let start: usize = text.split_inclusive('\n').take(skipped).map(str::len).sum();
    let characters = usize::try_from(column.saturating_sub(1)).unwrap_or(usize::MAX);
    let rest = text[start..].split('\n').next().unwrap_or_default();
    start
        + rest
            .char_indices()
            .nth(characters)
            .map_or(rest.len(), |(at, _)| at)
}

/// The parser's complaint in the words of this program.
fn syntax_error(text: &str, error: &serde_yaml::Error) -> Diagnostic {
    use serde_yaml::Error;
    use serde_yaml::budget::BudgetBreach;
    let error = error.without_snippet();
    let location = match error.locations() {
        Some(places) => Some(places.reference_location),
        None => error.location(),
    };
    let span = location.map(|location| match location.span().byte_offset() {
        Some(_) => byte_range(text, &location),
        None => {
            let at = byte_at(text, location.line(), location.column());
            let one = text[at..].chars().next().map_or(0, char::len_utf8);
            at..at + one
        }
    });
    let cause = match error {
        Error::AliasError { error, .. } => error,
        other => other,
    };
    let diagnostic = match cause {
        Error::MultipleDocuments { .. } => {
            Diagnostic::error("a second YAML document begins in this file")
                .expected("one structure per file, without lines `---` in between")
        }
        Error::UnknownAnchor { .. } => {
            Diagnostic::error("this alias repeats a value that no `&name` marks before it")
        }
        Error::RecursiveReferencesRequireWeakTypes { .. } => {
            Diagnostic::error("this alias repeats the value that it is a part of")
        }
        Error::MergeValueNotMapOrSeqOfMaps { .. } => {
            Diagnostic::error("`<<` can only take over a mapping of keys to values")
        }
        Error::AliasReplayLimitExceeded { .. }
        | Error::AliasReplayStackDepthExceeded { .. }
        | Error::AliasExpansionLimitExceeded { .. }
        | Error::AliasReplayCounterOverflow { .. } => Diagnostic::error(format!(
            "the aliases of this file repeat more than {MAX_REPEATED} values"
        )),
        Error::Budget {
            breach: BudgetBreach::Depth { .. },
            ..
        } => too_deep(),
        Error::Budget { .. } => Diagnostic::error(format!(
            "the file holds more values than a structure file may have ({MAX_NODES})"
        )),
        _ => scanner_error(text, span.as_ref(), &cause.to_string()),
    };
    match span {
        Some(span) => diagnostic.at(span),
        None => diagnostic,
    }
}

fn too_deep() -> Diagnostic {
    Diagnostic::error(format!(
        "the values of this file are nested more than {MAX_DEPTH} deep"
    ))
}

/// A message about text that is not YAML: what the scanner says, and what is mostly behind it.
fn scanner_error(text: &str, span: Option<&Range<usize>>, said: &str) -> Diagnostic {
    let said = match said.rfind(" at line ") {
        Some(end) => &said[..end],
        None => said,
    };
    if said.contains("recursion limit") {
        return too_deep();
    }
    let line = span.map_or("", |span| {
        let start = text[..span.start].rfind('\n').map_or(0, |at| at + 1);
        text[start..].lines().next().unwrap_or_default()
    });
    let indentation = &line[..line.len() - line.trim_start().len()];
    let hint = if indentation.contains('\t') {
        "indent with spaces; YAML allows no tabs there"
    } else if said.contains("mapping values are not allowed") {
        "a text with a colon and a space in it needs quotation marks: \"a: b\"; keys of one mapping begin in the same \
         column, and each has a space after its colon"
    } else if said.contains("unclosed") {
        "close it; the end of the file came first"
    } else if said.contains("flow mapping") || said.contains("flow sequence") {
        "a comma separates the entries within {…} and […]"
    } else if said.contains("simple key expected") || said.contains("placement of ':'") {
        "write `key: value`, with a space after the colon, and close every bracket before the next key"
    } else if said.contains("unexpected character") {
        "a text that begins with this character needs quotation marks"
    } else {
        "an entry is `key: value`; entries of one mapping begin in the same column"
    };
    Diagnostic::error(format!("this is not YAML: {said}")).hint(hint)
}
