//! The abstract mask-assignment problem and its encodings.
//!
//! A contents page, from the problem to the formulas:
//!
//! | module | what it holds |
//! |---|---|
//! | [`masks`] | masks and sets of masks |
//! | [`instance`] | [`Instance`]: fragments, conflict pairs, stitch edges, self-spacings, and their invariants |
//! | [`build`] | [`InstanceBuilder`], which checks them |
//! | `with_masks` | the same problem with another K |
//! | [`cost`] | [`Cost`]: what a colouring of an instance costs |
//! | [`literal`] | literals, the clause sink and the variable allocator |
//! | [`colour`] | direct encoding of colours |
//! | [`conflict`] | conflict edges and stitch edges |
//! | [`self_spacing`] | self-spacings |
//! | [`ties`] | conditions that nothing can be paid for |
//! | [`totalizer`] | incremental totalizer |
//! | [`at_most_one`] | three forms of "at most one" |
//! | [`symmetry`] | colour precedence and clique fixing, and when they are sound |
//! | [`assignment_ilp`] | the ILP assignment model |
//!
//! The crate does no input or output and links no solver: an encoder gets a clause sink and a
//! variable allocator from its caller.

pub mod assignment_ilp;
pub mod at_most_one;
pub mod build;
pub mod colour;
pub mod conflict;
pub mod cost;
pub mod instance;
pub mod literal;
pub mod masks;
pub mod self_spacing;
pub mod symmetry;
pub mod ties;
pub mod totalizer;
mod with_masks;

pub use build::{InstanceBuilder, InstanceError};
pub use cost::{Cost, Violation};
pub use instance::{Instance, Stitch};
pub use literal::{ClauseSink, Lit, VarAllocator};
pub use masks::{Mask, MaskSet};
pub use ties::Tie;
