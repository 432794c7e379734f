//! How results and messages leave the program.

use super::arguments::{Format, Output};
use super::output::{refuse, write_whole};
use crate::diagnostics::Diagnostic;
use crate::report::Report;
use std::io::Write;
use std::path::Path;

/// How a run ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Exit {
    Done,
    /// The input is right, but the work could not be done.
    NotPossible,
    WrongInput,
}

impl From<Exit> for u8 {
    fn from(exit: Exit) -> u8 {
        match exit {
            Exit::Done => 0,
            Exit::NotPossible => 1,
            Exit::WrongInput => 2,
        }
    }
}

/// Prints a result, or writes it to a file.
pub fn deliver(
    report: &impl Report,
    format: Format,
    path: Option<&Path>,
    input: &Path,
) -> Result<Exit, Exit> {
    let text = match format {
        Format::Table => Ok(report.text()),
        Format::Csv => report.csv().map_err(|error| error.to_string()),
        Format::Json => report.json().map_err(|error| error.to_string()),
    };
    let text = text.map_err(|error| {
        complain(&format!(
            "error: the result cannot be put into this form: {error}"
        ));
        Exit::NotPossible
    })?;
    match path {
        Some(path) => write(path, &text, input),
        None => print(&text),
    }
}

/// Writes the picture where the output's name ends in .svg, and the report otherwise.
pub fn deliver_or_draw(
    report: &impl Report,
    svg: impl FnOnce() -> String,
    output: &Output,
    input: &Path,
) -> Result<Exit, Exit> {
    match output.output.as_deref() {
        Some(path) if ends_in(path, "svg") => write(path, &svg(), input),
        path => deliver(report, output.format, path, input),
    }
}

/// Whether a file's name has this ending, in letters of either case.
pub fn ends_in(path: &Path, ending: &str) -> bool {
    path.extension()
        .is_some_and(|own| own.eq_ignore_ascii_case(ending))
}

/// Writes a file whole, never over the input.
pub fn write(path: &Path, text: &str, input: &Path) -> Result<Exit, Exit> {
    write_whole(path, text, &[input])
        .map(|()| Exit::Done)
        .map_err(|error| {
            complain(&format!("error: {error}"));
            Exit::NotPossible
        })
}

/// Refuses an output that is the input, or that cannot be written, before any work is done.
pub fn check_output(path: Option<&Path>, input: &Path) -> Result<(), Exit> {
    match path.map(|path| refuse(path, &[input])) {
        Some(Err(error)) => {
            complain(&format!("error: {error}"));
            Err(Exit::WrongInput)
        }
        _ => Ok(()),
    }
}

/// Prints to stdout. A reader that has gone away is no error.
pub fn print(text: &str) -> Result<Exit, Exit> {
    match std::io::stdout().lock().write_all(text.as_bytes()) {
        Err(error) if error.kind() != std::io::ErrorKind::BrokenPipe => {
            complain(&format!("error: the result cannot be printed: {error}"));
            Err(Exit::NotPossible)
        }
        _ => Ok(Exit::Done),
    }
}

/// Shows a message on stderr, in colour where the terminal wants it.
pub fn show(problem: &Diagnostic, name: &str, text: &str) {
    let colour = anstream::AutoStream::choice(&std::io::stderr()) != anstream::ColorChoice::Never;
    complain(&problem.render(name, text, colour));
}

/// Writes a line to stderr.
pub fn complain(text: &str) {
    // Nothing is left to tell when stderr itself is gone.
    let _ = writeln!(std::io::stderr().lock(), "{text}");
}
