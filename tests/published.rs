//! Published devices: what was published, what this program computes from the inputs the publication used, and how far
//! they are apart. `cargo test --release --test published -- --nocapture` prints the table.
//!
//! The papers state the layer sequences and the results; where a paper leaves an input open (barrier height, mass of
//! the barrier, field), the input is named in the row. Sequences are in Å, an injection barrier first, in the direction
//! of electron flow, so the field is negative: the electron's energy falls along the growth direction. One module is
//! solved between thick barriers; doping is neglected.
//! Rows marked (m) have their published value, or the sequence, from memory of the paper; the others were read in it.

use wellwright::models::BandOperator;
use wellwright::optics::{Transition, transitions};
use wellwright::structure;
use wellwright::subbands::{Accuracy, Subbands, solve};
use wellwright::tune::tune;

/// Materials of a two-material sequence.
#[derive(Clone, Copy)]
struct Materials {
    barrier_ev: f64,
    well_mass: f64,
    barrier_mass: f64,
    /// E′ of the two-band law in well and barrier; `None` for parabolic bands.
    nonparabolicity_ev: Option<(f64, f64)>,
}

/// GaAs/Al0.15Ga0.85As with an offset of 80 % of 1.247 x eV, as several terahertz papers state.
const OFFSET_80: Materials = Materials {
    barrier_ev: 0.1496,
    well_mass: 0.067,
    barrier_mass: 0.07945,
    nonparabolicity_ev: None,
};
/// GaAs/Al0.15Ga0.85As with the barrier of about 135 meV that other groups use.
const OFFSET_72: Materials = Materials {
    barrier_ev: 0.135,
    ..OFFSET_80
};
/// The gaps of GaAs and Al0.15Ga0.85As, 1.519 and 1.519 + 1.247 x eV, as E′.
const ALGAAS_15_GAPS: Option<(f64, f64)> = Some((1.519, 1.706));

/// A structure file of alternating barriers and wells (Å), the first a barrier, between barriers of `pad` Å.
fn file(
    sequence: &[f64],
    materials: Materials,
    field_kv_cm: f64,
    states: usize,
    pad: f64,
) -> String {
    let law = |ev: Option<f64>| {
        ev.map_or(String::new(), |ev| {
            format!(", nonparabolicity_energy: {ev} eV")
        })
    };
    let model = if materials.nonparabolicity_ev.is_some() {
        "energy-dependent"
    } else {
        "parabolic"
    };
    let mut text = format!(
        "field: {field_kv_cm} kV/cm\nbands: {{conduction: {{model: {model}, states: {states}}}}}\nmaterials:\n  \
         Well: {{conduction_edge: 0 eV, electron_mass: {}{}}}\n  \
         Barrier: {{conduction_edge: {} eV, electron_mass: {}{}}}\nlayers:\n",
        materials.well_mass,
        law(materials.nonparabolicity_ev.map(|e| e.0)),
        materials.barrier_ev,
        materials.barrier_mass,
        law(materials.nonparabolicity_ev.map(|e| e.1)),
    );
    for (k, width) in sequence.iter().enumerate() {
        let material = if k % 2 == 0 { "Barrier" } else { "Well" };
        let width = if k == 0 { width.max(pad) } else { *width };
        text += &format!("  - {{material: {material}, width: {width} Å}}\n");
    }
    if sequence.len().is_multiple_of(2) {
        text += &format!("  - {{material: Barrier, width: {pad} Å}}\n");
    }
    text
}

fn solved(text: &str) -> Subbands {
    let (structure, problems) = structure::read(text);
    let structure = structure.unwrap_or_else(|| panic!("{problems:?}\n{text}"));
    let stack = structure.stack().unwrap();
    let operator = BandOperator::conduction(&stack, structure.conduction.model).unwrap();
    solve(&operator, structure.conduction.states, Accuracy::default())
}

/// The transition between two levels counted from 1.
fn transition(text: &str, from: usize, to: usize) -> Transition {
    transitions(&solved(text))
        .into_iter()
        .find(|t| t.from + 1 == from && t.to + 1 == to)
        .unwrap()
}

/// The smallest gap of two neighbouring levels over a range of fields (kV/cm), the anticrossing gap, in meV.
fn anticrossing(file_at: impl Fn(f64) -> String, lower: usize, fields: (f64, f64)) -> f64 {
    let gap = |field: f64| {
        let levels = solved(&file_at(field)).pairs;
        1e3 * (levels[lower].value - levels[lower - 1].value)
    };
    // Golden section; the gap has one minimum in the range.
    let (mut low, mut high) = fields;
    let part = 0.5 * (5f64.sqrt() - 1.0);
    for _ in 0..40 {
        let (a, b) = (high - part * (high - low), low + part * (high - low));
        if gap(a) < gap(b) {
            high = b;
        } else {
            low = a;
        }
    }
    gap(0.5 * (low + high))
}

struct Row {
    device: &'static str,
    quantity: &'static str,
    published: f64,
    computed: f64,
    tolerance: f64,
    unit: &'static str,
    inputs: &'static str,
    source: &'static str,
}

#[derive(Default)]
struct Table {
    rows: Vec<Row>,
}

impl Table {
    /// Begins the rows of one device.
    fn device<'t>(
        &'t mut self,
        device: &'static str,
        inputs: &'static str,
        source: &'static str,
    ) -> Device<'t> {
        Device {
            table: self,
            device,
            inputs,
            source,
        }
    }

    fn markdown(&self) -> String {
        let mut text = String::from(
            "| device | quantity | published | computed | difference | tolerance | inputs left open by the paper | source |\n\
             | --- | --- | --- | --- | --- | --- | --- | --- |\n",
        );
        for row in &self.rows {
            let digits = if row.tolerance < 0.1 {
                3
            } else if row.tolerance < 1.0 {
                2
            } else {
                1
            };
            text += &format!(
                "| {} | {} | {} {} | {:.digits$} | {:+.digits$} | {:.digits$} | {} | {} |\n",
                row.device,
                row.quantity,
                row.published,
                row.unit,
                row.computed,
                row.computed - row.published,
                row.tolerance,
                row.inputs,
                row.source
            );
        }
        text.replace("  ", " ").replace("| -0.00 |", "| +0.00 |")
    }
}

struct Device<'t> {
    table: &'t mut Table,
    device: &'static str,
    inputs: &'static str,
    source: &'static str,
}

impl Device<'_> {
    fn row(
        &mut self,
        quantity: &'static str,
        published: f64,
        computed: f64,
        tolerance: f64,
        unit: &'static str,
    ) {
        let Device {
            device,
            inputs,
            source,
            ..
        } = *self;
        self.table.rows.push(Row {
            device,
            quantity,
            published,
            computed,
            tolerance,
            unit,
            inputs,
            source,
        });
    }
}

const PAD: f64 = 300.0;

fn terahertz(table: &mut Table) {
    let text = file(
        &[54., 78., 24., 64., 38., 148., 24., 94.],
        OFFSET_80,
        -12.2,
        5,
        PAD,
    );
    let mut device = table.device(
        "3.4 THz, GaAs/Al0.15Ga0.85As",
        "barrier 149.6 meV, parabolic",
        "Williams et al., Appl. Phys. Lett. 82, 1015 (2003)",
    );
    device.row(
        "E5 − E4",
        13.9,
        1e3 * transition(&text, 4, 5).energy_ev,
        0.5,
        "meV",
    );
    device.row(
        "E4 − E3",
        5.3,
        1e3 * transition(&text, 3, 4).energy_ev,
        0.4,
        "meV",
    );
    device.row(
        "E2 − E1",
        6.6,
        1e3 * transition(&text, 1, 2).energy_ev,
        0.8,
        "meV",
    );

    // The paper prints the transition but not the field: the field is tuned to it.
    let text = file(&[48., 85., 28., 85., 42., 164.], OFFSET_72, -12.5, 4, PAD)
        + "tune:\n  vary: [{field: [-14 kV/cm, -11 kV/cm]}]\n  aims: [{from: conduction 3, to: conduction 4, energy: 15.7 meV}]\n";
    let (structure, _) = structure::read(&text);
    let structure = structure.unwrap();
    let outcome = tune(
        &structure,
        &structure.stack().unwrap(),
        Accuracy::default(),
        &|_| {},
    )
    .unwrap();
    assert!(outcome.met[0]);
    let list = transitions(outcome.after.bands.conduction().unwrap());
    let lasing = list.iter().find(|t| (t.from, t.to) == (2, 3)).unwrap();
    let mut device = table.device(
        "3.9 THz, GaAs/Al0.15Ga0.85As",
        "barrier 135 meV, parabolic; field tuned to 15.7 meV",
        "Kumar, Hu and Reno, Appl. Phys. Lett. 94, 131105 (2009)",
    );
    device.row("z43", 37.0, 10.0 * lasing.dipole_nm, 3.0, "Å");
    device.row(
        "f43 (0.067 m0)",
        0.38,
        0.067 * lasing.oscillator_strength,
        0.03,
        "",
    );

    let doublet = file(&[43., 89., 24.6, 81.5], OFFSET_72, -12.2, 2, PAD);
    let injection = |field| {
        file(
            &[41., 160., 43., 89., 24.6, 81.5, 41., 160.],
            OFFSET_72,
            field,
            5,
            PAD,
        )
    };
    let extraction = |field| file(&[43., 89., 24.6, 81.5, 41., 160.], OFFSET_72, field, 3, PAD);
    let mut device = table.device(
        "resonant phonon, 200 K, GaAs/Al0.15Ga0.85As",
        "barrier 135 meV, parabolic",
        "Fathololoumi et al., Opt. Express 20, 3866 (2012)",
    );
    device.row(
        "doublet E2 − E1",
        15.1,
        1e3 * transition(&doublet, 1, 2).energy_ev,
        0.3,
        "meV",
    );
    device.row(
        "doublet f12 (0.067 m0)",
        0.475,
        0.067 * transition(&doublet, 1, 2).oscillator_strength,
        0.03,
        "",
    );
    let coupling = 0.5 * anticrossing(injection, 4, (-13.5, -11.0));
    device.row(
        "injection coupling (half gap)",
        1.38,
        coupling,
        0.08 * 1.38,
        "meV",
    );
    let coupling = 0.5 * anticrossing(extraction, 2, (-13.5, -11.0));
    device.row(
        "extraction coupling (half gap)",
        2.47,
        coupling,
        0.08 * 2.47,
        "meV",
    );

    let materials = Materials {
        nonparabolicity_ev: ALGAAS_15_GAPS,
        ..OFFSET_72
    };
    let text = file(
        &[55., 110., 18., 115., 38., 94., 42., 184.],
        materials,
        -7.6,
        5,
        PAD,
    );
    let mut device = table.device(
        "3.1 THz, bound to continuum",
        "barrier 135 meV, E′ 1.519/1.706 eV",
        "Amanti et al., New J. Phys. 11, 125022 (2009)",
    );
    device.row(
        "E5 − E4",
        12.0,
        1e3 * transition(&text, 4, 5).energy_ev,
        0.8,
        "meV",
    );
    device.row(
        "z54",
        44.0,
        10.0 * transition(&text, 4, 5).dipole_nm,
        3.0,
        "Å",
    );

    let materials = Materials {
        barrier_ev: 0.36,
        well_mass: 0.043,
        barrier_mass: 0.045,
        nonparabolicity_ev: None,
    };
    let text = file(&[30., 144., 10., 135., 30., 243.], materials, -9.0, 4, PAD);
    let mut device = table.device(
        "terahertz, InGaAs/GaAsSb",
        "well mass 0.043, parabolic",
        "Deutsch et al., Appl. Phys. Lett. 101, 211117 (2012)",
    );
    device.row(
        "E4 − E3",
        13.7,
        1e3 * transition(&text, 3, 4).energy_ev,
        1.3,
        "meV",
    );
    device.row(
        "E3 − E2",
        3.4,
        1e3 * transition(&text, 2, 3).energy_ev,
        0.8,
        "meV",
    );
    device.row(
        "E2 − E1",
        34.0,
        1e3 * transition(&text, 1, 2).energy_ev,
        1.5,
        "meV",
    );
    device.row(
        "z43",
        56.0,
        10.0 * transition(&text, 3, 4).dipole_nm,
        4.0,
        "Å",
    );

    let materials = Materials {
        barrier_ev: 0.1234,
        nonparabolicity_ev: ALGAAS_15_GAPS,
        ..OFFSET_72
    };
    let sequence = [
        39., 140., 6., 91., 6., 160., 15., 128., 18., 122., 20., 120., 20., 114., 27., 113., 35.,
        116.,
    ];
    let text = file(&sequence, materials, -2.09, 9, PAD);
    let mut device = table.device(
        "2.7 THz, bound to continuum",
        "66 % offset (123.4 meV), E′ 1.519/1.706 eV",
        "Vitiello et al., Appl. Phys. Lett. 90, 191115 (2007)",
    );
    device.row(
        "E9 − E8",
        11.1,
        1e3 * transition(&text, 8, 9).energy_ev,
        0.8,
        "meV",
    );
    device.row("z98", 9.2, transition(&text, 8, 9).dipole_nm, 0.8, "nm");
    device.row(
        "90 periods",
        11.60,
        90.0 * sequence.iter().sum::<f64>() * 1e-4,
        0.0116,
        "µm",
    );
}

fn mid_infrared(table: &mut Table) {
    let pad = 100.0;
    let law = |well: f64, barrier: f64| Some((well, barrier));
    let materials = Materials {
        barrier_ev: 0.276,
        well_mass: 0.067,
        barrier_mass: 0.0944,
        nonparabolicity_ev: law(1.519, 1.931),
    };
    let sequence = [
        58., 15., 20., 49., 17., 40., 34., 32., 20., 28., 23., 23., 25., 23., 25., 21.,
    ];
    let text = file(&sequence, materials, -48.0, 9, pad);
    table
        .device(
            "9.4 µm cascade, GaAs/Al0.33Ga0.67As (m)",
            "barrier 276 meV, E′ 1.519/1.931 eV",
            "Sirtori et al., Appl. Phys. Lett. 73, 3486 (1998)",
        )
        .row(
            "lasing transition",
            131.9,
            1e3 * transition(&text, 6, 9).energy_ev,
            6.0,
            "meV",
        );

    let materials = Materials {
        barrier_ev: 0.52,
        well_mass: 0.043,
        barrier_mass: 0.075,
        nonparabolicity_ev: law(0.79, 1.45),
    };
    let text = file(
        &[45., 8., 35., 35., 30., 28., 30.],
        materials,
        -90.0,
        3,
        pad,
    );
    let mut device = table.device(
        "4.2 µm cascade, InGaAs/AlInAs (m)",
        "barrier 0.52 eV, E′ 0.79/1.45 eV, 90 kV/cm",
        "Faist et al., Science 264, 553 (1994)",
    );
    device.row(
        "E3 − E2",
        295.0,
        1e3 * transition(&text, 2, 3).energy_ev,
        8.0,
        "meV",
    );
    device.row(
        "E2 − E1",
        30.0,
        1e3 * transition(&text, 1, 2).energy_ev,
        4.0,
        "meV",
    );

    let materials = Materials {
        barrier_ev: 0.75,
        well_mass: 0.036,
        barrier_mass: 0.09,
        nonparabolicity_ev: law(0.60, 1.7),
    };
    let sequence = [
        38., 12., 13., 43., 13., 38., 14., 36., 22., 28., 17., 25., 18., 22., 19., 21., 21., 20.,
        21., 18., 27., 18.,
    ];
    let text = file(&sequence, materials, -78.0, 12, pad);
    table
        .device(
            "4.6 µm cascade, strain-compensated InGaAs/AlInAs (m)",
            "barrier 0.75 eV, masses 0.036/0.09, E′ 0.60/1.7 eV, 78 kV/cm",
            "Evans, Lyakh et al., 2007–2009",
        )
        .row(
            "lasing transition",
            269.5,
            1e3 * transition(&text, 9, 12).energy_ev,
            12.0,
            "meV",
        );
}

fn wells(table: &mut Table) {
    // The library's GaAs and AlGaAs at low temperature: 62 % of the gap difference in the conduction band.
    let library = |barrier: &str, layers: &[(&str, f64)], field: f64| {
        let mut text = format!(
            "temperature: 0 K\nfield: {field} kV/cm\nlayers:\n  - {{material: {barrier}, width: 30 nm}}\n"
        );
        for (material, width) in layers {
            text += &format!("  - {{material: {material}, width: {width} Å}}\n");
        }
        text + &format!("  - {{material: {barrier}, width: 30 nm}}\n")
    };
    let single = |width| library("Al0.3Ga0.7As", &[("GaAs", width)], 0.0);
    let (narrow, wide) = (
        transition(&single(65.0), 1, 2),
        transition(&single(82.0), 1, 2),
    );
    let mut device = table.device(
        "doped wells, GaAs/Al0.3Ga0.7As (m)",
        "library, parabolic, no charge",
        "West and Eglash, Appl. Phys. Lett. 46, 1156 (1985)",
    );
    device.row(
        "65 Å, E2 − E1",
        152.0,
        1e3 * narrow.energy_ev,
        0.08 * 152.0,
        "meV",
    );
    device.row(
        "82 Å, E2 − E1",
        121.0,
        1e3 * wide.energy_ev,
        0.08 * 121.0,
        "meV",
    );
    device.row(
        "ratio",
        1.256,
        narrow.energy_ev / wide.energy_ev,
        0.04 * 1.256,
        "",
    );

    let materials = Materials {
        barrier_ev: 0.187,
        well_mass: 0.067,
        barrier_mass: 0.0878,
        nonparabolicity_ev: Some((1.519, 1.831)),
    };
    let text = file(&[95., 65.], materials, 0.0, 2, PAD);
    table
        .device(
            "detector well, 65 Å GaAs/Al0.25Ga0.75As (m)",
            "60 % offset (187 meV), E′ 1.519/1.831 eV",
            "Levine et al., Appl. Phys. Lett. 50, 1092 (1987)",
        )
        .row(
            "absorption peak",
            114.8,
            1e3 * transition(&text, 1, 2).energy_ev,
            0.06 * 114.8,
            "meV",
        );

    let coupled = |field| {
        library(
            "Al0.35Ga0.65As",
            &[("GaAs", 170.0), ("Al0.35Ga0.65As", 17.0), ("GaAs", 120.0)],
            field,
        )
    };
    // h = 4.1357 meV ps.
    let period_ps = 4.135_667_7 / anticrossing(coupled, 1, (-12.0, -2.0));
    table
        .device(
            "coupled wells, 170/17/120 Å (m)",
            "library, parabolic",
            "Leo et al., Phys. Rev. Lett. 66, 201 (1991)",
        )
        .row("oscillation at resonance", 1.3, period_ps, 0.13, "ps");
}

#[test]
fn published_devices_are_met_within_their_tolerances() {
    let mut table = Table::default();
    terahertz(&mut table);
    mid_infrared(&mut table);
    wells(&mut table);
    println!("{}", table.markdown());
    let missed: Vec<String> = table
        .rows
        .iter()
        .filter(|row| (row.computed - row.published).abs() > row.tolerance)
        .map(|row| {
            format!(
                "{} {}: {} for {}",
                row.device, row.quantity, row.computed, row.published
            )
        })
        .collect();
    assert!(missed.is_empty(), "{missed:#?}");
    let readme = include_str!("../README.md");
    for line in table.markdown().lines() {
        assert!(
            readme.contains(line),
            "the README's table lacks the line\n{line}"
        );
    }
}
