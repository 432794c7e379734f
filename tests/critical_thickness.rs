//! Critical thickness and strain balance against published formulas, and the bounds that tuning keeps to.

mod common;

use approx::assert_abs_diff_eq;
use common::{Bench, list, number};
use wellwright::epitaxy::{
    Glide, LayerMean, balance, glides, layer_mean, matthews_blakeslee_nm, net_strain_slope,
    people_bean_nm, strain_budget, thickness_ratio, whole_thickness_ratio,
};
use wellwright::materials::Element;
use wellwright::structure::{self, Knob, Stack, Structure};

#[track_caller]
fn structure(text: &str) -> Structure {
    let (structure, problems) = structure::read(text);
    structure.unwrap_or_else(|| panic!("{problems:#?}"))
}

/// In_xGa_1−xAs on GaAs with a and c₁₁, c₁₂ mixed linearly between GaAs (5.65325 Å, 122.1, 56.6 GPa) and InAs (6.0583 Å,
/// 83.29, 45.26 GPa), ν = c₁₂/(c₁₁ + c₁₂). Values in Å computed apart from this program with
///   h = a/(k √2 π f) (1 − ν/4)/(1 + ν) [ln(h √2/a) + 1]       (Matthews and Blakeslee, J. Cryst. Growth 27, 118 (1974))
///   h = (1 − ν)/(1 + ν) b²/(16 π √2 a f²) ln(h/b), b = a/√2   (People and Bean, Appl. Phys. Lett. 47, 322 (1985))
/// by fixed-point iteration; tolerance one unit of the last digit given. Luminescence of wells follows the first one over
/// the whole range: Andersson and others, Appl. Phys. Lett. 51, 752 (1987).
#[test]
fn indium_gallium_arsenide_on_gallium_arsenide() {
    for (x, free, buried, superlattice, people_bean) in [
        (0.10, 142.4, 338.9, 782.1, 2605.0),
        (0.15, 84.1, 205.4, 481.8, 983.0),
        (0.20, 57.1, 142.9, 340.1, 481.0),
        (0.25, 41.8, 107.2, 258.7, 271.0),
        (0.30, 32.1, 84.5, 206.4, 166.0),
    ] {
        let text = format!(
            "substrate: GaAs\nlayers: [{{material: In{x}Ga{:.2}As, width: 5 nm}}]\n",
            1.0 - x
        );
        let stack = structure(&text).stack().unwrap();
        let mean = layer_mean(&stack, 0).unwrap();
        for (glide, angstrom) in [
            (Glide::FreeLayer, free),
            (Glide::Buried, buried),
            (Glide::Superlattice, superlattice),
        ] {
            let nm = matthews_blakeslee_nm(mean.lattice_nm, mean.misfit, mean.poisson, glide);
            assert_abs_diff_eq!(10.0 * nm, angstrom, epsilon = 0.1);
            // The sign of the misfit does not matter.
            let other = matthews_blakeslee_nm(mean.lattice_nm, -mean.misfit, mean.poisson, glide);
            assert_eq!(nm, other);
        }
        let nm = people_bean_nm(mean.lattice_nm, mean.misfit, mean.poisson);
        assert_abs_diff_eq!(10.0 * nm, people_bean, epsilon = 1.0);
    }
}

#[test]
fn the_equations_hold_from_matched_to_hopeless() {
    assert_eq!(
        matthews_blakeslee_nm(0.5653, 0.0, 0.31, Glide::Buried),
        f64::INFINITY
    );
    assert_eq!(people_bean_nm(0.5653, 0.0, 0.31), f64::INFINITY);
    let (a, nu) = (0.5653_f64, 0.31);
    for power in 1..=60 {
        let f = 10_f64.powf(-0.1 * f64::from(power));
        let h = matthews_blakeslee_nm(a, f, nu, Glide::FreeLayer);
        // The factor before the bracket must be at least b for a solution.
        let scale =
            a / (4.0 * 2_f64.sqrt() * std::f64::consts::PI * f) * (1.0 - nu / 4.0) / (1.0 + nu);
        if scale < a / 2_f64.sqrt() {
            assert_eq!(h, 0.0, "{f}");
        } else {
            let again = scale * ((h * 2_f64.sqrt() / a).ln() + 1.0);
            assert!((again / h - 1.0).abs() < 1e-12, "{f}: {h} and {again}");
            assert!(h >= scale, "the larger root: {f}");
        }
    }
}

const BALANCED: &str = "\
substrate: InP
layers:
  - {material: InP, width: 20 nm}
  - repeat: 20
    layers:
      - {name: well, material: In0.65Ga0.35As, width: 5 nm}
      - {name: barrier, material: Al0.60In0.40As, width: 4 nm}
  - {name: cap, material: InP, width: 20 nm}
";

/// Two layers: a₀ = (A₁t₁a₁a₂² + A₂t₂a₂a₁²)/(A₁t₁a₂² + A₂t₂a₁²) with A = c₁₁ + c₁₂ − 2c₁₂²/c₁₁, the zero-stress condition of
/// Ekins-Daukes, Kawaguchi and Zhang, Cryst. Growth Des. 2, 287 (2002) (from memory). Constants in Å and GPa as above, and
/// AlAs 5.6611 Å, 125.0, 53.4.
#[test]
fn the_zero_stress_condition_of_two_layers() {
    let stack = structure(BALANCED).stack().unwrap();
    let mix = |x: f64, one: f64, other: f64| x * one + (1.0 - x) * other;
    let (a1, c11, c12) = (
        mix(0.35, 5.65325, 6.0583),
        mix(0.35, 122.1, 83.29),
        mix(0.35, 56.6, 45.26),
    );
    let first = c11 + c12 - 2.0 * c12 * c12 / c11;
    let (a2, c11, c12) = (
        mix(0.60, 5.6611, 6.0583),
        mix(0.60, 125.0, 83.29),
        mix(0.60, 53.4, 45.26),
    );
    let second = c11 + c12 - 2.0 * c12 * c12 / c11;
    let (t1, t2) = (5.0, 4.0);
    let a0 = (first * t1 * a1 * a2 * a2 + second * t2 * a2 * a1 * a1)
        / (first * t1 * a2 * a2 + second * t2 * a1 * a1);
    let found = balance(&stack, &[1, 2]).unwrap();
    assert_abs_diff_eq!(10.0 * found.zero_stress_lattice_nm, a0, epsilon = 1e-9);
    assert_abs_diff_eq!(found.net_strain, (5.8687 - a0) / a0, epsilon = 1e-10);
    assert_abs_diff_eq!(found.thickness_nm, 9.0, epsilon = 1e-12);
    // A layer on itself is balanced.
    assert_abs_diff_eq!(
        balance(&stack, &[0]).unwrap().net_strain,
        0.0,
        epsilon = 1e-12
    );
    assert_eq!(balance(&stack, &[]), None);
}

#[test]
fn which_k_is_taken() {
    let text = BALANCED.to_owned() + "  - {name: top, material: In0.6Ga0.4As, width: 3 nm}\n";
    let structure = structure(&text);
    let stack = structure.stack().unwrap();
    assert_eq!(
        glides(&structure, &stack),
        [
            Glide::Buried,
            Glide::Superlattice,
            Glide::Superlattice,
            Glide::Buried,
            Glide::FreeLayer
        ]
    );
    assert_eq!(
        [Glide::FreeLayer, Glide::Buried, Glide::Superlattice].map(Glide::k),
        [4.0, 2.0, 1.0]
    );
    let whole = strain_budget(&structure, &stack).whole.unwrap();
    assert_eq!(whole.glide, Glide::FreeLayer);
    assert_eq!(whole.layers, (1, 42));
    assert_abs_diff_eq!(whole.width_nm, 203.0, epsilon = 1e-9);
}

/// A layer that is graded from GaAs to In0.2Ga0.8As has the misfit of In0.1Ga0.9As on average, since the lattice constant is
/// linear in the fraction (Vegard).
#[test]
fn a_graded_layer_counts_with_its_mean() {
    let stack = structure(
        "\
substrate: GaAs
layers:
  - {material: GaAs, to: In0.2Ga0.8As, width: 10 nm}
  - {material: In0.1Ga0.9As, width: 10 nm}
",
    )
    .stack()
    .unwrap();
    let [graded, uniform] = [0, 1].map(|layer| layer_mean(&stack, layer).unwrap());
    assert_abs_diff_eq!(graded.misfit, uniform.misfit, epsilon = 1e-12);
    assert_abs_diff_eq!(graded.lattice_nm, uniform.lattice_nm, epsilon = 1e-12);
}

#[test]
fn bounds_have_exact_derivatives() {
    let graded = "\
substrate: InP
layers:
  - {name: well, material: In0.65Ga0.35As, width: 5 nm}
  - {name: barrier, material: Al0.60In0.40As, width: 4 nm}
  - {name: ramp, material: Al0.50In0.50As, to: In0.60Ga0.40As, width: 3 nm}
";
    for text in [BALANCED, graded] {
        let structure = structure(text);
        let stack = structure.stack().unwrap();
        let entries: Vec<usize> = stack.layers.iter().map(|layer| layer.entry).collect();
        let glides = glides(&structure, &stack);
        let mut knobs: Vec<Knob> = (0..structure.entries.len())
            .map(|entry| Knob::Width { entry })
            .collect();
        for (entry, element) in [(0, Element::In), (1, Element::In), (2, Element::Al)] {
            let named = structure.entries[entry].name.is_some();
            let has = stack
                .composition(entry)
                .is_some_and(|c| c.fraction(element) > 0.0 && c.elements().len() > 2);
            if named && has {
                knobs.push(Knob::Fraction { entry, element });
            }
        }
        assert!(knobs.len() > structure.entries.len());
        for knob in knobs.into_iter().chain([Knob::Field]) {
            let at = |step: f64| -> Stack {
                let mut moved = stack.clone();
                knob.set(&mut moved, knob.value(&stack).unwrap() + step);
                moved
            };
            let step = 1e-5;
            let difference = |value: &dyn Fn(&Stack) -> f64| {
                (value(&at(step)) - value(&at(-step))) / (2.0 * step)
            };
            let net = |s: &Stack| balance(s, &entries).unwrap().net_strain;
            assert_abs_diff_eq!(
                net_strain_slope(&stack, &entries, knob),
                difference(&net),
                epsilon = 1e-8
            );
            for (entry, glide) in glides.iter().enumerate() {
                let ratio = |s: &Stack| thickness_ratio(s, entry, *glide, None).value;
                assert_abs_diff_eq!(
                    thickness_ratio(&stack, entry, *glide, Some(knob)).slope,
                    difference(&ratio),
                    epsilon = 1e-6
                );
            }
        }
    }
}

fn well(width: &str) -> String {
    format!(
        "\
substrate: GaAs
layers:
  - {{material: GaAs, width: 20 nm}}
  - {{name: active, material: In0.2Ga0.8As, width: {width}}}
  - {{material: GaAs, width: 20 nm}}
"
    )
}

/// 14.29 nm for a buried layer with 20 % In (table above).
#[test]
fn a_warning_names_the_layer() {
    let bench = Bench::new();
    bench.write("thin.yaml", well("14.2 nm"));
    bench.write("thick.yaml", well("14.4 nm"));
    bench.write("hopeless.yaml", well("50 nm"));
    // InAs on GaAs, 7.2 %: no solution for the topmost layer.
    bench.write(
        "islands.yaml",
        "substrate: GaAs\nlayers: [{material: GaAs, width: 5 nm}, {name: dots, material: InAs, width: 0.5 nm}]\n",
    );
    let ran = bench.run(&["check", "islands.yaml"]).code(0);
    assert!(
        ran.stderr.contains(
            "layer `dots` has a misfit of +7.16 %, with which no thickness of it is stable"
        ),
        "{}",
        ran.stderr
    );
    for command in ["check", "levels"] {
        let thin = bench.run(&[command, "thin.yaml"]).code(0);
        assert!(!thin.stderr.contains("critical"), "{}", thin.stderr);
        let thick = bench.run(&[command, "thick.yaml"]).code(0);
        for part in [
            "warning: layer `active` (14.4 nm, misfit +1.43 %) is thicker than its critical thickness of 14.3 nm",
            "thick.yaml:4:30",
            "Matthews and Blakeslee for a buried layer (k = 2)",
            "People and Bean allows 48 nm: it may grow",
        ] {
            assert!(thick.stderr.contains(part), "{part}\n{}", thick.stderr);
        }
        let hopeless = bench.run(&[command, "hopeless.yaml"]).code(0);
        assert!(
            hopeless.stderr.contains("exceeded too"),
            "{}",
            hopeless.stderr
        );
    }
    let ran = bench
        .run(&["check", "thick.yaml", "--format", "json"])
        .code(0)
        .json();
    let row = &list(&ran, "thickness")[0];
    assert_eq!(row["coherent"], "metastable");
    assert_eq!(row["k"], 2.0);
    assert_abs_diff_eq!(number(row, "matthews_blakeslee_nm"), 14.29, epsilon = 0.01);
}

/// Five wells of 8 nm, each far below its 14.3 nm, and 8 nm of GaAs between: as one layer 72 nm with 5/9 of the misfit,
/// f = 0.0079610; a = 5.69826 Å and ν = 0.31972 on average. By hand, k = 2 (the last GaAs covers them):
/// h = 56.159 Å [ln(h √2/a) + 1] = 297.8 Å.
#[test]
fn many_thin_layers_add_up() {
    let bench = Bench::new();
    let wells = "  - {material: In0.2Ga0.8As, width: 8 nm}\n  - {material: GaAs, width: 8 nm}\n";
    bench.write(
        "wells.yaml",
        format!(
            "substrate: GaAs\nlayers:\n  - {{material: GaAs, width: 20 nm}}\n{}",
            wells.repeat(5)
        ),
    );
    let ran = bench.run(&["check", "wells.yaml"]).code(0);
    assert!(
        ran.stderr
            .contains("taken as one layer of 72 nm with their mean misfit of +0.796 %"),
        "{}",
        ran.stderr
    );
    assert_eq!(ran.stderr.matches("warning").count(), 1, "{}", ran.stderr);
    let json = bench
        .run(&["check", "wells.yaml", "--format", "json"])
        .code(0)
        .json();
    let together = list(&json, "thickness").last().unwrap();
    assert_eq!(together["layer"], "strained layers together");
    let nm = number(together, "matthews_blakeslee_nm");
    assert_abs_diff_eq!(nm, 29.78, epsilon = 0.02);
    // AlGaAs on GaAs is left alone however thick: common practice.
    bench.write(
        "algaas.yaml",
        "substrate: GaAs\nlayers: [{material: GaAs, width: 9 nm}, {material: Al0.3Ga0.7As, width: 1.5 µm}]\n",
    );
    let ran = bench.run(&["check", "algaas.yaml"]).code(0);
    assert_eq!(ran.stderr, "");
}

const TUNED: &str = "\
substrate: InP
field: -80 kV/cm
bands: {conduction: {model: energy-dependent, states: 2}}
layers:
  - {name: below, material: AlInAs, match: substrate, width: 10 nm}
  - {name: lower barrier, material: Al0.60In0.40As, width: 3 nm}
  - {name: well, material: In0.65Ga0.35As, width: 5 nm}
  - {name: upper barrier, material: Al0.60In0.40As, width: 1.5 nm}
  - {name: above, material: AlInAs, match: substrate, width: 10 nm}
tune:
  vary:
    - {layer: well, width: [3 nm, 9 nm]}
    - {layer: lower barrier, width: [1 nm, 8 nm]}
    - {layer: upper barrier, width: [1 nm, 8 nm]}
  aims:
    - {from: conduction 1, to: conduction 2, energy: 250 meV}
";

#[test]
fn tuning_keeps_a_stack_balanced() {
    let bench = Bench::new();
    let keep =
        "  keep: [{strain: balanced, from: lower barrier, to: upper barrier, within: 0.01 %}]\n";
    bench.write("free.yaml", TUNED);
    bench.write("kept.yaml", TUNED.to_owned() + keep);
    let net = |file: &str| {
        let structure = structure(&bench.read(file));
        let stack = structure.stack().unwrap();
        balance(&stack, &[1, 2, 3]).unwrap().net_strain
    };
    let tune = |file: &str, to: &str| {
        let ran = bench.run(&["tune", file, "--format", "json", "-o", to]);
        assert_eq!(ran.code, 0, "{}\n{}", ran.stdout, ran.stderr);
        ran.json()
    };
    let free = tune("free.yaml", "free-tuned.yaml");
    assert!(list(&free, "kept").is_empty());
    assert!(
        net("free-tuned.yaml").abs() > 5e-4,
        "{}",
        net("free-tuned.yaml")
    );
    let kept = tune("kept.yaml", "kept-tuned.yaml");
    assert!(
        net("kept-tuned.yaml").abs() <= 1e-4,
        "{}",
        net("kept-tuned.yaml")
    );
    let row = &list(&kept, "kept")[0];
    assert_eq!(row["met"], true);
    assert_abs_diff_eq!(number(row, "after"), net("kept-tuned.yaml"), epsilon = 1e-9);
    assert_eq!(list(&kept, "aims")[0]["met"], true);
}

/// A wide well gives the energy too, but one with 40 % In on GaAs may only be some 6 nm wide.
#[test]
fn tuning_keeps_below_the_critical_thickness() {
    let file = |keep: &str| {
        format!(
            "\
substrate: GaAs
bands: {{conduction: {{model: energy-dependent, states: 2}}}}
layers:
  - {{material: Al0.3Ga0.7As, width: 15 nm}}
  - {{name: well, material: In0.3Ga0.7As, width: 7 nm}}
  - {{material: Al0.3Ga0.7As, width: 15 nm}}
tune:
  vary:
    - {{layer: well, width: [3 nm, 14 nm]}}
    - {{layer: well, fraction: In, between: [0.02, 0.4]}}
  aims:
    - {{from: conduction 1, to: conduction 2, energy: 110 meV}}
{keep}"
        )
    };
    let bench = Bench::new();
    bench.write("kept.yaml", file("  keep: [{thickness: below critical}]\n"));
    let ran = bench
        .run(&["tune", "kept.yaml", "-o", "tuned.yaml"])
        .code(0);
    assert!(
        ran.stdout.contains("well in critical thicknesses"),
        "{}",
        ran.stdout
    );
    // The layers are bounded one by one here; what they make together is another bound.
    let checked = bench.run(&["check", "tuned.yaml"]).code(0);
    assert!(
        !checked.stderr.contains("is thicker than its critical"),
        "{}",
        checked.stderr
    );
    // Out of reach: the balance of a single strained layer.
    bench.write(
        "never.yaml",
        file("  keep: [{strain: balanced, from: well, to: well}]\n"),
    );
    let ran = bench.run(&["tune", "never.yaml"]).code(1);
    assert!(
        ran.stdout
            .contains("not within the bounds that were to be kept"),
        "{}",
        ran.stdout
    );
    assert!(
        ran.stdout.contains("net strain of well to well"),
        "{}",
        ran.stdout
    );
}

#[test]
fn mistakes_in_bounds_are_pointed_at() {
    let bench = Bench::new();
    bench.write(
        "bad.yaml",
        TUNED.to_owned()
            + "  keep:
    - {strain: balance}
    - {strain: balanced, from: wel, to: above}
    - {strain: balanced, from: well}
    - {strain: balanced, from: above, to: below}
    - {strain: balanced, within: 0.1 nm}
    - {thickness: below critical, layer: wall}
    - {thickness: below critical, within: 1 %}
    - {tension: balanced}
    - {strain: balanced, thickness: below critical}
",
    );
    let ran = bench.run(&["check", "bad.yaml"]).code(2);
    for (line, part) in [
        (18, "did you mean `balanced`?"),
        (19, "did you mean `well`?"),
        (20, "`from` and `to` go together"),
        (21, "`from` lies above `to`"),
        (22, "`0.1 nm` is no net strain"),
        (23, "no layer is named `wall`"),
        (24, "an entry of `keep`"),
        (25, "`tension`"),
        (26, "an entry of `keep`"),
    ] {
        assert!(
            ran.stderr.contains(&format!("bad.yaml:{line}:")),
            "{line}\n{}",
            ran.stderr
        );
        assert!(ran.stderr.contains(part), "{part}\n{}", ran.stderr);
    }
}

const FIVE_WELLS: &str = "\
substrate: GaAs
bands: {conduction: {model: energy-dependent, states: 1}, valence: {model: decoupled, states: 1}}
layers:
  - {material: GaAs, width: 15 nm}
  - repeat: 5
    layers:
      - {name: well, material: In0.2Ga0.8As, width: 6 nm}
      - {name: between, material: Al0.1Ga0.9As, width: 10 nm}
  - {material: GaAs, width: 15 nm}
";

/// The stack as one layer is W/h_c(f, W) with the width of all from the first to the last strained layer and the misfit's mean
/// over it, and its slopes are those of differences.
#[test]
fn strained_layers_together_are_one_layer() {
    let stack = |width: f64, between: f64, indium: f64| {
        let text = FIVE_WELLS
            .replace("6 nm", &format!("{width} nm"))
            .replace("10 nm", &format!("{between} nm"))
            .replace(
                "In0.2Ga0.8As",
                &format!("In{indium:.6}Ga{:.6}As", 1.0 - indium),
            );
        structure::read(&text).0.unwrap().stack().unwrap()
    };
    let at = |width: f64, between: f64, indium: f64| {
        whole_thickness_ratio(&stack(width, between, indium), None).value
    };
    let design = stack(6.0, 10.0, 0.2);
    // AlGaAs is strained a little too: five wells and five of those.
    let (well, spacer) = (
        layer_mean(&design, 1).unwrap(),
        layer_mean(&design, 2).unwrap(),
    );
    let mean = |of: fn(&LayerMean) -> f64| (6.0 * of(&well) + 10.0 * of(&spacer)) / 16.0;
    let critical_nm = matthews_blakeslee_nm(
        mean(|m| m.lattice_nm),
        mean(|m| m.misfit),
        mean(|m| m.poisson),
        Glide::Buried,
    );
    let expected = 80.0 / critical_nm;
    assert!((at(6.0, 10.0, 0.2) / expected - 1.0).abs() < 1e-12);
    let knobs = [
        (Knob::Width { entry: 1 }, [1.0, 0.0, 0.0], 1e-3),
        (Knob::Width { entry: 2 }, [0.0, 1.0, 0.0], 1e-3),
        (
            Knob::Fraction {
                entry: 1,
                element: Element::In,
            },
            [0.0, 0.0, 1.0],
            1e-4,
        ),
        (Knob::Width { entry: 0 }, [0.0, 0.0, 0.0], 1.0),
    ];
    for (knob, [width, between, indium], h) in knobs {
        let off = |by: f64| at(6.0 + by * width, 10.0 + by * between, 0.2 + by * indium);
        let difference = (off(h) - off(-h)) / (2.0 * h);
        let slope = whole_thickness_ratio(&design, Some(knob)).slope;
        assert!(
            (slope - difference).abs() < 1e-5 * difference.abs() + 1e-12,
            "{knob:?}: {slope} for {difference}"
        );
    }
}

/// Each well alone would stay coherent, the five together would not: the bound on the stack takes indium out or room in.
#[test]
fn tuning_keeps_the_stack_below_the_critical_thickness() {
    let file = |keep: &str| {
        FIVE_WELLS.to_owned()
            + "tune:
  vary:
    - {layer: well, width: [4 nm, 9 nm]}
    - {layer: between, width: [8 nm, 30 nm]}
    - {layer: well, fraction: In, between: [0.05, 0.3]}
  aims:
    - {from: heavy-hole 1, to: conduction 1, wavelength: 920 nm, within: 1 nm}
" + keep
    };
    let bench = Bench::new();
    bench.write(
        "kept.yaml",
        file("  keep: [{thickness: below critical, of: stack}]\n"),
    );
    let ran = bench
        .run(&["tune", "kept.yaml", "-o", "tuned.yaml"])
        .code(0);
    let text = &ran.stdout;
    assert!(
        text.contains("strained layers together in critical thicknesses"),
        "{text}"
    );
    let tuned = structure::read(&bench.read("tuned.yaml"))
        .0
        .unwrap()
        .stack()
        .unwrap();
    assert!(whole_thickness_ratio(&tuned, None).value <= 1.0);
    let free = structure::read(FIVE_WELLS).0.unwrap().stack().unwrap();
    assert!(whole_thickness_ratio(&free, None).value > 1.0);
    bench.write(
        "bad.yaml",
        file("  keep: [{thickness: below critical, of: stack, layer: well}, {thickness: below critical, of: stak}]\n"),
    );
    let ran = bench.run(&["check", "bad.yaml"]).code(2);
    for part in ["`of: stack` is all of them", "did you mean `stack`?"] {
        assert!(ran.stderr.contains(part), "{part}\n{}", ran.stderr);
    }
}
