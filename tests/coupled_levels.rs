//! Coupled bands through `levels`, `tune` and `dispersion`: against one band, published wells, an independent solver, and
//! what light must add up to.

mod common;
#[path = "common/eight_band.rs"]
mod eight_band;

use common::{Bench, list, number};
use nalgebra::{DMatrix, DVector};
use serde_json::Value;
use wellwright::constants::HC_EV_UM;
use wellwright::models::Band;
use wellwright::structure;
use wellwright::subbands::{Accuracy, Bands, State};

const LASER: &str = "substrate: GaAs
layers:
  - {name: lower, material: GaAs, width: 24 nm}
  - {name: well, material: In0.2Ga0.8As, width: 8 nm}
  - {name: upper, material: GaAs, width: 24 nm}
";

fn levels(bands: &str, rest: &str) -> Value {
    let bench = Bench::new();
    bench.write("stack.yaml", format!("bands: {bands}\n{rest}"));
    bench
        .run(&["levels", "stack.yaml", "--format", "json"])
        .code(0)
        .json()
}

/// The rows of a band, or of the coupled holes of one character.
fn rows<'j>(json: &'j Value, key: &str, word: &str) -> Vec<&'j Value> {
    let rows = list(json, "subbands").iter();
    rows.filter(|row| row[key] == word).collect()
}

#[track_caller]
fn close(found: f64, expected: f64, tolerance: f64) {
    assert!(
        (found - expected).abs() <= tolerance,
        "{found} for {expected} within {tolerance}"
    );
}

/// At k∥ = 0 heavy holes are coupled to nothing (Luttinger and Kohn, Phys. Rev. 97, 869 (1955)): energy, place and hold are
/// those of the one band, strain and field included; and the parabolic or energy-dependent electrons beside six bands are
/// untouched.
#[test]
fn heavy_holes_are_those_of_one_band() {
    for head in ["", "field: 30 kV/cm\n"] {
        let rest = format!("{head}{LASER}");
        let apart = levels(
            "{conduction: {model: energy-dependent, states: 2}, valence: {model: decoupled, states: 8}}",
            &rest,
        );
        let six = levels(
            "{conduction: {model: energy-dependent, states: 2}, valence: {model: six-band, states: 4}}",
            &rest,
        );
        let eight = levels(
            "{conduction: {model: eight-band, states: 2}, valence: {model: eight-band, states: 4}}",
            &rest,
        );
        let expected = rows(&apart, "band", "heavy-hole");
        assert!(expected.len() >= 3);
        for json in [&six, &eight] {
            assert_eq!(list(&json["audit"], "faults"), &[] as &[Value]);
            let heavy = rows(json, "character", "heavy hole");
            for (own, one) in heavy.iter().zip(&expected) {
                // 1e-6 meV.
                close(number(own, "energy_eV"), number(one, "energy_eV"), 1e-9);
                close(
                    number(own, "from_edge_meV"),
                    number(one, "from_edge_meV"),
                    1e-6,
                );
                close(number(own, "centre_nm"), number(one, "centre_nm"), 1e-5);
                close(number(own, "extent_nm"), number(one, "extent_nm"), 1e-5);
                assert_eq!(own["held_by"], one["held_by"]);
                close(number(own, "heavy_share"), 1.0, 1e-12);
            }
        }
        let [own, one] = [&six, &apart].map(|json| rows(json, "band", "conduction"));
        assert_eq!(own.len(), 2);
        for (own, one) in own.iter().zip(&one) {
            assert_eq!(own["energy_eV"], one["energy_eV"]);
        }
    }
}

/// `levels` gives the energies that an independent program computed (`tests/reference/README.md`), each pair once.
#[test]
fn eight_band_levels_are_those_of_the_independent_reference() {
    let reference = eight_band::reference();
    let mut compared = 0;
    for stack in &reference.stacks {
        let solved = stack
            .solved
            .iter()
            .find(|s| s.k_per_nm == [0.0, 0.0])
            .unwrap();
        let [conduction, valence] = [&solved.conduction_ev, &solved.valence_ev]
            .map(|all| all.iter().copied().step_by(2).collect::<Vec<f64>>());
        let one_band = "bands: {conduction: {model: parabolic, states: 1}}\n";
        assert!(stack.structure.contains(one_band));
        let json = levels(
            &format!(
                "{{conduction: {{states: {}}}, valence: {{model: eight-band, states: {}}}}}",
                conduction.len(),
                valence.len()
            ),
            &stack.structure.replace(one_band, ""),
        );
        for (band, expected) in [("conduction", &conduction), ("valence", &valence)] {
            let own = rows(&json, "band", band);
            assert_eq!(own.len(), expected.len(), "{}", stack.name);
            for (row, ev) in own.iter().zip(expected) {
                // A hundredth of the last digit of a table in meV; the reference has eight decimals.
                close(number(row, "energy_eV"), *ev, 1e-7);
                compared += 1;
            }
        }
        assert_eq!(
            list(&json["audit"], "faults"),
            &[] as &[Value],
            "{}",
            stack.name
        );
    }
    assert!(compared >= 48);
}

/// The limit for an infinite spin–orbit splitting Δ of values at several: a polynomial in 1/√Δ through all of them. There is
/// no term of first order: at an interface the split-off part dies out within a length that falls as 1/√Δ, and is itself
/// of order 1/Δ.
fn extrapolated(points: &[(f64, f64)]) -> f64 {
    let count = points.len();
    let powers = DMatrix::from_fn(count, count, |row, column| {
        let power = if column == 0 { 0 } else { column + 1 };
        points[row].0.powf(-0.5).powi(power as i32)
    });
    let values = DVector::from_fn(count, |row, _| points[row].1);
    powers.lu().solve(&values).unwrap()[0]
}

/// Levels of four-band wells, which are six-band ones whose split-off band is infinitely far: several spin–orbit
/// splittings are extrapolated to there.
fn four_band(well: [f64; 3], barrier: Option<([f64; 3], f64)>, count: usize) -> Vec<[f64; 2]> {
    let mut found: Vec<Vec<[f64; 3]>> = vec![Vec::new(); count];
    for spin_orbit in [0.9, 1.1, 1.4, 1.8, 2.3, 3.0] {
        let material = |name: &str, [g1, g2, g3]: [f64; 3], edge: f64| {
            format!(
                "  {name}: {{conduction_edge: 1.5 eV, electron_mass: 0.067, valence_edge: {edge} eV, spin_orbit: {spin_orbit} eV, luttinger: [{g1}, {g2}, {g3}]}}\n"
            )
        };
        let mut rest = format!("materials:\n{}", material("Well", well, 0.0));
        let mut layers = "  - {material: Well, width: 10 nm}\n".to_owned();
        if let Some((gammas, depth)) = barrier {
            rest.push_str(&material("Barrier", gammas, -depth));
            let pad = "  - {material: Barrier, width: 15 nm}\n";
            layers = format!("{pad}{layers}{pad}");
        }
        let json = levels(
            &format!(
                "{{conduction: {{states: 1}}, valence: {{model: six-band, states: {count}}}}}"
            ),
            &format!("{rest}layers:\n{layers}"),
        );
        for (k, row) in rows(&json, "band", "valence").iter().enumerate() {
            let inverse = 1.0 / number(row, "in_plane_mass");
            found[k].push([spin_orbit, -1e3 * number(row, "energy_eV"), inverse]);
        }
    }
    let limit = |points: &Vec<[f64; 3]>, which: usize| {
        extrapolated(&points.iter().map(|p| (p[0], p[which])).collect::<Vec<_>>())
    };
    found
        .iter()
        .map(|points| [limit(points, 1), 1.0 / limit(points, 2)])
        .collect()
}

/// A 10 nm well of γ = 6.98, 2.06, 2.93 between hard walls, and the same between Al0.3Ga0.7As (depth 159 meV), four bands:
/// computed elsewhere with 1e-5 meV; at k∥ = 0 the levels between walls have the closed form
/// ħ²π²n²(γ₁ ∓ 2γ₂)/2m₀L² (Luttinger 1956). The in-plane masses there are the same in all directions.
#[test]
fn luttinger_wells_through_levels() {
    let hard = four_band([6.98, 2.06, 2.93], None, 3);
    for ([level, mass], (expected, expected_mass)) in hard.iter().zip([
        (10.75446, 0.13956),
        (41.73935, -0.00468),
        (43.01785, 0.00446),
    ]) {
        println!("{level:.5} {mass:.5}");
        close(*level, expected, 2e-4);
        close(*mass, expected_mass, 1e-3 * expected_mass.abs() + 6e-6);
    }
    let finite = four_band([6.98, 2.06, 2.93], Some(([6.014, 1.688, 2.477], 0.159)), 4);
    for ([level, _], expected) in finite.iter().zip([7.8082, 22.5515, 31.0228, 68.8401]) {
        println!("{level:.4}");
        close(*level, expected, 1e-4);
    }
}

/// Sums over directions and holes (Coldren and Corzine 1995): with six-band holes two TE directions and TM add to the square
/// of the overlap, which never exceeds that of a hole of one kind; in a wide well of eight bands a heavy hole has 1/2 and 0
/// of E_P, a light one 1/6 and 2/3 (Kane 1957).
#[test]
fn light_adds_up() {
    let six = levels(
        "{conduction: {model: parabolic, states: 2}, valence: {model: six-band, states: 8}}",
        LASER,
    );
    let pairs = list(&six, "interband");
    assert_eq!(pairs.len(), 16);
    let mut light = 0;
    for pair in pairs {
        let [te, tm, overlap] = ["te_Ep", "tm_Ep", "overlap"].map(|key| number(pair, key));
        close(2.0 * te + tm, overlap * overlap, 1e-9);
        light += usize::from(tm > 0.1 * overlap * overlap && overlap > 0.1);
    }
    assert!(light > 0, "light holes are among them");
    let wide = "layers: [{material: GaAs, width: 80 nm}]\n";
    let eight = levels(
        "{conduction: {states: 1}, valence: {model: eight-band, states: 8}}",
        wide,
    );
    let rows = list(&eight, "subbands");
    let character = |pair: &Value| {
        let name = pair["from"].as_str().unwrap();
        let index: usize = name.trim_start_matches("valence ").parse().unwrap();
        rows[index]["character"].clone()
    };
    let allowed = |word: &str| {
        let pairs = list(&eight, "interband").iter();
        let mut own = pairs.filter(|pair| character(pair) == word && number(pair, "overlap") > 0.9);
        own.next().unwrap().clone()
    };
    let (heavy, light) = (allowed("heavy hole"), allowed("light hole"));
    close(number(&heavy, "te_Ep"), 1.0 / 2.0, 0.005);
    close(number(&heavy, "tm_Ep"), 0.0, 1e-12);
    close(number(&light, "te_Ep"), 1.0 / 6.0, 0.005);
    close(number(&light, "tm_Ep"), 2.0 / 3.0, 0.01);
}

/// Tolerances leave coupled holes out, and do not call them decoupled.
#[test]
fn tolerances_name_no_holes_that_they_leave_out() {
    let bench = Bench::new();
    let bands = "{conduction: {states: 2}, valence: {model: six-band, states: 2}}";
    bench.write("stack.yaml", format!("bands: {bands}\n{LASER}"));
    let ran = bench.run(&["tolerance", "stack.yaml"]).code(0);
    assert!(!ran.stdout.contains("decoupled"), "{}", ran.stdout);
}

/// Closure over the holes: with all of them, an electron of one band has TE = 1/2 + 1/6 + 1/3 = 1 and TM = 2/3 + 1/3 = 1, the
/// sums over heavy, light and split-off holes (Chuang 1995), whatever mixes the holes: here strain, a grade and no mirror.
/// Fifty levels hold all but 1e-4 of TE and 5e-3 of TM of the lowest electron.
#[test]
fn strengths_of_all_holes_add_up_to_one() {
    let stack = "substrate: InP
layers:
  - {material: Al0.48In0.52As, width: 9 nm}
  - {material: In0.42Ga0.58As, width: 7 nm}
  - {material: In0.6Ga0.4As, width: 2 nm}
  - {material: Al0.48In0.52As, width: 8 nm}
";
    let json = levels(
        "{conduction: {states: 1}, valence: {model: six-band, states: 50}}",
        stack,
    );
    let sum = |key: &str| -> f64 {
        let pairs = list(&json, "interband").iter();
        pairs.map(|pair| number(pair, key)).sum()
    };
    let [te, tm] = ["te_Ep", "tm_Ep"].map(sum);
    assert!(te <= 1.0 + 1e-9 && tm <= 1.0 + 1e-9, "{te} {tm}");
    close(te, 1.0, 2e-4);
    close(tm, 1.0, 2e-3);
}

/// A stack grown the other way round in the opposite field is the same stack, for levels, masses and light.
#[test]
fn a_mirrored_stack_shines_alike() {
    let stacks = [
        "field: 30 kV/cm
layers:
  - {material: Al0.3Ga0.7As, width: 10 nm}
  - {material: In0.15Ga0.85As, width: 5 nm}
  - {material: GaAs, to: Al0.3Ga0.7As, width: 3 nm}
  - {material: Al0.3Ga0.7As, width: 12 nm}
",
        "field: -30 kV/cm
layers:
  - {material: Al0.3Ga0.7As, width: 12 nm}
  - {material: Al0.3Ga0.7As, to: GaAs, width: 3 nm}
  - {material: In0.15Ga0.85As, width: 5 nm}
  - {material: Al0.3Ga0.7As, width: 10 nm}
",
    ];
    for bands in [
        "{conduction: {model: energy-dependent, states: 2}, valence: {model: six-band, states: 5}}",
        "{conduction: {model: eight-band, states: 2}, valence: {states: 5}}",
    ] {
        let [one, other] = stacks.map(|stack| levels(bands, &format!("substrate: GaAs\n{stack}")));
        let pairs = |key: &str| {
            let other = list(&other, key).to_vec();
            list(&one, key).iter().cloned().zip(other)
        };
        for (a, b) in pairs("subbands") {
            // 3 mV/nm over 30 nm.
            close(
                number(&a, "energy_eV"),
                number(&b, "energy_eV") + 0.09,
                1e-8,
            );
            close(
                number(&a, "centre_nm"),
                30.0 - number(&b, "centre_nm"),
                1e-6,
            );
            let ratio = number(&a, "in_plane_mass") / number(&b, "in_plane_mass");
            close(ratio, 1.0, 1e-6);
        }
        for (a, b) in pairs("transitions") {
            close(number(&a, "dipole_nm"), number(&b, "dipole_nm"), 1e-7);
        }
        for (a, b) in pairs("interband") {
            for key in ["overlap", "te_Ep", "tm_Ep"] {
                close(number(&a, key), number(&b, key), 1e-7);
            }
        }
    }
}

/// The report is of one piece: names, energies and wavelengths of transitions follow from the levels, shares add up to one.
#[test]
fn the_report_is_of_one_piece() {
    for bands in [
        "{conduction: {model: eight-band, states: 2}, valence: {states: 3}}",
        "{conduction: {states: 2}, valence: {model: six-band, states: 3}}",
    ] {
        let json = levels(bands, LASER);
        let energy = |name: &Value| {
            let (band, index) = name.as_str().unwrap().split_once(' ').unwrap();
            let row = rows(&json, "band", band)[index.parse::<usize>().unwrap() - 1];
            number(row, "energy_eV")
        };
        assert_eq!(list(&json, "transitions").len(), 1 + 3);
        for pair in list(&json, "transitions") {
            let ev = energy(&pair["to"]) - energy(&pair["from"]);
            assert!(ev > 0.0);
            close(number(pair, "energy_meV"), 1e3 * ev, 1e-8);
        }
        assert_eq!(list(&json, "interband").len(), 6);
        for pair in list(&json, "interband") {
            let ev = energy(&pair["to"]) - energy(&pair["from"]);
            close(number(pair, "wavelength_um"), HC_EV_UM / ev, 1e-8);
        }
        for row in rows(&json, "band", "valence") {
            let shares = [
                "conduction_share",
                "heavy_share",
                "light_share",
                "split_off_share",
            ];
            close(shares.map(|key| number(row, key)).iter().sum(), 1.0, 1e-10);
        }
        let exciton = &json["exciton"];
        assert!(
            (4.0..12.0).contains(&number(exciton, "binding_meV")),
            "{exciton}"
        );
        let bench = Bench::new();
        bench.write("stack.yaml", format!("bands: {bands}\n{LASER}"));
        let csv = bench
            .run(&["levels", "stack.yaml", "--format", "csv"])
            .code(0)
            .stdout;
        assert!(
            csv.contains("\nband,index,character,conduction_share,"),
            "{csv}"
        );
        let text = bench.run(&["levels", "stack.yaml"]).code(0).stdout;
        assert!(
            text.contains("heavy hole") && text.contains("Audit passed"),
            "{text}"
        );
    }
}

fn states(text: &str) -> [Vec<State>; 2] {
    let (file, problems) = structure::read(text);
    let file = file.unwrap_or_else(|| panic!("{problems:#?}"));
    let stack = file.stack().unwrap();
    let bands = Bands::solve(&stack, &Band::of(&file), Accuracy::default()).unwrap();
    [0, 1].map(|band| bands.states(band))
}

/// Where a gap is broken, by layers or by a field, states that bear the name of the other band are named; in a gap that is
/// whole none is.
#[test]
fn inverted_states_are_named() {
    let bench = Bench::new();
    let warned = |head: &str, layers: &str| {
        let bands = "bands: {valence: {model: eight-band, states: 3}}\n";
        bench.write("stack.yaml", format!("{bands}{head}layers:\n{layers}"));
        let ran = bench.run(&["levels", "stack.yaml"]).code(0);
        ran.stderr.contains("mostly of holes: the gap is broken")
    };
    let barrier = "  - {material: AlSb, width: 8 nm}\n";
    let beside = |width: f64| {
        format!(
            "{barrier}  - {{material: InAs, width: {width} nm}}\n  - {{material: GaSb, width: 8 nm}}\n{barrier}"
        )
    };
    // Thin InAs lifts its electron above the holes of GaSb; thick InAs does not: superlattices become
    // semimetals at some 8.5 nm (Chang and others, Appl. Phys. Lett. 35, 939 (1979), from memory).
    assert!(!warned("substrate: GaSb\n", &beside(4.0)));
    assert!(warned("substrate: GaSb\n", &beside(15.0)));
    let wide = "  - {material: GaAs, width: 60 nm}\n";
    assert!(!warned("field: 100 kV/cm\n", wide));
    assert!(
        warned("field: 400 kV/cm\n", wide),
        "2.4 eV are more than the gap"
    );
}

/// What the walls are said to shift a level by is what it moves when the outer layers are made wider.
#[test]
fn the_walls_shift_levels_as_said() {
    let text = |pads: f64| {
        format!(
            "bands: {{conduction: {{states: 1}}, valence: {{model: eight-band, states: 3}}}}\nlayers:\n  \
             - {{material: Al0.3Ga0.7As, width: {pads} nm}}\n  - {{material: GaAs, width: 6 nm}}\n  \
             - {{material: Al0.3Ga0.7As, width: {pads} nm}}\n"
        )
    };
    let (near, far) = (states(&text(4.0)), states(&text(30.0)));
    for (near, far) in near.iter().flatten().zip(far.iter().flatten()) {
        let moved = (near.energy_ev - far.energy_ev).abs();
        println!("{moved:.3e} said {:.3e}", near.wall_shift_ev);
        assert!(moved > 1e-6 && far.wall_shift_ev < 1e-9);
        close(near.wall_shift_ev / moved, 1.0, 0.25);
    }
}

const TUNED: &str = "substrate: GaAs
layers:
  - {name: lower, material: GaAs, width: 20 nm}
  - {name: well, material: In0.17Ga0.83As, width: 7 nm}
  - {name: upper, material: GaAs, width: 20 nm}
";

/// A laser well is tuned to 980 nm, in whole monolayers and below the critical thickness, and the tuned file, solved again,
/// gives what was printed.
#[test]
fn a_well_is_tuned_to_980_nm() {
    for bands in [
        "{conduction: {model: energy-dependent, states: 1}, valence: {model: six-band, states: 2}}",
        "{conduction: {model: eight-band, states: 1}, valence: {states: 2}}",
    ] {
        let bench = Bench::new();
        bench.write(
            "laser.yaml",
            format!(
                "bands: {bands}\n{TUNED}tune:\n  vary:\n    - {{layer: well, width: [5 nm, 10 nm]}}\n    \
                 - {{layer: well, fraction: In, between: [0.1, 0.25]}}\n  aims:\n    \
                 - {{from: valence 1, to: conduction 1, wavelength: 980 nm, within: 0.5 nm, follow: character}}\n    \
                 - {{from: valence 2, to: valence 1, energy: 30 meV, weight: 0.01, within: 4 meV}}\n  \
                 keep: [{{thickness: below critical, layer: well}}]\n  snap: monolayer\n"
            ),
        );
        let report = bench
            .run(&["tune", "laser.yaml", "-o", "tuned.yaml", "--format", "json"])
            .code(0)
            .json();
        assert_eq!(report["reached"], true, "{report}");
        let again = bench
            .run(&["levels", "tuned.yaml", "--format", "json"])
            .code(0)
            .json();
        let um = number(&list(&again, "interband")[0], "wavelength_um");
        close(um, 0.980, 5e-4);
        let printed = number(&list(&report["result"], "interband")[0], "wavelength_um");
        close(um, printed, 1e-8);
        let lines = bench.read("tuned.yaml");
        assert!(lines.contains(" ML"), "{lines}");
    }
}

/// A dipole between coupled holes is an aim too.
#[test]
fn a_dipole_of_coupled_holes_is_reached() {
    let bench = Bench::new();
    bench.write(
        "holes.yaml",
        format!(
            "bands: {{conduction: {{states: 1}}, valence: {{model: six-band, states: 3}}}}\n{TUNED}tune:\n  \
             vary: [{{layer: well, width: [4 nm, 12 nm]}}]\n  aims: [{{from: valence 2, to: valence 1, dipole: 2 nm}}]\n"
        ),
    );
    let report = bench
        .run(&["tune", "holes.yaml", "--format", "json"])
        .code(0)
        .json();
    let aim = &list(&report, "aims")[0];
    close(number(aim, "after"), 2.0, 0.02);
}

#[test]
fn dispersion_takes_the_model_of_the_file() {
    let bench = Bench::new();
    bench.write(
        "stack.yaml",
        format!("bands: {{valence: {{model: eight-band, states: 2}}}}\n{LASER}"),
    );
    let run = |more: &[&str]| {
        let mut words = vec![
            "dispersion",
            "stack.yaml",
            "--points",
            "2",
            "--format",
            "json",
        ];
        words.extend(more);
        bench.run(&words).code(0).json()
    };
    let json = run(&[]);
    assert_eq!(json["model"], "eight-band");
    assert_eq!(list(&json, "subbands").len(), 4 + 2);
    assert_eq!(run(&["--model", "six-band"])["model"], "six-band");
    let bench = Bench::new();
    bench.write(
        "apart.yaml",
        format!("bands: {{valence: {{model: decoupled}}}}\n{LASER}"),
    );
    let ran = bench
        .run(&["dispersion", "apart.yaml", "--points", "2"])
        .code(0);
    assert!(
        ran.stderr.contains("solves its holes apart"),
        "{}",
        ran.stderr
    );
}

#[test]
fn what_does_not_fit_is_told() {
    let bench = Bench::new();
    let refused = |command: &str, text: &str, words: &[&str]| {
        bench.write("bad.yaml", text);
        let mut arguments: Vec<&str> = command.split(' ').collect();
        arguments.push("bad.yaml");
        let ran = bench.run(&arguments).code(2);
        for word in words {
            assert!(ran.stderr.contains(word), "{word}\n{}", ran.stderr);
        }
    };
    let layers = "layers: [{name: well, material: M, width: 9 nm}]\n";
    let material = |keys: &str| format!("materials: {{M: {{{keys}}}}}\n{layers}");
    let simple = "conduction_edge: 1.4 eV, electron_mass: 0.067";
    let edges = format!("{simple}, valence_edge: 0 eV, spin_orbit: 0.3 eV");
    for (model, keys, missing) in [
        ("six-band", simple.to_owned(), "valence_edge"),
        ("six-band", edges.clone(), "luttinger"),
        (
            "eight-band",
            format!("{edges}, luttinger: [7, 2, 3]"),
            "gap",
        ),
    ] {
        for command in ["levels", "check"] {
            refused(
                command,
                &format!(
                    "bands: {{valence: {{model: {model}}}}}\n{}",
                    material(&keys)
                ),
                &[
                    "bad.yaml:3:33",
                    "layer `well`",
                    &format!("has no `{missing}`"),
                ],
            );
        }
    }
    let whole = format!("{edges}, luttinger: [7, 2, 3], gap: 1.4 eV");
    for (keys, words) in [
        (
            whole.replace("[7, 2, 3]", "[3, 2, 3]"),
            "holes that are no holes",
        ),
        (whole.replace("0.067", "1.2"), "electron mass of 1.200 m0"),
    ] {
        refused(
            "levels",
            &format!(
                "bands: {{valence: {{model: eight-band}}}}\n{}",
                material(&keys)
            ),
            &["bad.yaml:3:33", words],
        );
    }
    let eight = format!(
        "bands: {{conduction: {{model: eight-band}}}}\n{}",
        material(&whole)
    );
    let window = format!(
        "bands: {{valence: {{model: six-band}}}}\n{}tolerance:\n  field: 1 kV/cm\n  window: {{from: valence 1, to: conduction 1, energy: [1 eV, 2 eV]}}\n",
        material(&whole)
    );
    for command in [
        "plot --what yield",
        "plot --what sensitivities",
        "tolerance",
    ] {
        refused(
            command,
            &eight,
            &["on their own", "`eight-band`", "`levels`, `tune`"],
        );
        refused(
            command,
            &window,
            &["a window names valence 1", "coupled bands", "decoupled"],
        );
    }
    let tune = |aim: &str| {
        format!(
            "bands: {{valence: {{model: six-band}}}}\n{}tune:\n  vary: [{{layer: well, width: [3 nm, 12 nm]}}]\n  aims: [{{{aim}}}]\n",
            material(&whole)
        )
    };
    refused(
        "tune",
        &tune("from: heavy-hole 1, to: conduction 1, energy: 1 eV"),
        &["the band `heavy-hole` is not solved", "`valence 1`"],
    );
    refused(
        "tune",
        &tune("from: valence 51, to: conduction 1, energy: 1 eV"),
        &["beyond the 50"],
    );
    refused(
        "tune",
        &tune("from: valence 1, to: conduction 1, dipole: 1 nm"),
        &["a dipole along growth is between levels of one band"],
    );
}
