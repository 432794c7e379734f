//! A structure file as a command's input, and the messages about it.

use super::deliver::{Exit, complain, show};
use crate::charge::{self, ChargeError, Equilibrium, Solution};
use crate::diagnostics::Diagnostic;
use crate::epitaxy;
use crate::models::{Band, Unsuitable};
use crate::structure::{self, Ends, Stack, Structure};
use crate::subbands::{Accuracy, Audit, Bands, Hold, State};
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

    /// The bands of the stack, bent by charge where the file says so.
    pub fn solved(&self, bands: &[(Band, usize)]) -> Result<Solution, Exit> {
        charge::solve(
            &self.stack,
            &self.structure.charge,
            bands,
            Accuracy::default(),
        )
        .map_err(|error| self.uncharged(&error))
    }

    /// Says why there is no equilibrium.
    pub fn uncharged(&self, error: &ChargeError) -> Exit {
        if let ChargeError::Unsuitable { layer, reason } = error {
            return self.unsuitable(*layer, reason);
        }
        let problem =
            Diagnostic::error(error.to_string()).hint("`charge: flat` leaves the bands flat");
        show(&problem, &self.name, &self.text);
        Exit::NotPossible
    }

    /// Doubts about the charge; the exit code is that of work that could not be done where the bands did not settle.
    pub fn doubt_charge(&self, equilibrium: Option<&Equilibrium>) -> Exit {
        /// Carriers in the last subband that was solved beyond this part make the result doubtful.
        const CUT_OFF: f64 = 1e-6;
        let Some(found) = equilibrium else {
            return Exit::Done;
        };
        if found.beyond > CUT_OFF {
            let words = format!(
                "the highest subband that is solved still holds {:.0e} of its band's carriers: those above it are left out",
                found.beyond
            );
            show(&Diagnostic::warning(words), &self.name, &self.text);
        }
        if found.is_settled() {
            return Exit::Done;
        }
        let words = format!(
            "charge and potential did not settle in {} iterations: the last still moved the bands by {:.0e} eV",
            found.iterations, found.residual_ev
        );
        show(&Diagnostic::warning(words), &self.name, &self.text);
        Exit::NotPossible
    }

    /// Doubts about the solutions of all bands, of each about the states that are listed.
    pub fn doubt_all(&self, bands: &Bands, shown: &[usize]) {
        for (band, shown) in shown.iter().enumerate() {
            let states = bands.states(band);
            self.doubt_states(bands.band(band), &states, *shown);
            self.doubt_names(bands.band(band), &states[..states.len().min(*shown)]);
        }
        self.audited(&bands.audit());
    }

    /// Says which of the listed states of coupled bands bear the name of the other band.
    fn doubt_names(&self, band: Band, states: &[State]) {
        let other = |state: &State| {
            let of_conduction = state.shares.map(|shares| shares.conduction > 0.5);
            of_conduction.is_some_and(|of_conduction| of_conduction != (band.sign() > 0.0))
        };
        let names: Vec<String> = (1..)
            .zip(states)
            .filter(|(_, state)| other(state))
            .map(|(number, _)| format!("{} {number}", band.name().word()))
            .collect();
        if let [first, ..] = &names[..] {
            let (which, verb) = match names.len() {
                1 => (first.clone(), "is"),
                _ => (names.join(", "), "are"),
            };
            let kind = if band.sign() > 0.0 {
                "holes"
            } else {
                "electrons"
            };
            let words = format!(
                "{which} {verb} mostly of {kind}: the gap is broken, by the layers or by the field, and levels are counted from it by their number"
            );
            show(&Diagnostic::warning(words), &self.name, &self.text);
        }
    }

    /// Doubts about whether the layers stay coherent.
    pub fn doubt_growth(&self) {
        for problem in epitaxy::doubts(&self.structure, &self.stack) {
            show(&problem, &self.name, &self.text);
        }
    }

    /// Doubts about the states of one band. States of one kind, one above the other in one layer, share a message.
    fn doubt_states(&self, band: Band, states: &[State], shown: usize) {
        /// Level shifts by the walls below this do not change a printed digit.
        const WALL_SHIFT_EV: f64 = 1e-5;
        let shown = shown.min(states.len());
        // All unbound states share one message: there is no limit to them.
        let alike = |a: &State, b: &State| {
            a.hold == b.hold && (a.hold == Hold::Walls || a.layer == b.layer)
        };
        // Holes are the other way up.
        let (outside, raise) = if band.sign() > 0.0 {
            ("above the lower", "raise")
        } else {
            ("below the higher", "lower")
        };
        let band = band.name().word();
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
                    "{which} ({place}) can tunnel out at an end that the field has lowered; no lifetime is part of this result, {} gives it",
                    match self.structure.ends {
                        Ends::Open => "`levels`",
                        Ends::Walls | Ends::Periodic => "`ends: open`",
                    }
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
    }

    fn audited(&self, audit: &Audit) {
        for fault in audit.faults() {
            show(
                &Diagnostic::warning(format!("audit: {fault}")),
                &self.name,
                &self.text,
            );
        }
    }
}
