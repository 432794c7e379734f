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

/// e²/ε₀ in eV nm.
pub const E2_OVER_EPSILON_0: f64 = 4.0 * std::f64::consts::PI * COULOMB_EV_NM;

/// k_B in eV/K (exact).
pub const BOLTZMANN_EV_PER_K: f64 = 8.617_333_262e-5;

/// Densities per area are stated per cm² and used per nm².
pub const NM2_PER_CM2: f64 = 1e14;

/// Densities per volume are stated per cm³ and used per nm³.
pub const NM3_PER_CM3: f64 = 1e21;
