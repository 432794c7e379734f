//! Escape widths and lifetimes in words.

use super::table::significant;

/// Longer than this something else has ended the state: scattering, recombination.
const LONGEST_PS: f64 = 1e12;
const UNITS: [(&str, f64); 6] = [
    ("s", 1e12),
    ("ms", 1e9),
    ("µs", 1e6),
    ("ns", 1e3),
    ("ps", 1.0),
    ("fs", 1e-3),
];

/// A lifetime with the unit that suits it; `None` is longer than can be told.
pub fn lifetime(ps: Option<f64>) -> String {
    let Some(ps) = ps.filter(|ps| *ps < LONGEST_PS) else {
        return "longer than 1 s".to_owned();
    };
    let (unit, size) = UNITS
        .into_iter()
        .find(|(_, size)| ps >= 0.9995 * size)
        .unwrap_or(UNITS[UNITS.len() - 1]);
    format!("{} {unit}", significant(ps / size, 3))
}

/// A width in meV with the digits that its relative error leaves, four at most.
pub fn width_mev(width_ev: f64, relative_error: f64) -> String {
    // h/2π over a second is 6.6e-16 eV.
    if width_ev < 6.6e-16 {
        return "<1e-12".to_owned();
    }
    let digits = (-relative_error.max(1e-9).log10()).floor().clamp(1.0, 4.0) as usize;
    significant(1e3 * width_ev, digits)
}

/// The ends that a state leaves through, each with its part of the width.
pub fn leaves_through([bottom, top]: [f64; 2], bound: bool) -> String {
    let share = bottom / (bottom + top);
    if bound || !share.is_finite() {
        "neither end".to_owned()
    } else if share > 0.995 {
        "bottom".to_owned()
    } else if share < 0.005 {
        "top".to_owned()
    } else {
        format!(
            "bottom {:.0} %, top {:.0} %",
            100.0 * share,
            100.0 * (1.0 - share)
        )
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lifetimes_have_the_unit_that_suits_them() {
        assert_eq!(lifetime(Some(0.012345)), "12.3 fs");
        assert_eq!(lifetime(Some(0.99999)), "1.00 ps");
        assert_eq!(lifetime(Some(12345.0)), "12.3 ns");
        assert_eq!(lifetime(Some(2e13)), "longer than 1 s");
        assert_eq!(lifetime(None), "longer than 1 s");
    }
}
