//! Evidence for a bound: an odd cycle or a clique where it is one, enumeration where there is little to try, a
//! refutation of the canonical formula otherwise.
//!
//! Whatever it is, it has been checked here once: what does not hold, or would take too much to show, has no
//! evidence.

use std::io::Write;

use super::Effort;
use super::features::Features;
use super::formula::Outline;
use super::statement::{Item, Statement, is_self_spacing};
use super::store::ProofStore;
use super::{CertifyError, clique, cycle, enumeration, formula, lrat, precedence, stepwise};
use crate::certificate::{Edge, Enumeration, Evidence, MOST_COLOURINGS};
use crate::solve::Stop;
use crate::solve::refutation::{self, Lists, Refutation, Steps, refute};

/// A refutation at one go may be so much work before it is tried step by step.
const AT_ONE_GO: usize = 1 << 17;

/// What was found against a statement.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Found {
    /// Evidence.
    Evidence(Evidence),
    /// None that can be had; a smaller limit than that of the last budget may do, 0 for none.
    Less(u64),
}

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
    /// Evidence against a statement. A proof is kept under `name`.
    ///
    /// # Errors
    /// Those of the store.
    pub fn refute(&self, statement: &Statement, name: &str) -> Result<Found, CertifyError> {
        if let Some(cycle) = self.cycle(statement) {
            return Ok(Found::Evidence(Evidence::Cycle { cycle }));
        }
        if let Some(clique) = clique::of(self.features, statement) {
            return Ok(Found::Evidence(Evidence::Clique { clique }));
        }
        let fragments = statement.fragments(self.features);
        let colourings = enumeration::colourings(self.features, &fragments);
        if colourings <= self.effort.colourings {
            return Ok(self.enumerate(&fragments, statement));
        }
        let precedence = precedence::choose(self.features, &fragments, statement);
        let formula = formula::canonical(self.features, &fragments, statement, &precedence);
        let Some((formula, outline)) = formula else {
            return Ok(Found::Less(0));
        };
        let proof = refutation(&formula, &outline, self.effort.refutation, self.stop);
        match proof.and_then(|steps| lrat::trim(&formula, &steps).map_err(|_| 0)) {
            Ok(steps) => {
                let proof = format!("{name}.lrat");
                let write = |out: &mut dyn Write| lrat::write(formula.len(), &steps, out);
                self.store.put(&proof, &write)?;
                Ok(Found::Evidence(Evidence::Proof { proof, precedence }))
            }
            Err(_) if colourings <= MOST_COLOURINGS && !self.stop.now() => {
                Ok(self.enumerate(&fragments, statement))
            }
            Err(less) => Ok(Found::Less(less)),
        }
    }

    fn enumerate(&self, fragments: &[u32], statement: &Statement) -> Found {
        if enumeration::refutes(self.features, fragments, statement) {
            Found::Evidence(Evidence::Enumeration(Enumeration::Enumeration))
        } else {
            Found::Less(0)
        }
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

/// A refutation of a canonical formula, at one go where that is easy.
///
/// # Errors
/// There is none, or none without too much work; then a smaller limit that may do, 0 for none.
pub fn refutation(
    formula: &Lists,
    outline: &Outline,
    effort: refutation::Effort,
    stop: &Stop,
) -> Result<Steps, u64> {
    let little = refutation::Effort {
        most: effort.most.min(AT_ONE_GO),
        ..effort
    };
    let is_long = outline.nodes.len() > 1;
    match refute(formula, if is_long { little } else { effort }, stop) {
        Refutation::Proof(steps) => Ok(steps),
        Refutation::Stopped if is_long => stepwise::refute_stepwise(formula, outline, effort, stop),
        Refutation::Satisfiable | Refutation::Stopped => Err(0),
    }
}
