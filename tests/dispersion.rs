//! The command that follows coupled bands: its numbers against the closed form of a hard-walled well, its forms and its
//! mistakes. The physics of the bands is held in `tests/multiband.rs`.

mod common;

use common::Bench;
use serde_json::Value;

const WELL: &str = "\
title: Holes in a box
temperature: 300 K
bands: {conduction: {model: parabolic}}
materials:
  Box: {like: GaAs, valence_edge: -0.8 eV, luttinger: [6.98, 2.06, 2.93], spin_orbit: 0.341 eV}
layers:
  - {material: Box, width: 8 nm}
";

/// ħ²/2m₀ in eV nm², from CODATA 2022.
const HBAR2_OVER_2M0: f64 = 0.038_099_821;

fn number(value: &Value) -> f64 {
    value.as_f64().unwrap()
}

/// E_n = −(ħ²/2m₀)(γ₁ − 2γ₂)(nπ/L)² for heavy holes between hard walls: a textbook's closed form, since heavy holes are
/// uncoupled at k∥ = 0.
#[test]
fn heavy_holes_between_walls_have_the_closed_form() {
    let bench = Bench::new();
    bench.write("box.yaml", WELL);
    let run = bench.run(&[
        "dispersion",
        "box.yaml",
        "--points",
        "3",
        "--states",
        "8",
        "--format",
        "json",
    ]);
    assert_eq!(run.code, 0, "{}", run.stderr);
    let report: Value = serde_json::from_str(&run.stdout).unwrap();
    let heavy: Vec<f64> = report["subbands"]
        .as_array()
        .unwrap()
        .iter()
        .filter(|row| number(&row["heavy_share"]) > 0.999)
        .map(|row| number(&row["energy_eV"]))
        .collect();
    assert!(heavy.len() >= 3, "{report}");
    for (n, energy_ev) in heavy.iter().take(3).enumerate() {
        let wave = (n + 1) as f64 * std::f64::consts::PI / 8.0;
        let exact_ev = -0.8 - HBAR2_OVER_2M0 * (6.98 - 2.0 * 2.06) * wave * wave;
        assert!(
            (energy_ev - exact_ev).abs() < 1e-6,
            "{n}: {energy_ev} for {exact_ev}"
        );
    }
    // At every point there is one row for each subband, and shares add up.
    let points = report["points"].as_array().unwrap();
    assert_eq!(
        points.len(),
        3 * report["subbands"].as_array().unwrap().len()
    );
    for row in points {
        let sum: f64 = [
            "conduction_share",
            "heavy_share",
            "light_share",
            "split_off_share",
        ]
        .iter()
        .map(|key| number(&row[*key]))
        .sum();
        assert!((sum - 1.0).abs() < 1e-9, "{row}");
    }
}

#[test]
fn forms_and_picture() {
    let bench = Bench::new();
    bench.write("box.yaml", WELL);
    let csv = bench.run(&["dispersion", "box.yaml", "--points", "3", "--format", "csv"]);
    assert_eq!(csv.code, 0, "{}", csv.stderr);
    let tables: Vec<&str> = csv.stdout.split("\n\n").collect();
    assert_eq!(tables.len(), 2);
    for table in tables {
        let mut reader = csv::Reader::from_reader(table.as_bytes());
        assert!(reader.records().all(|record| record.is_ok()));
    }
    let text = bench.run(&[
        "dispersion",
        "box.yaml",
        "--model",
        "eight-band",
        "--along",
        "110",
        "--points",
        "3",
    ]);
    assert_eq!(text.code, 0, "{}", text.stderr);
    assert!(
        text.stdout.contains("eight-band model, k∥ along [110]")
            && text.stdout.contains("conduction 1")
    );
    let picture = bench.run(&["dispersion", "box.yaml", "--points", "3", "-o", "box.svg"]);
    assert_eq!(picture.code, 0, "{}", picture.stderr);
    let drawn = bench.read("box.svg");
    let svg = roxmltree::Document::parse(&drawn).unwrap();
    assert!(
        svg.descendants()
            .any(|node| node.text() == Some("valence 4"))
    );
}

#[test]
fn mistakes_are_named() {
    let bench = Bench::new();
    bench.write("box.yaml", WELL);
    let unit = bench.run(&["dispersion", "box.yaml", "--to", "0.5"]);
    assert!(
        unit.code == 2 && unit.stderr.contains("has no unit"),
        "{}",
        unit.stderr
    );
    let far = bench.run(&["dispersion", "box.yaml", "--to", "5 nm^-1"]);
    assert!(
        far.code == 2 && far.stderr.contains("up to 2 nm^-1"),
        "{}",
        far.stderr
    );
    let bare = "materials:\n  M: {conduction_edge: 0.1 eV, electron_mass: 0.07}\nlayers:\n  - {material: M, width: 8 nm}\n";
    let bench = Bench::new();
    bench.write("bare.yaml", bare);
    let missing = bench.run(&["dispersion", "bare.yaml", "-o", "never.csv"]);
    assert!(
        missing.code == 2
            && missing.stderr.contains("bare.yaml:4:16")
            && missing.stderr.contains("six-band"),
        "{}",
        missing.stderr
    );
    assert_eq!(bench.files(), ["bare.yaml"]);
}
