//! What to beware of with the elements and dopants of a stack: `materials/cautions.yaml`, chosen by what occurs.

use serde::Deserialize;

static TEXT: &str = include_str!("../../materials/cautions.yaml");

/// One caution.
#[derive(Clone, Debug, PartialEq, Eq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Caution {
    pub title: String,
    /// Symbols of elements and dopants that call for it; empty for what always holds.
    #[serde(default)]
    when: Vec<String>,
    /// Whether all of `when` must occur together instead of any of them.
    #[serde(default)]
    all: bool,
    pub text: String,
    /// Exposure limits.
    #[serde(default)]
    pub limits: Vec<Limit>,
}

/// One exposure limit with where it comes from.
#[derive(Clone, Debug, PartialEq, Eq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Limit {
    pub what: String,
    pub limit: String,
    /// Authority, and year or paragraph.
    pub source: String,
    /// `seen` or `from memory`.
    pub known: String,
}

/// The cautions for a stack with these elements and dopants, by symbol, in the order of the file.
pub fn cautions(symbols: &[&str]) -> Vec<Caution> {
    // That the embedded file can be read is held by a test.
    let all: Vec<Caution> = serde_yaml::from_str(TEXT).unwrap_or_default();
    let occurs = |symbol: &String| symbols.contains(&symbol.as_str());
    all.into_iter()
        .filter(|caution| {
            caution.when.is_empty()
                || if caution.all {
                    caution.when.iter().all(occurs)
                } else {
                    caution.when.iter().any(occurs)
                }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_embedded_file_is_whole() {
        let all: Vec<Caution> = serde_yaml::from_str(TEXT).unwrap();
        assert!(all.len() > 10);
        for limit in all.iter().flat_map(|caution| &caution.limits) {
            assert!(["seen", "from memory"].contains(&limit.known.as_str()));
        }
    }

    #[test]
    fn only_what_occurs_is_named() {
        let titles = |symbols: &[&str]| -> Vec<String> {
            cautions(symbols).into_iter().map(|c| c.title).collect()
        };
        let arsenide = titles(&["Ga", "As", "Si"]);
        assert!(arsenide.iter().any(|t| t == "Arsine"));
        assert!(arsenide.iter().any(|t| t == "Gallium arsenide dust"));
        assert!(
            !arsenide
                .iter()
                .any(|t| t.contains("Beryllium") || t.contains("phosphine"))
        );
        assert!(!titles(&["In", "P"]).iter().any(|t| t.contains("rsenic")));
    }
}
