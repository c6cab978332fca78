//! Placeholder until the branch lands.
use super::{Problem, Rejection, Step};
/// Not there yet.
pub fn derive(
    _: &crate::layout::Layout,
    _: &crate::layout::Rules,
    _: &crate::certificate::Certificate,
) -> Result<Problem, Rejection> {
    Err(Rejection::new(Step::Features, "not built"))
}
