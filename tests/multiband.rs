//! Six and eight coupled bands: against the bulk matrix, one band, published wells, and themselves turned.

use nalgebra::{Complex, DMatrix, SymmetricEigen};
use std::borrow::Cow;
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::materials::{Library, Material, Strain};
use wellwright::models::multiband::{
    Direction, MultibandModel, MultibandOperator, MultibandUnsuitable, Part,
};
use wellwright::models::{Band as OneBand, BandOperator, eight_band};
use wellwright::numerics::curvature::curvature;
use wellwright::numerics::matrix_pencil::{MatrixCoefficient, MatrixPencil};
use wellwright::numerics::mesh::Mesh;
use wellwright::numerics::nearest::{NearPair, numbered};
use wellwright::structure;
use wellwright::subbands::follow::follow_multiband;
use wellwright::subbands::multiband::{
    Band, MultibandSubbands, Wanted, solve_multiband, zone_centre_masses,
};
use wellwright::subbands::strengths::interband_strengths;
use wellwright::subbands::{Accuracy, solve};

const TOLERANCE_EV: f64 = 1e-8;
const MODELS: [MultibandModel; 2] = [MultibandModel::SixBand, MultibandModel::EightBand];

fn stack_of(text: &str) -> structure::Stack {
    let (file, problems) = structure::read(text);
    let file = file.unwrap_or_else(|| panic!("{problems:?}"));
    file.stack().unwrap()
}

fn solved(
    text: &str,
    model: MultibandModel,
    direction: Direction,
    k_per_nm: f64,
    wanted: Wanted,
) -> MultibandSubbands {
    let stack = stack_of(text);
    let operator = MultibandOperator::new(&stack, model, direction).unwrap();
    solve_multiband(&operator, k_per_nm, wanted, TOLERANCE_EV)
}

fn wanted(model: MultibandModel, conduction: usize, valence: usize) -> Wanted {
    match model {
        MultibandModel::SixBand => Wanted {
            conduction: 0,
            valence,
        },
        MultibandModel::EightBand => Wanted {
            conduction,
            valence,
        },
    }
}

fn gaas() -> Material {
    let library = Library::new();
    library
        .material(&library.find("GaAs").unwrap(), 300.0)
        .unwrap()
}

/// Holes with the given γ and edge, and a split-off band so far away that four bands are left.
fn four_bands(luttinger: [f64; 3], valence_edge_ev: f64) -> Material {
    Material {
        luttinger: Some(luttinger),
        valence_edge_ev: Some(valence_edge_ev),
        spin_orbit_ev: Some(1e6),
        ..gaas()
    }
}

/// The problem of six-band layers in the axial approximation; `part_of` takes what is wanted of their coefficients.
fn hole_pencil(
    layers: &[(Material, f64)],
    part_of: impl Fn(&wellwright::models::multiband::BlockCoefficient) -> MatrixCoefficient,
) -> MatrixPencil {
    let blocks: Vec<_> = layers
        .iter()
        .map(|(material, _)| {
            let block = MultibandModel::SixBand.block(material, None, Direction::AXIAL);
            part_of(&block.unwrap())
        })
        .collect();
    let lengths: Vec<f64> = layers.iter().map(|(_, width)| *width).collect();
    let pieces: Vec<usize> = lengths.iter().map(|l| (l / 2.5).ceil() as usize).collect();
    MatrixPencil::new(Mesh::new(&lengths, &pieces, 12), 3, |element, _| {
        Cow::Owned(blocks[element.segment].clone())
    })
}

/// The highest hole levels, downwards.
fn holes(pencil: &MatrixPencil, count: usize) -> Vec<NearPair> {
    let mut pairs = numbered(pencil, pencil.size() - count..pencil.size(), -0.05, 0.05);
    pairs.reverse();
    pairs
}

/// Hole energies against expected ones in meV, within `tolerance` of (absolute + relative part).
fn compare_holes(
    layers: &[(Material, f64)],
    k: f64,
    expected: &[f64],
    tolerance: impl Fn(f64) -> f64,
) {
    let pencil = hole_pencil(layers, |block| block.at(k, Part::Plus, 0.0));
    for (pair, expected) in holes(&pencil, expected.len()).iter().zip(expected) {
        let own = -1e3 * pair.value;
        let off = (own - expected).abs();
        println!("k {k}: {own:.5} meV for {expected}");
        assert!(off < tolerance(*expected), "k {k}: {own} for {expected}");
    }
}

fn compare_masses(layers: &[(Material, f64)], expected: &[f64], relative: f64) {
    let pencil = hole_pencil(layers, |block| block.at(0.0, Part::Plus, 0.0));
    let [first, second] =
        [0, 1].map(|order| hole_pencil(layers, |block| block.orders(Part::Plus)[order].clone()));
    let pairs = holes(&pencil, 8);
    let known: Vec<&NearPair> = pairs.iter().collect();
    for (pair, expected) in pairs.iter().zip(expected) {
        let bend = curvature(&pencil, &first, &second, &known, pair).unwrap();
        let mass = -HBAR2_OVER_2M0 / bend;
        println!("mass {mass:.5} for {expected}");
        assert!(
            (mass / expected - 1.0).abs() < relative,
            "{mass} for {expected}"
        );
    }
}

/// Hard-wall well of the 4 × 4 Luttinger matrix in the axial approximation, γ = 6.98, 2.06, 2.93, 10 nm: computed from
/// the stated inputs by independent code, converged to 1e-5 meV. The electron-like first light hole is that of Andreani,
/// Pasquarello and Bassani, Phys. Rev. B 36, 5887 (1987). Masses were differences over a k∥ of 3e-4/nm, given to five
/// digits after the point.
#[test]
fn hard_wall_luttinger_well_in_the_axial_approximation() {
    let well = [(four_bands([6.98, 2.06, 2.93], 0.0), 10.0)];
    let tight = |_: f64| 2e-5;
    compare_holes(
        &well,
        0.0,
        &[10.75446, 41.73935, 43.01785, 96.79016, 166.95739],
        tight,
    );
    compare_holes(
        &well,
        0.1,
        &[13.36917, 34.15419, 54.69644, 94.33786, 170.80328],
        tight,
    );
    compare_holes(&well, 0.2, &[19.24134, 31.52911, 70.6697, 89.91175], tight);
    compare_holes(&well, 0.3, &[22.2039, 38.0322, 88.2244, 89.7181], |_| 1e-4);
    compare_holes(&well, 0.5, &[28.24393, 52.76129, 99.2034, 132.4899], |_| {
        1e-4
    });
    compare_masses(&well, &[0.13956, -0.00468, 0.00446, -0.13587], 2e-3);
}

/// Al0.3Ga0.7As around 10 nm of GaAs, 159 meV deep, γ mixed linearly, 15 nm of barrier on both sides: by independent code
/// with γ₃ kz symmetrised. The order of Burt and Foreman moves what lies off k∥ = 0 by up to 3 %.
#[test]
fn finite_luttinger_well_in_the_axial_approximation() {
    let barrier = || (four_bands([6.014, 1.688, 2.477], -0.159), 15.0);
    let well = [
        barrier(),
        (four_bands([6.98, 2.06, 2.93], 0.0), 10.0),
        barrier(),
    ];
    compare_holes(
        &well,
        0.0,
        &[7.8082, 22.5515, 31.0228, 68.8401, 86.9854, 118.8381],
        |_| 0.01,
    );
    compare_holes(&well, 0.2, &[13.3471, 22.3405, 46.3473, 62.6827], |e| {
        0.03 * e
    });
    compare_holes(&well, 0.5, &[23.7118, 36.8862, 64.9292, 96.6939], |e| {
        0.03 * e
    });
}

/// The first light hole lies between the first two heavy ones in wells near 10 nm, so that heavy hole 2 gains strength
/// from it off k∥ = 0: Miller, Gossard, Sanders, Chang and Schulman, Phys. Rev. B 32, 8452 (1985).
#[test]
fn the_first_light_hole_lies_above_the_second_heavy_hole() {
    let text = "bands: {conduction: {model: parabolic, states: 1}}\nlayers:\n  - {material: Al0.3Ga0.7As, width: 15 nm}\n  \
                - {material: GaAs, width: 10 nm}\n  - {material: Al0.3Ga0.7As, width: 15 nm}\n";
    for model in MODELS {
        let centre = solved(text, model, Direction::ALONG_100, 0.0, wanted(model, 1, 3));
        let off = solved(text, model, Direction::ALONG_100, 0.3, wanted(model, 1, 3));
        let valence = |s: &MultibandSubbands| -> Vec<_> {
            s.states
                .iter()
                .filter(|s| s.band == Band::Valence)
                .cloned()
                .collect()
        };
        let heavy: Vec<bool> = valence(&centre)
            .iter()
            .map(|s| s.shares.heavy > 0.999)
            .collect();
        assert_eq!(heavy, [true, false, true], "{model:?}");
        // Away from the centre they mix.
        let mixed = valence(&off)
            .iter()
            .filter(|s| s.shares.heavy > 0.05 && s.shares.light > 0.05)
            .count();
        assert!(mixed >= 2, "{model:?}: {:?}", valence(&off));
    }
}

type Matrix = DMatrix<Complex<f64>>;

/// The bulk matrix in the cubic axes: Dresselhaus, Kip & Kittel (1955) for S, X, Y, Z with spin up, then down, and
/// Δ/3 L·σ with ⟨X|L_z|Y⟩ = −i. Parameters reduced as the model reports.
fn bulk(material: &Material, strain: Option<Strain>, k: [f64; 3], eight: bool) -> Matrix {
    let ([g1, g2, g3], s, kane) = if eight {
        let r = eight_band::reduction(material).unwrap();
        (r.luttinger, r.conduction_term, r.kane_energy_ev)
    } else {
        (material.luttinger.unwrap(), 1.0, 0.0)
    };
    let h = HBAR2_OVER_2M0;
    let (l, m, n) = (-(g1 + 4.0 * g2), -(g1 - 2.0 * g2), -6.0 * g3);
    let squares = k[0] * k[0] + k[1] * k[1] + k[2] * k[2];
    let edge = material.valence_edge_ev.unwrap();
    let third = material.spin_orbit_ev.unwrap() / 3.0;
    let strains = strain.map_or([0.0; 3], |s| [s.in_plane, s.in_plane, s.growth]);
    let trace: f64 = strains.iter().sum();
    let b = material.shear_b_ev.unwrap();
    let mut orbital = DMatrix::<Complex<f64>>::zeros(4, 4);
    orbital[(0, 0)] = Complex::from(material.conduction_edge_ev.unwrap() + h * s * squares);
    for i in 0..3 {
        let own = h * (l * k[i] * k[i] + m * (squares - k[i] * k[i]));
        let shear = b * (3.0 * strains[i] - trace);
        orbital[(1 + i, 1 + i)] = Complex::from(edge - third + own + shear);
        orbital[(0, 1 + i)] = Complex::new(0.0, (h * kane).sqrt() * k[i]);
        orbital[(1 + i, 0)] = orbital[(0, 1 + i)].conj();
        for j in 0..3 {
            if i != j {
                orbital[(1 + i, 1 + j)] = Complex::from(h * n * k[i] * k[j]);
            }
        }
    }
    let mut whole = DMatrix::zeros(8, 8);
    whole.view_mut((0, 0), (4, 4)).copy_from(&orbital);
    whole.view_mut((4, 4), (4, 4)).copy_from(&orbital);
    let i = Complex::new(0.0, 1.0);
    let one = Complex::from(1.0);
    // (row, column, σ as [↑↑, ↑↓, ↓↑, ↓↓]) of ⟨X|·|Y⟩ = −i σz, ⟨Y|·|Z⟩ = −i σx, ⟨Z|·|X⟩ = −i σy.
    let zero = Complex::from(0.0);
    for (row, column, sigma) in [
        (1, 2, [one, zero, zero, -one]),
        (2, 3, [zero, one, one, zero]),
        (3, 1, [zero, -i, i, zero]),
    ] {
        for (place, value) in sigma.iter().enumerate() {
            let (r, c) = (row + 4 * (place / 2), column + 4 * (place % 2));
            whole[(r, c)] += -i * value * third;
            whole[(c, r)] += (-i * value * third).conj();
        }
    }
    if eight {
        whole
    } else {
        whole.remove_rows_at(&[0, 4]).remove_columns_at(&[0, 4])
    }
}

fn eigenvalues(matrix: Matrix) -> Vec<f64> {
    let mut values: Vec<f64> = SymmetricEigen::new(matrix)
        .eigenvalues
        .iter()
        .copied()
        .collect();
    values.sort_by(f64::total_cmp);
    values
}

/// A kz² + kz (B + B†) + C of one set of coefficients, with B = −iG.
fn at_kz(at: &MatrixCoefficient, kz: f64) -> Matrix {
    let n = at.a.nrows();
    DMatrix::from_fn(n, n, |r, c| {
        Complex::new(
            at.a[(r, c)] * kz * kz + at.c[(r, c)],
            kz * (at.g[(c, r)] - at.g[(r, c)]),
        )
    })
}

fn strained_ingaas() -> (Material, Strain) {
    let library = Library::new();
    let material = library
        .material(&library.find("In0.2Ga0.8As").unwrap(), 300.0)
        .unwrap();
    let strain =
        wellwright::materials::strain(&material, gaas().lattice_constant_nm.unwrap()).unwrap();
    (material, strain)
}

/// The coefficients are those of the bulk matrix in another basis, for any direction, with and without strain.
#[test]
fn coefficients_have_the_eigenvalues_of_the_bulk_matrix() {
    let (ingaas, strain) = strained_ingaas();
    for (material, strain) in [(gaas(), None), (ingaas, Some(strain))] {
        for [kx, ky, kz] in [
            [0.0, 0.0, 0.0],
            [0.0, 0.0, 0.7],
            [0.4, 0.0, 0.3],
            [0.0, 0.4, 0.3],
            [0.3, 0.3, -0.5],
            [0.3, -0.3, 0.5],
            [0.5, 0.2, 0.4],
            [-0.1, 0.6, 0.9],
        ] {
            for model in MODELS {
                let direction = Direction::of(kx, ky);
                let block = model.block(&material, strain, direction).unwrap();
                let k = f64::hypot(kx, ky);
                let parts: &[Part] = if direction.is_mirror_plane() {
                    &[Part::Plus, Part::Minus]
                } else {
                    &[Part::Both]
                };
                let mut own: Vec<f64> = parts
                    .iter()
                    .flat_map(|&part| eigenvalues(at_kz(&block.at(k, part, 0.0), kz)))
                    .collect();
                own.sort_by(f64::total_cmp);
                let eight = model == MultibandModel::EightBand;
                let expected = eigenvalues(bulk(&material, strain, [kx, ky, kz], eight));
                for (own, expected) in own.iter().zip(&expected) {
                    assert!(
                        (own - expected).abs() < 1e-12,
                        "{model:?} {kx} {ky} {kz}: {own} for {expected}"
                    );
                }
            }
        }
    }
}

/// The edge masses of the bulk matrix are the tabulated ones, whatever the reduction: 1/m along \[001] by differences.
#[test]
fn the_reduction_leaves_all_edge_masses_as_tabulated() {
    let library = Library::new();
    for name in [
        "GaAs",
        "AlAs",
        "InAs",
        "InP",
        "GaP",
        "AlP",
        "GaSb",
        "AlSb",
        "InSb",
        "In0.53Ga0.47As",
        "Al0.48In0.52As",
    ] {
        let material = library
            .material(&library.find(name).unwrap(), 300.0)
            .unwrap();
        let reduced = eight_band::reduction(&material).unwrap();
        let kz = 1e-3;
        let levels = |k| eigenvalues(bulk(&material, None, [0.0, 0.0, k], true));
        let (edge, moved) = (levels(0.0), levels(kz));
        let inverse = |index: usize| (moved[index] - edge[index]) / (HBAR2_OVER_2M0 * kz * kz);
        let [g1, g2, _] = material.luttinger.unwrap();
        println!("{name}: {reduced:?}");
        assert!(
            (inverse(6) * material.electron_mass_m0.unwrap() - 1.0).abs() < 2e-3,
            "{name}: {}",
            inverse(6)
        );
        assert!(
            (inverse(4) / -(g1 - 2.0 * g2) - 1.0).abs() < 2e-3
                || (inverse(2) / -(g1 - 2.0 * g2) - 1.0).abs() < 2e-3,
            "{name}"
        );
        assert!(
            (inverse(2) / -(g1 + 2.0 * g2) - 1.0).abs() < 2e-3
                || (inverse(4) / -(g1 + 2.0 * g2) - 1.0).abs() < 2e-3,
            "{name}: {}",
            inverse(2)
        );
        assert!(reduced.conduction_term >= 1.0 - 1e-12);
        assert!(reduced.luttinger[0] + 4.0 * reduced.luttinger[1] >= 0.25 - 1e-12);
    }
}

/// In a layer so thick that kz hardly matters the first states approach the edges of the bulk bands at that k∥: at kz = 0
/// for electrons, where the warped valence band is highest for holes. What confinement adds is ħ²π²/2mL², 0.06 meV for
/// electrons and less for heavy holes.
#[test]
fn a_thick_layer_has_the_dispersion_of_the_bulk() {
    let text = "bands: {conduction: {model: parabolic, states: 1}}\nlayers:\n  - {material: GaAs, width: 300 nm}\n";
    let electrons = HBAR2_OVER_2M0 * (std::f64::consts::PI / 300.0).powi(2) / 0.067;
    for (kx, ky) in [(0.0, 0.0), (0.2, 0.0), (0.15, 0.15)] {
        let k = f64::hypot(kx, ky);
        let one = Wanted {
            conduction: 1,
            valence: 1,
        };
        let subbands = solved(
            text,
            MultibandModel::EightBand,
            Direction::of(kx, ky),
            k,
            one,
        );
        let own = [0, 1].map(|state| subbands.states[state].energies_ev[0]);
        let at = |kz: f64| eigenvalues(bulk(&gaas(), None, [kx, ky, kz], true));
        let top = (0..400).map(|step| at(1e-3 * f64::from(step))[5]);
        let top = top.fold(f64::NEG_INFINITY, f64::max);
        let rise = own[0] - at(0.0)[6];
        println!(
            "{kx} {ky}: electrons {rise:.2e}, holes {:.2e}",
            top - own[1]
        );
        assert!(
            (rise / electrons - 1.0).abs() < 0.1,
            "{kx} {ky}: {rise} for {electrons}"
        );
        assert!(
            (0.0..5e-5).contains(&(top - own[1])),
            "{kx} {ky}: {} for {top}",
            own[1]
        );
    }
}

/// A strained InGaAs well in GaAs with a step and a field: no symmetry but those of the crystal.
const LOPSIDED: &str = "substrate: GaAs\nfield: 40 kV/cm\nbands: {conduction: {model: parabolic, states: 1}}\nlayers:\n  \
    - {material: GaAs, width: 10 nm}\n  - {material: In0.2Ga0.8As, width: 6 nm}\n  - {material: In0.1Ga0.9As, width: 3 nm}\n  \
    - {material: Al0.2Ga0.8As, width: 10 nm}\n";
const SYMMETRIC: &str = "substrate: GaAs\nbands: {conduction: {model: parabolic, states: 1}}\nlayers:\n  \
    - {material: GaAs, width: 10 nm}\n  - {material: In0.2Ga0.8As, width: 6 nm}\n  - {material: GaAs, width: 10 nm}\n";

#[test]
fn pairs_coincide_at_the_centre_and_in_symmetric_stacks() {
    for model in MODELS {
        for (text, k) in [(LOPSIDED, 0.0), (SYMMETRIC, 0.0), (SYMMETRIC, 0.3)] {
            let subbands = solved(text, model, Direction::ALONG_100, k, wanted(model, 2, 4));
            for state in &subbands.states {
                let [a, b] = state.energies_ev;
                assert!((a - b).abs() < 1e-9, "{model:?} k {k}: {a} {b}");
            }
        }
        let split = solved(
            LOPSIDED,
            model,
            Direction::ALONG_100,
            0.3,
            wanted(model, 2, 4),
        );
        assert!(
            split
                .states
                .iter()
                .any(|s| (s.energies_ev[0] - s.energies_ev[1]).abs() > 1e-6)
        );
    }
}

/// Turned by 90° k∥ meets the same crystal; halfway between \[100] and \[110] the parts mix and are solved together.
#[test]
fn turning_by_a_right_angle_changes_nothing() {
    let k = 0.35;
    for model in MODELS {
        for angle in [0.0_f64, 0.2, 45.0_f64.to_radians(), 1.1] {
            let levels = |angle: f64| -> Vec<f64> {
                let direction = Direction::of(angle.cos(), angle.sin());
                let all = solved(LOPSIDED, model, direction, k, wanted(model, 2, 3));
                all.states
                    .iter()
                    .flat_map(|s| {
                        let [a, b] = s.energies_ev;
                        [a.min(b), a.max(b)]
                    })
                    .collect()
            };
            let (own, turned) = (levels(angle), levels(angle + std::f64::consts::FRAC_PI_2));
            for (a, b) in own.iter().zip(&turned) {
                assert!((a - b).abs() < 1e-8, "{model:?} {angle}: {a} {b}");
            }
        }
        // The whole problem along a mirror plane has the levels of its parts: a direction a hair off it.
        let parts = solved(
            LOPSIDED,
            model,
            Direction::ALONG_110,
            k,
            wanted(model, 2, 3),
        );
        let whole = solved(
            LOPSIDED,
            model,
            Direction::of(1.0, 1.0 + 1e-9),
            k,
            wanted(model, 2, 3),
        );
        assert_eq!((parts.parts.len(), whole.parts.len()), (2, 1));
        for (a, b) in parts.states.iter().zip(&whole.states) {
            let (mut a, mut b) = (a.energies_ev, b.energies_ev);
            a.sort_by(f64::total_cmp);
            b.sort_by(f64::total_cmp);
            assert!(
                (a[0] - b[0]).abs() < 1e-8 && (a[1] - b[1]).abs() < 1e-8,
                "{model:?}: {a:?} {b:?}"
            );
        }
    }
}

/// At k∥ = 0 heavy holes are a band of their own with 1/m = γ₁ − 2γ₂: the levels of the solver for one band, upside down.
#[test]
fn heavy_holes_at_the_centre_are_those_of_one_band() {
    let materials = [
        ([6.98, 2.06, 2.93], 0.0, "Well"),
        ([6.0, 1.7, 2.5], -0.16, "Barrier"),
    ];
    let many: String = materials
        .iter()
        .map(|([g1, g2, g3], edge, name)| {
            format!("  {name}: {{gap: 1.5 eV, electron_mass: 0.067, valence_edge: {edge} eV, spin_orbit: 0.34 eV, luttinger: [{g1}, {g2}, {g3}]}}\n")
        })
        .collect();
    let one: String = materials
        .iter()
        .map(|([g1, g2, _], edge, name)| {
            format!(
                "  {name}: {{conduction_edge: {} eV, electron_mass: {:?}}}\n",
                -edge,
                1.0 / (g1 - 2.0 * g2)
            )
        })
        .collect();
    let text = |field: f64, materials: &str| {
        format!(
            "field: {field} kV/cm\nbands: {{conduction: {{model: parabolic, states: 1}}}}\nmaterials:\n{materials}layers:\n  \
                 - {{material: Barrier, width: 9 nm}}\n  - {{material: Well, width: 8 nm}}\n  - {{material: Barrier, width: 9 nm}}\n"
        )
    };
    for field in [0.0, 30.0] {
        let mirror = stack_of(&text(-field, &one));
        let operator = BandOperator::new(
            &mirror,
            OneBand::Conduction(structure::ConductionModel::Parabolic),
        )
        .unwrap();
        let expected = solve(&operator, 3, Accuracy::default());
        for model in MODELS {
            let subbands = solved(
                &text(field, &many),
                model,
                Direction::ALONG_100,
                0.0,
                wanted(model, 1, 6),
            );
            let heavy = subbands
                .states
                .iter()
                .filter(|s| s.band == Band::Valence && s.shares.heavy > 0.5);
            for (state, pair) in heavy.zip(&expected.pairs) {
                let off = (state.energies_ev[0] + pair.value).abs();
                assert!(off < 1e-9, "{model:?} field {field}: {off}");
                assert!(state.shares.heavy > 1.0 - 1e-12);
            }
        }
    }
}

/// The in-plane mass is that of a fine difference of energies, which the exact perturbation replaces.
#[test]
fn in_plane_masses_are_second_derivatives() {
    for model in MODELS {
        let stack = stack_of(LOPSIDED);
        for direction in [Direction::ALONG_100, Direction::ALONG_110] {
            let operator = MultibandOperator::new(&stack, model, direction).unwrap();
            let at = |k: f64| solve_multiband(&operator, k, wanted(model, 2, 3), TOLERANCE_EV);
            let centre = at(0.0);
            let masses = zone_centre_masses(&operator, &centre);
            let k = 3e-3;
            let near = at(k);
            for ((state, moved), mass) in centre.states.iter().zip(&near.states).zip(&masses) {
                // Both members together are even in k.
                let rise =
                    0.5 * (moved.energies_ev[0] + moved.energies_ev[1]) - state.energies_ev[0];
                let sign = if state.band == Band::Valence {
                    -1.0
                } else {
                    1.0
                };
                let inverse = sign * rise / (HBAR2_OVER_2M0 * k * k);
                println!(
                    "{model:?} {:?} {}: {mass:?} {}",
                    state.band,
                    state.number,
                    1.0 / inverse
                );
                assert!(
                    (inverse * mass.unwrap() - 1.0).abs() < 0.01,
                    "{mass:?} for {}",
                    1.0 / inverse
                );
            }
        }
    }
}

/// Bands followed through k∥: the same whether the steps are coarse or fine, and continuous.
#[test]
fn bands_are_followed_without_swaps() {
    let stack = stack_of(SYMMETRIC);
    let operator =
        MultibandOperator::new(&stack, MultibandModel::EightBand, Direction::ALONG_100).unwrap();
    let wanted = Wanted {
        conduction: 2,
        valence: 4,
    };
    let list =
        |count: usize| -> Vec<f64> { (0..=count).map(|k| 0.6 * k as f64 / count as f64).collect() };
    let fine = follow_multiband(&operator, &list(96), wanted, 1e-6);
    let coarse = follow_multiband(&operator, &list(12), wanted, 1e-6);
    assert_eq!(fine.len(), 6);
    for (fine, coarse) in fine.iter().zip(&coarse) {
        for (step, energies) in coarse.energies_ev.iter().enumerate() {
            assert!(
                (energies[0] - fine.energies_ev[8 * step][0]).abs() < 1e-7,
                "{:?} {} step {step}",
                fine.band,
                fine.number
            );
        }
        // No jump: the second difference stays that of a smooth curve.
        for three in fine.energies_ev.windows(3) {
            let bend = three[0][0] - 2.0 * three[1][0] + three[2][0];
            assert!(bend.abs() < 1e-3, "{:?} {}: {bend}", fine.band, fine.number);
        }
    }
}

/// The polarisation rules of bulk hold for the lowest states of a wide well: E_P/2 for the heavy hole with the field in the
/// plane and nothing along z; E_P/6 and 2E_P/3 for the light hole (Kane, J. Phys. Chem. Solids 1, 249 (1957)). What the
/// confinement mixes in is of the order of the confinement energy over the gap.
#[test]
fn light_couples_the_states_of_a_wide_well_as_those_of_bulk() {
    let stack = stack_of(
        "bands: {conduction: {model: parabolic, states: 1}}\nlayers:\n  - {material: GaAs, width: 60 nm}\n",
    );
    let model = MultibandModel::EightBand;
    let operator = MultibandOperator::new(&stack, model, Direction::ALONG_100).unwrap();
    let subbands = solve_multiband(&operator, 0.0, wanted(model, 1, 8), 1e-7);
    let kane = eight_band::reduction(&gaas()).unwrap().kane_energy_ev;
    let holes: Vec<_> = subbands
        .states
        .iter()
        .filter(|s| s.band == Band::Valence)
        .collect();
    let mut light = 0;
    for strength in interband_strengths(&operator, &subbands) {
        let heavy = holes[strength.valence - 1].shares.heavy > 0.5;
        let [te, tm] = [strength.te_ev / kane, strength.tm_ev / kane];
        println!(
            "hole {} heavy {heavy}: TE {te:.5} TM {tm:.5}",
            strength.valence
        );
        if strength.valence == 1 {
            assert!(heavy && (te - 0.5).abs() < 0.01 && tm < 1e-12, "{te} {tm}");
        } else if heavy {
            assert!(
                te < 0.01 && tm < 1e-12,
                "another number of nodes: {te} {tm}"
            );
        } else if light == 0 {
            light += 1;
            assert!(
                (te - 1.0 / 6.0).abs() < 0.01 && (tm - 2.0 / 3.0).abs() < 0.02,
                "{te} {tm}"
            );
        }
    }
    assert_eq!(light, 1);
}

#[test]
fn a_missing_parameter_names_its_key() {
    let mut material = gaas();
    material.luttinger = None;
    for model in MODELS {
        let refused = model
            .block(&material, None, Direction::ALONG_100)
            .unwrap_err();
        assert!(refused.to_string().contains("luttinger"), "{refused}");
    }
    let mut heavy = gaas();
    heavy.electron_mass_m0 = Some(1.2);
    assert!(matches!(
        MultibandModel::EightBand.block(&heavy, None, Direction::ALONG_100),
        Err(MultibandUnsuitable::HeavyElectron { .. })
    ));
}

/// Every pair of binaries whose lattices are within 8 % of the substrate, a 5 nm well between 6 nm barriers: at midgap of
/// the edges that all layers share, the count of states below is that of the valence functions, at and off k∥ = 0; and
/// the first ten levels of both bands do not change with the mesh, which solutions that oscillate from node to node do.
#[test]
fn no_spurious_state_in_any_pair_of_binaries() {
    let library = Library::new();
    let names = [
        "GaAs", "AlAs", "InAs", "InP", "GaP", "AlP", "GaSb", "AlSb", "InSb",
    ];
    let lattice = |name: &str| {
        library
            .material(&library.find(name).unwrap(), 300.0)
            .unwrap()
            .lattice_constant_nm
            .unwrap()
    };
    let (mut pairs, mut with_gap, mut worst) = (0, 0, (0.0_f64, String::new()));
    for substrate in ["GaAs", "InP", "GaSb", "InAs"] {
        let grown: Vec<&str> = names
            .iter()
            .copied()
            .filter(|name| (lattice(substrate) / lattice(name) - 1.0).abs() < 0.08)
            .collect();
        for well in &grown {
            for barrier in grown.iter().filter(|b| *b != well) {
                pairs += 1;
                let name = format!("{well} in {barrier} on {substrate}");
                let stack = stack_of(&format!(
                    "substrate: {substrate}\nbands: {{conduction: {{model: parabolic, states: 1}}}}\nlayers:\n  \
                     - {{material: {barrier}, width: 6 nm}}\n  - {{material: {well}, width: 5 nm}}\n  - {{material: {barrier}, width: 6 nm}}\n"
                ));
                let operator =
                    MultibandOperator::new(&stack, MultibandModel::EightBand, Direction::ALONG_110)
                        .unwrap();
                let (mut top, mut floor) = (f64::NEG_INFINITY, f64::INFINITY);
                for layer in 0..2 {
                    let c = &operator.block(layer, 0.0).c[0];
                    let own = SymmetricEigen::new(c.clone()).eigenvalues;
                    let edge = c[(0, 0)];
                    floor = floor.min(edge);
                    top = own
                        .iter()
                        .filter(|e| **e != edge && (**e - edge).abs() > 1e-9)
                        .fold(top, |t, e| t.max(*e));
                }
                if floor - top > 1e-3 {
                    with_gap += 1;
                    for order in [8, 12] {
                        for k in [0.0, 0.3, 0.8] {
                            let mesh = Mesh::new(&[6.0, 5.0, 6.0], &[4, 4, 4], order);
                            let nodes = mesh.node_count() - 2;
                            let pencil = wellwright::subbands::multiband::pencil(
                                &operator,
                                mesh,
                                k,
                                Part::Plus,
                            );
                            let places: &[f64] = if k == 0.0 {
                                &[0.001, 0.25, 0.5, 0.75, 0.999]
                            } else {
                                &[0.5]
                            };
                            for part in places {
                                let count = pencil.count_below(top + part * (floor - top));
                                assert_eq!(
                                    count,
                                    3 * nodes,
                                    "{name}, order {order}, k {k}, {part} of the gap"
                                );
                            }
                        }
                    }
                }
                for k in [0.0, 0.4] {
                    let all = solve_multiband(
                        &operator,
                        k,
                        Wanted {
                            conduction: 5,
                            valence: 5,
                        },
                        1e-5,
                    );
                    for state in &all.states {
                        if state.error_ev > worst.0 {
                            worst = (
                                state.error_ev,
                                format!("{name} k {k} {:?} {}", state.band, state.number),
                            );
                        }
                    }
                }
            }
        }
    }
    println!(
        "{pairs} pairs, {with_gap} with a common gap; worst change on a finer mesh {:.1e} eV: {}",
        worst.0, worst.1
    );
    assert!(pairs > 60 && with_gap > 20);
    assert!(worst.0 < 1e-5, "{worst:?}");
}
