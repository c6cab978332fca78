//! The abstract mask-assignment problem and its encodings.
//!
//! A contents page, from the problem to the formulas:
//!
//! | module | what it holds |
//! |---|---|
//! | [`instance`] | [`Instance`]: fragments, conflict pairs, stitch edges, self-spacings, and their invariants |
//! | [`cost`] | [`Cost`]: what a colouring of an instance costs |
//!
//! The crate does no input or output and links no solver: an encoder gets a clause sink and a
//! variable allocator from its caller.

pub mod cost;
pub mod instance;

pub use cost::{Cost, Violation};
pub use instance::{Instance, InstanceBuilder, InstanceError, Mask, MaskSet, Stitch};
