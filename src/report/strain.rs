//! What the strain of a stack means for its growth: thickness against critical thickness, the strain balance of repeats,
//! and where x-ray diffraction will show the layers.

use super::layer_edges::layer_name;
use super::table::{TitledTable, signed, significant};
use crate::epitaxy::{
    Balance, Glide, LayerPeak, LayerThickness, Part, Period, PeriodPeaks, WholeThickness, balance,
    expected_x_ray, periods, strain_budget,
};
use crate::structure::{Stack, Structure};
use serde::Serialize;

/// Rows of three tables. Those without rows are not printed.
#[derive(Debug, Serialize)]
pub struct StrainReport {
    pub substrate: Option<String>,
    pub substrate_lattice_nm: Option<f64>,
    pub thickness: Vec<ThicknessRow>,
    pub repeats: Vec<RepeatRow>,
    pub x_ray: Vec<PeakRow>,
}

/// A thickness beside what can be grown coherently; the last row is all strained layers as one.
#[derive(Debug, Serialize)]
pub struct ThicknessRow {
    layer: String,
    width_nm: f64,
    misfit: f64,
    glide: &'static str,
    k: f64,
    /// None for a matched layer.
    matthews_blakeslee_nm: Option<f64>,
    people_bean_nm: Option<f64>,
    coherent: &'static str,
}

#[derive(Debug, Serialize)]
pub struct RepeatRow {
    repeat: String,
    count: u32,
    period_nm: f64,
    net_strain: Option<f64>,
    zero_stress_lattice_nm: Option<f64>,
    satellite_spacing_arcsec: Option<f64>,
    zero_order_arcsec: Option<f64>,
}

#[derive(Debug, Serialize)]
pub struct PeakRow {
    layer: String,
    bragg_deg: f64,
    /// Peak less that of the substrate, in θ.
    from_substrate_arcsec: f64,
}

/// Of the condition printed with the x-ray table.
const X_RAY_CONDITION: &str = "(004), Cu Kα1 (1.540593 Å), coherent, at 300 K; peaks of thin layers are broad and shifted by interference";
/// Less misfit than this is matched: no row for the layer.
const MATCHED: f64 = 1e-5;

/// Thicker than any stack that is grown.
const BEYOND_USE_NM: f64 = 1e5;

impl StrainReport {
    pub fn new(structure: &Structure, stack: &Stack) -> StrainReport {
        let budget = strain_budget(structure, stack);
        let mut thickness: Vec<ThicknessRow> = budget
            .layers
            .iter()
            .filter(|row| row.misfit.abs() > MATCHED)
            .map(|row: &LayerThickness| ThicknessRow {
                layer: layer_name(structure, row.entry, Part::Whole),
                ..thickness_row(
                    row.width_nm,
                    row.misfit,
                    row.glide,
                    [row.matthews_blakeslee_nm, row.people_bean_nm],
                )
            })
            .collect();
        if let Some(row) = &budget.whole
            && row.layers.0 != row.layers.1
        {
            thickness.push(whole_row(row));
        }
        let x_ray = expected_x_ray(structure, stack);
        let substrate = stack.substrate().map(ToString::to_string);
        let mut peaks = Vec::new();
        let mut repeats: Vec<RepeatRow> = periods(structure)
            .iter()
            .map(|period| repeat_row(structure, period, balance(stack, &period.entries)))
            .collect();
        if let Some(x_ray) = &x_ray {
            let from = |rad: f64| (rad - x_ray.substrate_bragg_rad).to_degrees() * 3600.0;
            peaks.push(PeakRow {
                layer: format!("substrate {}", substrate.as_deref().unwrap_or_default()),
                bragg_deg: x_ray.substrate_bragg_rad.to_degrees(),
                from_substrate_arcsec: 0.0,
            });
            peaks.extend(x_ray.layers.iter().map(|peak: &LayerPeak| PeakRow {
                layer: layer_name(structure, peak.entry, peak.part),
                bragg_deg: peak.bragg_rad.to_degrees(),
                from_substrate_arcsec: from(peak.bragg_rad),
            }));
            for (row, period) in repeats.iter_mut().zip(periods(structure)) {
                let own = |p: &&PeriodPeaks| {
                    p.count == period.count
                        && Some(&p.entries.0) == period.entries.first()
                        && Some(&p.entries.1) == period.entries.last()
                };
                if let Some(found) = x_ray.periods.iter().find(own) {
                    let spacing = found.satellite_spacing_rad.to_degrees() * 3600.0;
                    row.satellite_spacing_arcsec = Some(spacing);
                    row.zero_order_arcsec = Some(from(found.bragg_rad));
                }
            }
        }
        StrainReport {
            substrate,
            substrate_lattice_nm: stack.substrate_lattice_nm(),
            thickness,
            repeats,
            x_ray: peaks,
        }
    }

    /// The tables that have rows, for text and page.
    pub fn tables(&self) -> Vec<TitledTable> {
        let nm = |value: Option<f64>| match value {
            None => "-".to_owned(),
            Some(nm) if nm > BEYOND_USE_NM => format!("> {BEYOND_USE_NM}"),
            Some(nm) => significant(nm, 3),
        };
        let thickness = self.thickness.iter().map(|row| {
            vec![
                row.layer.clone(),
                format!("{:.2}", row.width_nm),
                signed(1e2 * row.misfit, 3),
                format!("{}, k = {}", row.glide, row.k),
                nm(row.matthews_blakeslee_nm),
                nm(row.people_bean_nm),
                row.coherent.to_owned(),
            ]
        });
        let repeats = self.repeats.iter().map(|row| {
            let strain = row
                .net_strain
                .map_or("-".to_owned(), |v| signed(1e2 * v, 4));
            let lattice = row
                .zero_stress_lattice_nm
                .map_or("-".to_owned(), |v| format!("{v:.5}"));
            let arcsec = |v: Option<f64>| v.map_or("-".to_owned(), |v| format!("{v:.0}"));
            vec![
                row.repeat.clone(),
                row.count.to_string(),
                format!("{:.2}", row.period_nm),
                strain,
                lattice,
                arcsec(row.zero_order_arcsec),
                arcsec(row.satellite_spacing_arcsec),
            ]
        });
        let x_ray = self.x_ray.iter().map(|row| {
            vec![
                row.layer.clone(),
                format!("{:.4}", row.bragg_deg),
                signed(row.from_substrate_arcsec, 0),
            ]
        });
        let mut tables = vec![
            TitledTable {
                title: "Critical thickness".to_owned(),
                header: vec![
                    "layer",
                    "nm",
                    "misfit %",
                    "taken as",
                    "Matthews-Blakeslee nm",
                    "People-Bean nm",
                    "coherent",
                ],
                left: vec![0, 3, 6],
                rows: thickness.collect(),
                note: "",
            },
            TitledTable {
                title: "Repeats".to_owned(),
                header: vec![
                    "from, to",
                    "times",
                    "period nm",
                    "net strain %",
                    "a0 nm",
                    "order 0 arcsec",
                    "satellites every arcsec",
                ],
                left: vec![0],
                rows: repeats.collect(),
                note: "Net strain: (substrate - a0)/a0 with the lattice constant a0 at which the period exerts no in-plane force.",
            },
            TitledTable {
                title: format!("X-ray peaks: {X_RAY_CONDITION}"),
                header: vec!["layer", "θ °", "from substrate arcsec"],
                left: vec![0],
                rows: x_ray.collect(),
                note: "",
            },
        ];
        tables.retain(|table| !table.rows.is_empty());
        tables
    }
}

fn thickness_row(width_nm: f64, misfit: f64, glide: Glide, limits_nm: [f64; 2]) -> ThicknessRow {
    let [forces_nm, energy_nm] = limits_nm;
    let finite = |nm: f64| nm.is_finite().then_some(nm);
    ThicknessRow {
        layer: String::new(),
        width_nm,
        misfit,
        glide: glide.in_words(),
        k: glide.k(),
        matthews_blakeslee_nm: finite(forces_nm),
        people_bean_nm: finite(energy_nm),
        coherent: if width_nm <= forces_nm {
            "yes"
        } else if width_nm <= energy_nm {
            "metastable"
        } else {
            "no"
        },
    }
}

fn whole_row(row: &WholeThickness) -> ThicknessRow {
    ThicknessRow {
        layer: "strained layers together".to_owned(),
        ..thickness_row(
            row.width_nm,
            row.misfit,
            row.glide,
            [row.matthews_blakeslee_nm, row.people_bean_nm],
        )
    }
}

fn repeat_row(structure: &Structure, period: &Period, balance: Option<Balance>) -> RepeatRow {
    let name = |entry: Option<&usize>| {
        entry.map_or(String::new(), |e| layer_name(structure, *e, Part::Whole))
    };
    RepeatRow {
        repeat: format!(
            "{} to {}",
            name(period.entries.first()),
            name(period.entries.last())
        ),
        count: period.count,
        period_nm: balance.map_or(0.0, |b| b.thickness_nm),
        net_strain: balance.map(|b| b.net_strain),
        zero_stress_lattice_nm: balance.map(|b| b.zero_stress_lattice_nm),
        satellite_spacing_arcsec: None,
        zero_order_arcsec: None,
    }
}
