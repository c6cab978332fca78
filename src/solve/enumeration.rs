//! Enumeration with pruning, for tiny pieces.
//!
//! Depth-first over the fragments in order; a branch ends when what is paid so far reaches the best cost
//! known. Lemma: unresolved pairs and stitches among the first fragments stay, whatever the others take,
//! so what is paid only grows. Self-spacings are counted on whole colourings only, which keeps the paid
//! part a lower bound, and so are ties looked at. Where masks are interchangeable, a fragment uses at most one mask beyond those
//! in use before it (value precedence; Law and Lee, CP 2004): every colouring is one of those up to
//! renumbering.

use encodings::{Cost, Instance, Mask};

/// The largest piece, in fragments, that enumeration takes on.
pub const MOST_FRAGMENTS: usize = 10;

/// A colouring of least cost; `first`, a legal one, where it has that.
pub fn least_cost(instance: &Instance, first: Vec<Mask>) -> (Vec<Mask>, Cost) {
    let mut search = Search::new(instance, first);
    search.extend(0, 0, Cost::default());
    (search.best, search.least)
}

struct Search<'a> {
    instance: &'a Instance,
    interchangeable: bool,
    /// For each fragment its edges to earlier ones: pair and earlier fragment.
    edges: Vec<Vec<(u32, u32)>>,
    /// For each fragment its stitch edges to earlier ones: earlier fragment and weight.
    stitches: Vec<Vec<(u32, u32)>>,
    /// How many fragments already leave each pair unresolved.
    unresolved: Vec<u32>,
    colours: Vec<Mask>,
    best: Vec<Mask>,
    least: Cost,
}

impl<'a> Search<'a> {
    fn new(instance: &'a Instance, best: Vec<Mask>) -> Search<'a> {
        let count = instance.fragment_count();
        let mut edges = vec![Vec::new(); count];
        for (pair, own) in instance.pairs().enumerate() {
            for &[a, b] in own {
                edges[b as usize].push((pair as u32, a));
            }
        }
        let mut stitches = vec![Vec::new(); count];
        for stitch in instance.stitches() {
            stitches[stitch.b as usize].push((stitch.a, stitch.weight));
        }
        Search {
            instance,
            interchangeable: instance.is_unrestricted(),
            edges,
            stitches,
            unresolved: vec![0; instance.pair_count()],
            colours: vec![0; count],
            least: instance.cost(&best),
            best,
        }
    }

    fn extend(&mut self, fragment: usize, used: Mask, paid: Cost) {
        if paid >= self.least {
            return;
        }
        if fragment == self.colours.len() {
            let cost = self.instance.cost(&self.colours);
            if cost < self.least && self.instance.broken_ties(&self.colours).next().is_none() {
                self.least = cost;
                self.best.clone_from(&self.colours);
            }
            return;
        }
        let masks = self.instance.masks();
        let end = if self.interchangeable {
            masks.min(used + 1)
        } else {
            masks
        };
        for mask in 0..end {
            if self.instance.allowed(fragment as u32).contains(mask) {
                self.colours[fragment] = mask;
                let step = self.pay(fragment, mask);
                self.extend(fragment + 1, used.max(mask + 1), paid + step);
                self.take_back(fragment, mask);
            }
        }
    }

    /// Marks the pairs that `fragment` leaves unresolved with earlier ones; returns what it adds.
    fn pay(&mut self, fragment: usize, mask: Mask) -> Cost {
        let mut step = Cost::default();
        for &(pair, earlier) in &self.edges[fragment] {
            if self.colours[earlier as usize] == mask {
                step.conflicts += u64::from(self.unresolved[pair as usize] == 0);
                self.unresolved[pair as usize] += 1;
            }
        }
        for &(earlier, weight) in &self.stitches[fragment] {
            if self.colours[earlier as usize] != mask {
                step.stitches += u64::from(weight);
            }
        }
        step
    }

    fn take_back(&mut self, fragment: usize, mask: Mask) {
        for &(pair, earlier) in &self.edges[fragment] {
            if self.colours[earlier as usize] == mask {
                self.unresolved[pair as usize] -= 1;
            }
        }
    }
}
