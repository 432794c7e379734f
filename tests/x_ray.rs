//! Expected x-ray peaks against Bragg's law with tabulated constants.
//!
//! Elastic constants c₁₁/c₁₂ in GPa and lattice constants: Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815 (2001),
//! from memory: GaAs 122.1/56.6, AlAs 125.0/53.4, InAs 83.29/45.26, GaSb 88.42/40.26, AlSb 87.69/43.41, mixed linearly.

use approx::assert_abs_diff_eq;
use wellwright::epitaxy::{XRay, bragg_004_rad, expected_x_ray, satellite_spacing_rad};
use wellwright::structure;

#[track_caller]
fn expected(text: &str) -> Option<XRay> {
    let (structure, problems) = structure::read(text);
    let structure = structure.unwrap_or_else(|| panic!("{problems:#?}"));
    expected_x_ray(&structure, &structure.stack().unwrap())
}

fn arcsec(rad: f64) -> f64 {
    rad.to_degrees() * 3600.0
}

/// θ of (004) for Cu Kα₁ at 1.540593 Å: sin θ = 2λ/a. GaAs 33.02666° and InP 31.66960° (5.8687 Å) or 31.66358° (5.8697 Å),
/// GaSb 30.36137°, by hand from the lattice constants 5.65325, 5.8687, 5.8697 and 6.0959 Å.
#[test]
fn substrates() {
    for (lattice_nm, degrees) in [
        (0.565325, 33.02666),
        (0.58687, 31.66960),
        (0.58697, 31.66358),
        (0.60959, 30.36137),
    ] {
        let found = bragg_004_rad(lattice_nm, 0.1540593).unwrap().to_degrees();
        assert_abs_diff_eq!(found, degrees, epsilon = 1e-5);
    }
    assert_eq!(bragg_004_rad(0.3, 0.1540593), None);
}

/// Layer less substrate in θ, computed apart from this program with the constants above (tolerance 0.5″). A published
/// value for AlAs on GaAs lies between −340 and −375″, depending on the elastic constants (from memory).
#[test]
fn layers() {
    let old = "materials: {InP: {choose: {lattice_constant: Vurgaftman2001}}}\n";
    for (substrate, formula, materials, wanted) in [
        ("GaAs", "AlAs", "", -344.2),
        ("GaAs", "Al0.3Ga0.7As", "", -106.3),
        ("GaAs", "In0.1Ga0.9As", "", -1831.0),
        ("GaAs", "In0.2Ga0.8As", "", -3625.0),
        ("InP", "In0.53Ga0.47As", old, 76.8),
        ("InP", "In0.67Ga0.33As", old, -2352.0),
        ("GaSb", "AlSb", "", -1539.0),
    ] {
        // At 77 K too: wafers are measured at room temperature.
        for kelvin in [77, 300] {
            let x_ray = expected(&format!(
                "substrate: {substrate}\ntemperature: {kelvin} K\n{materials}layers: [{{material: {formula}, width: 5 nm}}]\n"
            ))
            .unwrap();
            let found = arcsec(x_ray.layers[0].bragg_rad - x_ray.substrate_bragg_rad);
            assert_abs_diff_eq!(found, wanted, epsilon = 0.5);
        }
    }
}

/// Λ = 20 nm at the angle of GaAs. By hand: λ/(2Λ) = 0.1540593/40 = 0.00385148, cos 33.02666° = 0.838428, so
/// Δθ = 0.00459370 rad = 947.5″; by Bragg's law the satellites −1 and +1 lie at asin(sin θ ∓ 0.00385148), 1895.1″ apart.
#[test]
fn satellites() {
    let bragg = 33.02666_f64.to_radians();
    let spacing = satellite_spacing_rad(20.0, bragg, 0.1540593);
    assert_abs_diff_eq!(arcsec(spacing), 947.5, epsilon = 0.1);
    let at = |order: f64| (bragg.sin() + order * 0.1540593 / 40.0).asin();
    assert_abs_diff_eq!(
        arcsec(at(1.0) - at(-1.0)),
        2.0 * arcsec(spacing),
        epsilon = 0.2
    );
}

/// 10 nm AlAs and 10 nm GaAs on GaAs: the zeroth order lies at the mean lattice constant, with the numbers of monolayers as
/// weights: AlAs a⊥ = 5.6611 (1 + 2·0.4272·0.0013866) = 5.66781 Å, so the mean is 2/(1/5.66781 + 1/5.65325) = 5.66052 Å,
/// and Δθ = −tan θ Δa/a = −0.6501·0.0012863 rad = −172.5″ (to first order).
#[test]
fn a_superlattice() {
    let x_ray = expected(
        "\
substrate: GaAs
layers:
  - {material: GaAs, width: 50 nm}
  - repeat: 30
    layers: [{material: AlAs, width: 10 nm}, {material: GaAs, width: 10 nm}]
  - {material: AlAs, to: GaAs, width: 20 nm}
",
    )
    .unwrap();
    let [period] = &x_ray.periods[..] else {
        panic!("{:?}", x_ray.periods)
    };
    assert_eq!((period.count, period.entries), (30, (1, 2)));
    assert_abs_diff_eq!(period.period_nm, 20.0, epsilon = 1e-9);
    let from_substrate = arcsec(period.bragg_rad - x_ray.substrate_bragg_rad);
    assert_abs_diff_eq!(from_substrate, -172.5, epsilon = 0.5);
    assert_abs_diff_eq!(arcsec(period.satellite_spacing_rad), 947.0, epsilon = 1.0);
    // Both faces of the graded layer.
    let last: Vec<f64> = x_ray.layers[3..]
        .iter()
        .map(|peak| peak.bragg_rad)
        .collect();
    assert_abs_diff_eq!(
        arcsec(last[0] - x_ray.substrate_bragg_rad),
        -344.2,
        epsilon = 0.5
    );
    assert_abs_diff_eq!(last[1], x_ray.substrate_bragg_rad, epsilon = 1e-12);
}

#[test]
fn nothing_is_expected_without_a_substrate() {
    assert_eq!(expected("layers: [{material: GaAs, width: 5 nm}]\n"), None);
}
