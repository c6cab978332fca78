//! Evidence for a bound: enumeration where there is little to try, a refutation of the canonical formula
//! otherwise.
//!
//! Whatever it is, it has been checked here once: what does not hold, or would take too much to show, has no
//! evidence.

use std::collections::BTreeSet;

use super::Effort;
use super::features::Features;
use super::formula::Outline;
use super::statement::{Item, Statement, is_self_spacing};
use super::store::ProofStore;
use super::{CertifyError, cycle, enumeration, formula, lrat, precedence, stepwise};
use crate::certificate::{Edge, Enumeration, Evidence, MOST_COLOURINGS};
use crate::solve::Stop;
use crate::solve::refutation::{self, Lists, Refutation, Steps, refute};

/// A refutation at one go may be so much work before it is tried step by step.
const AT_ONE_GO: usize = 1 << 20;

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
        if let Some(clique) = self.clique(statement) {
            return Ok(Some(Evidence::Clique { clique }));
        }
        let fragments = statement.fragments(self.features);
        let colourings = enumeration::colourings(self.features, &fragments);
        if colourings <= self.effort.colourings {
            return Ok(self.enumerate(&fragments, statement));
        }
        let precedence = precedence::choose(self.features, &fragments, statement);
        let proof = formula::canonical(self.features, &fragments, statement, &precedence).and_then(
            |(formula, outline)| {
                let steps = self.refutation(&formula, &outline)?;
                let steps = lrat::trim(&formula, &steps).ok()?;
                Some((formula.len(), steps))
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

    /// A refutation, at one go where that is easy.
    fn refutation(&self, formula: &Lists, outline: &Outline) -> Option<Steps> {
        let all = self.effort.refutation;
        let little = refutation::Effort {
            most: all.most.min(AT_ONE_GO),
            ..all
        };
        let is_long = outline.nodes.len() > 1;
        match refute(formula, if is_long { little } else { all }, self.stop) {
            Refutation::Proof(steps) => Some(steps),
            Refutation::Satisfiable => None,
            Refutation::Stopped if is_long => {
                stepwise::refute_stepwise(formula, outline, all, self.stop)
            }
            Refutation::Stopped => None,
        }
    }

    fn enumerate(&self, fragments: &[u32], statement: &Statement) -> Option<Evidence> {
        enumeration::refutes(self.features, fragments, statement)
            .then_some(Evidence::Enumeration(Enumeration::Enumeration))
    }

    /// All fragments of the own units, where every two of them are joined and Turan's theorem says enough.
    fn clique(&self, statement: &Statement) -> Option<Vec<u32>> {
        let own = statement.budgets.last()?;
        let mut edges = BTreeSet::new();
        for item in &own.items {
            match item {
                Item::Conflict(unit) if unit.len() == 1 => edges.insert(unit[0]),
                _ => return None,
            };
        }
        let members: BTreeSet<u32> = edges.iter().flatten().copied().collect();
        let count = members.len() as u64;
        let is_whole = edges.len() as u64 == count * count.saturating_sub(1) / 2;
        let joins = |&edge: &Edge| !is_self_spacing(self.features, edge);
        if !is_whole || !edges.iter().all(joins) {
            return None;
        }
        let masks = u64::from(self.features.instance.masks());
        (turan(count, masks) > own.most).then(|| members.into_iter().collect())
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

/// The fewest pairs on one mask each when the members of a clique are spread over the masks (Turan 1941).
fn turan(members: u64, masks: u64) -> u64 {
    let (each, more) = (members / masks, members % masks);
    let within = |n: u64| n * n.saturating_sub(1) / 2;
    more * within(each + 1) + (masks - more) * within(each)
}
