//! From a command to the exit code.

use super::arguments::{Arguments, Command};
use super::deliver::Exit;
use super::{
    absorption, cascade, check, dispersion, levels, materials, plot, sheet, sweep, tolerance,
    transmission, tune,
};

/// Runs one command.
pub fn run(arguments: Arguments) -> Exit {
    let result = match arguments.command {
        Command::Levels { file, output } => levels::levels(&file, &output),
        Command::Tune {
            file,
            format,
            output,
        } => tune::tune(&file, format, &output),
        Command::Sheet {
            file,
            format,
            output,
        } => sheet::sheet(&file, format, output.as_deref()),
        Command::Tolerance {
            file,
            samples,
            threads,
            output,
        } => tolerance::tolerance(&file, samples, threads, &output),
        Command::Sweep {
            file,
            points,
            part,
            threads,
            what,
            width,
            output,
        } => sweep::sweep(&file, (points, part, threads), (what, width), &output),
        Command::Check { file, output } => check::check(&file, &output),
        Command::Plot {
            file,
            what,
            width,
            output,
        } => plot::plot(&file, what, width.into(), output.as_deref()),
        Command::Dispersion {
            file,
            model,
            states,
            along,
            to,
            points,
            output,
        } => dispersion::dispersion(&file, (model, states), (along, &to, points), &output),
        Command::Cascade { file, output } => cascade::cascade(&file, &output),
        Command::Transmission {
            file,
            from,
            to,
            points,
            output,
        } => {
            let range = (from.as_deref(), to.as_deref(), points);
            transmission::transmission(&file, range, &output)
        }
        Command::Absorption {
            file,
            level,
            broadening,
            from,
            to,
            points,
            output,
        } => {
            let range = absorption::Range {
                level,
                broadening: &broadening,
                from: from.as_deref(),
                to: to.as_deref(),
                points,
            };
            absorption::absorption(&file, &range, &output)
        }
        Command::Materials {
            formula,
            temperature,
            output,
        } => materials::materials(formula.as_deref(), &temperature, &output),
    };
    result.unwrap_or_else(|exit| exit)
}
