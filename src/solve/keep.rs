//! Keeping a given colouring: only the places where it fails are solved, with all else fixed.
//!
//! A feature is free where the given colouring fails: the features of each unit of conflict that it leaves unresolved,
//! those on a mask that they may not take, those of a broken tie, and whatever ties between fragments bind to
//! the latter two (else no legal masks might be left for them). All other fragments have one mask to choose from: the
//! given one.
//!
//! Lemma. Units between fixed features cost what they cost, and so do the stitches of fixed features. A unit that
//! names a free feature lies in one place, a component of free features under conflict pairs and ties between two
//! free features: so do the stitches and ties of its features. What a place costs depends on its own free
//! features only, so least costs of places add up to the least cost of all, and among colourings of that
//! cost the fewest changed features add up as well. There is a legal colouring: the given one is legal where no
//! mask or tie fails, and where one does, everything that ties bind to it is free.
//!
//! Each place is an instance of its own: its free features, and the fixed ones that they conflict with or are tied
//! to.

use std::collections::BTreeMap;

use petgraph::unionfind::UnionFind;
use rayon::prelude::*;

use encodings::{Cost, Instance, InstanceBuilder, InstanceError, Mask, MaskSet, Stitch, Tie};

use super::{Choice, Limits, changes, solve_piece_from};

/// A colouring that differs from a given one only where that one fails.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Kept {
    /// The mask of each fragment.
    pub colouring: Vec<Mask>,
    /// The places, by their first features.
    pub places: Vec<KeptPlace>,
}

/// A place where the given colouring fails.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct KeptPlace {
    /// Its free features, ascending.
    pub features: Vec<u32>,
    /// What the given colouring costs here: units that name a free feature, and stitches of free features.
    pub start: Cost,
    /// What the colouring found costs here.
    pub cost: Cost,
    /// The free features with a fragment on another mask than given, ascending.
    pub changed: Vec<u32>,
    /// Whether no masks of the free features cost less.
    pub least: bool,
    /// Whether none of that cost change fewer features.
    pub fewest: bool,
}

impl KeptPlace {
    /// Whether it costs as much as before.
    pub fn is_no_better(&self) -> bool {
        self.changed.is_empty()
    }
}

impl Kept {
    /// Whether everything said of every place is proven.
    pub fn is_proven(&self) -> bool {
        self.places.iter().all(|place| place.least && place.fewest)
    }

    /// How many features have a fragment on another mask than given.
    pub fn changed_count(&self) -> u64 {
        let changed = self.places.iter().map(|place| place.changed.len() as u64);
        changed.sum()
    }
}

/// Solves the places where `start` fails, a mask below K for each fragment, on the current thread pool. Where a
/// limit stops the search, the colouring is legal still, as long as ties and allowed masks can be kept at all.
///
/// # Errors
/// None for valid instances; a broken invariant of a place is reported rather than trusted.
pub fn solve(instance: &Instance, start: &[Mask], limits: &Limits) -> Result<Kept, InstanceError> {
    let places = places(instance, start)?;
    let solved: Vec<(Vec<Mask>, KeptPlace)> = (places.par_iter().with_max_len(1))
        .map(|place| place.solve(instance, start, limits))
        .collect();
    let mut kept = Kept {
        colouring: start.to_vec(),
        places: Vec::with_capacity(places.len()),
    };
    for (place, (masks, found)) in places.iter().zip(solved) {
        for (&fragment, mask) in place.fragments.iter().zip(masks) {
            kept.colouring[fragment as usize] = mask;
        }
        kept.places.push(found);
    }
    Ok(kept)
}

/// The features where a colouring fails, ascending.
pub fn failing(instance: &Instance, start: &[Mask]) -> Vec<u32> {
    let mut illegal = vec![false; instance.feature_count()];
    for (fragment, &mask) in (0u32..).zip(start) {
        illegal[instance.feature_of(fragment) as usize] |=
            !instance.allowed(fragment).contains(mask);
    }
    for tie in instance.broken_ties(start) {
        for fragment in instance.ties()[tie as usize].fragments() {
            illegal[instance.feature_of(fragment) as usize] = true;
        }
    }
    let mut fails = spread(instance, &illegal);
    let pairs = instance.unresolved_pairs(start);
    for [a, b] in pairs.map(|pair| ends(instance, pair)) {
        fails[a as usize] = true;
        fails[b as usize] = true;
    }
    for unit in instance.violated_self_units(start) {
        for &[a, _] in instance.self_unit(unit) {
            fails[instance.feature_of(a) as usize] = true;
        }
    }
    let features = (0u32..).zip(fails).filter(|&(_, fails)| fails);
    features.map(|(feature, _)| feature).collect()
}

/// The features of a pair.
fn ends(instance: &Instance, pair: u32) -> [u32; 2] {
    let edge = instance.pair(pair).first().copied().unwrap_or_default();
    edge.map(|fragment| instance.feature_of(fragment))
}

/// The features that a tie between two fragments binds to each other.
fn bound(instance: &Instance, tie: &Tie) -> Option<[u32; 2]> {
    match tie {
        Tie::Same(ends) | Tie::Different(ends) => Some(ends.map(|f| instance.feature_of(f))),
        Tie::AtMost { .. } => None,
    }
}

/// Marks all features that ties bind to marked ones.
fn spread(instance: &Instance, marked: &[bool]) -> Vec<bool> {
    let mut classes = UnionFind::<u32>::new(marked.len());
    for [a, b] in instance
        .ties()
        .iter()
        .filter_map(|tie| bound(instance, tie))
    {
        classes.union(a, b);
    }
    let class_of = classes.into_labeling();
    let mut spread = vec![false; marked.len()];
    for (&class, _) in class_of.iter().zip(marked).filter(|&(_, &marked)| marked) {
        spread[class as usize] = true;
    }
    let class_is_marked = |class: &u32| spread[*class as usize];
    class_of.iter().map(class_is_marked).collect()
}

/// A place as an instance of its own.
struct Place {
    /// The free features, ascending.
    free: Vec<u32>,
    /// The same in the numbers of the place.
    own: Vec<u32>,
    /// For each fragment of the place the fragment of the whole.
    fragments: Vec<u32>,
    instance: Instance,
    /// What the stitches of fixed features among them weigh.
    fixed_stitches: u64,
}

impl Place {
    fn solve(&self, whole: &Instance, start: &[Mask], limits: &Limits) -> (Vec<Mask>, KeptPlace) {
        let given: Vec<Mask> = (self.fragments.iter())
            .map(|&fragment| start[fragment as usize])
            .collect();
        let is_legal = self.instance.check_legal(&given).is_ok();
        let own = is_legal.then(|| given.clone());
        let outcome = solve_piece_from(&self.instance, own, Choice::Auto, limits);
        let least = outcome.conflicts.is_tight() && outcome.stitches.is_tight();
        let mut best = outcome.colouring;
        let mut fewest = true;
        if is_legal && self.instance.cost(&given) <= self.instance.cost(&best) {
            best.clone_from(&given);
        } else {
            let stop = limits.for_piece();
            (best, fewest) = changes::fewest(&self.instance, &given, &self.own, best, &stop);
        }
        let own_cost = |masks: &[Mask]| {
            let cost = self.instance.cost(masks);
            let stitches = cost.stitches - self.fixed_stitches;
            Cost { stitches, ..cost }
        };
        let mut changed: Vec<u32> = (self.fragments.iter().zip(given.iter().zip(&best)))
            .filter(|(_, (before, now))| before != now)
            .map(|(&fragment, _)| whole.feature_of(fragment))
            .collect();
        changed.dedup();
        let found = KeptPlace {
            features: self.free.clone(),
            start: own_cost(&given),
            cost: own_cost(&best),
            changed,
            least,
            fewest: fewest && least,
        };
        (best, found)
    }
}

/// What goes into a place.
#[derive(Default)]
struct Parts {
    /// Its features, free and fixed ones.
    features: Vec<u32>,
    pairs: Vec<u32>,
    ties: Vec<u32>,
}

/// The places where `start` fails, by their first features.
fn places(instance: &Instance, start: &[Mask]) -> Result<Vec<Place>, InstanceError> {
    let failing = failing(instance, start);
    let mut is_free = vec![false; instance.feature_count()];
    failing.iter().for_each(|&f| is_free[f as usize] = true);
    let parts = parts(instance, &failing, &is_free);
    let mut stitches: BTreeMap<u32, Vec<Stitch>> = BTreeMap::new();
    let named = parts.iter().flat_map(|parts| &parts.features);
    named.for_each(|&feature| {
        stitches.entry(feature).or_default();
    });
    for stitch in instance.stitches() {
        if let Some(own) = stitches.get_mut(&instance.feature_of(stitch.a)) {
            own.push(*stitch);
        }
    }
    let context = Context {
        instance,
        start,
        is_free: &is_free,
        stitches: &stitches,
    };
    parts.iter().map(|parts| context.place(parts)).collect()
}

fn parts(instance: &Instance, failing: &[u32], is_free: &[bool]) -> Vec<Parts> {
    let free = |feature: u32| is_free[feature as usize];
    let mut joined = UnionFind::<u32>::new(is_free.len());
    let pairs = (0..instance.pair_count() as u32).map(|pair| ends(instance, pair));
    let ties = instance
        .ties()
        .iter()
        .filter_map(|tie| bound(instance, tie));
    for [a, b] in pairs.chain(ties).filter(|&[a, b]| free(a) && free(b)) {
        joined.union(a, b);
    }
    let mut number: BTreeMap<u32, usize> = BTreeMap::new();
    let mut found: Vec<Parts> = Vec::new();
    for &feature in failing {
        let place = *number.entry(joined.find(feature)).or_insert(found.len());
        if place == found.len() {
            found.push(Parts::default());
        }
        found[place].features.push(feature);
    }
    let mut place_of = |features: &[u32]| {
        let feature = features.iter().copied().find(|&feature| free(feature))?;
        number.get(&joined.find_mut(feature)).copied()
    };
    for pair in 0..instance.pair_count() as u32 {
        let ends = ends(instance, pair);
        if let Some(place) = place_of(&ends) {
            found[place].pairs.push(pair);
            found[place].features.extend(ends);
        }
    }
    for (i, tie) in (0u32..).zip(instance.ties()) {
        let fragments = tie.fragments().into_iter();
        let named: Vec<u32> = fragments.map(|f| instance.feature_of(f)).collect();
        if let Some(place) = place_of(&named) {
            found[place].ties.push(i);
            found[place].features.extend(named);
        }
    }
    for parts in &mut found {
        parts.features.sort_unstable();
        parts.features.dedup();
    }
    found
}

struct Context<'a> {
    instance: &'a Instance,
    start: &'a [Mask],
    is_free: &'a [bool],
    stitches: &'a BTreeMap<u32, Vec<Stitch>>,
}

impl Context<'_> {
    fn place(&self, parts: &Parts) -> Result<Place, InstanceError> {
        let whole = self.instance;
        let mut builder = InstanceBuilder::new(whole.masks());
        let mut fragments: Vec<u32> = Vec::new();
        for &feature in &parts.features {
            let range = whole.fragments_of(feature);
            builder.feature(range.len() as u32);
            for fragment in range {
                builder.allow(fragments.len() as u32, self.allowed(fragment));
                fragments.push(fragment);
            }
        }
        // Fragments ascend with features.
        let number = |fragment: u32| fragments.partition_point(|&own| own < fragment) as u32;
        for &pair in &parts.pairs {
            builder.pair(whole.pair(pair).iter().map(|edge| edge.map(number)));
        }
        for stitch in parts
            .features
            .iter()
            .filter_map(|f| self.stitches.get(f))
            .flatten()
        {
            builder.stitch(number(stitch.a), number(stitch.b), stitch.weight);
        }
        let free = |feature: &u32| self.is_free[*feature as usize];
        for unit in whole.self_units() {
            let feature = unit.first().map(|edge| whole.feature_of(edge[0]));
            let here = feature.filter(free);
            if here.is_some_and(|feature| parts.features.binary_search(&feature).is_ok()) {
                for edge in unit {
                    let [a, b] = edge.map(number);
                    builder.self_spacing(a, b);
                }
            }
        }
        for &tie in &parts.ties {
            let renumbered = whole.ties()[tie as usize].renumbered(|f| Some(number(f)));
            renumbered.into_iter().for_each(|tie| builder.tie(tie));
        }
        let own = (0u32..).zip(&parts.features);
        let own = own.filter(|(_, feature)| free(feature));
        let (own, free) = own.unzip();
        Ok(Place {
            free,
            own,
            instance: builder.build()?,
            fragments,
            fixed_stitches: self.fixed_stitches(parts),
        })
    }

    fn allowed(&self, fragment: u32) -> MaskSet {
        match self.is_free[self.instance.feature_of(fragment) as usize] {
            true => self.instance.allowed(fragment),
            false => MaskSet::from_bits(1 << self.start[fragment as usize]),
        }
    }

    fn fixed_stitches(&self, parts: &Parts) -> u64 {
        let mask = |fragment: u32| self.start[fragment as usize];
        let fixed = parts
            .features
            .iter()
            .filter(|&&f| !self.is_free[f as usize]);
        let stitches = fixed
            .filter_map(|feature| self.stitches.get(feature))
            .flatten();
        let used = stitches.filter(|stitch| mask(stitch.a) != mask(stitch.b));
        used.map(|stitch| u64::from(stitch.weight)).sum()
    }
}
