//! What the models of several coupled bands share: the zone-centre basis, the valence part, and the operator on a stack.
//!
//! H = kz A kz + kz B + B† kz + C acts on the functions S, X, Y, Z of the conduction and valence edges with both spins;
//! the in-plane axes are turned so that x lies along k∥. Three symmetries of a crystal grown along \[001] make the
//! matrices small and real, whatever the layers:
//! - The half turn about z together with the reversal of time leaves k∥ and z alone and squares to one. In the basis
//!   {S, iX, iY, Z} with the spins quantised along y (phases (−i, 1) and (−1, i)) all of A, C and G = iB are real.
//! - The mirror plane through k∥ and z splits H for k∥ along \[100] and \[110] into two parts of half the size:
//!   S, X, Z of one spin with Y of the other.
//! - With the signs of Y and Z of the second part turned, both parts have the same A and C and opposite G: they are
//!   mirror images along z. They share their levels at k∥ = 0 and, in a stack that is its own mirror image, everywhere.
//!   Otherwise they split (Rashba).
//!
//! The zone-centre functions of a part are the conduction one S, the heavy hole (X − Y)/√2, the light hole
//! (X + Y + 2Z)/√6 and the split-off hole (X + Y − Z)/√3, in this order. No term that stems from the missing inversion
//! centre of the crystal is kept.

use super::{eight_band, six_band};
use crate::constants::HBAR2_OVER_2M0;
use crate::materials::{Element, Material, Strain, strain};
use crate::numerics::matrix_pencil::MatrixCoefficient;
use crate::structure::Stack;
use nalgebra::{DMatrix, Matrix3};

/// Step of a fraction in the difference that gives the slopes of the matrices: its fourth power is as small as the
/// rounding over it.
const SLOPE_STEP: f64 = 1e-3;

/// The thickest stack in nm: a superlattice of this takes some ten seconds, and more holds no further design.
const MOST_NM: f64 = 2000.0;

/// Which bands are coupled.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum MultibandModel {
    /// Heavy, light and split-off holes.
    SixBand,
    /// The same with the conduction band.
    EightBand,
}

/// Why a material cannot be used with such a model.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum MultibandUnsuitable {
    #[error("has no `{key}`, which the {model} model needs")]
    Missing {
        key: &'static str,
        model: &'static str,
    },
    #[error(
        "has holes that are no holes: γ₁ − 2γ₂ = {heavy:.3} and γ₁ + 4γ₂ = {light:.3} must both be positive"
    )]
    NotHoles { heavy: f64, light: f64 },
    #[error(
        "has an electron mass of {mass_m0:.3} m0: only one below that of the free electron can come from the coupling to the valence bands"
    )]
    HeavyElectron { mass_m0: f64 },
    #[error("has a gap of {gap_ev:.3} eV: the coupling of the bands needs a positive one")]
    NoGap { gap_ev: f64 },
    #[error(
        "belongs to a stack of {total_nm:.0} nm, and coupled bands are solved in at most {MOST_NM} nm: leave out of the layers what holds no state"
    )]
    TooThick { total_nm: f64 },
}

/// A direction of k∥, or the mean over all of them.
///
/// With φ the angle to \[100] only w = sin²(2φ)/2 and sin(4φ)/4 enter.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Direction {
    anisotropy: f64,
    mixing: f64,
}

impl Direction {
    pub const ALONG_100: Direction = Direction {
        anisotropy: 0.0,
        mixing: 0.0,
    };
    pub const ALONG_110: Direction = Direction {
        anisotropy: 0.5,
        mixing: 0.0,
    };
    /// The axial approximation: the mean over the angle (Altarelli, Ekenberg and Fasolino, Phys. Rev. B 32, 5138 (1985)).
    pub const AXIAL: Direction = Direction {
        anisotropy: 0.25,
        mixing: 0.0,
    };

    /// The direction of a vector (kx, ky) along \[100] and \[010].
    pub fn of(kx: f64, ky: f64) -> Direction {
        let square = kx * kx + ky * ky;
        if square == 0.0 {
            return Direction::ALONG_100;
        }
        // sin 2φ and cos 2φ without angles, so that a vector along an axis or a diagonal is exactly so.
        let (sine, cosine) = (2.0 * kx * ky / square, (kx * kx - ky * ky) / square);
        Direction {
            anisotropy: 0.5 * sine * sine,
            mixing: 0.5 * sine * cosine,
        }
    }

    /// Whether the two parts do not mix.
    pub fn is_mirror_plane(self) -> bool {
        self.mixing == 0.0
    }
}

/// The parts of H under the mirror plane of k∥ and z.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Part {
    Plus,
    Minus,
    /// The whole H: the functions of the first part, then those of the second.
    Both,
}

/// The coefficients of one part as polynomials of k∥ in 1/nm: A in eV nm², G₀ + k G₁, and C₀ + k C₁ + k² C₂ in eV.
#[derive(Clone, Debug, PartialEq)]
pub struct BlockCoefficient {
    pub a: DMatrix<f64>,
    pub g: [DMatrix<f64>; 2],
    pub c: [DMatrix<f64>; 3],
    /// The coupling of the first part to the second, times k².
    pub cross: DMatrix<f64>,
}

impl BlockCoefficient {
    /// E_P = P²/(ħ²/2m₀) of the coupling of S and X, in eV: that in use, after any reduction.
    pub fn kane_energy_ev(&self) -> f64 {
        // The coupling to X is spread over heavy, light and split-off holes; see the module.
        let couplings = self.c[1].row(0);
        couplings.norm_squared() / HBAR2_OVER_2M0
    }

    /// The coefficients at one k∥, raised by an energy.
    pub fn at(&self, k_per_nm: f64, part: Part, raised_ev: f64) -> MatrixCoefficient {
        let k = k_per_nm;
        let n = self.a.nrows();
        let mut c = &self.c[0] + k * &self.c[1] + k * k * &self.c[2];
        for i in 0..n {
            c[(i, i)] += raised_ev;
        }
        let g = &self.g[0] + k * &self.g[1];
        let a = self.a.clone();
        match part {
            Part::Plus => MatrixCoefficient { a, g, c },
            Part::Minus => MatrixCoefficient { a, g: -g, c },
            Part::Both => {
                let mut both = MatrixCoefficient::zeros(2 * n);
                both.a.view_mut((0, 0), (n, n)).copy_from(&a);
                both.a.view_mut((n, n), (n, n)).copy_from(&a);
                both.g.view_mut((0, 0), (n, n)).copy_from(&g);
                both.g.view_mut((n, n), (n, n)).copy_from(&-g);
                both.c.view_mut((0, 0), (n, n)).copy_from(&c);
                both.c.view_mut((n, n), (n, n)).copy_from(&c);
                let cross = k * k * &self.cross;
                both.c
                    .view_mut((n, 0), (n, n))
                    .copy_from(&cross.transpose());
                both.c.view_mut((0, n), (n, n)).copy_from(&cross);
                both
            }
        }
    }

    /// The derivative with respect to k∥ at k∥ = 0 of a part: first and second order.
    pub fn orders(&self, part: Part) -> [MatrixCoefficient; 2] {
        let n = self.a.nrows();
        let sign = if part == Part::Minus { -1.0 } else { 1.0 };
        let (mut first, mut second) = (MatrixCoefficient::zeros(n), MatrixCoefficient::zeros(n));
        first.g = sign * &self.g[1];
        first.c.clone_from(&self.c[1]);
        second.c.clone_from(&self.c[2]);
        [first, second]
    }
}

/// The valence part of a model: everything in ħ²/2m₀ but the energies, which are in eV.
pub(super) struct Valence {
    /// Own terms of X along x and across (Dresselhaus, Kip and Kittel, Phys. Rev. 98, 368 (1955)), with what the free
    /// electron adds.
    pub l: f64,
    pub m: f64,
    /// The two orders of the coupling of X and Z, kx N₊ kz + kz N₋ kx (Foreman, Phys. Rev. B 56, R12748 (1997)).
    pub n_plus: f64,
    pub n_minus: f64,
    /// The common edge of heavy and light holes.
    pub edge_ev: f64,
    pub spin_orbit_ev: f64,
    /// b (ε∥ − ε_zz).
    pub shear_ev: f64,
}

impl Valence {
    /// From γ₁, γ₂, γ₃ as they enter the model: the tabulated ones, or what is left of them beside a coupling.
    ///
    /// N₋ is M without the free electron's own term.
    pub fn new(
        material: &Material,
        [g1, g2, g3]: [f64; 3],
        strain: Option<Strain>,
        model: &'static str,
    ) -> Result<Valence, MultibandUnsuitable> {
        let missing = |key| MultibandUnsuitable::Missing { key, model };
        let m = -(g1 - 2.0 * g2);
        let n_minus = m - 1.0;
        Ok(Valence {
            l: -HBAR2_OVER_2M0 * (g1 + 4.0 * g2),
            m: HBAR2_OVER_2M0 * m,
            n_plus: HBAR2_OVER_2M0 * (-6.0 * g3 - n_minus),
            n_minus: HBAR2_OVER_2M0 * n_minus,
            edge_ev: material.valence_edge_ev.ok_or(missing("valence_edge"))?,
            spin_orbit_ev: material.spin_orbit_ev.ok_or(missing("spin_orbit"))?,
            shear_ev: shear_ev(material, strain, model)?,
        })
    }

    /// Coefficients in the basis X, Y, Z, from row and column `first` on.
    pub fn add_to(&self, block: &mut BlockCoefficient, first: usize, direction: Direction) {
        let [x, y, z] = [first, first + 1, first + 2];
        let excess = self.l - self.m - (self.n_plus + self.n_minus);
        let own = self.edge_ev - self.spin_orbit_ev / 3.0;
        for (row, a, c, shear) in [
            (x, self.m, self.l - direction.anisotropy * excess, 1.0),
            (y, self.m, self.m + direction.anisotropy * excess, 1.0),
            (z, self.l, self.m, -2.0),
        ] {
            block.a[(row, row)] = a;
            block.c[0][(row, row)] = own + shear * self.shear_ev;
            block.c[2][(row, row)] = c;
        }
        // Δ/3 L·σ in this basis.
        for (row, column, sign) in [(x, y, -1.0), (y, z, 1.0), (x, z, 1.0)] {
            block.c[0][(row, column)] = sign * self.spin_orbit_ev / 3.0;
            block.c[0][(column, row)] = sign * self.spin_orbit_ev / 3.0;
        }
        // ⟨iX| kx N₊ kz + kz N₋ kx |Z⟩ with kz = −i d/dz.
        block.g[1][(x, z)] = self.n_minus;
        block.g[1][(z, x)] = -self.n_plus;
        block.cross[(x, y)] = direction.mixing * excess;
        block.cross[(y, x)] = -direction.mixing * excess;
    }
}

impl BlockCoefficient {
    pub(super) fn zeros(n: usize) -> BlockCoefficient {
        let zero = || DMatrix::zeros(n, n);
        BlockCoefficient {
            a: zero(),
            g: [zero(), zero()],
            c: [zero(), zero(), zero()],
            cross: zero(),
        }
    }

    /// From X, Y, Z, the last three functions, to heavy, light and split-off holes.
    pub(super) fn into_holes(self) -> BlockCoefficient {
        let n = self.a.nrows();
        let (r2, r3, r6) = (
            0.5_f64.sqrt(),
            (1.0_f64 / 3.0).sqrt(),
            (1.0_f64 / 6.0).sqrt(),
        );
        let holes = Matrix3::new(r2, r6, r3, -r2, r6, r3, 0.0, 2.0 * r6, -r3);
        let mut turn = DMatrix::identity(n, n);
        turn.view_mut((n - 3, n - 3), (3, 3)).copy_from(&holes);
        let turned = |m: DMatrix<f64>| {
            let mut m = turn.transpose() * m * &turn;
            // What vanishes does so exactly: heavy holes decouple at k∥ = 0.
            let largest = m.amax();
            m.iter_mut()
                .filter(|v| v.abs() < 4.0 * f64::EPSILON * largest)
                .for_each(|v| *v = 0.0);
            m
        };
        BlockCoefficient {
            a: turned(self.a),
            g: self.g.map(turned),
            c: self.c.map(turned),
            cross: turned(self.cross),
        }
    }
}

/// b (ε∥ − ε_zz); zero without strain.
///
/// # Errors
/// When the layer is strained and b is unknown.
fn shear_ev(
    material: &Material,
    strain: Option<Strain>,
    model: &'static str,
) -> Result<f64, MultibandUnsuitable> {
    match strain {
        Some(strain) if strain.in_plane != 0.0 => {
            let b = material.shear_b_ev.ok_or(MultibandUnsuitable::Missing {
                key: "shear_b",
                model,
            })?;
            Ok(b * (strain.in_plane - strain.growth))
        }
        _ => Ok(0.0),
    }
}

impl MultibandModel {
    /// The name in files and reports.
    pub fn name(self) -> &'static str {
        match self {
            MultibandModel::SixBand => "six-band",
            MultibandModel::EightBand => "eight-band",
        }
    }

    /// Number of functions of one part.
    pub fn components(self) -> usize {
        match self {
            MultibandModel::SixBand => 3,
            MultibandModel::EightBand => 4,
        }
    }

    /// The coefficients of a material whose edges have been moved by the hydrostatic part of the strain, as
    /// [`strained`](crate::materials::strained) does.
    ///
    /// # Errors
    /// When a parameter is missing or does not describe the bands.
    pub fn block(
        self,
        material: &Material,
        strain: Option<Strain>,
        direction: Direction,
    ) -> Result<BlockCoefficient, MultibandUnsuitable> {
        match self {
            MultibandModel::SixBand => six_band::block(material, strain, direction),
            MultibandModel::EightBand => eight_band::block(material, strain, direction),
        }
    }
}

/// The operator of coupled bands on one stack, for one direction of k∥.
#[derive(Clone, Debug)]
pub struct MultibandOperator<'s> {
    stack: &'s Stack,
    model: MultibandModel,
    direction: Direction,
    /// The coefficients of the layers at their bottom face, without field.
    bottoms: Vec<BlockCoefficient>,
}

impl<'s> MultibandOperator<'s> {
    /// Checks that every layer has what the model needs. The error carries the number of the first layer that has not, or
    /// of the thickest one where all together are too thick.
    pub fn new(
        stack: &'s Stack,
        model: MultibandModel,
        direction: Direction,
    ) -> Result<Self, (usize, MultibandUnsuitable)> {
        let total_nm = stack.total_width_nm();
        if total_nm > MOST_NM {
            let layers = stack.layers.iter().enumerate();
            let thickest = layers.max_by(|a, b| a.1.width_nm.total_cmp(&b.1.width_nm));
            let layer = thickest.map_or(0, |(layer, _)| layer);
            return Err((layer, MultibandUnsuitable::TooThick { total_nm }));
        }
        let mut operator = Self {
            stack,
            model,
            direction,
            bottoms: Vec::with_capacity(stack.layers.len()),
        };
        for layer in 0..stack.layers.len() {
            let bottom = operator.resolve(layer, 0.0);
            operator
                .bottoms
                .push(bottom.map_err(|reason| (layer, reason))?);
            if !stack.is_uniform(layer) {
                for t in [0.25, 0.5, 0.75, 1.0] {
                    operator
                        .resolve(layer, t)
                        .map_err(|reason| (layer, reason))?;
                }
            }
        }
        Ok(operator)
    }

    fn resolve(&self, layer: usize, t: f64) -> Result<BlockCoefficient, MultibandUnsuitable> {
        self.block_of(&self.stack.material_at(layer, t))
    }

    fn block_of(&self, material: &Material) -> Result<BlockCoefficient, MultibandUnsuitable> {
        let substrate = self.stack.substrate_lattice_nm();
        let strain = substrate.and_then(|lattice| strain(material, lattice));
        self.model.block(material, strain, self.direction)
    }

    /// The slopes of A, G and C of the first part at k∥ = 0 with respect to the fraction of an element in the layer's
    /// material, the field left out: a difference of fourth order of these matrices along the exact slopes of the
    /// material's parameters, right to rounding. Zero for a layer without that element.
    pub fn fraction_slope(&self, layer: usize, t: f64, element: Element) -> MatrixCoefficient {
        let h = SLOPE_STEP;
        let steps = [h, -h, 2.0 * h, -2.0 * h];
        let materials = self.stack.materials_moved_at(layer, t, element, &steps);
        let blocks: Option<Vec<MatrixCoefficient>> = materials.ok().and_then(|materials| {
            let blocks = materials.iter().map(|m| self.block_of(m).ok());
            blocks.map(|b| Some(b?.at(0.0, Part::Plus, 0.0))).collect()
        });
        // Abramowitz and Stegun 1964, table 25.2, five points.
        let slope = |pick: fn(&MatrixCoefficient) -> &DMatrix<f64>, [a, b, c, d]: [&_; 4]| {
            ((pick(a) - pick(b)) * 8.0 - (pick(c) - pick(d))) / (12.0 * h)
        };
        match blocks.as_deref() {
            Some([a, b, c, d]) => MatrixCoefficient {
                a: slope(|m| &m.a, [a, b, c, d]),
                g: slope(|m| &m.g, [a, b, c, d]),
                c: slope(|m| &m.c, [a, b, c, d]),
            },
            _ => MatrixCoefficient::zeros(self.model.components()),
        }
    }

    pub fn stack(&self) -> &'s Stack {
        self.stack
    }

    pub fn model(&self) -> MultibandModel {
        self.model
    }

    pub fn direction(&self) -> Direction {
        self.direction
    }

    /// The coefficients at fraction `t` of a layer, without field.
    pub fn block(&self, layer: usize, t: f64) -> std::borrow::Cow<'_, BlockCoefficient> {
        if self.stack.is_uniform(layer) || t <= 0.0 {
            return std::borrow::Cow::Borrowed(&self.bottoms[layer]);
        }
        // A grade runs between materials that were checked; should a point in between fail, the face stands in.
        match self.resolve(layer, t) {
            Ok(block) => std::borrow::Cow::Owned(block),
            Err(_) => std::borrow::Cow::Borrowed(&self.bottoms[layer]),
        }
    }
}
