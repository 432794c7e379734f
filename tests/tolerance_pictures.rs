//! The pictures of sensitivities and yield show the numbers that `tolerance` prints.

mod common;

use common::{Bench, list, number};
use roxmltree::Document;

const FILE: &str = "\
title: Well & <window>
temperature: 77 K
substrate: GaAs
layers:
  - {name: lower, material: Al0.3Ga0.7As, width: 20 nm}
  - {name: well, material: GaAs, width: 6 nm}
  - {name: upper, material: Al0.3Ga0.7As, width: 20 nm}
tolerance:
  rate: 0.7 %
  field: 1 kV/cm
  samples: 500
  window: {from: conduction 1, to: conduction 2, wavelength: [7.47 µm, 9 µm]}
";

fn texts(svg: &str) -> Vec<String> {
    let document = Document::parse(svg).unwrap();
    let nodes = document.descendants().filter(|node| node.is_text());
    nodes
        .filter_map(|node| node.text().map(str::to_owned))
        .collect()
}

#[test]
fn bars_carry_the_shifts_and_the_histogram_the_share() {
    bars_and_histogram(FILE, "conduction 1", "conduction 2");
}

/// The same across the gap, the window written from the electron to the hole.
#[test]
fn pictures_between_bands_show_their_numbers() {
    let file = FILE.replace(
        "substrate: GaAs\n",
        "substrate: GaAs\nbands: {conduction: {model: energy-dependent, states: 2}, valence: {model: decoupled, states: 3}}\n",
    );
    let window = "window: {from: conduction 1, to: light-hole 1, wavelength: [767.5 nm, 769 nm]}";
    let at = file.find("window: {").unwrap();
    let file = format!("{}{window}\n", &file[..at]);
    bars_and_histogram(&file, "light-hole 1", "conduction 1");
}

fn bars_and_histogram(file: &str, from: &str, to: &str) {
    let bench = Bench::new();
    bench.write("well.yaml", file);
    let report = bench
        .run(&["tolerance", "well.yaml", "--format", "json"])
        .code(0)
        .json();
    bench
        .run(&[
            "plot",
            "well.yaml",
            "--what",
            "sensitivities",
            "-o",
            "bars.svg",
        ])
        .code(0);
    let bars = texts(&bench.read("bars.svg"));
    let drawn = list(&report, "sensitivities")
        .iter()
        .filter(|row| row["from"] == from && row["to"] == to);
    let mut count = 0;
    for row in drawn {
        count += 1;
        let name = row["quantity"].as_str().unwrap();
        assert!(bars.iter().any(|text| text == name), "{name}: {bars:?}");
        let shift_mev = number(row, "energy_meV");
        if shift_mev.abs() > 0.01 {
            // Three digits with a true minus sign.
            let close = bars.iter().any(|text| {
                let value = text.replace('−', "-").parse::<f64>();
                value.is_ok_and(|value| (value / shift_mev - 1.0).abs() < 6e-3)
            });
            assert!(close, "{name} {shift_mev}: {bars:?}");
        }
    }
    assert!(count >= 5);

    bench
        .run(&["plot", "well.yaml", "--what", "yield", "-o", "yield.svg"])
        .code(0);
    let histogram = texts(&bench.read("yield.svg"));
    let share = 100.0 * number(&list(&report, "windows")[0], "share");
    assert!((1.0..99.9).contains(&share), "{share}");
    let said = format!("{share:.1} % inside");
    assert!(
        histogram.iter().any(|text| text.contains(&said)),
        "{said}: {histogram:?}"
    );
}

#[test]
fn a_file_without_spreads_has_no_yield_to_draw() {
    let bench = Bench::new();
    bench.write("well.yaml", &FILE[..FILE.find("tolerance:").unwrap()]);
    let ran = bench
        .run(&["plot", "well.yaml", "--what", "yield", "-o", "yield.svg"])
        .code(2);
    assert!(ran.stderr.contains("nothing to draw"), "{}", ran.stderr);
    assert_eq!(bench.files(), ["well.yaml"]);
}
