//! The whole instance as a pseudo-Boolean problem: each fragment on one mask, a price for each unit of
//! conflict and each stitch, and an objective in which one conflict weighs more than all stitches.
//!
//! The clauses of a price are those of the canonical formula, for all edges of the unit. So the clauses of
//! a bound are some of the problem's.

use std::io::{self, Write};
use std::ops::Range;

use rustc_hash::FxHashMap;

use encodings::Mask;

use super::super::features::Features;
use super::super::formula::Formula;
use super::super::statement::Item;
use crate::certificate::Edge;
use crate::solve::refutation::Lists;

/// The problem. Variables are numbered from 1, constraints too, as VeriPB counts them: an equation is two.
pub struct Problem<'a> {
    /// The instance.
    pub features: &'a Features<'a>,
    /// The name of each variable.
    names: Vec<String>,
    /// The variable of each fragment's first mask.
    first: Vec<i32>,
    /// All clauses; the first ones, about one fragment, are stated as equations.
    clauses: Lists,
    /// How many these are.
    of_fragments: usize,
    /// The price of each edge, and its clauses.
    of_edge: FxHashMap<Edge, (i32, Range<usize>)>,
    /// The prices of all units of conflict.
    pub units: Vec<i32>,
    /// The prices of all stitches, and their weights.
    pub stitches: Vec<(i32, u64)>,
}

/// The problem in the making.
struct Builder<'a> {
    formula: Formula<'a, Lists>,
    names: Vec<String>,
    of_edge: FxHashMap<Edge, (i32, Range<usize>)>,
}

impl Builder<'_> {
    /// A price for an item, with its clauses.
    fn price(&mut self, name: String, item: &Item) -> i32 {
        let price = self.formula.fresh();
        self.names.push(name);
        for &edge in item.edges() {
            let start = self.formula.sink().len();
            let part = match item {
                Item::Conflict(_) => Item::Conflict(vec![edge]),
                Item::Stitch { .. } => item.clone(),
            };
            self.formula.violated(&part, Some(price));
            let clauses = start..self.formula.sink().len();
            self.of_edge.insert(edge, (price, clauses));
            let [a, b] = edge;
            for step in 1..=self.formula.variables() - self.names.len() as i32 {
                self.names.push(format!("r{a}_{b}i{step}"));
            }
        }
        price
    }
}

impl<'a> Problem<'a> {
    /// The problem of an instance with `fragments` fragments, listed; `None` where it has more literals than a
    /// formula may.
    pub fn new(features: &'a Features<'a>, fragments: &'a [u32]) -> Option<Problem<'a>> {
        let instance = features.instance;
        let mut formula = Formula::new(features, fragments, false, Lists::default());
        formula.masks();
        let of_fragments = formula.sink().len();
        let (mut names, mut first) = (Vec::new(), Vec::with_capacity(fragments.len()));
        for &fragment in fragments {
            first.push(names.len() as i32 + 1);
            let masks = instance.allowed(fragment).iter();
            names.extend(masks.map(|mask| format!("f{fragment}m{}", mask + 1)));
        }
        let mut builder = Builder {
            formula,
            names,
            of_edge: FxHashMap::default(),
        };
        let pairs = instance.pairs().map(|pair| {
            let [f, g] = pair[0].map(|fragment| instance.feature_of(fragment));
            (format!("p{f}_{g}"), pair.to_vec())
        });
        let spacings = instance.self_units().map(|edges| {
            let feature = instance.feature_of(edges[0][0]);
            (format!("s{feature}"), edges.to_vec())
        });
        let mut units = Vec::with_capacity(instance.unit_count());
        for (name, edges) in pairs.chain(spacings) {
            units.push(builder.price(name, &Item::Conflict(edges)));
        }
        let mut stitches = Vec::with_capacity(instance.stitches().len());
        for stitch in instance.stitches() {
            let (ends, weight) = ([stitch.a, stitch.b], u64::from(stitch.weight));
            let name = format!("c{}_{}", stitch.a, stitch.b);
            let price = builder.price(name, &Item::Stitch { ends, weight });
            stitches.push((price, weight));
        }
        builder.formula.fits().then(|| Problem {
            features,
            names: builder.names,
            first,
            clauses: builder.formula.into_sink(),
            of_fragments,
            of_edge: builder.of_edge,
            units,
            stitches,
        })
    }

    /// What a conflict weighs in the objective: one more than all stitches.
    pub fn conflict_weight(&self) -> u64 {
        let weights = self.stitches.iter().map(|&(_, weight)| weight);
        weights.sum::<u64>() + 1
    }

    /// The name of a variable.
    pub fn name(&self, variable: i32) -> &str {
        &self.names[variable as usize - 1]
    }

    /// The variables of a fragment, one for each mask that it may take.
    pub fn masks_of(&self, fragment: u32) -> Range<i32> {
        let first = self.first[fragment as usize];
        first..first + self.features.instance.allowed(fragment).len() as i32
    }

    /// The numbers of the constraints "at least one mask" and "at most one mask" of a fragment.
    pub fn one_mask(fragment: u32) -> [u64; 2] {
        let before = 2 * u64::from(fragment);
        [before + 1, before + 2]
    }

    /// How many constraints there are.
    pub fn constraint_count(&self) -> u64 {
        self.number(self.clauses.len()) - 1
    }

    /// The number of a clause by its place.
    fn number(&self, place: usize) -> u64 {
        2 * self.first.len() as u64 + (place - self.of_fragments) as u64 + 1
    }

    /// The price of an item by its edges.
    pub fn price(&self, edges: &[Edge]) -> i32 {
        self.of_edge[&edges[0]].0
    }

    /// The clauses of an edge with their numbers.
    pub fn clauses_of(&self, edge: Edge) -> impl Iterator<Item = (u64, &[i32])> {
        let places = self.of_edge[&edge].1.clone();
        places.map(|place| (self.number(place), self.clauses.get(place)))
    }

    /// The value of each variable under a colouring, at the least price.
    ///
    /// Prices are false and ways along features true unless one of their clauses says otherwise; what defines a
    /// variable comes before what uses it.
    pub fn values(&self, colours: &[Mask]) -> Vec<bool> {
        let mut values = vec![true; self.names.len()];
        for (fragment, &colour) in (0..).zip(colours) {
            let masks = self.features.instance.allowed(fragment).iter();
            for (variable, mask) in self.masks_of(fragment).zip(masks) {
                values[variable as usize - 1] = mask == colour;
            }
        }
        let prices = self.stitches.iter().map(|&(price, _)| price);
        let mut is_price = vec![false; self.names.len()];
        for price in self.units.iter().copied().chain(prices) {
            values[price as usize - 1] = false;
            is_price[price as usize - 1] = true;
        }
        for place in self.of_fragments..self.clauses.len() {
            let clause = self.clauses.get(place);
            let holds = |&lit: &i32| values[lit.unsigned_abs() as usize - 1] == (lit > 0);
            if clause.iter().any(holds) {
                continue;
            }
            let is_price = |&&lit: &&i32| lit > 0 && is_price[lit as usize - 1];
            let change = clause.iter().find(is_price).or(clause.first());
            if let Some(&literal) = change {
                values[literal.unsigned_abs() as usize - 1] = literal > 0;
            }
        }
        values
    }

    /// Writes the problem in OPB, with names as VeriPB allows them.
    ///
    /// # Errors
    /// Those of the writer.
    pub fn write(&self, out: &mut dyn Write) -> io::Result<()> {
        let constraints = self.first.len() + self.clauses.len() - self.of_fragments;
        let variables = self.names.len();
        writeln!(out, "* #variable= {variables} #constraint= {constraints}")?;
        writeln!(
            out,
            "* f3m2: fragment 3 is on mask 2\n\
             * p1_4: some close fragments of features 1 and 4 are on one mask\n\
             * s3_5: fragments 3 and 5 of a feature are on one mask that does not join them\n\
             * r3_5i1, ...: ways along that feature, as format.md says\n\
             * c3_4: fragments 3 and 4 of a feature are on two masks"
        )?;
        write!(out, "min:")?;
        let conflict = self.conflict_weight();
        let units = self.units.iter().map(|&unit| (unit, conflict));
        for (price, weight) in units.chain(self.stitches.iter().copied()) {
            write!(out, " {weight} {}", self.name(price))?;
        }
        writeln!(out, " ;")?;
        for fragment in 0..self.first.len() as u32 {
            for variable in self.masks_of(fragment) {
                write!(out, "1 {} ", self.name(variable))?;
            }
            writeln!(out, "= 1 ;")?;
        }
        for place in self.of_fragments..self.clauses.len() {
            for &literal in self.clauses.get(place) {
                let sign = if literal < 0 { "~" } else { "" };
                write!(out, "1 {sign}{} ", self.name(literal.abs()))?;
            }
            writeln!(out, ">= 1 ;")?;
        }
        Ok(())
    }
}
