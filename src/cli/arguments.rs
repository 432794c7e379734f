//! What the user types.

use crate::report::svg::Width;
use crate::structure::MOST_POINTS;
use crate::sweep::Part;
use clap::{Args, Parser, Subcommand, ValueEnum};
use std::path::PathBuf;

/// Subbands, transitions and tuned layer widths of quantum-well stacks.
#[derive(Debug, Parser)]
#[command(name = "wellwright", version, max_term_width = 100)]
pub struct Arguments {
    #[command(subcommand)]
    pub command: Command,
}

#[derive(Debug, Subcommand)]
pub enum Command {
    /// Solve a stack: subband table and transition table
    Levels {
        /// Structure file
        file: PathBuf,
        #[command(flatten)]
        output: Output,
    },
    /// Change widths, compositions and field until the aims of the file's `tune` block are met
    Tune {
        /// Structure file with a `tune` block
        file: PathBuf,
        /// Form of the report
        #[arg(long, value_enum, default_value_t = Format::Table)]
        format: Format,
        /// Write to a file: a name ending in .yaml or .yml receives the tuned structure, any other name the report.
        /// May be given once for each
        #[arg(short, long, value_name = "FILE")]
        output: Vec<PathBuf>,
    },
    /// Print the growth sheet of a stack with a `growth` block
    Sheet {
        /// Structure file
        file: PathBuf,
        /// Form of the sheet; a table, or a page when the output's name ends in .html
        #[arg(long, value_enum)]
        format: Option<SheetFormat>,
        /// Write the sheet to a file instead of the terminal
        #[arg(short, long, value_name = "FILE")]
        output: Option<PathBuf>,
    },
    /// How far the transitions move with everything that cannot be held exactly, and the share of wafers inside the
    /// windows of the file's `tolerance` block
    Tolerance {
        /// Structure file, with a `tolerance` block for the share of wafers
        file: PathBuf,
        /// Wafers to sample instead of the number in the file
        #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(2..=100_000))]
        samples: Option<u32>,
        /// Threads to use; as many as there are cores when left out
        #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
        threads: Option<u16>,
        #[command(flatten)]
        output: Output,
    },
    /// Levels and transitions while one number of the stack goes through the range of the file's `sweep` block
    Sweep {
        /// Structure file with a `sweep` block
        file: PathBuf,
        /// Points instead of the number in the file
        #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(2..=i64::from(MOST_POINTS)))]
        points: Option<u32>,
        /// Solve one slice of the points only, the I-th of N: the CSV of all slices, one after the other, is that of the
        /// whole
        #[arg(long, value_name = "I/N")]
        part: Option<Part>,
        /// Threads to use; as many as there are cores when left out
        #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
        threads: Option<u16>,
        /// What a picture shows: levels when left out
        #[arg(long, value_enum)]
        what: Option<SweepWhat>,
        /// Printed width of a picture: a page (170 mm) when left out, or a column of a journal (86 mm)
        #[arg(long, value_enum)]
        width: Option<PlotWidth>,
        /// A file name ending in .svg receives the picture
        #[command(flatten)]
        output: Output,
    },
    /// Read and check a structure file without solving it: strain and band edges of its layers, critical thicknesses,
    /// expected x-ray peaks
    Check {
        /// Structure file
        file: PathBuf,
        #[command(flatten)]
        output: Output,
    },
    /// Draw the band diagram with the squared envelopes as SVG
    Plot {
        /// Structure file
        file: PathBuf,
        /// What to draw of the transition that windows or aims name
        #[arg(long, value_enum, default_value_t = Picture::Bands)]
        what: Picture,
        /// Printed width: a page (170 mm) or a column of a journal (86 mm)
        #[arg(long, value_enum, default_value_t = PlotWidth::Page)]
        width: PlotWidth,
        /// Write the picture to a file instead of the terminal
        #[arg(short, long, value_name = "FILE")]
        output: Option<PathBuf>,
    },
    /// The ladder of levels of a module that is repeated in a field: states, transitions inside and to the next module,
    /// alignments and anticrossing gaps
    Cascade {
        /// Structure file with a `repeat` and a field
        file: PathBuf,
        /// A file name ending in .svg receives the picture
        #[command(flatten)]
        output: Output,
    },
    /// Follow the subbands of coupled bands along an in-plane wave vector; with `ends: periodic` the minibands along growth
    Dispersion {
        /// Structure file
        file: PathBuf,
        /// Bands that are coupled: heavy, light and split-off holes, or these and the electrons. That of the file when
        /// left out, and six bands when it names none
        #[arg(long, value_enum)]
        model: Option<Coupled>,
        /// Subbands of each band, counted from the gap; 4, or as many as the file asks for with the same model
        #[arg(long, value_name = "N", value_parser = clap::value_parser!(u8).range(1..=50))]
        states: Option<u8>,
        /// Direction of the wave vector
        #[arg(long, value_enum, default_value_t = Along::Axis)]
        along: Along,
        /// Largest wave vector with its unit
        #[arg(
            long,
            value_name = "WAVE VECTOR",
            default_value = "0.5 nm^-1",
            allow_hyphen_values = true
        )]
        to: String,
        /// Wave vectors from zero to the largest
        #[arg(long, value_name = "N", default_value_t = 26, value_parser = clap::value_parser!(u16).range(2..=1000))]
        points: u16,
        /// A file name ending in .svg receives the picture
        #[command(flatten)]
        output: Output,
    },
    /// What part of an electron stream crosses the stack between flat leads, and at which resonances
    Transmission {
        /// Structure file
        file: PathBuf,
        /// Lowest energy, counted from the lowest band edge of the stack; the edge of the higher lead when left out
        #[arg(long, value_name = "ENERGY", allow_hyphen_values = true)]
        from: Option<String>,
        /// Highest energy; above the highest band edge when left out
        #[arg(long, value_name = "ENERGY", allow_hyphen_values = true)]
        to: Option<String>,
        /// Equal steps of energy; more points are laid around each resonance
        #[arg(long, value_name = "N", default_value_t = 400, value_parser = clap::value_parser!(u16).range(2..=20_000))]
        points: u16,
        /// A file name ending in .svg receives the picture
        #[command(flatten)]
        output: Output,
    },
    /// Absorption from one level into all others and into the continuum, for light polarised along growth
    Absorption {
        /// Structure file
        file: PathBuf,
        /// The level that holds the electrons
        #[arg(long, value_name = "N", default_value_t = 1, value_parser = clap::value_parser!(u8).range(1..=50))]
        level: u8,
        /// Full width at half maximum of the lines
        #[arg(
            long,
            value_name = "ENERGY",
            default_value = "6 meV",
            allow_hyphen_values = true
        )]
        broadening: String,
        /// Lowest photon energy; 10 meV when left out
        #[arg(long, value_name = "ENERGY", allow_hyphen_values = true)]
        from: Option<String>,
        /// Highest photon energy; one and a half times the height of the highest band edge when left out
        #[arg(long, value_name = "ENERGY", allow_hyphen_values = true)]
        to: Option<String>,
        /// Photon energies
        #[arg(long, value_name = "N", default_value_t = 600, value_parser = clap::value_parser!(u16).range(3..=20_000))]
        points: u16,
        /// A file name ending in .svg receives the picture
        #[command(flatten)]
        output: Output,
    },
    /// List the material library, or print one material's parameters
    Materials {
        /// Chemical formula, such as GaAs or Al0.3Ga0.7As
        formula: Option<String>,
        /// Temperature with its unit, such as "77 K"
        #[arg(long, default_value = "300 K", allow_hyphen_values = true)]
        temperature: String,
        #[command(flatten)]
        output: Output,
    },
}

/// Where a result goes and in what form.
#[derive(Debug, Args)]
pub struct Output {
    /// Form of the result
    #[arg(long, value_enum, default_value_t = Format::Table)]
    pub format: Format,
    /// Write the result to a file instead of the terminal
    #[arg(short, long, value_name = "FILE")]
    pub output: Option<PathBuf>,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Format {
    Table,
    Csv,
    Json,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum SheetFormat {
    Table,
    Csv,
    Json,
    /// One page that holds everything and prints on A4
    Html,
}

/// Coupled bands.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Coupled {
    SixBand,
    EightBand,
}

/// Direction of the in-plane wave vector.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Along {
    #[value(name = "100")]
    Axis,
    #[value(name = "110")]
    Diagonal,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Picture {
    /// Band edge with squared envelopes, levels and transitions
    Bands,
    /// How far a transition moves with each cause
    Sensitivities,
    /// The sampled distribution of a transition with its window
    Yield,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum SweepWhat {
    /// Levels, each line following a state
    Levels,
    /// Transition energies
    Transitions,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum PlotWidth {
    Page,
    Column,
}

impl From<PlotWidth> for Width {
    fn from(width: PlotWidth) -> Width {
        match width {
            PlotWidth::Page => Width::Page,
            PlotWidth::Column => Width::Column,
        }
    }
}
