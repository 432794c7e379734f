//! Fermi statistics in two and three dimensions.

use crate::constants::{BOLTZMANN_EV_PER_K, HBAR2_OVER_2M0};

/// kT ln(1 + exp(x/kT)) and its slope 1/(1 + exp(−x/kT)): by how much a subband is filled whose bottom lies x below the
/// Fermi level. At kT = 0 the limits, max(0, x) and the step.
#[inline]
pub fn filling(x: f64, kt: f64) -> (f64, f64) {
    if kt <= 0.0 || x.abs() > 40.0 * kt && x > 0.0 {
        return (x.max(0.0), f64::from(u8::from(x > 0.0)));
    }
    let boltzmann = (-x.abs() / kt).exp();
    let slope = if x > 0.0 {
        1.0 / (1.0 + boltzmann)
    } else {
        boltzmann / (1.0 + boltzmann)
    };
    (x.max(0.0) + kt * boltzmann.ln_1p(), slope)
}

/// States per area and energy of a subband, spin included: m/πħ², in 1/(eV nm²).
pub fn density_of_states(mass_m0: f64) -> f64 {
    mass_m0 / (2.0 * std::f64::consts::PI * HBAR2_OVER_2M0)
}

/// F₁/₂(η) = 2/√π ∫ √x/(1 + exp(x − η)) dx, normalised so that it tends to exp(η) (Blakemore 1962, eq. B1).
fn fermi_integral_half(eta: f64) -> f64 {
    /// Beyond, Sommerfeld's series of three terms is exact to 1e-9.
    const DEGENERATE: f64 = 60.0;
    let half = 2.0 / std::f64::consts::PI.sqrt();
    if eta > DEGENERATE {
        let squared = (std::f64::consts::PI / eta).powi(2);
        return half * 2.0 / 3.0
            * eta.powf(1.5)
            * (1.0 + squared / 8.0 + 7.0 * squared * squared / 640.0);
    }
    // With x = t² the integrand is even and analytic near the real line: the trapezoidal rule converges exponentially.
    let (step, end) = (0.05, (eta.max(0.0) + 45.0).sqrt());
    let points = (end / step) as usize;
    let sum: f64 = (1..=points)
        .map(|k| {
            let x = (k as f64 * step).powi(2);
            x / (1.0 + (x - eta).exp())
        })
        .sum();
    half * 2.0 * step * sum
}

/// Carriers per volume, in 1/nm³, of a parabolic band whose edge lies `x_ev` below the Fermi level: 2 (2πm kT/h²)^(3/2)
/// F₁/₂(x/kT); without temperature (2m x/ħ²)^(3/2)/3π².
fn bulk_density(x_ev: f64, mass_m0: f64, kt_ev: f64) -> f64 {
    let per_energy = mass_m0 / HBAR2_OVER_2M0;
    if kt_ev <= 0.0 {
        return (per_energy * x_ev.max(0.0)).powf(1.5) / (3.0 * std::f64::consts::PI.powi(2));
    }
    let effective = 2.0 * (per_energy * kt_ev / (4.0 * std::f64::consts::PI)).powf(1.5);
    effective * fermi_integral_half(x_ev / kt_ev)
}

/// A parabolic band of a bulk: its edge in eV and its density-of-states mass.
#[derive(Clone, Copy, Debug)]
pub struct BulkBand {
    pub edge_ev: f64,
    pub mass_m0: f64,
}

/// The Fermi level at which a bulk is neutral, in eV. `excess(E)` gives the density of ionised donors less that of ionised
/// acceptors, in 1/nm³, at a Fermi level. `None` when nothing makes up for it.
pub fn bulk_fermi_ev(
    conduction: BulkBand,
    valence: Option<BulkBand>,
    excess: impl Fn(f64) -> f64,
    temperature_k: f64,
) -> Option<f64> {
    let kt_ev = BOLTZMANN_EV_PER_K * temperature_k;
    // Falls as the Fermi level rises.
    let charge = |fermi_ev: f64| {
        let electrons = bulk_density(fermi_ev - conduction.edge_ev, conduction.mass_m0, kt_ev);
        let holes = valence.map_or(0.0, |band| {
            bulk_density(band.edge_ev - fermi_ev, band.mass_m0, kt_ev)
        });
        excess(fermi_ev) + holes - electrons
    };
    let low_ev = valence.map_or(conduction.edge_ev - 3.0, |band| band.edge_ev - 3.0);
    root_of_falling(charge, low_ev, conduction.edge_ev + 3.0)
}

/// The zero of a function that falls, by bisection; `None` when the ends do not enclose one.
pub fn root_of_falling(f: impl Fn(f64) -> f64, low: f64, high: f64) -> Option<f64> {
    let (mut low, mut high) = (low, high);
    if !(f(low) > 0.0 && f(high) < 0.0) {
        return None;
    }
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high {
            break;
        }
        if f(middle) > 0.0 {
            low = middle;
        } else {
            high = middle;
        }
    }
    Some(0.5 * (low + high))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// F₁/₂(0) = (1 − 2^(−1/2)) ζ(3/2) = 0.765147…; the series Σ (−1)^(k+1) e^(kη)/k^(3/2) at η = −3; and Sommerfeld's
    /// limit, which must join the trapezoidal rule. Closed forms.
    #[test]
    fn the_fermi_integral_has_its_known_values() {
        let at_zero = (1.0 - 0.5_f64.sqrt()) * 2.612_375_348_685_488;
        assert!((fermi_integral_half(0.0) - at_zero).abs() < 1e-10);
        let series: f64 = (1..60)
            .map(|k| {
                let k = f64::from(k);
                -(-1.0_f64).powf(k) * (-3.0 * k).exp() / k.powf(1.5)
            })
            .sum();
        assert!((fermi_integral_half(-3.0) - series).abs() < 1e-11);
        let ratio = fermi_integral_half(59.999_999) / fermi_integral_half(60.000_001);
        assert!((ratio - 1.0).abs() < 1e-7, "{ratio}");
    }

    #[test]
    fn the_filling_of_a_subband_has_its_limits() {
        assert_eq!(filling(0.01, 0.0), (0.01, 1.0));
        assert_eq!(filling(-0.01, 0.0), (0.0, 0.0));
        let (deep, slope) = filling(0.01, 1e-5);
        assert!((deep - 0.01).abs() < 1e-15 && slope == 1.0);
        let kt = 0.025;
        let (at_edge, half) = filling(0.0, kt);
        assert!((at_edge - kt * 2.0_f64.ln()).abs() < 1e-15 && half == 0.5);
        let (tail, _) = filling(-1.0, kt);
        assert!((tail / (kt * (-40.0_f64).exp()) - 1.0).abs() < 1e-12);
    }

    /// m/πħ² = 2.7988008505e13 cm⁻² eV⁻¹ for m = 0.067 (30-digit arithmetic with CODATA 2018).
    #[test]
    fn the_density_of_states_is_that_of_the_constants() {
        assert!((1e14 * density_of_states(0.067) / 2.798_800_850_5e13 - 1.0).abs() < 1e-8);
    }
}
