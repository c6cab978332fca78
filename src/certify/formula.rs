//! The canonical formula of a statement, clause by clause as `format.md` says.
//!
//! Direct encoding of masks, as in [`encodings::colour`] but with one variable for each fragment and mask;
//! bounded reachability for self-spacings of ring-shaped features; the generalized totalizer of Joshi,
//! Martins and Manquinho, "Generalized totalizer encoding for pseudo-Boolean constraints" (CP 2015) for
//! budgets. Clauses go to a sink as they are made.
//!
//! A formula may also be *guarded*, which the format knows nothing of: then each edge of a resolved unit
//! has a literal that must be false for it to bind, so has each budget, and each item that a budget cannot
//! pay. Solving under assumptions then tells which of them a refutation needs ([`super::cores`]).

use std::ops::Range;

use rustc_hash::FxHashMap;

use encodings::Mask;

use super::features::Features;
use super::statement::{Budget, Item, Statement, is_self_spacing};
use super::ties;
use crate::certificate::{Edge, MOST_LITERALS, Unit};
use crate::solve::refutation::Lists;

/// Takes clauses, in DIMACS numbers.
pub trait Sink {
    /// Adds one clause.
    fn clause(&mut self, literals: &[i32]);
}

impl Sink for Lists {
    fn clause(&mut self, literals: &[i32]) {
        self.push(literals.iter().copied());
    }
}

/// What a guard guards: the part of the statement binds while the literal is false.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Part {
    /// An edge of a resolved unit: its place in the statement.
    Resolved(u32, u32),
    /// An edge of an item that a budget cannot pay: budget, item, edge.
    Unpaid(u32, u32, u32),
    /// A budget.
    Budget(u32),
}

/// Which clauses of a canonical formula say what, numbered from 0.
#[derive(Clone, Debug, Default)]
pub struct Outline {
    /// For each fragment of the formula the clauses about its masks.
    pub masks: Vec<Range<u32>>,
    /// Precedence, ties, resolved units and met bounds.
    pub common: Range<u32>,
    /// The fragments that the common clauses speak of, by their places.
    pub fragments_of_common: Vec<u32>,
    /// The items of the last budget.
    pub items: Vec<Outlined>,
    /// The inner nodes of the counter over them, children before parents, if all have a price of 1.
    pub nodes: Vec<Node>,
}

/// An item of the last budget.
#[derive(Clone, Debug)]
pub struct Outlined {
    /// Its clauses.
    pub clauses: Range<u32>,
    /// The fragments that it speaks of, by their places.
    pub fragments: Vec<u32>,
}

/// An inner node of the counter.
#[derive(Clone, Debug)]
pub struct Node {
    /// The items below it.
    pub items: Range<usize>,
    /// The inner nodes that are its children.
    pub children: Vec<usize>,
    /// The clauses of the counter up to this node.
    pub counter: Range<u32>,
    /// Its outputs, of values 1, 2, ...
    pub outputs: Vec<i32>,
}

/// The formula in the making.
pub struct Formula<'a, S> {
    features: &'a Features<'a>,
    fragments: &'a [u32],
    /// The variable of each fragment's first mask, by its place in `fragments`.
    first: Vec<i32>,
    variables: i32,
    clauses: u32,
    literals: usize,
    guarded: bool,
    /// The guards in the order of their making.
    pub guards: Vec<(i32, Part)>,
    outline: Outline,
    sink: S,
}

/// The canonical formula of a statement; `None` where it has more literals than the format allows.
/// `fragments` are those of the statement.
pub fn canonical(
    features: &Features<'_>,
    fragments: &[u32],
    statement: &Statement,
    precedence: &[u32],
) -> Option<(Lists, Outline)> {
    let mut formula = Formula::new(features, fragments, false, Lists::default());
    formula.write(statement, precedence);
    formula.fits().then_some((formula.sink, formula.outline))
}

impl<'a, S: Sink> Formula<'a, S> {
    /// A formula about `fragments`, ascending.
    pub fn new(
        features: &'a Features<'a>,
        fragments: &'a [u32],
        guarded: bool,
        sink: S,
    ) -> Formula<'a, S> {
        Formula {
            features,
            fragments,
            first: Vec::with_capacity(fragments.len()),
            variables: 0,
            clauses: 0,
            literals: 0,
            guarded,
            guards: Vec::new(),
            outline: Outline::default(),
            sink,
        }
    }

    /// Whether it has no more literals than the format allows. Beyond them, nothing is written.
    pub fn fits(&self) -> bool {
        self.literals <= MOST_LITERALS
    }

    /// What takes the clauses.
    pub fn sink(&self) -> &S {
        &self.sink
    }

    /// How many variables there are.
    pub fn variables(&self) -> i32 {
        self.variables
    }

    /// What took the clauses.
    pub fn into_sink(self) -> S {
        self.sink
    }

    /// Writes all of it.
    pub fn write(&mut self, statement: &Statement, precedence: &[u32]) {
        self.masks();
        let start = self.clauses;
        self.precedence(precedence);
        let tied = self.ties();
        for (i, unit) in (0..).zip(&statement.resolved) {
            self.hard_unit(unit, |edge| Part::Resolved(i, edge));
        }
        let Some((own, met)) = statement.budgets.split_last() else {
            return;
        };
        for (i, budget) in (0..).zip(met) {
            self.budget(i, budget);
        }
        let common = Statement {
            resolved: statement.resolved.clone(),
            budgets: met.to_vec(),
            with: tied,
        };
        self.outline.fragments_of_common = self.places(common.fragments(self.features));
        self.outline.common = start..self.clauses;
        (self.outline.items, self.outline.nodes) = (Vec::new(), Vec::new());
        self.budget(met.len() as u32, own);
        if own.items.iter().any(|item| item.weight() != 1) {
            self.outline.nodes.clear();
        }
    }

    /// The ties among the fragments, which nothing guards; gives the fragments that they name.
    fn ties(&mut self) -> Vec<u32> {
        let ties = ties::among(self.features, self.fragments);
        let guarded = std::mem::take(&mut self.guarded);
        for &ends in &ties.same {
            self.stitch(ends, None);
        }
        for &ends in &ties.different {
            self.conflict_edge(ends, None);
        }
        for budget in &ties.budgets {
            self.budget(0, budget);
        }
        self.guarded = guarded;
        ties.fragments().collect()
    }

    /// The places of some fragments.
    fn places(&self, fragments: Vec<u32>) -> Vec<u32> {
        let place = |fragment: &u32| self.fragments.binary_search(fragment).ok();
        let places = fragments.iter().filter_map(place);
        places.map(|place| place as u32).collect()
    }

    /// A variable that nothing speaks of yet.
    pub fn fresh(&mut self) -> i32 {
        self.variables += 1;
        self.variables
    }

    fn clause(&mut self, literals: &[i32]) {
        self.literals += literals.len();
        self.clauses += 1;
        if self.fits() {
            self.sink.clause(literals);
        }
    }

    /// "The fragment is on the mask"; `None` where it may not be.
    fn on(&self, fragment: u32, mask: Mask) -> Option<i32> {
        let at = self.fragments.binary_search(&fragment).ok()?;
        let allowed = self.features.instance.allowed(fragment);
        let before = allowed.bits() & ((1u16 << mask) - 1) as u8;
        allowed
            .contains(mask)
            .then(|| self.first[at] + before.count_ones() as i32)
    }

    /// Both literals, where both fragments may take the mask.
    fn both(&self, [a, b]: Edge, mask: Mask) -> Option<[i32; 2]> {
        Some([self.on(a, mask)?, self.on(b, mask)?])
    }

    fn all_masks(&self) -> std::ops::Range<Mask> {
        0..self.features.instance.masks()
    }

    /// A variable for each fragment and mask, and the clauses that make it one mask a fragment.
    pub fn masks(&mut self) {
        for &fragment in self.fragments {
            let count = self.features.instance.allowed(fragment).len() as i32;
            self.first.push(self.variables + 1);
            self.variables += count;
        }
        for at in 0..self.fragments.len() {
            let count = self.features.instance.allowed(self.fragments[at]).len() as i32;
            let own: Vec<i32> = (0..count).map(|i| self.first[at] + i).collect();
            let start = self.clauses;
            self.clause(&own);
            for (i, &a) in own.iter().enumerate() {
                for &b in &own[i + 1..] {
                    self.clause(&[-a, -b]);
                }
            }
            self.outline.masks.push(start..self.clauses);
        }
    }

    fn precedence(&mut self, listed: &[u32]) {
        for (i, &fragment) in (1..).zip(listed) {
            for mask in i..self.features.instance.masks() {
                if let Some(on) = self.on(fragment, mask) {
                    self.clause(&[-on]);
                }
            }
        }
    }

    fn guard(&mut self, part: Part) -> Option<i32> {
        self.guarded.then(|| {
            let guard = self.fresh();
            self.guards.push((guard, part));
            guard
        })
    }

    /// A unit that must be resolved; guarded edge by edge.
    fn hard_unit(&mut self, unit: &Unit, part: impl Fn(u32) -> Part) {
        for (i, &edge) in (0..).zip(unit) {
            let guard = self.guard(part(i));
            self.conflict_edge(edge, guard);
        }
    }

    fn conflict_edge(&mut self, edge: Edge, price: Option<i32>) {
        if is_self_spacing(self.features, edge) {
            self.self_spacing(edge, price);
            return;
        }
        for mask in self.all_masks() {
            if let Some([a, b]) = self.both(edge, mask) {
                self.clause_of(&[-a, -b], [price]);
            }
        }
    }

    /// A clause of some literals and those of `more` that exist.
    fn clause_of<const N: usize>(&mut self, literals: &[i32], more: [Option<i32>; N]) {
        let mut clause = literals.to_vec();
        clause.extend(more.into_iter().flatten());
        self.clause(&clause);
    }

    fn stitch(&mut self, [a, b]: Edge, price: Option<i32>) {
        for mask in self.all_masks() {
            let (a, b) = (self.on(a, mask), self.on(b, mask));
            for (from, to) in [(a, b), (b, a)] {
                if let Some(from) = from {
                    self.clause_of(&[-from], [to, price]);
                }
            }
        }
    }

    /// The clauses of a violated item: "resolved", or the price where there is one.
    pub fn violated(&mut self, item: &Item, price: Option<i32>) {
        match item {
            Item::Conflict(unit) => unit
                .iter()
                .for_each(|&edge| self.conflict_edge(edge, price)),
            Item::Stitch { ends, .. } => self.stitch(*ends, price),
        }
    }

    fn self_spacing(&mut self, edge: Edge, price: Option<i32>) {
        let feature = self.features.instance.feature_of(edge[0]);
        if self.features.is_tree(feature) {
            let path = self.features.path(edge);
            for mask in self.all_masks() {
                if let Some([a, b]) = self.both(edge, mask) {
                    for &inner in &path {
                        let inner = self.on(inner, mask);
                        self.clause_of(&[-a, -b], [inner, price]);
                    }
                }
            }
            return;
        }
        let reached = self.reached(edge);
        for mask in self.all_masks() {
            if let Some([a, b]) = self.both(edge, mask) {
                self.clause_of(&[-a, -b], [reached, price]);
            }
        }
    }

    /// "b is reached from a in n - 1 steps on the mask of a", with its definition.
    fn reached(&mut self, [a, b]: Edge) -> Option<i32> {
        let features = self.features;
        let fragments = features
            .instance
            .fragments_of(features.instance.feature_of(a));
        let far = features.distances(a);
        // r(t, f) of the step before, by the place of f in the feature.
        let mut before: Vec<Option<i32>> = vec![None; fragments.len()];
        for steps in 1..fragments.len() as u32 {
            let mut now = vec![None; fragments.len()];
            for f in fragments.clone().filter(|&f| f != a) {
                let at = (f - fragments.start) as usize;
                if far[at] <= steps {
                    let reached = self.fresh();
                    now[at] = Some(reached);
                    self.reached_by(reached, [a, f], &before, fragments.start);
                }
            }
            before = now;
        }
        before[(b - fragments.start) as usize]
    }

    fn reached_by(&mut self, reached: i32, [a, f]: Edge, before: &[Option<i32>], first: u32) {
        let neighbours = self.features.neighbours(f);
        if neighbours.binary_search(&a).is_err() {
            let mut sources: Vec<u32> = neighbours.to_vec();
            sources.push(f);
            sources.sort_unstable();
            let mut clause = vec![-reached];
            let at = |&g: &u32| before[(g - first) as usize];
            clause.extend(sources.iter().filter_map(at));
            self.clause(&clause);
        }
        for mask in self.all_masks() {
            if let Some(from) = self.on(a, mask) {
                let to = self.on(f, mask);
                self.clause_of(&[-reached, -from], [to]);
            }
        }
    }

    fn budget(&mut self, number: u32, budget: &Budget) {
        let mut prices: Vec<(i32, u64)> = Vec::new();
        for (i, item) in (0..).zip(&budget.items) {
            if item.weight() <= budget.most {
                let price = self.fresh();
                let start = self.clauses;
                self.violated(item, Some(price));
                prices.push((price, item.weight()));
                let fragments = self.places(item.fragments(self.features));
                let clauses = start..self.clauses;
                self.outline.items.push(Outlined { clauses, fragments });
                continue;
            }
            match item {
                Item::Conflict(unit) => {
                    self.hard_unit(unit, |edge| Part::Unpaid(number, i, edge));
                }
                Item::Stitch { ends, .. } => {
                    let guard = self.guard(Part::Unpaid(number, i, 0));
                    self.stitch(*ends, guard);
                }
            }
        }
        if prices.iter().map(|&(_, weight)| weight).sum::<u64>() > budget.most {
            let guard = self.guard(Part::Budget(number));
            self.counter(&prices, 0, budget.most, guard);
        }
    }

    /// Writes the counter over some prices; returns its outputs and their values, ascending. As deep as
    /// the logarithm of their number. The first one has the place `from` among the items.
    fn counter(
        &mut self,
        prices: &[(i32, u64)],
        from: usize,
        most: u64,
        guard: Option<i32>,
    ) -> Vec<(i32, u64)> {
        if prices.len() < 2 {
            return prices.to_vec();
        }
        let (start, items) = (self.clauses, from..from + prices.len());
        let (left, right) = prices.split_at(prices.len() / 2);
        let mut children = Vec::new();
        let mut outputs_of = |formula: &mut Self, part: &[(i32, u64)], from: usize| {
            let outputs = formula.counter(part, from, most, guard);
            if part.len() > 1 {
                children.push(formula.outline.nodes.len() - 1);
            }
            outputs
        };
        let behind = from + left.len();
        let mut left = outputs_of(self, left, from);
        let mut right = outputs_of(self, right, behind);
        left.insert(0, (0, 0));
        right.insert(0, (0, 0));
        let sums = left.iter().flat_map(|x| right.iter().map(|y| x.1 + y.1));
        let mut values: Vec<u64> = sums.filter(|sum| (1..=most).contains(sum)).collect();
        values.sort_unstable();
        values.dedup();
        let outputs: Vec<(i32, u64)> = values.iter().map(|&v| (self.fresh(), v)).collect();
        let output: FxHashMap<u64, i32> = outputs.iter().map(|&(lit, v)| (v, lit)).collect();
        for &(x, low) in &left {
            for &(y, high) in &right {
                if low + high == 0 {
                    continue;
                }
                let inputs: Vec<i32> = [x, y].into_iter().filter(|&lit| lit != 0).collect();
                let inputs: Vec<i32> = inputs.into_iter().map(|lit| -lit).collect();
                match output.get(&(low + high)) {
                    Some(&output) => self.clause_of(&inputs, [Some(output)]),
                    None => self.clause_of(&inputs, [guard]),
                }
            }
        }
        self.outline.nodes.push(Node {
            items,
            children,
            counter: start..self.clauses,
            outputs: outputs.iter().map(|&(lit, _)| lit).collect(),
        });
        outputs
    }
}
