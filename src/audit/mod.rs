//! The audit: an independent check of a certificate against the input.

pub mod layer;
pub mod problem;
pub mod verdict;

pub use problem::Problem;
pub use verdict::{Malformed, Rejection, Step, Verdict};

/// What an accepted certificate proves.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Theorem {}
