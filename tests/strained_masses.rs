//! Masses of strained layers against the bulk matrix of eight bands with the tabulated (unreduced) parameters, which the
//! program nowhere forms: Dresselhaus, Kip & Kittel (1955) for S, X, Y, Z with both spins, Δ/3 L·σ for the spin–orbit splitting,
//! strain after Pikus & Bir.

use nalgebra::{Complex, DMatrix, SymmetricEigen};
use wellwright::constants::HBAR2_OVER_2M0;
use wellwright::materials::{Element, Material, strain};
use wellwright::models::{Band, BandOperator, Hole};
use wellwright::structure::{self, ConductionModel, Stack};

/// Compressed, stretched and matched layers.
const LAYERS: [(&str, &str); 6] = [
    ("In0.2Ga0.8As", "GaAs"),
    ("In0.7Ga0.3As", "InP"),
    ("In0.4Ga0.6As", "InP"),
    ("InAs", "GaSb"),
    ("GaAs0.8P0.2", "GaAs"),
    ("GaAs", "GaAs"),
];

fn stack(material: &str, substrate: &str) -> Stack {
    let text = format!(
        "substrate: {substrate}\ntemperature: 300 K\nlayers: [{{material: {material}, width: 1 nm}}]\n"
    );
    let (file, problems) = structure::read(&text);
    file.unwrap_or_else(|| panic!("{problems:?}"))
        .stack()
        .unwrap()
}

/// Kinetic terms of the bulk matrix in ħ²/2m₀: the conduction band's own, L and M of the valence band, and E_P in eV.
struct Kinetic {
    own: f64,
    l: f64,
    m: f64,
    kane_ev: f64,
}

/// Ascending eigenvalues of the bulk matrix at k along one of x, y, z, for a material whose edges carry the hydrostatic
/// strain.
fn levels(
    material: &Material,
    lattice_nm: f64,
    kinetic: &Kinetic,
    axis: usize,
    k: f64,
) -> Vec<f64> {
    let strain = strain(material, lattice_nm).unwrap();
    let strains = [strain.in_plane, strain.in_plane, strain.growth];
    let trace: f64 = strains.iter().sum();
    let third = material.spin_orbit_ev.unwrap() / 3.0;
    let (edge, b) = (
        material.valence_edge_ev.unwrap(),
        material.shear_b_ev.unwrap(),
    );
    let h = HBAR2_OVER_2M0 * k * k;
    let mut matrix = DMatrix::<Complex<f64>>::zeros(8, 8);
    for spin in [0, 4] {
        matrix[(spin, spin)] =
            Complex::from(material.conduction_edge_ev.unwrap() + h * kinetic.own);
        for (i, strain) in strains.iter().enumerate() {
            let own = h * if i == axis { kinetic.l } else { kinetic.m };
            let shear = b * (3.0 * strain - trace);
            let place = spin + 1 + i;
            matrix[(place, place)] = Complex::from(edge - third + own + shear);
            if i == axis {
                let coupling = Complex::new(0.0, (HBAR2_OVER_2M0 * kinetic.kane_ev).sqrt() * k);
                matrix[(spin, place)] = coupling;
                matrix[(place, spin)] = coupling.conj();
            }
        }
    }
    // ⟨X|·|Y⟩ = −i σz, ⟨Y|·|Z⟩ = −i σx, ⟨Z|·|X⟩ = −i σy, each times Δ/3.
    let (i, one, zero) = (
        Complex::new(0.0, 1.0),
        Complex::from(1.0),
        Complex::from(0.0),
    );
    for (row, column, sigma) in [
        (1, 2, [one, zero, zero, -one]),
        (2, 3, [zero, one, one, zero]),
        (3, 1, [zero, -i, i, zero]),
    ] {
        for (place, value) in sigma.iter().enumerate() {
            let (r, c) = (row + 4 * (place / 2), column + 4 * (place % 2));
            matrix[(r, c)] += -i * value * third;
            matrix[(c, r)] += (-i * value * third).conj();
        }
    }
    let mut values: Vec<f64> = SymmetricEigen::new(matrix)
        .eigenvalues
        .iter()
        .copied()
        .collect();
    values.sort_by(f64::total_cmp);
    values
}

/// The law of the mass is exact for flat valence bands: an eigenvalue E of the matrix fulfils E = Ec + A(E) k², at the edge and
/// far above it.
#[test]
fn the_electrons_mass_is_that_of_eight_bands() {
    for (name, substrate) in LAYERS {
        let stack = stack(name, substrate);
        let operator = BandOperator::conduction(&stack, ConductionModel::EnergyDependent).unwrap();
        let law = operator.at(0, 0.0, 0.0);
        let (material, lattice) = (
            stack.material_at(0, 0.0),
            stack.substrate_lattice_nm().unwrap(),
        );
        let flat = Kinetic {
            own: 1.0 + 2.0 * material.remote_band_f.unwrap(),
            l: 0.0,
            m: 0.0,
            kane_ev: material.kane_energy_ev.unwrap(),
        };
        for k in [0.01, 0.1, 0.3, 0.5] {
            let energy_ev = levels(&material, lattice, &flat, 2, k)[7];
            let own_ev = law.constant + law.a(energy_ev) * k * k;
            assert!(
                (energy_ev - own_ev).abs() < 1e-10,
                "{name} on {substrate} at {k}/nm: {own_ev} for {energy_ev}"
            );
        }
        // In the plane the same, where strain makes a difference.
        let in_plane = operator.in_plane(0, 0.0);
        assert_eq!(
            in_plane.is_some(),
            name != substrate,
            "{name} on {substrate}"
        );
        for k in [0.01, 0.1, 0.3] {
            let energy_ev = levels(&material, lattice, &flat, 0, k)[7];
            let stiffness = in_plane
                .as_ref()
                .map_or(law.a(energy_ev), |own| own.at(energy_ev));
            let own_ev = law.constant + stiffness * k * k;
            assert!(
                (energy_ev - own_ev).abs() < 1e-10,
                "{name} on {substrate} at {k}/nm in the plane: {own_ev} for {energy_ev}"
            );
        }
        // At the edge the valence bands' own terms do not count.
        let [g1, g2, _] = material.luttinger.unwrap();
        let whole = Kinetic {
            l: -(g1 + 4.0 * g2),
            m: -(g1 - 2.0 * g2),
            ..flat
        };
        let at = |k: f64| levels(&material, lattice, &whole, 2, k)[7];
        let slope = |k: f64| (at(k) - at(0.0)) / (k * k);
        let inverse_mass = (4.0 * slope(0.005) - slope(0.01)) / 3.0 / HBAR2_OVER_2M0;
        let own = law.a(law.constant) / HBAR2_OVER_2M0;
        assert!(
            (own / inverse_mass - 1.0).abs() < 1e-5,
            "{name} on {substrate}: {own} for {inverse_mass}"
        );
    }
}

/// The light hole's masses along growth and in the plane are curvatures of the valence part of the matrix.
#[test]
fn the_light_holes_masses_are_those_of_six_bands() {
    for (name, substrate) in &LAYERS[..5] {
        let stack = stack(name, substrate);
        let operator = BandOperator::new(&stack, Band::Hole(Hole::Light)).unwrap();
        let (material, lattice) = (
            stack.material_at(0, 0.0),
            stack.substrate_lattice_nm().unwrap(),
        );
        let [g1, g2, _] = material.luttinger.unwrap();
        // The conduction band moved out of the way.
        let kinetic = Kinetic {
            own: 1.0,
            l: -(g1 + 4.0 * g2),
            m: -(g1 - 2.0 * g2),
            kane_ev: 0.0,
        };
        for (axis, own) in [
            (2, operator.at(0, 0.0, 0.0).stiffness),
            (0, operator.in_plane(0, 0.0).unwrap().at(0.0)),
        ] {
            let at = |k: f64| levels(&material, lattice, &kinetic, axis, k);
            let edge_ev = operator.edge_ev(0);
            let near = |list: &[f64]| {
                let apart = |k: &usize| (list[*k] - edge_ev).abs();
                (0..8).min_by(|a, b| apart(a).total_cmp(&apart(b))).unwrap()
            };
            let place = near(&at(0.0));
            assert!((at(0.0)[place] - edge_ev).abs() < 1e-10);
            let slope = |k: f64| (at(0.0)[place] - at(k)[place]) / (k * k);
            let found = (4.0 * slope(0.005) - slope(0.01)) / 3.0;
            assert!(
                (own / found - 1.0).abs() < 1e-4,
                "{name} on {substrate}, axis {axis}: {} for {}",
                own / HBAR2_OVER_2M0,
                found / HBAR2_OVER_2M0
            );
        }
    }
}

/// The coefficients' slopes with respect to a fraction are those of differences.
#[test]
fn slopes_of_strained_masses_are_those_of_differences() {
    let at = |x: f64| {
        let text = format!("In{x:.6}Ga{:.6}As", 1.0 - x);
        let stack = stack(&text, "InP");
        let electron = BandOperator::conduction(&stack, ConductionModel::EnergyDependent).unwrap();
        let hole = BandOperator::new(&stack, Band::Hole(Hole::Light)).unwrap();
        let law = electron.at(0, 0.0, 0.0);
        let [light, split_off] = law.poles.map(Option::unwrap);
        [
            law.stiffness,
            light.strength,
            light.position,
            split_off.strength,
            split_off.position,
            hole.at(0, 0.0, 0.0).stiffness,
        ]
    };
    for x in [0.42, 0.66] {
        let stack = stack(&format!("In{x:.6}Ga{:.6}As", 1.0 - x), "InP");
        let electron = BandOperator::conduction(&stack, ConductionModel::EnergyDependent).unwrap();
        let hole = BandOperator::new(&stack, Band::Hole(Hole::Light)).unwrap();
        let law = electron.fraction_slope(0, 0.0, Element::In);
        let [light, split_off] = law.poles.map(Option::unwrap);
        let slopes = [
            law.stiffness,
            light.strength,
            light.position,
            split_off.strength,
            split_off.position,
            hole.fraction_slope(0, 0.0, Element::In).stiffness,
        ];
        // Five points: fourth order.
        let h = 1e-3;
        let near = [at(x - h), at(x + h)];
        let far = [at(x - 2.0 * h), at(x + 2.0 * h)];
        for (k, slope) in slopes.into_iter().enumerate() {
            let difference =
                (8.0 * (near[1][k] - near[0][k]) - (far[1][k] - far[0][k])) / (12.0 * h);
            assert!(
                (slope - difference).abs() < 1e-7 * difference.abs().max(1e-2),
                "number {k} at {x}: {slope} for {difference}"
            );
        }
    }
}
