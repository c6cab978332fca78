//! The stitch policies against every legal place of the grid.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod candidates;
mod directed;
mod everywhere;
mod layouts;
mod listed;
mod policies;
mod routed;
mod search;
mod theorem;
