//! The elements of the library and the two sublattices of the zincblende crystal.

/// One of the two sublattices.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sublattice {
    GroupThree,
    GroupFive,
}

impl Sublattice {
    /// What is on the sublattice, in words.
    pub fn noun(self) -> &'static str {
        match self {
            Sublattice::GroupThree => "group-III element (Al, Ga, In)",
            Sublattice::GroupFive => "group-V element (P, As, Sb)",
        }
    }
}

/// An element of the library.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Element {
    Al,
    Ga,
    In,
    P,
    As,
    Sb,
}

impl Element {
    /// All elements; the position of an element in it is its index in arrays by element.
    pub const ALL: [Element; 6] = [
        Element::Al,
        Element::Ga,
        Element::In,
        Element::P,
        Element::As,
        Element::Sb,
    ];

    /// The chemical symbol.
    pub fn symbol(self) -> &'static str {
        match self {
            Element::Al => "Al",
            Element::Ga => "Ga",
            Element::In => "In",
            Element::P => "P",
            Element::As => "As",
            Element::Sb => "Sb",
        }
    }

    /// The element of a symbol, in the usual upper and lower case.
    pub fn from_symbol(symbol: &str) -> Option<Element> {
        Self::ALL.into_iter().find(|e| e.symbol() == symbol)
    }

    pub fn sublattice(self) -> Sublattice {
        match self {
            Element::Al | Element::Ga | Element::In => Sublattice::GroupThree,
            Element::P | Element::As | Element::Sb => Sublattice::GroupFive,
        }
    }

    pub(super) fn index(self) -> usize {
        self as usize
    }
}
