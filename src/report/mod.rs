//! (in preparation)
