//! `cascade`: the ladder of levels of a module that is repeated in a field.

use super::arguments::Output;
use super::deliver::{Exit, check_output, deliver_or_draw, show};
use super::input::Input;
use crate::diagnostics::Diagnostic;
use crate::models::{Band, BandOperator};
use crate::report::Cascade;
use crate::report::svg::Width;
use crate::structure::Ends;
use crate::subbands::Accuracy;
use crate::superlattice::{Ladder, Module, ladder};
use std::path::Path;

/// Bounds of what is a cascade's module; common practice is a third of either.
const LONGEST_NM: f64 = 500.0;
const DEEPEST_EV: f64 = 1.5;
/// Shifts below this change no printed digit of an energy.
const NOTICED_EV: f64 = 1e-5;

pub fn cascade(file: &Path, output: &Output) -> Result<Exit, Exit> {
    let input = Input::read(file)?;
    check_output(output.output.as_deref(), file)?;
    let refuse = |problem: Diagnostic| {
        show(&problem, &input.name, &input.text);
        Exit::WrongInput
    };
    if input.structure.ends == Ends::Periodic {
        return Err(refuse(
            Diagnostic::error(
                "`cascade` solves a module in a field, which `ends: periodic` excludes",
            )
            .expected("`ends: walls`, a `repeat` and a field"),
        ));
    }
    let repeated = input.structure.repeated().map_err(|reason| {
        refuse(
            Diagnostic::error(reason.to_string()).expected(
                "one `- repeat: 40` with the `layers:` of a module; what stands beside it is not part of the module",
            ),
        )
    })?;
    if input.stack.field_v_per_nm == 0.0 {
        return Err(refuse(
            Diagnostic::error("there is no field, so the modules' levels do not make a ladder")
                .expected("a line such as `field: -12 kV/cm`")
                .hint("without a field `ends: periodic` gives the minibands"),
        ));
    }
    input.conduction_only("`cascade` solves")?;
    input.with_flat_bands("`cascade` solves");
    let module = input.structure.one_copy(&input.stack, repeated);
    let band = Band::Conduction(input.structure.conduction.model);
    let operator = BandOperator::new(&module, band)
        .map_err(|(layer, reason)| input.unsuitable(repeated.first + layer, &reason))?;
    let period_nm = module.total_width_nm();
    let drop_ev = input.stack.field_v_per_nm.abs() * period_nm;
    if period_nm > LONGEST_NM || drop_ev > DEEPEST_EV {
        return Err(refuse(
            Diagnostic::error(format!(
                "the repeat is {period_nm:.0} nm thick, and an electron loses {drop_ev:.2} eV in it"
            ))
            .at(input
                .structure
                .field
                .as_ref()
                .map_or(0..0, |field| field.span.clone()))
            .expected(format!(
                "a module of at most {LONGEST_NM} nm that takes at most {DEEPEST_EV} eV"
            )),
        ));
    }
    let asked = input.structure.conduction.states;
    let found = ladder(
        Module {
            operator: &operator,
            field_v_per_nm: input.stack.field_v_per_nm,
        },
        asked,
        Accuracy::default(),
    );
    for doubt in doubts(&found, asked) {
        show(&Diagnostic::warning(doubt), &input.name, &input.text);
    }
    input.doubt_growth();
    let report = Cascade::new(&input.structure, &module, repeated.copies, &found);
    deliver_or_draw(&report, || report.svg(Width::Page), output, file)
}

fn doubts(found: &Ladder, asked: usize) -> Vec<String> {
    let mut doubts = Vec::new();
    if found.states.is_empty() {
        doubts.push(
            "no state is on the ladder: the field is too weak, or too strong, for the states to be those of modules"
                .to_owned(),
        );
    } else if found.states.len() < asked {
        doubts.push(format!(
            "of {asked} states asked for {} are on the ladder; those above are not held by the module",
            found.states.len()
        ));
    }
    for (k, state) in found.states.iter().enumerate() {
        if state.window_shift_ev > NOTICED_EV {
            if state.extent_nm > 0.5 * found.period_nm {
                doubts.push(format!(
                    "state {} spreads over more modules than are solved together, or leaves them: its energy is known to about {:.2} meV",
                    k + 1,
                    1e3 * state.window_shift_ev
                ));
                continue;
            }
            doubts.push(format!(
                "state {} can leave downstream: its energy depends on what lies there by about {:.2} meV",
                k + 1,
                1e3 * state.window_shift_ev
            ));
            continue;
        }
        if state.ladder_residual_ev.abs() > NOTICED_EV {
            doubts.push(format!(
                "state {} is {:.2} meV off the ladder in the next module: it leaks downstream",
                k + 1,
                1e3 * state.ladder_residual_ev.abs()
            ));
        }
    }
    doubts
}

/// Points from the levels of a whole cascade to its ladder.
pub fn hint(input: &Input) {
    let modules = input.structure.repeated().map_or(1, |r| r.copies);
    if modules > 1 && input.stack.field_v_per_nm != 0.0 {
        let words =
            format!("the lowest levels of all {modules} copies of the repeat stand in one list");
        let hint = "`wellwright cascade` gives those of one module, with what joins it to the next";
        show(
            &Diagnostic::warning(words).hint(hint),
            &input.name,
            &input.text,
        );
    }
}
