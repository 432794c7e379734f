//! Input that cannot be right. Each file gives one message with its place and its line, ends the run with 2, prints no
//! result and leaves no output file, whatever command reads it.

mod common;

use common::Bench;

const LAYERS: &str = "\
layers:
  - {name: well, material: GaAs, width: 5 nm}
  - {name: cap, material: Al0.26Ga0.74As, width: 5 nm}
";

/// `head`, then two layers `well` and `cap` (three lines).
fn with_head(head: &str) -> String {
    format!("{head}\n{LAYERS}")
}

/// One layer; its line is the second, its first key in column 6.
fn layer(keys: &str) -> String {
    format!("layers:\n  - {{{keys}}}\n")
}

/// A file with one aim, whose variable stands on line 6 from column 7.
fn vary(variable: &str) -> String {
    format!(
        "{LAYERS}tune:\n  vary:\n    - {variable}\n  aims:\n    - {{from: conduction 1, to: conduction 2, energy: 0.1 eV}}\n"
    )
}

/// A file with one variable, whose aims stand on line 7 from column 9.
fn aims(aims: &str) -> String {
    format!(
        "{LAYERS}tune:\n  vary:\n    - {{layer: well, width: [3 nm, 9 nm]}}\n  aims: [{aims}]\n"
    )
}

/// Runs every command that reads a structure file on these bytes; what they say is the same, and is returned.
#[track_caller]
fn refused(bytes: &[u8]) -> String {
    let bench = Bench::new();
    bench.write("bad.yaml", bytes);
    let mut said: Option<String> = None;
    for command in [
        &["check", "bad.yaml"][..],
        &["levels", "bad.yaml", "--format", "json", "-o", "out.json"],
        &["tune", "bad.yaml", "-o", "out.txt", "-o", "tuned.yaml"],
    ] {
        let ran = bench.run(command).code(2);
        assert_eq!(ran.stdout, "");
        assert_eq!(bench.files(), ["bad.yaml"]);
        assert_eq!(*said.get_or_insert_with(|| ran.stderr.clone()), ran.stderr);
    }
    said.unwrap()
}

fn errors(said: &str) -> usize {
    said.lines()
        .filter(|line| line.starts_with("error"))
        .count()
}

/// Holds that there is one error, at this place, with the line shown and all these words.
#[track_caller]
fn one_mistake(text: &str, line: usize, column: usize, words: &[&str]) {
    let said = refused(text.as_bytes());
    assert_eq!(errors(&said), 1, "\n{said}");
    assert!(
        said.contains(&format!("bad.yaml:{line}:{column}\n")),
        "no {line}:{column} in\n{said}"
    );
    let own = text
        .trim_start_matches('\u{feff}')
        .lines()
        .nth(line - 1)
        .unwrap_or_default()
        .trim();
    // Long lines are shown in part, and a tab as spaces.
    let shown = own.is_empty() || own.len() > 100 || said.contains(own);
    assert!(shown, "the line `{own}` is not shown in\n{said}");
    for word in words {
        assert!(said.contains(word), "no `{word}` in\n{said}");
    }
}

#[test]
fn misspelt_keys() {
    for (text, line, column, words) in [
        (
            with_head("substarte: GaAs"),
            1,
            1,
            ["`substarte`", "did you mean `substrate`?"],
        ),
        (
            with_head("temprature: 77 K"),
            1,
            1,
            ["`temprature`", "did you mean `temperature`?"],
        ),
        (
            with_head("Field: 3 kV/cm"),
            1,
            1,
            ["`Field`", "did you mean `field`?"],
        ),
        (
            with_head("bands: {conduktion: {states: 3}}"),
            1,
            9,
            ["`conduktion`", "did you mean `conduction`?"],
        ),
        (
            with_head("bands: {conduction: {stats: 3}}"),
            1,
            22,
            ["`stats`", "did you mean `states`?"],
        ),
        (
            with_head("bands: {conduction: {model: parabollic}}"),
            1,
            29,
            ["`parabollic`", "did you mean `parabolic`?"],
        ),
        (with_head("colour: green"), 1, 1, ["`colour`", "`title`"]),
        (
            layer("material: GaAs, widht: 5 nm"),
            2,
            22,
            ["`widht`", "did you mean `width`?"],
        ),
        (
            layer("material: GaAs, width: 5 nm, doners: 1e17 cm^-3"),
            2,
            35,
            ["`doners`", "did you mean `donors`?"],
        ),
        (
            format!(
                "materials: {{M: {{conduction_edge: 0 eV, electron_mas: 0.1}}}}\n{}",
                layer("material: M, width: 5 nm")
            ),
            1,
            40,
            ["`electron_mas`", "did you mean `electron_mass`?"],
        ),
        (
            vary("{layr: well, width: [3 nm, 9 nm]}"),
            6,
            8,
            ["`layr`", "did you mean `layer`?"],
        ),
        (
            aims("{from: conduction 1, too: conduction 2, energy: 1 eV}"),
            7,
            31,
            ["`too`", "did you mean `to`?"],
        ),
        (
            format!("{LAYERS}tune:\n  vray: []\n  aims: []\n"),
            5,
            3,
            ["`vray`", "did you mean `vary`?"],
        ),
    ] {
        // A file may hold a second mistake that follows from the first; here only the first counts.
        let said = refused(text.as_bytes());
        assert!(
            said.contains(&format!("bad.yaml:{line}:{column}\n")),
            "no {line}:{column} in\n{said}"
        );
        for word in words {
            assert!(said.contains(word), "no `{word}` in\n{said}");
        }
    }
}

#[test]
fn misspelt_materials_and_alloys_that_do_not_add_up() {
    let material = |text: &str| layer(&format!("material: {text}, width: 5 nm"));
    for (text, words) in [
        ("GaAss", &["`GaAss`", "did you mean `GaAs`?"][..]),
        ("gaas", &["did you mean `GaAs`?"]),
        ("AlgaAs", &["`AlgaAs`"]),
        ("Si", &["`Si`", "write a chemical formula"]),
        ("Al0.26Ga0.64As", &["Al and Ga", "add up to 0.9, not to 1"]),
        ("Al0.26Ga0.84As", &["add up to 1.1, not to 1"]),
        ("GaAs0.5P0.4", &["add up to 0.9, not to 1"]),
        ("Al0.26As", &["add up to 0.26, not to 1"]),
        ("Al1.3Ga-0.3As", &["Al1.3Ga-0.3As"]),
        (
            "Al30Ga70As",
            &["the fraction 30 of Al is not between 0 and 1"],
        ),
        ("AlGa", &["no group-V element (P, As, Sb)"]),
        ("AsP", &["no group-III element (Al, Ga, In)"]),
        ("GaGaAs", &["Ga twice"]),
        (
            "InGaAs",
            &["`InGaAs` leaves fractions open", "`match: substrate`"],
        ),
        ("'Al0,3Ga0,7As'", &["write decimals with a point"]),
    ] {
        one_mistake(&material(text), 2, 16, words);
    }
    one_mistake(
        &with_head("substrate: GaAss"),
        1,
        12,
        &["did you mean `GaAs`?"],
    );
    one_mistake(
        &format!(
            "substrate: GaAs\n{}",
            layer("material: InAsP, match: substrate, width: 5 nm")
        ),
        3,
        16,
        &["no composition of `InAsP` has the lattice constant"],
    );
    one_mistake(
        &layer("material: InGaAs, match: substrate, width: 5 nm"),
        2,
        31,
        &["the file names none", "`substrate: InP`"],
    );
}

#[test]
fn materials_of_the_file_that_cannot_be() {
    let with = |definition: &str| {
        format!(
            "materials:\n  M: {definition}\n{}",
            layer("material: M, width: 5 nm")
        )
    };
    for (definition, line, column, words) in [
        (
            "{conduction_edge: 0 eV, electron_mass: -0.1}",
            2,
            45,
            "`electron_mass` of -0.1 is outside",
        ),
        (
            "{conduction_edge: 0 eV, electron_mass: 0}",
            2,
            45,
            "`electron_mass` of 0 is outside",
        ),
        (
            "{conduction_edge: 0, electron_mass: 0.1}",
            2,
            24,
            "`0` has no unit",
        ),
        (
            "{conduction_edge: 0 nm, electron_mass: 0.1}",
            2,
            24,
            "`nm` is the unit of a length",
        ),
        ("{conduction_edge: 0 eV}", 4, 16, "no `electron_mass`"),
        ("{electron_mass: 0.1}", 4, 16, "no `conduction_edge`"),
        ("{like: GaAss}", 2, 13, "did you mean `GaAs`?"),
        ("{like: M}", 2, 13, "`M` is made like itself"),
        ("{}", 4, 16, "which the chosen model needs"),
        ("[1, 2]", 2, 6, "a list stands here"),
    ] {
        // The default model needs more than the edge and the mass.
        let text = format!(
            "bands: {{conduction: {{model: parabolic}}}}\n{}",
            with(definition)
        );
        one_mistake(&text, line + 1, column, &[words]);
    }
}

#[test]
fn missing_and_wrong_units() {
    for (text, line, column, words) in [
        (
            with_head("temperature: 77"),
            1,
            14,
            &["`77` has no unit", "write the unit, as in `77 K`"][..],
        ),
        (
            with_head("temperature: 77 C"),
            1,
            14,
            &["`C` is no unit known here"],
        ),
        (
            with_head("temperature: 77 k"),
            1,
            14,
            &["did you mean `K`?"],
        ),
        (
            with_head("field: 30"),
            1,
            8,
            &["`30` has no unit", "`30 kV/cm`"],
        ),
        (
            with_head("field: 30 V"),
            1,
            8,
            &["`V` is no unit known here"],
        ),
        (
            with_head("field: 30 kv/cm"),
            1,
            8,
            &["did you mean `kV/cm`?"],
        ),
        (
            layer("material: GaAs, width: 5"),
            2,
            29,
            &["`5` has no unit", "as in `5 nm`"],
        ),
        (
            layer("material: GaAs, width: 5 eV"),
            2,
            29,
            &["`eV` is the unit of an energy", "a length such as `5.2 nm`"],
        ),
        (
            layer("material: GaAs, width: nm"),
            2,
            29,
            &["`nm` does not begin with a number"],
        ),
        (
            layer("material: GaAs, width: '5,2 nm'"),
            2,
            29,
            &[
                "has a comma where a point belongs",
                "did you mean `5.2 nm`?",
            ],
        ),
        (
            layer("material: GaAs, width: 5 nm, donors: 1e17"),
            2,
            43,
            &["no unit", "`1e17 cm^-3`"],
        ),
        (
            vary("{layer: well, width: [3, 9 nm]}"),
            6,
            29,
            &["`3` has no unit"],
        ),
        (vary("{field: [0, 60 kV/cm]}"), 6, 16, &["`0` has no unit"]),
        (
            aims("{from: conduction 1, to: conduction 2, wavelength: 8.6}"),
            7,
            61,
            &["`8.6` has no unit"],
        ),
        (
            aims("{from: conduction 1, to: conduction 2, energy: 8.6 µm}"),
            7,
            57,
            &["`µm` is the unit of a length"],
        ),
        (
            aims("{from: conduction 1, to: conduction 2, wavelength: 8.6 THz}"),
            7,
            61,
            &["`THz` is no unit known here"],
        ),
    ] {
        one_mistake(&text, line, column, words);
    }
    // In braces a decimal comma begins the next key.
    let said = refused(layer("material: GaAs, width: 5,2 nm").as_bytes());
    assert!(
        said.contains("a comma begins the next key; write decimals with a point"),
        "{said}"
    );
}

#[test]
fn sizes_and_temperatures_that_cannot_be() {
    let width = |text: &str| layer(&format!("material: GaAs, width: {text}"));
    for (text, words) in [
        ("0 nm", "`0 nm` is out of range"),
        ("-5 nm", "`-5 nm` is out of range"),
        ("1e9 nm", "`1e9 nm` is out of range"),
        ("1 mm", "to 100 µm"),
        ("1e-9 nm", "from 0.01 nm"),
        ("1e400 nm", "`1e400 nm` is not a finite number"),
        ("nan nm", "`nan nm` does not begin with a number"),
        ("inf nm", "`inf nm` does not begin with a number"),
        (".inf", "`.inf` does not begin with a number"),
        (".nan", "`.nan` does not begin with a number"),
        ("0 ML", "`0 ML` is out of range"),
        ("true", "`true` does not begin with a number"),
    ] {
        one_mistake(&width(text), 2, 29, &[words]);
    }
    for (text, words) in [
        ("-5 K", "from 0 K to 1000 K"),
        ("5000 K", "`5000 K` is out of range"),
        ("1e308 K", "`1e308 K` is out of range"),
        ("NaN K", "does not begin with a number"),
        (".inf", "does not begin with a number"),
    ] {
        one_mistake(&with_head(&format!("temperature: {text}")), 1, 14, &[words]);
    }
    for text in ["1e9 kV/cm", "-11 MV/cm", "1e300 V/nm"] {
        one_mistake(
            &with_head(&format!("field: {text}")),
            1,
            8,
            &["out of range", "from -10 MV/cm to 10 MV/cm"],
        );
    }
    one_mistake(
        "layers:\n  - repeat: 10000\n    layers:\n      - {material: GaAs, width: 5 nm}\n      - {material: GaSb, width: 90 µm}\n",
        5,
        33,
        &[
            "the layers are 900050 µm thick together",
            "at most 100 µm in all; this layer and its copies make up 900000 µm",
        ],
    );
}

#[test]
fn numbers_that_would_never_end() {
    for (text, line, column, words) in [
        ("layers:\n  - repeat: 1000000000\n    layers: [{material: GaAs, width: 5 nm}]\n".to_owned(), 2, 13, "from 1 to 10000"),
        ("layers:\n  - repeat: 0\n    layers: [{material: GaAs, width: 5 nm}]\n".to_owned(), 2, 13, "a whole number from 1 to 10000"),
        ("layers:\n  - repeat: -3\n    layers: [{material: GaAs, width: 5 nm}]\n".to_owned(), 2, 13, "a whole number of at least 1"),
        (
            "layers:\n  - repeat: 9999\n    layers: [{repeat: 9999, layers: [{material: GaAs, width: 5 nm}]}]\n".to_owned(),
            2,
            3,
            "99980001 layers",
        ),
        (with_head("bands: {conduction: {states: 1000000}}"), 1, 30, "a whole number from 1 to 200"),
        (with_head("bands: {conduction: {states: 0}}"), 1, 30, "out of range"),
        (with_head("bands: {conduction: {states: many}}"), 1, 30, "not a whole number"),
    ] {
        one_mistake(&text, line, column, &[words]);
    }
}

#[test]
fn names_that_are_double_or_unknown() {
    one_mistake(
        "layers:\n  - {name: a, material: GaAs, width: 5 nm}\n  - {name: a, material: AlAs, width: 5 nm}\n",
        3,
        12,
        &["two layers are named `a`", "the first `a` is on line 2"],
    );
    one_mistake(
        &with_head("field: 1 kV/cm\nfield: 2 kV/cm"),
        2,
        1,
        &["the key `field` stands here a second time", "line 1"],
    );
    one_mistake(
        &vary("{layer: wel, width: [3 nm, 9 nm]}"),
        6,
        15,
        &["no layer is named `wel`", "did you mean `well`?"],
    );
    one_mistake(
        &vary("{layer: substrate, width: [3 nm, 9 nm]}"),
        6,
        15,
        &["no layer is named `substrate`", "under `name:`"],
    );
}

#[test]
fn variables_that_cannot_vary() {
    for (variable, column, words) in [
        ("{layer: well, width: [9 nm, 3 nm]}", 28, "reversed"),
        ("{layer: well, width: [3 nm, 3 nm]}", 28, "equal"),
        ("{layer: well, width: [-3 nm, 3 nm]}", 29, "out of range"),
        ("{layer: well, width: [3 nm, 1e9 nm]}", 35, "out of range"),
        (
            "{layer: well, width: [3 nm]}",
            28,
            "the lower and the upper",
        ),
        (
            "{layer: cap, fraction: In, between: [0.1, 0.2]}",
            30,
            "`Al0.26Ga0.74As` contains no In",
        ),
        (
            "{layer: cap, fraction: al, between: [0.1, 0.2]}",
            30,
            "did you mean `Al`?",
        ),
        (
            "{layer: cap, fraction: As, between: [0.1, 0.2]}",
            30,
            "no other element beside it",
        ),
        (
            "{layer: cap, fraction: Al, between: [0.1, 2]}",
            49,
            "from 0 to 1",
        ),
        ("{layer: well}", 7, "either a width or a fraction"),
        ("{field: [60 kV/cm, 0 kV/cm]}", 15, "reversed"),
    ] {
        one_mistake(&vary(variable), 6, column, &[words]);
    }
    one_mistake(
        &format!(
            "{}  snap: monolayer\n",
            vary("{layer: well, width: [5 nm, 5.05 nm]}")
        ),
        6,
        7,
        &[
            "the bounds on the width of layer `well` hold no whole number of monolayers",
            "17.69 and 17.87 monolayers",
        ],
    );
    one_mistake(
        "bands: {conduction: {model: parabolic}}\nmaterials: {M: {conduction_edge: 0 eV, electron_mass: 0.1}}\n\
         layers: [{name: w, material: M, width: 5 nm}]\ntune:\n  vary: [{layer: w, width: [3 nm, 9 nm]}]\n  \
         aims: [{from: conduction 1, to: conduction 2, energy: 0.1 eV}]\n  snap: monolayer\n",
        5,
        10,
        &[
            "the monolayer of layer `w` is unknown",
            "because of `snap: monolayer`",
        ],
    );
}

#[test]
fn aims_that_are_empty_or_impossible() {
    let from_to = "from: conduction 1, to: conduction 2";
    one_mistake(
        &aims(""),
        7,
        9,
        &["there is no aim", "energies, wavelengths or dipoles"],
    );
    one_mistake(
        &format!("{LAYERS}tune:\n  vary: []\n  aims: [{{{from_to}, energy: 1 eV}}]\n"),
        5,
        9,
        &["there is nothing to vary"],
    );
    one_mistake(&format!("{LAYERS}tune:\n"), 4, 5, &["nothing stands here"]);
    for (aim, column, words) in [
        (
            "{from: conduction 1, to: conduction 1, energy: 1 eV}".to_owned(),
            35,
            "from a level to itself",
        ),
        (
            "{from: conduction 0, to: conduction 1, energy: 1 eV}".to_owned(),
            17,
            "levels are counted from 1",
        ),
        (
            "{from: conduction 1, to: conduction 999, energy: 1 eV}".to_owned(),
            35,
            "level 999 is beyond the 200",
        ),
        (
            "{from: conduction 1, to: conduction two, energy: 1 eV}".to_owned(),
            35,
            "`conduction two` is no level",
        ),
        (
            "{from: valence 1, to: conduction 2, energy: 1 eV}".to_owned(),
            17,
            "`valence` is not solved",
        ),
        (
            "{to: conduction 2, energy: 1 eV}".to_owned(),
            10,
            "no `from`",
        ),
        (
            format!("{{{from_to}}}"),
            10,
            "does not say what the transition shall have",
        ),
        (
            format!("{{{from_to}, wavelength: -8 µm}}"),
            61,
            "more than 0 µm",
        ),
        (
            format!("{{{from_to}, wavelength: 0 µm}}"),
            61,
            "more than 0 µm",
        ),
        (
            format!("{{{from_to}, energy: -1 meV}}"),
            57,
            "more than 0 eV",
        ),
        (
            format!("{{{from_to}, energy: 1 keV}}"),
            57,
            "`keV` is no unit",
        ),
        (
            format!("{{{from_to}, energy: 1000 eV}}"),
            57,
            "at most 10 eV",
        ),
        (
            format!("{{{from_to}, dipole: -2 nm}}"),
            57,
            "more than 0 nm",
        ),
        (
            format!("{{{from_to}, maximize: wavelength}}"),
            59,
            "`dipole`",
        ),
        (
            format!("{{{from_to}, energy: 1 eV, weight: -1}}"),
            71,
            "out of range",
        ),
        (
            format!("{{{from_to}, energy: 1 eV, weight: .nan}}"),
            71,
            "a number",
        ),
    ] {
        one_mistake(&aims(&aim), 7, column, &[words]);
    }
    one_mistake(
        &aims(&format!(
            "{{{from_to}, energy: 1 eV}}, {{{from_to}, energy: 2 eV}}"
        )),
        7,
        64,
        &["the aim on line 7 is about the same property of the same transition"],
    );
}

#[test]
fn bombs() {
    let mut aliases = String::from("a: &a [x,x,x,x,x,x,x,x,x]\n");
    for (before, name) in ('a'..'j').zip('b'..) {
        let nine = vec![format!("*{before}"); 9].join(",");
        aliases += &format!("{name}: &{name} [{nine}]\n");
    }
    let said = refused(aliases.as_bytes());
    assert_eq!(errors(&said), 1);
    assert!(
        said.contains("the aliases of this file repeat more than") && said.contains("bad.yaml:5:"),
        "{said}"
    );
    one_mistake(
        "a: &a [*a]\n",
        1,
        8,
        &["this alias repeats the value that it is a part of"],
    );
    let deep = "the values of this file are nested more than 64 deep";
    one_mistake(&"[".repeat(100_000), 1, 65, &[deep]);
    one_mistake(&"{a: ".repeat(100_000), 1, 257, &[deep]);
    let blocks: String = (0..1500)
        .map(|depth| format!("{}a:\n", " ".repeat(depth)))
        .collect();
    one_mistake(&blocks, 65, 65, &[deep]);
    let nested =
        "{repeat: 2, layers: [".repeat(100) + "{material: GaAs, width: 5 nm}" + &"]}".repeat(100);
    let said = refused(format!("layers: [{nested}]\n").as_bytes());
    assert!(said.contains(deep), "{said}");
    let values = format!("[{}]", "1,".repeat(1_000_000));
    let said = refused(values.as_bytes());
    assert!(
        said.contains("the file holds more values than a structure file may have"),
        "{said}"
    );
}

#[test]
fn a_file_with_mistakes_without_end_is_not_told_to_the_end() {
    let text = format!("layers:\n{}", "  - x: y\n".repeat(10_000));
    let said = refused(text.as_bytes());
    assert!((2..=51).contains(&errors(&said)), "{}", errors(&said));
}

#[test]
fn text_that_is_not_yaml() {
    one_mistake(
        &with_head("title: Well: 8.6 µm"),
        1,
        12,
        &["not YAML", "quotation marks"],
    );
    one_mistake(
        "layers:\n\t- {material: GaAs, width: 5 nm}\n",
        2,
        2,
        &["not YAML", "indent with spaces"],
    );
    one_mistake(
        "layers: [{material: GaAs, width: 5 nm}\n",
        1,
        9,
        &["not YAML", "bracket"],
    );
    one_mistake("title: 'x\nlayers: 3\n", 1, 8, &["not YAML", "quote"]);
    one_mistake(
        &format!("{LAYERS}---\n{LAYERS}"),
        5,
        1,
        &["a second YAML document begins"],
    );
    one_mistake("just words\n", 1, 1, &["a single value stands here"]);
}

#[test]
fn empty_files() {
    for text in ["", "\n\n   \n", "# nothing but this\n", "\u{feff}", "---\n"] {
        let said = refused(text.as_bytes());
        assert_eq!(errors(&said), 1);
        for words in ["the file is empty", "bad.yaml:1:1", "at least `layers:`"] {
            assert!(said.contains(words), "{text:?}: {said}");
        }
    }
    one_mistake("title: x\n", 1, 1, &["the file has no `layers`"]);
    one_mistake("layers: []\n", 1, 9, &["there is no layer"]);
}

#[test]
fn bytes_that_are_no_text() {
    let text = format!("title: x\n{LAYERS}");
    let utf16: Vec<u8> = [0xff, 0xfe]
        .into_iter()
        .chain(text.encode_utf16().flat_map(u16::to_le_bytes))
        .collect();
    for (bytes, words) in [
        (
            &b"\x7fELF\x02\x01\x01\0\0\0\0"[..],
            &["this is a binary file, not a structure file", "bad.yaml"][..],
        ),
        (b"title: x\0y\n", &["this is a binary file"]),
        (
            b"title: x\nsubstrate: caf\xe9\n",
            &["not UTF-8", "on line 2", "save the file as UTF-8"],
        ),
        (&utf16, &["the file is in UTF-16", "save the file as UTF-8"]),
        (&vec![b'#'; 5_000_000], &["more than the 2097152 bytes"]),
    ] {
        let said = refused(bytes);
        assert_eq!(errors(&said), 1, "{said}");
        for word in words {
            assert!(said.contains(word), "no `{word}` in\n{said}");
        }
    }
}

#[test]
fn carriage_returns_and_byte_order_marks_do_not_move_the_place() {
    one_mistake(
        &with_head("title: x\nfield: 3 V").replace('\n', "\r\n"),
        2,
        8,
        &["`V` is no unit known here"],
    );
    one_mistake(
        &format!("\u{feff}{}", with_head("titel: x")),
        1,
        1,
        &["did you mean `title`?"],
    );
}

#[test]
fn tuning_needs_to_be_told_what() {
    let bench = Bench::new();
    bench.write("plain.yaml", LAYERS);
    bench.run(&["check", "plain.yaml"]).code(0);
    let ran = bench.run(&["tune", "plain.yaml", "-o", "out.yaml"]).code(2);
    assert!(
        ran.stderr.contains("there is no `tune` block in the file"),
        "{}",
        ran.stderr
    );
    assert_eq!(bench.files(), ["plain.yaml"]);
}
