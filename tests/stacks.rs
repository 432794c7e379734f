//! Stacks: what a structure becomes once it is laid out, and how it changes while it is tuned.

use approx::assert_relative_eq;
use wellwright::diagnostics::Severity;
use wellwright::materials::{
    Composition, Dual, Element, Library, Material, monolayer_nm, strained,
};
use wellwright::structure::{self, Stack, Structure};

#[track_caller]
fn structure(text: &str) -> Structure {
    let (structure, problems) = structure::read(text);
    structure.unwrap_or_else(|| panic!("{problems:#?}"))
}

#[track_caller]
fn stack(text: &str) -> Stack {
    structure(text).stack().unwrap()
}

/// The words of the warnings about a good file.
#[track_caller]
fn warnings(text: &str) -> Vec<String> {
    let (structure, problems) = structure::read(text);
    assert!(structure.is_some(), "{problems:#?}");
    problems
        .into_iter()
        .inspect(|problem| assert_eq!(problem.severity, Severity::Warning))
        .map(|problem| problem.message)
        .collect()
}

fn edge(material: &Material) -> f64 {
    material.conduction_edge_ev.unwrap()
}

#[test]
fn repeats_are_laid_out_and_copies_numbered() {
    let stack = stack(
        "\
layers:
  - {name: below, material: AlAs, width: 2 nm}
  - repeat: 2
    layers:
      - {name: a, material: GaAs, width: 1 nm, donors: 1e17 cm^-3}
      - repeat: 3
        layers: [{material: AlAs, width: 3 nm}]
",
    );
    let labels: Vec<&str> = stack
        .layers
        .iter()
        .map(|layer| layer.label.as_str())
        .collect();
    assert_eq!(
        labels,
        [
            "below",
            "a [1]",
            "layer 3 [1]",
            "layer 3 [2]",
            "layer 3 [3]",
            "a [2]",
            "layer 3 [4]",
            "layer 3 [5]",
            "layer 3 [6]"
        ]
    );
    let entries: Vec<usize> = stack.layers.iter().map(|layer| layer.entry).collect();
    assert_eq!(entries, [0, 1, 2, 2, 2, 1, 2, 2, 2]);
    assert_eq!(stack.layers[5].donors_cm3, 1e17);
    assert_relative_eq!(stack.total_width_nm(), 2.0 + 2.0 * 10.0);
    assert_eq!(stack.faces_nm().len(), 10);
    assert_relative_eq!(stack.faces_nm()[9], 22.0);
    assert_eq!(stack.field_v_per_nm, 0.0);
}

#[test]
fn materials_are_those_of_the_library_at_temperature_and_strain() {
    let stack = stack(
        "\
substrate: InP
temperature: 77 K
layers:
  - {material: In0.6Ga0.4As, width: 5 nm}
  - {material: AlInAs, match: substrate, width: 18 ML}
",
    );
    let library = Library::new();
    let inp = library
        .resolve(&Composition::parse("InP").unwrap(), 77.0)
        .unwrap();
    let lattice = inp.lattice_constant_nm.unwrap();
    assert_eq!(stack.substrate_lattice_nm(), Some(lattice));
    let free = library
        .resolve(&Composition::parse("In0.6Ga0.4As").unwrap(), 77.0)
        .unwrap();
    let layer = strained(&free, lattice);
    assert_ne!(edge(&layer), edge(&free));
    assert_eq!(edge(&stack.material_at(0, 0.3)), edge(&layer));
    // Al0.4773In0.5227As matches InP of 0.58687 nm: Vegard's rule between the lattice constants at 300 K of AlAs,
    // 0.56611 nm (Vurgaftman, Meyer and Ram-Mohan 2001), and InAs, 0.60583 nm (the same).
    let indium = stack.composition(1).unwrap().fraction(Element::In);
    assert_relative_eq!(indium, 0.5227, epsilon = 1e-4);
    let monolayer = stack.monolayer_nm(1).unwrap();
    assert_relative_eq!(monolayer, 0.5 * lattice, max_relative = 1e-3);
    assert_relative_eq!(stack.layers[1].width_nm, 18.0 * monolayer);
}

#[test]
fn without_a_substrate_nothing_is_strained() {
    let stack = stack("layers: [{material: InAs, width: 10 ML}]\n");
    let free = Library::new()
        .resolve(&Composition::parse("InAs").unwrap(), 300.0)
        .unwrap();
    assert_eq!(stack.material_at(0, 0.0), free);
    assert_relative_eq!(
        stack.layers[0].width_nm,
        10.0 * monolayer_nm(&free, None).unwrap()
    );
}

#[test]
fn a_linear_grade_goes_straight_in_composition() {
    let stack = stack("layers: [{material: Al0.4Ga0.6As, to: GaAs, width: 10 nm}]\n");
    assert!(!stack.is_uniform(0));
    let library = Library::new();
    for (t, formula) in [
        (0.0, "Al0.4Ga0.6As"),
        (0.25, "Al0.3Ga0.7As"),
        (0.75, "Al0.1Ga0.9As"),
        (1.0, "GaAs"),
    ] {
        let expected = library
            .resolve(&Composition::parse(formula).unwrap(), 300.0)
            .unwrap();
        assert_relative_eq!(
            edge(&stack.material_at(0, t)),
            edge(&expected),
            epsilon = 1e-12
        );
    }
}

#[test]
fn a_parabolic_grade_has_its_vertex_at_the_lower_edge() {
    let library = Library::new();
    let at = |formula: &str| {
        edge(
            &library
                .resolve(&Composition::parse(formula).unwrap(), 300.0)
                .unwrap(),
        )
    };
    // Half way up, a parabola from its vertex has gone a quarter of the way.
    let up =
        stack("layers: [{material: GaAs, to: Al0.4Ga0.6As, profile: parabolic, width: 10 nm}]\n");
    assert_relative_eq!(
        edge(&up.material_at(0, 0.5)),
        at("Al0.1Ga0.9As"),
        epsilon = 1e-12
    );
    let down =
        stack("layers: [{material: Al0.4Ga0.6As, to: GaAs, profile: parabolic, width: 10 nm}]\n");
    assert_relative_eq!(
        edge(&down.material_at(0, 0.5)),
        at("Al0.1Ga0.9As"),
        epsilon = 1e-12
    );
    assert_relative_eq!(
        edge(&down.material_at(0, 0.0)),
        at("Al0.4Ga0.6As"),
        epsilon = 1e-12
    );
    assert_relative_eq!(edge(&down.material_at(0, 1.0)), at("GaAs"), epsilon = 1e-12);
}

#[test]
fn a_grade_between_materials_of_the_file_takes_every_parameter_along() {
    let stack = stack(
        "\
materials:
  Low: {conduction_edge: 0 eV, electron_mass: 0.067}
  High: {conduction_edge: 0.3 eV, electron_mass: 0.097}
layers: [{material: Low, to: High, profile: parabolic, width: 10 nm}]
",
    );
    let middle = stack.material_at(0, 0.5);
    assert_relative_eq!(edge(&middle), 0.075, epsilon = 1e-15);
    assert_relative_eq!(middle.electron_mass_m0.unwrap(), 0.0745, epsilon = 1e-15);
    assert_eq!(middle.gap_ev, None);
}

#[test]
fn slopes_agree_with_differences() {
    let text = "\
substrate: InP
layers:
  - {material: In0.53Ga0.47As, width: 5 nm}
  - {material: Al0.2Ga0.3In0.5As, width: 5 nm}
  - {material: Al0.2Ga0.35In0.45As, to: In0.6Ga0.4As, width: 5 nm}
  - {material: Al0.45Ga0.15In0.4As, to: Ga0.8In0.2As, profile: parabolic, width: 5 nm}
  - {material: In0.7Ga0.3As, to: Odd, width: 5 nm}
materials:
  Odd: {like: InP, gap: 1.3 eV}
";
    let stack = stack(text);
    for layer in 0..5 {
        for element in [Element::Al, Element::Ga, Element::In] {
            let from = stack.composition(layer).unwrap().fraction(element);
            for t in [0.0, 0.3, 0.8, 1.0] {
                let Ok(slope) = stack.material_slope_at(layer, t, element) else {
                    assert_eq!(from, 0.0);
                    continue;
                };
                let step = 1e-5;
                let moved = |by: f64| {
                    let mut moved = stack.clone();
                    moved.set_fraction(layer, element, from + by).unwrap();
                    moved.material_at(layer, t)
                };
                let (up, down) = (moved(step), moved(-step));
                let pairs: [(Option<Dual>, Option<f64>, Option<f64>); 3] = [
                    (
                        slope.conduction_edge_ev,
                        up.conduction_edge_ev,
                        down.conduction_edge_ev,
                    ),
                    (
                        slope.electron_mass_m0,
                        up.electron_mass_m0,
                        down.electron_mass_m0,
                    ),
                    (slope.gap_ev, up.gap_ev, down.gap_ev),
                ];
                for (slope, up, down) in pairs {
                    let difference = (up.unwrap() - down.unwrap()) / (2.0 * step);
                    assert_relative_eq!(slope.unwrap().slope, difference, epsilon = 1e-7);
                }
                let here = stack.material_at(layer, t);
                assert_relative_eq!(
                    slope.conduction_edge_ev.unwrap().value,
                    edge(&here),
                    epsilon = 1e-12
                );
            }
        }
    }
}

#[test]
fn changes_reach_every_copy() {
    let mut stack = stack(
        "layers: [{repeat: 3, layers: [{material: GaAs, width: 5 nm}, {material: Al0.3Ga0.7As, width: 2 nm}]}]\n",
    );
    stack.set_width(0, 6.5);
    stack.set_fraction(1, Element::Al, 0.2).unwrap();
    assert_relative_eq!(stack.total_width_nm(), 3.0 * 8.5);
    let expected = Library::new()
        .resolve(&Composition::parse("Al0.2Ga0.8As").unwrap(), 300.0)
        .unwrap();
    for layer in [1, 3, 5] {
        assert_relative_eq!(
            edge(&stack.material_at(layer, 0.5)),
            edge(&expected),
            epsilon = 1e-12
        );
    }
    assert!(stack.set_fraction(0, Element::Ga, 0.5).is_err());
    assert!(stack.set_fraction(1, Element::Al, 1.5).is_err());
}

#[test]
fn what_cannot_be_laid_out_names_the_layer() {
    let said = |text: &str| {
        let (structure, problems) = structure::read(text);
        assert!(structure.is_none());
        assert_eq!(problems.len(), 1, "{problems:#?}");
        let span = problems[0].span.clone().unwrap();
        (problems[0].message.clone(), text[span].to_owned())
    };
    let own = "materials: {Own: {conduction_edge: 0 eV}}\n";
    let (message, place) = said(&format!(
        "{own}layers: [{{name: b, material: Own, width: 5 nm}}]\n"
    ));
    assert!(
        message.contains("layer `b` has no `electron_mass`"),
        "{message}"
    );
    assert_eq!(place, "Own");
    let own = "materials: {Own: {conduction_edge: 0 eV, electron_mass: 0.07}}\n";
    let (message, place) = said(&format!("{own}layers: [{{material: Own, width: 5 ML}}]\n"));
    assert!(
        message.contains("the monolayer of layer 1 is unknown"),
        "{message}"
    );
    assert_eq!(place, "5 ML");
    let (message, _) = said(&format!(
        "{own}bands: {{conduction: {{model: energy-dependent}}}}\nlayers: [{{material: Own, width: 5 nm}}]\n"
    ));
    assert!(message.contains("no `gap`"), "{message}");
    let (message, place) = said(&format!(
        "{own}substrate: Own\nlayers: [{{material: GaAs, width: 5 nm}}]\n"
    ));
    assert!(
        message.contains("the substrate has no `lattice_constant`"),
        "{message}"
    );
    assert_eq!(place, "Own");
    let (message, _) =
        said("substrate: GaSb\nlayers: [{material: AlGaAs, match: substrate, width: 5 nm}]\n");
    assert!(message.contains("no composition of `AlGaAs`"), "{message}");
    let (message, place) = said("layers: [{material: Al0.2Ga0.3In0.5As, to: GaSb, width: 5 nm}]\n");
    assert!(message.contains("elements"), "{message}");
    assert_eq!(place, "GaSb");
}

#[test]
fn mistakes_in_materials_are_found_at_their_place_and_not_repeated_where_they_are_used() {
    let text = "\
materials:
  One: {electron_mas: 0.07}
  Two: {electron_mass: 0.07 eV, gap: 0.8, luttinger: [1, 2], elastic: 3 GPa}
  Three: {like: Threee}
  Four: {like: One}
  GaAs: {choose: {elastic: nothing}, bowing: {gap: 0.1 eV}}
layers:
  - {material: One, width: 5 nm}
  - {material: Two, to: Four, width: 5 nm}
";
    let (structure, problems) = structure::read(text);
    assert!(structure.is_none());
    let listed: Vec<(usize, String)> = problems
        .iter()
        .map(|problem| {
            let at = problem.span.clone().unwrap().start;
            (
                structure::document::line_of(text, at),
                problem.message.clone(),
            )
        })
        .collect();
    let lines: Vec<usize> = listed.iter().map(|(line, _)| *line).collect();
    assert_eq!(lines, [2, 3, 3, 3, 3, 4, 6, 6], "{listed:#?}");
}

#[test]
fn doubtful_physics_is_a_warning_that_names_the_layer() {
    let found = warnings(
        "\
substrate: GaAs
field: 1 kV/cm
layers:
  - {name: x, material: Al0.6Ga0.4As, width: 5 nm}
  - {name: near, material: Al0.4Ga0.6As, width: 5 nm}
  - {name: thin, material: GaAs, width: 0.2 nm, donors: 1e18 cm^-3}
  - {name: strained, material: InAs, width: 3 nm, donors: 1e18 cm^-3}
",
    );
    assert_eq!(found.len(), 5, "{found:#?}");
    assert!(
        found[0].contains("`x` is indirect: its X valley"),
        "{}",
        found[0]
    );
    assert!(
        found[1].contains("`near` is nearly indirect"),
        "{}",
        found[1]
    );
    assert!(
        found[2].contains("`thin` is doped, but its bands stay flat"),
        "{}",
        found[2]
    );
    assert!(
        found[3].contains("`thin` is thinner than one monolayer"),
        "{}",
        found[3]
    );
    assert!(
        found[4].contains("`strained` is strained by -6.7 %"),
        "{}",
        found[4]
    );
}

#[test]
fn a_start_outside_its_bounds_is_a_warning() {
    let found = warnings(
        "\
field: 70 kV/cm
layers:
  - {name: well, material: GaAs, width: 10 nm}
  - {name: cap, material: Al0.1Ga0.9As, width: 10 nm}
tune:
  vary:
    - {layer: well, width: [3 nm, 9 nm]}
    - {layer: cap, fraction: Al, between: [0.18, 0.35]}
    - {field: [0 kV/cm, 60 kV/cm]}
  aims: [{from: conduction 1, to: conduction 2, energy: 0.1 eV}]
",
    );
    assert_eq!(found.len(), 3, "{found:#?}");
    assert_eq!(
        found[0],
        "the width 10 nm of layer `well` lies outside its bounds"
    );
    assert_eq!(
        found[1],
        "the fraction of Al in layer `cap` lies outside its bounds"
    );
    assert_eq!(found[2], "the field lies outside its bounds");
}
