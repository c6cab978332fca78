//! GDSII streams: the real block, hierarchy, paths, bad input, damage, the coloured copy.

#![allow(clippy::unwrap_used, clippy::expect_used, missing_docs)]

mod bad;
mod coloured;
mod damage;
mod help;
mod hierarchy;
mod layers;
mod paths;
mod real;
