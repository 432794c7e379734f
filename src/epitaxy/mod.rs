//! What coherent growth on the substrate means for a stack: strain and edges of its layers, critical thickness, strain
//! balance of what is repeated, and where x-ray diffraction will show it. Nothing here solves anything.

mod critical_thickness;
mod doubts;
mod layers;
mod mean;
mod periods;
mod sensitivity;
mod strain_balance;
mod strain_budget;
mod x_ray;

pub use critical_thickness::{Glide, matthews_blakeslee_nm, people_bean_nm};
pub use doubts::doubts;
pub use layers::{LayerStrain, Part, layer_strains};
pub use mean::{LayerMean, layer_mean};
pub use periods::{Period, periods};
pub use sensitivity::{net_strain_slope, thickness_ratio, whole_thickness_ratio};
pub use strain_balance::{Balance, balance};
pub use strain_budget::{LayerThickness, StrainBudget, WholeThickness, glides, strain_budget};
pub use x_ray::{
    CU_K_ALPHA_1_NM, LayerPeak, PeriodPeaks, XRay, bragg_004_rad, expected_x_ray,
    satellite_spacing_rad,
};
