//! A structure file as a command's input, and the messages about it.

use super::deliver::{Exit, complain, show};
use crate::diagnostics::Diagnostic;
use crate::epitaxy;
use crate::models::Unsuitable;
use crate::structure::{self, Ends, Stack, Structure};
use crate::subbands::{Bands, Hold, State, Subbands};
use std::collections::BTreeSet;
use std::fs::File;
use std::io::Read;
use std::path::Path;

/// A structure file that was read without errors.
pub struct Input {
    pub name: String,
    pub text: String,
    pub structure: Structure,
    pub stack: Stack,
}

impl Input {
    /// Reads a file, with all its mistakes and doubts shown.
    pub fn read(path: &Path) -> Result<Input, Exit> {
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
    pub fn unsuitable(&self, layer: usize, reason: &Unsuitable) -> Exit {
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

    /// Says that a command leaves the holes of the file out.
    pub fn without_holes(&self, what: &str) {
        if self.structure.valence.is_some() {
            let words =
                format!("{what} the conduction band only; `levels` and `tune` solve the holes too");
            show(&Diagnostic::warning(words), &self.name, &self.text);
        }
    }

    /// Says that a command takes walls where the file has open ends.
    pub fn with_walls(&self, what: &str) {
        if self.structure.ends == Ends::Open {
            let words = format!(
                "{what} between walls at both ends: escape widths and lifetimes are left out; `levels`, `transmission` and `absorption` let electrons out"
            );
            show(&Diagnostic::warning(words), &self.name, &self.text);
        }
    }

    /// Doubts about the solutions of all bands, of each about the states that are listed.
    pub fn doubt_all(&self, bands: &Bands, shown: &[usize]) {
        for (band, shown) in bands.all().iter().zip(shown) {
            self.doubt(band, *shown);
        }
    }

    /// Doubts about whether the layers stay coherent.
    pub fn doubt_growth(&self) {
        for problem in epitaxy::doubts(&self.structure, &self.stack) {
            show(&problem, &self.name, &self.text);
        }
    }

    /// Doubts about a solution. States of one kind, one above the other in one layer, share a message.
    pub fn doubt(&self, subbands: &Subbands, shown: usize) {
        /// Level shifts by the walls below this do not change a printed digit.
        const WALL_SHIFT_EV: f64 = 1e-5;
        let states = subbands.states();
        let shown = shown.min(states.len());
        // All unbound states share one message: there is no limit to them.
        let alike = |a: &State, b: &State| {
            a.hold == b.hold && (a.hold == Hold::Walls || a.layer == b.layer)
        };
        let band = subbands.band.name().word();
        // Holes are the other way up.
        let (outside, raise) = if subbands.band.sign() > 0.0 {
            ("above the lower", "raise")
        } else {
            ("below the higher", "lower")
        };
        let mut first = 0;
        for group in states[..shown].chunk_by(alike) {
            let last = first + group.len();
            let (which, many) = if group.len() == 1 {
                (format!("{band} {last}"), false)
            } else {
                (format!("{band} {} to {last}", first + 1), true)
            };
            first = last;
            let verb = |one: &str, several: &str| (if many { several } else { one }).to_owned();
            let layers: BTreeSet<usize> = group.iter().map(|state| state.layer).collect();
            let labels: Vec<&str> = layers
                .iter()
                .map(|layer| &*self.stack.layers[*layer].label)
                .collect();
            let place = match labels[..] {
                [one] => format!("mostly in {one}"),
                [one, other] => format!("mostly in {one} and {other}"),
                _ => "spread over the stack".to_owned(),
            };
            let shift_ev = group.iter().map(|s| s.wall_shift_ev).fold(0.0, f64::max);
            let words = match group[0].hold {
                Hold::Walls => format!(
                    "{which} ({place}) {} {outside} outer barrier edge: only the wall holds {}, {} not bound",
                    verb("lies", "lie"),
                    verb("it", "them"),
                    verb("it is", "they are"),
                ),
                Hold::Leaky => format!(
                    "{which} ({place}) can tunnel out at an end that the field has lowered; no lifetime is part of this result, `ends: open` gives it"
                ),
                Hold::Bound if shift_ev > WALL_SHIFT_EV => format!(
                    "the walls {raise} {which} ({place}) by {} {:.2} meV: make the outer layers wider",
                    verb("about", "up to about"),
                    1e3 * shift_ev
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
