//! The embedded tables: one file per binary and per ternary, read when it is first needed.

use super::definition::Setting;
use super::element::Element;
use super::error::MaterialError;
use super::keys::{Key, Parameter};
use super::values::Values;
use crate::units::{self, Dimension};
use serde::Deserialize;
use std::collections::BTreeMap;
use std::sync::OnceLock;

/// How a value is known.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Deserialize)]
pub enum Known {
    /// Given by the structure file.
    #[serde(skip)]
    Given,
    /// Read in its source, or in the abstract of it.
    #[serde(rename = "seen")]
    Seen,
    /// Computed by the relation that is its source.
    #[serde(rename = "computed")]
    Computed,
    /// From memory of its source.
    #[serde(rename = "from memory")]
    FromMemory,
}

impl std::fmt::Display for Known {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            Known::Given => "given",
            Known::Seen => "seen",
            Known::Computed => "computed",
            Known::FromMemory => "from memory",
        })
    }
}

/// A value with where it comes from and what else could stand there.
#[derive(Clone, Debug)]
pub(super) struct Entry<V> {
    pub parameter: Parameter,
    pub value: V,
    pub source: String,
    pub known: Known,
    pub note: Option<String>,
    pub alternatives: Vec<(String, Entry<V>)>,
}

/// A parameter of a binary: numbers at the reference temperature and the law that leads away from it.
#[derive(Clone, Debug)]
pub(super) struct Tabulated {
    pub components: [f64; 3],
    pub law: Law,
}

/// How the first number of a parameter depends on the temperature T.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Law {
    Constant,
    /// E(T) = E(0) − α T²/(T + β): Varshni, Physica 34, 149 (1967).
    Varshni {
        alpha: f64,
        beta_k: f64,
    },
    /// E(T) = E(0) + A (1 − coth(T₀/T)), used for GaP by Vurgaftman, Meyer and Ram-Mohan (2001).
    Coth {
        amplitude: f64,
        temperature_k: f64,
    },
    /// P(T) = P(T_ref) + s (T − T_ref).
    Linear {
        slope: f64,
        from_k: f64,
    },
}

impl Law {
    fn shift(self, temperature_k: f64) -> f64 {
        match self {
            Law::Constant => 0.0,
            Law::Varshni { alpha, beta_k } => {
                -alpha * temperature_k * temperature_k / (temperature_k + beta_k)
            }
            // At 0 K the argument is infinite and the hyperbolic cotangent 1.
            Law::Coth {
                amplitude,
                temperature_k: scale,
            } => amplitude * (1.0 - 1.0 / (scale / temperature_k).tanh()),
            Law::Linear { slope, from_k } => slope * (temperature_k - from_k),
        }
    }
}

/// The bowing of a parameter in a ternary.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Bowing {
    /// C(x) = value + slope x, with x the fraction of the first binary.
    Polynomial { value: f64, slope: f64 },
    /// For the remote-band parameter: what makes the Kane mass at 0 K the bowed electron mass.
    Fitted,
}

/// A binary: its table.
#[derive(Clone, Debug)]
pub(super) struct BinaryData {
    pub name: &'static str,
    pub entries: Vec<Entry<Tabulated>>,
    /// What a structure puts over the table.
    pub given: Vec<Setting>,
}

/// A ternary: its two binaries as indices, the one with fraction x first, and its bowings.
#[derive(Clone, Debug)]
pub(super) struct TernaryData {
    pub name: &'static str,
    pub of: [usize; 2],
    pub entries: Vec<Entry<Bowing>>,
}

impl BinaryData {
    /// All parameters at a temperature, what follows from them included.
    pub fn values(&self, temperature_k: f64) -> Values<f64> {
        let mut values = Values::empty();
        for entry in &self.entries {
            let Tabulated {
                mut components,
                law,
            } = entry.value;
            if entry.parameter == Parameter::Gap {
                values.gap_0k = Some(components[0] + law.shift(0.0));
            }
            components[0] += law.shift(temperature_k);
            values.set_all(entry.parameter, Some(components));
        }
        values.complete();
        if !self.given.is_empty() {
            values.apply(&self.given);
        }
        values
    }
}

macro_rules! files {
    ($($name:literal),*) => {
        [$(($name, include_str!(concat!("../../materials/", $name, ".yaml")))),*]
    };
}

/// Name and text of the binaries, in the order of [`binary_index`].
pub(super) static BINARIES: [(&str, &str); 9] = files![
    "AlP", "AlAs", "AlSb", "GaP", "GaAs", "GaSb", "InP", "InAs", "InSb"
];

/// Name and text of the ternaries.
pub(super) static TERNARIES: [(&str, &str); 18] = files![
    "AlGaP", "AlGaAs", "AlGaSb", "AlInP", "AlInAs", "AlInSb", "GaInP", "GaInAs", "GaInSb", "AlAsP",
    "AlPSb", "AlAsSb", "GaAsP", "GaPSb", "GaAsSb", "InAsP", "InPSb", "InAsSb"
];

static SOURCES: &str = include_str!("../../materials/sources.yaml");

/// The position in [`BINARIES`] of the crystal of a group-III and a group-V element.
pub(super) fn binary_index(three: Element, five: Element) -> usize {
    3 * (three.index() % 3) + five.index() % 3
}

/// The position in [`TERNARIES`] of the ternary with exactly these three elements.
pub(super) fn ternary_index(elements: &[Element]) -> Option<usize> {
    let symbols: usize = elements.iter().map(|e| e.symbol().len()).sum();
    TERNARIES.iter().position(|(name, _)| {
        name.len() == symbols && elements.iter().all(|e| name.contains(e.symbol()))
    })
}

/// The position in [`TERNARIES`] of the ternary between two binaries.
///
/// # Errors
/// When they share no element.
pub(super) fn ternary_between(a: usize, b: usize) -> Result<usize, MaterialError> {
    let elements = |index: usize| [Element::ALL[index / 3], Element::ALL[3 + index % 3]];
    let [three, five] = elements(a);
    let [other_three, other_five] = elements(b);
    let found = if five == other_five {
        ternary_index(&[three, other_three, five])
    } else if three == other_three {
        ternary_index(&[three, five, other_five])
    } else {
        None
    };
    found.ok_or_else(|| {
        let pair = format!("{} to {}", BINARIES[a].0, BINARIES[b].0);
        data_error(&pair, "no such ternary".to_owned())
    })
}

/// The table of a binary as published.
pub(super) fn binary(index: usize) -> Result<&'static BinaryData, MaterialError> {
    static CACHE: [OnceLock<Result<BinaryData, MaterialError>>; 9] = [const { OnceLock::new() }; 9];
    let (name, text) = BINARIES[index];
    let read = CACHE[index].get_or_init(|| read_binary(name, text));
    read.as_ref().map_err(Clone::clone)
}

/// The table of a ternary as published.
pub(super) fn ternary(index: usize) -> Result<&'static TernaryData, MaterialError> {
    static CACHE: [OnceLock<Result<TernaryData, MaterialError>>; 18] =
        [const { OnceLock::new() }; 18];
    let (name, text) = TERNARIES[index];
    let read = CACHE[index].get_or_init(|| read_ternary(name, text));
    read.as_ref().map_err(Clone::clone)
}

fn sources() -> &'static BTreeMap<String, String> {
    static CACHE: OnceLock<BTreeMap<String, String>> = OnceLock::new();
    // A test reads the embedded text, so that the empty table never stands in for it.
    CACHE.get_or_init(|| serde_yaml::from_str(SOURCES).unwrap_or_default())
}

/// The full citation behind a source key.
pub fn citation(key: &str) -> Option<&'static str> {
    sources().get(key).map(String::as_str)
}

/// Every source key of the library.
pub fn source_keys() -> impl Iterator<Item = &'static str> {
    sources().keys().map(String::as_str)
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct BinaryFile {
    source: String,
    known: Known,
    parameters: BTreeMap<String, RawEntry>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct TernaryFile {
    of: [String; 2],
    source: String,
    known: Known,
    bowing: BTreeMap<String, RawEntry>,
}

#[derive(Deserialize)]
#[serde(untagged)]
enum RawEntry {
    Short(RawValue),
    Full(Box<FullEntry>),
}

#[derive(Deserialize)]
#[serde(untagged)]
enum RawValue {
    Number(f64),
    Text(String),
    List(Vec<RawValue>),
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct FullEntry {
    value: RawValue,
    varshni: Option<RawVarshni>,
    coth: Option<RawCoth>,
    linear: Option<RawLinear>,
    slope: Option<RawValue>,
    source: Option<String>,
    known: Option<Known>,
    note: Option<String>,
    #[serde(default)]
    alternatives: BTreeMap<String, FullEntry>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct RawVarshni {
    alpha: String,
    beta: String,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct RawCoth {
    amplitude: String,
    temperature: String,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct RawLinear {
    slope: String,
    from: String,
}

impl From<RawEntry> for FullEntry {
    fn from(raw: RawEntry) -> FullEntry {
        match raw {
            RawEntry::Full(entry) => *entry,
            RawEntry::Short(value) => FullEntry {
                value,
                varshni: None,
                coth: None,
                linear: None,
                slope: None,
                source: None,
                known: None,
                note: None,
                alternatives: BTreeMap::new(),
            },
        }
    }
}

/// A mistake in an embedded file; the file's name is put before it.
type Mistake = String;

fn read_binary(name: &'static str, text: &str) -> Result<BinaryData, MaterialError> {
    let read = || -> Result<BinaryData, Mistake> {
        let file: BinaryFile = serde_yaml::from_str(text).map_err(|e| e.to_string())?;
        let defaults = (file.source.as_str(), file.known);
        let entries = entries(file.parameters, defaults, tabulated)?;
        Ok(BinaryData {
            name,
            entries,
            given: Vec::new(),
        })
    };
    read().map_err(|message| data_error(name, message))
}

fn read_ternary(name: &'static str, text: &str) -> Result<TernaryData, MaterialError> {
    let read = || -> Result<TernaryData, Mistake> {
        let file: TernaryFile = serde_yaml::from_str(text).map_err(|e| e.to_string())?;
        let position = |wanted: &String| {
            let found = BINARIES.iter().position(|(name, _)| name == wanted);
            found.ok_or_else(|| format!("`{wanted}` is no binary"))
        };
        let [first, second] = &file.of;
        let of = [position(first)?, position(second)?];
        let defaults = (file.source.as_str(), file.known);
        let entries = entries(file.bowing, defaults, bowing)?;
        Ok(TernaryData { name, of, entries })
    };
    read().map_err(|message| data_error(name, message))
}

fn data_error(name: &str, message: Mistake) -> MaterialError {
    MaterialError::Data {
        file: format!("materials/{name}.yaml"),
        message,
    }
}

fn entries<V>(
    raw: BTreeMap<String, RawEntry>,
    defaults: (&str, Known),
    read: impl Fn(&'static Key, &FullEntry) -> Result<V, Mistake> + Copy,
) -> Result<Vec<Entry<V>>, Mistake> {
    let with_key = |(name, raw): (String, RawEntry)| {
        let key = Key::find(&name).map_err(|e| e.to_string())?;
        entry(key, raw.into(), defaults, read).map_err(|e| format!("{name}: {e}"))
    };
    raw.into_iter().map(with_key).collect()
}

fn entry<V>(
    key: &'static Key,
    raw: FullEntry,
    defaults: (&str, Known),
    read: impl Fn(&'static Key, &FullEntry) -> Result<V, Mistake> + Copy,
) -> Result<Entry<V>, Mistake> {
    let value = read(key, &raw)?;
    let alternatives = raw
        .alternatives
        .into_iter()
        .map(|(name, raw)| Ok((name, entry(key, raw, defaults, read)?)))
        .collect::<Result<_, Mistake>>()?;
    Ok(Entry {
        parameter: key.parameter,
        value,
        source: raw.source.unwrap_or_else(|| defaults.0.to_owned()),
        known: raw.known.unwrap_or(defaults.1),
        note: raw.note,
        alternatives,
    })
}

fn tabulated(key: &'static Key, raw: &FullEntry) -> Result<Tabulated, Mistake> {
    let numbers = match &raw.value {
        RawValue::List(list) => list
            .iter()
            .map(|value| number(value, key.dimension))
            .collect::<Result<Vec<_>, _>>()?,
        single => vec![number(single, key.dimension)?],
    };
    let components = key.components_of(&numbers).map_err(|e| e.to_string())?;
    let kelvin = |text: &str| quantity(text, Some(Dimension::Temperature));
    let law = match (&raw.varshni, &raw.coth, &raw.linear) {
        (None, None, None) => Law::Constant,
        (Some(varshni), None, None) => Law::Varshni {
            alpha: per_kelvin(&varshni.alpha, key.dimension)?,
            beta_k: kelvin(&varshni.beta)?,
        },
        (None, Some(coth), None) => Law::Coth {
            amplitude: quantity(&coth.amplitude, key.dimension)?,
            temperature_k: kelvin(&coth.temperature)?,
        },
        (None, None, Some(linear)) => Law::Linear {
            slope: per_kelvin(&linear.slope, key.dimension)?,
            from_k: kelvin(&linear.from)?,
        },
        _ => return Err("more than one temperature law".to_owned()),
    };
    if raw.slope.is_some() {
        return Err("`slope` belongs to a bowing".to_owned());
    }
    Ok(Tabulated { components, law })
}

fn bowing(key: &'static Key, raw: &FullEntry) -> Result<Bowing, Mistake> {
    if raw.varshni.is_some() || raw.coth.is_some() || raw.linear.is_some() {
        return Err("a bowing has no temperature law".to_owned());
    }
    if key.components != 1 {
        return Err("a key of several numbers cannot be bowed".to_owned());
    }
    match &raw.value {
        RawValue::Text(text) if text == "fitted" && key.parameter == Parameter::RemoteBandF => {
            Ok(Bowing::Fitted)
        }
        value => Ok(Bowing::Polynomial {
            value: number(value, key.dimension)?,
            slope: match &raw.slope {
                Some(slope) => number(slope, key.dimension)?,
                None => 0.0,
            },
        }),
    }
}

fn number(value: &RawValue, dimension: Option<Dimension>) -> Result<f64, Mistake> {
    match (value, dimension) {
        (RawValue::Number(number), None) => Ok(*number),
        (RawValue::Text(text), Some(_)) => quantity(text, dimension),
        (RawValue::Number(number), Some(_)) => Err(format!("{number} has no unit")),
        (RawValue::Text(text), None) => Err(format!("`{text}` is no pure number")),
        (RawValue::List(_), _) => Err("a list where one number belongs".to_owned()),
    }
}

fn quantity(text: &str, dimension: Option<Dimension>) -> Result<f64, Mistake> {
    let dimension = dimension.ok_or_else(|| format!("`{text}` has a unit"))?;
    let quantity = units::parse(text, &[dimension]).map_err(|e| e.to_string())?;
    Ok(quantity.value())
}

fn per_kelvin(text: &str, dimension: Option<Dimension>) -> Result<f64, Mistake> {
    let per = text.strip_suffix("/K");
    quantity(
        per.ok_or_else(|| format!("`{text}` is not per K"))?,
        dimension,
    )
}
