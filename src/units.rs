//! Quantities with units, at the rim of the program: text such as `5.2 nm` in, a number in the inner unit out.
//!
//! Inside the program lengths are in nm, energies in eV, fields in V/nm, temperatures in K, volume densities in cm⁻³,
//! sheet densities in cm⁻², stiffness in GPa. A bare number where a unit belongs is an error.

use std::fmt;

/// What a quantity measures.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Dimension {
    Length,
    /// A length counted in monolayers of the layer it belongs to; it becomes nm once the layer's material is known.
    Monolayers,
    Energy,
    Field,
    Temperature,
    VolumeDensity,
    SheetDensity,
    Stiffness,
    /// Growth counted in monolayers per time; the inner unit is the monolayer per second.
    MonolayerRate,
    /// Growth as a length per time; the inner unit is nm/s.
    LengthRate,
    /// A part of the quantity that is spoken of; 1 % is 0.01 inside.
    Percentage,
    /// The inner unit is 1/nm.
    WaveVector,
}

impl Dimension {
    /// The dimension in words, for messages.
    pub fn noun(self) -> &'static str {
        match self {
            Dimension::Length => "a length",
            Dimension::Monolayers => "a number of monolayers",
            Dimension::Energy => "an energy",
            Dimension::Field => "an electric field",
            Dimension::Temperature => "a temperature",
            Dimension::VolumeDensity => "a density per volume",
            Dimension::SheetDensity => "a density per area",
            Dimension::Stiffness => "an elastic constant",
            Dimension::MonolayerRate => "a growth rate in monolayers",
            Dimension::LengthRate => "a growth rate",
            Dimension::Percentage => "a percentage",
            Dimension::WaveVector => "a wave vector",
        }
    }

    /// A correct example, for messages.
    pub fn example(self) -> &'static str {
        match self {
            Dimension::Length => "5.2 nm",
            Dimension::Monolayers => "18 ML",
            Dimension::Energy => "0.23 eV",
            Dimension::Field => "30 kV/cm",
            Dimension::Temperature => "77 K",
            Dimension::VolumeDensity => "5e17 cm^-3",
            Dimension::SheetDensity => "5e11 cm^-2",
            Dimension::Stiffness => "122.1 GPa",
            Dimension::MonolayerRate => "0.70 ML/s",
            Dimension::LengthRate => "1.0 µm/h",
            Dimension::Percentage => "0.7 %",
            Dimension::WaveVector => "0.5 nm^-1",
        }
    }
}

/// A unit: how it is written and how many inner units it is.
#[derive(Debug, PartialEq)]
pub struct Unit {
    /// The form that is printed; the first spelling.
    pub symbol: &'static str,
    spellings: &'static [&'static str],
    pub dimension: Dimension,
    /// Inner units per this unit.
    pub factor: f64,
}

macro_rules! unit {
    ($symbol:literal, $dimension:ident, $factor:expr $(, $other:literal)*) => {
        Unit { symbol: $symbol, spellings: &[$symbol $(, $other)*], dimension: Dimension::$dimension, factor: $factor }
    };
}

/// Every unit that a file may use.
pub static UNITS: &[Unit] = &[
    unit!("nm", Length, 1.0),
    unit!("Å", Length, 0.1, "A", "Å", "angstrom", "Angstrom"),
    unit!("µm", Length, 1e3, "μm", "um", "micron"),
    unit!("mm", Length, 1e6),
    unit!("ML", Monolayers, 1.0),
    unit!("eV", Energy, 1.0),
    unit!("meV", Energy, 1e-3),
    unit!("kV/cm", Field, 1e-4),
    unit!("V/cm", Field, 1e-7),
    unit!("MV/cm", Field, 0.1),
    unit!("MV/m", Field, 1e-3),
    unit!("V/µm", Field, 1e-3, "V/μm", "V/um"),
    unit!("V/m", Field, 1e-9),
    unit!("V/nm", Field, 1.0),
    unit!("K", Temperature, 1.0),
    unit!(
        "cm^-3",
        VolumeDensity,
        1.0,
        "cm-3",
        "/cm^3",
        "/cm3",
        "cm⁻³",
        "1/cm^3",
        "1/cm3"
    ),
    unit!("m^-3", VolumeDensity, 1e-6, "m-3", "m⁻³", "1/m^3"),
    unit!(
        "cm^-2",
        SheetDensity,
        1.0,
        "cm-2",
        "/cm^2",
        "/cm2",
        "cm⁻²",
        "1/cm^2",
        "1/cm2"
    ),
    unit!("m^-2", SheetDensity, 1e-4, "m-2", "m⁻²", "1/m^2"),
    unit!("GPa", Stiffness, 1.0),
    unit!("kbar", Stiffness, 0.1),
    unit!("ML/s", MonolayerRate, 1.0),
    unit!("nm/s", LengthRate, 1.0),
    unit!("Å/s", LengthRate, 0.1, "A/s", "Å/s"),
    unit!("µm/h", LengthRate, 1.0 / 3.6, "μm/h", "um/h"),
    unit!("%", Percentage, 1e-2),
    unit!("nm^-1", WaveVector, 1.0, "1/nm", "/nm"),
    unit!("cm^-1", WaveVector, 1e-7, "1/cm", "/cm"),
];

/// A number with its unit, as the user wrote it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Quantity {
    pub number: f64,
    pub unit: &'static Unit,
}

impl Quantity {
    /// The value in the inner unit of its dimension.
    pub fn value(&self) -> f64 {
        self.number * self.unit.factor
    }
}

impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} {}", self.number, self.unit.symbol)
    }
}

/// What is wrong with a text that should be a quantity.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum UnitError {
    #[error("`{text}` does not begin with a number")]
    NotANumber { text: String },
    #[error("`{text}` is not a finite number")]
    NotFinite { text: String },
    #[error("`{text}` has a comma where a point belongs")]
    DecimalComma { text: String },
    #[error("`{text}` has no unit")]
    MissingUnit { text: String },
    #[error("`{unit}` is no unit known here")]
    UnknownUnit {
        unit: String,
        suggestion: Option<&'static str>,
    },
    #[error("`{unit}` is the unit of {found}")]
    WrongDimension {
        unit: &'static str,
        found: &'static str,
    },
}

/// Splits a text into its leading number and the rest; the minus sign U+2212 is read as `-`.
pub fn split_number(text: &str) -> Option<(f64, &str)> {
    let text = text.trim();
    let (negative, body) = match text.strip_prefix('−') {
        Some(rest) => (true, rest),
        None => (false, text),
    };
    let bytes = body.as_bytes();
    let digits = |mut at: usize| {
        while at < bytes.len() && bytes[at].is_ascii_digit() {
            at += 1;
        }
        at
    };
    let start = usize::from(!negative && matches!(bytes.first(), Some(b'+' | b'-')));
    let mut end = digits(start);
    let mut seen = end > start;
    if bytes.get(end) == Some(&b'.') {
        let fraction_end = digits(end + 1);
        seen |= fraction_end > end + 1;
        end = fraction_end;
    }
    if !seen {
        return None;
    }
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let sign = usize::from(matches!(bytes.get(end + 1), Some(b'+' | b'-')));
        let exponent_end = digits(end + 1 + sign);
        if exponent_end > end + 1 + sign {
            end = exponent_end;
        }
    }
    let number: f64 = body[..end].parse().ok()?;
    Some((if negative { -number } else { number }, body[end..].trim()))
}

/// Reads a quantity that must be of one of the `expected` dimensions.
pub fn parse(text: &str, expected: &[Dimension]) -> Result<Quantity, UnitError> {
    let Some((number, rest)) = split_number(text) else {
        return Err(UnitError::NotANumber {
            text: text.trim().to_owned(),
        });
    };
    if !number.is_finite() {
        return Err(UnitError::NotFinite {
            text: text.trim().to_owned(),
        });
    }
    let decimals = rest.strip_prefix(',').and_then(|rest| rest.chars().next());
    if decimals.is_some_and(|c| c.is_ascii_digit()) {
        return Err(UnitError::DecimalComma {
            text: text.trim().to_owned(),
        });
    }
    if rest.is_empty() {
        return Err(UnitError::MissingUnit {
            text: text.trim().to_owned(),
        });
    }
    let Some(unit) = UNITS.iter().find(|unit| unit.spellings.contains(&rest)) else {
        let suggestion = UNITS
            .iter()
            .filter(|unit| expected.contains(&unit.dimension))
            .find(|unit| unit.spellings.iter().any(|s| s.eq_ignore_ascii_case(rest)))
            .map(|unit| unit.symbol);
        return Err(UnitError::UnknownUnit {
            unit: rest.to_owned(),
            suggestion,
        });
    };
    if expected.contains(&unit.dimension) {
        Ok(Quantity { number, unit })
    } else {
        Err(UnitError::WrongDimension {
            unit: unit.symbol,
            found: unit.dimension.noun(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reads_the_spellings_of_one_length() {
        for text in [
            "5.2 nm",
            "52 Å",
            "52 A",
            "52Å",
            "0.0052 um",
            "0.0052 µm",
            " 5.2nm ",
        ] {
            let value = parse(text, &[Dimension::Length]).unwrap().value();
            assert!((value - 5.2).abs() < 1e-12, "{text} gave {value}");
        }
        assert_eq!(
            parse("−30 kV/cm", &[Dimension::Field]).unwrap().value(),
            -30.0 * 1e-4
        );
    }

    #[test]
    fn says_what_is_wrong() {
        let length = &[Dimension::Length];
        assert!(matches!(
            parse("5.2", length),
            Err(UnitError::MissingUnit { .. })
        ));
        assert!(matches!(
            parse("wide", length),
            Err(UnitError::NotANumber { .. })
        ));
        assert!(matches!(
            parse("1e999 nm", length),
            Err(UnitError::NotFinite { .. })
        ));
        assert!(matches!(
            parse("5 eV", length),
            Err(UnitError::WrongDimension { unit: "eV", .. })
        ));
        assert!(matches!(
            parse("5 NM", length),
            Err(UnitError::UnknownUnit {
                suggestion: Some("nm"),
                ..
            })
        ));
    }
}
