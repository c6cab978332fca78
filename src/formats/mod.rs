//! The formats that are read and written: bytes to nouns and back.
//!
//! | module | format |
//! |---|---|
//! | [`gdsii`] | GDSII streams: a layer of them read, the coloured copy written |
//! | [`rules`], [`rules_toml`], [`length`] | rules from TOML and the command line (`rules.md`) |
//! | [`stitch_list`] | lists of stitch candidates (`stitch-list.md`) |
//! | [`instance_json`] | abstract instances (`instance-json.md`) |
//! | [`colouring_json`] | colourings of them |
//! | [`dimacs_col`] | graphs of the DIMACS challenge |
//! | [`document`] | JSON written as it is produced |
//! | [`input`] | files: unpacked, and told apart |
//!
//! Every reader is a total function: any bytes give a noun or one [`FormatError`] that says where,
//! what is wrong and what would be right.

pub mod colouring_json;
pub mod dimacs_col;
pub mod document;
mod error;
pub mod gdsii;
pub mod input;
pub mod instance_json;
pub mod json;
pub mod length;
mod nearest;
pub mod rules;
pub mod rules_toml;
pub mod stitch_list;

pub use error::{FormatError, Position, Problem};
pub use input::{Input, Kind, open as open_input};
