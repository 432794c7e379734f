//! Files that are damaged at random: reading them never panics, and always ends with a structure or with a message.

use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use wellwright::diagnostics::Severity;
use wellwright::structure::{self, document};

const GOOD: &str = "\
# a file with every kind of entry
title: 'Emitter: two wells'
substrate: InP
temperature: 300 K
field: 45 kV/cm
bands: {conduction: {model: energy-dependent, states: 5}}
materials:
  Ours: {like: In0.53Ga0.47As, gap: 0.80 eV, luttinger: [11.0, 4.2, 4.9], elastic: [99.9 GPa, 49.3 GPa, 48.9 GPa]}
  Barrier: {conduction_edge: 0.23 eV, electron_mass: 0.0919}
layers:
  - &lower {name: lower, material: AlInAs, match: substrate, width: 30 nm}
  - repeat: 3
    layers:
      - {name: well, material: In0.53Ga0.47As, width: 18 ML, donors: 5e17 cm^-3}
      - {material: In0.53Ga0.47As, to: Al0.2Ga0.27In0.53As, profile: parabolic, width: 4 nm}
  - {<<: *lower, name: upper}
  - {name: mixed, material: Al0.2Ga0.27In0.53As, width: 5e1 Å}
tune:
  vary:
    - {layer: well, width: [12 ML, 30 ML]}
    - {layer: mixed, fraction: Al, between: [0.1, 0.25]}
    - {field: [0 kV/cm, 60 kV/cm]}
  aims:
    - {from: conduction 1, to: conduction 2, wavelength: 8.6 um, within: 20 nm}
    - {from: conduction 2, to: conduction 3, maximize: dipole, weight: 0.1}
  snap: monolayer
growth:
  cells:
    - {name: In 1, element: In, rate: 0.53 ML/s, of: InAs, on: InP}
    - {element: Ga, rate: 0.3 um/h}
    - {element: Al, rate: 0.5 Å/s}
  dopants: {donors: Si, acceptors: Be}
";

/// Reads whatever bytes there are, as the program does.
fn read(bytes: &[u8]) -> Result<(), TestCaseError> {
    let text = match document::decode(bytes) {
        Ok(text) => text,
        Err(problem) => {
            prop_assert_eq!(problem.severity, Severity::Error);
            return Ok(());
        }
    };
    let (structure, problems) = structure::read(text);
    let wrong = problems
        .iter()
        .any(|problem| problem.severity == Severity::Error);
    prop_assert_eq!(structure.is_none(), wrong);
    for problem in &problems {
        if let Some(span) = &problem.span {
            prop_assert!(
                span.start <= span.end && span.end <= text.len(),
                "{problem:?}"
            );
        }
        prop_assert!(!problem.render("file.yaml", text, false).is_empty());
    }
    if let Some(structure) = structure {
        let stack = structure.stack();
        prop_assert!(stack.is_ok());
        if let (Ok(stack), Some(_)) = (stack, &structure.growth) {
            // What a growth needs was found out when the file was read.
            prop_assert!(wellwright::growth::plan(&structure, &stack).is_ok());
        }
    }
    Ok(())
}

#[test]
fn the_undamaged_file_is_good() {
    let (structure, problems) = structure::read(GOOD);
    assert!(structure.is_some(), "{problems:#?}");
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 600, failure_persistence: None, rng_seed: RngSeed::Fixed(1), ..ProptestConfig::default() })]

    #[test]
    fn bytes_replaced(changes in prop::collection::vec((0..GOOD.len(), any::<u8>()), 1..4)) {
        let mut bytes = GOOD.as_bytes().to_vec();
        for (at, byte) in changes {
            bytes[at] = byte;
        }
        read(&bytes)?;
    }

    #[test]
    fn a_piece_taken_out(from in 0..GOOD.len(), length in 1..60_usize) {
        let mut bytes = GOOD.as_bytes().to_vec();
        bytes.drain(from..(from + length).min(GOOD.len()));
        read(&bytes)?;
    }

    #[test]
    fn a_piece_doubled(from in 0..GOOD.len(), length in 1..200_usize, to in 0..GOOD.len()) {
        let mut bytes = GOOD.as_bytes().to_vec();
        let piece: Vec<u8> = bytes[from..(from + length).min(GOOD.len())].to_vec();
        bytes.splice(to..to, piece);
        read(&bytes)?;
    }

    #[test]
    fn words_exchanged(words in prop::collection::vec((0..200_usize, 0..200_usize), 1..4)) {
        let mut pieces: Vec<&str> = GOOD.split_inclusive([' ', ',', '{', '}', '\n']).collect();
        for (one, other) in words {
            let count = pieces.len();
            pieces.swap(one % count, other % count);
        }
        read(pieces.concat().as_bytes())?;
    }

    #[test]
    fn signs_of_yaml_in_any_order(text in "[-a-z0-9 :,{}\\[\\]\n\t'\"&*<>|!%#?~.µ]{0,120}") {
        read(text.as_bytes())?;
    }

    #[test]
    fn values_of_any_kind(value in "[-+.0-9eEinfaxML mµÅ%_]{0,12}", at in 0..8_usize) {
        let old = ["30 nm", "45 kV/cm", "300 K", "18 ML", "5", "3\n", "[0.1, 0.25]", "5e17 cm^-3"][at];
        read(GOOD.replacen(old, &value, 1).as_bytes())?;
    }
}
