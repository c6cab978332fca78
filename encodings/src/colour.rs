//! The direct encoding of colours: one literal for each fragment and mask that it may take.
//!
//! Source: the direct encoding of constraint problems, de Kleer, "A comparison of ATMS and CSP
//! techniques", IJCAI 1989; Walsh, "SAT v CSP", CP 2000.
//! Where we differ: a fragment with two masks to choose from gets one variable with its two signs
//! instead of two variables, which makes two-mask instances half as large; and "at most one mask" is
//! optional. Left open, a model may put a fragment on several masks: a conflict that is not paid for
//! keeps the two sets of masks disjoint, a stitch that is not paid for keeps them equal, so reading off
//! the first mask of each set keeps both ([`Colours::decode`]; reading any one could break a stitch).
//! Assuming one literal then puts the fragment on that mask, but does not keep it off the others.
//! Self-spacings need it stated ([`crate::self_spacing`]).

use crate::at_most_one;
use crate::literal::{ClauseSink, Lit, VarAllocator};
use crate::masks::{MAX_MASKS, Mask, MaskSet};

/// Whether the encoding says that a fragment has at most one mask.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum AtMostOne {
    /// Left open: a model may give a fragment several masks, of which the first is read off.
    Open,
    /// Stated.
    Stated,
}

/// The colour literals of a list of fragments, which are numbered by their place in that list.
#[derive(Clone, Debug)]
pub struct Colours {
    masks: u8,
    lits: Vec<Option<Lit>>,
}

impl Colours {
    /// Encodes that every fragment has a mask among its allowed ones.
    pub fn encode<S: ClauseSink + VarAllocator>(
        masks: u8,
        allowed: impl IntoIterator<Item = MaskSet>,
        at_most_one: AtMostOne,
        sink: &mut S,
    ) -> Colours {
        let allowed = allowed.into_iter().map(|set| (set, None));
        Colours::encode_near(masks, allowed, at_most_one, sink)
    }

    /// The same, with a preferred mask for each fragment. Solvers try "false" first, so the literal of a
    /// preferred mask is a negated variable: a search begins near that colouring.
    pub fn encode_near<S: ClauseSink + VarAllocator>(
        masks: u8,
        fragments: impl IntoIterator<Item = (MaskSet, Option<Mask>)>,
        at_most_one: AtMostOne,
        sink: &mut S,
    ) -> Colours {
        let mut colours = Colours {
            masks: masks.min(MAX_MASKS),
            lits: Vec::new(),
        };
        for (allowed, preferred) in fragments {
            colours.add(allowed, preferred, at_most_one, sink);
        }
        colours
    }

    fn add<S: ClauseSink + VarAllocator>(
        &mut self,
        set: MaskSet,
        preferred: Option<Mask>,
        form: AtMostOne,
        sink: &mut S,
    ) {
        let mut fresh = |mask: Mask| {
            let lit = sink.fresh();
            if preferred == Some(mask) { !lit } else { lit }
        };
        let mut own: Vec<Lit> = Vec::with_capacity(self.masks as usize);
        if set.len() == 2 {
            let first = set.first().map(&mut fresh);
            own.extend(first.into_iter().flat_map(|first| [first, !first]));
        } else {
            own.extend(set.iter().map(fresh));
            sink.clause(&own);
            if form == AtMostOne::Stated {
                at_most_one::pairwise(&own, sink);
            }
        }
        let mut own = own.into_iter();
        self.lits
            .extend((0..self.masks).map(|mask| own.next_if(set.contains(mask))));
    }

    /// K, the number of masks.
    pub fn masks(&self) -> u8 {
        self.masks
    }

    /// How many fragments there are.
    pub fn fragment_count(&self) -> usize {
        self.lits.len() / self.masks as usize
    }

    /// "The fragment is on the mask"; `None` where it may not be.
    pub fn lit(&self, fragment: u32, mask: Mask) -> Option<Lit> {
        self.lits[fragment as usize * self.masks as usize + mask as usize]
    }

    /// Reads the masks off a model: the first true one of each fragment.
    pub fn decode(&self, holds: impl Fn(Lit) -> bool) -> Vec<Mask> {
        self.lits
            .chunks(self.masks as usize)
            .map(|own| {
                let on = own.iter().position(|lit| lit.is_some_and(&holds));
                // Every model satisfies "at least one"; the first allowed mask stands in for none.
                on.or_else(|| own.iter().position(Option::is_some))
                    .unwrap_or(0) as Mask
            })
            .collect()
    }
}

/// Takes the next item only where it is wanted.
trait NextIf: Iterator {
    fn next_if(&mut self, wanted: bool) -> Option<Self::Item> {
        if wanted { self.next() } else { None }
    }
}

impl<I: Iterator> NextIf for I {}
