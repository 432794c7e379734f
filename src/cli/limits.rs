//! What a command does not take of a file: it is told where the rest is solved, and refused where nothing is left.

use super::deliver::{Exit, show};
use super::input::Input;
use crate::diagnostics::Diagnostic;
use crate::models::Band;
use crate::structure::{Charge, ConductionModel, Ends};

impl Input {
    /// For a command that knows bound levels only.
    ///
    /// # Errors
    /// When the stack repeats itself for ever.
    pub fn without_minibands(&self, command: &str) -> Result<(), Exit> {
        if self.structure.ends != Ends::Periodic {
            return Ok(());
        }
        let problem = Diagnostic::error(format!("{command} does not know minibands"))
            .expected("`ends: walls`")
            .hint("`levels` and `dispersion` solve a stack with `ends: periodic`");
        show(&problem, &self.name, &self.text);
        Err(Exit::WrongInput)
    }

    /// Tells a file with holes from what a command takes, the conduction band.
    ///
    /// # Errors
    /// When electrons and holes are one problem, of which the command takes no part.
    pub fn conduction_only(&self, what: &str) -> Result<(), Exit> {
        if self.structure.valence.is_some() && !self.structure.couples_bands() {
            let words = format!("{what} the conduction band only");
            show(&Diagnostic::warning(words), &self.name, &self.text);
        }
        self.without_coupled(what)
    }

    /// Tells a file whose bands are coupled from what a command takes, bands that are solved on their own.
    ///
    /// # Errors
    /// When electrons and holes are one problem, of which the command takes no part.
    pub fn without_coupled(&self, what: &str) -> Result<(), Exit> {
        if self.structure.conduction.model == ConductionModel::EightBand {
            let problem = Diagnostic::error(format!(
                "{what} bands that are solved on their own, and this file's are `eight-band`"
            ))
            .expected("`parabolic` or `energy-dependent` for `conduction`")
            .hint("`levels`, `tune`, `sweep`, `dispersion`, `plot --what bands` and `sheet` take eight bands");
            show(&problem, &self.name, &self.text);
            return Err(Exit::WrongInput);
        }
        if Band::alone(&self.structure).len() < Band::of(&self.structure).len() {
            let words = format!(
                "{what} the conduction band only, since the holes are coupled; `levels`, `tune`, `sweep` and `plot --what bands` solve them too"
            );
            show(&Diagnostic::warning(words), &self.name, &self.text);
        }
        Ok(())
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

    /// Says that a command takes flat bands where charge bends those of the file.
    pub fn with_flat_bands(&self, what: &str) {
        if self.structure.charge != Charge::Flat {
            let words = format!("charge bends the bands of this file, but {what} flat ones");
            show(&Diagnostic::warning(words), &self.name, &self.text);
        }
    }
}
