//! Evidence for a bound: enumeration where there is little to try, a refutation of the canonical formula
//! otherwise.
//!
//! Whatever it is, it has been checked here once: what does not hold, or would take too much to show, has no
//! evidence.

use super::Effort;
use super::features::Features;
use super::statement::{Item, Statement, is_self_spacing};
use super::store::ProofStore;
use super::{CertifyError, cycle, enumeration, formula, lrat, precedence};
use crate::certificate::{Edge, Enumeration, Evidence, MOST_COLOURINGS};
use crate::solve::Stop;
use crate::solve::refutation::{Refutation, refute};

/// Finds evidence about bounds of one instance.
pub struct Prover<'a> {
    /// The instance.
    pub features: &'a Features<'a>,
    /// Where proofs go.
    pub store: &'a dyn ProofStore,
    /// How much work each bound may be.
    pub effort: Effort,
    /// When to leave what is not easy.
    pub stop: &'a Stop,
}

impl Prover<'_> {
    /// Evidence against a statement; `None` where there is none to be had. A proof is kept under `name`.
    ///
    /// # Errors
    /// Those of the store.
    pub fn refute(
        &self,
        statement: &Statement,
        name: &str,
    ) -> Result<Option<Evidence>, CertifyError> {
        if let Some(cycle) = self.cycle(statement) {
            return Ok(Some(Evidence::Cycle { cycle }));
        }
        let fragments = statement.fragments(self.features);
        let colourings = enumeration::colourings(self.features, &fragments);
        if colourings <= self.effort.colourings {
            return Ok(self.enumerate(&fragments, statement));
        }
        let precedence = precedence::choose(self.features, &fragments, statement);
        let proof = formula::canonical(self.features, &fragments, statement, &precedence).and_then(
            |formula| match refute(&formula, self.effort.refutation, self.stop) {
                Refutation::Proof(steps) => {
                    let steps = lrat::trim(&formula, &steps).ok()?;
                    Some((formula.len(), steps))
                }
                Refutation::Satisfiable | Refutation::Stopped => None,
            },
        );
        match proof {
            Some((given, steps)) => {
                let proof = format!("{name}.lrat");
                self.store
                    .put(&proof, &|out| lrat::write(given, &steps, out))?;
                Ok(Some(Evidence::Proof { proof, precedence }))
            }
            None if colourings <= MOST_COLOURINGS && !self.stop.now() => {
                Ok(self.enumerate(&fragments, statement))
            }
            None => Ok(None),
        }
    }

    fn enumerate(&self, fragments: &[u32], statement: &Statement) -> Option<Evidence> {
        enumeration::refutes(self.features, fragments, statement)
            .then_some(Evidence::Enumeration(Enumeration::Enumeration))
    }

    /// An odd cycle, with two masks: each step of it must be kept, or is more than the own budget pays.
    fn cycle(&self, statement: &Statement) -> Option<Vec<u32>> {
        let own = statement.budgets.last()?;
        let affordable = |item: &Item| item.weight() <= own.most;
        if self.features.instance.masks() != 2 || own.items.iter().any(affordable) {
            return None;
        }
        let mut conflicts: Vec<Edge> = statement.resolved.iter().flatten().copied().collect();
        let mut stitches = Vec::new();
        for item in &own.items {
            match item {
                Item::Conflict(unit) => conflicts.extend(unit),
                Item::Stitch { ends, .. } => stitches.push(*ends),
            }
        }
        conflicts.retain(|&edge| !is_self_spacing(self.features, edge));
        cycle::shortest(&conflicts, &stitches)
    }
}
