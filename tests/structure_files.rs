//! Structure files with mistakes: what is said about each, and where. The expected places were counted by hand.

use wellwright::diagnostics::{Diagnostic, Severity};
use wellwright::structure::{self, document};

/// Line and column of a message, counted from 1, the column in characters.
fn place(text: &str, diagnostic: &Diagnostic) -> (usize, usize) {
    let at = diagnostic.span.clone().expect("a place").start;
    let before = &text[..at];
    let line_start = before.rfind('\n').map_or(0, |at| at + 1);
    (
        document::line_of(text, at),
        1 + before[line_start..].chars().count(),
    )
}

/// All that is said about a message, in one line.
fn said(diagnostic: &Diagnostic) -> String {
    format!(
        "{} | {} | {}",
        diagnostic.message,
        diagnostic.expected.as_deref().unwrap_or_default(),
        diagnostic.hint.as_deref().unwrap_or_default()
    )
}

/// Holds that the file's errors are exactly these, in this order, each with its place and the words given.
#[track_caller]
fn mistakes(text: &str, expected: &[(usize, usize, &[&str])]) {
    let (structure, problems) = structure::read(text);
    let errors: Vec<&Diagnostic> = problems
        .iter()
        .filter(|problem| problem.severity == Severity::Error)
        .collect();
    let listed: Vec<String> = errors
        .iter()
        .map(|error| format!("{:?} {}", place(text, error), said(error)))
        .collect();
    let listed = listed.join("\n");
    assert_eq!(errors.len(), expected.len(), "\n{listed}\n");
    for (error, (line, column, words)) in errors.iter().zip(expected) {
        assert_eq!(place(text, error), (*line, *column), "\n{listed}\n");
        for word in *words {
            assert!(said(error).contains(word), "no `{word}` in\n{listed}\n");
        }
        assert!(!error.render("well.yaml", text, false).is_empty());
    }
    assert!(structure.is_none());
}

/// Holds that a file without errors has exactly these warnings.
#[track_caller]
fn doubts(text: &str, expected: &[(usize, &[&str])]) {
    let (structure, problems) = structure::read(text);
    let listed: Vec<String> = problems.iter().map(said).collect();
    let listed = listed.join("\n");
    assert!(structure.is_some(), "\n{listed}\n");
    assert_eq!(problems.len(), expected.len(), "\n{listed}\n");
    for (problem, (line, words)) in problems.iter().zip(expected) {
        assert_eq!(place(text, problem).0, *line, "\n{listed}\n");
        for word in *words {
            assert!(said(problem).contains(word), "no `{word}` in\n{listed}\n");
        }
    }
}

const LAYERS: &str = "layers: [{name: well, material: GaAs, width: 5 nm}]\n";

#[test]
fn a_good_file_is_read_whole() {
    let text = "\
title: Detector well
substrate: GaAs
temperature: 77 K
field: -12 kV/cm
ends: walls
bands:
  conduction: {model: energy-dependent, states: 6}
layers:
  - {material: Al0.26Ga0.74As, width: 30 nm}
  - repeat: 2
    layers:
      - {name: well, material: GaAs, width: 52 Å}
      - {name: cap, material: Al0.26Ga0.74As, width: 0.03 µm}
tune:
  vary:
    - {layer: well, width: [3 nm, 9 nm]}
    - {layer: cap, fraction: Al, between: [0.18, 0.35]}
    - {field: [-60 kV/cm, 60 kV/cm]}
  aims:
    - {from: conduction 1, to: conduction 2, wavelength: 8.6 um, within: 1 %}
    - {from: conduction 2, to: conduction 3, energy: 36 meV, weight: 0.5, follow: character}
    - {from: conduction 1, to: conduction 2, maximize: dipole, weight: 0.1}
  snap: monolayer
";
    let (structure, problems) = structure::read(text);
    assert_eq!(problems, []);
    let structure = structure.unwrap();
    assert_eq!(structure.title.as_deref(), Some("Detector well"));
    assert_eq!(structure.temperature_k, 77.0);
    assert_eq!(structure.conduction.states, 6);
    assert_eq!(structure.entries.len(), 3);
    assert_eq!(structure.entries[0].label, "layer 1");
    assert_eq!(structure.entries[1].label, "well");
    let tune = structure.tune.as_ref().unwrap();
    assert_eq!(tune.vary.len(), 3);
    assert_eq!(tune.aims.len(), 3);
    assert!(tune.snap_to_monolayers);
    let stack = structure.stack().unwrap();
    assert_eq!(stack.layers.len(), 5);
    assert!((stack.total_width_nm() - (30.0 + 2.0 * 35.2)).abs() < 1e-9);
    assert!((stack.field_v_per_nm + 12e-4).abs() < 1e-15);
}

#[test]
fn all_mistakes_of_a_file_are_reported_at_once() {
    mistakes(
        "\
titel: x
temprature: 77 K
field: 12
substrate: GaAss
layers:
  - {material: Al0.26Ga0.74As, width: 30}
  - {name: well, material: GaAs, widht: 5 nm}
  - {name: well, material: GaAs, width: -5 nm}
tune:
  vary: [{layer: wel, width: [3 nm, 9 nm]}]
  aims: []
",
        &[
            (1, 1, &["unknown key `titel`", "did you mean `title`?"]),
            (2, 1, &["`temprature`", "did you mean `temperature`?"]),
            (
                3,
                8,
                &["`12` has no unit", "an electric field such as `30 kV/cm`"],
            ),
            (4, 12, &["GaAss", "did you mean `GaAs`?"]),
            (6, 39, &["`30` has no unit", "`5.2 nm`", "as in `30 nm`"]),
            (7, 34, &["unknown key `widht`", "did you mean `width`?"]),
            (8, 12, &["two layers are named `well`", "line 7"]),
            (8, 41, &["`-5 nm` is out of range", "from 0.01 nm"]),
            (10, 18, &["no layer is named `wel`", "did you mean `well`?"]),
            (11, 9, &["there is no aim", "a list"]),
        ],
    );
}

#[test]
fn text_that_is_not_yaml_is_one_message_with_its_place() {
    mistakes(
        "title: Well: 8.6\n",
        &[(1, 12, &["not YAML", "quotation marks"])],
    );
    mistakes("layers:\n\t- a\n", &[(2, 2, &["tabs", "spaces"])]);
    mistakes(
        "a: [1, 2\n",
        &[(1, 4, &["unclosed bracket", "end of the file"])],
    );
    mistakes("µ: [1,\n  'x\n", &[(2, 3, &["unclosed quote"])]);
    mistakes("a: *no\n", &[(1, 4, &["no `&name` marks"])]);
    mistakes("a: &x [*x]\n", &[(1, 8, &["a part of"])]);
    mistakes("a: 1\n---\nb: 1\n", &[(3, 1, &["second YAML document"])]);
    mistakes(
        "title: a\r\ntitle: b\r\n",
        &[(2, 1, &["`title` stands here a second time", "line 1"])],
    );
}

#[test]
fn bytes_that_are_no_text_are_one_message() {
    for (bytes, words) in [
        (&b"\x7fELF\0\0"[..], "binary file"),
        (b"title: \xff\xfe\n", "line 1 belongs to no character"),
        (
            &[b'#'; document::MAX_BYTES + 1],
            "more than the 2097152 bytes",
        ),
    ] {
        let problem = document::decode(bytes).unwrap_err();
        assert!(said(&problem).contains(words), "{}", said(&problem));
    }
    assert_eq!(document::decode("\u{feff}a: µ".as_bytes()), Ok("a: µ"));
}

#[test]
fn a_byte_order_mark_and_carriage_returns_do_no_harm() {
    let text = format!("\u{feff}title: x\r\n{}", LAYERS.replace('\n', "\r\n"));
    let (structure, problems) = structure::read(&text);
    assert_eq!(problems, []);
    assert_eq!(structure.unwrap().title.as_deref(), Some("x"));
    mistakes(
        "title: x\r\nfield: 3 V\r\nlayers: [{material: GaAs, width: 5 nm}]\r\n",
        &[(2, 8, &["`V` is no unit known here"])],
    );
}

#[test]
fn empty_files_and_wrong_kinds() {
    mistakes("# nothing\n", &[(1, 1, &["the file is empty", "layers"])]);
    mistakes(
        "just words\n",
        &[(1, 1, &["a single value", "a structure file"])],
    );
    mistakes("- a\n- b\n", &[(1, 1, &["a list stands here"])]);
    mistakes("title: x\n", &[(1, 1, &["the file has no `layers`"])]);
    mistakes(
        "layers:\n",
        &[(1, 7, &["nothing stands here", "a list of layers"])],
    );
    mistakes("layers: []\n", &[(1, 9, &["there is no layer"])]);
    mistakes(
        "layers: [GaAs]\n",
        &[(1, 10, &["a single value", "a layer"])],
    );
    mistakes(
        "layers: {material: GaAs}\n",
        &[(1, 9, &["a mapping", "a list of layers"])],
    );
    mistakes(
        "layers: [{material: [GaAs], width: {a: b}}]\n? [x]\n: y\n",
        &[
            (1, 21, &["a list stands here", "Ga0.74As"]),
            (1, 36, &["a mapping", "a length such as `5.2 nm`"]),
            (2, 3, &["a list stands here", "a key"]),
        ],
    );
}

#[test]
fn quantities_of_the_file() {
    let with = |head: &str| format!("{head}\n{LAYERS}");
    mistakes(
        &with("temperature: 77"),
        &[(1, 14, &["`77` has no unit", "as in `77 K`"])],
    );
    mistakes(
        &with("temperature: -4 K"),
        &[(1, 14, &["out of range", "0 K to 1000 K"])],
    );
    mistakes(&with("temperature: 5000 K"), &[(1, 14, &["out of range"])]);
    mistakes(
        &with("temperature: 77 nm"),
        &[(1, 14, &["`nm` is the unit of a length", "a temperature"])],
    );
    mistakes(
        &with("temperature: 77 k"),
        &[(1, 14, &["`k` is no unit", "did you mean `K`?"])],
    );
    mistakes(
        &with("temperature: cold"),
        &[(1, 14, &["does not begin with a number"])],
    );
    mistakes(
        &with("temperature: .inf"),
        &[(1, 14, &["does not begin with a number"])],
    );
    mistakes(
        &with("temperature: .nan K"),
        &[(1, 14, &["does not begin with a number"])],
    );
    mistakes(
        &with("temperature: 1e999 K"),
        &[(1, 14, &["not a finite number"])],
    );
    mistakes(
        &with("temperature:"),
        &[(1, 12, &["nothing stands here", "77 K"])],
    );
    mistakes(
        &with("field: 11 MV/cm"),
        &[(1, 8, &["out of range", "10 MV/cm"])],
    );
    mistakes(&with("field: '12'"), &[(1, 8, &["`12` has no unit"])]);
    mistakes(&with("title: ''"), &[(1, 8, &["empty text"])]);
}

#[test]
fn parts_that_are_not_available() {
    let with = |head: &str| format!("{head}\n{LAYERS}");
    mistakes(
        &with("ends: wals"),
        &[(1, 7, &["`wals`", "did you mean `walls`?"])],
    );
    mistakes(
        &with("bands: {conduction: {model: eight-band, states: 0}}"),
        &[(1, 49, &["`0` is out of range", "1 to 200"])],
    );
    mistakes(
        &with("bands: {conduction: {model: eight-band}, valence: {model: six-band}}"),
        &[(
            1,
            59,
            &[
                "`eight-band` solves electrons and holes as one problem",
                "`valence` asks for `six-band`",
                "no `model` here",
            ],
        )],
    );
    mistakes(
        &with("bands: {conduction: {model: parabolic}, valence: {model: eight-band}}"),
        &[(1, 29, &["`conduction` asks for `parabolic`"])],
    );
    mistakes(
        &with("bands: {conduction: {model: six-band}}"),
        &[(1, 29, &["`six-band`", "expected"])],
    );
    mistakes(
        &with("bands: {conduction: {states: 1000000}}"),
        &[(1, 30, &["out of range", "200"])],
    );
    mistakes(
        &with("bands: {conduction: {states: 4.5}}"),
        &[(1, 30, &["not a whole number"])],
    );
    mistakes(
        &with("bands: {conduction: {states: -4}}"),
        &[(1, 30, &["not a whole number of at least 1"])],
    );
    mistakes(
        &with("bands: {conducton: {states: 4}}"),
        &[(1, 9, &["did you mean `conduction`?"])],
    );
}

#[test]
fn layers_and_repeats() {
    let layers = |content: &str| format!("layers:\n  - {content}\n");
    mistakes(
        &layers("{material: GaAs}"),
        &[(2, 5, &["no `width`", "add `width: 5.2 nm`"])],
    );
    mistakes(&layers("{width: 5 nm}"), &[(2, 5, &["no `material`"])]);
    mistakes(
        &layers("{material: GaAs, width: 0 nm}"),
        &[(2, 29, &["out of range", "from 0.01 nm"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 1e300 nm}"),
        &[(2, 29, &["out of range", "100 µm"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 5 m}"),
        &[(2, 29, &["`m` is no unit"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 5 NM}"),
        &[(2, 29, &["did you mean `nm`?"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 0 ML}"),
        &[(2, 29, &["out of range"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 5 nm, donors: 5e17}"),
        &[(2, 43, &["no unit", "cm^-3"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 5 nm, donors: 5e11 cm^-2}"),
        &[(2, 43, &["density per area", "density per volume"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 5 nm, acceptors: -1 cm^-3}"),
        &[(2, 46, &["out of range", "1e22"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 5 nm, profile: parabolic}"),
        &[(2, 44, &["second material", "`to: GaAs`"])],
    );
    mistakes(
        &layers("{material: GaAs, width: 5 nm, to: AlAs, profile: cubic}"),
        &[(2, 54, &["`cubic`", "`linear` or `parabolic`"])],
    );
    mistakes(&layers("{repeat: 3}"), &[(2, 5, &["no `layers`"])]);
    mistakes(
        &layers("{layers: [{material: GaAs, width: 5 nm}]}"),
        &[(2, 5, &["no `repeat`"])],
    );
    mistakes(
        &layers("{repeat: 3, layers: []}"),
        &[(2, 25, &["there is no layer"])],
    );
    mistakes(
        &layers("{repeat: 1000000000, layers: [{material: GaAs, width: 5 nm}]}"),
        &[(2, 14, &["out of range", "10000"])],
    );
    mistakes(
        &layers("{repeat: 99999999999999999999, layers: [{material: GaAs, width: 5 nm}]}"),
        &[(2, 14, &["out of range"])],
    );
    mistakes(
        &layers(
            "{repeat: 10000, layers: [{repeat: 10000, layers: [{material: GaAs, width: 5 nm}]}]}",
        ),
        &[(2, 3, &["100000000 layers", "at most 20000"])],
    );
    mistakes(
        &layers("{repeat: 3, width: 5 nm, layers: [{material: GaAs, width: 5 nm}]}"),
        &[(2, 5, &["`width` stands beside `repeat`"])],
    );
}

#[test]
fn materials_that_do_not_exist() {
    let layer = |material: &str| format!("layers: [{{material: {material}, width: 5 nm}}]\n");
    mistakes(&layer("Al0.26Ga0.64As"), &[(1, 21, &["Al0.26Ga0.64As"])]);
    mistakes(
        &layer("GaAss"),
        &[(1, 21, &["GaAss", "did you mean `GaAs`?"])],
    );
    mistakes(&layer("Al1.2Ga-0.2As"), &[(1, 21, &["Al1.2Ga-0.2As"])]);
    mistakes(
        &layer("InGaAs"),
        &[(1, 21, &["InGaAs", "match: substrate"])],
    );
    mistakes(
        "materials: {Barrier: {conduction_edge: 0.23 eV, electron_mass: 0.0919}}\nlayers: [{material: Barier, width: 5 nm}]\n",
        &[(2, 21, &["Barier", "did you mean `Barrier`?"])],
    );
    mistakes(
        "layers: [{material: InGaAs, width: 5 nm, match: substrate}]\n",
        &[(1, 49, &["match the substrate", "substrate: InP"])],
    );
    mistakes(
        "substrate: InP\nlayers: [{material: In0.53Ga0.47As, width: 5 nm, match: substrate}]\n",
        &[(2, 57, &["no fraction open", "`material: InGaAs`"])],
    );
    mistakes(
        "substrate: InGaAs\nlayers: [{material: GaAs, width: 5 nm}]\n",
        &[(1, 12, &["InGaAs", "fractions open"])],
    );
}

#[test]
fn tuning_that_cannot_work() {
    let head = "\
layers:
  - {name: well, material: GaAs, width: 5 nm}
  - {name: cap, material: Al0.26Ga0.74As, width: 5 nm}
";
    let vary = |content: &str| {
        format!(
            "{head}tune:\n  vary: [{content}]\n  aims: [{{from: conduction 1, to: conduction 2, energy: 0.1 eV}}]\n"
        )
    };
    mistakes(
        &format!("{head}tune:\n"),
        &[(4, 5, &["nothing stands here", "`tune`"])],
    );
    mistakes(
        &format!("{head}tune: {{}}\n"),
        &[(4, 7, &["no `vary`"]), (4, 7, &["no `aims`"])],
    );
    mistakes(&vary(""), &[(5, 9, &["nothing to vary"])]);
    mistakes(
        &vary("{layer: wall, width: [3 nm, 9 nm]}"),
        &[(5, 18, &["`wall`", "did you mean `well`?"])],
    );
    mistakes(
        &vary("{layer: well, width: [9 nm, 3 nm]}"),
        &[(5, 31, &["reversed"])],
    );
    mistakes(
        &vary("{layer: well, width: [3 nm, 30 Å]}"),
        &[(5, 31, &["equal"])],
    );
    mistakes(
        &vary("{layer: well, width: [3 nm]}"),
        &[(5, 31, &["1 bounds", "the lower and the upper"])],
    );
    mistakes(
        &vary("{layer: well, width: 3 nm}"),
        &[(5, 31, &["a single value", "[3 nm, 9 nm]"])],
    );
    mistakes(
        &vary("{layer: well, width: [0 nm, 9 nm]}"),
        &[(5, 32, &["out of range"])],
    );
    mistakes(
        &vary("{layer: well, width: [3 nm, 9 ML]}"),
        &[(5, 38, &["`ML` is the unit", "a length"])],
    );
    mistakes(
        &vary("{layer: well}"),
        &[(5, 10, &["either a width or a fraction"])],
    );
    mistakes(
        &vary("{width: [3 nm, 9 nm]}"),
        &[(5, 10, &["what to vary"])],
    );
    mistakes(
        &vary("{field: [0 kV/cm, 60 kV/cm], layer: well}"),
        &[(5, 10, &["varies the field and"])],
    );
    mistakes(
        &vary("{field: [0 kV/cm, 60 kV/cm]}, {field: [0 kV/cm, 50 kV/cm]}"),
        &[(5, 40, &["line 5 varies the same"])],
    );
    mistakes(
        &vary("{layer: cap, fraction: In, between: [0.1, 0.2]}"),
        &[(5, 33, &["`cap`", "no In"])],
    );
    mistakes(
        &vary("{layer: cap, fraction: As, between: [0.1, 0.2]}"),
        &[(5, 33, &["As", "no other element"])],
    );
    mistakes(
        &vary("{layer: cap, fraction: Xx, between: [0.1, 0.2]}"),
        &[(5, 33, &["`Xx`"])],
    );
    mistakes(
        &vary("{layer: cap, fraction: Al, between: [-0.1, 1.2]}"),
        &[
            (5, 47, &["out of range", "0 to 1"]),
            (5, 53, &["out of range"]),
        ],
    );
    mistakes(
        &vary("{layer: cap, fraction: Al, between: [18 %, 0.3]}"),
        &[(5, 47, &["`%` follows"])],
    );
    mistakes(
        &vary("{layer: cap, fraction: Al}"),
        &[(5, 10, &["no `between`"])],
    );

    let aims = |content: &str| {
        format!(
            "{head}tune:\n  vary: [{{layer: well, width: [3 nm, 9 nm]}}]\n  aims: [{content}]\n"
        )
    };
    let from_to = "from: conduction 1, to: conduction 2";
    mistakes(&aims(""), &[(6, 9, &["there is no aim"])]);
    mistakes(
        &aims(&format!("{{{from_to}}}")),
        &[(6, 10, &["what the transition shall have"])],
    );
    mistakes(
        &aims(&format!("{{{from_to}, energy: 1 eV, dipole: 2 nm}}")),
        &[(6, 10, &["`energy` and `dipole` at once"])],
    );
    mistakes(
        &aims("{from: conduction 1, to: conduction 1, energy: 1 eV}"),
        &[(6, 35, &["from a level to itself"])],
    );
    mistakes(
        &aims("{from: conduction 0, to: conduction 1, energy: 1 eV}"),
        &[(6, 17, &["counted from 1"])],
    );
    mistakes(
        &aims("{from: conduction 1, to: conduction 201, energy: 1 eV}"),
        &[(6, 35, &["level 201", "200"])],
    );
    mistakes(
        &aims("{from: heavy-hole 1, to: conduction 1, energy: 1 eV}"),
        &[(6, 17, &["`heavy-hole` is not solved"])],
    );
    mistakes(
        &aims("{from: conducton 1, to: conduction 2, energy: 1 eV}"),
        &[(6, 17, &["did you mean `conduction`?"])],
    );
    mistakes(
        &aims("{from: conduction, to: conduction 2 3, energy: 1 eV}"),
        &[
            (6, 17, &["number of the level is missing"]),
            (6, 33, &["`conduction 2 3` is no level"]),
        ],
    );
    mistakes(
        &aims(&format!("{{{from_to}, wavelength: -8 µm}}")),
        &[(6, 61, &["out of range", "more than 0 µm"])],
    );
    mistakes(
        &aims(&format!("{{{from_to}, wavelength: 8 eV}}")),
        &[(6, 61, &["`eV` is the unit of an energy"])],
    );
    mistakes(
        &aims(&format!("{{{from_to}, energy: 0 eV}}")),
        &[(6, 57, &["out of range"])],
    );
    mistakes(
        &aims(&format!("{{{from_to}, maximize: energy}}")),
        &[(6, 59, &["`energy`", "`dipole`"])],
    );
    mistakes(
        &aims(&format!("{{{from_to}, energy: 1 eV, weight: 0}}")),
        &[(6, 71, &["out of range"])],
    );
    mistakes(
        &aims(&format!("{{{from_to}, energy: 1 eV, within: 1 nm}}")),
        &[(6, 71, &["does not suit"])],
    );
    mistakes(
        &aims(&format!("{{{from_to}, maximize: dipole, within: 1 %}}")),
        &[(6, 75, &["maximizes"])],
    );
    mistakes(
        &aims(&format!("{{{from_to}, energy: 1 eV, follow: shape}}")),
        &[(6, 71, &["`order` or `character`"])],
    );
    mistakes(
        &aims(
            "{from: conduction 1, to: conduction 2, energy: 1 eV}, {from: conduction 2, to: conduction 1, wavelength: 8 µm}",
        ),
        &[(6, 64, &["the aim on line 6", "same transition"])],
    );
}

#[test]
fn bombs_are_refused() {
    let mut aliases = String::from("a0: &a0 [x,x,x,x,x,x,x,x,x]\n");
    for i in 1..12 {
        let repeated = vec![format!("*a{}", i - 1); 9].join(",");
        aliases += &format!("a{i}: &a{i} [{repeated}]\n");
    }
    let flow = "[".repeat(100_000);
    let mappings = "{a: ".repeat(100_000);
    let blocks: String = (0..1500)
        .map(|i| format!("{}a:\n", " ".repeat(i)))
        .collect();
    let values = format!("[{}]", "1,".repeat(1_000_000));
    let lines = |head: &str, line: &dyn Fn(usize) -> String, count: usize| {
        format!("{head}\n{}", (0..count).map(line).collect::<String>())
    };
    let mistakes_without_end = lines("layers:", &|_| " - x: y\n".to_owned(), 60_000);
    let x = |count: usize| "x".repeat(count);
    let names = lines(
        "layers:",
        &|i| format!(" - {{material: {}{i}, width: 5 nm}}\n", x(60)),
        30_000,
    );
    let chain = lines(
        "materials:",
        &|i| format!(" m{i}: {{like: m{}}}\n", i + 1),
        40_000,
    );
    let long = format!("layers: [{{material: {}, width: 5 nm}}]\n", x(4_000_000));
    let keys = lines("layers:", &|i| format!(" {}{i}: y\n", x(900)), 4_000);
    let named = |i| format!(" - {{name: a{i}, material: GaAs, width: 5 nm}}\n");
    let varied = |i| format!(" - {{layer: a{i}, width: [3 nm, 4 nm]}}\n");
    let varied = lines("layers:", &named, 15_000) + &lines("tune:\n vary:", &varied, 15_000);
    for text in [
        aliases,
        flow,
        mappings,
        blocks,
        values,
        mistakes_without_end,
        names,
        chain,
        long,
        keys,
        varied,
    ] {
        let (structure, problems) = structure::read(&text);
        assert!(structure.is_none());
        assert!((1..=51).contains(&problems.len()), "{}", problems.len());
        for problem in &problems {
            problem.render("bomb.yaml", &text, false);
        }
    }
}

#[test]
fn doping_without_a_species() {
    doubts(
        "substrate: GaAs\nlayers:\n  - {name: well, material: GaAs, width: 5 nm, donors: 1e17 cm^-3}\ngrowth: {rates: {Ga: 1 ML/s}}\n",
        &[(
            4,
            &["`growth` names no species", "add `dopants: {donors: Si}`"],
        )],
    );
}
