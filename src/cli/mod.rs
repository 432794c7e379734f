//! The command line. Only this module touches files, the terminal and the environment.

mod absorption;
mod arguments;
mod cascade;
mod check;
mod deliver;
mod dispersion;
mod input;
mod levels;
mod limits;
mod materials;
mod minibands;
mod output;
mod plot;
mod progress;
mod run;
mod sheet;
mod sweep;
mod threads;
mod tolerance;
mod transmission;
mod tune;

pub use arguments::Arguments;

/// Runs a command line and returns the exit code: 0 done, 1 the work could not be done, 2 the input is wrong.
pub fn main(arguments: Arguments) -> u8 {
    run::run(arguments).into()
}
