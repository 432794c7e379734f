//! What each command does, from its arguments to the exit code.

use super::arguments::{Arguments, Command, Format, Output};
use super::output::{refuse_input, write_whole};
use super::progress::SearchProgress;
use crate::diagnostics::Diagnostic;
use crate::models::{ConductionOperator, Unsuitable};
use crate::report::{Levels, MaterialList, MaterialSheet, Report, Tuning};
use crate::structure::{self, Edits, Knob, NewWidth, Stack, Structure};
use crate::subbands::{self, Accuracy, Hold, Subbands};
use crate::tune::{self, Outcome, TuneError};
use crate::units::{self, Dimension};
use std::fs::File;
use std::io::{Read, Write};
use std::path::{Path, PathBuf};

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

/// Runs one command.
pub fn run(arguments: Arguments) -> Exit {
    let result = match arguments.command {
        Command::Levels { file, output } => levels(&file, &output),
        Command::Tune {
            file,
            format,
            output,
        } => tune(&file, format, &output),
        Command::Check { file } => check(&file),
        Command::Materials {
            formula,
            temperature,
            output,
        } => materials(formula.as_deref(), &temperature, &output),
    };
    result.unwrap_or_else(|exit| exit)
}

/// A structure file that was read without errors.
struct Input {
    name: String,
    text: String,
    structure: Structure,
    stack: Stack,
}

impl Input {
    fn read(path: &Path) -> Result<Input, Exit> {
        let name = path.display().to_string();
        let mut bytes = Vec::new();
        // One byte more than is allowed tells a file that is too large; the rest of it is never read.
        let limit = structure::MAX_BYTES as u64 + 1;
        if let Err(error) =
            File::open(path).and_then(|file| file.take(limit).read_to_end(&mut bytes))
        {
            complain(&format!("error: {name} cannot be read: {error}"));
            return Err(Exit::WrongInput);
        }
        let text = match structure::decode(&bytes) {
            Ok(text) => text.to_owned(),
            Err(problem) => {
                show(&problem, &name, "");
                return Err(Exit::WrongInput);
            }
        };
        let (structure, problems) = structure::read(&text);
        for problem in &problems {
            show(problem, &name, &text);
        }
        let structure = structure.ok_or(Exit::WrongInput)?;
        match structure.stack() {
            Ok(stack) => Ok(Input {
                name,
                text,
                structure,
                stack,
            }),
            Err(problems) => {
                problems
                    .iter()
                    .for_each(|problem| show(problem, &name, &text));
                Err(Exit::WrongInput)
            }
        }
    }

    /// A material that the chosen model cannot use, marked where the file names it.
    fn unsuitable(&self, layer: usize, reason: &Unsuitable) -> Exit {
        let layer = &self.stack.layers[layer];
        let mut problem = Diagnostic::error(format!("the material of `{}` {reason}", layer.label));
        if let Some(entry) = self.structure.entries.get(layer.entry) {
            problem = problem.at(entry.material.span.clone());
        }
        if *reason == Unsuitable::NoLaw {
            problem = problem
                .hint("give the material a `nonparabolicity_energy`, or use the parabolic model");
        }
        show(&problem, &self.name, &self.text);
        Exit::WrongInput
    }

    /// Doubts about a solution, each naming its layer.
    fn doubt(&self, subbands: &Subbands, shown: usize) {
        /// Level shifts by the walls below this do not change a printed digit.
        const WALL_SHIFT_EV: f64 = 1e-5;
        for (index, state) in subbands.states().iter().take(shown).enumerate() {
            let label = &self.stack.layers[state.layer].label;
            let words = match state.hold {
                Hold::Walls => format!(
                    "conduction {} (mostly in {label}) lies above the lower outer barrier edge: only the wall holds it, it is not bound",
                    index + 1
                ),
                Hold::Leaky => format!(
                    "conduction {} (mostly in {label}) can tunnel out at an end that the field has lowered; its lifetime is not part of this result",
                    index + 1
                ),
                Hold::Bound if state.wall_shift_ev > WALL_SHIFT_EV => format!(
                    "the walls raise conduction {} (mostly in {label}) by about {:.2} meV: make the outer layers wider",
                    index + 1,
                    1e3 * state.wall_shift_ev
                ),
                Hold::Bound => continue,
            };
            show(&Diagnostic::warning(words), &self.name, &self.text);
        }
        for fault in subbands.audit().faults() {
            show(
                &Diagnostic::warning(format!("audit: {fault}")),
                &self.name,
                &self.text,
            );
        }
    }
}

fn levels(file: &Path, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    let operator = ConductionOperator::new(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let states = input.structure.conduction.states;
    let subbands = subbands::solve(&operator, states, Accuracy::default());
    input.doubt(&subbands, states);
    deliver(
        &Levels::new(&input.structure, &input.stack, &subbands, states),
        output.format,
        output.output.as_deref(),
        file,
    )
}

fn check(file: &Path) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    ConductionOperator::new(&input.stack, input.structure.conduction.model)
        .map_err(|(layer, reason)| input.unsuitable(layer, &reason))?;
    let (layers, width) = (input.stack.layers.len(), input.stack.total_width_nm());
    let tuning = if input.structure.tune.is_some() {
        ", with a tune block"
    } else {
        ""
    };
    print(&format!(
        "{}: {layers} layers, {width:.2} nm{tuning}; no mistakes\n",
        input.name
    ))
}

fn tune(file: &Path, format: Format, outputs: &[PathBuf]) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    for output in outputs {
        check_output(Some(output), file)?;
    }
    let is_structure =
        |path: &&PathBuf| path.extension().is_some_and(|e| e == "yaml" || e == "yml");
    let (structures, reports): (Vec<&PathBuf>, Vec<&PathBuf>) =
        outputs.iter().partition(is_structure);
    if structures.len() > 1 || reports.len() > 1 {
        complain(
            "error: -o may be given once for the tuned structure (.yaml or .yml) and once for the report",
        );
        return Err(Exit::WrongInput);
    }
    let progress = SearchProgress::new();
    let outcome = tune::tune(
        &input.structure,
        &input.stack,
        Accuracy::default(),
        &|stage| progress.show(stage),
    );
    drop(progress);
    let outcome = outcome.map_err(|error| match &error {
        TuneError::Unsuitable { layer, reason } => input.unsuitable(*layer, reason),
        TuneError::NothingToTune => {
            let problem = Diagnostic::error("there is no `tune` block in the file")
                .expected("`tune` with `vary` and `aims`");
            show(&problem, &input.name, &input.text);
            Exit::WrongInput
        }
        TuneError::Snap(_) | TuneError::Unsolved => {
            show(
                &Diagnostic::error(error.to_string()),
                &input.name,
                &input.text,
            );
            Exit::NotPossible
        }
    })?;
    let text = structure::rewrite(&input.text, &input.structure, &edits(&outcome)).map_err(
        |problems| {
            problems
                .iter()
                .for_each(|problem| show(problem, &input.name, &input.text));
            Exit::WrongInput
        },
    )?;
    let tuned = Input {
        stack: outcome.after.stack.clone(),
        ..input
    };
    let report = Tuning::new(&tuned.structure, &outcome, text.clone());
    tuned.doubt(&outcome.after.subbands, report.states());
    if let Some(path) = structures.first() {
        write(path, &text, file)?;
    }
    deliver(
        &report,
        format,
        reports.first().map(|path| path.as_path()),
        file,
    )?;
    Ok(if outcome.met.iter().all(|met| *met) {
        Exit::Done
    } else {
        Exit::NotPossible
    })
}

/// The tuned numbers as edits of the file.
fn edits(outcome: &Outcome) -> Edits {
    let mut edits = Edits::default();
    for variable in &outcome.task.variables {
        let stack = &outcome.after.stack;
        match variable.knob {
            Knob::Width { entry } => {
                let whole = outcome
                    .continuous
                    .as_ref()
                    .and(stack.entry_monolayer_nm(entry));
                let width_nm = stack.entry_width_nm(entry).unwrap_or(variable.low);
                edits.widths.push((
                    entry,
                    match whole {
                        Some(monolayer_nm) => {
                            NewWidth::Monolayers((width_nm / monolayer_nm).round())
                        }
                        None => NewWidth::Length(width_nm),
                    },
                ));
            }
            Knob::Fraction { entry, .. } => {
                if let Some(composition) = stack.composition(entry) {
                    edits.compositions.push((entry, composition.clone()));
                }
            }
            Knob::Field => edits.field_v_per_nm = Some(stack.field_v_per_nm),
        }
    }
    edits
}

fn materials(formula: Option<&str>, temperature: &str, output: &Output) -> Result<Exit, Exit> {
    let nowhere = Path::new("");
    let temperature_k = match units::parse(temperature, &[Dimension::Temperature]) {
        Ok(quantity) if (0.0..=1000.0).contains(&quantity.value()) => quantity.value(),
        Ok(_) => {
            complain(&format!(
                "error: --temperature {temperature}: expected a temperature from 0 K to 1000 K"
            ));
            return Err(Exit::WrongInput);
        }
        Err(error) => {
            complain(&format!(
                "error: --temperature: {error}; expected {}, such as \"77 K\"",
                Dimension::Temperature.noun()
            ));
            return Err(Exit::WrongInput);
        }
    };
    let Some(formula) = formula else {
        let list = MaterialList::new().map_err(|error| {
            complain(&format!("error: {error}"));
            Exit::NotPossible
        })?;
        return deliver(&list, output.format, output.output.as_deref(), nowhere);
    };
    match MaterialSheet::new(formula, temperature_k) {
        Ok(sheet) => deliver(&sheet, output.format, output.output.as_deref(), nowhere),
        Err(error) => {
            complain(&format!("error: {error}"));
            if let Some(hint) = error.hint() {
                complain(&format!("help: {hint}"));
            }
            Err(Exit::WrongInput)
        }
    }
}

/// Prints a result, or writes it to a file.
fn deliver(
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

fn write(path: &Path, text: &str, input: &Path) -> Result<Exit, Exit> {
    write_whole(path, text, &[input])
        .map(|()| Exit::Done)
        .map_err(|error| {
            complain(&format!("error: {error}"));
            Exit::NotPossible
        })
}

/// Refuses an output that is the input before any work is done.
fn check_output(path: Option<&Path>, input: &Path) -> Result<(), Exit> {
    match path.map(|path| refuse_input(path, &[input])) {
        Some(Err(error)) => {
            complain(&format!("error: {error}"));
            Err(Exit::WrongInput)
        }
        _ => Ok(()),
    }
}

/// Prints to stdout. A reader that has gone away is no error.
fn print(text: &str) -> Result<Exit, Exit> {
    match std::io::stdout().lock().write_all(text.as_bytes()) {
        Err(error) if error.kind() != std::io::ErrorKind::BrokenPipe => {
            complain(&format!("error: the result cannot be printed: {error}"));
            Err(Exit::NotPossible)
        }
        _ => Ok(Exit::Done),
    }
}

/// Shows a message on stderr, in colour where the terminal wants it.
fn show(problem: &Diagnostic, name: &str, text: &str) {
    let colour = anstream::AutoStream::choice(&std::io::stderr()) != anstream::ColorChoice::Never;
    complain(&problem.render(name, text, colour));
}

fn complain(text: &str) {
    // Nothing is left to tell when stderr itself is gone.
    let _ = writeln!(std::io::stderr().lock(), "{text}");
}
