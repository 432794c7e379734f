//! Minibands of a period that is repeated for ever: tables, and the dispersion through the minizone.

use super::svg::{MinizoneCurves, Width};
use super::table::{error_mev, given, significant, table};
use super::{Report, csv_table, verdict};
use crate::models::model_name;
use crate::structure::{Stack, Structure};
use crate::superlattice::{
    DensityPoint, Dispersed, FLAT_EV, Minibands, NO_GAP_EV, Zone, density_of_states,
};
use serde::Serialize;
use std::f64::consts::PI;

/// What every table of minibands says above it.
#[derive(Clone, Debug, Serialize)]
struct Head {
    title: Option<String>,
    ends: &'static str,
    model: &'static str,
    #[serde(rename = "temperature_K")]
    temperature_k: f64,
    period_nm: f64,
}

impl Head {
    fn new(structure: &Structure, period: &Stack) -> Head {
        Head {
            title: structure.title.clone(),
            ends: "periodic",
            model: model_name(structure.conduction.model),
            temperature_k: structure.temperature_k,
            period_nm: period.total_width_nm(),
        }
    }

    fn text(&self) -> String {
        let title = self.title.as_ref().map(|t| format!("{t}\n"));
        format!(
            "{}{} K, {} mass, a period of {:.3} nm repeated for ever\n\n",
            title.unwrap_or_default(),
            given(self.temperature_k, 4),
            self.model,
            self.period_nm
        )
    }
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct MinibandRow {
    band: &'static str,
    index: usize,
    bottom_eV: f64,
    top_eV: f64,
    /// Of the edge nearer to the band gap.
    from_edge_meV: f64,
    width_meV: f64,
    gap_to_next_meV: f64,
    error_meV: f64,
    /// Along growth; for holes that of the hole.
    bottom_mass: Option<f64>,
    top_mass: Option<f64>,
    bottom_at: &'static str,
    in_plane_mass: f64,
    layer: String,
    layer_share: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct TransitionRow {
    from: String,
    to: String,
    phase: &'static str,
    energy_meV: f64,
    wavelength_um: f64,
    dipole_nm: f64,
    oscillator_strength: f64,
    momentum_eV: f64,
}

#[derive(Debug, Serialize)]
struct AuditRow {
    velocity_slope: f64,
    orthonormality: f64,
    counts_match: bool,
    faults: Vec<String>,
}

/// The minibands of a stack.
#[derive(Debug, Serialize)]
pub struct MinibandLevels {
    #[serde(flatten)]
    head: Head,
    minibands: Vec<MinibandRow>,
    transitions: Vec<TransitionRow>,
    audit: Vec<AuditRow>,
}

fn zone_name(zone: Zone) -> &'static str {
    match zone {
        Zone::Centre => "0",
        Zone::Border => "π",
    }
}

fn rows(period: &Stack, bands: &[Minibands]) -> Vec<MinibandRow> {
    let mut rows = Vec::new();
    for solved in bands {
        let electrons = solved.band.sign() > 0.0;
        for (index, miniband) in solved.minibands.iter().enumerate() {
            let [near, far] = &miniband.edges;
            let (bottom, top) = if electrons { (near, far) } else { (far, near) };
            rows.push(MinibandRow {
                band: solved.band.name().word(),
                index: index + 1,
                bottom_eV: bottom.energy_ev,
                top_eV: top.energy_ev,
                from_edge_meV: 1e3 * (near.energy_ev - solved.edge_ev).abs(),
                width_meV: 1e3 * miniband.width_ev(),
                gap_to_next_meV: 1e3 * miniband.gap_ev,
                error_meV: 1e3 * near.error_ev.max(far.error_ev),
                bottom_mass: bottom.mass_m0,
                top_mass: top.mass_m0,
                bottom_at: zone_name(bottom.zone),
                in_plane_mass: near.in_plane_mass_m0,
                layer: period.layers[miniband.layer].label.clone(),
                layer_share: miniband.layer_share,
            });
        }
    }
    rows
}

impl MinibandLevels {
    /// `period` is the stack of one period.
    pub fn new(structure: &Structure, period: &Stack, bands: &[Minibands]) -> MinibandLevels {
        let transitions = bands.iter().flat_map(|solved| {
            let name = |index: usize| format!("{} {}", solved.band.name().word(), index + 1);
            solved.transitions.iter().map(move |t| TransitionRow {
                from: name(t.from),
                to: name(t.to),
                phase: zone_name(t.zone),
                energy_meV: 1e3 * t.energy_ev,
                wavelength_um: t.wavelength_um(),
                dipole_nm: t.dipole_nm,
                oscillator_strength: t.oscillator_strength,
                momentum_eV: t.momentum_ev,
            })
        });
        let audit = bands.iter().map(|solved| AuditRow {
            velocity_slope: solved.audit.velocity,
            orthonormality: solved.audit.orthonormality,
            counts_match: solved.audit.counted,
            faults: solved.audit.faults(),
        });
        MinibandLevels {
            head: Head::new(structure, period),
            minibands: rows(period, bands),
            transitions: transitions.collect(),
            audit: audit.collect(),
        }
    }
}

fn miniband_table(rows: &[MinibandRow]) -> String {
    let mass = |mass: Option<f64>| mass.map_or("-".to_owned(), |m| significant(m, 3));
    let lines = rows.iter().map(|row| {
        vec![
            format!("{} {}", row.band, row.index),
            format!("{:.5}", row.bottom_eV),
            format!("{:.5}", row.top_eV),
            format!("{:.2}", row.from_edge_meV),
            if row.width_meV < 1e3 * FLAT_EV {
                "flat".to_owned()
            } else {
                width_text(row.width_meV)
            },
            if row.gap_to_next_meV < 1e3 * NO_GAP_EV {
                "none".to_owned()
            } else {
                width_text(row.gap_to_next_meV)
            },
            error_mev(1e-3 * row.error_meV),
            mass(row.bottom_mass),
            mass(row.top_mass),
            row.bottom_at.to_owned(),
            significant(row.in_plane_mass, 3),
            format!("{} ({:.0} %)", row.layer, 100.0 * row.layer_share),
        ]
    });
    table(
        &[
            "miniband",
            "bottom eV",
            "top eV",
            "from edge meV",
            "width meV",
            "gap to next meV",
            "error meV",
            "mass at bottom",
            "at top",
            "bottom at q d",
            "mass in plane",
            "mostly in",
        ],
        &[0, 11],
        lines.collect(),
    )
}

/// Widths reach from hundreds of meV down to what tunnelling through thick barriers leaves.
fn width_text(mev: f64) -> String {
    if mev >= 1.0 {
        format!("{mev:.2}")
    } else {
        significant(mev, 3)
    }
}

impl Report for MinibandLevels {
    fn text(&self) -> String {
        let transitions = table(
            &[
                "from",
                "to",
                "q d",
                "energy meV",
                "wavelength µm",
                "dipole nm",
                "strength",
                "2p²/m0 eV",
            ],
            &[0, 1],
            self.transitions
                .iter()
                .map(|t| {
                    vec![
                        t.from.clone(),
                        t.to.clone(),
                        t.phase.to_owned(),
                        format!("{:.2}", t.energy_meV),
                        significant(t.wavelength_um, 4),
                        format!("{:.3}", t.dipole_nm),
                        format!("{:.3}", t.oscillator_strength),
                        if t.momentum_eV < 1e-6 {
                            "0".to_owned()
                        } else {
                            significant(t.momentum_eV, 4)
                        },
                    ]
                })
                .collect(),
        );
        let faults: Vec<String> = self
            .audit
            .iter()
            .flat_map(|a| a.faults.iter().cloned())
            .collect();
        let worst = |of: fn(&AuditRow) -> f64| self.audit.iter().map(of).fold(0.0, f64::max);
        format!(
            "{}{}\nMasses along growth in m0, from ∂²E/∂q² at the edge; negative where an electron's energy falls from it, or a hole's rises.\n\n{transitions}\n\
             Dipole: |<from|v|to>|ħ/energy from the velocity. Strength: 2 m0 E |z|²/ħ² with the free-electron mass.\n\
             Audit {}: velocity and slope {:.0e}, overlaps {:.0e}{}.\n",
            self.head.text(),
            miniband_table(&self.minibands),
            verdict(&faults),
            worst(|a| a.velocity_slope),
            worst(|a| a.orthonormality),
            if self.audit.iter().all(|a| a.counts_match) {
                ", levels counted in every gap"
            } else {
                ""
            },
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        Ok(format!(
            "{}\n{}",
            csv_table(&self.minibands)?,
            csv_table(&self.transitions)?
        ))
    }
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct PointRow {
    band: &'static str,
    index: usize,
    /// q d/π.
    phase_over_pi: f64,
    q_per_nm: f64,
    energy_eV: f64,
    velocity_m_s: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct DensityRow {
    band: &'static str,
    energy_eV: f64,
    per_eV_cm2_and_period: f64,
    per_eV_cm3: f64,
}

/// Minibands through the minizone, with their density of states.
#[derive(Debug, Serialize)]
pub struct Minizone {
    #[serde(flatten)]
    head: Head,
    minibands: Vec<MinibandRow>,
    points: Vec<PointRow>,
    density_of_states: Vec<DensityRow>,
    #[serde(skip)]
    curves: MinizoneCurves,
}

/// Energies at which the density of states is listed, in each miniband.
const DENSITY_POINTS: usize = 40;
/// Rows of the text table of energies: more are in the other forms.
const MOST_ROWS: usize = 26;

impl Minizone {
    /// `points` phases are spread evenly from the centre to the border of the minizone.
    pub fn new(
        structure: &Structure,
        period: &Stack,
        bands: &[Minibands],
        points: usize,
    ) -> Minizone {
        let head = Head::new(structure, period);
        let last = points.max(2) - 1;
        let phases: Vec<f64> = (0..=last)
            .map(|k| {
                if k == last {
                    PI
                } else {
                    PI * k as f64 / last as f64
                }
            })
            .collect();
        let mut curves = MinizoneCurves {
            title: structure
                .title
                .clone()
                .unwrap_or_else(|| "Minibands".to_owned()),
            caption: format!(
                "Period {} nm, {} K, {} mass; q is the wave vector along growth, d the period. \
                 The density of states is that of one period, both spins, with the in-plane masses of the minibands.",
                given(head.period_nm, 5),
                given(head.temperature_k, 4),
                head.model
            ),
            panels: Vec::new(),
        };
        let mut rows_of_points = Vec::new();
        let mut rows_of_density = Vec::new();
        for solved in bands {
            let word = solved.band.name().word();
            let dispersed = solved.dispersed(&phases);
            for (
                index,
                Dispersed {
                    energies_ev,
                    velocities_m_s,
                },
            ) in dispersed.iter().enumerate()
            {
                for (k, phase) in phases.iter().enumerate() {
                    rows_of_points.push(PointRow {
                        band: word,
                        index: index + 1,
                        phase_over_pi: phase / PI,
                        q_per_nm: phase / solved.period_nm,
                        energy_eV: energies_ev[k],
                        velocity_m_s: velocities_m_s[k],
                    });
                }
            }
            let density = density_of_states(solved, &density_energies(solved));
            rows_of_density.extend(density.iter().map(|point| DensityRow {
                band: word,
                energy_eV: point.energy_ev,
                per_eV_cm2_and_period: point.per_period,
                per_eV_cm3: point.per_volume,
            }));
            curves
                .panels
                .push(panel(solved, &phases, &dispersed, &density));
        }
        Minizone {
            head,
            minibands: rows(period, bands),
            points: rows_of_points,
            density_of_states: rows_of_density,
            curves,
        }
    }

    /// The picture.
    pub fn svg(&self, width: Width) -> String {
        self.curves.svg(width)
    }
}

/// Energies from the band's edge through all minibands, close to one another at their edges, where the density bends.
fn density_energies(solved: &Minibands) -> Vec<f64> {
    let mut energies = vec![solved.edge_ev];
    for miniband in &solved.minibands {
        let [near, far] = miniband.edges.map(|edge| edge.energy_ev);
        energies.extend((0..=DENSITY_POINTS).map(|k| {
            let turn = PI * k as f64 / DENSITY_POINTS as f64;
            near + (far - near) * 0.5 * (1.0 - turn.cos())
        }));
    }
    energies
}

fn panel(
    solved: &Minibands,
    phases: &[f64],
    dispersed: &[Dispersed],
    density: &[DensityPoint],
) -> super::svg::MinizonePanel {
    super::svg::MinizonePanel {
        word: solved.band.name().word(),
        phases_over_pi: phases.iter().map(|p| p / PI).collect(),
        minibands_ev: dispersed.iter().map(|d| d.energies_ev.clone()).collect(),
        edge_ev: solved.edge_ev,
        density: density
            .iter()
            .map(|p| [p.energy_ev, p.per_period])
            .collect(),
    }
}

impl Report for Minizone {
    fn text(&self) -> String {
        let names: Vec<String> = ["q d/π", "q 1/nm"]
            .into_iter()
            .map(str::to_owned)
            .chain(
                self.minibands
                    .iter()
                    .map(|m| format!("{} {}", m.band, m.index)),
            )
            .collect();
        let header: Vec<&str> = names.iter().map(|name| &**name).collect();
        let bands = self.minibands.len().max(1);
        let places = self.points.len() / bands;
        let every = places.div_ceil(MOST_ROWS).max(1);
        let lines = (0..places).step_by(every).map(|place| {
            let own = |band: usize| &self.points[band * places + place];
            let mut line = vec![
                format!("{:.3}", own(0).phase_over_pi),
                format!("{:.4}", own(0).q_per_nm),
            ];
            line.extend((0..bands).map(|band| format!("{:.5}", own(band).energy_eV)));
            line
        });
        format!(
            "{}{}\nEnergies in eV through the minizone\n{}\
             Group velocities and the density of states stand in CSV and JSON; `-o name.svg` draws both.\n",
            self.head.text(),
            miniband_table(&self.minibands),
            table(&header, &[], lines.collect())
        )
    }

    fn csv(&self) -> Result<String, csv::Error> {
        Ok(format!(
            "{}\n{}\n{}",
            csv_table(&self.minibands)?,
            csv_table(&self.points)?,
            csv_table(&self.density_of_states)?
        ))
    }
}
