//! The material library against published values. Each expected number has its source beside it.
//!
//! "Table" stands for Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), whose values the library mostly
//! holds; a check against the table alone is a guard, a check against a measurement is said to be one.

use proptest::prelude::*;
use wellwright::materials::{
    Composition, Definition, Dual, Element, Family, Formula, KEYS, Key, Known, Library, Material,
    MaterialError, Origin, Substance, Valley, citation, monolayer_nm, source_keys, strain,
    strained,
};

const BINARIES: [&str; 9] = [
    "AlP", "GaP", "InP", "AlAs", "GaAs", "InAs", "AlSb", "GaSb", "InSb",
];

fn resolve(formula: &str, temperature_k: f64) -> Material {
    resolve_in(&Library::new(), formula, temperature_k)
}

fn resolve_in(library: &Library, formula: &str, temperature_k: f64) -> Material {
    library
        .resolve(&Composition::parse(formula).unwrap(), temperature_k)
        .unwrap()
}

fn close(found: Option<f64>, expected: f64, tolerance: f64) {
    let found = found.expect("a value");
    assert!(
        (found - expected).abs() <= tolerance,
        "found {found}, expected {expected} within {tolerance}"
    );
}

fn gap(formula: &str, temperature_k: f64) -> f64 {
    resolve(formula, temperature_k).gap_ev.unwrap()
}

fn offsets(upper: &str, lower: &str, temperature_k: f64) -> (f64, f64) {
    let (upper, lower) = (resolve(upper, temperature_k), resolve(lower, temperature_k));
    (
        upper.conduction_edge_ev.unwrap() - lower.conduction_edge_ev.unwrap(),
        lower.valence_edge_ev.unwrap() - upper.valence_edge_ev.unwrap(),
    )
}

fn definitions(list: &[(&str, Definition)]) -> Vec<(String, Definition)> {
    let owned = |(name, definition): &(&str, Definition)| ((*name).to_owned(), definition.clone());
    list.iter().map(owned).collect()
}

fn with(list: &[(&str, Definition)]) -> Library {
    Library::with_definitions(&definitions(list)).unwrap()
}

fn choosing(key: &str, alternative: &str) -> Definition {
    let mut definition = Definition::default();
    definition.choose(key, alternative).unwrap();
    definition
}

fn family(text: &str) -> Family {
    match Formula::parse(text).unwrap() {
        Formula::Open(family) => family,
        Formula::Complete(_) => panic!("{text} is complete"),
    }
}

// ---- Published values

#[test]
fn algaas_gaps_and_offsets() {
    // Table, evaluated independently: 1.937 eV at 0 K.
    assert!((gap("Al0.3Ga0.7As", 0.0) - 1.937).abs() < 5e-4);
    // Measured: El Allali and others, Phys. Rev. B 48, 4398 (1993), at 293 K for x < 0.44.
    let measured = gap("GaAs", 293.0) + 1.429 * 0.3 - 0.14 * 0.3 * 0.3;
    assert!((gap("Al0.3Ga0.7As", 293.0) - measured).abs() < 0.003);
    // Table: valence offset 0.159 eV (0.53 x), conduction offset 0.259 eV at 300 K.
    let (conduction, valence) = offsets("Al0.3Ga0.7As", "GaAs", 300.0);
    assert!((valence - 0.159).abs() < 5e-4);
    assert!((conduction - 0.259).abs() < 1e-3, "{conduction}");
}

#[test]
fn arsenides_on_inp() {
    // Table: 0.522 and 0.191 eV. Measured conduction offset 0.53 eV: Sugiyama and others, Jpn. J. Appl. Phys. (1986).
    let (conduction, valence) = offsets("Al0.48In0.52As", "In0.53Ga0.47As", 0.0);
    assert!((conduction - 0.522).abs() < 1e-3, "{conduction}");
    assert!((valence - 0.191).abs() < 1e-3, "{valence}");
    assert!((conduction - 0.53).abs() < 0.02);
    // Table 0.346 eV; measured 0.34 eV: Waldrop and others, J. Appl. Phys. 69, 372 (1991).
    let (_, valence) = offsets("InP", "In0.53Ga0.47As", 0.0);
    assert!((valence - 0.346).abs() < 1e-3, "{valence}");
}

#[test]
fn gainp_on_gaas_and_broken_gap() {
    // Table: 0.310 and 0.193 eV. Measured 0.285 and 0.198 eV: Biswas and others, Appl. Phys. Lett. (1990).
    let (conduction, valence) = offsets("Ga0.516In0.484P", "GaAs", 300.0);
    assert!((valence - 0.310).abs() < 1.5e-3, "{valence}");
    assert!((conduction - 0.193).abs() < 1.5e-3, "{conduction}");
    // Table: the valence edge of GaSb lies 0.143 eV above the conduction edge of InAs.
    let overlap = resolve("GaSb", 0.0).valence_edge_ev.unwrap()
        - resolve("InAs", 0.0).conduction_edge_ev.unwrap();
    assert!((overlap - 0.143).abs() < 5e-4, "{overlap}");
}

/// m₀/m of the Kane relation at 0 K.
fn kane_mass(material: &Material) -> f64 {
    let (gap, split) = (material.gap_ev.unwrap(), material.spin_orbit_ev.unwrap());
    let coupled =
        material.kane_energy_ev.unwrap() * (gap + 2.0 * split / 3.0) / (gap * (gap + split));
    1.0 / (1.0 + 2.0 * material.remote_band_f.unwrap() + coupled)
}

#[test]
fn edge_mass_follows_from_kane_parameters() {
    // Relation: table, eq. 2.15. The nine binaries hold it within 0.13 %, the two alloys on InP within rounding.
    for name in BINARIES {
        let material = resolve(name, 0.0);
        let ratio = kane_mass(&material) / material.electron_mass_m0.unwrap();
        assert!((ratio - 1.0).abs() < 2e-3, "{name}: {ratio}");
    }
    for (name, mass) in [("Ga0.47In0.53As", 0.0430), ("Al0.48In0.52As", 0.0733)] {
        let material = resolve(name, 0.0);
        close(material.electron_mass_m0, mass, 6e-5);
        assert!(
            (kane_mass(&material) - mass).abs() < 1e-4,
            "{name}: {}",
            kane_mass(&material)
        );
    }
    for name in ["Ga0.516In0.484P", "Ga0.5In0.5Sb", "InAs0.5Sb0.5"] {
        let material = resolve(name, 0.0);
        let ratio = kane_mass(&material) / material.electron_mass_m0.unwrap();
        assert!((ratio - 1.0).abs() < 2e-3, "{name}: {ratio}");
    }
}

#[test]
fn tabulated_remote_band_parameters_can_be_chosen() {
    // The mismatch of the tabulated bowing: +7 % at x = 0.516 (mass 0.0995 against 0.0928), -15 % for Ga0.5In0.5Sb
    // (0.0202 against 0.0239), -16 % for a linear law in InAs0.5Sb0.5 (0.0092 against 0.0110). Computed independently
    // from the table.
    for (entry, alternative, formula, mass) in [
        ("GaInP", "tabulated", "Ga0.516In0.484P", 0.0995),
        ("InGaSb", "tabulated", "Ga0.5In0.5Sb", 0.0202),
        ("InAsSb", "linear", "InAs0.5Sb0.5", 0.0092),
    ] {
        let library = with(&[(entry, choosing("remote_band_f", alternative))]);
        let found = kane_mass(&resolve_in(&library, formula, 0.0));
        assert!((found - mass).abs() < 1e-4, "{formula}: {found}");
    }
}

#[test]
fn pressure_moves_the_gap_as_measured() {
    // dEg/dP = -(a_c + a_v)/B with B = (c11 + 2 c12)/3, meV/kbar. GaP 10.7, GaSb 14.5 +-0.3 measured; GaAs 10.6 table.
    // A wrong sign of a_v would cost 3 meV/kbar in GaAs and more in GaP.
    for (name, expected, tolerance) in
        [("GaAs", 10.6, 0.1), ("GaP", 10.7, 0.6), ("GaSb", 14.5, 0.3)]
    {
        let m = resolve(name, 300.0);
        let bulk_gpa = (m.c11_gpa.unwrap() + 2.0 * m.c12_gpa.unwrap()) / 3.0;
        let potentials = m.hydrostatic_conduction_ev.unwrap() + m.hydrostatic_valence_ev.unwrap();
        // 0.1 GPa per kbar, 1000 meV per eV.
        let found = -potentials / bulk_gpa * 0.1 * 1e3;
        assert!((found - expected).abs() < tolerance, "{name}: {found}");
    }
}

#[test]
fn quaternaries_against_measured_laws() {
    // AlGaInAs on InP: Olego and others, Appl. Phys. Lett. 41, 476 (1982), 0.76 + 1.04 y + 0.87 y², 300 K, +-0.04 eV.
    // Found: -23 meV at the InGaAs end, -9 to +5 meV elsewhere.
    for step in 0..=10 {
        let z = f64::from(step) / 10.0;
        let (al, ga) = (0.48 * z, 0.47 * (1.0 - z));
        let found = gap(&format!("Al{al}Ga{ga}In{}As", 1.0 - al - ga), 300.0);
        let measured = 0.76 + 1.04 * al + 0.87 * al * al;
        assert!((found - measured).abs() < 0.04, "z {z}: {found} {measured}");
    }
    // GaInAsP on InP: Nahory and others, Appl. Phys. Lett. 33, 659 (1978), 1.35 - 0.72 y + 0.12 y² at 300 K.
    // Found: +3 meV at InP falling to -16 meV at InGaAs. Ga fraction of the match to InP: Levinshtein and others (1996).
    for step in 0..=10 {
        let y = f64::from(step) / 10.0;
        let ga = 0.1894 * y / (0.4184 - 0.013 * y);
        let found = gap(&format!("Ga{ga}In{}As{y}P{}", 1.0 - ga, 1.0 - y), 300.0);
        let measured = 1.35 - 0.72 * y + 0.12 * y * y;
        assert!((found - measured).abs() < 0.02, "y {y}: {found} {measured}");
    }
}

#[test]
fn hole_masses_of_the_alloy_on_inp() {
    // Table: Luttinger parameters of In0.53Ga0.47As near 11.0, 4.2, 4.9, which its bowed hole masses imply.
    let [gamma1, gamma2, gamma3] = resolve("In0.53Ga0.47As", 300.0).luttinger.unwrap();
    assert!(
        (gamma1 - 11.0).abs() < 0.1 && (gamma2 - 4.2).abs() < 0.1 && (gamma3 - 4.9).abs() < 0.1
    );
}

#[test]
fn phonon_law_of_algaas_is_the_published_polynomial() {
    // Adachi, J. Appl. Phys. 58, R1 (1985): 36.25 + 1.83 x + 17.12 x² - 5.11 x³ meV.
    for x in [0.0, 0.2, 0.5, 0.9, 1.0] {
        let expected = 36.25 + 1.83 * x + 17.12 * x * x - 5.11 * x * x * x;
        let found = resolve(&format!("Al{x}Ga{}As", 1.0 - x), 300.0).lo_phonon_ev;
        close(found, expected * 1e-3, 1e-9);
    }
}

#[test]
fn monolayers() {
    // a/2 in Å from the lattice constants of the table, InP that of Levinshtein and others (1996).
    for (name, half) in [
        ("GaAs", 2.8266),
        ("AlAs", 2.8306),
        ("InAs", 3.0292),
        ("InP", 2.9344),
        ("GaSb", 3.0480),
        ("AlSb", 3.0678),
    ] {
        let found = monolayer_nm(&resolve(name, 300.0), None);
        close(found.map(|nm| 10.0 * nm), half, 6e-5);
    }
    let library = with(&[("InP", choosing("lattice_constant", "Vurgaftman2001"))]);
    let found = monolayer_nm(&resolve_in(&library, "InP", 300.0), None);
    close(found.map(|nm| 10.0 * nm), 2.9348, 6e-5);
}

#[test]
fn strain_of_ingaas_on_gaas() {
    // Computed independently from the table with linear a_c: a 5.73426 Å, strains -0.014127 and +0.013426, trace
    // -0.014828, a along growth 5.81125 Å, conduction edge +100.12 meV, valence edge -16.73 meV, gap 1.13242 eV (300 K).
    let library = with(&[("InGaAs", choosing("hydrostatic_conduction", "linear"))]);
    let layer = resolve_in(&library, "In0.2Ga0.8As", 300.0);
    let substrate = 0.565325;
    close(layer.lattice_constant_nm, 0.573426, 5e-7);
    close(layer.gap_ev, 1.13242, 1e-5);
    let found = strain(&layer, substrate).unwrap();
    close(Some(found.in_plane), -0.014127, 5e-7);
    close(Some(found.growth), 0.013426, 5e-7);
    close(Some(found.trace()), -0.014828, 5e-7);
    close(monolayer_nm(&layer, Some(substrate)), 0.581125 / 2.0, 5e-7);
    let moved = strained(&layer, substrate);
    let shift = |a: Option<f64>, b: Option<f64>| Some(a.unwrap() - b.unwrap());
    close(
        shift(moved.conduction_edge_ev, layer.conduction_edge_ev),
        0.10012,
        1e-5,
    );
    close(
        shift(moved.valence_edge_ev, layer.valence_edge_ev),
        -0.01673,
        1e-5,
    );
    assert_eq!(moved.gap_ev, layer.gap_ev);
    // 1.22224 eV at 4 K, same source.
    close(
        resolve_in(&library, "In0.2Ga0.8As", 4.0).gap_ev,
        1.22224,
        1e-4,
    );
    // The bowed a_c of the table moves the edge by -7.17 instead of -6.75 eV times the trace: 6 meV.
    let bowed = strained(&resolve("In0.2Ga0.8As", 300.0), substrate);
    close(
        shift(bowed.conduction_edge_ev, moved.conduction_edge_ev),
        0.006,
        5e-4,
    );
}

#[test]
fn lattice_matched_fractions() {
    let library = Library::new();
    let lattice = |name| resolve(name, 300.0).lattice_constant_nm.unwrap();
    // From the lattice constants of the table and InP 5.8687 Å: In 0.5319 and 0.5227; with 5.8697 Å 0.5344 and 0.5252.
    for (text, on_inp, on_other) in [("InGaAs", 0.5319, 0.5344), ("AlInAs", 0.5227, 0.5252)] {
        for (lattice_nm, expected) in [(lattice("InP"), on_inp), (0.58697, on_other)] {
            let matched = library.match_to(&family(text), lattice_nm).unwrap();
            close(Some(matched.fraction(Element::In)), expected, 6e-5);
        }
    }
    // Levinshtein and others (1996): GaInP matches GaAs at 0.51 to 0.516.
    let gainp = library.match_to(&family("GaInP"), lattice("GaAs")).unwrap();
    assert!((0.51..0.52).contains(&gainp.fraction(Element::Ga)));
    // Quaternaries with one fraction open: y = 2.20 x for GaInAsP on InP, a textbook rule good to 2 %.
    let matched = library
        .match_to(&family("Ga0.25In0.75AsP"), lattice("InP"))
        .unwrap();
    close(Some(matched.fraction(Element::As)), 0.55, 0.02);
    let a = library
        .resolve(&matched, 300.0)
        .unwrap()
        .lattice_constant_nm;
    close(a, lattice("InP"), 1e-9);
    let matched = library
        .match_to(&family("Al0.2GaInAs"), lattice("InP"))
        .unwrap();
    assert_eq!(matched.fraction(Element::Al), 0.2);
    assert!(matches!(
        library.match_to(&family("InGaAs"), 0.7),
        Err(MaterialError::NoMatch { .. })
    ));
    assert!(matches!(
        library.match_to(&family("InGaAsP"), 0.587),
        Err(MaterialError::Underdetermined { open: 2, .. })
    ));
}

#[test]
fn side_valleys() {
    // Measured crossing of AlGaAs at x = 0.37 (2 K), the table's at 0.417; InSb is direct only with the handbook's order.
    let lowest = |formula| resolve(formula, 0.0).lowest_valley().unwrap().0;
    assert_eq!(lowest("Al0.40Ga0.60As"), Valley::Gamma);
    assert_eq!(lowest("Al0.43Ga0.57As"), Valley::X);
    for (name, valley) in [
        ("GaAs", Valley::Gamma),
        ("InSb", Valley::Gamma),
        ("GaSb", Valley::Gamma),
        ("AlAs", Valley::X),
        ("GaP", Valley::X),
        ("AlSb", Valley::X),
        ("AlP", Valley::X),
    ] {
        assert_eq!(lowest(name), valley, "{name}");
    }
    // Table: GaP 2.777 eV at 300 K by its own law; InP X 2.384 - 3.7e-4 T.
    close(resolve("GaP", 300.0).gap_ev, 2.777, 5e-4);
    close(resolve("GaP", 0.0).gap_ev, 2.886, 1e-12);
    close(resolve("InP", 300.0).gap_x_ev, 2.273, 1e-9);
}

// ---- Interpolation

/// Every number of a material in a fixed order.
fn numbers(m: &Material) -> Vec<f64> {
    let report = format!("{m:?}");
    report
        .split(|c: char| !(c.is_ascii_alphanumeric() || "+-.".contains(c)))
        .filter_map(|word| word.parse().ok())
        .collect()
}

#[test]
fn quaternaries_go_over_into_ternaries_and_binaries() {
    let tiny = 1e-9;
    let near = [
        // (near the edge or corner, on it as a quaternary, the lesser alloy)
        (
            format!("Al{tiny}Ga0.4In{}As", 0.6 - tiny),
            "Al0Ga0.4In0.6As",
            "Ga0.4In0.6As",
        ),
        (
            format!("Al{tiny}Ga{tiny}In{}As", 1.0 - 2.0 * tiny),
            "Al0Ga0In1As",
            "InAs",
        ),
        (
            format!("Ga0.3In0.7As{tiny}P{}", 1.0 - tiny),
            "Ga0.3In0.7As0P1",
            "Ga0.3In0.7P",
        ),
        (
            format!("Ga{tiny}In{}As{tiny}P{}", 1.0 - tiny, 1.0 - tiny),
            "Ga0In1As0P1",
            "InP",
        ),
        (
            format!("Ga{tiny}In{}As{}P{tiny}", 1.0 - tiny, 1.0 - tiny),
            "Ga0In1As1P0",
            "InAs",
        ),
        (
            format!("GaAs{tiny}P0.5Sb{}", 0.5 - tiny),
            "GaAs0P0.5Sb0.5",
            "GaP0.5Sb0.5",
        ),
        (format!("Al{tiny}Ga{}As", 1.0 - tiny), "Al0Ga1As", "GaAs"),
        (format!("InAs{}Sb{tiny}", 1.0 - tiny), "InAs1Sb0", "InAs"),
    ];
    for (near, on, lesser) in &near {
        let expected = resolve(lesser, 300.0);
        for formula in [near.as_str(), on] {
            let found = resolve(formula, 300.0);
            // Parameters that only some of the ends know are unknown in the larger alloy.
            let mut reduced = expected.clone();
            if found.electron_mass_x_m0.is_none() {
                reduced.electron_mass_x_m0 = None;
            }
            if found.electron_mass_l_m0.is_none() {
                reduced.electron_mass_l_m0 = None;
            }
            if found.density_of_states_mass_x_m0.is_none() {
                reduced.density_of_states_mass_x_m0 = None;
            }
            if found.density_of_states_mass_l_m0.is_none() {
                reduced.density_of_states_mass_l_m0 = None;
            }
            let (found, reduced) = (numbers(&found), numbers(&reduced));
            assert_eq!(found.len(), reduced.len(), "{formula}");
            for (a, b) in found.iter().zip(&reduced) {
                assert!((a - b).abs() < 1e-6 * (1.0 + b.abs()), "{formula}: {a} {b}");
            }
        }
    }
}

fn derivatives_agree(formula: &str, element: Element, temperature_k: f64) {
    let library = Library::new();
    let here = Composition::parse(formula).unwrap();
    let dual: Material<Dual> = library
        .resolve(&here.along(element).unwrap(), temperature_k)
        .unwrap();
    let step = 1e-5;
    let at = |shift: f64| {
        let mut there = here.clone();
        there
            .set_fraction(element, here.fraction(element) + shift)
            .unwrap();
        library.resolve(&there, temperature_k).unwrap()
    };
    let (low, high, middle) = (at(-step), at(step), at(0.0));
    let mut compared = 0;
    macro_rules! compare {
        ($($field:ident),*) => {$(
            if let (Some(d), Some(l), Some(h), Some(m)) = (dual.$field, low.$field, high.$field, middle.$field) {
                let difference = (h - l) / (2.0 * step);
                assert!((d.value - m).abs() < 1e-12 * (1.0 + m.abs()), "{} of {formula}", stringify!($field));
                assert!(
                    (d.slope - difference).abs() < 1e-6 * (1.0 + difference.abs()),
                    "{} of {formula}: {} {difference}", stringify!($field), d.slope
                );
                compared += 1;
            }
        )*};
    }
    compare!(
        lattice_constant_nm,
        gap_ev,
        gap_x_ev,
        gap_l_ev,
        spin_orbit_ev,
        electron_mass_m0,
        heavy_hole_mass_m0,
        light_hole_mass_m0,
        split_off_mass_m0,
        kane_energy_ev,
        remote_band_f,
        valence_edge_ev,
        conduction_edge_ev,
        hydrostatic_conduction_ev,
        hydrostatic_valence_ev,
        shear_b_ev,
        shear_d_ev,
        c11_gpa,
        c12_gpa,
        c44_gpa,
        permittivity_static,
        permittivity_optical,
        lo_phonon_ev,
        density_g_per_cm3
    );
    assert_eq!(compared, 24, "{formula}");
    let triple = |m: &Material, i: usize| m.luttinger.unwrap()[i];
    for (i, d) in dual.luttinger.unwrap().iter().enumerate() {
        let difference = (triple(&high, i) - triple(&low, i)) / (2.0 * step);
        assert!((d.slope - difference).abs() < 1e-5 * (1.0 + difference.abs()));
    }
}

#[test]
fn derivatives_are_those_of_central_differences() {
    derivatives_agree("Al0.26Ga0.74As", Element::Al, 77.0);
    derivatives_agree("Al0.26Ga0.74As", Element::Ga, 300.0);
    derivatives_agree("In0.53Ga0.47As", Element::In, 300.0);
    derivatives_agree("Ga0.516In0.484P", Element::Ga, 300.0);
    derivatives_agree("InAs0.91Sb0.09", Element::Sb, 300.0);
    derivatives_agree("In0.7Ga0.3As0.6P0.4", Element::In, 300.0);
    derivatives_agree("In0.7Ga0.3As0.6P0.4", Element::P, 300.0);
    derivatives_agree("Al0.2Ga0.27In0.53As", Element::Al, 300.0);
    derivatives_agree("Al0.2Ga0.27In0.53As", Element::In, 0.0);
}

#[test]
fn derivatives_hold_at_the_corners_of_quaternaries() {
    let library = Library::new();
    // One-sided differences towards the inside, the other fractions staying at their ends.
    for (corner, inside, element) in [
        ("Ga0In1As0P1", "Ga0.00001In0.99999As0P1", Element::Ga),
        ("Ga0In1As0P1", "Ga0In1As0.00001P0.99999", Element::As),
        ("Al0Ga0In1As", "Al0.00001Ga0In0.99999As", Element::Al),
    ] {
        let here = Composition::parse(corner).unwrap().along(element).unwrap();
        let slope = library.resolve(&here, 300.0).unwrap().gap_ev.unwrap().slope;
        let difference = (gap(inside, 300.0) - gap(corner, 300.0)) / 1e-5;
        assert!(
            (slope - difference).abs() < 1e-4,
            "{corner}: {slope} {difference}"
        );
    }
}

fn healthy(m: &Material) -> bool {
    numbers(m).iter().all(|n| n.is_finite()) && !format!("{m:?}").contains("NaN")
}

proptest! {
    #[test]
    fn every_pair_of_binaries_resolves(
        a in 0usize..9, b in 0usize..9, x in 0.0f64..=1.0, temperature in 0.0f64..600.0,
    ) {
        let library = Library::new();
        let ends = [BINARIES[a], BINARIES[b]].map(|n| Composition::parse(n).unwrap());
        let mix = ends[0].towards(&ends[1], x).unwrap();
        let material = library.resolve(&mix, temperature).unwrap();
        prop_assert!(healthy(&material), "{} at {temperature} K: {material:?}", mix.formula());
        for element in mix.elements() {
            if let Ok(along) = mix.along(*element) {
                let dual = library.resolve(&along, temperature).unwrap();
                let shown = format!("{dual:?}");
                prop_assert!(!shown.contains("NaN"), "{}", shown);
            }
        }
        // What is printed reads back as the same composition, to the digits that are printed.
        let read = Composition::parse(&mix.formula()).unwrap();
        for element in Element::ALL {
            prop_assert!((read.fraction(element) - mix.fraction(element)).abs() < 1.01e-5);
        }
    }

    #[test]
    fn quaternaries_on_one_sublattice_resolve(
        v in 0usize..6, x in 0.0f64..=1.0, share in 0.0f64..=1.0, temperature in 0.0f64..600.0,
    ) {
        let y = (1.0 - x) * share;
        let z = 1.0 - x - y;
        let formula = match v {
            0 => format!("Al{x:.9}Ga{y:.9}In{z:.9}P"),
            1 => format!("Al{x:.9}Ga{y:.9}In{z:.9}As"),
            2 => format!("Al{x:.9}Ga{y:.9}In{z:.9}Sb"),
            3 => format!("AlP{x:.9}As{y:.9}Sb{z:.9}"),
            4 => format!("GaP{x:.9}As{y:.9}Sb{z:.9}"),
            _ => format!("InP{x:.9}As{y:.9}Sb{z:.9}"),
        };
        let composition = Composition::parse(&formula).unwrap();
        let library = Library::new();
        let material = library.resolve(&composition, temperature).unwrap();
        prop_assert!(healthy(&material), "{} at {} K: {:?}", formula, temperature, material);
        prop_assert!(material.heavy_hole_mass_m0.unwrap() > 0.0);
        prop_assert!(material.light_hole_mass_m0.unwrap() > 0.0);
        prop_assert!(material.electron_mass_m0.unwrap() > 0.0, "{}", formula);
        for element in composition.elements() {
            if let Ok(along) = composition.along(*element) {
                let shown = format!("{:?}", library.resolve(&along, temperature).unwrap());
                prop_assert!(!shown.contains("NaN"), "{}", shown);
            }
        }
    }

    #[test]
    fn no_text_makes_a_formula_panic(text in "\\PC{0,12}") {
        let _ = Formula::parse(&text);
        let _ = Library::new().find(&text);
    }

    #[test]
    fn nearly_formulas_do_not_panic(text in "(Al|Ga|In|P|As|Sb|al|Ge|[0-9.]{1,4}|-|é){0,8}") {
        if let Err(error) = Library::new().find(&text) {
            let _ = (error.to_string(), error.hint());
        }
    }
}

#[test]
fn every_ternary_and_quaternary_end_resolves() {
    let library = Library::new();
    for a in BINARIES {
        for b in BINARIES {
            for x in [0.0, 1e-13, 1e-6, 0.5, 1.0 - 1e-13, 1.0] {
                for temperature in [0.0, 1e-3, 300.0, 600.0] {
                    let [a, b] = [a, b].map(|n| Composition::parse(n).unwrap());
                    let mix = a.towards(&b, x).unwrap();
                    assert!(healthy(&library.resolve(&mix, temperature).unwrap()));
                }
            }
        }
    }
    for temperature in [-1.0, f64::NAN, f64::INFINITY] {
        let gaas = Composition::parse("GaAs").unwrap();
        assert!(matches!(
            library.resolve(&gaas, temperature),
            Err(MaterialError::Temperature { .. })
        ));
    }
}

// ---- Formulas

#[test]
fn formulas_are_read_in_any_order_and_printed_plainly() {
    for (text, printed) in [
        ("Al0.26Ga0.74As", "Al0.26Ga0.74As"),
        ("AsGa0.74Al0.26", "Ga0.74Al0.26As"),
        ("In0.7Ga0.3As0.6P0.4", "In0.7Ga0.3As0.6P0.4"),
        ("P0.4In0.7As0.6Ga0.3", "In0.7Ga0.3P0.4As0.6"),
        ("Al0.2Ga0.27In0.53As", "Al0.2Ga0.27In0.53As"),
        ("AlP0.2As0.3Sb0.5", "AlP0.2As0.3Sb0.5"),
        ("Ga.333In.667P", "Ga0.333In0.667P"),
        ("GaAs", "GaAs"),
        ("Ga1As1", "GaAs"),
        ("Al0Ga1As", "GaAs"),
        ("Al0.3333333Ga0.6666667As", "Al0.33333Ga0.66667As"),
        (" InP ", "InP"),
    ] {
        assert_eq!(
            Composition::parse(text).unwrap().formula(),
            printed,
            "{text}"
        );
    }
}

#[test]
fn wrong_formulas_say_what_is_wrong() {
    let error = |text: &str| Formula::parse(text).unwrap_err();
    let says = |text: &str, parts: &[&str]| {
        let error = error(text);
        let whole = format!("{error}; {}", error.hint().unwrap_or_default());
        for part in parts {
            assert!(whole.contains(part), "{text}: {whole}");
        }
    };
    says("Al0.3Ga0.8As", &["Al and Ga", "1.1"]);
    says("Al0.3Ga0.69As", &["0.99"]);
    says("Al0.3GaAs", &["no fraction for Ga", "Al0.3Ga0.7As"]);
    says("Gl0.3As", &["`Gl`"]);
    says("gaas", &["`GaAs`"]);
    says("AL0.3GA0.7AS", &["`Al0.3Ga0.7As`"]);
    says("AlGa", &["group-V"]);
    says("As", &["group-III"]);
    says("GaGaAs", &["twice"]);
    says("AlGaInAsP", &["5 elements"]);
    says("Al1.3Ga0.7As", &["1.3"]);
    says("Al-0.3Ga1.3As", &["does not belong"]);
    says("Al0.3.1Ga0.6As", &["0.3.1"]);
    says("", &["does not belong"]);
    let open = Composition::parse("InGaAs").unwrap_err();
    assert!(open.hint().unwrap().contains("In0.3Ga0.7As"), "{open}");
    let open = Library::new()
        .match_to(&family("InGaAsP"), 0.58)
        .unwrap_err();
    assert!(
        open.hint().unwrap().contains("InGaAs0.6P0.4"),
        "{:?}",
        open.hint()
    );
    let open = Library::new()
        .match_to(&family("AlGaInAs"), 0.58)
        .unwrap_err();
    assert!(
        open.hint().unwrap().contains("Al0.2GaInAs"),
        "{:?}",
        open.hint()
    );
}

#[test]
fn unknown_names_are_met_with_what_was_meant() {
    let mut barrier = Definition::default();
    barrier.set("conduction_edge", &[0.23]).unwrap();
    let library = with(&[("Barrier", barrier)]);
    for (text, meant) in [
        ("Barier", "Barrier"),
        ("GsAs", "GaAs"),
        ("Galium", "Ga"),
        ("gaas", "GaAs"),
    ] {
        let error = library.find(text).unwrap_err();
        assert!(
            error.hint().unwrap().contains(meant),
            "{text}: {error} {:?}",
            error.hint()
        );
    }
    assert_eq!(
        library.find("Barrier"),
        Ok(Substance::Named("Barrier".to_owned()))
    );
}

#[test]
fn the_host_compensates() {
    let mut alloy = Composition::parse("Al0.26Ga0.74As").unwrap();
    alloy.set_fraction(Element::Al, 0.3).unwrap();
    assert_eq!(alloy.formula(), "Al0.3Ga0.7As");
    assert!(alloy.set_fraction(Element::Al, 1.1).is_err());
    assert!(alloy.set_fraction(Element::Al, f64::NAN).is_err());
    assert!(alloy.set_fraction(Element::In, 0.1).is_err());
    assert!(alloy.set_fraction(Element::As, 0.9).is_err());
    let mut three = Composition::parse("Al0.2Ga0.27In0.53As").unwrap();
    assert_eq!(three.host(Element::Al).unwrap(), Element::In);
    assert_eq!(three.host(Element::In).unwrap(), Element::Ga);
    three.set_fraction(Element::Al, 0.25).unwrap();
    assert_eq!(three.formula(), "Al0.25Ga0.27In0.48As");
    let middle = Composition::parse("GaAs")
        .unwrap()
        .towards(&Composition::parse("Al0.4Ga0.6As").unwrap(), 0.5)
        .unwrap();
    assert_eq!(middle.formula(), "Ga0.8Al0.2As");
}

// ---- Definitions

#[test]
fn own_materials() {
    let mut barrier = Definition::default();
    barrier.set("conduction_edge", &[0.23]).unwrap();
    barrier.set("electron_mass", &[0.0919]).unwrap();
    let mut ours = Definition::like("In0.53Ga0.47As");
    ours.set("gap", &[0.80]).unwrap();
    ours.set("luttinger", &[11.0, 4.2, 4.9]).unwrap();
    let mut theirs = Definition::like("Ours");
    theirs.set("conduction_edge", &[0.1]).unwrap();
    let library = with(&[("Theirs", theirs), ("Barrier", barrier), ("Ours", ours)]);
    let material = |name: &str| {
        library
            .material(&library.find(name).unwrap(), 77.0)
            .unwrap()
    };

    let barrier = material("Barrier");
    assert_eq!(barrier.conduction_edge_ev, Some(0.23));
    assert_eq!(barrier.electron_mass_m0, Some(0.0919));
    assert_eq!(barrier.gap_ev, None);
    let plain = resolve("In0.53Ga0.47As", 77.0);
    let ours = material("Ours");
    assert_eq!(ours.gap_ev, Some(0.80));
    close(
        ours.conduction_edge_ev,
        plain.valence_edge_ev.unwrap() + 0.80,
        1e-12,
    );
    close(ours.heavy_hole_mass_m0, 1.0 / (11.0 - 8.4), 1e-12);
    assert_eq!(ours.electron_mass_m0, plain.electron_mass_m0);
    let theirs = material("Theirs");
    assert_eq!(
        (theirs.gap_ev, theirs.conduction_edge_ev),
        (Some(0.80), Some(0.1))
    );
    let composition = library
        .composition(&library.find("Theirs").unwrap())
        .unwrap();
    assert_eq!(composition.formula(), "In0.53Ga0.47As");

    let rows = library
        .report(&library.find("Ours").unwrap(), 77.0)
        .unwrap();
    let origin = |key: &str| {
        rows.iter()
            .find(|r| r.key == key)
            .unwrap()
            .origin
            .to_string()
    };
    assert_eq!(origin("gap"), "structure file: Ours");
    assert_eq!(origin("conduction_edge"), "valence_edge + gap");
    assert_eq!(origin("heavy_hole_mass"), "from luttinger");
    assert!(
        origin("kane_energy").contains("InAs"),
        "{}",
        origin("kane_energy")
    );
}

#[test]
fn a_changed_binary_flows_into_its_alloys() {
    let mut gaas = Definition::default();
    gaas.set("gap", &[1.5]).unwrap();
    gaas.set("conduction_edge", &[0.75]).unwrap();
    let library = with(&[("GaAs", gaas)]);
    let changed = resolve_in(&library, "GaAs", 300.0);
    assert_eq!(
        (changed.gap_ev, changed.conduction_edge_ev),
        (Some(1.5), Some(0.75))
    );
    let (alloy, plain) = (
        resolve_in(&library, "Al0.3Ga0.7As", 300.0),
        resolve("Al0.3Ga0.7As", 300.0),
    );
    let raised = 1.5 - gap("GaAs", 300.0);
    close(alloy.gap_ev, plain.gap_ev.unwrap() + 0.7 * raised, 1e-12);
    // The edge set 0.05 eV above valence edge + gap stays so for the GaAs share of the alloy.
    let sum = alloy.valence_edge_ev.unwrap() + alloy.gap_ev.unwrap();
    close(alloy.conduction_edge_ev, sum + 0.7 * 0.05, 1e-12);
}

#[test]
fn alternatives_and_bowings() {
    let library = with(&[("InGaAs", choosing("valence_edge", "linear"))]);
    // Linear between the ends: 0.53 (-0.59) + 0.47 (-0.80).
    close(
        resolve_in(&library, "In0.53Ga0.47As", 0.0).valence_edge_ev,
        0.53 * -0.59 + 0.47 * -0.80,
        1e-12,
    );
    let mut bowed = Definition::default();
    bowed.set_bowing("gap", 0.45).unwrap();
    let library = with(&[("InGaAs", bowed)]);
    let raised = (0.477 - 0.45) * 0.53 * 0.47;
    close(
        resolve_in(&library, "In0.53Ga0.47As", 0.0).gap_ev,
        gap("In0.53Ga0.47As", 0.0) + raised,
        1e-12,
    );
    let row = |library: &Library| {
        let substance = library.find("In0.53Ga0.47As").unwrap();
        let rows = library.report(&substance, 0.0).unwrap();
        rows.into_iter().find(|r| r.key == "gap").unwrap()
    };
    assert!(row(&library).origin.to_string().contains("structure file"));
    // GaP: the tabulated third Luttinger parameter gives a negative mass along [111]; the one in use does not.
    let [g1, _, g3] = resolve("GaP", 300.0).luttinger.unwrap();
    assert!(g1 - 2.0 * g3 > 0.0);
    let library = with(&[("GaP", choosing("luttinger", "tabulated"))]);
    assert_eq!(
        resolve_in(&library, "GaP", 300.0).luttinger.unwrap()[2],
        2.93
    );
}

#[test]
fn every_alternative_can_be_chosen() {
    for entry in Library::new().entries().unwrap() {
        for alternative in &entry.alternatives {
            let library = with(&[(entry.name, choosing(alternative.key, &alternative.name))]);
            assert!(library.entries().is_ok());
        }
    }
}

#[test]
fn wrong_definitions_are_all_reported_with_their_place() {
    let like = Definition::like;
    let mut valued = Definition::default();
    valued.set("gap", &[0.7]).unwrap();
    let mut bowed = Definition::default();
    bowed.set_bowing("gap", 0.7).unwrap();
    let problems = Library::with_definitions(&definitions(&[
        ("A", like("B")),
        ("B", like("A")),
        ("C", like("Gaas")),
        ("GaAs", like("InAs")),
        ("InGaAs", choosing("valence_edge", "straight")),
        ("AlInAs", valued),
        ("InP", bowed),
        ("Al0.3Ga0.7As", Definition::default()),
        ("D", like("InGaAs")),
        ("E", choosing("gap", "x")),
    ]))
    .unwrap_err();
    let found: Vec<_> = problems
        .iter()
        .map(|p| (p.name.as_str(), p.path.as_slice()))
        .collect();
    let expected: Vec<(&str, &[&str])> = vec![
        ("GaAs", &["like"]),
        ("InGaAs", &["choose", "valence_edge"]),
        ("AlInAs", &["gap"]),
        ("InP", &["bowing"]),
        ("Al0.3Ga0.7As", &[]),
        ("E", &["choose"]),
        ("A", &["like"]),
        ("B", &["like"]),
        ("C", &["like"]),
        ("D", &["like"]),
    ];
    assert_eq!(found, expected);
    assert!(problems[1].error.hint().unwrap().contains("linear"));
}

#[test]
fn wrong_values_are_refused() {
    let mut definition = Definition::default();
    assert!(matches!(
        definition.set("gapp", &[1.0]),
        Err(MaterialError::UnknownKey {
            meant: Some("gap"),
            ..
        })
    ));
    assert!(matches!(
        definition.set("luttinger", &[1.0]),
        Err(MaterialError::WrongCount {
            expected: 3,
            found: 1,
            ..
        })
    ));
    for wrong in [-1.0, f64::NAN, 1e9] {
        assert!(matches!(
            definition.set("electron_mass", &[wrong]),
            Err(MaterialError::OutOfRange { .. })
        ));
    }
    assert!(matches!(
        definition.set_bowing("luttinger", 1.0),
        Err(MaterialError::NoBowing { .. })
    ));
    assert!(definition.set_bowing("gap", f64::INFINITY).is_err());
}

// ---- The embedded tables

#[test]
fn keys_stand_at_the_place_of_their_parameter() {
    for key in &KEYS {
        assert_eq!(key.parameter.key().name, key.name);
        assert_eq!(Key::find(key.name).unwrap().parameter, key.parameter);
    }
}

#[test]
fn every_table_is_sound() {
    // Reading refuses unknown keys, missing units and values outside the range of their key.
    let library = Library::new();
    let entries = library.entries().unwrap();
    assert_eq!(entries.iter().filter(|e| e.of.is_none()).count(), 9);
    assert_eq!(entries.iter().filter(|e| e.of.is_some()).count(), 18);
    assert!(source_keys().count() > 10);
    let cited = |source: &str| {
        assert!(
            citation(source).is_some(),
            "{source} is not in sources.yaml"
        )
    };
    let mut used = std::collections::BTreeSet::new();
    for entry in &entries {
        for alternative in &entry.alternatives {
            cited(&alternative.source);
            used.insert(alternative.source.clone());
        }
    }
    for a in BINARIES {
        for b in BINARIES {
            let [a, b] = [a, b].map(|n| Composition::parse(n).unwrap());
            let mix = a.towards(&b, 0.5).unwrap();
            for row in library.report(&Substance::Alloy(mix), 300.0).unwrap() {
                match row.origin {
                    Origin::Tabulated(source) => {
                        cited(&source);
                        assert!(matches!(
                            row.known,
                            Some(Known::Seen | Known::Computed | Known::FromMemory)
                        ));
                        used.insert(source);
                    }
                    Origin::Interpolated { sources, .. } => {
                        sources.iter().for_each(|s| cited(s));
                        used.extend(sources);
                    }
                    Origin::Derived(relation) => assert!(!relation.is_empty()),
                    Origin::Definition(name) => panic!("{name} is not of the library"),
                }
            }
        }
    }
    for source in source_keys() {
        assert!(used.contains(source), "{source} is cited nowhere");
    }
    // What every binary must have for all models.
    for name in BINARIES {
        let rows = library.report(&library.find(name).unwrap(), 300.0).unwrap();
        for key in KEYS.iter().map(|k| k.name) {
            let optional = matches!(
                key,
                "electron_mass_x"
                    | "electron_mass_l"
                    | "density_of_states_mass_x"
                    | "density_of_states_mass_l"
                    | "nonparabolicity_energy"
            );
            assert!(
                optional || rows.iter().any(|r| r.key == key),
                "{name} lacks {key}"
            );
        }
    }
}
