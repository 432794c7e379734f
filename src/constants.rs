//! Physical constants in the program's inner units (nm, eV, K, free-electron mass, elementary charge).
//!
//! Source: CODATA recommended values 2022 (Mohr, Newell, Taylor and Tiesinga, 2024).

/// ħ²/2m₀ in eV nm².
pub const HBAR2_OVER_2M0: f64 = 0.038_099_821_109_685_84;

/// h c in eV µm: the wavelength in µm of a photon of energy E eV is `HC_EV_UM / E`.
pub const HC_EV_UM: f64 = 1.239_841_984_332_002_5;

/// h in eV per THz (h = 4.135 667 696…e-15 eV s): the frequency of a photon of energy E eV is `E / H_EV_PER_THZ` THz.
pub const H_EV_PER_THZ: f64 = 4.135_667_696_923_859e-3;

/// e²/4πε₀ in eV nm: α ħc with α = 7.297 352 564 3e-3 and ħc = 197.326 980 459 3 eV nm.
pub const COULOMB_EV_NM: f64 = 1.439_964_546_9;
