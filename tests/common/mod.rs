//! What the integration tests share: references written apart from the program, and the one place
//! where they call it.
#![allow(dead_code, clippy::unwrap_used, clippy::expect_used)]

pub mod audited;
pub mod certified;
pub mod enumerate;
pub mod graphs;
pub mod random;
pub mod rup;
pub mod solver;
