//! maskproof splits one chip layer over K masks, exactly and with evidence.
//!
//! The way through the code is the way of the data; nouns are data rooms, verbs are stages:
//!
//! ```text
//! bytes -> layout -> instance -> pieces (+ trail) -> outcome per piece -> colouring -> reports
//! ```
//!
//! | room | what it does |
//! |---|---|
//! | [`geometry`] | points, rectangles, exact distances on the grid |
//! | [`layout`] | the shapes, rules, features and fragments of one layer |
//! | [`formats`] | reads and writes GDSII, DIMACS `.col`, instance JSON and rules TOML |
//! | [`extract`] | layout to instance: features, conflict pairs, stitch candidates |
//! | [`reduce`] | instance to pieces, with the trail back |
//! | [`solve`] | pieces to outcomes: the engines, and the only room that links a solver |
//! | [`merge`] | outcomes and trail to a colouring of the instance |
//! | [`report`] | summary and output files |
//! | [`explain`] | certificate and input to irreducible cores and repairs |
//! | [`pipeline`] | the order of the stages |
//! | [`cli`] | the command line |

pub mod audit;
pub mod certificate;
pub mod certify;
pub mod cli;
pub mod explain;
pub mod extract;
pub mod formats;
pub mod geometry;
pub mod layout;
pub mod merge;
pub mod pipeline;
pub mod reduce;
pub mod report;
pub mod solve;
