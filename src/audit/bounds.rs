//! The two packings: each bound holds, and no unit is in two bounds of a level.

use std::collections::BTreeMap;
use std::io::{self, BufRead};

use rayon::prelude::*;

use super::lrat::{self, Failure};
use super::problem::Problem;
use super::statement::{self, Key, Statement};
use super::verdict::{Malformed, Rejection, Step};
use super::{clique, cycle, enumeration, formula};
use crate::certificate::{Certificate, ConflictBound, Evidence, PROOFS};

/// Where proofs come from.
pub trait Proofs: Sync {
    /// Opens the proof of that name.
    ///
    /// # Errors
    /// There is none, or it cannot be read.
    fn open(&self, name: &str) -> io::Result<Box<dyn BufRead + '_>>;
}

/// Proofs in memory, by name.
impl Proofs for BTreeMap<String, Vec<u8>> {
    fn open(&self, name: &str) -> io::Result<Box<dyn BufRead + '_>> {
        let proof = self.get(name).ok_or(io::ErrorKind::NotFound)?;
        Ok(Box::new(proof.as_slice()))
    }
}

/// What is wrong with a certificate: what it says, or its form.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Fault {
    /// It says what is not so.
    Rejected(Rejection),
    /// It has not the form.
    Malformed(Malformed),
}

impl From<Rejection> for Fault {
    fn from(rejection: Rejection) -> Fault {
        Fault::Rejected(rejection)
    }
}

/// How many bounds have which evidence.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Tally {
    /// Colourings tried.
    pub enumerated: usize,
    /// Cliques.
    pub cliques: usize,
    /// Odd cycles.
    pub cycles: usize,
    /// Proofs checked.
    pub proofs: usize,
}

impl Tally {
    fn add(&mut self, by: &Evidence) {
        match by {
            Evidence::Enumeration(_) => self.enumerated += 1,
            Evidence::Clique { .. } => self.cliques += 1,
            Evidence::Cycle { .. } => self.cycles += 1,
            Evidence::Proof { .. } => self.proofs += 1,
        }
    }
}

/// Checks both packings; returns how.
///
/// # Errors
/// The first bound that is wrong.
pub fn check(
    problem: &Problem,
    certificate: &Certificate,
    proofs: &dyn Proofs,
) -> Result<Tally, Fault> {
    let (conflicts, stitches) = (&certificate.conflict_bounds, &certificate.stitch_bounds);
    let taken = disjoint_units(problem, conflicts)?;
    first_fault(
        conflicts,
        Step::ConflictBound,
        |bound| Ok((statement::of_conflict_bound(problem, bound)?, &bound.by)),
        proofs,
    )?;
    disjoint_stitches(certificate)?;
    for (i, bound) in stitches.iter().enumerate() {
        for unit in &bound.resolved {
            let reject = |reason| Rejection::new(Step::StitchBound(i), reason);
            let key = statement::key(problem, unit).map_err(reject)?;
            if let Ok(at) = taken.binary_search_by_key(&key, |&(key, _)| key) {
                let of = taken[at].1;
                return Err(reject(format!(
                    "relies on {key} being resolved, which conflict bound {of} does not say"
                ))
                .into());
            }
        }
    }
    first_fault(
        stitches,
        Step::StitchBound,
        |bound| {
            Ok((
                statement::of_stitch_bound(problem, conflicts, bound)?,
                &bound.by,
            ))
        },
        proofs,
    )?;
    let mut tally = Tally::default();
    let evidence = conflicts.iter().map(|bound| &bound.by);
    evidence
        .chain(stitches.iter().map(|bound| &bound.by))
        .for_each(|by| tally.add(by));
    Ok(tally)
}

/// The first fault of all bounds, which are checked in parallel.
fn first_fault<'a, B: Sync>(
    bounds: &'a [B],
    step: fn(usize) -> Step,
    read: impl Fn(&'a B) -> Result<(Statement, &'a Evidence), String> + Sync,
    proofs: &dyn Proofs,
) -> Result<(), Fault> {
    let fault = |(i, bound): (usize, &'a B)| {
        let reject = |reason| Fault::from(Rejection::new(step(i), reason));
        let checked = read(bound).map_err(reject);
        checked
            .and_then(|(statement, by)| refute(&statement, by, step(i), proofs))
            .err()
    };
    match bounds.par_iter().enumerate().find_map_first(fault) {
        None => Ok(()),
        Some(fault) => Err(fault),
    }
}

/// Checks the evidence that the statement of a bound is impossible.
fn refute(
    statement: &Statement,
    by: &Evidence,
    step: Step,
    proofs: &dyn Proofs,
) -> Result<(), Fault> {
    let reject = |reason| Fault::from(Rejection::new(step.clone(), reason));
    match by {
        Evidence::Enumeration(_) => match enumeration::counterexample(statement).map_err(reject)? {
            None => Ok(()),
            Some(masks) => Err(reject(format!("not so: {}", witness(statement, &masks)))),
        },
        Evidence::Clique { clique } => {
            let clique = own_numbers(statement, clique).map_err(reject)?;
            clique::check(statement, &clique).map_err(reject)
        }
        Evidence::Cycle { cycle } => {
            let cycle = own_numbers(statement, cycle).map_err(reject)?;
            cycle::check(statement, &cycle).map_err(reject)
        }
        Evidence::Proof { proof, precedence } => {
            let precedence = own_numbers(statement, precedence).map_err(reject)?;
            let formula = formula::canonical(statement, &precedence).map_err(reject)?;
            let file = format!("{PROOFS}/{proof}");
            let malformed = |line, message| {
                Fault::Malformed(Malformed {
                    file: file.clone(),
                    line,
                    message,
                })
            };
            let text = proofs
                .open(proof)
                .map_err(|error| malformed(0, error.to_string()))?;
            lrat::check(&formula, text).map_err(|failure| match failure {
                Failure::Form { line, message } => malformed(line, message),
                Failure::Step { line, reason } => reject(format!("{file}, line {line}: {reason}")),
            })
        }
    }
}

/// The bound's own numbers of some fragments.
fn own_numbers(statement: &Statement, fragments: &[u32]) -> Result<Vec<u32>, String> {
    let own = |fragment: &u32| {
        let found = statement.fragments.binary_search(fragment);
        found
            .map(|at| at as u32)
            .map_err(|_| format!("fragment {fragment} is not among the bound's"))
    };
    fragments.iter().map(own).collect()
}

/// The most fragments that a witness lists.
const MOST_LISTED: usize = 60;

fn witness(statement: &Statement, masks: &[u8]) -> String {
    let listed = statement.fragments.iter().zip(masks).take(MOST_LISTED);
    let listed: Vec<String> = listed
        .map(|(fragment, mask)| format!("{fragment} on mask {}", mask + 1))
        .collect();
    let more = if statement.fragments.len() > MOST_LISTED {
        ", ..."
    } else {
        ""
    };
    format!("fragments {}{more}", listed.join(", "))
}

/// The units of all bounds on conflicts with the number of their bound, sorted; each once.
fn disjoint_units(
    problem: &Problem,
    bounds: &[ConflictBound],
) -> Result<Vec<(Key, usize)>, Rejection> {
    let mut taken = Vec::new();
    for (i, bound) in bounds.iter().enumerate() {
        for unit in &bound.units {
            let key = statement::key(problem, unit);
            taken.push((
                key.map_err(|reason| Rejection::new(Step::ConflictBound(i), reason))?,
                i,
            ));
        }
    }
    taken.sort_unstable();
    match taken.windows(2).find(|two| two[0].0 == two[1].0) {
        None => Ok(taken),
        Some(two) => {
            let reason = format!("{} is in conflict bound {} already", two[1].0, two[0].1);
            Err(Rejection::new(Step::ConflictBound(two[1].1), reason))
        }
    }
}

fn disjoint_stitches(certificate: &Certificate) -> Result<(), Rejection> {
    let mut taken = Vec::new();
    for (i, bound) in certificate.stitch_bounds.iter().enumerate() {
        taken.extend(bound.units.iter().map(|&ends| (ends, i)));
    }
    taken.sort_unstable();
    match taken.windows(2).find(|two| two[0].0 == two[1].0) {
        None => Ok(()),
        Some(two) => {
            let [a, b] = two[1].0;
            let reason = format!(
                "stitch edge [{a},{b}] is in stitch bound {} already",
                two[0].1
            );
            Err(Rejection::new(Step::StitchBound(two[1].1), reason))
        }
    }
}
