//! Structure files: reading, checking, and laying out as a stack of layers.

pub mod document;
