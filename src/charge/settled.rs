//! Solutions for those who go on to compute with them.

use super::{ChargeError, Solution, solve};
use crate::models::Band;
use crate::structure::{Charge, Stack};
use crate::subbands::Accuracy;

/// As [`solve`], with as many levels of each band as asked for and no more.
///
/// # Errors
/// Those of [`solve`], and when charge and potential did not settle.
pub fn settled(
    stack: &Stack,
    charge: &Charge,
    asked: &[(Band, usize)],
    accuracy: Accuracy,
) -> Result<Solution, ChargeError> {
    let solution = solve(stack, charge, asked, accuracy)?;
    if let Some(found) = &solution.equilibrium
        && !found.is_settled()
    {
        let residual_ev = found.residual_ev;
        return Err(ChargeError::Unsettled { residual_ev });
    }
    // More may have been solved because they are filled.
    let counts: Vec<usize> = asked.iter().map(|(_, count)| *count).collect();
    Ok(Solution {
        bands: solution.bands.truncated(&counts),
        ..solution
    })
}
