use clap::Parser;
use std::process::ExitCode;

fn main() -> ExitCode {
    ExitCode::from(wellwright::cli::main(wellwright::cli::Arguments::parse()))
}
