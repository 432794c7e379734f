//! What a stack repeats.

use crate::structure::{Item, Structure};

/// One repeat of the file.
#[derive(Clone, Debug, PartialEq)]
pub struct Period {
    pub count: u32,
    /// The entries of one period, lowest first, with inner repeats laid out.
    pub entries: Vec<usize>,
}

/// Every repeat of two periods or more, outer ones before those inside them.
pub fn periods(structure: &Structure) -> Vec<Period> {
    let mut found = Vec::new();
    collect(&structure.sequence, &mut found);
    found
}

fn collect(items: &[Item], found: &mut Vec<Period>) {
    for item in items {
        if let Item::Repeat { count, items } = item {
            if *count > 1 {
                let mut entries = Vec::new();
                lay_out(items, &mut entries);
                found.push(Period {
                    count: *count,
                    entries,
                });
            }
            collect(items, found);
        }
    }
}

fn lay_out(items: &[Item], entries: &mut Vec<usize>) {
    for item in items {
        match item {
            Item::Layer(entry) => entries.push(*entry),
            Item::Plane(_) => {}
            Item::Repeat { count, items } => {
                let start = entries.len();
                lay_out(items, entries);
                let end = entries.len();
                for _ in 1..*count {
                    entries.extend_from_within(start..end);
                }
            }
        }
    }
}
