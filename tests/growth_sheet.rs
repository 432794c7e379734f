//! The growth sheet against published monolayers, sums worked out by hand, and files with mistakes.

use std::fs;
use std::path::Path;
use std::process::{Command, Output};
use wellwright::diagnostics::Severity;
use wellwright::growth::{self, Filling, Flag, LayerRow, Plan, Row, Sums};
use wellwright::materials::Element;
use wellwright::structure::{self, Stack, Structure, document};
use wellwright::subbands::Accuracy;
use wellwright::tune;

fn laid_out(text: &str) -> (Structure, Stack) {
    let (structure, problems) = structure::read(text);
    let structure = structure.unwrap_or_else(|| panic!("{problems:?}"));
    let stack = structure.stack().unwrap();
    (structure, stack)
}

fn plan(text: &str) -> Plan {
    let (structure, stack) = laid_out(text);
    growth::plan(&structure, &stack).unwrap()
}

fn layers(plan: &Plan) -> Vec<&LayerRow> {
    plan.rows
        .iter()
        .filter_map(|row| match row {
            Row::Layer(layer) => Some(layer),
            _ => None,
        })
        .collect()
}

fn run(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_wellwright"))
        .args(arguments)
        .output()
        .unwrap()
}

#[track_caller]
fn near(value: f64, expected: f64, within: f64) {
    assert!(
        (value - expected).abs() <= within,
        "{value} is not {expected} within {within}"
    );
}

/// Half the lattice constants at 300 K of Vurgaftman, Meyer and Ram-Mohan, J. Appl. Phys. 89, 5815 (2001), tables I to VI;
/// that of InP is the handbook value (Levinshtein, Rumyantsev and Shur, World Scientific, 1996).
#[test]
fn monolayers_are_half_the_published_lattice_constants() {
    for (binary, lattice_angstrom) in [
        ("GaAs", 5.65325),
        ("AlAs", 5.6611),
        ("InAs", 6.0583),
        ("InP", 5.8687),
        ("GaSb", 6.0959),
        ("AlSb", 6.1355),
    ] {
        let element = &binary[..2];
        let plan = plan(&format!(
            "substrate: {binary}\nlayers:\n  - {{material: {binary}, width: 10 ML}}\ngrowth: {{rates: {{{element}: 1 ML/s}}}}\n"
        ));
        let layer = layers(&plan)[0];
        near(10.0 * layer.monolayer_nm, lattice_angstrom / 2.0, 1e-6);
        assert_eq!(layer.own.monolayers_hundredths, 1000);
        // Ten monolayers, printed to 0.01 Å.
        near(
            layer.own.width_pm as f64 / 100.0,
            5.0 * lattice_angstrom,
            0.0051,
        );
        assert_eq!(layer.own.time_cs, 1000);
    }
}

/// 1 µm/h is 10 000 Å in 3600 s, 2.7778 Å/s; half of 5.65325 Å is one monolayer of GaAs: 2.77778/2.826625 = 0.982719 ML/s.
#[test]
fn lengths_per_time_become_monolayers_per_time() {
    for rate in [
        "1 µm/h",
        "1 um/h",
        "2.77778 Å/s",
        "2.77778 A/s",
        "0.277778 nm/s",
    ] {
        let plan = plan(&format!(
            "substrate: GaAs\nlayers:\n  - {{material: GaAs, width: 100 ML}}\ngrowth: {{rates: {{Ga: {rate}}}}}\n"
        ));
        near(plan.shutters[0].rate_ml_per_s.unwrap(), 0.982719, 2e-6);
    }
    // The cell of AlAs at 0.5 Å/s, coherent on GaAs. By hand from the constants of Vurgaftman 2001: in-plane strain
    // (5.65325 - 5.6611)/5.6611 = -0.0013867, along growth +2 (53.4/125.0) 0.0013867 = +0.0011848, so a monolayer is
    // 2.83055 x 1.0011848 = 2.833904 Å, and 0.5/2.833904 = 0.176435 ML/s.
    let aluminium = plan(
        "substrate: GaAs\nlayers:\n  - {material: AlAs, width: 10 ML}\ngrowth:\n  cells:\n    - {element: Al, rate: 0.5 Å/s, of: AlAs}\n",
    );
    near(aluminium.shutters[0].rate_ml_per_s.unwrap(), 0.176435, 1e-6);
    // A rate counted on an InAs wafer and used on InP: equally many atoms per area and time are
    // 0.5 x (5.8687/6.0583)² = 0.469193 monolayers of the denser net.
    let indium = plan(
        "substrate: InP\nlayers:\n  - {material: InAs, width: 2 ML}\ngrowth:\n  cells:\n    - {element: In, rate: 0.5 ML/s, of: InAs, on: InAs}\n",
    );
    near(indium.shutters[0].rate_ml_per_s.unwrap(), 0.469193, 1e-6);
}

/// Common practice: the rate of AlGaAs is R_Ga + R_Al, and x = R_Al/(R_Ga + R_Al). With 0.70 and 0.30 ML/s:
/// AlGaAs 1.00 ML/s at x = 0.30, so 106 ML take 106.00 s; GaAs 20/0.70 = 28.571 s; AlAs 3/0.30 = 10.00 s.
#[test]
fn rates_add_up() {
    let plan = plan(
        "substrate: GaAs\nlayers:\n\
         \x20 - {material: Al0.30Ga0.70As, width: 106 ML}\n\
         \x20 - {material: GaAs, width: 20 ML}\n\
         \x20 - {material: AlAs, width: 3 ML}\n\
         growth: {rates: {Ga: 0.70 ML/s, Al: 0.30 ML/s}}\n",
    );
    let times: Vec<u64> = layers(&plan).iter().map(|l| l.own.time_cs).collect();
    assert_eq!(times, [10600, 2857, 1000]);
    let open: Vec<Vec<usize>> = layers(&plan).iter().map(|l| l.filling.cells()).collect();
    assert_eq!(open, [vec![0, 1], vec![0], vec![1]]);
    assert!(plan.flags.is_empty(), "{:?}", plan.flags);
    // Ga is open for 106.00 + 28.57 s, Al for 106.00 s and again for 10.00 s.
    assert_eq!(
        (plan.shutters[0].open_cs, plan.shutters[0].openings),
        (13457, 1)
    );
    assert_eq!(
        (plan.shutters[1].open_cs, plan.shutters[1].openings),
        (11600, 2)
    );
}

/// With cells of 0.85, 0.28 and 0.15 ML/s, Al0.15 is the first Ga cell with Al; 0.15/(0.28 + 0.15) = 0.349 is the second.
#[test]
fn several_cells_of_one_element_give_several_compositions() {
    let plan = plan(
        "substrate: GaAs\nlayers:\n\
         \x20 - {material: Al0.15Ga0.85As, width: 10 ML}\n\
         \x20 - {material: Al0.35Ga0.65As, width: 10 ML}\n\
         \x20 - {material: GaAs, width: 10 ML}\n\
         growth:\n  cells:\n\
         \x20   - {name: Ga 1, element: Ga, rate: 0.85 ML/s}\n\
         \x20   - {name: Ga 2, element: Ga, rate: 0.28 ML/s}\n\
         \x20   - {name: Al, element: Al, rate: 0.15 ML/s}\n",
    );
    let open: Vec<Vec<usize>> = layers(&plan).iter().map(|l| l.filling.cells()).collect();
    assert_eq!(open, [vec![0, 2], vec![1, 2], vec![0]]);
    assert_eq!(layers(&plan)[1].own.time_cs, 2326); // 10/0.43
    assert!(plan.flags.is_empty(), "{:?}", plan.flags);
}

const CASCADE: &str = "substrate: GaAs\ntemperature: 20 K\nlayers:\n  - repeat: 90\n    layers:\n";

/// The sequence of Vitiello and others, Appl. Phys. Lett. 90, 191115 (2007), in Å; 90 periods are published as 11.6 µm.
#[test]
fn ninety_periods_are_as_thick_as_published() {
    let widths = [
        39, 140, 6, 91, 6, 160, 15, 128, 18, 122, 20, 120, 20, 114, 27, 113, 35, 116,
    ];
    let mut text = CASCADE.to_owned();
    for (index, width) in widths.iter().enumerate() {
        let material = ["Al0.15Ga0.85As", "GaAs"][index % 2];
        text.push_str(&format!(
            "      - {{material: {material}, width: {width} Å}}\n"
        ));
    }
    text.push_str("growth: {rates: {Ga: 0.85 ML/s, Al: 0.15 ML/s}}\n");
    let plan = plan(&text);
    // 1290 Å in one period, 116 100 Å in 90.
    assert_eq!(plan.total.width_pm, 11_610_000);
    near(1e-3 * plan.total.width_nm(), 11.6, 0.0116);
    assert_eq!(plan.total.layers, 90 * 18);
    sums_hold(&plan);
    // Ga never closes; Al opens for each of the nine barriers of each period.
    assert_eq!(plan.shutters[0].openings, 1);
    assert_eq!(plan.shutters[1].openings, 90 * 9);
    assert_eq!(plan.shutters[0].open_cs, plan.total.time_cs);
}

/// Every total is the sum of the rows above it, to the last digit.
#[track_caller]
fn sums_hold(plan: &Plan) {
    let mut open: Vec<Sums> = vec![Sums::default()];
    let mut base: Vec<Sums> = vec![Sums::default()];
    for row in &plan.rows {
        match row {
            Row::Layer(layer) => {
                let pass = open.pop().unwrap().plus(layer.own);
                assert_eq!(layer.after, base.last().unwrap().plus(pass));
                open.push(pass);
            }
            Row::Plane(_) => {}
            Row::LoopBegins { .. } => {
                base.push(base.last().unwrap().plus(*open.last().unwrap()));
                open.push(Sums::default());
            }
            Row::LoopEnds {
                count, pass, after, ..
            } => {
                assert_eq!(open.pop().unwrap(), *pass);
                base.pop();
                let outer = open.pop().unwrap().plus(pass.times(*count));
                assert_eq!(base.last().unwrap().plus(outer), *after);
                open.push(outer);
            }
        }
    }
    assert_eq!(open, [plan.total]);
}

#[test]
fn totals_hold_for_nested_loops_and_all_shipped_structures() {
    let nested = plan(
        "substrate: GaAs\nlayers:\n\
         \x20 - {material: GaAs, width: 3.33 nm}\n\
         \x20 - repeat: 7\n    layers:\n\
         \x20     - {material: AlAs, width: 1.07 nm}\n\
         \x20     - repeat: 3\n        layers:\n\
         \x20         - {material: GaAs, width: 2.19 nm}\n\
         \x20         - {material: AlAs, width: 0.61 nm}\n\
         \x20 - {material: GaAs, width: 1.11 nm}\n\
         growth: {rates: {Ga: 0.3 ML/s, Al: 0.7 ML/s}}\n",
    );
    sums_hold(&nested);
    // 3.33 + 7 (1.07 + 3 (2.19 + 0.61)) + 1.11 nm
    assert_eq!(nested.total.width_pm, 70_730);
    assert_eq!(nested.total.layers, 1 + 7 * (1 + 3 * 2) + 1);
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("structures");
    let mut count = 0;
    for file in fs::read_dir(folder).unwrap() {
        let text = fs::read_to_string(file.unwrap().path()).unwrap();
        let plan = plan(&text);
        sums_hold(&plan);
        count += 1;
    }
    assert!(count >= 6);
}

/// The totals as they are printed in each form of the command's output.
#[test]
fn the_printed_total_is_the_sum_of_the_printed_rows() {
    let file = structure_file("methane-cascade-7p7um");
    let json: serde_json::Value =
        serde_json::from_slice(&run(&["sheet", &file, "--format", "json"]).stdout).unwrap();
    let rows = json["rows"].as_array().unwrap();
    for (key, total, decimals) in [
        ("thickness_nm", "thickness_nm", 3),
        ("monolayers", "monolayers", 2),
        ("time_s", "time_s", 2),
    ] {
        let sum: f64 = rows.iter().map(|row| row[key].as_f64().unwrap()).sum();
        let total = json["total"][total].as_f64().unwrap();
        assert_eq!(format!("{sum:.decimals$}"), format!("{total:.decimals$}"));
    }
    let csv = String::from_utf8(run(&["sheet", &file, "--format", "csv"]).stdout).unwrap();
    let table = csv
        .split("\n\n")
        .find(|table| table.starts_with("kind,number"))
        .unwrap();
    let mut reader = csv::Reader::from_reader(table.as_bytes());
    let column = reader
        .headers()
        .unwrap()
        .iter()
        .position(|h| h == "time_s")
        .unwrap();
    let sum: f64 = reader
        .records()
        .map(|record| record.unwrap()[column].parse::<f64>().unwrap())
        .sum();
    near(sum, json["total"]["time_s"].as_f64().unwrap(), 1e-6);
}

/// A linear grade from Al0.3Ga0.7As to GaAs holds 0.85 Ga on average: 100 ML of it take 100 x 0.85/0.70 = 121.43 s at a
/// steady Ga cell of 0.70 ML/s. A parabola with its vertex at the GaAs face holds 0.3/3 = 0.1 Al: 100 x 0.9/0.7 = 128.57 s.
/// The Al cell starts at 0.3/0.7 of the Ga cell's rate, 0.30 ML/s.
#[test]
fn graded_layers_ramp_a_cell() {
    for (profile, hundredths) in [("linear", 12143), ("parabolic", 12857)] {
        let plan = plan(&format!(
            "substrate: GaAs\nlayers:\n  - {{name: ramp, material: Al0.3Ga0.7As, to: GaAs, profile: {profile}, width: 100 ML}}\n\
             growth: {{rates: {{Ga: 0.70 ML/s, Al: 0.25 ML/s}}}}\n"
        ));
        let layer = layers(&plan)[0];
        assert_eq!(layer.own.time_cs, hundredths);
        let Filling::Ramped(ramp) = &layer.filling else {
            panic!("a grade is ramped");
        };
        assert!(ramp.cells[0].is_steady());
        near(ramp.cells[1].rate_ml_per_s[0], 0.30, 1e-12);
        near(ramp.cells[1].rate_ml_per_s[1], 0.0, 1e-12);
        assert!(
            matches!(&plan.flags[..], [Flag::Ramped { label, .. }] if label == "ramp"),
            "{:?}",
            plan.flags
        );
    }
    // From AlAs to GaAs no element is there throughout: the total stays, and the fluxes cross.
    let whole = plan(
        "substrate: GaAs\nlayers:\n  - {material: AlAs, to: GaAs, width: 100 ML}\n\
         growth: {rates: {Ga: 0.70 ML/s, Al: 0.30 ML/s}}\n",
    );
    assert_eq!(layers(&whole)[0].own.time_cs, 10000);
}

/// A linear grade over N monolayers from A to B holds N t²/2 of B up to the part t: after each period whole monolayers are off
/// by half of one at most, and the written layers are the same ones.
#[test]
fn graded_layers_have_a_digital_alloy() {
    let plan = plan(
        "substrate: GaAs\nlayers:\n  - {name: ramp, material: Al0.3Ga0.7As, to: GaAs, width: 100 ML}\n\
         growth: {rates: {Ga: 0.70 ML/s, Al: 0.30 ML/s}}\n",
    );
    let [
        Flag::Ramped {
            digital: Some(digital),
            ..
        },
    ] = &plan.flags[..]
    else {
        panic!("{:?}", plan.flags);
    };
    assert_eq!(digital.formulas, ["Al0.3Ga0.7As", "GaAs"]);
    let (mut grown, mut placed) = (0, 0);
    for [of_a, of_b] in &digital.periods {
        grown += of_a + of_b;
        placed += of_b;
        let t = f64::from(grown) / 100.0;
        assert!(
            (f64::from(placed) - 50.0 * t * t).abs() <= 0.5,
            "{grown}: {placed}"
        );
    }
    assert_eq!((grown, placed), (100, 50));
    // Two roundings of half a monolayer in a period of six, or of the four that are left, in units of 0.3 Al.
    assert!(digital.largest_miss <= 0.3 / 4.0 && digital.mean_miss < 1e-12);
    let written = structure::read(&format!("substrate: GaAs\nlayers:\n{}", digital.yaml()));
    let stack = written.0.unwrap().stack().unwrap();
    let monolayer_nm = stack.monolayer_nm(0).unwrap();
    let of = |formula: &str| -> f64 {
        let own = (0..stack.layers.len())
            .filter(|layer| stack.composition_at(*layer, 0.0).unwrap().formula() == formula);
        own.map(|layer| stack.layers[layer].width_nm).sum()
    };
    near(of("GaAs") / monolayer_nm, 50.0, 0.1);
    near(of("Al0.3Ga0.7As") / monolayer_nm, 50.0, 0.1);
}

/// Four formula units per cell: Ga in 100 nm of GaAs is 4/(0.565325 nm)³ x 100 nm = 2.2139e15 per µm², 2.2139e17 per cm².
/// Donors of 2e18 per cm³ in these 1e-5 cm are 2e13 per cm².
#[test]
fn material_totals_are_the_atoms_of_the_crystal() {
    let plan = plan(
        "substrate: GaAs\ntemperature: 300 K\nlayers:\n  - {material: GaAs, width: 100 nm, donors: 2e18 cm^-3}\n\
         growth: {rates: {Ga: 1 ML/s}, dopants: {donors: Si}}\n",
    );
    let of = |symbol: &str| {
        plan.materials
            .iter()
            .find(|material| material.element == symbol)
            .unwrap()
    };
    near(of("Ga").atoms_per_cm2, 2.2139e17, 2e13);
    near(of("As").atoms_per_cm2, of("Ga").atoms_per_cm2, 1e9);
    near(of("Si").atoms_per_cm2, 2e13, 1e7);
    // 100 nm are 1000/2.826625 = 353.779 monolayers.
    near(of("Ga").monolayers.unwrap(), 353.779, 1e-3);
}

/// The fraction of Al, and of what else, in the words of a digital alloy's snippet: read back, its mean is the wanted one.
#[test]
fn a_digital_alloy_has_the_mean_that_the_cells_do_not_give() {
    let head = "title: t\nsubstrate: GaAs\ntemperature: 77 K\nbands: {conduction: {model: parabolic, states: 2}}\nlayers:\n  - {material: Al0.3Ga0.7As, width: 100 ML}\n  - {name: well, material: GaAs, width: 20 ML}\n";
    let cells = "growth: {rates: {Ga: 0.70 ML/s, Al: 0.30 ML/s}}\n";
    // 104 ML: the shortest period with the mean 1/4 is 3 ML of GaAs and 1 ML of AlAs, 26 times. In 106 ML its rest would
    // make that 27/106; 1 ML of GaAs and 5 of Al0.3Ga0.7As do better, 17 times with 1 and 3 ML left: 0.3 x 88/106.
    for (monolayers, period, aluminium_monolayers) in
        [(104, [3, 1], 26.0), (106, [1, 5], 0.3 * 88.0)]
    {
        let plan = plan(&format!(
            "{head}  - {{name: odd, material: Al0.25Ga0.75As, width: {monolayers} ML}}\n{cells}"
        ));
        let [Flag::Composition(off)] = &plan.flags[..] else {
            panic!("{:?}", plan.flags);
        };
        assert_eq!(off.label, "odd");
        assert_eq!(off.given.formula(), "Al0.3Ga0.7As");
        let digital = off.digital.as_ref().unwrap();
        assert_eq!(digital.total(), monolayers);
        assert_eq!(digital.monolayers, period);
        let snippet: String = digital
            .yaml()
            .lines()
            .map(|line| format!("  {line}\n"))
            .collect();
        let text = format!("{head}{snippet}{cells}");
        let (structure, stack) = laid_out(&text);
        let (mut aluminium, mut all) = (0.0, 0.0);
        for (index, layer) in stack.layers.iter().enumerate().skip(2) {
            let count = layer.width_nm / stack.monolayer_nm(index).unwrap();
            let composition = stack.composition_at(index, 0.0).unwrap();
            aluminium += count * composition.fraction(Element::Al);
            all += count;
        }
        near(all, f64::from(monolayers), 1e-9);
        near(aluminium, aluminium_monolayers, 1e-9);
        near(aluminium / all, digital.mean.fraction(Element::Al), 1e-12);
        near(aluminium / all, 0.25, 0.002);
        // What the snippet says can be grown with these cells, and solved.
        let again = growth::plan(&structure, &stack).unwrap();
        assert!(again.flags.is_empty(), "{:?}", again.flags);
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("digital.yaml");
        fs::write(&file, text).unwrap();
        let levels = run(&["levels", file.to_str().unwrap(), "--format", "json"]);
        assert_eq!(levels.status.code(), Some(0));
        let json: serde_json::Value = serde_json::from_slice(&levels.stdout).unwrap();
        assert_eq!(json["subbands"][0]["bound"], true);
    }
}

#[test]
fn widths_between_monolayers_are_named() {
    let plan = plan(
        "substrate: GaAs\nlayers:\n  - {name: whole, material: GaAs, width: 20 ML}\n  - {name: odd, material: GaAs, width: 19.83 ML}\n\
         growth: {rates: {Ga: 0.70 ML/s}}\n",
    );
    let [
        Flag::Remainder {
            label, monolayers, ..
        },
    ] = &plan.flags[..]
    else {
        panic!("{:?}", plan.flags);
    };
    assert_eq!(label, "odd");
    near(*monolayers, 19.83, 1e-9);
}

#[test]
fn mixed_group_five_is_a_flux_ratio() {
    let plan = plan(
        "substrate: InP\nlayers:\n  - {material: In0.8Ga0.2As0.44P0.56, width: 10 nm}\n  - {material: InP, width: 10 nm}\n\
         growth: {rates: {In: 0.8 ML/s, Ga: 0.2 ML/s}}\n",
    );
    assert_eq!(plan.flux_targets.len(), 1);
    let fractions: Vec<f64> = plan.flux_targets[0]
        .fractions
        .iter()
        .map(|(_, f)| *f)
        .collect();
    near(fractions[0], 0.44, 1e-12);
    near(fractions[1], 0.56, 1e-12);
}

/// The id is that of the physics, not of the words.
#[test]
fn the_content_id_follows_the_stack() {
    let id = |text: &str| plan(text).content_id;
    let tail = "growth: {rates: {Ga: 0.7 ML/s, Al: 0.3 ML/s}}\n";
    let one = id(&format!(
        "# a comment\ntitle: One\nsubstrate: GaAs\nlayers:\n  - repeat: 2\n    layers:\n      - {{material: AlAs, width: 1 nm}}\n      - {{name: w, material: GaAs, width: 5.2 nm}}\n{tail}"
    ));
    let same = id(&format!(
        "title: Two\nsubstrate: GaAs\nlayers:\n  - {{material: AlAs, width: 10 Å}}\n  - {{material: GaAs, width: 52 Å}}\n  - {{material: AlAs, width: 0.001 µm}}\n  - {{name: x, material: GaAs, width: 5.2 nm}}\n{tail}"
    ));
    assert_eq!(one, same);
    assert_eq!(one.len(), 12);
    for other in [
        format!(
            "substrate: GaAs\nlayers:\n  - repeat: 2\n    layers:\n      - {{material: AlAs, width: 1 nm}}\n      - {{material: GaAs, width: 5.3 nm}}\n{tail}"
        ),
        format!(
            "substrate: GaAs\nlayers:\n  - repeat: 2\n    layers:\n      - {{material: AlAs, width: 1 nm}}\n      - {{material: GaAs, width: 5.2 nm, donors: 1e17 cm^-3}}\n{tail}"
        ),
        format!(
            "substrate: GaAs\nmaterials: {{GaAs: {{electron_mass: 0.066}}}}\nlayers:\n  - repeat: 2\n    layers:\n      - {{material: AlAs, width: 1 nm}}\n      - {{material: GaAs, width: 5.2 nm}}\n{tail}"
        ),
    ] {
        assert_ne!(one, id(&other));
    }
}

/// Holds that the errors of a file are these: line, and words of the message, what was expected and the hint.
#[track_caller]
fn mistakes(growth: &str, expected: &[(usize, &[&str])]) {
    let text = format!(
        "substrate: GaAs\nlayers:\n  - {{name: barrier, material: Al0.3Ga0.7As, width: 30 nm}}\n  - {{material: GaAs, width: 5 nm}}\n{growth}\n"
    );
    let (structure, problems) = structure::read(&text);
    let errors: Vec<String> = problems
        .iter()
        .filter(|problem| problem.severity == Severity::Error)
        .map(|problem| {
            let line = document::line_of(&text, problem.span.clone().unwrap().start);
            format!("{line} | {problem:?}")
        })
        .collect();
    assert!(structure.is_none());
    assert_eq!(errors.len(), expected.len(), "{errors:#?}");
    for (error, (line, words)) in errors.iter().zip(expected) {
        assert!(error.starts_with(&format!("{line} | ")), "{error}");
        for word in *words {
            assert!(error.contains(word), "no `{word}` in {error}");
        }
    }
}

#[test]
fn mistakes_are_named_with_what_was_expected() {
    mistakes(
        "growth: {rates: {Ga: 0 ML/s, Al: 0.3 ML/s}}",
        &[(5, &["`0 ML/s` is out of range", "above 0"])],
    );
    mistakes(
        "growth: {rates: {Ga: -1 ML/s, Al: 0.3 ML/s}}",
        &[(5, &["`-1 ML/s` is out of range"])],
    );
    mistakes(
        "growth: {rates: {Ga: 0.7, Al: 0.3 ML/s}}",
        &[(5, &["no unit", "0.7 ML/s"])],
    );
    mistakes(
        "growth: {rates: {Ga: 0.7 nm, Al: 0.3 ML/s}}",
        &[(5, &["unit of a length"])],
    );
    mistakes(
        "growth: {rates: {Ga: 0.7 ML/s}}",
        &[(
            3,
            &[
                "layer `barrier` holds Al",
                "mounts no Al cell",
                "Al: 0.25 ML/s",
            ],
        )],
    );
    mistakes(
        "growth: {rates: {Ga: 0.7 ML/s, Al: 0.3 ML/s, As: 1 ML/s}}",
        &[(5, &["unknown key `As`", "`Al`, `Ga` or `In`"])],
    );
    mistakes("growth: {rates: {}}", &[(5, &["there is no cell"])]);
    mistakes("growth: {}", &[(5, &["`growth` has no `rates`"])]);
    mistakes("growth: 5", &[(5, &["a mapping with keys"])]);
    mistakes(
        "growth: {rate: {Ga: 0.7 ML/s}}",
        &[(5, &["unknown key `rate`", "did you mean `rates`?"])],
    );
    mistakes(
        "growth: {rates: {Ga: 0.7 ML/s, Al: 0.3 ML/s}, dopants: {donors: Sii, acceptors: Te}}",
        &[
            (5, &["`Sii` is no dopant known here", "did you mean `Si`?"]),
            (5, &["`Te` is a donor", "`Be`"]),
        ],
    );
    mistakes(
        "growth:\n  cells:\n    - {name: A, element: Ga, rate: 0.7 ML/s}\n    - {name: A, element: Al, rate: 0.3 ML/s}",
        &[(8, &["two cells are named `A`", "line 7"])],
    );
    mistakes(
        "growth:\n  cells:\n    - {element: Gaa, rate: 0.7 ML/s}\n    - {element: Al, rate: 1 Å/s, of: GaAs}\n    - {element: In}",
        &[
            (7, &["`Gaa`", "did you mean `Ga`?"]),
            (8, &["`GaAs` is no binary of Al", "`AlAs`"]),
            (9, &["no `rate`"]),
        ],
    );
    mistakes(
        "growth: {rates: {Ga: 0.7 ML/s, Al: 0.3 ML/s}, cells: [{element: Ga, rate: 1 ML/s}]}",
        &[(5, &["both `rates` and `cells`"])],
    );
    let nine = "{element: Ga, rate: 1 ML/s}, ".repeat(9);
    mistakes(
        &format!("growth: {{cells: [{nine}]}}"),
        &[(5, &["there are 9 cells", "at most 8"])],
    );
    let (structure, problems) = structure::read(
        "layers:\n  - {material: GaAs, width: 5 nm}\ngrowth: {rates: {Ga: 1 ML/s}}\n",
    );
    assert!(structure.is_none());
    assert!(
        problems[0].message.contains("needs a substrate"),
        "{problems:?}"
    );
    let (structure, problems) = structure::read(
        "substrate: GaAs\nmaterials: {Ours: {conduction_edge: 0 eV, electron_mass: 0.067}}\nlayers:\n  - {material: Ours, width: 5 nm}\ngrowth: {rates: {Ga: 1 ML/s}}\n",
    );
    assert!(structure.is_none());
    assert!(
        problems
            .iter()
            .any(|p| p.message.contains("names no formula")),
        "{problems:?}"
    );
    // A material that is `like` a formula is grown as that.
    let own = plan(
        "substrate: GaAs\nmaterials: {Ours: {like: Al0.3Ga0.7As, gap: 1.8 eV}}\nlayers:\n  - {material: Ours, width: 10 ML}\ngrowth: {rates: {Ga: 0.7 ML/s, Al: 0.3 ML/s}}\n",
    );
    assert_eq!(layers(&own)[0].material, "Ours (Al0.3Ga0.7As)");
    assert_eq!(layers(&own)[0].own.time_cs, 1000);
}

/// Doping without a species is printed as such, with a warning.
#[test]
fn a_missing_species_is_a_warning() {
    let (structure, problems) = structure::read(
        "substrate: GaAs\nlayers:\n  - {name: well, material: GaAs, width: 5 nm, donors: 1e17 cm^-3}\ngrowth: {rates: {Ga: 1 ML/s}}\n",
    );
    assert!(structure.is_some());
    assert!(
        problems
            .iter()
            .any(|p| p.message.contains("layer `well` has donors")
                && p.hint.as_deref() == Some("add `dopants: {donors: Si}`")),
        "{problems:?}"
    );
}

/// InAs on GaAs is strained by 5.65325/6.0583 - 1 = -6.7 %: no such film has a thickness that could be measured.
#[test]
fn a_length_of_a_binary_that_cannot_grow_there_is_doubted() {
    for (cell, warned) in [
        ("{element: In, rate: 0.5 µm/h}", true),
        ("{element: In, rate: 0.5 µm/h, on: InAs}", false),
        ("{element: In, rate: 0.5 ML/s}", false),
    ] {
        let (structure, problems) = structure::read(&format!(
            "substrate: GaAs\nlayers:\n  - {{material: In0.1Ga0.9As, width: 5 nm}}\ngrowth: {{cells: [{cell}, {{element: Ga, rate: 1 ML/s}}]}}\n"
        ));
        assert!(structure.is_some());
        let found = problems.iter().any(|p| p.message.contains("-6.7 %"));
        assert_eq!(found, warned, "{problems:?}");
    }
}

/// Si is an acceptor in GaSb and AlSb, where Te is the donor; common practice.
#[test]
fn silicon_is_no_donor_in_gallium_antimonide() {
    for (species, warned) in [("Si", true), ("Te", false)] {
        let (structure, problems) = structure::read(&format!(
            "substrate: GaSb\nlayers:\n  - {{name: well, material: GaSb, width: 5 nm, donors: 1e17 cm^-3}}\ngrowth: {{rates: {{Ga: 1 ML/s}}, dopants: {{donors: {species}}}}}\n"
        ));
        assert!(structure.is_some());
        let found = problems
            .iter()
            .any(|p| p.message.contains("acts as an acceptor in GaSb"));
        assert_eq!(found, warned, "{problems:?}");
    }
}

fn structure_file(name: &str) -> String {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("structures");
    path.join(format!("{name}.yaml")).display().to_string()
}

#[test]
fn text_of_the_file_cannot_become_html() {
    let folder = tempfile::tempdir().unwrap();
    let file = folder.path().join("evil.yaml");
    let page = folder.path().join("page.html");
    fs::write(
        &file,
        "title: '</title><script>alert(1)</script>'\nsubstrate: GaAs\nlayers:\n\
         \x20 - {name: '<img src=x onerror=\"a\">', material: Al0.2Ga0.8As, width: 30.3 nm}\n\
         \x20 - {name: \"w'&\", material: GaAs, width: 5 nm}\n\
         growth:\n  cells:\n    - {name: '<i>Ga', element: Ga, rate: 0.7 ML/s}\n    - {name: '\"Al', element: Al, rate: 0.3 ML/s}\n",
    )
    .unwrap();
    let done = run(&[
        "sheet",
        file.to_str().unwrap(),
        "-o",
        page.to_str().unwrap(),
    ]);
    assert_eq!(done.status.code(), Some(0), "{done:?}");
    let html = fs::read_to_string(page).unwrap();
    for raw in ["<script", "<img", "<i>", "onerror=\"", "w'&\"", "</title><"] {
        assert!(!html.contains(raw), "{raw}");
    }
    for safe in [
        "&lt;script&gt;",
        "&lt;img src=x onerror=&quot;a&quot;&gt;",
        "w&#39;&amp;",
        "&lt;i&gt;Ga",
    ] {
        assert!(html.contains(safe), "{safe}");
    }
    // One page that holds everything: nothing is fetched.
    let html = html.replace("http://www.w3.org/2000/svg", "");
    for fetched in ["http://", "https://", "<link", "src=\"", "url("] {
        assert!(!html.contains(fetched), "{fetched}");
    }
    assert!(html.contains("<svg"), "the band diagram stands in the page");
}

#[test]
fn an_output_is_whole_or_absent() {
    let folder = tempfile::tempdir().unwrap();
    let input = folder.path().join("well.yaml");
    fs::copy(structure_file("thermal-camera-8p6um"), &input).unwrap();
    let before = fs::read(&input).unwrap();
    let input = input.to_str().unwrap();
    let over = run(&["sheet", input, "-o", input]);
    assert_eq!(over.status.code(), Some(2));
    assert_eq!(fs::read(input).unwrap(), before);
    let nowhere = folder.path().join("no/such/folder/sheet.html");
    let lost = run(&["sheet", input, "-o", nowhere.to_str().unwrap()]);
    assert_eq!(lost.status.code(), Some(2));
    assert!(!nowhere.exists());
    // A file without a growth block leaves nothing behind.
    let bare = folder.path().join("bare.yaml");
    fs::write(&bare, "layers:\n  - {material: GaAs, width: 5 nm}\n").unwrap();
    let page = folder.path().join("page.html");
    let refused = run(&[
        "sheet",
        bare.to_str().unwrap(),
        "-o",
        page.to_str().unwrap(),
    ]);
    assert_eq!(refused.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&refused.stderr).contains("no `growth` block"));
    assert!(!page.exists());
    let names: Vec<_> = fs::read_dir(folder.path())
        .unwrap()
        .map(|entry| entry.unwrap().file_name())
        .collect();
    assert_eq!(names.len(), 2, "{names:?}");
}

#[test]
fn the_same_file_gives_the_same_page() {
    let file = structure_file("terahertz-module");
    let once = run(&["sheet", &file, "--format", "html"]).stdout;
    let again = Command::new(env!("CARGO_BIN_EXE_wellwright"))
        .args(["sheet", &file, "--format", "html"])
        .env("RAYON_NUM_THREADS", "1")
        .output()
        .unwrap()
        .stdout;
    assert!(once.starts_with(b"<!DOCTYPE html>"));
    assert_eq!(once, again);
}

#[test]
fn cautions_are_those_of_the_stack() {
    let text =
        |name: &str| String::from_utf8(run(&["sheet", &structure_file(name)]).stdout).unwrap();
    let arsenide = text("thermal-camera-8p6um");
    for word in [
        "Arsine",
        "IEC 60825-1",
        "silane: 5 ppm",
        "29 CFR 1910.1018",
        "from memory",
    ] {
        assert!(arsenide.contains(word), "{word}");
    }
    for word in ["hosphine", "Beryllium", "Antimony", "Tellurium"] {
        assert!(!arsenide.contains(word), "{word}");
    }
    // The substrate counts as well: InP under a stack that holds no phosphorus itself.
    let on_phosphide = text("short-wave-emitter");
    for word in ["phosphine", "stibine", "Indium"] {
        assert!(on_phosphide.contains(word), "{word}");
    }
}

/// Three compositions can be grown with these cells: 0.15/1.00, 0.15/(0.42 + 0.15) and 0.15/(0.85 + 0.42 + 0.15). Tuning
/// among them must find what tuning with each of them fixed finds best.
#[test]
fn tuning_among_cells_takes_the_best_growable_composition() {
    let text = |material: &str, fraction: &str, snap: &str| {
        format!(
            "substrate: GaAs\ntemperature: 77 K\nbands: {{conduction: {{model: energy-dependent, states: 2}}}}\nlayers:\n\
             \x20 - {{name: below, material: Al0.15Ga0.85As, width: 30 nm}}\n\
             \x20 - {{name: step, material: {material}, width: 3 nm}}\n\
             \x20 - {{name: well, material: GaAs, width: 8 nm}}\n\
             \x20 - {{name: above, material: Al0.15Ga0.85As, width: 30 nm}}\n\
             tune:\n  vary:\n    - {{layer: well, width: [7 nm, 9 nm]}}\n{fraction}\
             \x20 aims:\n    - {{from: conduction 1, to: conduction 2, energy: 76 meV}}\n\
             \x20   - {{from: conduction 1, to: conduction 2, maximize: dipole, weight: 0.5}}\n{snap}\
             growth:\n  cells:\n\
             \x20   - {{name: Ga 1, element: Ga, rate: 0.85 ML/s}}\n\
             \x20   - {{name: Ga 2, element: Ga, rate: 0.42 ML/s}}\n\
             \x20   - {{name: Al, element: Al, rate: 0.15 ML/s}}\n"
        )
    };
    let among = "    - {layer: step, fraction: Al, between: cells}\n";
    let tuned = |text: &str| {
        let (structure, stack) = laid_out(text);
        let outcome = tune::tune(&structure, &stack, Accuracy::default(), &|_| {}).unwrap();
        (structure, outcome)
    };
    for snap in ["", "  snap: monolayer\n"] {
        let (structure, outcome) = tuned(&text("Al0.2Ga0.8As", among, snap));
        let chosen = outcome
            .after
            .stack
            .composition(1)
            .unwrap()
            .fraction(Element::Al);
        let fixed: Vec<(f64, usize, f64)> = [0.15, 0.26316, 0.10563]
            .into_iter()
            .map(|al: f64| {
                let ga = 1.0 - al;
                let (_, outcome) = tuned(&text(&format!("Al{al}Ga{ga:.5}As"), "", snap));
                let unmet = outcome.met.iter().filter(|met| !**met).count();
                (al, unmet, outcome.after.cost())
            })
            .collect();
        let best = fixed
            .iter()
            .min_by(|a, b| a.1.cmp(&b.1).then(a.2.total_cmp(&b.2)))
            .unwrap();
        near(chosen, best.0, 1e-9);
        near(outcome.after.cost(), best.2, 1e-6 * best.2);
        // What comes out can be grown as it is, but for widths between monolayers when these are allowed.
        let plan = growth::plan(&structure, &outcome.after.stack).unwrap();
        assert!(
            plan.flags
                .iter()
                .all(|flag| matches!(flag, Flag::Remainder { label, .. } if label != "well" || snap.is_empty())),
            "{:?}",
            plan.flags
        );
    }
    // Without cells there is nothing to choose from.
    let bare = text("Al0.2Ga0.8As", among, "");
    let (structure, problems) = structure::read(&bare[..bare.find("growth:").unwrap()]);
    assert!(structure.is_none());
    assert!(
        problems[0]
            .message
            .contains("`between: cells` needs a `growth` block")
    );
    // A layer of one group-III element has no choice either.
    let single = bare.replace("layer: step, fraction: Al", "layer: well, fraction: Ga");
    assert!(structure::read(&single).0.is_none());
}

/// The light that a wafer should give on the bench, whatever field it is made for:
/// - the heavy-hole exciton of 95 Å GaAs wells in Al0.32Ga0.68As at room temperature, 1.457 ± 0.005 eV (Miller and others, Phys. Rev.
///   Lett. 53, 2173 (1984), from memory);
/// - from 77 to 300 K a wide well moves with the gap of GaAs, 1.519 eV − 5.405e-4 T²/(T + 204) (Vurgaftman, Meyer and Ram-Mohan 2001):
///   85.1 meV, less what the lighter mass adds.
#[test]
fn the_sheet_foretells_the_photoluminescence() {
    let folder = tempfile::tempdir().unwrap();
    let peaks = |width: &str, field: &str| -> Vec<serde_json::Value> {
        let text = format!(
            "substrate: GaAs\ntemperature: 120 K\nfield: {field}\nbands: {{conduction: {{model: energy-dependent, states: 1}}, \
             valence: {{model: decoupled, states: 1}}}}\nlayers:\n  - {{material: Al0.32Ga0.68As, width: 15 nm}}\n  \
             - {{material: GaAs, width: {width}}}\n  - {{material: Al0.32Ga0.68As, width: 15 nm}}\n\
             growth: {{rates: {{Ga: 0.68 ML/s, Al: 0.32 ML/s}}}}\n"
        );
        let file = folder.path().join("well.yaml");
        fs::write(&file, text).unwrap();
        let file = file.to_str().unwrap();
        let json: serde_json::Value =
            serde_json::from_slice(&run(&["sheet", file, "--format", "json"]).stdout).unwrap();
        let printed = run(&["sheet", file]).stdout;
        assert!(
            String::from_utf8(printed)
                .unwrap()
                .contains("Expected photoluminescence")
        );
        json["photoluminescence"].as_array().unwrap().clone()
    };
    let of = |row: &serde_json::Value, key: &str| row[key].as_f64().unwrap();
    let narrow = peaks("9.5 nm", "70 kV/cm");
    assert_eq!(narrow, peaks("9.5 nm", "0 kV/cm"));
    assert_eq!(narrow.len(), 2);
    assert_eq!(of(&narrow[1], "temperature_K"), 300.0);
    near(of(&narrow[1], "peak_meV"), 1457.0, 5.0);
    for row in &narrow {
        let binding = of(row, "binding_meV");
        assert!((6.0..10.0).contains(&binding), "{binding}");
        // The file's numbers have twelve digits.
        near(
            of(row, "transition_meV") - binding,
            of(row, "peak_meV"),
            1e-8,
        );
        near(
            of(row, "peak_meV") * of(row, "peak_nm"),
            1_239_841.984,
            0.01,
        );
    }
    let wide = peaks("20 nm", "0 kV/cm");
    near(
        of(&wide[0], "peak_meV") - of(&wide[1], "peak_meV"),
        85.1,
        1.0,
    );
}

/// Aims between bands are transitions of the sheet by their names, and no others are taken for them.
#[test]
fn transitions_between_bands_have_names() {
    let sheet = run(&[
        "sheet",
        "structures/strained-980nm-well.yaml",
        "--format",
        "json",
    ]);
    let json: serde_json::Value = serde_json::from_slice(&sheet.stdout).unwrap();
    let transitions = json["transitions"].as_array().unwrap();
    assert_eq!(transitions.len(), 1);
    assert_eq!(transitions[0]["from"], "heavy-hole 1");
    assert_eq!(transitions[0]["to"], "conduction 1");
    let levels = run(&[
        "levels",
        "structures/strained-980nm-well.yaml",
        "--format",
        "json",
    ]);
    let levels: serde_json::Value = serde_json::from_slice(&levels.stdout).unwrap();
    assert_eq!(
        transitions[0]["energy_meV"],
        levels["interband"][0]["energy_meV"]
    );
}
