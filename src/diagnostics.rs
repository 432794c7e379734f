//! Messages about the user's input: what is wrong, where it stands, what was expected and what was probably meant.

use annotate_snippets::{AnnotationKind, Group, Level, Renderer, Snippet, renderer::DecorStyle};
use std::ops::Range;

/// How much a message matters: an error stops the work, a warning names a doubt about the result.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Severity {
    Error,
    Warning,
}

/// One message, with the byte range of the text it is about.
#[derive(Clone, Debug, PartialEq)]
pub struct Diagnostic {
    pub severity: Severity,
    /// What is wrong, in one sentence without a full stop.
    pub message: String,
    /// Where in the file, in bytes; `None` for a message about the whole.
    pub span: Option<Range<usize>>,
    /// What was expected at that place; stands beside the marked text.
    pub expected: Option<String>,
    /// What was probably meant, or what to do.
    pub hint: Option<String>,
}

impl Diagnostic {
    /// An error about the whole input; add its place and help with the builder methods.
    pub fn error(message: impl Into<String>) -> Self {
        Self {
            severity: Severity::Error,
            message: message.into(),
            span: None,
            expected: None,
            hint: None,
        }
    }

    /// A warning about the whole input.
    pub fn warning(message: impl Into<String>) -> Self {
        Self {
            severity: Severity::Warning,
            ..Self::error(message)
        }
    }

    pub fn at(mut self, span: Range<usize>) -> Self {
        self.span = Some(span);
        self
    }

    pub fn expected(mut self, expected: impl Into<String>) -> Self {
        self.expected = Some(expected.into());
        self
    }

    pub fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }

    /// The message with file, line, column and the line itself, over several lines of text.
    ///
    /// `source` is the file's text and `name` how the user calls it. Escape sequences for colour are included when
    /// `colour` is set.
    pub fn render(&self, name: &str, source: &str, colour: bool) -> String {
        let level = match self.severity {
            Severity::Error => Level::ERROR,
            Severity::Warning => Level::WARNING,
        };
        let title = level.primary_title(&self.message);
        let mut groups = Vec::new();
        match &self.span {
            Some(span) => {
                let span = within_text(span, source);
                // The renderer is handed the marked lines only: it lays out every line that it is given.
                let start = source[..span.start].rfind('\n').map_or(0, |at| at + 1);
                let end = source[span.end..]
                    .find('\n')
                    .map_or(source.len(), |at| span.end + at);
                let line = 1 + source[..start]
                    .bytes()
                    .filter(|byte| *byte == b'\n')
                    .count();
                let marked = AnnotationKind::Primary
                    .span(span.start - start..span.end - start)
                    .label(self.expected.as_deref());
                let snippet = Snippet::source(&source[start..end])
                    .path(name)
                    .line_start(line)
                    .annotation(marked);
                groups.push(title.element(snippet));
            }
            None => {
                let text = match &self.expected {
                    Some(expected) => format!("{name}: {expected}"),
                    None => name.to_owned(),
                };
                groups.push(Group::with_title(title).element(Level::NOTE.message(text)));
            }
        }
        if let Some(hint) = &self.hint {
            groups.push(Group::with_title(Level::HELP.secondary_title(hint)));
        }
        let renderer = if colour {
            Renderer::styled()
        } else {
            Renderer::plain()
        };
        renderer.decor_style(DecorStyle::Ascii).render(&groups)
    }
}

/// Clips a range to the text and to character boundaries, so that no range can make rendering fail.
fn within_text(span: &Range<usize>, source: &str) -> Range<usize> {
    let floor = |mut at: usize| {
        at = at.min(source.len());
        while !source.is_char_boundary(at) {
            at -= 1;
        }
        at
    };
    let start = floor(span.start);
    start..floor(span.end).max(start)
}

/// The candidate nearest to `word`, when it is near enough to have been meant.
pub fn probably_meant<'a>(
    word: &str,
    candidates: impl IntoIterator<Item = &'a str>,
) -> Option<&'a str> {
    let lower = word.to_lowercase();
    candidates
        .into_iter()
        .map(|candidate| {
            (
                strsim::damerau_levenshtein(&lower, &candidate.to_lowercase()),
                candidate,
            )
        })
        .filter(|(distance, candidate)| {
            *distance <= 1 + candidate.chars().count().max(lower.chars().count()) / 4
        })
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, candidate)| candidate)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_file_line_and_column_and_shows_the_line() {
        let source = "substrate: GaAs\ntemprature: 77 K\n";
        let text = Diagnostic::error("unknown key `temprature`")
            .at(16..26)
            .expected("a key of a structure file")
            .hint("did you mean `temperature`?")
            .render("well.yaml", source, false);
        assert!(text.contains("well.yaml:2:1"), "{text}");
        assert!(text.contains("temprature: 77 K"), "{text}");
        assert!(text.contains("did you mean `temperature`?"), "{text}");
    }

    #[test]
    fn any_range_renders() {
        for (start, end) in [(0, 0), (3, 1), (2, 999), (1, 2)] {
            Diagnostic::error("x")
                .at(start..end)
                .render("f", "µ\n", false);
        }
        Diagnostic::error("x").at(0..0).render("f", "", false);
    }

    #[test]
    fn finds_the_word_that_was_meant() {
        assert_eq!(
            probably_meant("temprature", ["title", "temperature"]),
            Some("temperature")
        );
        assert_eq!(probably_meant("zzz", ["title", "temperature"]), None);
    }
}
