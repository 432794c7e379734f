//! The ladder of levels of modules in a field: Wannier's exact spacing, independence of how many modules are solved
//! together, mirrored fields, and published cascades, which print their values for the README with
//! `cargo test --release --test cascade -- --nocapture`.

mod common;

use common::{Bench, list, number, shipped_files};
use serde_json::Value;
use std::f64::consts::PI;
use wellwright::models::BandOperator;
use wellwright::structure;
use wellwright::subbands::{Accuracy, solve};
use wellwright::superlattice::{
    Alignment, Ladder, Module, Neighbours, ladder, ladder_in, minibands,
};

/// Alternating barriers and wells in Å, the first a barrier, as a module that is repeated.
struct Cascade<'s> {
    sequence: &'s [f64],
    barrier_ev: f64,
    masses: [f64; 2],
    /// E′ in well and barrier.
    law_ev: Option<[f64; 2]>,
    field_kv_cm: f64,
    states: usize,
}

impl Cascade<'_> {
    fn layers(&self, indentation: &str) -> String {
        let line = |(k, width): (usize, &f64)| {
            let material = if k % 2 == 0 { "Barrier" } else { "Well" };
            format!("{indentation}- {{material: {material}, width: {width} Å}}\n")
        };
        self.sequence.iter().enumerate().map(line).collect()
    }

    fn head(&self) -> String {
        let law = |which: usize| {
            self.law_ev.map_or(String::new(), |ev| {
                format!(", nonparabolicity_energy: {} eV", ev[which])
            })
        };
        format!(
            "field: {} kV/cm\nbands: {{conduction: {{model: {}, states: {}}}}}\nmaterials:\n  \
             Well: {{conduction_edge: 0 eV, electron_mass: {}{}}}\n  \
             Barrier: {{conduction_edge: {} eV, electron_mass: {}{}}}\nlayers:\n",
            self.field_kv_cm,
            if self.law_ev.is_some() {
                "energy-dependent"
            } else {
                "parabolic"
            },
            self.states,
            self.masses[0],
            law(0),
            self.barrier_ev,
            self.masses[1],
            law(1),
        )
    }

    fn file(&self, modules: usize) -> String {
        format!(
            "{}  - repeat: {modules}\n    layers:\n{}",
            self.head(),
            self.layers("      ")
        )
    }

    fn ladder_in(&self, neighbours: Option<Neighbours>) -> Ladder {
        let text = self.file(2);
        let (structure, problems) = structure::read(&text);
        let structure = structure.unwrap_or_else(|| panic!("{problems:?}\n{text}"));
        let stack = structure.stack().unwrap();
        let module = structure.one_copy(&stack, structure.repeated().unwrap());
        let operator = BandOperator::conduction(&module, structure.conduction.model).unwrap();
        let module = Module {
            operator: &operator,
            field_v_per_nm: stack.field_v_per_nm,
        };
        match neighbours {
            Some(neighbours) => ladder_in(module, neighbours, self.states, Accuracy::default()),
            None => ladder(module, self.states, Accuracy::default()),
        }
    }

    fn ladder(&self) -> Ladder {
        self.ladder_in(None)
    }
}

/// Fathololoumi et al., Opt. Express 20, 3866 (2012).
const RESONANT: Cascade = Cascade {
    sequence: &[43., 89., 24.6, 81.5, 41., 160.],
    barrier_ev: 0.135,
    masses: [0.067, 0.07945],
    law_ev: None,
    field_kv_cm: -12.2,
    states: 4,
};

/// A deep module whose states cannot leave: two coupled wells, 20 kV/cm.
const HELD: Cascade = Cascade {
    sequence: &[60.0, 70.0, 30.0, 50.0],
    barrier_ev: 1.2,
    masses: [0.067, 0.09],
    law_ev: None,
    field_kv_cm: -20.0,
    states: 3,
};

/// E → E + e F d under a shift by a period: 20 kV/cm over 21 nm are 42 meV.
#[test]
fn neighbouring_modules_are_a_period_of_potential_apart() {
    for law_ev in [None, Some([1.519, 1.93])] {
        let found = Cascade { law_ev, ..HELD }.ladder();
        assert!((found.drop_ev - 0.042).abs() < 1e-12);
        assert_eq!(found.states.len(), 3);
        for state in &found.states {
            assert!(state.ladder_residual_ev.abs() < 1e-9, "{state:?}");
            assert!(state.window_shift_ev < 1e-9, "{state:?}");
        }
    }
}

/// 4, 5, 6, … modules give the same, and the levels are those of a module in the midst of a whole stack between walls.
#[test]
fn the_ladder_does_not_depend_on_how_many_modules_are_solved() {
    let few = HELD.ladder();
    for (upstream, downstream) in [(3, 1), (2, 2), (4, 3), (6, 5)] {
        let more = HELD.ladder_in(Some(Neighbours {
            upstream,
            downstream,
        }));
        for (a, b) in few.states.iter().zip(&more.states) {
            assert!((a.energy_ev - b.energy_ev).abs() < 1e-9);
            assert!((a.centre_nm - b.centre_nm).abs() < 1e-5);
        }
        for (a, b) in few.transitions.iter().zip(&more.transitions) {
            assert!((a.dipole_nm - b.dipole_nm).abs() < 1e-5, "{a:?} {b:?}");
        }
    }
    // Five modules and an end barrier, as `levels` solves them.
    let text = HELD.file(5) + "  - {material: Barrier, width: 200 Å}\n";
    let (structure, _) = structure::read(&text.replace("states: 3", "states: 20"));
    let structure = structure.unwrap();
    let stack = structure.stack().unwrap();
    let operator = BandOperator::conduction(&stack, structure.conduction.model).unwrap();
    let whole = solve(&operator, 20, Accuracy::default());
    for state in &few.states {
        // The third module's lower face lies two periods up.
        let expected = state.energy_ev - 2.0 * few.drop_ev;
        let nearest = whole
            .pairs
            .iter()
            .map(|pair| (pair.value - expected).abs())
            .fold(f64::INFINITY, f64::min);
        assert!(nearest < 1e-7, "{nearest}");
    }
}

/// A stack grown the other way round in the opposite field is the same stack.
#[test]
fn a_mirrored_module_in_the_opposite_field_has_the_same_levels() {
    let one = HELD.ladder();
    // Beginning with its barrier, a mirrored module is barrier, then the rest backwards.
    let mirrored = Cascade {
        sequence: &[60.0, 50.0, 30.0, 70.0],
        field_kv_cm: 20.0,
        ..HELD
    };
    let other = mirrored.ladder();
    assert!(one.along_growth && !other.along_growth);
    let relative = |l: &Ladder| -> Vec<f64> {
        // The border of the modules lies elsewhere, so the same states may be counted from another module.
        let mut energies: Vec<f64> = l
            .states
            .iter()
            .map(|s| (s.energy_ev - l.states[0].energy_ev).rem_euclid(l.drop_ev))
            .collect();
        energies.sort_by(f64::total_cmp);
        energies
    };
    for (a, b) in relative(&one).iter().zip(relative(&other)) {
        let apart = (a - b).abs();
        assert!(apart.min(one.drop_ev - apart) < 1e-8, "{a} {b}");
    }
}

/// Where a module is said to begin changes neither its levels, counted round e F d, nor their dipoles, nor which of them
/// align: a level that is called one of the next module there is one of the same here.
#[test]
fn a_module_may_begin_at_any_barrier() {
    let round = |l: &Ladder, offset_ev: f64| -> Vec<f64> {
        let energies = l.states.iter();
        energies
            .map(|s| (s.energy_ev + offset_ev).rem_euclid(l.drop_ev))
            .collect()
    };
    for law_ev in [None, Some([1.519, 1.93])] {
        let one = Cascade { law_ev, ..HELD }.ladder();
        let other = Cascade {
            law_ev,
            sequence: &[30.0, 50.0, 60.0, 70.0],
            ..HELD
        }
        .ladder();
        // The field's energy is zero 13 nm higher: −20 kV/cm.
        let energies = [round(&one, 0.0), round(&other, -0.026)];
        let partner = |a: f64| {
            let apart = |b: f64| {
                let apart = (a - b).abs();
                apart.min(one.drop_ev - apart)
            };
            let places = (0..3).map(|k| (k, apart(energies[1][k])));
            places.min_by(|a, b| a.1.total_cmp(&b.1)).unwrap()
        };
        let partners: Vec<usize> = energies[0]
            .iter()
            .map(|a| {
                let (place, apart_ev) = partner(*a);
                assert!(apart_ev < 1e-9, "{apart_ev}");
                place
            })
            .collect();
        let mut compared = 0;
        for t in &one.transitions {
            let names = [partners[t.from], partners[t.to]];
            let same = other.transitions.iter().find(|u| {
                let own = [u.from, u.to];
                own == names && (u.energy_ev - t.energy_ev).abs() < 1e-8
            });
            let Some(same) = same else { continue };
            compared += 1;
            assert!((same.dipole_nm - t.dipole_nm).abs() < 1e-7);
            assert!((same.overlap - t.overlap).abs() < 1e-7);
        }
        assert!(compared >= 4, "{compared}");
    }
}

/// Injection through its resonance: the gap is the least distance over a scan of the field, and its field the scan's.
#[test]
fn anticrossings_are_where_a_scan_of_the_field_finds_them() {
    let found = RESONANT.ladder();
    let crossing = found
        .alignments
        .iter()
        .find(|a| (a.upstream, a.downstream, a.next_module) == (2, 3, false))
        .and_then(|a| a.anticrossing)
        .unwrap_or_else(|| panic!("{:?}", found.alignments));
    let distance = |field_v_per_nm: f64| {
        let at = Cascade {
            field_kv_cm: 1e4 * field_v_per_nm,
            ..RESONANT
        };
        let ladder = at.ladder();
        // The two may be counted from neighbouring modules.
        let mut least = f64::INFINITY;
        for (k, a) in ladder.states.iter().enumerate() {
            for b in &ladder.states[..k] {
                let apart = (a.energy_ev - b.energy_ev).abs();
                least = least.min(apart).min((apart - ladder.drop_ev).abs());
            }
        }
        least
    };
    let least = distance(crossing.field_v_per_nm);
    assert!(
        (least - crossing.gap_ev).abs() < 1e-7,
        "{least} {crossing:?}"
    );
    // Further off other levels come near the two.
    for step in [-4e-3, -2e-3, 2e-3, 4e-3] {
        assert!(distance(crossing.field_v_per_nm * (1.0 + step)) > least);
    }
}

/// A superlattice in a field: the levels of a miniband of width Δ in the tight-binding limit are the ladder E₀ + n e F d,
/// with E₀ the mean of the miniband over the minizone, and spread over Δ/e F (Wannier 1960; Bleuse, Bastard and Voisin, Phys. Rev. Lett. 60,
/// 220 (1988), from memory).
#[test]
fn a_superlattice_in_a_field_has_the_ladder_of_its_miniband() {
    let superlattice = Cascade {
        sequence: &[60.0, 60.0],
        barrier_ev: 0.25,
        masses: [0.067, 0.067],
        field_kv_cm: 1.0,
        states: 1,
        ..HELD
    };
    let found = superlattice.ladder();
    let state = &found.states[0];
    assert!(state.ladder_residual_ev.abs() < 1e-8, "{state:?}");
    assert!(state.window_shift_ev < 1e-8, "{state:?}");
    let text = superlattice
        .file(2)
        .replace("field: 1 kV/cm", "ends: periodic");
    let (structure, problems) = structure::read(&text);
    let structure = structure.unwrap_or_else(|| panic!("{problems:?}"));
    let period = structure.period(&structure.stack().unwrap());
    let operator = BandOperator::conduction(&period, structure.conduction.model).unwrap();
    let solved = minibands(&operator, 1, Accuracy::default());
    let [low, high] = solved.minibands[0].edges.map(|edge| edge.energy_ev);
    let phases: Vec<f64> = (0..64).map(|k| PI * (f64::from(k) + 0.5) / 64.0).collect();
    let mean = solved.dispersed(&phases)[0].energies_ev.iter().sum::<f64>() / 64.0;
    // The well's middle lies 9 nm above the lower face.
    let expected = mean + 1e-4 * 9.0;
    let apart = (state.energy_ev - expected).rem_euclid(found.drop_ev);
    let apart = apart.min(found.drop_ev - apart);
    assert!(apart < 3e-3 * (high - low), "{apart} {}", high - low);
    // ⟨(z − z₀)²⟩ = 2 (t/e F)² beside the spread of the envelope in one well, with Δ = 4 t.
    let hopping_nm = (0.25 * (high - low) / 1e-4) * 2f64.sqrt();
    let one_well_nm = WELL_SPREAD_NM;
    let spread_nm = hopping_nm.hypot(one_well_nm);
    assert!(
        (state.extent_nm / spread_nm - 1.0).abs() < 0.05,
        "{} {spread_nm}",
        state.extent_nm
    );
}

/// Standard deviation of the ground state of a 6 nm well, about: that of a box 7.6 nm wide, L √(1/12 − 1/2π²).
const WELL_SPREAD_NM: f64 = 7.6 * 0.1808;

struct Row {
    device: &'static str,
    quantity: &'static str,
    published: f64,
    computed: f64,
    tolerance: f64,
}

/// The devices of `tests/published.rs` as modules of a ladder. Inputs and sources stand there.
#[test]
fn published_cascades_as_ladders() {
    let mut rows = Vec::new();
    let mut row = |device, quantity, published, computed, tolerance| {
        rows.push(Row {
            device,
            quantity,
            published,
            computed,
            tolerance,
        });
    };
    let between = |l: &Ladder, a: usize, b: usize| {
        1e3 * (l.states[b - 1].energy_ev - l.states[a - 1].energy_ev)
    };
    let same = |l: &Ladder, a: usize, b: usize| {
        *l.transitions
            .iter()
            .find(|t| !t.to_next_module && (t.from, t.to) == (a - 1, b - 1))
            .unwrap()
    };

    // Williams et al., Appl. Phys. Lett. 82, 1015 (2003).
    let l = Cascade {
        sequence: &[54., 78., 24., 64., 38., 148., 24., 94.],
        barrier_ev: 0.1496,
        masses: [0.067, 0.07945],
        law_ev: None,
        field_kv_cm: -12.2,
        states: 5,
    }
    .ladder();
    let device = "3.4 THz, Appl. Phys. Lett. 82, 1015 (2003)";
    row(
        device,
        "energy per module (meV)",
        64.0,
        1e3 * l.drop_ev,
        0.5,
    );
    row(device, "E5 − E4 (meV)", 13.9, between(&l, 4, 5), 0.5);
    let gap = l
        .alignments
        .iter()
        .find(|a| !a.next_module && (a.upstream, a.downstream) == (2, 3))
        .and_then(|a| a.anticrossing);
    row(
        device,
        "anticrossing 4–3, full gap (meV)",
        5.3,
        1e3 * gap.unwrap().gap_ev,
        0.4,
    );

    // Fathololoumi et al., Opt. Express 20, 3866 (2012): half gaps of injection and extraction.
    let l = RESONANT.ladder();
    let device = "200 K, Opt. Express 20, 3866 (2012)";
    let half_gap = |a: usize, b: usize| {
        let own = |x: &&Alignment| !x.next_module && (x.upstream, x.downstream) == (a, b);
        let pair = l.alignments.iter().find(own);
        0.5e3 * pair.and_then(|a| a.anticrossing).unwrap().gap_ev
    };
    row(
        device,
        "injection coupling, half gap (meV)",
        1.38,
        half_gap(2, 3),
        0.08 * 1.38,
    );
    row(
        device,
        "extraction coupling, half gap (meV)",
        2.47,
        half_gap(0, 1),
        0.08 * 2.47,
    );

    // Amanti et al., New J. Phys. 11, 125022 (2009).
    let l = Cascade {
        sequence: &[55., 110., 18., 115., 38., 94., 42., 184.],
        barrier_ev: 0.135,
        masses: [0.067, 0.07945],
        law_ev: Some([1.519, 1.706]),
        field_kv_cm: -7.6,
        states: 6,
    }
    .ladder();
    let device = "3.1 THz, New J. Phys. 11, 125022 (2009)";
    row(device, "E5 − E4 (meV)", 12.0, between(&l, 4, 5), 0.8);
    row(device, "z54 (nm)", 4.4, same(&l, 4, 5).dipole_nm, 0.3);

    // Vitiello et al., Appl. Phys. Lett. 90, 191115 (2007).
    let l = Cascade {
        sequence: &[
            39., 140., 6., 91., 6., 160., 15., 128., 18., 122., 20., 120., 20., 114., 27., 113.,
            35., 116.,
        ],
        barrier_ev: 0.1234,
        masses: [0.067, 0.07945],
        law_ev: Some([1.519, 1.706]),
        field_kv_cm: -2.09,
        states: 9,
    }
    .ladder();
    let device = "2.7 THz, Appl. Phys. Lett. 90, 191115 (2007)";
    // The injector's ground state of the module before shares the upper state: 8 and 9 are that doublet, 7 the lower state.
    let shared = [8, 9].map(|upper| same(&l, 7, upper).dipole_nm);
    row(device, "E9 − E7 (meV)", 11.1, between(&l, 7, 9), 0.8);
    row(
        device,
        "z of 8 and 9 to 7 (nm)",
        9.2,
        shared[0].hypot(shared[1]),
        0.8,
    );

    // Sirtori et al., Appl. Phys. Lett. 73, 3486 (1998), from memory.
    let l = Cascade {
        sequence: &[
            58., 15., 20., 49., 17., 40., 34., 32., 20., 28., 23., 23., 25., 23., 25., 21.,
        ],
        barrier_ev: 0.276,
        masses: [0.067, 0.0944],
        law_ev: Some([1.519, 1.931]),
        field_kv_cm: -48.0,
        states: 9,
    }
    .ladder();
    row(
        "9.4 µm, Appl. Phys. Lett. 73, 3486 (1998) (m)",
        "lasing transition (meV)",
        131.9,
        between(&l, 6, 8),
        6.0,
    );
    for r in &rows {
        println!(
            "| {} | {} | {} | {:.3} | {:+.3} | {} |",
            r.device,
            r.quantity,
            r.published,
            r.computed,
            r.computed - r.published,
            r.tolerance
        );
    }
    for r in &rows {
        assert!(
            (r.computed - r.published).abs() <= r.tolerance,
            "{}: {}",
            r.device,
            r.quantity
        );
    }
}

/// Tables, JSON, CSV and picture say the same; forty modules cost what a few do.
#[test]
fn the_command_prints_the_ladder() {
    let bench = Bench::new();
    bench.write("a.yaml", HELD.file(40));
    let json: Value = bench
        .run(&["cascade", "a.yaml", "--format", "json"])
        .code(0)
        .json();
    assert_eq!(list(&json, "states").len(), 3);
    assert!((number(&json, "energy_per_module_meV") - 42.0).abs() < 1e-9);
    assert_eq!(json["modules"], 40);
    assert_eq!(json["downstream"], "along growth");
    let few = {
        bench.write("few.yaml", HELD.file(3));
        bench
            .run(&["cascade", "few.yaml", "--format", "json"])
            .code(0)
            .json()
    };
    assert_eq!(
        few["states"], json["states"],
        "the number of modules grown does not matter"
    );
    let text = bench.run(&["cascade", "a.yaml"]).code(0).stdout;
    assert!(
        text.contains("An electron loses 42 meV from module to module, along growth."),
        "{text}"
    );
    let csv = bench
        .run(&["cascade", "a.yaml", "--format", "csv"])
        .code(0)
        .stdout;
    assert!(csv.starts_with("state,energy_eV,above_lowest_meV"), "{csv}");
    bench.run(&["cascade", "a.yaml", "-o", "a.svg"]).code(0);
    roxmltree::Document::parse(&bench.read("a.svg")).unwrap();
    // `levels` of the whole cascade points here.
    let told = bench.run(&["levels", "a.yaml"]).code(0).stderr;
    assert!(told.contains("wellwright cascade"), "{told}");
}

/// Stacks that are not tuned: a cascade and a superlattice, used as a user does.
#[test]
fn shipped_cascades_and_superlattices_are_solved_and_drawn() {
    let mut found = [0, 0];
    for file in shipped_files() {
        let text = std::fs::read_to_string(&file).unwrap();
        if text.contains("\ntune:") || text.contains("ends: open") {
            continue;
        }
        let bench = Bench::new();
        let name = file.to_str().unwrap();
        bench.run(&["check", name]).code(0);
        bench.run(&["sheet", name]).code(0);
        bench.run(&["sheet", name, "-o", "sheet.html"]).code(0);
        assert!(bench.read("sheet.html").contains("<svg"));
        bench.run(&["levels", name]).code(0);
        let command = if text.contains("ends: periodic") {
            found[0] += 1;
            "dispersion"
        } else {
            found[1] += 1;
            "cascade"
        };
        let ran = bench.run(&[command, name]).code(0);
        assert!(!ran.stderr.contains("audit"), "{}", ran.stderr);
        bench.run(&[command, name, "-o", "a.svg"]).code(0);
        let drawn = bench.read("a.svg");
        assert!(drawn.len() < 200_000, "{} bytes", drawn.len());
        roxmltree::Document::parse(&drawn).unwrap();
    }
    assert!(found.iter().all(|n| *n > 0), "{found:?}");
}

#[test]
fn what_makes_no_ladder_is_told() {
    let bench = Bench::new();
    let layers = HELD.layers("  ");
    bench.write("flat.yaml", format!("{}{layers}", HELD.head()));
    let told = bench.run(&["cascade", "flat.yaml"]).code(2).stderr;
    assert!(told.contains("no `repeat`"), "{told}");
    bench.write("zero.yaml", HELD.file(3).replace("-20 kV/cm", "0 kV/cm"));
    let told = bench.run(&["cascade", "zero.yaml"]).code(2).stderr;
    assert!(
        told.contains("there is no field") && told.contains("ends: periodic"),
        "{told}"
    );
    let twice = HELD.file(3) + &HELD.file(2)[HELD.head().len()..];
    bench.write("twice.yaml", twice);
    let told = bench.run(&["cascade", "twice.yaml"]).code(2).stderr;
    assert!(told.contains("2 repeats side by side"), "{told}");
    bench.write("more.yaml", HELD.file(3).replace("states: 3", "states: 40"));
    let told = bench.run(&["cascade", "more.yaml"]).code(0).stderr;
    assert!(told.contains("of 40 states asked for"), "{told}");
}
