//! What an accepted certificate proves, in words.

use std::fmt;

use super::bounds::Tally;
use super::problem::Problem;
use crate::certificate::{Certificate, Claim, LayerRules, Rules};
use crate::layout::length::Micrometres;

/// What an accepted certificate proves. Shown as one sentence.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Theorem {
    /// Of what, under which rules.
    pub rules: Rules,
    /// How many features there are.
    pub features: usize,
    /// How many stitch edges.
    pub stitch_candidates: usize,
    /// The least number of conflicts, and that of the colouring.
    pub conflicts: Claim,
    /// The least weight of stitches among colourings of fewest conflicts, and that of the colouring.
    pub stitches: Claim,
    /// How the bounds were checked.
    pub tally: Tally,
}

impl Theorem {
    /// What an accepted certificate proves of a problem.
    pub fn new(problem: &Problem, certificate: &Certificate, tally: Tally) -> Theorem {
        Theorem {
            rules: certificate.rules.clone(),
            features: problem.feature_count(),
            stitch_candidates: problem.stitches.len(),
            conflicts: certificate.conflicts,
            stitches: certificate.stitches,
            tally,
        }
    }

    /// Whether the colouring is proven to be of least cost.
    pub fn is_optimal(&self) -> bool {
        self.conflicts.is_tight() && self.stitches.is_tight()
    }
}

impl fmt::Display for Theorem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &self.rules {
            Rules::Layer(rules) => self.layer(rules, f)?,
            Rules::Graph(_) => write!(f, "this graph, {}", of(self.rules.masks(), "mask"))?,
        }
        f.write_str(": ")?;
        let Claim { lower, upper } = self.conflicts;
        match (lower, upper) {
            (0, 0) => f.write_str("this colouring leaves no conflict")?,
            _ if lower == upper => {
                write!(
                    f,
                    "every colouring leaves at least {}, and this one has no more",
                    of(lower, "conflict")
                )?;
            }
            _ => write!(
                f,
                "every colouring leaves at least {}, and this one {upper}",
                of(lower, "conflict")
            )?,
        }
        if !self.conflicts.is_tight() || (self.stitch_candidates == 0 && self.stitches.upper == 0) {
            return Ok(());
        }
        f.write_str("; among those that leave as few, ")?;
        let Claim { lower, upper } = self.stitches;
        match (lower, upper) {
            (0, 0) => f.write_str("none has fewer stitches, since it has none"),
            _ if lower == upper => write!(f, "none has stitches of less weight than its {upper}"),
            _ => write!(
                f,
                "all have stitches of a weight of at least {lower}, and this one {upper}"
            ),
        }
    }
}

impl Theorem {
    fn layer(&self, rules: &LayerRules, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let spacing = Micrometres::new(rules.spacing, rules.unit_pm);
        write!(
            f,
            "layer {} of {}, {}, {spacing} um apart",
            rules.layer,
            rules.top,
            of(rules.masks, "mask")
        )?;
        match rules.stitch.as_str() {
            "none" => f.write_str(", no stitches"),
            "every-interval" => f.write_str(
                ", stitches where the certificate lists a candidate (policy every-interval)",
            ),
            policy => write!(f, ", stitches where policy {policy} allows them"),
        }
    }
}

fn of(count: impl Into<u64>, noun: &str) -> String {
    let count = count.into();
    format!("{count} {noun}{}", if count == 1 { "" } else { "s" })
}
