//! The writer of certificates.
//!
//! | file | what it does |
//! |---|---|
//! | [`layer`] | says in the words of the format which features a layer has, and where they are cut |

pub mod layer;
