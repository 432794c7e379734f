//! What a design is tuned for, as residuals of a least-squares problem.

use crate::structure::Level;

/// The goal of one aim.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Goal {
    /// E(to) − E(from) in eV; a wavelength is kept as its energy.
    Energy { target_ev: f64, within_ev: f64 },
    /// |⟨from|z|to⟩| in nm, of two levels of one band.
    Dipole { target_nm: f64, within_nm: f64 },
    /// As large a dipole as the other aims allow.
    LargestDipole,
}

/// One aim on a pair of levels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Aim {
    pub from: Level,
    pub to: Level,
    pub goal: Goal,
    pub weight: f64,
    /// The states are those that have the character of the file's states, whatever their order becomes.
    pub by_character: bool,
}

/// A target missed by this part of itself counts as a residual of 1.
const UNIT_MISS: f64 = 0.01;
/// A dipole of this size has a residual of 1 when it is to be largest: small against a missed target, so that targets
/// come first.
const UNIT_DIPOLE_NM: f64 = 1.0;
/// Keeps the residual of a forbidden transition finite.
const LEAST_DIPOLE_NM: f64 = 0.01;

impl Goal {
    /// The residual at an energy (eV, signed) or a dipole (nm, not negative), and its slope.
    pub fn residual(&self, value: f64) -> (f64, f64) {
        match *self {
            Goal::Energy {
                target_ev: target, ..
            }
            | Goal::Dipole {
                target_nm: target, ..
            } => {
                let unit = UNIT_MISS * target.abs();
                ((value - target) / unit, 1.0 / unit)
            }
            Goal::LargestDipole => {
                let dipole = value + LEAST_DIPOLE_NM;
                (UNIT_DIPOLE_NM / dipole, -UNIT_DIPOLE_NM / (dipole * dipole))
            }
        }
    }

    /// Whether a value meets the goal; a largest dipole is never missed.
    pub fn is_met(&self, value: f64) -> bool {
        self.miss(value)
            .is_none_or(|(miss, within)| miss.abs() <= within)
    }

    /// Value minus target, and the tolerance on it.
    pub fn miss(&self, value: f64) -> Option<(f64, f64)> {
        match *self {
            Goal::Energy {
                target_ev,
                within_ev,
            } => Some((value - target_ev, within_ev)),
            Goal::Dipole {
                target_nm,
                within_nm,
            } => Some((value - target_nm, within_nm)),
            Goal::LargestDipole => None,
        }
    }

    pub fn is_energy(&self) -> bool {
        matches!(self, Goal::Energy { .. })
    }
}
