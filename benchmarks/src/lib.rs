//! Inputs for benchmarks, made from a seed: the same bytes on every machine.
//!
//! | module | what it holds |
//! |---|---|
//! | [`contact_array`] | an irregular array of contacts, as squares and as an instance |
//! | [`gds_writer`] | squares on one layer as a GDSII file |
//!
//! `peers/run.py` runs the program and general solvers on such inputs and on the real ones.

pub mod contact_array;
pub mod gds_writer;

pub use contact_array::{Contact, ContactArray};
