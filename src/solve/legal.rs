//! What nothing can be paid for: allowed masks and ties. Either a colouring that keeps to them, or a few of
//! them that contradict each other.
//!
//! Fragments that no tie names are free of each other, so only the others are asked for: a direct encoding of
//! their masks and of the ties, with the first colouring as the solver's preference. A contradiction is found by
//! leaving out statements, runs of them first, as long as the rest contradicts itself, each time solved from scratch
//! (deletion-based shrinking, Bakker et al., IJCAI 1993): at the end none can be left out.

use encodings::colour::{AtMostOne, Colours};
use encodings::{Instance, Mask, MaskSet, Tie, ties};

use super::backend::{Answer, SatBackend, Varisat};
use super::limits::Stop;

/// One thing that a colouring must keep to.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Statement {
    /// The fragment may take some of the masks only.
    Allowed(u32),
    /// This tie.
    Tie(u32),
}

/// A colouring that keeps to allowed masks and ties, near `first`, which keeps to allowed masks. Where there is
/// none, what is returned breaks ties: it is for [`contradiction`] to say so beforehand.
pub fn near(instance: &Instance, mut first: Vec<Mask>) -> Vec<Mask> {
    if instance.broken_ties(&first).next().is_none() {
        return first;
    }
    let problem = Problem::of(instance);
    unite_free_features(&problem, &mut first);
    problem
        .solve(&problem.statements(), &first)
        .unwrap_or(first)
}

/// Puts features that break a tie between their stitches on one mask, where nothing else ties them.
fn unite_free_features(problem: &Problem<'_>, colours: &mut [Mask]) {
    let instance = problem.instance;
    let broken: Vec<u32> = instance.broken_ties(colours).collect();
    for tie in broken {
        if problem.ties.binary_search(&tie).is_ok() {
            continue;
        }
        if let Tie::AtMost { stitches, .. } = &instance.ties()[tie as usize] {
            let own = instance.fragments_of(instance.feature_of(stitches[0].a));
            let first = colours[own.start as usize];
            let common = common_masks(instance, own.clone());
            let mask = common.contains(first).then_some(first).or(common.first());
            for fragment in own {
                colours[fragment as usize] = mask.unwrap_or(first);
            }
        }
    }
}

/// The masks that all of some fragments may take.
fn common_masks(instance: &Instance, fragments: std::ops::Range<u32>) -> MaskSet {
    let allowed = fragments.map(|fragment| instance.allowed(fragment));
    allowed.fold(MaskSet::all(instance.masks()), MaskSet::intersection)
}

/// Some statements that cannot be kept all at once, of which none can be left out; `None` where all can be kept.
pub fn contradiction(instance: &Instance) -> Option<Vec<Statement>> {
    let problem = Problem::of(instance);
    let mut left = problem.statements();
    let first = vec![0; instance.fragment_count()];
    if problem.solve(&left, &first).is_some() {
        return None;
    }
    // Whole runs first, so that a contradiction of few statements among thousands is found soon.
    let mut run = left.len().div_ceil(2).max(1);
    loop {
        let mut at = 0;
        while at < left.len() {
            let mut without = left.clone();
            without.drain(at..(at + run).min(left.len()));
            if problem.solve(&without, &first).is_none() {
                left = without;
            } else {
                at += run;
            }
        }
        if run == 1 {
            return Some(left);
        }
        run = run.div_ceil(2).min(left.len().max(1));
    }
}

struct Problem<'a> {
    instance: &'a Instance,
    /// The ties that can be at odds with each other or with allowed masks, ascending.
    ties: Vec<u32>,
    /// The fragments that these name, ascending.
    fragments: Vec<u32>,
}

impl<'a> Problem<'a> {
    fn of(instance: &'a Instance) -> Problem<'a> {
        let all = instance.ties();
        let between = |tie: &&Tie| !matches!(tie, Tie::AtMost { .. });
        let bound = all.iter().filter(between).flat_map(Tie::fragments);
        let mut bound: Vec<u32> = bound.map(|f| instance.feature_of(f)).collect();
        bound.sort_unstable();
        bound.dedup();
        // Ties between the stitches of a feature are kept by any one mask that it may take.
        let is_free = |tie: &Tie| match tie {
            Tie::Same(_) | Tie::Different(_) => false,
            Tie::AtMost { stitches, .. } => {
                let feature = instance.feature_of(stitches[0].a);
                bound.binary_search(&feature).is_err()
                    && !common_masks(instance, instance.fragments_of(feature)).is_empty()
            }
        };
        let ties: Vec<u32> = (0..all.len() as u32)
            .filter(|&tie| !is_free(&all[tie as usize]))
            .collect();
        let named = ties.iter().flat_map(|&tie| all[tie as usize].fragments());
        let mut fragments: Vec<u32> = named.collect();
        fragments.sort_unstable();
        fragments.dedup();
        Problem {
            instance,
            ties,
            fragments,
        }
    }

    /// The ties, and the restrictions of the fragments that they name; ascending.
    fn statements(&self) -> Vec<Statement> {
        let every = MaskSet::all(self.instance.masks());
        let restricted = self.fragments.iter().copied();
        let restricted = restricted.filter(|&f| self.instance.allowed(f) != every);
        let ties = self.ties.iter().copied().map(Statement::Tie);
        restricted.map(Statement::Allowed).chain(ties).collect()
    }

    /// A colouring near `first` that keeps to the statements, ascending.
    fn solve(&self, statements: &[Statement], first: &[Mask]) -> Option<Vec<Mask>> {
        let instance = self.instance;
        let mut solver = Varisat::new(&Stop::default());
        let masks = |&fragment: &u32| {
            let restricted = statements
                .binary_search(&Statement::Allowed(fragment))
                .is_ok();
            let allowed = match restricted {
                true => instance.allowed(fragment),
                false => MaskSet::all(instance.masks()),
            };
            (allowed, first.get(fragment as usize).copied())
        };
        let each = self.fragments.iter().map(masks);
        let colours = Colours::encode_near(instance.masks(), each, AtMostOne::Stated, &mut solver);
        let number = |fragment: u32| {
            let place = self.fragments.binary_search(&fragment);
            place.ok().map(|place| place as u32)
        };
        for &statement in statements {
            if let Statement::Tie(tie) = statement
                && let Some(tie) = instance.ties()[tie as usize].renumbered(number)
            {
                ties::encode(&colours, &tie, &mut solver);
            }
        }
        if solver.solve(&[]) != Answer::Satisfiable {
            return None;
        }
        let model = solver.model();
        let mut colouring = first.to_vec();
        let found = colours.decode(|lit| model.holds(lit));
        for (&fragment, mask) in self.fragments.iter().zip(found) {
            colouring[fragment as usize] = mask;
        }
        Some(colouring)
    }
}
