//! The program as a shell sees it: exit codes, the two streams, output files, forms, and arguments that are wrong.

mod common;

use common::{Bench, Ran, list, shipped_structures};
use std::process::{Command, Stdio};

const WELL: &str = "\
title: A well
substrate: GaAs
bands: {conduction: {model: parabolic, states: 2}}
layers:
  - {material: Al0.25Ga0.75As, width: 25 nm}
  - {name: well, material: GaAs, width: 6 nm}
  - {material: Al0.25Ga0.75As, width: 25 nm}
";
const TUNE: &str = "\
tune:
  vary: [{layer: well, width: [4 nm, 9 nm]}]
  aims: [{from: conduction 1, to: conduction 2, energy: 120 meV}]
";

/// A folder with `well.yaml`, which can be tuned.
fn bench() -> Bench {
    let bench = Bench::new();
    bench.write("well.yaml", format!("{WELL}{TUNE}"));
    bench
}

#[test]
fn results_go_to_stdout_and_messages_to_stderr() {
    let bench = bench();
    bench.write(
        "doped.yaml",
        format!("field: 5 kV/cm\n{WELL}").replace("width: 6 nm", "width: 6 nm, donors: 1e17 cm^-3"),
    );
    let ran = bench.run(&["levels", "doped.yaml"]).code(0);
    assert!(ran.stdout.contains("from edge meV"), "{}", ran.stdout);
    assert!(!ran.stdout.contains("warning"), "{}", ran.stdout);
    assert!(
        ran.stderr.contains("warning: layer `well` is doped"),
        "{}",
        ran.stderr
    );
    assert!(ran.stderr.contains("doped.yaml:7:28"), "{}", ran.stderr);
    let ran = bench.run(&["levels", "well.yaml"]).code(0);
    assert_eq!(ran.stderr, "");
    let ran = bench.run(&["check", "well.yaml"]).code(0);
    assert!(
        ran.stdout
            .starts_with("well.yaml: 3 layers, 56.00 nm, with a tune block; no mistakes\n"),
        "{}",
        ran.stdout
    );
    assert_eq!(ran.stderr, "");
    let ran = bench.run(&["tune", "well.yaml"]).code(0);
    assert!(
        ran.stdout.starts_with("All aims are met."),
        "{}",
        ran.stdout
    );
    assert_eq!(ran.stderr, "");
}

#[test]
fn an_aim_out_of_reach_ends_with_1() {
    let bench = bench();
    bench.write(
        "far.yaml",
        format!("{WELL}{}", TUNE.replace("120 meV", "20 meV")),
    );
    let ran = bench.run(&["tune", "far.yaml", "-o", "tuned.yaml"]).code(1);
    assert!(
        ran.stdout.contains("this is the nearest design"),
        "{}",
        ran.stdout
    );
    // The nearest design is a result like another, and is written.
    assert!(bench.read("tuned.yaml").contains("width: 9 nm"));
}

#[test]
fn a_misspelt_key_is_shown_with_its_place_and_what_was_meant() {
    let bench = bench();
    bench.write(
        "typo.yaml",
        format!("{}{TUNE}", WELL.replace("substrate:", "substarte:")),
    );
    for command in [
        &["check", "typo.yaml"][..],
        &["levels", "typo.yaml", "-o", "out.csv"],
        &["tune", "typo.yaml", "-o", "out.yaml", "-o", "out.txt"],
    ] {
        let ran = bench.run(command).code(2);
        assert_eq!(ran.stdout, "");
        for words in [
            "error: unknown key `substarte`",
            "typo.yaml:2:1",
            "2 | substarte: GaAs",
            "did you mean `substrate`?",
        ] {
            assert!(
                ran.stderr.contains(words),
                "no `{words}` in\n{}",
                ran.stderr
            );
        }
    }
    assert_eq!(bench.files(), ["typo.yaml", "well.yaml"]);
}

#[test]
fn a_misspelt_material_is_shown_with_what_was_meant() {
    let bench = bench();
    bench.write(
        "typo.yaml",
        WELL.replace("material: GaAs", "material: GaAS"),
    );
    let ran = bench.run(&["levels", "typo.yaml"]).code(2);
    for words in [
        "typo.yaml:6:28",
        "{name: well, material: GaAS, width: 6 nm}",
        "did you mean `GaAs`?",
    ] {
        assert!(
            ran.stderr.contains(words),
            "no `{words}` in\n{}",
            ran.stderr
        );
    }
    let ran = bench.run(&["materials", "InGaSs"]).code(2);
    assert_eq!(ran.stdout, "");
    assert!(ran.stderr.contains("`InGaSs`"), "{}", ran.stderr);
}

#[test]
fn an_output_file_holds_what_would_have_been_printed() {
    let bench = bench();
    for form in ["table", "csv", "json"] {
        let printed = bench
            .run(&["levels", "well.yaml", "--format", form])
            .code(0);
        let written = bench
            .run(&["levels", "well.yaml", "--format", form, "-o", "out"])
            .code(0);
        assert_eq!(written.stdout, "");
        assert_eq!(bench.read("out"), printed.stdout);
    }
    // A second run replaces the file, and no temporary file is left.
    assert_eq!(bench.files(), ["out", "well.yaml"]);
}

#[cfg(unix)]
#[test]
fn an_output_file_can_be_read_by_others_like_any_file() {
    use std::os::unix::fs::PermissionsExt;
    let bench = bench();
    bench.run(&["levels", "well.yaml", "-o", "out"]).code(0);
    let mode = bench.path("out").metadata().unwrap().permissions().mode();
    assert_eq!(mode & 0o777, 0o644);
}

#[test]
fn an_input_is_never_written_over() {
    let bench = bench();
    let before = bench.read("well.yaml");
    std::fs::create_dir(bench.path("sub")).unwrap();
    let mut names = vec!["well.yaml", "./well.yaml", "sub/../well.yaml"];
    #[cfg(unix)]
    {
        std::os::unix::fs::symlink(bench.path("well.yaml"), bench.path("link.yaml")).unwrap();
        names.push("link.yaml");
    }
    for name in names {
        for command in ["levels", "tune"] {
            let ran = bench.run(&[command, "well.yaml", "-o", name]).code(2);
            assert_eq!(ran.stdout, "");
            assert!(
                ran.stderr
                    .contains("is an input of this run and is not overwritten"),
                "{}",
                ran.stderr
            );
            assert_eq!(bench.read("well.yaml"), before);
        }
    }
}

#[test]
fn places_that_cannot_be_written_are_told_before_any_work() {
    let bench = bench();
    let ran = bench
        .run(&["levels", "well.yaml", "-o", "nowhere/out"])
        .code(2);
    assert!(
        ran.stderr
            .contains("nowhere/out cannot be written: there is no folder nowhere"),
        "{}",
        ran.stderr
    );
    let ran = bench
        .run(&["tune", "well.yaml", "-o", "nowhere/out.yaml"])
        .code(2);
    assert_eq!(ran.stdout, "");
    assert!(
        ran.stderr.contains("there is no folder nowhere"),
        "{}",
        ran.stderr
    );
    std::fs::create_dir(bench.path("folder")).unwrap();
    let ran = bench.run(&["levels", "well.yaml", "-o", "folder"]).code(2);
    assert!(
        ran.stderr
            .contains("folder cannot be written: it is a folder"),
        "{}",
        ran.stderr
    );
    assert_eq!(bench.files(), ["folder", "well.yaml"]);
}

#[test]
fn tune_writes_the_structure_and_the_report_by_the_file_names() {
    let bench = bench();
    let ran = bench
        .run(&[
            "tune",
            "well.yaml",
            "-o",
            "report.json",
            "-o",
            "new.yml",
            "--format",
            "json",
        ])
        .code(0);
    assert_eq!(ran.stdout, "");
    let report: serde_json::Value = serde_json::from_str(&bench.read("report.json")).unwrap();
    assert_eq!(report["structure"].as_str().unwrap(), bench.read("new.yml"));
    let ran = bench
        .run(&["tune", "well.yaml", "-o", "a.yaml", "-o", "b.yaml"])
        .code(2);
    assert!(
        ran.stderr.contains("-o may be given once"),
        "{}",
        ran.stderr
    );
    assert_eq!(bench.files(), ["new.yml", "report.json", "well.yaml"]);
}

/// The tables of a CSV result, which stand one after the other with an empty line between.
fn tables(text: &str) -> Vec<(Vec<String>, usize)> {
    text.split("\n\n")
        .map(|table| {
            let mut reader = csv::Reader::from_reader(table.as_bytes());
            let header = reader
                .headers()
                .unwrap()
                .iter()
                .map(str::to_owned)
                .collect();
            // Rows of another length than the header are an error of the reader.
            let rows = reader
                .records()
                .collect::<Result<Vec<_>, _>>()
                .unwrap()
                .len();
            (header, rows)
        })
        .collect()
}

#[test]
fn csv_and_json_can_be_read_by_others() {
    let bench = bench();
    let levels = tables(
        &bench
            .run(&["levels", "well.yaml", "--format", "csv"])
            .code(0)
            .stdout,
    );
    assert!(levels.len() >= 2, "{levels:?}");
    assert_eq!(levels[0].1, 2);
    assert_eq!(levels[1].1, 1);
    assert!(levels[0].0.contains(&"energy_eV".to_owned()), "{levels:?}");
    assert!(
        levels[1].0.contains(&"wavelength_um".to_owned()),
        "{levels:?}"
    );
    let tuned = tables(
        &bench
            .run(&["tune", "well.yaml", "--format", "csv"])
            .code(0)
            .stdout,
    );
    assert_eq!((tuned[0].1, tuned[1].1), (1, 1), "{tuned:?}");
    assert!(tuned[1].0.contains(&"upper_bound".to_owned()), "{tuned:?}");
    for arguments in [
        &["materials"][..],
        &["materials", "Al0.3Ga0.7As", "--temperature", "77 K"],
    ] {
        let with = |form| {
            bench
                .run(&[arguments, &["--format", form]].concat())
                .code(0)
        };
        for (header, rows) in tables(&with("csv").stdout) {
            assert!(header.len() > 1 && rows > 0, "{header:?}");
        }
        assert!(with("json").json().is_object());
    }
    let json = bench
        .run(&["levels", "well.yaml", "--format", "json"])
        .code(0)
        .json();
    assert_eq!(json["title"], "A well");
    assert_eq!(list(&json, "subbands").len(), 2);
}

#[test]
fn a_reader_that_goes_away_is_no_error() {
    let bench = bench();
    for arguments in [
        &["levels", "well.yaml"][..],
        &["tune", "well.yaml"],
        &["check", "well.yaml"],
        &["materials"],
    ] {
        let mut child = Command::new(env!("CARGO_BIN_EXE_wellwright"))
            .args(arguments)
            .current_dir(bench.path(""))
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        drop(child.stdout.take());
        let ran = Ran::from(child.wait_with_output().unwrap()).code(0);
        assert_eq!(ran.stderr, "", "{arguments:?}");
    }
}

#[test]
fn colour_is_for_terminals_and_for_those_who_ask() {
    let bench = bench();
    bench.write("typo.yaml", WELL.replace("title", "titel"));
    let with = |settings: &[(&str, &str)]| {
        let output = bench
            .program()
            .args(["check", "typo.yaml"])
            .envs(settings.iter().copied())
            .output();
        Ran::from(output.unwrap()).code(2).stderr
    };
    assert!(!with(&[]).contains('\u{1b}'));
    assert!(with(&[("CLICOLOR_FORCE", "1")]).contains('\u{1b}'));
    assert!(!with(&[("CLICOLOR_FORCE", "1"), ("NO_COLOR", "1")]).contains('\u{1b}'));
}

#[test]
fn files_that_cannot_be_read() {
    let bench = bench();
    for command in ["check", "levels", "tune"] {
        let ran = bench.run(&[command, "none.yaml"]).code(2);
        assert!(
            ran.stderr
                .contains("none.yaml cannot be read: No such file"),
            "{}",
            ran.stderr
        );
        let ran = bench.run(&[command, "."]).code(2);
        assert!(
            ran.stderr.contains(". cannot be read: Is a directory"),
            "{}",
            ran.stderr
        );
    }
}

#[test]
fn a_byte_order_mark_and_carriage_returns_are_kept() {
    let bench = bench();
    let text = format!("\u{feff}{}", format!("{WELL}{TUNE}").replace('\n', "\r\n"));
    bench.write("windows.yaml", &text);
    let plain = bench.run(&["levels", "well.yaml"]).code(0);
    assert_eq!(
        bench.run(&["levels", "windows.yaml"]).code(0).stdout,
        plain.stdout
    );
    bench
        .run(&["tune", "windows.yaml", "-o", "tuned.yaml"])
        .code(0);
    bench
        .run(&["tune", "well.yaml", "-o", "plain.yaml"])
        .code(0);
    let tuned = bench.read("tuned.yaml");
    assert_eq!(
        tuned.trim_start_matches('\u{feff}'),
        bench.read("plain.yaml").replace('\n', "\r\n")
    );
}

#[test]
fn arguments_that_are_wrong_end_with_2() {
    let bench = bench();
    for (arguments, words) in [
        (&[][..], "Usage: wellwright"),
        (&["levels"], "<FILE>"),
        (&["tune"], "<FILE>"),
        (&["check"], "<FILE>"),
        (&["levle", "well.yaml"], "unrecognized subcommand 'levle'"),
        (&["levels", "well.yaml", "--fromat", "csv"], "'--format'"),
        (
            &["levels", "well.yaml", "--format", "xml"],
            "table, csv, json",
        ),
        (&["levels", "well.yaml", "-o"], "-o"),
        (
            &["materials", "GaAs", "--temperature", "77"],
            "`77` has no unit; expected a temperature, such as \"77 K\"",
        ),
        (
            &["materials", "GaAs", "--temperature", "cold"],
            "`cold` does not begin with a number",
        ),
        (
            &["materials", "GaAs", "--temperature", "77 nm"],
            "`nm` is the unit of a length",
        ),
        (
            &["materials", "GaAs", "--temperature", "-5 K"],
            "from 0 K to 1000 K",
        ),
        (
            &["materials", "GaAs", "--temperature", "NaN K"],
            "`NaN K` does not begin with a number",
        ),
        (&["materials", "Al0.3Ga0.8As"], "add up to 1.1, not to 1"),
        (&["materials", "GaAss"], "did you mean `GaAs`?"),
        (&["materials", ""], "``"),
    ] {
        let ran = bench.run(arguments).code(2);
        assert!(
            ran.stderr.contains(words),
            "{arguments:?}: no `{words}` in\n{}",
            ran.stderr
        );
        assert_eq!(ran.stdout, "", "{arguments:?}");
    }
}

#[test]
fn help_and_version_are_results() {
    let bench = bench();
    let help = bench.run(&["--help"]).code(0);
    for command in ["levels", "tune", "check", "materials"] {
        assert!(help.stdout.contains(command), "{}", help.stdout);
        bench.run(&[command, "--help"]).code(0);
    }
    assert!(
        bench
            .run(&["--version"])
            .code(0)
            .stdout
            .contains(env!("CARGO_PKG_VERSION"))
    );
}

#[test]
fn the_same_input_gives_the_same_bytes_on_any_number_of_threads() {
    for file in shipped_structures() {
        // A stack with open ends need not have anything to tune.
        if !std::fs::read_to_string(&file).unwrap().contains("\ntune:") {
            continue;
        }
        let bench = Bench::new();
        let on = |threads: &str| {
            let output = bench
                .program()
                .args(["tune", file.to_str().unwrap(), "--format", "json"])
                .env("RAYON_NUM_THREADS", threads)
                .output();
            Ran::from(output.unwrap()).code(0).stdout
        };
        assert_eq!(on("1"), on("3"), "{}", file.display());
    }
}
