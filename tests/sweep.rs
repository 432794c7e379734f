//! Sweeps against closed forms, a published pair of wells and the program's own single solves; slices, threads, bad input.

mod common;

use common::{Bench, Ran, list, number};
use serde_json::Value;
use wellwright::constants::HBAR2_OVER_2M0;

/// A layer between hard walls, of one mass.
const BOX: &str = "\
field: 0 kV/cm
bands: {conduction: {model: parabolic, states: 4}}
materials:
  Box: {conduction_edge: 0 eV, electron_mass: 0.067}
layers:
  - {name: box, material: Box, width: 10 nm}
";

/// Two wells of different widths behind a barrier that hardly lets through.
const PAIR: &str = "\
title: Pair
substrate: GaAs
temperature: 10 K
bands: {conduction: {model: parabolic, states: 3}}
layers:
  - {name: bottom, material: Al0.3Ga0.7As, width: 15 nm}
  - {name: wide, material: GaAs, width: 10 nm}
  - {name: barrier, material: Al0.3Ga0.7As, width: 7 nm}
  - {name: narrow, material: GaAs, width: 7 nm}
  - {name: top, material: Al0.3Ga0.7As, width: 15 nm}
";

const PAIR_SWEEP: &str = "sweep: {vary: {field: [-40 kV/cm, 20 kV/cm]}, points: 23}\n";

fn bench(text: &str) -> Bench {
    let bench = Bench::new();
    bench.write("stack.yaml", text);
    bench
}

/// A sweep of one file, as JSON.
#[track_caller]
fn swept(text: &str) -> Value {
    sweep(&bench(text), &["--format", "json"]).json()
}

#[track_caller]
fn sweep(bench: &Bench, arguments: &[&str]) -> Ran {
    let mut all = vec!["sweep", "stack.yaml"];
    all.extend(arguments);
    bench.run(&all).code(0)
}

/// One number of every level at a point.
fn of_levels(point: &Value, key: &str) -> Vec<f64> {
    list(point, "levels")
        .iter()
        .map(|l| number(l, key))
        .collect()
}

#[track_caller]
fn near(found: f64, expected: f64, tolerance: f64) {
    assert!(
        (found - expected).abs() <= tolerance,
        "{found} for {expected}"
    );
}

/// Hard walls: E_n = ħ²π²n²/2mL², z12 = 16L/9π², f12 = 256/27π² · m0/m (any textbook; 30 digits in closed_forms.json).
#[test]
fn a_box_follows_the_square_of_its_width() {
    let text = "sweep: {vary: {layer: box, width: [5 nm, 20 nm]}, points: 5, steps: logarithmic}\n";
    let file = swept(&format!("{BOX}{text}"));
    let pi = std::f64::consts::PI;
    for (point, width_nm) in list(&file, "points")
        .iter()
        .zip([5.0, 7.0710678, 10.0, 14.142136, 20.0])
    {
        near(number(point, "at"), width_nm, 1e-6);
        let width_nm = number(point, "at");
        for (n, mev) in (1..=4).zip(of_levels(point, "from_edge_meV")) {
            let wave = f64::from(n) * pi / width_nm;
            near(mev, 1e3 * HBAR2_OVER_2M0 / 0.067 * wave * wave, 1e-3);
        }
        let first = &list(point, "transitions")[0];
        near(
            number(first, "dipole_nm"),
            16.0 * width_nm / (9.0 * pi * pi),
            1e-6 * width_nm,
        );
        near(
            number(first, "oscillator_strength"),
            256.0 / (27.0 * pi * pi) / 0.067,
            1e-5,
        );
        near(
            number(first, "wavelength_um") * number(first, "energy_meV"),
            1_239.841_984,
            1e-5,
        );
    }
    assert_eq!(list(&file, "anticrossings"), &[] as &[Value]);
    assert_eq!(list(&file, "points").len(), 5);
}

/// Airy determinant with 30 digits (tests/reference/closed_forms.py), zero of energy at the middle of the box.
#[test]
fn a_box_in_a_field_has_the_levels_of_airy_functions() {
    let file = swept(&format!(
        "{BOX}sweep: {{vary: {{field: [0 kV/cm, 100 kV/cm]}}, points: 6}}\n"
    ));
    let points = list(&file, "points");
    for (point, expected) in [
        (1, [56.046741123417, 224.51861701645, 505.12885512606]),
        (5, [54.206226569685, 225.05951209959, 505.45756433981]),
    ] {
        let levels = of_levels(&points[point], "from_middle_meV");
        for (mev, expected) in levels.into_iter().zip(expected) {
            near(mev, expected, 1e-3);
        }
    }
}

/// E_n = −a_n (ħ²e²F²/2m)^(1/3) above the wall's foot, a_n the zeros of Ai (Abramowitz and Stegun 1964, table 10.13).
#[test]
fn a_triangular_well_follows_the_two_thirds_power_of_the_field() {
    let file = swept(&format!(
        "{}sweep: {{vary: {{field: [20 kV/cm, 80 kV/cm]}}, points: 3}}\n",
        BOX.replace("width: 10 nm", "width: 90 nm")
    ));
    for (point, field) in list(&file, "points").iter().zip([2e-3_f64, 5e-3, 8e-3]) {
        let scale = (HBAR2_OVER_2M0 / 0.067 * field * field).cbrt();
        for (mev, zero) in of_levels(point, "from_edge_meV").into_iter().zip([
            2.338_107_41,
            4.087_949_44,
            5.520_559_83,
            6.786_708_09,
        ]) {
            near(mev, 1e3 * scale * zero, 1e-3);
        }
    }
}

/// Equal wells are in resonance without a field; the gap there is 18.600 853 442 589 meV by the closed form of a double
/// well with 60/20/60 Å, 0.25 eV, masses 0.067 and 0.09 (tests/reference/closed_forms.py).
#[test]
fn equal_wells_anticross_without_field() {
    let text = "\
bands: {conduction: {model: parabolic, states: 2}}
materials:
  W: {conduction_edge: 0 eV, electron_mass: 0.067}
  B: {conduction_edge: 0.25 eV, electron_mass: 0.09}
layers:
  - {material: B, width: 30 nm}
  - {material: W, width: 6 nm}
  - {material: B, width: 2 nm}
  - {material: W, width: 6 nm}
  - {material: B, width: 30 nm}
sweep: {vary: {field: [-53 kV/cm, 57 kV/cm]}, points: 7}
";
    let file = swept(text);
    let [row] = list(&file, "anticrossings") else {
        panic!("{file}");
    };
    near(number(row, "gap_meV"), 18.600853442589, 1e-5);
    near(number(row, "at"), 0.0, 0.02);
    assert_eq!(
        (&row["one"], &row["other"]),
        (&"conduction 1".into(), &"conduction 2".into())
    );
    assert_eq!(row["settled"], true);
}

/// Leo et al., Phys. Rev. Lett. 66, 201 (1991), from memory: 170/17/120 Å with Al0.35Ga0.65As oscillate with 1.3 ps at
/// resonance, within 10 %. Beside it the gap of an independent program with the parameters of Vurgaftman et al. (2001),
/// 3.36 meV, at 0 K and without strain.
#[test]
fn a_published_pair_of_wells_has_its_gap() {
    let text = "\
temperature: 0 K
bands: {conduction: {model: parabolic, states: 2}}
layers:
  - {material: Al0.35Ga0.65As, width: 25 nm}
  - {material: GaAs, width: 17 nm}
  - {material: Al0.35Ga0.65As, width: 1.7 nm}
  - {material: GaAs, width: 12 nm}
  - {material: Al0.35Ga0.65As, width: 25 nm}
sweep: {vary: {field: [-16 kV/cm, 2 kV/cm]}, points: 10}
";
    let file = swept(text);
    let [row] = list(&file, "anticrossings") else {
        panic!("{file}");
    };
    let gap_mev = number(row, "gap_meV");
    near(4.135_667_7 / gap_mev, 1.3, 0.13);
    near(gap_mev, 3.36, 0.02);
}

/// Two-level model (von Neumann and Wigner 1929): g² = Δ² + (e d δF)² beside the resonance, d the distance between the
/// centres of the two wells' states. Its gaps are those of single solves.
#[test]
fn names_go_with_the_wells_through_a_crossing() {
    let file = swept(&format!("{PAIR}{PAIR_SWEEP}"));
    let crossings = list(&file, "anticrossings");
    let row = crossings
        .iter()
        .find(|row| row["levels"][0] == "conduction 1")
        .unwrap();
    let (at, gap_mev) = (number(row, "at"), number(row, "gap_meV"));
    assert!(gap_mev < 0.5, "{gap_mev}");
    let points = list(&file, "points");
    let solved = |field: f64| -> Value {
        let bench = bench(&format!("{PAIR}field: {field} kV/cm\n"));
        let ran = bench.run(&["levels", "stack.yaml", "--format", "json"]);
        ran.code(0).json()
    };
    let distance = |levels: &Value| number(&list(levels, "transitions")[0], "energy_meV");
    near(distance(&solved(at)), gap_mev, 1e-5);
    for aside in [-1.0, 1.0] {
        let levels = solved(at + aside);
        let centre = |k: usize| number(&list(&levels, "subbands")[k], "centre_nm");
        // 1 kV/cm over 1 nm is 0.1 meV.
        let shift_mev = 0.1 * aside * (centre(1) - centre(0));
        near(distance(&levels) / gap_mev.hypot(shift_mev), 1.0, 0.02);
    }
    // The layers that hold the states, by single solves at both ends.
    let mut seen = Vec::new();
    for levels in [solved(-40.0), solved(20.0)] {
        let layer = |k: usize| {
            let state = &list(&levels, "subbands")[k];
            state["layer"].as_str().unwrap().to_owned()
        };
        seen.push([layer(0), layer(1)]);
    }
    assert_eq!(seen[0][0], seen[1][1]);
    assert_eq!(seen[0][1], seen[1][0]);
    for point in points {
        let levels = list(point, "levels");
        let expected = if number(point, "at") < at {
            ["conduction 1", "conduction 2"]
        } else {
            ["conduction 2", "conduction 1"]
        };
        for (level, expected) in levels.iter().zip(expected) {
            assert_eq!(level["follows"], expected, "{point}");
        }
        let first = &list(point, "transitions")[0];
        assert_eq!(first["from_follows"], expected[0]);
        assert_eq!(first["to_follows"], expected[1]);
    }
}

/// Every point is the file solved with the value written into it.
#[test]
fn points_are_single_solves() {
    let pair = PAIR.replace(
        "states: 3}",
        "states: 2}, valence: {model: decoupled, states: 2}",
    );
    for (vary, place, written) in [
        (
            "{temperature: [10 K, 250 K]}",
            "temperature: 10 K",
            "temperature: 250 K",
        ),
        (
            "{layer: wide, width: [20 ML, 40 ML]}",
            "width: 10 nm",
            "width: 40 ML",
        ),
        (
            "{layer: barrier, fraction: Al, between: [0.2, 0.35]}",
            "{name: barrier, material: Al0.3Ga0.7As",
            "{name: barrier, material: Al0.35Ga0.65As",
        ),
    ] {
        let file = swept(&format!("{pair}sweep: {{vary: {vary}, points: 3}}\n"));
        let last = list(&file, "points").last().unwrap();
        let bench = bench(&pair.replace(place, written));
        let levels = bench
            .run(&["levels", "stack.yaml", "--format", "json"])
            .code(0)
            .json();
        for row in list(&levels, "subbands") {
            let name = format!("{} {}", row["band"].as_str().unwrap(), row["index"]);
            let own = list(last, "levels")
                .iter()
                .find(|l| l["level"] == *name)
                .unwrap();
            near(number(own, "energy_eV"), number(row, "energy_eV"), 1e-9);
            near(
                number(own, "from_edge_meV"),
                number(row, "from_edge_meV"),
                1e-6,
            );
        }
        // Neighbouring levels are shown: the gap and inside the band.
        let transitions = list(last, "transitions");
        assert_eq!(transitions.len(), 2);
        for own in transitions {
            let rows = list(&levels, "transitions")
                .iter()
                .chain(list(&levels, "interband"));
            let mut rows = rows.filter(|row| row["from"] == own["from"] && row["to"] == own["to"]);
            let row = rows.next().unwrap();
            for key in [
                "energy_meV",
                "wavelength_um",
                "dipole_nm",
                "oscillator_strength",
                "overlap",
                "te_Ep",
            ] {
                if own.get(key).is_some() {
                    near(number(own, key), number(row, key), 1e-6);
                }
            }
        }
    }
}

#[test]
fn slices_join_to_the_bytes_of_the_whole() {
    let bench = bench(&format!("{PAIR}{PAIR_SWEEP}"));
    let whole = sweep(&bench, &["--format", "csv"]).stdout;
    assert_eq!(whole.lines().count(), 24);
    let header = whole.lines().next().unwrap();
    assert!(
        header.starts_with("field_kV_cm,conduction_1_energy_eV,"),
        "{header}"
    );
    // Both names of the lowest level occur, so that a slice that began to count anew would show.
    let column = header
        .split(',')
        .position(|c| c == "conduction_1_follows")
        .unwrap();
    let names = whole
        .lines()
        .skip(1)
        .map(|line| line.split(',').nth(column).unwrap());
    let names: std::collections::BTreeSet<&str> = names.collect();
    assert_eq!(names.into_iter().collect::<Vec<_>>(), ["1", "2"]);
    for of in [1, 3, 7, 30] {
        let slices = (1..=of).map(|index| {
            let part = format!("{index}/{of}");
            sweep(&bench, &["--format", "csv", "--part", &part]).stdout
        });
        assert_eq!(slices.collect::<String>(), whole, "{of} slices");
    }
    sweep(
        &bench,
        &["--format", "csv", "--part", "2/3", "-o", "second.csv"],
    );
    assert!(whole.contains(&bench.read("second.csv")));
}

#[test]
fn neither_threads_nor_points_change_what_is_followed() {
    let bench = bench(&format!("{PAIR}{PAIR_SWEEP}"));
    let one = sweep(&bench, &["--format", "json", "--threads", "1"]).stdout;
    for threads in ["2", "5"] {
        assert_eq!(
            sweep(&bench, &["--format", "json", "--threads", threads]).stdout,
            one
        );
    }
    let more = sweep(&bench, &["--format", "json", "--points", "50"]).json();
    let one: Value = serde_json::from_str(&one).unwrap();
    assert_eq!(more["anticrossings"], one["anticrossings"]);
    assert_eq!(list(&more, "points").len(), 50);
}

/// A remote-band term that makes the mass of GaAs negative, and with more aluminium positive again: the first points have
/// no solution and stay in the list.
#[test]
fn points_without_a_solution_are_marked() {
    let text = "\
bands: {conduction: {model: energy-dependent, states: 2}}
materials:
  GaAs: {remote_band_f: -10.5}
layers:
  - {material: Al0.5Ga0.5As, width: 20 nm}
  - {name: well, material: Al0.3Ga0.7As, width: 10 nm}
  - {material: Al0.5Ga0.5As, width: 20 nm}
sweep: {vary: {layer: well, fraction: Al, between: [0, 0.4]}, points: 9}
";
    let bench = bench(text);
    let ran = sweep(&bench, &["--format", "json"]);
    let file = ran.json();
    let points = list(&file, "points");
    assert_eq!(points.len(), 9);
    assert!(
        points[0]["not_solved"]
            .as_str()
            .unwrap()
            .contains("not positive")
    );
    assert_eq!(list(&points[0], "levels"), &[] as &[Value]);
    assert!(points[8].get("not_solved").is_none());
    assert_eq!(list(&points[8], "levels").len(), 2);
    assert!(
        ran.stderr.contains("of 9 points cannot be solved"),
        "{}",
        ran.stderr
    );
    let csv = sweep(&bench, &["--format", "csv"]).stdout;
    assert_eq!(csv.lines().count(), 10);
    assert!(csv.lines().nth(1).unwrap().contains("not positive"));
    let table = sweep(&bench, &[]).stdout;
    assert!(
        table.contains("of 9 points cannot be solved (-), the first at 0:"),
        "{table}"
    );
    sweep(&bench, &["-o", "levels.svg"]);
    // Nowhere is another matter.
    let nowhere = common::Bench::new();
    nowhere.write("stack.yaml", text.replace("[0, 0.4]", "[0, 0.05]"));
    let ran = nowhere.run(&["sweep", "stack.yaml"]).code(2);
    assert!(ran.stderr.contains("not positive"), "{}", ran.stderr);
}

#[test]
fn doping_is_swept_with_a_warning() {
    let text = format!(
        "{PAIR}sweep: {{vary: {{layer: wide, donors: [1e16 cm^-3, 1e18 cm^-3]}}, points: 3, steps: logarithmic}}\n"
    );
    let ran = sweep(&bench(&text), &["--format", "json"]);
    assert!(
        ran.stderr.contains("the levels do not depend on doping"),
        "{}",
        ran.stderr
    );
    let table = sweep(&bench(&text), &[]).stdout;
    assert!(
        table.contains("donors of wide from 1e16 to 1e18 cm^-3, 3 points"),
        "{table}"
    );
    let file = ran.json();
    let at: Vec<f64> = list(&file, "points")
        .iter()
        .map(|p| number(p, "at"))
        .collect();
    assert_eq!(at, [1e16, 1e17, 1e18]);
    assert_eq!(list(&file, "anticrossings"), &[] as &[Value]);
}

/// Gauss's law: between two empty wells on either side of donors and of the electrons that they gave, the potential
/// makes a step of e²N d/ε, d from the middle of the donors to the middle of the electrons. A well of 4 nm moves its
/// electrons towards the donors by less than 0.02 nm of these 10 nm, in proportion to the density.
#[test]
fn levels_follow_the_doping_where_charge_bends_the_bands() {
    let text = "\
temperature: 4 K
bands: {conduction: {model: parabolic, states: 3}}
materials:
  W: {conduction_edge: 0 eV, electron_mass: 0.067, permittivity_static: 12}
  B: {conduction_edge: 0.3 eV, electron_mass: 0.067, permittivity_static: 12}
layers:
  - {material: B, width: 15 nm}
  - {name: before, material: W, width: 2 nm}
  - {material: B, width: 14 nm}
  - {name: supply, material: B, width: 2 nm, donors: 1e18 cm^-3}
  - {material: B, width: 7 nm}
  - {name: filled, material: W, width: 4 nm}
  - {material: B, width: 15 nm}
  - {name: behind, material: W, width: 2 nm}
  - {material: B, width: 15 nm}
sweep:
  vary: {layer: supply, donors: [1e17 cm^-3, 4e17 cm^-3]}
  points: 4
  show: [{from: conduction 2, to: conduction 3}]
";
    let bench = bench(text);
    let ran = sweep(&bench, &["--format", "json"]);
    assert!(!ran.stderr.contains("flat"), "{}", ran.stderr);
    // e/ε0 in V nm (CODATA 2018).
    let per_charge = 1.602_176_634e-19 / 8.854_187_812_8e-12 * 1e9;
    for point in list(&ran.json(), "points") {
        let sheet_per_nm2 = number(point, "at") * 1e-21 * 2.0;
        let step_mev = 1e3 * per_charge * sheet_per_nm2 * 10.0 / 12.0;
        let found_mev = number(&list(point, "transitions")[0], "energy_meV");
        near(found_mev / step_mev, 1.0, 2e-3);
    }
}

/// The hint used to lead into an error: nothing in the file is doped that `fermi_level: neutral` could balance.
#[test]
fn a_sweep_of_doping_in_an_undoped_file_says_what_makes_it_count() {
    let text = format!(
        "{PAIR}sweep: {{vary: {{layer: wide, donors: [1e16 cm^-3, 1e18 cm^-3]}}, points: 3}}\n"
    );
    let ran = sweep(&bench(&text), &["--format", "csv"]);
    assert!(
        ran.stderr.contains("state a density in the layer too"),
        "{}",
        ran.stderr
    );
    let doped = text.replace(
        "GaAs, width: 10 nm",
        "GaAs, width: 10 nm, donors: 1e16 cm^-3",
    );
    let ran = sweep(&bench(&doped), &["--format", "csv"]);
    assert!(!ran.stderr.contains("flat"), "{}", ran.stderr);
}

#[test]
fn mistakes_in_the_block_are_told_with_their_place() {
    for (block, place, message) in [
        (
            "vary: {layer: box, width: [9 nm, 3 nm]}",
            "7:35",
            "the bounds are reversed",
        ),
        (
            "vary: {layer: box, width: [3 nm, 3 nm]}",
            "7:35",
            "nothing can vary",
        ),
        (
            "vary: {layer: bux, width: [3 nm, 9 nm]}",
            "7:23",
            "did you mean `box`?",
        ),
        (
            "vary: {layer: cap, width: [3 nm, 9 nm]}",
            "7:23",
            "no layer is named `cap`",
        ),
        (
            "vary: {layer: box, width: [3, 9 nm]}",
            "7:36",
            "has no unit",
        ),
        (
            "vary: {layer: box, width: [0 nm, 9 nm]}",
            "7:36",
            "out of range",
        ),
        (
            "vary: {layer: box, width: [-3 nm, 9 nm]}",
            "7:36",
            "out of range",
        ),
        (
            "vary: {layer: box, width: [3 nm, NaN nm]}",
            "7:42",
            "expected a length",
        ),
        (
            "vary: {layer: box, width: [3 nm]}",
            "7:35",
            "1 bounds stand here",
        ),
        ("vary: {temperature: [4 K, 3000 K]}", "7:35", "out of range"),
        ("vary: {temperature: [-4 K, 300 K]}", "7:30", "out of range"),
        (
            "vary: {layer: box, temperature: [4 K, 300 K]}",
            "7:15",
            "the same temperature",
        ),
        (
            "vary: {temperatur: [4 K, 300 K]}",
            "7:16",
            "did you mean `temperature`?",
        ),
        (
            "vary: {layer: box, donors: [1e17 cm^-3, 1e16 cm^-3]}",
            "7:36",
            "the bounds are reversed",
        ),
        (
            "vary: {donors: [1e16 cm^-3, 1e17 cm^-3]}",
            "7:15",
            "has no `layer`",
        ),
        (
            "vary: {layer: box, width: [3 nm, 9 nm], donors: [1e16 cm^-3, 1e17 cm^-3]}",
            "7:15",
            "at once",
        ),
        ("vary: {layer: box}", "7:15", "does not say what to sweep"),
        (
            "vary: [{layer: box, width: [3 nm, 9 nm]}]",
            "7:15",
            "expected `vary`, a mapping",
        ),
        ("points: 20", "7:8", "`sweep` has no `vary`"),
        (
            "vary: {field: [0 kV/cm, 9 kV/cm]}, points: 1",
            "7:52",
            "out of range",
        ),
        (
            "vary: {field: [0 kV/cm, 9 kV/cm]}, points: 2.5",
            "7:52",
            "no whole number",
        ),
        (
            "vary: {field: [0 kV/cm, 9 kV/cm]}, points: 1e9",
            "7:52",
            "out of range",
        ),
        (
            "vary: {field: [0 kV/cm, 9 kV/cm]}, steps: logarithmic",
            "7:51",
            "no logarithmic steps",
        ),
        (
            "vary: {field: [0 kV/cm, 9 kV/cm]}, steps: log",
            "7:51",
            "expected `even` or `logarithmic`",
        ),
        (
            "vary: {field: [0 kV/cm, 9 kV/cm]}, show: []",
            "7:50",
            "0 transitions",
        ),
        (
            "vary: {field: [0 kV/cm, 9 kV/cm]}, show: [{from: conduction 1, to: conduction 1}]",
            "7:76",
            "from a level to itself",
        ),
        (
            "vary: {field: [0 kV/cm, 9 kV/cm]}, show: [{from: heavy-hole 1, to: conduction 1}]",
            "7:58",
            "is not solved",
        ),
    ] {
        let bench = bench(&format!("{BOX}sweep: {{{block}}}\n"));
        let ran = bench.run(&["sweep", "stack.yaml", "-o", "out.svg"]).code(2);
        assert!(ran.stderr.contains(message), "{block}\n{}", ran.stderr);
        assert!(
            ran.stderr.contains(&format!("stack.yaml:{place}")),
            "{block}\n{}",
            ran.stderr
        );
        assert_eq!(bench.files(), ["stack.yaml"]);
    }
    let ran = bench(BOX).run(&["sweep", "stack.yaml"]).code(2);
    assert!(ran.stderr.contains("no `sweep` block"), "{}", ran.stderr);
}

#[test]
fn arguments_that_make_no_sense_are_refused() {
    let bench = bench(&format!("{PAIR}{PAIR_SWEEP}"));
    for (arguments, message) in [
        (&["--format", "csv", "--part", "0/3"][..], "1/3"),
        (&["--format", "csv", "--part", "4/3"], "from `1/3` to `3/3`"),
        (&["--format", "csv", "--part", "a/b"], "as in `1/4`"),
        (&["--part", "1/3"], "--part needs --format csv"),
        (
            &["--part", "1/3", "--format", "csv", "-o", "a.svg"],
            "no picture",
        ),
        (&["--points", "1"], "2..=100000"),
        (&["--points", "0"], "2..=100000"),
        (&["--threads", "0"], "1..=1024"),
        (&["--what", "levels"], "ends in .svg"),
    ] {
        let mut all = vec!["sweep", "stack.yaml"];
        all.extend(arguments);
        let ran = bench.run(&all).code(2);
        assert!(
            ran.stderr.contains(message),
            "{arguments:?}\n{}",
            ran.stderr
        );
        assert_eq!(bench.files(), ["stack.yaml"]);
    }
}

#[test]
fn pictures_show_every_state_once() {
    let bench = bench(&format!("{PAIR}{PAIR_SWEEP}"));
    for (what, width, points, names) in [
        (
            "levels",
            "page",
            170.0,
            ["conduction 1", "conduction 2", "conduction 3"],
        ),
        (
            "transitions",
            "column",
            86.0,
            ["to conduction 2", "to conduction 3", "Field (kV/cm)"],
        ),
    ] {
        sweep(&bench, &["--what", what, "--width", width, "-o", "a.svg"]);
        let text = bench.read("a.svg");
        let picture = roxmltree::Document::parse(&text).unwrap();
        let root = picture.root_element();
        let wide: f64 = root
            .attribute("width")
            .unwrap()
            .trim_end_matches("pt")
            .parse()
            .unwrap();
        near(wide, points * 72.0 / 25.4, 0.01);
        for name in names {
            let found = root
                .descendants()
                .filter(|n| n.has_tag_name("text") && n.text() == Some(name));
            assert_eq!(found.count(), 1, "{name}\n{text}");
        }
    }
}

/// Each shipped structure with a `sweep` block is swept without a doubt about what its states follow.
#[test]
fn shipped_structures_are_swept() {
    let mut swept = 0;
    for path in common::shipped_structures() {
        let text = std::fs::read_to_string(&path).unwrap();
        if !text.contains("\nsweep:") {
            continue;
        }
        swept += 1;
        let ran = sweep(&bench(&text), &["--format", "json"]);
        assert!(!ran.stderr.contains("not sure"), "{}", ran.stderr);
        assert!(!ran.stderr.contains("audit"), "{}", ran.stderr);
        let file = ran.json();
        for point in list(&file, "points") {
            assert!(point.get("not_solved").is_none(), "{point}");
            assert_eq!(
                list(point, "transitions").len(),
                list(&list(&file, "points")[0], "transitions").len()
            );
        }
        assert!(
            list(&file, "anticrossings")
                .iter()
                .all(|row| row["settled"] == true)
        );
    }
    assert!(swept >= 2);
}

/// What a state follows does not depend on how many levels are asked for: a widening well draws states from far above
/// down through those of its neighbours. With few levels some are told only as having come from beyond.
#[test]
fn asking_for_more_levels_changes_no_name() {
    let file = |states: usize| {
        swept(&format!(
            "\
substrate: GaAs
field: 2.1 kV/cm
bands: {{conduction: {{model: parabolic, states: {states}}}}}
layers:
  - {{material: Al0.3Ga0.7As, width: 15 nm}}
  - {{name: well, material: GaAs, width: 7 nm}}
  - {{material: Al0.3Ga0.7As, width: 5.5 nm}}
  - {{material: GaAs, width: 12 nm}}
  - {{material: Al0.3Ga0.7As, width: 6 nm}}
  - {{material: GaAs, width: 9 nm}}
  - {{material: Al0.3Ga0.7As, width: 15 nm}}
sweep: {{vary: {{layer: well, width: [2 nm, 18 nm]}}, points: 41}}
"
        ))
    };
    let (few, many) = (file(3), file(9));
    let mut told = 0;
    for (few, many) in list(&few, "points").iter().zip(list(&many, "points")) {
        for (one, other) in list(few, "levels").iter().zip(list(many, "levels")) {
            let name = one["follows"].as_str().unwrap();
            assert!(
                name == other["follows"] || name == "conduction 5+",
                "{one} {other}"
            );
            told += usize::from(name == other["follows"] && name != one["level"]);
        }
    }
    assert!(told > 20, "{told}");
}

/// Holes between hard walls, six bands coupled: at k∥ = 0 heavy holes ħ²π²n²(γ₁ − 2γ₂)/2m₀L²; light holes the upper root of
/// Luttinger and Kohn's block of light and split-off holes at k = nπ/L, which for a large splitting is
/// ħ²π²n²(γ₁ + 2γ₂)/2m₀L² (Phys. Rev. 97, 869 (1955); γ of GaAs, Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815
/// (2001)). The second heavy hole stays behind the first light one: (γ₁ + 2γ₂)/(γ₁ − 2γ₂) = 3.88 of 4.
#[test]
fn coupled_holes_between_hard_walls_follow_the_square_of_the_width() {
    let (g1, g2, split_ev) = (6.98, 2.06, 3.0);
    let file = swept(&format!(
        "bands:
  conduction: {{model: parabolic, states: 1}}
  valence: {{model: six-band, states: 3}}
materials:
  Box: {{like: GaAs, luttinger: [{g1}, {g2}, 2.93], spin_orbit: {split_ev} eV}}
layers:
  - {{name: box, material: Box, width: 10 nm}}
sweep: {{vary: {{layer: box, width: [5 nm, 20 nm]}}, points: 7}}
"
    ));
    assert_eq!(list(&file, "points").len(), 7);
    for point in list(&file, "points") {
        let width_nm = number(point, "at");
        let square = |n: f64| HBAR2_OVER_2M0 * (n * std::f64::consts::PI / width_nm).powi(2);
        // −(γ₁ + 2γ₂)k², −Δ − γ₁k² and 2√2 γ₂k² between them.
        let light = |n: f64| {
            let k2 = square(n);
            let (light, split) = (-(g1 + 2.0 * g2) * k2, -split_ev - g1 * k2);
            let half = 0.5 * (light - split);
            -(0.5 * (light + split) + half.hypot(8f64.sqrt() * g2 * k2))
        };
        let heavy = |n: f64| (g1 - 2.0 * g2) * square(n);
        let mut expected = [heavy(1.0), heavy(2.0), light(1.0)].map(|ev| 1e3 * ev);
        expected.sort_by(f64::total_cmp);
        let found = list(point, "levels").iter();
        let found: Vec<f64> = found
            .filter(|level| {
                level["level"]
                    .as_str()
                    .is_some_and(|l| l.starts_with("valence"))
            })
            .map(|level| number(level, "from_edge_meV"))
            .collect();
        assert_eq!(found.len(), 3);
        for (found, expected) in found.iter().zip(expected) {
            near(*found, expected, 1e-3);
        }
        // ∝ 1/L², and 10.754 meV at 10 nm.
        near(found[0] * (width_nm / 10.0).powi(2), 10.754, 2e-3);
    }
}

/// At k∥ = 0 heavy holes are coupled to nothing, so that they cross light ones and electrons without a gap (Luttinger and
/// Kohn 1955). TE light alone comes to them (Chuang 1995), and a field moves levels of a symmetric well the same way for
/// both of its signs.
#[test]
fn eight_coupled_bands_are_swept() {
    let well = "substrate: GaSb
temperature: 300 K
bands:
  conduction: {model: eight-band, states: 2}
  valence: {model: eight-band, states: 3}
layers:
  - {name: lower, material: AlSb, width: 6 nm}
  - {name: first, material: InAs, width: 1.7 nm}
  - {name: holes, material: In0.35Ga0.65Sb, width: 3 nm}
  - {name: second, material: InAs, width: 1.7 nm}
  - {name: upper, material: AlSb, width: 6 nm}
";
    let show =
        "show: [{from: valence 1, to: conduction 1}, {from: conduction 1, to: conduction 2}]";
    let file = swept(&format!(
        "{well}sweep: {{vary: {{layer: holes, width: [2.5 nm, 4.5 nm]}}, points: 5, {show}}}\n"
    ));
    assert_eq!(list(&file, "points").len(), 5);
    for point in list(&file, "points") {
        let aim = &list(point, "transitions")[0];
        assert!(number(aim, "te_Ep") > 0.05);
        near(number(aim, "tm_Ep"), 0.0, 1e-9);
    }
    let crossings = list(&file, "anticrossings");
    assert!(!crossings.is_empty());
    for crossing in crossings {
        near(number(crossing, "gap_meV"), 0.0, 1e-5);
    }
    let file = swept(&format!(
        "{well}sweep: {{vary: {{field: [-100 kV/cm, 100 kV/cm]}}, points: 5, {show}}}\n"
    ));
    let points = list(&file, "points");
    for (one, other) in points.iter().zip(points.iter().rev()) {
        let of = |point| of_levels(point, "from_middle_meV");
        for (a, b) in of(one).iter().zip(of(other)) {
            near(*a, b, 1e-5);
        }
        for (a, b) in list(one, "transitions")
            .iter()
            .zip(list(other, "transitions"))
        {
            near(number(a, "energy_meV"), number(b, "energy_meV"), 1e-5);
        }
    }
    // A state across the gap bears the other band's name, which is said.
    let inverted = format!(
        "{}sweep: {{vary: {{layer: first, width: [5 nm, 15 nm]}}, points: 3}}\n",
        well.replace("width: 1.7", "width: 10")
            .replace("width: 3 ", "width: 8 ")
    );
    let ran = sweep(&bench(&inverted), &[]);
    assert!(
        ran.stderr.contains("conduction 1 is mostly of holes at"),
        "{}",
        ran.stderr
    );
}
