//! The derivatives that tuning uses are exact: those of every energy, of every place of a state ⟨i|z|i⟩ and of every
//! dipole ⟨i|z|j⟩, with respect to every width, fraction and the field, against central differences of full solves.
//!
//! The differences are of sixth order,
//! f′ ≈ [45 (f₁ − f₋₁) − 9 (f₂ − f₋₂) + (f₃ − f₋₃)] / 60 h  (Abramowitz and Stegun 1964, table 25.2, seven points),
//! made with a step and with half of it. Their own disagreement bounds what is left of their error (Richardson 1911), so
//! a step that does not suit the stack shows as such and not as a wrong derivative.

use wellwright::materials::Element;
use wellwright::models::{Band, BandOperator};
use wellwright::numerics::sensitivity::value_slope;
use wellwright::structure::{self, BandName, Charge, ConductionModel, Knob, Level, Stack};
use wellwright::subbands::{Accuracy, change};
use wellwright::tune::{Aim, Design, Goal, Task, Variable};

/// Relative tolerance of a slope.
const RELATIVE: f64 = 1e-6;
/// How far the two differences may be apart. Half the step leaves a 64th of the error in the finer one.
const UNSURE: f64 = 20.0 * RELATIVE;
/// A slope that nearly vanishes is held to this part of the largest slope of its kind in the same direction.
const SMALL: f64 = 1e-2;
/// Rounding of a solved energy, in eV; over the step it hides the slopes of states that do not reach a layer.
const ENERGY_ROUNDING: f64 = 3e-13;
/// Rounding of a dipole, in nm, and what is added to it over the distance of near levels, which rounding mixes, in nm eV.
const DIPOLE_ROUNDING: (f64, f64) = (1e-11, 5e-13);
/// Solves are this exact, so that differences over small steps keep their digits.
const ACCURACY: Accuracy = Accuracy {
    tolerance_ev: 1e-11,
};

struct Case {
    text: &'static str,
    states: usize,
    /// Fractions that can vary: entry (from 0, bottom first) and element. Every width and the field always vary.
    fractions: &'static [(usize, Element)],
    /// Steps in nm, in fraction, and in kV/cm. Smaller where two levels nearly touch.
    steps: (f64, f64, f64),
}

fn stack_of(text: &str) -> (Stack, ConductionModel) {
    let (file, problems) = structure::read(text);
    let file = file.unwrap_or_else(|| panic!("{problems:#?}"));
    (file.stack().unwrap(), file.conduction.model)
}

/// All pairs of states, a state with itself included, by dipole; energies need no aim here.
fn task(case: &Case) -> Task {
    let (stack, model) = stack_of(case.text);
    let entries = 1 + stack.layers.iter().map(|layer| layer.entry).max().unwrap();
    let widths = (0..entries).map(|entry| Knob::Width { entry });
    let fractions = case
        .fractions
        .iter()
        .map(|&(entry, element)| Knob::Fraction { entry, element });
    let variables = widths
        .chain(fractions)
        .chain([Knob::Field])
        .map(|knob| Variable {
            knob,
            low: 0.0,
            high: 1.0,
            name: format!("{knob:?}"),
        });
    let pairs = (0..case.states).flat_map(|i| (i..case.states).map(move |j| (i, j)));
    let dipole = Goal::Dipole {
        target_nm: 1.0,
        within_nm: 0.1,
    };
    Task {
        bands: vec![(Band::Conduction(model), case.states)],
        charge: wellwright::structure::Charge::Flat,
        variables: variables.collect(),
        aims: pairs
            .map(|(from, to)| Aim {
                from: conduction(from),
                to: conduction(to),
                goal: dipole,
                weight: 1.0,
                by_character: false,
            })
            .collect(),
        keeps: Vec::new(),
        accuracy: ACCURACY,
        stack,
    }
}

fn conduction(state: usize) -> Level {
    Level {
        band: BandName::Conduction,
        index: state + 1,
    }
}

/// Energies in eV, then dipoles in nm.
fn values(design: &Design) -> Vec<f64> {
    let energies = design
        .bands
        .conduction()
        .unwrap()
        .pairs
        .iter()
        .map(|pair| pair.value);
    energies.chain(design.values.iter().copied()).collect()
}

/// The sixth-order difference of all values in a knob.
fn difference(
    task: &Task,
    knob: Knob,
    step: f64,
    values: impl Fn(&Design) -> Vec<f64>,
) -> Vec<f64> {
    let at = knob.value(&task.stack).unwrap();
    let solved = |shift: f64| {
        let mut stack = task.stack.clone();
        knob.set(&mut stack, at + shift * step);
        values(&task.design(stack, None).unwrap())
    };
    let sides: Vec<(Vec<f64>, Vec<f64>)> = [1.0, 2.0, 3.0]
        .iter()
        .map(|&s| (solved(s), solved(-s)))
        .collect();
    (0..sides[0].0.len())
        .map(|v| {
            let d = |s: usize| sides[s].0[v] - sides[s].1[v];
            (45.0 * d(0) - 9.0 * d(1) + d(2)) / (60.0 * step)
        })
        .collect()
}

#[track_caller]
fn assert_exact(case: &Case) {
    let task = task(case);
    let design = task.design(task.stack.clone(), None).unwrap();
    let operator = BandOperator::new(&task.stack, task.bands[0].0).unwrap();
    let subbands = design.bands.conduction().unwrap();
    let pencil = &subbands.pencil;
    let dipole_slopes = task.value_slopes(&design);
    let n = case.states;
    assert_eq!(subbands.pairs.len(), n);
    let nearest_ev = subbands
        .pairs
        .windows(2)
        .map(|two| two[1].value - two[0].value)
        .fold(f64::INFINITY, f64::min);
    for (column, variable) in task.variables.iter().enumerate() {
        let step = match variable.knob {
            Knob::Width { .. } => case.steps.0,
            Knob::Fraction { .. } => case.steps.1,
            Knob::Field => 1e-4 * case.steps.2,
        };
        let (coarse, fine) = (
            difference(&task, variable.knob, step, values),
            difference(&task, variable.knob, 0.5 * step, values),
        );
        let own = change(&operator, pencil, variable.knob);
        let energy_slopes = subbands
            .pairs
            .iter()
            .map(|pair| value_slope(pencil, &own, pair));
        let exact: Vec<f64> = energy_slopes
            .chain(dipole_slopes.column(column).iter().copied())
            .collect();
        assert_eq!(exact.len(), fine.len());
        let largest =
            |range: std::ops::Range<usize>| fine[range].iter().fold(0.0_f64, |a, b| a.max(b.abs()));
        let (energies, dipoles) = (largest(0..n), largest(n..fine.len()));
        for v in 0..fine.len() {
            let scale = fine[v]
                .abs()
                .max(SMALL * if v < n { energies } else { dipoles });
            let what = match v.checked_sub(n) {
                None => format!("energy {}", v + 1),
                Some(a) => format!("dipole of {} and {}", task.aims[a].from, task.aims[a].to),
            };
            let rounding = if v < n {
                ENERGY_ROUNDING
            } else {
                DIPOLE_ROUNDING.0 + DIPOLE_ROUNDING.1 / nearest_ev
            } / step;
            let relative = |deviation: f64| (deviation.abs() - rounding) / scale;
            let (unsure, miss) = (relative(coarse[v] - fine[v]), relative(exact[v] - fine[v]));
            assert!(
                unsure < UNSURE,
                "{what} by {}: the differences {} and {} do not agree; choose another step",
                variable.name,
                coarse[v],
                fine[v]
            );
            assert!(
                miss < RELATIVE,
                "{what} by {}: {} where differences say {}, relative {miss:.1e}",
                variable.name,
                exact[v],
                fine[v]
            );
        }
    }
}

#[test]
fn coupled_wells_in_a_field_with_parabolic_bands() {
    assert_exact(&Case {
        text: "\
field: 20 kV/cm
substrate: GaAs
temperature: 77 K
bands: {conduction: {model: parabolic}}
layers:
  - {material: Al0.3Ga0.7As, width: 12 nm}
  - {material: GaAs, width: 7.1 nm}
  - {material: Al0.3Ga0.7As, width: 1.8 nm}
  - {material: Al0.05Ga0.95As, width: 4.9 nm}
  - {material: Al0.25Ga0.75As, width: 14 nm}
",
        states: 4,
        fractions: &[
            (0, Element::Al),
            (2, Element::Al),
            (3, Element::Al),
            (3, Element::Ga),
            (4, Element::Al),
        ],
        steps: (0.04, 0.001, 0.2),
    });
}

#[test]
fn coupled_wells_in_a_field_with_the_three_level_mass() {
    assert_exact(&Case {
        text: "\
field: -35 kV/cm
substrate: GaAs
temperature: 77 K
bands: {conduction: {model: energy-dependent}}
layers:
  - {material: Al0.33Ga0.67As, width: 12 nm}
  - {material: GaAs, width: 7.2 nm}
  - {material: Al0.33Ga0.67As, width: 1.4 nm}
  - {material: Al0.04Ga0.96As, width: 5.0 nm}
  - {material: Al0.28Ga0.72As, width: 14 nm}
",
        states: 4,
        fractions: &[
            (0, Element::Al),
            (2, Element::Al),
            (3, Element::Al),
            (3, Element::Ga),
            (4, Element::Al),
        ],
        steps: (0.04, 0.001, 0.2),
    });
}

#[test]
fn coupled_wells_with_a_stated_nonparabolicity_energy() {
    // Masses and E′ of an intersubband design in InGaAs/AlInAs (Faist et al., Science 264, 553 (1994), from memory).
    assert_exact(&Case {
        text: "\
field: 40 kV/cm
bands: {conduction: {model: energy-dependent}}
materials:
  Well: {conduction_edge: 0 eV, electron_mass: 0.043, nonparabolicity_energy: 0.79 eV}
  Barrier: {conduction_edge: 0.52 eV, electron_mass: 0.078, nonparabolicity_energy: 1.45 eV}
layers:
  - {material: Barrier, width: 8 nm}
  - {material: Well, width: 4.5 nm}
  - {material: Barrier, width: 1.2 nm}
  - {material: Well, width: 3.6 nm}
  - {material: Barrier, width: 7 nm}
",
        states: 4,
        fractions: &[],
        steps: (0.03, 0.0, 0.5),
    });
}

#[test]
fn strained_layers_with_the_three_level_mass() {
    assert_exact(&Case {
        text: "\
field: 60 kV/cm
substrate: InP
temperature: 300 K
bands: {conduction: {model: energy-dependent}}
layers:
  - {material: Al0.6In0.4As, width: 7 nm}
  - {material: In0.67Ga0.33As, width: 4.1 nm}
  - {material: Al0.64In0.36As, width: 1.3 nm}
  - {material: In0.62Ga0.38As, width: 3.2 nm}
  - {material: Al0.55In0.45As, width: 6 nm}
",
        states: 3,
        fractions: &[
            (0, Element::Al),
            (1, Element::In),
            (1, Element::Ga),
            (2, Element::In),
            (3, Element::In),
            (4, Element::Al),
        ],
        steps: (0.02, 0.001, 0.4),
    });
}

#[test]
fn strained_quaternary_with_parabolic_bands() {
    assert_exact(&Case {
        text: "\
substrate: InP
temperature: 200 K
field: 8 kV/cm
bands: {conduction: {model: parabolic}}
layers:
  - {material: InP, width: 9 nm}
  - {material: In0.8Ga0.2As0.7P0.3, width: 8 nm}
  - {material: In0.9Ga0.1As0.25P0.75, width: 3 nm}
  - {material: In0.72Ga0.28As0.61P0.39, width: 6 nm}
  - {material: InP, width: 9 nm}
",
        states: 3,
        fractions: &[
            (1, Element::In),
            (1, Element::As),
            (2, Element::P),
            (3, Element::Ga),
            (3, Element::P),
        ],
        steps: (0.05, 0.004, 0.4),
    });
}

#[test]
fn deep_wells_of_indium_arsenide() {
    assert_exact(&Case {
        text: "\
substrate: GaSb
temperature: 80 K
field: 30 kV/cm
bands: {conduction: {model: energy-dependent}}
layers:
  - {material: Al0.9Ga0.1Sb, width: 6 nm}
  - {material: InAs0.94Sb0.06, width: 7.5 nm}
  - {material: Al0.8Ga0.2Sb, width: 1.6 nm}
  - {material: InAs0.9Sb0.1, width: 5.1 nm}
  - {material: Al0.95Ga0.05Sb, width: 6 nm}
",
        states: 4,
        fractions: &[
            (0, Element::Al),
            (1, Element::Sb),
            (2, Element::Ga),
            (3, Element::As),
            (4, Element::Al),
        ],
        steps: (0.02, 0.001, 0.4),
    });
}

#[test]
fn linear_grades() {
    for model in ["parabolic", "energy-dependent"] {
        let text = format!(
            "\
substrate: GaAs
temperature: 10 K
field: 14 kV/cm
bands: {{conduction: {{model: {model}}}}}
layers:
  - {{material: Al0.32Ga0.68As, width: 9 nm}}
  - {{material: Al0.28Ga0.72As, to: Al0.02Ga0.98As, width: 6 nm}}
  - {{material: GaAs, width: 4 nm}}
  - {{material: Al0.06Ga0.94As, to: Al0.3Ga0.7As, width: 9 nm}}
  - {{material: Al0.3Ga0.7As, width: 9 nm}}
"
        );
        assert_exact(&Case {
            text: text.leak(),
            states: 4,
            fractions: &[
                (1, Element::Al),
                (3, Element::Al),
                (3, Element::Ga),
                (4, Element::Al),
            ],
            steps: (0.05, 0.004, 0.4),
        });
    }
}

#[test]
fn parabolic_grades() {
    for model in ["parabolic", "energy-dependent"] {
        let text = format!(
            "\
substrate: InP
temperature: 300 K
field: 5 kV/cm
bands: {{conduction: {{model: {model}}}}}
layers:
  - {{material: Al0.48In0.52As, width: 8 nm}}
  - {{material: Al0.4Ga0.07In0.53As, to: Al0.02Ga0.45In0.53As, profile: parabolic, width: 18 nm}}
  - {{material: Al0.03Ga0.44In0.53As, to: Al0.3Ga0.17In0.53As, profile: parabolic, width: 22 nm}}
  - {{material: Al0.48In0.52As, width: 8 nm}}
"
        );
        assert_exact(&Case {
            text: text.leak(),
            states: 4,
            fractions: &[
                (1, Element::Al),
                (1, Element::In),
                (2, Element::Al),
                (2, Element::Ga),
                (3, Element::Al),
            ],
            steps: (0.1, 0.001, 0.2),
        });
    }
}

#[test]
fn all_copies_of_a_repeat_move_together() {
    assert_exact(&Case {
        text: "\
substrate: GaAs
temperature: 77 K
field: 6 kV/cm
bands: {conduction: {model: energy-dependent}}
layers:
  - {material: Al0.15Ga0.85As, width: 10 nm}
  - repeat: 3
    layers:
      - {material: GaAs, width: 6.4 nm}
      - {material: Al0.15Ga0.85As, width: 2.6 nm}
      - {material: Al0.03Ga0.97As, width: 5.1 nm}
      - {material: Al0.18Ga0.82As, width: 3.3 nm}
  - {material: Al0.15Ga0.85As, width: 10 nm}
",
        states: 5,
        fractions: &[
            (0, Element::Al),
            (2, Element::Al),
            (3, Element::Al),
            (4, Element::Al),
            (5, Element::Al),
        ],
        steps: (0.03, 0.002, 0.1),
    });
}

/// Two wells whose lowest levels lie apart by far less than their distance to all others, on both sides of the
/// anticrossing and near its middle: there the states trade places within a hundredth of a monolayer.
#[test]
fn nearly_degenerate_double_wells() {
    for model in ["parabolic", "energy-dependent"] {
        for second in ["7.99", "8.0005", "8.02"] {
            let text = format!(
                "\
temperature: 77 K
substrate: GaAs
bands: {{conduction: {{model: {model}}}}}
layers:
  - {{material: Al0.3Ga0.7As, width: 10 nm}}
  - {{material: GaAs, width: 8.0 nm}}
  - {{material: Al0.3Ga0.7As, width: 9 nm}}
  - {{material: GaAs, width: {second} nm}}
  - {{material: Al0.3Ga0.7As, width: 11 nm}}
"
            );
            assert_exact(&Case {
                text: text.leak(),
                states: 4,
                fractions: &[(1, Element::Ga), (2, Element::Al), (3, Element::Ga)],
                steps: (0.00004, 0.000004, 0.0002),
            });
        }
    }
}

#[test]
fn the_module_of_a_terahertz_laser() {
    assert_exact(&Case {
        text: "\
substrate: GaAs
temperature: 50 K
field: -12 kV/cm
bands: {conduction: {model: parabolic}}
layers:
  - {material: Al0.15Ga0.85As, width: 20 nm}
  - {material: GaAs, width: 8.1 nm}
  - {material: Al0.15Ga0.85As, width: 2.5 nm}
  - {material: GaAs, width: 6.8 nm}
  - {material: Al0.15Ga0.85As, width: 3.9 nm}
  - {material: GaAs, width: 15.2 nm}
  - {material: Al0.15Ga0.85As, width: 2.5 nm}
  - {material: GaAs, width: 9.6 nm}
  - {material: Al0.15Ga0.85As, width: 20 nm}
",
        states: 5,
        fractions: &[
            (0, Element::Al),
            (2, Element::Al),
            (4, Element::Al),
            (6, Element::Al),
        ],
        steps: (0.02, 0.002, 0.05),
    });
}

/// Rounding of a level of coupled bands, in eV: that of the thin elements' stiffness, some 1e4 eV.
const COUPLED_ROUNDING: f64 = 1e-11;

/// The same for coupled bands: transitions between the sides of the gap, and all dipoles within each, a state with itself
/// included.
#[track_caller]
fn assert_coupled_exact(text: &str, fractions: &[(usize, Element)]) {
    let (file, problems) = structure::read(text);
    let file = file.unwrap_or_else(|| panic!("{problems:#?}"));
    let stack = file.stack().unwrap();
    let bands = Band::of(&file);
    let entries = 1 + stack.layers.iter().map(|layer| layer.entry).max().unwrap();
    let knobs = (0..entries)
        .map(|entry| (Knob::Width { entry }, 0.02))
        .chain(
            fractions
                .iter()
                .map(|&(entry, element)| (Knob::Fraction { entry, element }, 1e-3)),
        )
        .chain([(Knob::Field, 1e-5)]);
    let knobs: Vec<(Knob, f64)> = knobs.collect();
    let level = |band: usize, state: usize| Level {
        band: bands[band].0.name(),
        index: state + 1,
    };
    let mut aims = Vec::new();
    let mut aim = |from: Level, to: Level, goal: Goal| {
        aims.push(Aim {
            from,
            to,
            goal,
            weight: 1.0,
            by_character: false,
        });
    };
    for i in 0..bands[0].1 {
        for j in 0..bands[1].1 {
            let energy = Goal::Energy {
                target_ev: 1.0,
                within_ev: 0.1,
            };
            aim(level(1, j), level(0, i), energy);
        }
    }
    for (band, &(_, states)) in bands.iter().enumerate() {
        for i in 0..states {
            for j in i..states {
                let dipole = Goal::Dipole {
                    target_nm: 1.0,
                    within_nm: 0.1,
                };
                aim(level(band, i), level(band, j), dipole);
            }
        }
    }
    let task = Task {
        stack,
        bands: bands.clone(),
        charge: Charge::Flat,
        variables: knobs
            .iter()
            .map(|&(knob, _)| Variable {
                knob,
                low: 0.0,
                high: 1.0,
                name: format!("{knob:?}"),
            })
            .collect(),
        aims,
        keeps: Vec::new(),
        accuracy: ACCURACY,
    };
    let design = task.design(task.stack.clone(), None).unwrap();
    let exact = task.value_slopes(&design);
    let energies = bands[0].1 * bands[1].1;
    let values = |design: &Design| design.values.clone();
    let mut worst = 0.0_f64;
    for (column, &(knob, step)) in knobs.iter().enumerate() {
        let [coarse, fine] = [step, 0.5 * step].map(|step| difference(&task, knob, step, values));
        let largest =
            |range: std::ops::Range<usize>| fine[range].iter().fold(0.0_f64, |a, b| a.max(b.abs()));
        let scales = [largest(0..energies), largest(energies..fine.len())];
        for row in 0..fine.len() {
            let is_energy = row < energies;
            let scale = fine[row].abs().max(SMALL * scales[usize::from(!is_energy)]);
            // Of dipoles: over the distance of near levels, here at least a tenth of a meV.
            let rounding = if is_energy { 1.0 } else { 1e3 } * COUPLED_ROUNDING / step;
            let relative = |deviation: f64| (deviation.abs() - rounding) / scale;
            let aim = &task.aims[row];
            assert!(
                relative(coarse[row] - fine[row]) < UNSURE,
                "{} to {} by {knob:?}: the differences {} and {} do not agree; choose another step",
                aim.from,
                aim.to,
                coarse[row],
                fine[row]
            );
            let miss = relative(exact[(row, column)] - fine[row]);
            worst = worst.max((exact[(row, column)] - fine[row]).abs() / scale);
            assert!(
                miss < RELATIVE,
                "{} to {} by {knob:?}: {} where differences say {}, relative {miss:.1e}",
                aim.from,
                aim.to,
                exact[(row, column)],
                fine[row]
            );
        }
    }
    println!("worst {worst:.1e}");
}

/// A strained stack with a graded layer and a field, so that nothing is its own mirror image.
fn lopsided(bands: &str) -> String {
    format!(
        "\
field: 15 kV/cm
substrate: GaAs
bands: {bands}
layers:
  - {{material: Al0.3Ga0.7As, width: 9 nm}}
  - {{material: In0.12Ga0.88As, width: 6.1 nm}}
  - {{material: GaAs, to: Al0.2Ga0.8As, width: 3.3 nm}}
  - {{material: Al0.28Ga0.72As, width: 8 nm}}
"
    )
}

const LOPSIDED_FRACTIONS: &[(usize, Element)] = &[
    (0, Element::Al),
    (1, Element::In),
    (2, Element::Ga),
    (3, Element::Al),
];

#[test]
fn six_band_holes_of_a_strained_graded_stack_in_a_field() {
    assert_coupled_exact(
        &lopsided(
            "{conduction: {model: energy-dependent, states: 2}, valence: {model: six-band, states: 4}}",
        ),
        LOPSIDED_FRACTIONS,
    );
}

#[test]
fn eight_bands_of_a_strained_graded_stack_in_a_field() {
    assert_coupled_exact(
        &lopsided("{conduction: {model: eight-band, states: 2}, valence: {states: 4}}"),
        LOPSIDED_FRACTIONS,
    );
}
