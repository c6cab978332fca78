//! What a colouring of an instance costs: unresolved units of conflict, then stitches.

use crate::build::find;
use crate::instance::Instance;
use crate::masks::Mask;

/// A cost, compared lexicographically: conflicts first, then stitches by weight.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Cost {
    /// Unresolved units of conflict: pairs, and features with a violated self-spacing.
    pub conflicts: u64,
    /// Total weight of the stitch edges whose ends differ.
    pub stitches: u64,
}

impl std::ops::Add for Cost {
    type Output = Cost;
    fn add(self, other: Cost) -> Cost {
        Cost {
            conflicts: self.conflicts + other.conflicts,
            stitches: self.stitches + other.stitches,
        }
    }
}

impl std::ops::AddAssign for Cost {
    fn add_assign(&mut self, other: Cost) {
        *self = *self + other;
    }
}

impl std::iter::Sum for Cost {
    fn sum<I: Iterator<Item = Cost>>(costs: I) -> Cost {
        costs.fold(Cost::default(), |sum, cost| sum + cost)
    }
}

/// A reason why a list of masks is no legal colouring of an instance.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Violation {
    /// The list has another length than the instance has fragments.
    Length {
        /// Masks listed.
        found: usize,
        /// Fragments to colour.
        expected: usize,
    },
    /// The fragment has a mask that it may not take.
    Forbidden {
        /// The fragment.
        fragment: u32,
        /// Its mask.
        mask: Mask,
    },
    /// A tie is broken.
    Tie(u32),
}

impl Instance {
    /// Checks that `colouring` gives every fragment a mask that it may take, and keeps all ties.
    ///
    /// # Errors
    /// The first fragment, or tie, that breaks the rule.
    pub fn check_legal(&self, colouring: &[Mask]) -> Result<(), Violation> {
        if colouring.len() != self.fragment_count() {
            return Err(Violation::Length {
                found: colouring.len(),
                expected: self.fragment_count(),
            });
        }
        match (0..colouring.len()).find(|&f| {
            let mask = colouring[f];
            mask >= self.masks() || !self.allowed(f as u32).contains(mask)
        }) {
            None => match self.broken_ties(colouring).next() {
                None => Ok(()),
                Some(tie) => Err(Violation::Tie(tie)),
            },
            Some(f) => Err(Violation::Forbidden {
                fragment: f as u32,
                mask: colouring[f],
            }),
        }
    }

    /// The ties that a colouring breaks, ascending.
    pub fn broken_ties<'a>(&'a self, colouring: &'a [Mask]) -> impl Iterator<Item = u32> + 'a {
        let ties = (0u32..).zip(self.ties());
        ties.filter(|(_, tie)| !tie.holds(colouring))
            .map(|(i, _)| i)
    }

    /// Counts the cost of a legal colouring.
    pub fn cost(&self, colouring: &[Mask]) -> Cost {
        let same = |a: u32, b: u32| colouring[a as usize] == colouring[b as usize];
        let pairs = self.unresolved_pairs(colouring).count();
        let stitches = self
            .stitches()
            .iter()
            .filter(|stitch| !same(stitch.a, stitch.b))
            .map(|stitch| u64::from(stitch.weight))
            .sum();
        Cost {
            conflicts: pairs as u64 + self.violated_self_units(colouring).count() as u64,
            stitches,
        }
    }

    /// The conflict pairs that `colouring` leaves unresolved, ascending.
    pub fn unresolved_pairs<'a>(&'a self, colouring: &'a [Mask]) -> impl Iterator<Item = u32> + 'a {
        (0..self.pair_count() as u32).filter(move |&pair| {
            self.pair(pair)
                .iter()
                .any(|&[a, b]| colouring[a as usize] == colouring[b as usize])
        })
    }

    /// The features with self-spacings, numbered among themselves, of which `colouring` violates some;
    /// ascending.
    pub fn violated_self_units<'a>(
        &'a self,
        colouring: &'a [Mask],
    ) -> impl Iterator<Item = u32> + 'a {
        let mut last = None;
        let unit_of = |i: u32| self.self_start.partition_point(|&start| start <= i) as u32 - 1;
        let violated = self.violated_self_spacings(colouring).map(unit_of);
        violated.filter(move |&unit| last.replace(unit) != Some(unit))
    }

    /// The self-spacings that `colouring` violates, ascending: both fragments on one mask, and not
    /// joined through fragments of that mask.
    pub fn violated_self_spacings<'a>(
        &'a self,
        colouring: &'a [Mask],
    ) -> impl Iterator<Item = u32> + 'a {
        let part = self.same_mask_parts(colouring);
        (0..self.self_spacings().len() as u32).filter(move |&i| {
            let [a, b] = self.self_spacings()[i as usize];
            colouring[a as usize] == colouring[b as usize] && part[a as usize] != part[b as usize]
        })
    }

    /// For each fragment, the smallest fragment that it is joined to through stitch edges without a
    /// mask change. Empty when no self-spacing asks for it.
    fn same_mask_parts(&self, colouring: &[Mask]) -> Vec<u32> {
        if self.self_spacings().is_empty() {
            return Vec::new();
        }
        let mut part: Vec<u32> = (0..self.fragment_count() as u32).collect();
        for stitch in self.stitches() {
            if colouring[stitch.a as usize] == colouring[stitch.b as usize] {
                let (a, b) = (find(&mut part, stitch.a), find(&mut part, stitch.b));
                part[a.max(b) as usize] = a.min(b);
            }
        }
        for fragment in 0..part.len() {
            part[fragment] = find(&mut part, fragment as u32);
        }
        part
    }
}
