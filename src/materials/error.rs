//! What can be wrong with a material.

use super::element::Sublattice;

/// Why a formula, a definition or a resolution was refused. [`MaterialError::hint`] says what was probably meant.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum MaterialError {
    #[error("`{text}` is no material known here")]
    UnknownMaterial { text: String, meant: Option<String> },
    #[error("`{symbol}` in `{text}` is no element of the library")]
    UnknownElement {
        text: String,
        symbol: String,
        meant: Option<String>,
    },
    #[error("`{found}` in `{text}` does not belong into a chemical formula")]
    Malformed { text: String, found: String },
    #[error("`{text}` names {symbol} twice")]
    RepeatedElement { text: String, symbol: &'static str },
    #[error("`{text}` has no {}", .missing.noun())]
    MissingSublattice { text: String, missing: Sublattice },
    #[error("`{text}` has {count} elements; alloys of up to four are known")]
    TooManyElements { text: String, count: usize },
    #[error("the fraction {fraction} of {symbol} is not between 0 and 1")]
    FractionRange { symbol: &'static str, fraction: f64 },
    #[error("the fractions of {symbols} in `{text}` add up to {sum}, not to 1")]
    FractionSum {
        text: String,
        symbols: String,
        sum: f64,
    },
    #[error("`{text}` gives no fraction for {symbol}")]
    MissingFraction {
        text: String,
        symbol: &'static str,
        meant: String,
    },
    #[error("`{text}` leaves fractions open")]
    NeedsMatch { text: String, example: String },
    #[error("`{text}` leaves {open} fractions open, and a lattice match fixes one")]
    Underdetermined {
        text: String,
        open: usize,
        example: String,
    },
    #[error(
        "no composition of `{text}` has the lattice constant {wanted_nm:.5} nm; it reaches {low_nm:.5} to {high_nm:.5} nm"
    )]
    NoMatch {
        text: String,
        wanted_nm: f64,
        low_nm: f64,
        high_nm: f64,
    },
    #[error("`{text}` contains no {symbol}")]
    NoSuchElement { text: String, symbol: &'static str },
    #[error("{symbol} in `{text}` has no other element beside it that could compensate")]
    NoHost { text: String, symbol: &'static str },
    #[error("the temperature {temperature_k} K is not a temperature")]
    Temperature { temperature_k: f64 },
    #[error("unknown parameter `{key}`")]
    UnknownKey {
        key: String,
        meant: Option<&'static str>,
    },
    #[error("`{key}` takes {expected} number{}, not {found}", if *.expected == 1 { "" } else { "s" })]
    WrongCount {
        key: &'static str,
        expected: usize,
        found: usize,
    },
    #[error("`{key}` of {} is outside {} to {}", with_unit(.number, .unit), .range.0, with_unit(&.range.1, .unit))]
    OutOfRange {
        key: &'static str,
        number: f64,
        unit: &'static str,
        range: (f64, f64),
    },
    #[error("`{key}` cannot be bowed")]
    NoBowing { key: &'static str },
    #[error("`{entry}` has no alternative `{name}` for `{key}`")]
    UnknownAlternative {
        entry: String,
        key: &'static str,
        name: String,
        available: Vec<String>,
    },
    #[error("`{name}` is an entry of the library and is not made like another material")]
    LikeOnEntry { name: String },
    #[error("`{name}` is an alloy family; its parameters follow from its binaries and its bowing")]
    ValuesOnFamily { name: String },
    #[error("{part} belongs to an alloy family or a binary of the library, which `{name}` is not")]
    OnlyOnEntry { name: String, part: &'static str },
    #[error("`{name}` is a formula and cannot be given another meaning")]
    NameIsFormula { name: String },
    #[error("`{name}` is made like itself: {}", .chain.join(" → "))]
    Circular { name: String, chain: Vec<String> },
    #[error("the library file {file} cannot be read: {message}")]
    Data { file: String, message: String },
}

/// A number with its unit, if it has one.
fn with_unit(number: &f64, unit: &str) -> String {
    format!("{number} {unit}").trim_end().to_owned()
}

impl MaterialError {
    /// What was probably meant, or what to do.
    pub fn hint(&self) -> Option<String> {
        let did_you_mean = |word: &str| format!("did you mean `{word}`?");
        match self {
            Self::UnknownMaterial { meant, .. } => Some(match meant {
                Some(meant) => did_you_mean(meant),
                None => "write a chemical formula such as `Al0.3Ga0.7As`, or define the material under `materials:`".to_owned(),
            }),
            Self::UnknownElement { meant, .. } => Some(match meant {
                Some(meant) => did_you_mean(meant),
                None => "the elements are Al, Ga, In and P, As, Sb".to_owned(),
            }),
            Self::Malformed { found, .. } if found.starts_with(',') => {
                Some("write decimals with a point, as in `Al0.3Ga0.7As`".to_owned())
            }
            Self::Malformed { .. } => {
                Some("write elements with fractions behind them, such as `Al0.3Ga0.7As`".to_owned())
            }
            Self::MissingSublattice { .. } => {
                Some("a III–V crystal needs elements of both groups, such as `GaAs`".to_owned())
            }
            Self::FractionSum { .. } => {
                Some("the fractions of group III and those of group V each add up to 1".to_owned())
            }
            Self::MissingFraction { meant, .. } => Some(did_you_mean(meant)),
            Self::NeedsMatch { example, .. } => Some(format!(
                "give the fractions, such as `{example}`, or let `match: substrate` choose them"
            )),
            Self::Underdetermined { example, .. } => {
                Some(format!("give more fractions, such as `{example}`"))
            }
            Self::UnknownKey {
                meant: Some(meant), ..
            } => Some(did_you_mean(meant)),
            Self::NoBowing { .. } => Some(
                "single numbers can be bowed; for `luttinger` bow `heavy_hole_mass` and `light_hole_mass`"
                    .to_owned(),
            ),
            Self::UnknownAlternative { available, .. } => Some(if available.is_empty() {
                "it has none for this parameter; give the value itself".to_owned()
            } else {
                format!("available: {}", available.join(", "))
            }),
            Self::LikeOnEntry { .. } | Self::NameIsFormula { .. } => Some(
                "give the material a name of its own and refer to the formula with `like:`".to_owned(),
            ),
            Self::ValuesOnFamily { .. } => {
                Some("give `bowing:`, or define a named material `like:` one composition".to_owned())
            }
            Self::OnlyOnEntry { part, .. } => Some(format!(
                "put {part} under a formula such as `GaAs` or `InGaAs`"
            )),
            _ => None,
        }
    }
}
