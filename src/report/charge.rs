//! The Fermi level, the filling of subbands and the absorption that the electrons' field moves.

use super::csv_table;
use super::table::{significant, table};
use crate::charge::{Equilibrium, Solution};
use crate::constants::HC_EV_UM;
use crate::optics::depolarisation;
use crate::structure::Charge;
use serde::Serialize;

/// Lines of absorption with less than this share are not listed.
const FAINT: f64 = 0.01;
/// So many lines are named in the text, the strongest.
const NAMED: usize = 5;
/// Subbands with less than this part of the carriers are not listed beyond those asked for.
const EMPTY: f64 = 1e-4;

/// What charge does to a stack.
#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
pub struct ChargeReport {
    fermi_level_eV: f64,
    /// From the lowest electron subband.
    fermi_level_from_lowest_meV: f64,
    electrons_cm2: f64,
    holes_cm2: f64,
    ionised_donors_cm2: f64,
    ionised_acceptors_cm2: f64,
    /// Slopes of an electron's potential energy at the bottom and the top.
    field_bottom_kV_cm: f64,
    field_top_kV_cm: f64,
    /// (donors + holes − electrons − acceptors)/(donors + acceptors), which faces carry unless the stack is neutral.
    imbalance: f64,
    neutral: bool,
    iterations: usize,
    residual_eV: f64,
    settled: bool,
    exchange: bool,
    filling: Vec<FillingRow>,
    /// Of the conduction band.
    depolarised: Vec<ShiftRow>,
    absorption: Vec<LineRow>,
    depolarisation_definition: &'static str,
}

const DEFINITION: &str = "alone: static depolarisation of this transition (Allen, Tsui and Vinter 1976); coupled: the line it contributes most to, with the fields of all transitions; static permittivity, without exchange";

#[derive(Debug, Serialize)]
struct FillingRow {
    band: &'static str,
    index: usize,
    density_cm2: f64,
    /// Of the band's kind of carriers.
    share: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct ShiftRow {
    from: usize,
    to: usize,
    bare_meV: f64,
    alone_meV: f64,
    coupled_meV: f64,
    coupled_um: f64,
}

#[derive(Debug, Serialize)]
#[allow(non_snake_case)]
struct LineRow {
    energy_meV: f64,
    wavelength_um: f64,
    share: f64,
    mostly_from: usize,
    mostly_to: usize,
}

impl ChargeReport {
    /// `shown` limits the transitions to the lowest levels; `None` where the bands stay flat.
    pub fn new(solution: &Solution, shown: &[usize], charge: &Charge) -> Option<ChargeReport> {
        let Equilibrium {
            fermi_ev,
            densities_cm2,
            electrons_cm2,
            holes_cm2,
            ionised_donors_cm2,
            ionised_acceptors_cm2,
            end_fields_v_per_nm: [bottom, top],
            imbalance,
            is_neutral,
            iterations,
            residual_ev,
            ..
        } = solution.equilibrium.as_ref()?;
        let settled = solution.equilibrium.as_ref()?.is_settled();
        let bands = solution.bands.alone().zip(densities_cm2);
        let mut filling = Vec::new();
        for ((solved, densities), shown) in bands.zip(shown) {
            let all = if solved.band.sign() > 0.0 {
                *electrons_cm2
            } else {
                *holes_cm2
            };
            for (index, density_cm2) in densities.iter().enumerate() {
                let share = if all > 0.0 { density_cm2 / all } else { 0.0 };
                if index < *shown || share > EMPTY {
                    filling.push(FillingRow {
                        band: solved.band.name().word(),
                        index: index + 1,
                        density_cm2: *density_cm2,
                        share,
                    });
                }
            }
        }
        let conduction = solution.bands.conduction()?;
        let answer = depolarisation(&solution.stack, conduction, &densities_cm2[0]);
        let listed = shown.first().copied().unwrap_or(0);
        let depolarised = answer.transitions.iter().filter(|t| t.to < listed);
        let lines = answer.lines.iter().filter(|line| line.share > FAINT);
        Some(ChargeReport {
            fermi_level_eV: *fermi_ev,
            fermi_level_from_lowest_meV: 1e3
                * (fermi_ev - conduction.pairs.first().map_or(0.0, |pair| pair.value)),
            electrons_cm2: *electrons_cm2,
            holes_cm2: *holes_cm2,
            ionised_donors_cm2: *ionised_donors_cm2,
            ionised_acceptors_cm2: *ionised_acceptors_cm2,
            field_bottom_kV_cm: 1e4 * bottom,
            field_top_kV_cm: 1e4 * top,
            imbalance: *imbalance,
            neutral: *is_neutral,
            iterations: *iterations,
            residual_eV: *residual_ev,
            settled,
            exchange: matches!(charge, Charge::Bent(bending) if bending.exchange),
            filling,
            depolarised: depolarised
                .map(|t| ShiftRow {
                    from: t.from + 1,
                    to: t.to + 1,
                    bare_meV: 1e3 * t.bare_ev,
                    alone_meV: 1e3 * t.alone_ev,
                    coupled_meV: 1e3 * t.coupled_ev,
                    coupled_um: HC_EV_UM / t.coupled_ev,
                })
                .collect(),
            absorption: lines
                .map(|line| LineRow {
                    energy_meV: 1e3 * line.energy_ev,
                    wavelength_um: HC_EV_UM / line.energy_ev,
                    share: line.share,
                    mostly_from: line.from + 1,
                    mostly_to: line.to + 1,
                })
                .collect(),
            depolarisation_definition: DEFINITION,
        })
    }

    /// The tables for reading.
    pub fn text(&self) -> String {
        let sheet = |density_cm2: f64| match density_cm2 {
            small if small < 1.0 => "0".to_owned(),
            density => format!("{density:.3e}"),
        };
        let filling = self.filling.iter().map(|row| {
            vec![
                format!("{} {}", row.band, row.index),
                sheet(row.density_cm2),
                format!("{:.2} %", 100.0 * row.share),
            ]
        });
        let mut text = format!(
            "Charge\n{}",
            table(
                &["level", "carriers cm⁻²", "share"],
                &[0],
                filling.collect()
            )
        );
        text.push_str(&format!(
            "Fermi level {:.5} eV, {:.2} meV from conduction 1. Electrons {}, holes {}, ionised donors {}, ionised acceptors {} cm⁻².\n",
            self.fermi_level_eV,
            self.fermi_level_from_lowest_meV,
            sheet(self.electrons_cm2),
            sheet(self.holes_cm2),
            sheet(self.ionised_donors_cm2),
            sheet(self.ionised_acceptors_cm2),
        ));
        let exchange = if self.exchange {
            ", with exchange and correlation in local density"
        } else {
            ""
        };
        let balance = if self.neutral {
            format!(
                "the stack is out of balance by {:.0e}",
                self.imbalance.abs()
            )
        } else {
            format!(
                "its faces carry {:.3e} e/cm²",
                -self.imbalance * (self.ionised_donors_cm2 + self.ionised_acceptors_cm2)
            )
        };
        text.push_str(&format!(
            "Field {:.2} kV/cm at the bottom, {:.2} kV/cm at the top; {balance}.\n{} iteration{}{exchange}; the last changed the potential by {:.0e} eV{}.\n",
            self.field_bottom_kV_cm + 0.0,
            self.field_top_kV_cm + 0.0,
            self.iterations,
            if self.iterations == 1 { "" } else { "s" },
            self.residual_eV,
            if self.settled { "" } else { ": NOT SETTLED" },
        ));
        if !self.depolarised.is_empty() {
            let rows = self.depolarised.iter().map(|row| {
                vec![
                    row.from.to_string(),
                    row.to.to_string(),
                    format!("{:.2}", row.bare_meV),
                    format!("{:.2}", row.alone_meV),
                    format!("{:.2}", row.coupled_meV),
                    significant(row.coupled_um, 4),
                ]
            });
            text.push_str(&format!(
                "\nAbsorption moved by the electrons' field\n{}",
                table(
                    &[
                        "from",
                        "to",
                        "bare meV",
                        "alone meV",
                        "coupled meV",
                        "coupled µm"
                    ],
                    &[],
                    rows.collect()
                )
            ));
            let mut strongest: Vec<&LineRow> = self.absorption.iter().collect();
            strongest.sort_by(|a, b| b.share.total_cmp(&a.share));
            strongest.truncate(NAMED);
            let lines: Vec<String> = strongest
                .iter()
                .map(|line| {
                    format!(
                        "{:.2} meV ({} µm) {:.1} %, mostly {} to {}",
                        line.energy_meV,
                        significant(line.wavelength_um, 4),
                        100.0 * line.share,
                        line.mostly_from,
                        line.mostly_to
                    )
                })
                .collect();
            text.push_str(&format!(
                "Strongest lines with their share of the absorption: {}.\n{}{}.\n",
                lines.join("; "),
                DEFINITION[..1].to_uppercase(),
                &DEFINITION[1..]
            ));
        }
        text
    }

    /// The tables as CSV, one after the other with an empty line between.
    pub fn csv(&self) -> Result<String, csv::Error> {
        let mut tables = vec![csv_table(&self.filling)?];
        if !self.depolarised.is_empty() {
            tables.push(csv_table(&self.depolarised)?);
        }
        if !self.absorption.is_empty() {
            tables.push(csv_table(&self.absorption)?);
        }
        Ok(tables.join("\n"))
    }
}
