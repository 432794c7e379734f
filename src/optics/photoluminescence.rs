//! The photoluminescence that a wafer should show on the bench: at other temperatures than that of use, and with no
//! field.
//!
//! Peak = transition of the lowest pair less the binding of its exciton, at low temperature and at room temperature alike:
//! free excitons carry the emission of wells up to 300 K (Dawson, Duggan, Ralph and Woodbridge, Phys. Rev. B 28, 7381
//! (1983), from memory). Where carriers are free the peak is the transition itself: in two dimensions the density of pairs
//! is a step, and a step times exp(−E/kT) is highest at its edge, without the kT/2 of the bulk. The light then lies between
//! the two. Filled bands, alloy disorder and wells that differ (all of which pull the peak down) are left out.

use super::{NoExciton, lowest_exciton};
use crate::charge::{self, ChargeError};
use crate::models::Band;
use crate::structure::{Charge, Level, Stack};
use crate::subbands::{Accuracy, Place};

/// The expected peak of the lowest pair at one temperature.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Photoluminescence {
    pub temperature_k: f64,
    pub from: Level,
    pub to: Level,
    pub transition_ev: f64,
    /// 0 where no exciton is bound; `None` where there is none to tell: a permittivity is missing, or a mass in the plane is not
    /// positive.
    pub binding_ev: Option<f64>,
}

impl Photoluminescence {
    /// The excitonic peak in eV.
    pub fn peak_ev(&self) -> f64 {
        self.transition_ev - self.binding_ev.unwrap_or(0.0)
    }
}

/// The peak of a stack at a temperature in K, widths and compositions as they are and the field off. `None` where the gap
/// is broken, or without holes.
///
/// # Errors
/// Why there is no equilibrium of a doped stack, or which layer's material does not suit at that temperature.
pub fn photoluminescence(
    stack: &Stack,
    charge: &Charge,
    bands: &[(Band, usize)],
    temperature_k: f64,
    accuracy: Accuracy,
) -> Result<Option<Photoluminescence>, ChargeError> {
    let Ok(mut stack) = stack.at_temperature(temperature_k) else {
        return Ok(None);
    };
    stack.field_v_per_nm = 0.0;
    let lowest: Vec<(Band, usize)> = bands.iter().map(|(band, _)| (*band, 1)).collect();
    let charge::Solution { stack, bands, .. } = charge::solve(&stack, charge, &lowest, accuracy)?;
    let Some(hole) = bands.holes().first().copied() else {
        return Ok(None);
    };
    let electron = Place { band: 0, state: 0 };
    let transition_ev = bands.energy_ev(electron) - bands.energy_ev(hole);
    Ok((transition_ev > 0.0).then(|| Photoluminescence {
        temperature_k,
        from: bands.level(hole),
        to: bands.level(electron),
        transition_ev,
        binding_ev: match lowest_exciton(&stack, &bands) {
            Ok((_, exciton)) => Some(exciton.binding_ev.max(0.0)),
            Err(NoExciton::Unbound) => Some(0.0),
            Err(_) => None,
        },
    }))
}
