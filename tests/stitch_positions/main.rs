//! The stitch policies against every legal place of the grid.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod candidates;
mod everywhere;
mod layouts;
mod search;
mod theorem;
