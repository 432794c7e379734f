//! The part of a stack that is grown over and over: a cascade's module, a superlattice's period.

use super::file::{Ends, Item, Structure};
use super::stack::Stack;
use crate::diagnostics::Diagnostic;

/// A repeat as laid out in a stack.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Repeated {
    /// The first layer of the first copy.
    pub first: usize,
    /// Layers in one copy.
    pub layers: usize,
    pub copies: u32,
}

/// Why a structure has no module.
#[derive(Clone, Copy, Debug, PartialEq, Eq, thiserror::Error)]
pub enum NoModule {
    #[error("the file has no `repeat`, so nothing says which layers make up a module")]
    NoRepeat,
    #[error("the file has {0} repeats side by side, so it is not clear which one holds the module")]
    Several(usize),
}

impl Structure {
    /// The only repeat that does not stand inside of another.
    ///
    /// # Errors
    /// When there is none, or more than one.
    pub fn repeated(&self) -> Result<Repeated, NoModule> {
        let mut first = 0;
        let mut found = Vec::new();
        for item in &self.sequence {
            if let Item::Repeat { count, items } = item {
                found.push(Repeated {
                    first,
                    layers: items.iter().map(laid_out).sum(),
                    copies: *count,
                });
            }
            first += laid_out(item);
        }
        match found[..] {
            [] => Err(NoModule::NoRepeat),
            [one] => Ok(one),
            _ => Err(NoModule::Several(found.len())),
        }
    }

    /// The layers that stand between one face and the same face of the next copy: those of a repeat that is all there
    /// is, else the whole stack.
    pub fn period(&self, stack: &Stack) -> Stack {
        match self.repeated() {
            Ok(repeated) if repeated.layers * repeated.copies as usize == stack.layers.len() => {
                self.one_copy(stack, repeated)
            }
            _ => stack.clone(),
        }
    }

    /// One copy of a repeat as a stack. Layers carry the copy's number only where the copy holds several of them.
    pub fn one_copy(&self, stack: &Stack, repeated: Repeated) -> Stack {
        let range = repeated.first..repeated.first + repeated.layers;
        let mut copy = stack.clone();
        copy.layers = stack.layers[range].to_vec();
        // Copies are solved flat; planes belong to the whole stack.
        copy.planes.clear();
        for index in 0..copy.layers.len() {
            let entry = copy.layers[index].entry;
            let alone = copy.layers.iter().filter(|l| l.entry == entry).count() == 1;
            if let Some(written) = self.entries.get(entry).filter(|_| alone) {
                copy.layers[index].label.clone_from(&written.label);
            }
        }
        copy
    }
}

/// Layers of a step of the sequence.
fn laid_out(item: &Item) -> usize {
    match item {
        Item::Layer(_) => 1,
        Item::Plane(_) => 0,
        Item::Repeat { count, items } => {
            *count as usize * items.iter().map(laid_out).sum::<usize>()
        }
    }
}

/// What keeps a stack with `ends: periodic` from being one.
pub(super) fn not_periodic(structure: &Structure) -> Vec<Diagnostic> {
    let mut found = Vec::new();
    if structure.ends != Ends::Periodic {
        return found;
    }
    if let Some(field) = &structure.field
        && field.value.value() != 0.0
    {
        found.push(
            Diagnostic::error("a stack in a field is not periodic: the edge drops from one period to the next")
                .at(field.span.clone())
                .expected("no field with `ends: periodic`")
                .hint("for the ladder of levels in a field put the layers into a `repeat`, take `ends` out and use `wellwright cascade`"),
        );
    }
    if structure.couples_bands() {
        found.push(
            Diagnostic::error("coupled bands are solved between walls only, and the file says `ends: periodic`")
                .expected("`parabolic` or `energy-dependent` electrons and `decoupled` holes, or `ends: walls`"),
        );
    }
    if let Some(tune) = &structure.tune {
        found.extend(tune.vary.first().map(|variable| {
            Diagnostic::warning(
                "`tune` does not know minibands: with `ends: periodic` it is not used",
            )
            .at(variable.span.clone())
        }));
    }
    if structure.tolerance.is_some() {
        found.push(Diagnostic::warning(
            "`tolerance` does not know minibands: with `ends: periodic` it is not used",
        ));
    }
    found
}
