//! The parameters of one material, resolved at a temperature.

use super::dual::Number;
use super::keys::Parameter;
use super::values::Values;

/// One material at one temperature, without strain unless [`strained`](super::strained) has moved its edges.
///
/// `None` means that no table and no definition gives the parameter. Energies are absolute on the scale whose zero is
/// the unstrained valence edge of InSb.
#[derive(Clone, Debug, PartialEq)]
pub struct Material<T = f64> {
    /// At the temperature of the material.
    pub lattice_constant_nm: Option<T>,
    /// Γ gap at the temperature, without strain.
    pub gap_ev: Option<T>,
    /// Gap to the X minima, from the valence edge.
    pub gap_x_ev: Option<T>,
    /// Gap to the L minima, from the valence edge.
    pub gap_l_ev: Option<T>,
    pub spin_orbit_ev: Option<T>,
    /// The tabulated mass at the Γ edge; it does not depend on temperature.
    pub electron_mass_m0: Option<T>,
    /// Longitudinal and transverse mass of an X minimum.
    pub electron_mass_x_m0: Option<[T; 2]>,
    /// Longitudinal and transverse mass of an L minimum.
    pub electron_mass_l_m0: Option<[T; 2]>,
    /// Density-of-states mass of all X minima together.
    pub density_of_states_mass_x_m0: Option<T>,
    /// Density-of-states mass of all L minima together.
    pub density_of_states_mass_l_m0: Option<T>,
    /// γ₁, γ₂, γ₃ of the six-band model.
    pub luttinger: Option<[T; 3]>,
    /// Along \[001].
    pub heavy_hole_mass_m0: Option<T>,
    /// Along \[001].
    pub light_hole_mass_m0: Option<T>,
    pub split_off_mass_m0: Option<T>,
    /// E_P = 2 m₀ P²/ħ².
    pub kane_energy_ev: Option<T>,
    /// F, the part of remote bands in the mass: m₀/m = 1 + 2F + E_P (E_g + 2Δ/3)/(E_g (E_g + Δ)).
    pub remote_band_f: Option<T>,
    pub valence_edge_ev: Option<T>,
    pub conduction_edge_ev: Option<T>,
    /// a_c: the conduction edge moves by a_c Tr ε.
    pub hydrostatic_conduction_ev: Option<T>,
    /// a_v in the tabulated sign: the valence edge moves by −a_v Tr ε.
    pub hydrostatic_valence_ev: Option<T>,
    pub shear_b_ev: Option<T>,
    pub shear_d_ev: Option<T>,
    pub c11_gpa: Option<T>,
    pub c12_gpa: Option<T>,
    pub c44_gpa: Option<T>,
    pub permittivity_static: Option<T>,
    pub permittivity_optical: Option<T>,
    pub lo_phonon_ev: Option<T>,
    /// E' of the two-band law m(E) = m (1 + (E − E_c)/E'); only definitions give it.
    pub nonparabolicity_energy_ev: Option<T>,
    pub density_g_per_cm3: Option<T>,
}

/// A minimum of the conduction band.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Valley {
    Gamma,
    X,
    L,
}

impl Valley {
    /// The usual name.
    pub fn symbol(self) -> &'static str {
        match self {
            Valley::Gamma => "Γ",
            Valley::X => "X",
            Valley::L => "L",
        }
    }
}

impl<T: Number> Material<T> {
    pub(super) fn from_values(values: &Values<T>) -> Self {
        let one = |parameter| values.one(parameter);
        let pair = |parameter| values.all(parameter).map(|[a, b, _]| [a, b]);
        let elastic = values.all(Parameter::Elastic);
        Self {
            lattice_constant_nm: one(Parameter::LatticeConstant),
            gap_ev: one(Parameter::Gap),
            gap_x_ev: one(Parameter::GapX),
            gap_l_ev: one(Parameter::GapL),
            spin_orbit_ev: one(Parameter::SpinOrbit),
            electron_mass_m0: one(Parameter::ElectronMass),
            electron_mass_x_m0: pair(Parameter::ElectronMassX),
            electron_mass_l_m0: pair(Parameter::ElectronMassL),
            density_of_states_mass_x_m0: one(Parameter::DensityOfStatesMassX),
            density_of_states_mass_l_m0: one(Parameter::DensityOfStatesMassL),
            luttinger: values.all(Parameter::Luttinger),
            heavy_hole_mass_m0: one(Parameter::HeavyHoleMass),
            light_hole_mass_m0: one(Parameter::LightHoleMass),
            split_off_mass_m0: one(Parameter::SplitOffMass),
            kane_energy_ev: one(Parameter::KaneEnergy),
            remote_band_f: one(Parameter::RemoteBandF),
            valence_edge_ev: one(Parameter::ValenceEdge),
            conduction_edge_ev: one(Parameter::ConductionEdge),
            hydrostatic_conduction_ev: one(Parameter::HydrostaticConduction),
            hydrostatic_valence_ev: one(Parameter::HydrostaticValence),
            shear_b_ev: one(Parameter::ShearB),
            shear_d_ev: one(Parameter::ShearD),
            c11_gpa: elastic.map(|c| c[0]),
            c12_gpa: elastic.map(|c| c[1]),
            c44_gpa: elastic.map(|c| c[2]),
            permittivity_static: one(Parameter::PermittivityStatic),
            permittivity_optical: one(Parameter::PermittivityOptical),
            lo_phonon_ev: one(Parameter::LoPhonon),
            nonparabolicity_energy_ev: one(Parameter::NonparabolicityEnergy),
            density_g_per_cm3: one(Parameter::Density),
        }
    }

    /// The lowest minimum of the conduction band without strain and its gap in eV; `None` when the Γ gap is unknown.
    ///
    /// Anything but Γ means that the material is indirect, and that states computed at Γ lie above other ones.
    pub fn lowest_valley(&self) -> Option<(Valley, f64)> {
        let gamma = (Valley::Gamma, self.gap_ev?.value());
        let sides = [(Valley::X, self.gap_x_ev), (Valley::L, self.gap_l_ev)];
        let known = sides
            .into_iter()
            .filter_map(|(valley, gap)| Some((valley, gap?.value())));
        Some(known.fold(gamma, |low, next| if next.1 < low.1 { next } else { low }))
    }
}
