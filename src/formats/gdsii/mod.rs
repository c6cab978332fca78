//! stub
/// sig
pub const SIGNATURE: [u8; 4] = [0, 6, 0, 2];
/// p
#[derive(Debug, thiserror::Error)]
#[error("x")]
pub struct Problem;
