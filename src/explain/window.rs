//! A window: some features are coloured anew, everything around them stays as it is. Can that be done
//! with fewer conflicts?
//!
//! A colouring of the window together with the masks around it is a colouring of the whole: what is
//! found here holds for the whole, however small the window is. A larger window only finds more.
//!
//! Conflicts are counted by groups, each with a budget of its own: those of other bounds have to stay as many
//! as they are, by what is proven of them, so that one counter over all would only hide that from the
//! solver (measured: 20 times as long where conflicts are dense).

use std::cell::Cell;
use std::collections::{BTreeMap, BTreeSet};

use encodings::colour::{AtMostOne, Colours};
use encodings::totalizer::Totalizer;
use encodings::{ClauseSink, Lit, Mask, Tie, VarAllocator, conflict, self_spacing, ties};

use super::core::feature_graph;
use super::units;
use crate::solve::Stop;
use crate::solve::backend::{Answer, SatBackend, Varisat};
use crate::solve::places::Places;

/// The effort for one question, in bytes of proof: at most so much, and counted as at least so much.
const MOST_EFFORT: u64 = 1 << 19;
const LEAST_EFFORT: u64 = 1 << 13;

/// Some features of an instance, to be coloured anew.
pub struct Window<'a> {
    /// The instance.
    pub places: &'a Places<'a>,
    /// The features, ascending.
    pub free: &'a [u32],
    /// The mask of a fragment of any other feature.
    pub mask: &'a dyn Fn(u32) -> Mask,
    /// Whether a unit is left out.
    pub released: &'a dyn Fn(u32) -> bool,
    /// The group of a unit; none where it must not be violated at all.
    pub group: &'a dyn Fn(u32) -> Option<u32>,
    /// How many units of a group may be violated.
    pub budget: &'a dyn Fn(u32) -> u64,
}

impl Window<'_> {
    /// Whether the features can be coloured so that the units with an end among them keep to the budgets.
    /// `None` where that was not found out with the effort that is left, which is lowered.
    pub fn is_colourable(&self, left: &Cell<u64>, stop: &Stop) -> Option<bool> {
        if left.get() == 0 {
            return None;
        }
        let mut formula = Formula::new(self, left.get().min(MOST_EFFORT), stop);
        formula.encode_ties(self);
        for (group, prices) in formula.encode_units(self) {
            let most = u32::try_from((self.budget)(group)).unwrap_or(u32::MAX);
            let mut counter = Totalizer::new(&prices);
            let too_many = most.checked_add(1);
            if let Some(lit) = too_many.and_then(|n| counter.at_least(n, &mut formula.solver)) {
                formula.solver.clause(&[!lit]);
            }
        }
        let answer = formula.solver.solve(&[]);
        let spent = formula.solver.effort().max(LEAST_EFFORT);
        left.set(left.get().saturating_sub(spent));
        match answer {
            Answer::Satisfiable => Some(true),
            Answer::Unsatisfiable(_) => Some(false),
            Answer::Stopped => None,
        }
    }

    /// The units with an end among the features, ascending.
    fn units(&self) -> BTreeSet<u32> {
        let at = |&feature: &u32| self.places.units_of_conflict(feature);
        let units = self.free.iter().flat_map(at);
        units.filter(|&unit| !(self.released)(unit)).collect()
    }
}

struct Formula {
    solver: Varisat,
    colours: Colours,
    /// The fragments of the window, ascending.
    fragments: Vec<u32>,
}

impl Formula {
    fn new(window: &Window<'_>, most: u64, stop: &Stop) -> Formula {
        let instance = window.places.instance;
        let own = |&feature: &u32| instance.fragments_of(feature);
        let fragments: Vec<u32> = window.free.iter().flat_map(own).collect();
        let comparing = |&f: &u32| !window.places.self_spacings(f).is_empty();
        let form = if window.free.iter().any(comparing) {
            AtMostOne::Stated
        } else {
            AtMostOne::Open
        };
        let mut solver = Varisat::bounded(stop, most);
        let allowed = fragments.iter().map(|&f| instance.allowed(f));
        let colours = Colours::encode(instance.masks(), allowed, form, &mut solver);
        Formula {
            solver,
            colours,
            fragments,
        }
    }

    /// Encodes all units; gives the prices of those that may be violated, by their groups.
    fn encode_units(&mut self, window: &Window<'_>) -> BTreeMap<u32, Vec<Lit>> {
        let instance = window.places.instance;
        let mut prices: BTreeMap<u32, Vec<Lit>> = BTreeMap::new();
        for unit in window.units() {
            let group = (window.group)(unit).filter(|&group| (window.budget)(group) > 0);
            let price = group.map(|group| {
                let price = self.solver.fresh();
                prices.entry(group).or_default().push(price);
                price
            });
            for &edge in units::edges(instance, unit) {
                if units::is_self_spacing(instance, unit) {
                    self.self_spacing(window.places, edge, price);
                } else {
                    self.pair_edge(window, edge, price);
                }
            }
        }
        prices
    }

    /// What ties ask of the features, with the masks around them as they are.
    fn encode_ties(&mut self, window: &Window<'_>) {
        let places = window.places;
        let at = window.free.iter().flat_map(|&feature| places.ties(feature));
        let ties: BTreeSet<u32> = at.copied().collect();
        for tie in ties {
            let tie = &places.instance.ties()[tie as usize];
            if let Some(tie) = tie.renumbered(|fragment| self.local(fragment).ok()) {
                ties::encode(&self.colours, &tie, &mut self.solver);
                continue;
            }
            // Those between stitches lie within one feature; these reach out.
            let (Tie::Same(ends) | Tie::Different(ends)) = tie else {
                continue;
            };
            let outer = ends.iter().find(|&&f| self.local(f).is_err());
            let inner = ends.iter().find_map(|&f| self.local(f).ok());
            if let (Some(&outer), Some(inner)) = (outer, inner) {
                let mask = (window.mask)(outer);
                match tie {
                    Tie::Different(_) => self.keep_off(inner, mask, None),
                    _ => {
                        let on = self.colours.lit(inner, mask);
                        self.solver.clause(&on.into_iter().collect::<Vec<Lit>>());
                    }
                }
            }
        }
    }

    fn local(&self, fragment: u32) -> Result<u32, usize> {
        let found = self.fragments.binary_search(&fragment);
        found.map(|i| i as u32)
    }

    fn pair_edge(&mut self, window: &Window<'_>, [a, b]: [u32; 2], price: Option<Lit>) {
        match (self.local(a), self.local(b)) {
            (Ok(a), Ok(b)) => conflict::separate(&self.colours, [a, b], price, &mut self.solver),
            (Ok(inner), Err(_)) => self.keep_off(inner, (window.mask)(b), price),
            (Err(_), Ok(inner)) => self.keep_off(inner, (window.mask)(a), price),
            (Err(_), Err(_)) => {}
        }
    }

    /// The fragment is not on the mask of its neighbour outside.
    fn keep_off(&mut self, fragment: u32, mask: Mask, price: Option<Lit>) {
        let on = self.colours.lit(fragment, mask).map(|lit| !lit);
        if let Some(off) = on {
            let clause: Vec<Lit> = [Some(off), price].into_iter().flatten().collect();
            self.solver.clause(&clause);
        }
    }

    fn self_spacing(&mut self, places: &Places<'_>, edge: [u32; 2], price: Option<Lit>) {
        let fragments = &self.fragments;
        let local = |fragment: u32| fragments.partition_point(|&f| f < fragment) as u32;
        let graph = feature_graph(places, places.instance.feature_of(edge[0]), &local);
        let ends = edge.map(local);
        self_spacing::encode(&self.colours, ends, &graph, price, &mut self.solver);
    }
}
