//! A structure file as a command's input, and the messages about it.

use super::deliver::{Exit, complain, show};
use crate::diagnostics::Diagnostic;
use crate::models::Unsuitable;
use crate::structure::{self, Stack, Structure};
use crate::subbands::{Hold, Subbands};
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

    /// Doubts about a solution, each naming its layer.
    pub fn doubt(&self, subbands: &Subbands, shown: usize) {
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
