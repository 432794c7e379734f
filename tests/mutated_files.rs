//! Files that are damaged at random: reading them never panics, and always ends with a structure or with a message; what
//! can be read can be solved, or is refused with a message.

use proptest::prelude::*;
use proptest::sample::Index;
use proptest::test_runner::RngSeed;
use wellwright::charge;
use wellwright::diagnostics::Severity;
use wellwright::models::{Band, BandOperator};
use wellwright::open_ends::{self, Outside, Wanted};
use wellwright::structure::{self, Ends, Structure, document};
use wellwright::subbands::Accuracy;
use wellwright::superlattice::{self, Module};
use wellwright::sweep::{self, Part};

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

/// A stack with every kind of charge and a sweep.
const CHARGED: &str = "\
substrate: GaAs
temperature: 77 K
bands: {conduction: {model: energy-dependent, states: 3}, valence: {model: decoupled, states: 2}}
charge:
  fermi_level: neutral
  ionisation: {donors: 6 meV, acceptors: {energy: 27 meV, degeneracy: 4}}
  exchange: local density
layers:
  - {name: lower, material: Al0.3Ga0.7As, width: 10 nm, acceptors: 1e16 cm^-3}
  - {name: plane, sheet_donors: 5e11 cm^-2}
  - {name: spacer, material: Al0.3Ga0.7As, width: 6 nm, sheet_acceptors: 1e10 cm^-2}
  - {name: well, material: GaAs, width: 8 nm}
  - {name: grade, material: GaAs, to: Al0.3Ga0.7As, width: 5 nm}
  - {name: upper, material: Al0.3Ga0.7As, width: 10 nm}
tolerance: {doping: 5 %, window: {from: conduction 1, to: conduction 2, energy: [80 meV, 120 meV]}}
sweep:
  vary: {layer: lower, acceptors: [1e16 cm^-3, 1e17 cm^-3]}
  points: 3
  steps: logarithmic
  show: [{from: valence 1, to: conduction 1}]
";

/// A pair of barriers that electrons cross.
const OPEN: &str = "\
substrate: GaAs
temperature: 77 K
field: 20 kV/cm
ends: open
charge: flat
bands: {conduction: {model: energy-dependent, states: 2}}
layers:
  - {name: lead, material: GaAs, width: 4 nm}
  - {name: first, material: Al0.4Ga0.6As, width: 2 nm}
  - {name: well, material: GaAs, width: 5 nm, donors: 1e16 cm^-3}
  - {name: second, material: Al0.4Ga0.6As, width: 2 nm}
  - {name: exit, material: GaAs, width: 4 nm}
";

/// One period with a grade.
const PERIODIC: &str = "\
substrate: GaAs
temperature: 10 K
ends: periodic
bands: {conduction: {model: parabolic, states: 2}, valence: {model: decoupled, states: 2}}
layers:
  - {name: well, material: GaAs, width: 7 nm}
  - {name: grade, material: GaAs, to: Al0.2Ga0.8As, profile: parabolic, width: 2 nm}
  - {name: barrier, material: Al0.2Ga0.8As, width: 3 nm}
";

/// Modules in a field.
const LADDER: &str = "\
substrate: GaAs
field: 12 kV/cm
bands: {conduction: {model: parabolic, states: 3}}
layers:
  - repeat: 3
    layers:
      - {name: well, material: GaAs, width: 8 nm}
      - {name: barrier, material: Al0.15Ga0.85As, width: 4 nm}
";

const NEW: [&str; 4] = [CHARGED, OPEN, PERIODIC, LADDER];
const ALL: [&str; 5] = [GOOD, CHARGED, OPEN, PERIODIC, LADDER];

/// Solves what a small file asks for, by the way that its ends take. Refusals are fine; no panic and no level that is not
/// a number are asked of it.
fn solve(structure: &Structure) -> Result<(), TestCaseError> {
    let Ok(stack) = structure.stack() else {
        return Ok(());
    };
    let accuracy = Accuracy::default();
    let [donors_cm2, acceptors_cm2] = stack.sheet_doping_cm2();
    // What takes long is large, not wrong.
    if stack.layers.len() > 12
        || stack.total_width_nm() > 80.0
        || stack.field_v_per_nm.abs() > 0.02
        || donors_cm2.max(acceptors_cm2) > 1e13
        || structure.conduction.states > 4
        || structure.couples_bands()
    {
        return Ok(());
    }
    let Ok(operator) = BandOperator::conduction(&stack, structure.conduction.model) else {
        return Ok(());
    };
    let states = structure.conduction.states;
    match structure.ends {
        Ends::Walls => {
            let bands = Band::of(structure);
            if let Ok(found) = charge::solve(&stack, &structure.charge, &bands, accuracy)
                && let Some(found) = found.equilibrium
            {
                prop_assert!(found.fermi_ev.is_finite() && found.electrons_cm2 >= 0.0);
            }
            let swept = sweep::sweep(
                structure,
                &stack,
                Some(2),
                Part::WHOLE,
                accuracy,
                &|_, _| (),
            );
            if let Ok(swept) = swept {
                prop_assert_eq!(swept.points.len(), 2);
            }
            if let Ok(repeated) = structure.repeated()
                && stack.field_v_per_nm != 0.0
            {
                let one = structure.one_copy(&stack, repeated);
                if let Ok(operator) = BandOperator::conduction(&one, structure.conduction.model) {
                    let module = Module {
                        operator: &operator,
                        field_v_per_nm: one.field_v_per_nm,
                    };
                    let ladder = superlattice::ladder(module, states, accuracy);
                    prop_assert!(ladder.states.iter().all(|s| s.energy_ev.is_finite()));
                }
            }
        }
        Ends::Open => {
            let found = open_ends::quasi_bound(&operator, Outside::Field, &Wanted::lowest(states));
            prop_assert!(found.states.iter().all(|s| s.width_ev >= 0.0));
            for point in open_ends::crossing(&operator, &[2.0, 3.0]) {
                prop_assert!(point.energy_ev.is_finite());
            }
        }
        Ends::Periodic => {
            let found = superlattice::minibands(&operator, states, accuracy);
            prop_assert!(
                found
                    .minibands
                    .iter()
                    .all(|band| band.width_ev().is_finite())
            );
        }
    }
    Ok(())
}

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
fn the_undamaged_files_are_good() {
    for text in ALL {
        let (structure, problems) = structure::read(text);
        assert!(structure.is_some(), "{problems:#?}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 600, failure_persistence: None, rng_seed: RngSeed::Fixed(1), ..ProptestConfig::default() })]

    #[test]
    fn bytes_replaced(text in 0..ALL.len(), changes in prop::collection::vec((any::<Index>(), any::<u8>()), 1..4)) {
        let mut bytes = ALL[text].as_bytes().to_vec();
        for (at, byte) in changes {
            let at = at.index(bytes.len());
            bytes[at] = byte;
        }
        read(&bytes)?;
    }

    #[test]
    fn a_piece_taken_out(text in 0..ALL.len(), from: Index, length in 1..60_usize) {
        let mut bytes = ALL[text].as_bytes().to_vec();
        let from = from.index(bytes.len());
        bytes.drain(from..(from + length).min(bytes.len()));
        read(&bytes)?;
    }

    #[test]
    fn a_piece_doubled(text in 0..ALL.len(), from: Index, length in 1..200_usize, to: Index) {
        let mut bytes = ALL[text].as_bytes().to_vec();
        let (from, to) = (from.index(bytes.len()), to.index(bytes.len()));
        let piece: Vec<u8> = bytes[from..(from + length).min(bytes.len())].to_vec();
        bytes.splice(to..to, piece);
        read(&bytes)?;
    }

    #[test]
    fn words_exchanged(text in 0..ALL.len(), words in prop::collection::vec((0..200_usize, 0..200_usize), 1..4)) {
        let mut pieces: Vec<&str> = ALL[text].split_inclusive([' ', ',', '{', '}', '\n']).collect();
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

proptest! {
    #![proptest_config(ProptestConfig { cases: 60, failure_persistence: None, rng_seed: RngSeed::Fixed(2), ..ProptestConfig::default() })]

    /// One value of a file becomes another that may be extreme, and the file is solved.
    #[test]
    fn what_can_be_read_can_be_solved(
        text in 0..NEW.len(),
        place: Index,
        number in prop::sample::select(vec!["0", "-1", "1e-9", "1e-3", "0.5", "1", "2", "3.7", "20", "300", "1e3", "1e9", "1e12", "1e19", "NaN", "inf"]),
    ) {
        let text = NEW[text];
        let is_number = |word: &str| word.trim_start_matches(['[', '{']).starts_with(|c: char| c.is_ascii_digit());
        let mut pieces: Vec<String> = text.split_inclusive(' ').map(str::to_owned).collect();
        let numbers: Vec<usize> = (0..pieces.len()).filter(|k| is_number(&pieces[*k])).collect();
        let at = numbers[place.index(numbers.len())];
        let old = pieces[at].clone();
        let digits = old.trim_start_matches(['[', '{']);
        let end = digits.find(|c: char| !(c.is_ascii_digit() || ".e-".contains(c))).unwrap_or(digits.len());
        pieces[at] = format!("{}{number}{}", &old[..old.len() - digits.len()], &digits[end..]);
        let changed = pieces.concat();
        read(changed.as_bytes())?;
        if let (Some(structure), _) = structure::read(&changed) {
            solve(&structure)?;
        }
    }
}
