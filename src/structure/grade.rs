//! Graded layers: the way from the lower to the upper material.

use super::file::Profile;
use crate::materials::{Composition, Dual, Element, Library, Material, MaterialError, Number};

/// How far along the way a graded layer is, as a function of the height in it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Law {
    Linear,
    /// A parabola whose vertex lies at the lower face.
    VertexBelow,
    /// A parabola whose vertex lies at the upper face.
    VertexAbove,
}

impl Law {
    /// A parabola has its vertex where the conduction edge is lower.
    pub fn of(profile: Profile, lower: &Material, upper: &Material) -> Self {
        match profile {
            Profile::Linear => Law::Linear,
            Profile::Parabolic => match (lower.conduction_edge_ev, upper.conduction_edge_ev) {
                (Some(below), Some(above)) if above < below => Law::VertexAbove,
                _ => Law::VertexBelow,
            },
        }
    }

    /// The share of the upper material at the height `t` (0 at the lower face, 1 at the upper).
    pub fn share(self, t: f64) -> f64 {
        match self {
            Law::Linear => t,
            Law::VertexBelow => t * t,
            Law::VertexAbove => t * (2.0 - t),
        }
    }

    /// The mean of [`share`](Self::share) over the layer.
    pub fn mean_share(self) -> f64 {
        match self {
            Law::Linear => 1.0 / 2.0,
            Law::VertexBelow => 1.0 / 3.0,
            Law::VertexAbove => 2.0 / 3.0,
        }
    }
}

/// Every parameter that share of the way from one material to another.
pub(super) fn blend<T: Number>(
    lower: &Material<T>,
    upper: &Material<T>,
    share: f64,
) -> Material<T> {
    let (below, above) = (T::constant(1.0 - share), T::constant(share));
    combine(lower, upper, |a, b| below * a + above * b)
}

/// The material with every parameter independent of the variable.
pub(super) fn constant(material: &Material) -> Material<Dual> {
    combine(material, material, |a, _| Dual::constant(a))
}

/// The material of a composition with the derivative with respect to the fraction of `element`, at the cost of `host`.
///
/// The library's own derivative lets the most abundant partner give way, which along a grade may be another one than at
/// the face whose fraction is varied. The directions are linear, so that the wanted one is a difference of two.
pub(super) fn along(
    library: &Library,
    composition: &Composition,
    temperature_k: f64,
    element: Element,
    host: Element,
) -> Result<Material<Dual>, MaterialError> {
    let direction = |element| library.resolve(&composition.along(element)?, temperature_k);
    let for_element = direction(element)?;
    let partner = composition.host(element)?;
    if partner == host {
        return Ok(for_element);
    }
    let for_host = direction(host)?;
    let partner_of_host = composition.host(host)?;
    let slope = |element: Dual, of_host: Dual| {
        if partner_of_host == partner {
            element.slope - of_host.slope
        } else {
            -of_host.slope
        }
    };
    Ok(combine(&for_element, &for_host, |a, b| Dual {
        value: a.value,
        slope: slope(a, b),
    }))
}

/// Combines two materials parameter by parameter; what is unknown in one is unknown in the result.
pub(super) fn combine<T: Copy, U>(
    a: &Material<T>,
    b: &Material<T>,
    combine: impl Fn(T, T) -> U,
) -> Material<U> {
    let one = |a: Option<T>, b: Option<T>| a.zip(b).map(|(a, b)| combine(a, b));
    Material {
        lattice_constant_nm: one(a.lattice_constant_nm, b.lattice_constant_nm),
        gap_ev: one(a.gap_ev, b.gap_ev),
        gap_x_ev: one(a.gap_x_ev, b.gap_x_ev),
        gap_l_ev: one(a.gap_l_ev, b.gap_l_ev),
        spin_orbit_ev: one(a.spin_orbit_ev, b.spin_orbit_ev),
        electron_mass_m0: one(a.electron_mass_m0, b.electron_mass_m0),
        density_of_states_mass_x_m0: one(
            a.density_of_states_mass_x_m0,
            b.density_of_states_mass_x_m0,
        ),
        density_of_states_mass_l_m0: one(
            a.density_of_states_mass_l_m0,
            b.density_of_states_mass_l_m0,
        ),
        heavy_hole_mass_m0: one(a.heavy_hole_mass_m0, b.heavy_hole_mass_m0),
        light_hole_mass_m0: one(a.light_hole_mass_m0, b.light_hole_mass_m0),
        split_off_mass_m0: one(a.split_off_mass_m0, b.split_off_mass_m0),
        kane_energy_ev: one(a.kane_energy_ev, b.kane_energy_ev),
        remote_band_f: one(a.remote_band_f, b.remote_band_f),
        valence_edge_ev: one(a.valence_edge_ev, b.valence_edge_ev),
        conduction_edge_ev: one(a.conduction_edge_ev, b.conduction_edge_ev),
        hydrostatic_conduction_ev: one(a.hydrostatic_conduction_ev, b.hydrostatic_conduction_ev),
        hydrostatic_valence_ev: one(a.hydrostatic_valence_ev, b.hydrostatic_valence_ev),
        shear_b_ev: one(a.shear_b_ev, b.shear_b_ev),
        shear_d_ev: one(a.shear_d_ev, b.shear_d_ev),
        c11_gpa: one(a.c11_gpa, b.c11_gpa),
        c12_gpa: one(a.c12_gpa, b.c12_gpa),
        c44_gpa: one(a.c44_gpa, b.c44_gpa),
        permittivity_static: one(a.permittivity_static, b.permittivity_static),
        permittivity_optical: one(a.permittivity_optical, b.permittivity_optical),
        lo_phonon_ev: one(a.lo_phonon_ev, b.lo_phonon_ev),
        nonparabolicity_energy_ev: one(a.nonparabolicity_energy_ev, b.nonparabolicity_energy_ev),
        density_g_per_cm3: one(a.density_g_per_cm3, b.density_g_per_cm3),
        electron_mass_x_m0: a
            .electron_mass_x_m0
            .zip(b.electron_mass_x_m0)
            .map(|(a, b)| std::array::from_fn(|i| combine(a[i], b[i]))),
        electron_mass_l_m0: a
            .electron_mass_l_m0
            .zip(b.electron_mass_l_m0)
            .map(|(a, b)| std::array::from_fn(|i| combine(a[i], b[i]))),
        luttinger: a
            .luttinger
            .zip(b.luttinger)
            .map(|(a, b)| std::array::from_fn(|i| combine(a[i], b[i]))),
    }
}
