//! `sweep`: levels and transitions while one number of the stack goes through a range.

use super::arguments::{Format, Output, PlotWidth, SweepWhat};
use super::deliver::{Exit, check_output, complain, deliver, ends_in, show, write};
use super::input::Input;
use super::progress::SearchProgress;
use super::threads::pool;
use crate::diagnostics::Diagnostic;
use crate::report::Sweeps;
use crate::report::svg::Width;
use crate::structure::BandName;
use crate::subbands::Accuracy;
use crate::sweep::{self, NotSolved, Outcome, Part, SweepError};
use std::path::Path;

pub fn sweep(
    file: &Path,
    (points, part, threads): (Option<u32>, Option<Part>, Option<u16>),
    (what, width): (Option<SweepWhat>, Option<PlotWidth>),
    output: &Output,
) -> Result<Exit, Exit> {
    let picture = output.output.as_deref();
    let picture = picture.filter(|path| ends_in(path, "svg"));
    if part.is_some() && (output.format != Format::Csv || picture.is_some()) {
        complain("error: slices join as CSV only: --part needs --format csv, and no picture");
        return Err(Exit::WrongInput);
    }
    if picture.is_none() && (what.is_some() || width.is_some()) {
        complain(
            "error: --what and --width are for a picture: give it a name that ends in .svg with -o",
        );
        return Err(Exit::WrongInput);
    }
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    input.without_minibands("`sweep`")?;
    input.with_walls("the sweep solves levels");
    let part = part.unwrap_or(Part::WHOLE);
    let pool = pool(threads)?;
    let progress = SearchProgress::new();
    let outcome = pool.install(|| {
        sweep::sweep(
            &input.structure,
            &input.stack,
            points.map(|points| points as usize),
            part,
            Accuracy::default(),
            &|done, all| progress.say(format!("{done} of {all} points")),
        )
    });
    drop(progress);
    let outcome = outcome.map_err(|error| refused(&input, &error))?;
    doubt(&input, &outcome);
    input.doubt_growth();
    let report = Sweeps::new(&input.structure, &input.stack, outcome, part.is_first());
    match picture {
        Some(path) => {
            let width = width.map_or(Width::Page, Width::from);
            let svg = match what {
                Some(SweepWhat::Transitions) => report.transitions_svg(width),
                Some(SweepWhat::Levels) | None => report.levels_svg(width),
            };
            write(path, &svg, file)
        }
        None => deliver(&report, output.format, output.output.as_deref(), file),
    }
}

fn refused(input: &Input, error: &SweepError) -> Exit {
    let place = input
        .structure
        .sweep
        .as_ref()
        .map(|sweep| sweep.span.clone());
    let problem = match error {
        SweepError::Unsolved(NotSolved::Unsuitable { layer, reason }) => {
            return input.unsuitable(*layer, reason);
        }
        SweepError::NothingToSweep => Diagnostic::error(error.to_string())
            .expected("`sweep` with `vary`, such as `{vary: {field: [0 kV/cm, 60 kV/cm]}}`"),
        SweepError::Unsolved(_) => Diagnostic::error(error.to_string()),
    };
    let problem = match place {
        Some(span) => problem.at(span),
        None => problem,
    };
    show(&problem, &input.name, &input.text);
    Exit::WrongInput
}

/// Doubts about what was found, each said once for all points.
fn doubt(input: &Input, outcome: &Outcome) {
    let warn = |words: String| show(&Diagnostic::warning(words), &input.name, &input.text);
    let all = outcome.points.len();
    let refused = outcome
        .points
        .iter()
        .filter_map(|point| point.found.as_ref().err());
    let reasons: Vec<&NotSolved> = refused.collect();
    if let Some(first) = reasons.first() {
        warn(format!(
            "{} of {all} points cannot be solved: {first}",
            reasons.len()
        ));
    }
    let found = || {
        outcome
            .points
            .iter()
            .filter_map(|point| point.found.as_ref().ok())
    };
    for (band, (name, count)) in outcome.bands.iter().enumerate() {
        for state in 0..*count {
            let loose =
                found().filter(|found| found.levels[band].get(state).is_some_and(|l| !l.bound));
            let loose = loose.count();
            if loose > 0 {
                warn(format!(
                    "{} {} and what lies beyond it are held by the walls only, not bound, at {loose} of {all} points",
                    name.word(),
                    state + 1
                ));
                break;
            }
        }
    }
    for (band, (name, count)) in outcome.bands.iter().enumerate() {
        for state in 0..*count {
            let other = found().filter(|found| {
                let own = found.levels[band].get(state);
                own.is_some_and(|level| level.inverted)
            });
            let other = other.count();
            if other > 0 {
                let kind = match *name {
                    BandName::Conduction => "holes",
                    _ => "electrons",
                };
                warn(format!(
                    "{} {} is mostly of {kind} at {other} of {all} points: the gap is broken there. Levels are counted from it by their number, and a state that crosses it is not followed from one band to the other",
                    name.word(),
                    state + 1
                ));
            }
        }
    }
    if !outcome.followed {
        warn("states change faster along this range than they can be followed: what they follow is not sure".to_owned());
    }
    if outcome
        .anticrossings
        .iter()
        .any(|crossing| !crossing.settled)
    {
        warn("the search for a least gap did not settle".to_owned());
    }
    let faults: Vec<&String> = found().flat_map(|found| found.faults.first()).collect();
    if let Some(fault) = faults.first() {
        warn(format!(
            "audit: at {} of {all} points, the first: {fault}",
            faults.len()
        ));
    }
}
