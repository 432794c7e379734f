//! The growth sheet: what the grower takes to the machine.

use super::Report;
use super::sheet_csv::sheet_csv;
use super::sheet_text::sheet_text;
use super::strain::StrainReport;
use super::table::{TitledTable, significant};
use crate::constants::HC_EV_UM;
use crate::growth::{
    self, Caution, Digital, Filling, Flag, LayerRow, Plan, PlaneRow, Row, Sums, cautions,
};
use crate::materials::Element;
use crate::optics::Photoluminescence;
use crate::structure::{BandName, Growth, Level, Profile, Stack, Structure};
use crate::subbands::Bands;
use serde::Serialize;

/// The whole sheet, in the units in which it is printed.
#[derive(Debug, Serialize)]
pub struct Sheet {
    pub title: Option<String>,
    /// See [`content_id`](crate::growth::content_id).
    pub content_id: String,
    pub substrate: String,
    pub orientation: &'static str,
    #[serde(rename = "temperature_K")]
    pub temperature_k: f64,
    #[serde(rename = "field_kV_cm")]
    pub field_kv_cm: f64,
    pub total: Total,
    pub transitions: Vec<DesignTransition>,
    /// What the wafer should show on the bench; empty without holes.
    pub photoluminescence: Vec<PeakRow>,
    pub rows: Vec<SheetRow>,
    pub shutters: Vec<Shutter>,
    pub materials: Vec<Material>,
    pub flux_targets: Vec<FluxRatio>,
    /// What the cells do not give, with what comes nearest.
    pub compositions: Vec<NotGiven>,
    /// Graded layers as digital alloys.
    pub grades: Vec<DigitalGradeRow>,
    pub warnings: Vec<String>,
    /// Critical thickness, strain balance and x-ray peaks.
    pub strain: StrainReport,
    pub cautions: Vec<CautionEntry>,
    pub program: &'static str,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
pub struct Total {
    pub layers: u64,
    pub thickness_nm: f64,
    pub monolayers: f64,
    pub time_s: f64,
    /// Hours, minutes and seconds.
    pub time: String,
    pub shutter_openings: u64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
pub struct DesignTransition {
    pub from: String,
    pub to: String,
    pub energy_meV: f64,
    /// `None` where the lower level lies above the upper one: a broken gap.
    pub wavelength_um: Option<f64>,
}

/// The expected peak of the photoluminescence at one temperature.
#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
pub struct PeakRow {
    pub temperature_K: f64,
    pub from: String,
    pub to: String,
    pub transition_meV: f64,
    pub transition_nm: f64,
    pub binding_meV: Option<f64>,
    pub peak_meV: f64,
    pub peak_nm: f64,
}

/// A layer, or the beginning or end of a loop.
#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
pub struct SheetRow {
    pub kind: RowKind,
    pub number: Option<usize>,
    /// Loops that the row stands in.
    pub depth: usize,
    /// Passes of the loop.
    pub repeat: Option<u32>,
    pub name: String,
    pub material: String,
    /// The material at the top of a graded layer.
    pub to: Option<String>,
    /// Of the layer, or of one pass of the loop that ends.
    pub thickness_nm: Option<f64>,
    pub thickness_A: Option<f64>,
    pub monolayers: Option<f64>,
    /// Species and density per cm³; per cm² in a plane, with its unit.
    #[serde(serialize_with = "joined")]
    pub doping: Vec<String>,
    pub open_cells: String,
    pub rate_ML_s: Option<f64>,
    pub time_s: Option<f64>,
    /// From the substrate to the top, in the first pass of a loop.
    pub cumulative_nm: Option<f64>,
    pub cumulative_s: Option<f64>,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
pub enum RowKind {
    #[serde(rename = "layer")]
    Layer,
    #[serde(rename = "plane of dopants")]
    Plane,
    #[serde(rename = "loop begins")]
    LoopBegins,
    #[serde(rename = "loop ends")]
    LoopEnds,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
pub struct Shutter {
    pub cell: String,
    /// As the file has it.
    pub calibrated: String,
    pub rate_ML_s: Option<f64>,
    pub open_s: f64,
    pub openings: u64,
}

#[derive(Debug, Serialize)]
pub struct Material {
    pub element: String,
    pub monolayers: Option<f64>,
    pub atoms_per_cm2: f64,
}

#[derive(Debug, Serialize)]
pub struct FluxRatio {
    pub layers: String,
    /// Fractions in the crystal.
    pub ratio: String,
}

#[derive(Debug, Serialize)]
pub struct NotGiven {
    pub layer: String,
    pub wanted: String,
    pub cells: String,
    pub given: String,
    pub digital_alloy: Option<DigitalAlloy>,
    /// The same in one sentence.
    pub sentence: String,
}

#[derive(Debug, Serialize)]
pub struct DigitalAlloy {
    pub period_monolayers: u32,
    /// The part of the second material.
    pub duty: f64,
    pub total_monolayers: u32,
    pub mean: String,
    /// The layers as a structure file has them.
    pub structure: String,
    pub sentence: String,
}

/// A graded layer in whole monolayers of two materials.
#[derive(Debug, Serialize)]
pub struct DigitalGradeRow {
    pub layer: String,
    pub periods: usize,
    pub total_monolayers: u32,
    /// The largest difference in a fraction between a period and the grade there.
    pub largest_miss: f64,
    pub mean_miss: f64,
    /// The layers as a structure file has them.
    pub structure: String,
    pub sentence: String,
}

#[derive(Debug, Serialize)]
pub struct CautionEntry {
    pub title: String,
    pub text: String,
    pub limits: Vec<String>,
}

/// What the grower fills in.
pub const GROWER_ENTRIES: [&str; 6] = [
    "Date",
    "Machine",
    "Wafer number",
    "Operator",
    "Measured rates",
    "Remarks",
];

/// What the peaks mean.
const PEAK_NOTE: &str = "Peak: transition less exciton binding, at both temperatures (free excitons carry the light of wells up to 300 K: Dawson and \
others 1983); where carriers are free, the transition itself. No field, holes as the file solves them; filled bands and disorder, which pull it down, left out.";
/// Decimals of a fraction in sentences about compositions.
const FRACTION_DECIMALS: usize = 4;

impl Sheet {
    /// Gathers the sheet. The transitions are those of the file's aims, or else all inside the conduction band among the
    /// `shown` states of each band, and from the highest hole across the gap.
    pub fn new(
        structure: &Structure,
        growth: &Growth,
        stack: &Stack,
        plan: &Plan,
        (bands, shown): (&Bands, &[usize]),
        peaks: &[Photoluminescence],
    ) -> Sheet {
        let transition = |from: Level, to: Level| {
            let ev = bands.energy_ev(bands.place(to)) - bands.energy_ev(bands.place(from));
            DesignTransition {
                from: from.to_string(),
                to: to.to_string(),
                energy_meV: 1e3 * ev,
                wavelength_um: (ev > 0.0).then(|| HC_EV_UM / ev),
            }
        };
        let mut wanted: Vec<(Level, Level)> = Vec::new();
        for aim in structure.tune.iter().flat_map(|tune| &tune.aims) {
            let (mut from, mut to) = (aim.from, aim.to);
            // Of one band the lower level first, also where an aim by character goes down.
            if from.band == to.band
                && (from.index > to.index) == (from.band == BandName::Conduction)
            {
                (from, to) = (to, from);
            }
            if !wanted.contains(&(from, to)) {
                wanted.push((from, to));
            }
        }
        if wanted.is_empty() {
            let electron = |index| Level {
                band: BandName::Conduction,
                index,
            };
            let highest = bands.holes().first().map(|place| bands.level(*place));
            wanted.extend(highest.map(|hole| (hole, electron(1))));
            for from in 1..=shown[0] {
                wanted.extend((from + 1..=shown[0]).map(|to| (electron(from), electron(to))));
            }
        }
        let there = |level: Level| match level.band {
            BandName::Valence => level.index <= bands.holes().len(),
            _ => bands.level(bands.place(level)) == level,
        };
        wanted.retain(|(from, to)| there(*from) && there(*to));
        let transitions = wanted
            .iter()
            .map(|(from, to)| transition(*from, *to))
            .collect();
        let peak = |peak: &Photoluminescence| PeakRow {
            temperature_K: peak.temperature_k,
            from: peak.from.to_string(),
            to: peak.to.to_string(),
            transition_meV: 1e3 * peak.transition_ev,
            transition_nm: 1e3 * HC_EV_UM / peak.transition_ev,
            binding_meV: peak.binding_ev.map(|ev| 1e3 * ev),
            peak_meV: 1e3 * peak.peak_ev(),
            peak_nm: 1e3 * HC_EV_UM / peak.peak_ev(),
        };
        let calibrated = growth.cells.iter().map(|cell| {
            use crate::units::Dimension;
            match cell.calibrated.unit.dimension {
                Dimension::MonolayerRate => cell.calibrated.to_string(),
                _ => format!("{} of {}", cell.calibrated, cell.of),
            }
        });
        let shutters: Vec<Shutter> = plan
            .shutters
            .iter()
            .zip(calibrated.map(Some).chain(std::iter::repeat(None)))
            .map(|(shutter, calibrated)| Shutter {
                cell: shutter.name.clone(),
                calibrated: calibrated.unwrap_or_default(),
                rate_ML_s: shutter.rate_ml_per_s,
                open_s: hundredths(shutter.open_cs),
                openings: shutter.openings,
            })
            .collect();
        let symbols: Vec<&str> = plan.materials.iter().map(|m| m.element.as_str()).collect();
        let substrate: Vec<&str> = Element::ALL
            .into_iter()
            .map(Element::symbol)
            .filter(|symbol| plan.substrate.contains(symbol))
            .collect();
        Sheet {
            title: structure.title.clone(),
            content_id: plan.content_id.clone(),
            substrate: plan.substrate.clone(),
            orientation: "(001)",
            temperature_k: structure.temperature_k,
            field_kv_cm: 1e4 * stack.field_v_per_nm,
            total: Total {
                layers: plan.total.layers,
                thickness_nm: plan.total.width_nm(),
                monolayers: plan.total.monolayers(),
                time_s: plan.total.time_s(),
                time: clock(plan.total.time_s()),
                shutter_openings: shutters.iter().map(|shutter| shutter.openings).sum(),
            },
            transitions,
            photoluminescence: peaks.iter().map(peak).collect(),
            rows: plan.rows.iter().map(|row| sheet_row(row, growth)).collect(),
            shutters,
            materials: plan
                .materials
                .iter()
                .map(|material| Material {
                    element: material.element.clone(),
                    monolayers: material.monolayers,
                    atoms_per_cm2: material.atoms_per_cm2,
                })
                .collect(),
            flux_targets: plan
                .flux_targets
                .iter()
                .map(|target| FluxRatio {
                    layers: target.labels.join(", "),
                    ratio: ratio(&target.fractions),
                })
                .collect(),
            compositions: plan
                .flags
                .iter()
                .filter_map(|flag| not_given(flag, growth))
                .collect(),
            grades: plan.flags.iter().filter_map(grade).collect(),
            warnings: plan.flags.iter().filter_map(warning).collect(),
            strain: StrainReport::new(structure, stack),
            cautions: cautions(&[symbols, substrate].concat())
                .into_iter()
                .map(caution_entry)
                .collect(),
            program: concat!("Wellwright ", env!("CARGO_PKG_VERSION")),
        }
    }

    /// The lines of the head, as name and value.
    pub fn head(&self) -> Vec<(&'static str, String)> {
        let transitions: Vec<String> = self
            .transitions
            .iter()
            .map(|t| {
                let electrons = "conduction ";
                let (from, to) =
                    match (t.from.strip_prefix(electrons), t.to.strip_prefix(electrons)) {
                        (Some(from), Some(to)) => (from, to),
                        _ => (t.from.as_str(), t.to.as_str()),
                    };
                let length = match t.wavelength_um {
                    Some(um) => significant(um, 4) + " µm",
                    None => "no light".to_owned(),
                };
                format!("{from} to {to}: {:.2} meV, {length}", t.energy_meV)
            })
            .collect();
        vec![
            ("Content id", self.content_id.clone()),
            (
                "Substrate",
                format!("{} {}", self.substrate, self.orientation),
            ),
            (
                "Thickness",
                format!(
                    "{:.3} nm, {:.2} ML in {} layers",
                    self.total.thickness_nm, self.total.monolayers, self.total.layers
                ),
            ),
            (
                "Growth time",
                format!(
                    "{} ({:.2} s), {} shutter openings",
                    self.total.time, self.total.time_s, self.total.shutter_openings
                ),
            ),
            (
                "Designed for",
                format!(
                    "{} K, field {} kV/cm",
                    plain(self.temperature_k),
                    plain(self.field_kv_cm)
                ),
            ),
            (
                "Transitions",
                if transitions.is_empty() {
                    "none solved".to_owned()
                } else {
                    transitions.join("; ")
                },
            ),
        ]
    }
}

impl Sheet {
    /// The expected photoluminescence and what concerns strain.
    pub fn more_tables(&self) -> Vec<TitledTable> {
        let mut tables = self.strain.tables();
        if !self.photoluminescence.is_empty() {
            let rows = self.photoluminescence.iter().map(|peak| {
                vec![
                    plain(peak.temperature_K),
                    format!("{} to {}", peak.from, peak.to),
                    format!("{:.1}", peak.transition_meV),
                    format!("{:.1}", peak.transition_nm),
                    peak.binding_meV
                        .map_or("-".to_owned(), |mev| format!("{mev:.1}")),
                    format!("{:.1}", peak.peak_meV),
                    format!("{:.1}", peak.peak_nm),
                ]
            });
            let table = TitledTable {
                title: "Expected photoluminescence".to_owned(),
                header: vec![
                    "K",
                    "lowest pair",
                    "transition meV",
                    "nm",
                    "exciton meV",
                    "peak meV",
                    "peak nm",
                ],
                left: vec![1],
                rows: rows.collect(),
                note: PEAK_NOTE,
            };
            tables.insert(0, table);
        }
        tables
    }
}

impl Report for Sheet {
    fn text(&self) -> String {
        sheet_text(self)
    }

    fn csv(&self) -> Result<String, csv::Error> {
        sheet_csv(self)
    }
}

fn hundredths(value: u64) -> f64 {
    value as f64 / 1e2
}

/// A number of the file with up to four decimals.
fn plain(value: f64) -> String {
    let text = format!("{value:.4}");
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}

/// Hours, minutes and seconds.
pub fn clock(time_s: f64) -> String {
    let hundredths = (time_s * 1e2).round() as u64;
    let seconds = hundredths / 100;
    format!(
        "{}:{:02}:{:02}.{:02}",
        seconds / 3600,
        seconds / 60 % 60,
        seconds % 60,
        hundredths % 100
    )
}

fn sheet_row(row: &Row, growth: &Growth) -> SheetRow {
    let empty = |kind, depth, repeat| SheetRow {
        kind,
        number: None,
        depth,
        repeat,
        name: String::new(),
        material: String::new(),
        to: None,
        thickness_nm: None,
        thickness_A: None,
        monolayers: None,
        doping: Vec::new(),
        open_cells: String::new(),
        rate_ML_s: None,
        time_s: None,
        cumulative_nm: None,
        cumulative_s: None,
    };
    let with = |row: SheetRow, own: Sums, after: Sums| SheetRow {
        thickness_nm: Some(own.width_nm()),
        thickness_A: Some(own.width_pm as f64 / 1e2),
        monolayers: Some(own.monolayers()),
        time_s: Some(own.time_s()),
        cumulative_nm: Some(after.width_nm()),
        cumulative_s: Some(after.time_s()),
        ..row
    };
    match row {
        Row::Plane(plane) => SheetRow {
            name: plane.label.clone(),
            material: "growth stops".to_owned(),
            doping: plane_doping(plane, growth)
                .map(|(name, density)| format!("{name} {density:e} cm^-2"))
                .collect(),
            open_cells: plane_doping(plane, growth)
                .map(|(name, _)| name)
                .collect::<Vec<_>>()
                .join(", "),
            cumulative_nm: Some(plane.after.width_nm()),
            cumulative_s: Some(plane.after.time_s()),
            ..empty(RowKind::Plane, plane.depth, None)
        },
        Row::LoopBegins { count, depth } => empty(RowKind::LoopBegins, *depth, Some(*count)),
        Row::LoopEnds {
            count,
            depth,
            pass,
            after,
        } => with(
            empty(RowKind::LoopEnds, *depth, Some(*count)),
            *pass,
            *after,
        ),
        Row::Layer(layer) => {
            let row = empty(RowKind::Layer, layer.depth, None);
            let rate = match &layer.filling {
                Filling::Open { rate_ml_per_s, .. } => Some(*rate_ml_per_s),
                Filling::Ramped(_) => None,
            };
            with(
                SheetRow {
                    number: Some(layer.number),
                    name: layer.label.clone(),
                    material: layer.material.clone(),
                    to: layer.to.clone(),
                    doping: doping(layer, growth),
                    open_cells: open_cells(&layer.filling, growth),
                    rate_ML_s: rate,
                    ..row
                },
                layer.own,
                layer.after,
            )
        }
    }
}

/// A list as one text, which a CSV field can hold.
fn joined<S: serde::Serializer>(list: &[String], serializer: S) -> Result<S::Ok, S::Error> {
    serializer.serialize_str(&list.join(", "))
}

fn doping(layer: &LayerRow, growth: &Growth) -> Vec<String> {
    let parts = [
        (layer.donors_cm3, &growth.donors, "donors"),
        (layer.acceptors_cm3, &growth.acceptors, "acceptors"),
    ];
    parts
        .into_iter()
        .filter(|(density, _, _)| *density > 0.0)
        .map(|(density, species, word)| {
            let name = species.as_ref().map_or(word, |s| s.value.symbol);
            format!("{name} {density:e}")
        })
        .collect()
}

/// The species of a plane with their densities in cm⁻².
fn plane_doping<'g>(plane: &PlaneRow, growth: &'g Growth) -> impl Iterator<Item = (&'g str, f64)> {
    let parts = [
        (plane.donors_cm2, &growth.donors, "donors"),
        (plane.acceptors_cm2, &growth.acceptors, "acceptors"),
    ];
    let present = parts.into_iter().filter(|(density, _, _)| *density > 0.0);
    present.map(|(density, species, word)| {
        (species.as_ref().map_or(word, |s| s.value.symbol), density)
    })
}

fn open_cells(filling: &Filling, growth: &Growth) -> String {
    let name = |cell: &usize| growth.cells[*cell].name.clone();
    match filling {
        Filling::Open { cells, .. } => names(cells, growth),
        Filling::Ramped(ramp) => {
            let written: Vec<String> = ramp
                .cells
                .iter()
                .map(|ramped| match ramped.rate_ml_per_s {
                    _ if ramped.is_steady() => name(&ramped.cell),
                    [lower, upper] => format!(
                        "{} ramped {lower:.3} to {upper:.3} ML/s",
                        name(&ramped.cell)
                    ),
                })
                .collect();
            written.join(" + ")
        }
    }
}

fn names(cells: &[usize], growth: &Growth) -> String {
    let names: Vec<&str> = cells
        .iter()
        .map(|cell| growth.cells[*cell].name.as_str())
        .collect();
    names.join(" + ")
}

fn ratio(fractions: &[(Element, f64)]) -> String {
    let symbols: Vec<&str> = fractions.iter().map(|(e, _)| e.symbol()).collect();
    let numbers: Vec<String> = fractions.iter().map(|(_, f)| format!("{f:.4}")).collect();
    format!("{} = {}", symbols.join(" : "), numbers.join(" : "))
}

fn warning(flag: &Flag) -> Option<String> {
    match flag {
        Flag::Remainder {
            label,
            monolayers,
            monolayer_nm,
        } => {
            let below = monolayers.floor();
            let (over, under) = (monolayers - below, below + 1.0 - monolayers);
            Some(format!(
                "{label}: {monolayers:.2} monolayers are no whole number: {over:.2} ({:.4} nm) over {below}, {under:.2} ({:.4} nm) short of {}",
                over * monolayer_nm,
                under * monolayer_nm,
                below + 1.0
            ))
        }
        Flag::Ramped {
            label,
            profile,
            digital,
        } => {
            let how = match profile {
                Profile::Linear => "linearly",
                Profile::Parabolic => "as a parabola",
            };
            let otherwise = match digital {
                Some(_) => "or grow the digital alloy below",
                None => "no digital alloy of two settings of these cells follows it",
            };
            Some(format!(
                "{label}: fixed rates do not give a graded layer. Ramp the fluxes between the rates of its line, the composition changing {how} with height; {otherwise}"
            ))
        }
        Flag::Stop { label } => Some(format!(
            "{label}: growth stops while the dopant alone is supplied; the growth time does not hold the stop, which the dopant's own calibration gives"
        )),
        Flag::Composition(_) => None,
    }
}

fn grade(flag: &Flag) -> Option<DigitalGradeRow> {
    let Flag::Ramped {
        label,
        digital: Some(digital),
        ..
    } = flag
    else {
        return None;
    };
    let [first, second] = &digital.formulas;
    Some(DigitalGradeRow {
        layer: label.clone(),
        periods: digital.periods.len(),
        total_monolayers: digital.total(),
        largest_miss: digital.largest_miss,
        mean_miss: digital.mean_miss,
        structure: digital.yaml(),
        sentence: format!(
            "{label}: {} periods of {first} and {second}, {} ML. A period's mean is off the grade by up to {:.3} in a fraction, the whole layer's by {:.4}; solve it before it is grown",
            digital.periods.len(),
            digital.total(),
            digital.largest_miss,
            digital.mean_miss
        ),
    })
}

fn not_given(flag: &Flag, chamber: &Growth) -> Option<NotGiven> {
    let Flag::Composition(off) = flag else {
        return None;
    };
    let growth::NotGiven {
        label,
        wanted,
        given,
        cells,
        digital,
    } = &**off;
    let [wanted, given] = [wanted, given].map(|c| c.formula_to(FRACTION_DECIMALS));
    let cells = names(cells, chamber);
    let digital_alloy = digital.as_ref().map(digital_alloy);
    let otherwise = if digital_alloy.is_some() {
        ""
    } else {
        ". No digital alloy of whole monolayers comes nearer"
    };
    Some(NotGiven {
        sentence: format!(
            "{label}: no set of cells gives {wanted}. The nearest, {cells}, gives {given}; its line is timed for that{otherwise}"
        ),
        layer: label.clone(),
        wanted,
        cells,
        given,
        digital_alloy,
    })
}

fn digital_alloy(digital: &Digital) -> DigitalAlloy {
    let [lower, upper] = &digital.formulas;
    let [of_lower, of_upper] = digital.monolayers;
    let duty = f64::from(of_upper) / f64::from(digital.period());
    let mean = digital.mean.formula_to(FRACTION_DECIMALS);
    let mut sentence = format!(
        "Digital alloy: {of_lower} ML {lower} and {of_upper} ML {upper} in turn, period {} ML, duty {:.1} % {upper}, {} periods",
        digital.period(),
        100.0 * duty,
        digital.repeats
    );
    for (formula, rest) in digital.formulas.iter().zip(digital.rest) {
        if rest > 0 {
            sentence.push_str(&format!(", then {rest} ML {formula}"));
        }
    }
    sentence.push_str(&format!("; {} ML of mean {mean}", digital.total()));
    if digital.strain.abs() > 0.02 {
        sentence.push_str(&format!(
            "; strained by up to {:+.1} %",
            1e2 * digital.strain
        ));
    }
    DigitalAlloy {
        period_monolayers: digital.period(),
        duty,
        total_monolayers: digital.total(),
        mean,
        structure: digital.yaml(),
        sentence,
    }
}

fn caution_entry(caution: Caution) -> CautionEntry {
    CautionEntry {
        title: caution.title,
        text: caution.text,
        limits: caution
            .limits
            .into_iter()
            .map(|limit| {
                let memory = if limit.known == "seen" {
                    ""
                } else {
                    ", from memory"
                };
                format!("{}: {} ({}{memory})", limit.what, limit.limit, limit.source)
            })
            .collect(),
    }
}
