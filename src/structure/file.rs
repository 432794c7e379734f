//! What a structure file says, checked, with the places it was read from.

use super::charge::Charge;
use super::document::Node;
use super::growth::Growth;
use super::rewrite::FreeLine;
use super::spreads::Tolerance;
use super::sweeps::Sweep;
use crate::materials::{Element, Library, Substance};
use crate::units::Quantity;
use std::fmt;
use std::ops::Range;

/// A value with the bytes of the file it was read from.
#[derive(Clone, Debug, PartialEq)]
pub struct Spanned<T> {
    pub value: T,
    /// In bytes, quotation marks included.
    pub span: Range<usize>,
    /// Whether an alias or a merge key makes these bytes stand for other places of the file too.
    pub shared: bool,
}

impl<T> Spanned<T> {
    pub(super) fn new(value: T, node: &Node) -> Self {
        Self {
            value,
            span: node.span.clone(),
            shared: node.shared,
        }
    }
}

/// A structure file that holds no mistake.
#[derive(Clone, Debug)]
pub struct Structure {
    pub title: Option<String>,
    /// The crystal that sets the in-plane lattice constant; without it nothing is strained.
    pub substrate: Option<Spanned<Substance>>,
    pub temperature_k: f64,
    /// The field along the growth direction; `None` when the file has no such key.
    pub field: Option<Spanned<Quantity>>,
    pub ends: Ends,
    pub conduction: ConductionBand,
    /// The valence bands, if they are to be solved.
    pub valence: Option<ValenceBand>,
    /// The library with the materials that the file defines or changes.
    pub library: Library,
    /// The file's layers in its order, each once, however often it is repeated.
    pub entries: Vec<LayerEntry>,
    /// The file's doping planes in its order, each once.
    pub planes: Vec<PlaneEntry>,
    /// How layers and planes follow one another, bottom first.
    pub sequence: Vec<Item>,
    pub tune: Option<Tune>,
    pub growth: Option<Growth>,
    pub tolerance: Option<Tolerance>,
    pub sweep: Option<Sweep>,
    /// Whether the charge of dopants and carriers bends the bands.
    pub charge: Charge,
    /// Where a top-level `field:` line can be added.
    pub(super) field_line: Option<FreeLine>,
}

impl Structure {
    /// Whether any bands are solved together.
    pub fn couples_bands(&self) -> bool {
        let holes = self.valence.map(|valence| valence.model);
        self.conduction.model == ConductionModel::EightBand
            || holes.is_some_and(|model| model != ValenceModel::Decoupled)
    }
}

/// What lies beyond the two ends of the stack.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ends {
    /// Walls, at which the envelopes vanish.
    Walls,
    /// The outermost materials, which go on: electrons may leave.
    Open,
    /// The same layers again, for ever.
    Periodic,
}

/// The conduction band that is to be solved.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ConductionBand {
    pub model: ConductionModel,
    /// How many levels are asked for.
    pub states: usize,
}

/// The valence bands that are to be solved.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ValenceBand {
    pub model: ValenceModel,
    /// How many levels of all holes together are asked for, the highest ones.
    pub states: usize,
}

/// Which bands the holes are coupled to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ValenceModel {
    /// Heavy and light holes, each on its own.
    Decoupled,
    /// Heavy, light and split-off holes, to one another.
    SixBand,
    /// The same and the electrons: [`ConductionModel::EightBand`].
    EightBand,
}

/// How the electron's mass depends on its energy.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ConductionModel {
    /// Not at all.
    Parabolic,
    /// As the material's energy-dependent mass says.
    EnergyDependent,
    /// As the coupling to the valence bands makes it: one problem of electrons and holes.
    EightBand,
}

/// One step of the layer sequence.
#[derive(Clone, Debug, PartialEq)]
pub enum Item {
    /// An index into [`Structure::entries`].
    Layer(usize),
    /// An index into [`Structure::planes`].
    Plane(usize),
    /// Steps that follow one another `count` times.
    Repeat { count: u32, items: Vec<Item> },
}

/// A layer as the file has it.
#[derive(Clone, Debug)]
pub struct LayerEntry {
    /// The name the user gave it; unique in the file.
    pub name: Option<String>,
    /// The name, or else `layer 3`, counted over the file from 1.
    pub label: String,
    /// A family stands for an alloy whose amounts follow from the substrate.
    pub material: Spanned<Substance>,
    /// A length or a number of monolayers.
    pub width: Spanned<Quantity>,
    /// The material at the upper face of a graded layer.
    pub to: Option<Spanned<Substance>>,
    pub profile: Profile,
    /// Donors per volume, in cm⁻³.
    pub donors_cm3: f64,
    /// Acceptors per volume, in cm⁻³.
    pub acceptors_cm3: f64,
    /// Donors per area that are spread over the width, in cm⁻².
    pub sheet_donors_cm2: f64,
    /// Acceptors per area that are spread over the width, in cm⁻².
    pub sheet_acceptors_cm2: f64,
    /// The layer's bytes.
    pub span: Range<usize>,
}

impl LayerEntry {
    pub fn has_donors(&self) -> bool {
        self.donors_cm3 > 0.0 || self.sheet_donors_cm2 > 0.0
    }

    pub fn has_acceptors(&self) -> bool {
        self.acceptors_cm3 > 0.0 || self.sheet_acceptors_cm2 > 0.0
    }
}

/// A plane of dopants between two layers: growth stops there, and the dopant alone is supplied.
#[derive(Clone, Debug)]
pub struct PlaneEntry {
    /// The user's name, or else `plane 2`, counted over the file from 1.
    pub label: String,
    pub donors_cm2: f64,
    pub acceptors_cm2: f64,
    /// The plane's bytes.
    pub span: Range<usize>,
}

/// How a graded layer goes from its lower to its upper material.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Profile {
    Linear,
    /// With zero slope at the face whose conduction edge is lower.
    Parabolic,
}

/// What tuning may change and what it aims at.
#[derive(Clone, Debug, PartialEq)]
pub struct Tune {
    pub vary: Vec<Variable>,
    pub aims: Vec<Aim>,
    /// What the layers must keep to meanwhile.
    pub keep: Vec<Keep>,
    /// Whether the varied widths are to end in whole monolayers.
    pub snap_to_monolayers: bool,
}

/// Something that tuning may change, with its bounds, the lower first.
#[derive(Clone, Debug, PartialEq)]
pub struct Variable {
    pub quantity: Varied,
    pub span: Range<usize>,
}

/// See [`Variable`].
#[derive(Clone, Debug, PartialEq)]
pub enum Varied {
    /// The width of the layer entry, which all copies of a repeat share.
    Width {
        entry: usize,
        /// Both lengths or both numbers of monolayers.
        bounds: [Quantity; 2],
    },
    /// The fraction of an element in the layer's `material`; the host element of its sublattice compensates.
    Fraction {
        entry: usize,
        element: Element,
        bounds: [f64; 2],
    },
    /// As `Fraction`, with one of the values that the cells of `growth` give; the layer holds two group-III elements.
    FractionOfCells { entry: usize, element: Element },
    /// The field.
    Field { bounds_v_per_nm: [f64; 2] },
}

/// A bound on strain that tuning keeps to.
#[derive(Clone, Debug, PartialEq)]
pub struct Keep {
    pub bound: StrainBound,
    pub span: Range<usize>,
}

/// See [`Keep`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum StrainBound {
    /// Layers together pull neither way at the substrate: their net strain stays within a number.
    Balanced {
        /// The entries from one to another, the lower first; without, the period of the only repeat, or all layers.
        range: Option<(usize, usize)>,
        within: f64,
    },
    /// A layer, or each one, is no thicker than its critical thickness.
    BelowCritical { entry: Option<usize> },
    /// All strained layers together, as one layer with their mean misfit, stay below its critical thickness.
    StackBelowCritical,
}

/// One aim of tuning: a property of the transition between two levels.
#[derive(Clone, Debug, PartialEq)]
pub struct Aim {
    /// The lower of the two levels where levels are counted by energy.
    pub from: Level,
    pub to: Level,
    pub target: Target,
    /// More than 0.
    pub weight: f64,
    /// How near the result must come for the aim to count as reached, if the user says so.
    pub within: Option<Within>,
    pub follow: Follow,
    pub span: Range<usize>,
}

/// A level of a band, counted from 1 at the band's edge: upwards in the conduction band, downwards in the others.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Level {
    pub band: BandName,
    pub index: usize,
}

/// A band as files and reports call it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum BandName {
    Conduction,
    HeavyHole,
    LightHole,
    /// All holes together, in the order of their energies: solved apart, or coupled.
    Valence,
}

impl BandName {
    pub const ALL: [BandName; 4] = [
        BandName::Conduction,
        BandName::HeavyHole,
        BandName::LightHole,
        BandName::Valence,
    ];

    pub fn word(self) -> &'static str {
        match self {
            BandName::Conduction => "conduction",
            BandName::HeavyHole => "heavy-hole",
            BandName::LightHole => "light-hole",
            BandName::Valence => "valence",
        }
    }
}

impl fmt::Display for Level {
    fn fmt(&self, f: &mut fmt::Formatter) -> fmt::Result {
        write!(f, "{} {}", self.band.word(), self.index)
    }
}

/// What a transition shall have.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Target {
    /// The distance of the levels.
    EnergyEv(f64),
    /// The vacuum wavelength of light of the levels' distance.
    WavelengthUm(f64),
    /// The dipole |⟨i|z|j⟩|.
    DipoleNm(f64),
    /// As large a dipole as can be.
    MaximizeDipole,
}

/// A tolerance of an aim, in a unit that suits the target.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Within {
    /// A part of the target's value.
    Fraction(f64),
    EnergyEv(f64),
    LengthNm(f64),
}

/// Which level an aim means once levels cross.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Follow {
    /// The one with this index.
    Order,
    /// The one with the shape that this index had in the file's structure.
    Character,
}
