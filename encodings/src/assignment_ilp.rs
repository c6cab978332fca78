//! The assignment model as an integer linear programme: integer coefficients, 0-1 variables, and the
//! two levels of cost as two objectives.
//!
//! x(f,m) = 1 when fragment f is on mask m, with sum over m of x(f,m) = 1; for each conflict edge and
//! mask x(a,m) + x(b,m) <= 1 + u with one u per unit; for each stitch edge and mask
//! x(a,m) - x(b,m) <= s. (The usual assignment formulation of graph colouring, Mendez-Diaz and Zabala,
//! "A branch-and-cut algorithm for graph coloring", 2006, with units and stitches paid for.)
//! Self-spacings and ties reuse their clauses: a clause is the row "sum of its literals >= 1".
//! Colour precedence is added only where masks are interchangeable ([`crate::symmetry`]).

use crate::colour::{AtMostOne, Colours};
use crate::conflict;
use crate::instance::Instance;
use crate::literal::{ClauseSink, Lit, VarAllocator};
use crate::masks::MaskSet;
use crate::self_spacing::{self, FeatureGraph};
use crate::symmetry;
use crate::ties;

/// How a row compares with its right side.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sense {
    /// Sum of terms at least the right side.
    AtLeast,
    /// Sum of terms equal to the right side.
    Equal,
}

/// One row: sum of coefficient x variable, compared with an integer.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Row {
    /// Variable (from 0) and coefficient.
    pub terms: Vec<(u32, i64)>,
    /// The comparison.
    pub sense: Sense,
    /// The right side.
    pub right: i64,
}

/// The model: all variables are 0 or 1; both objectives are minimised, one after the other.
#[derive(Clone, Debug)]
pub struct AssignmentModel {
    /// How many variables there are.
    pub variables: u32,
    /// The rows.
    pub rows: Vec<Row>,
    /// First objective: unresolved units, each with coefficient 1.
    pub conflicts: Vec<(u32, i64)>,
    /// Second objective: stitches by weight.
    pub stitches: Vec<(u32, i64)>,
    /// The colour literals: variable v of the formula is variable v - 1 of the model.
    pub colours: Colours,
}

#[derive(Default)]
struct Rows {
    variables: u32,
    rows: Vec<Row>,
}

impl VarAllocator for Rows {
    fn fresh(&mut self) -> Lit {
        let lit = Lit::after(self.variables);
        self.variables += 1;
        lit
    }
}

impl ClauseSink for Rows {
    /// A negated literal counts as 1 - x: the constants move to the right side.
    fn clause(&mut self, literals: &[Lit]) {
        let term = |lit: &Lit| (lit.variable() - 1, if lit.is_positive() { 1 } else { -1 });
        let negated = literals.iter().filter(|lit| !lit.is_positive()).count() as i64;
        self.rows.push(Row {
            terms: literals.iter().map(term).collect(),
            sense: Sense::AtLeast,
            right: 1 - negated,
        });
    }
}

impl AssignmentModel {
    /// Encodes an instance.
    pub fn encode(instance: &Instance) -> AssignmentModel {
        let mut rows = Rows::default();
        let count = instance.fragment_count() as u32;
        let allowed = (0..count).map(|f| instance.allowed(f));
        let colours = Colours::encode(instance.masks(), allowed, AtMostOne::Open, &mut rows);
        state_exactly_one(instance, &colours, &mut rows);
        let mut conflicts = Vec::with_capacity(instance.unit_count());
        for edges in instance.pairs() {
            let unit = rows.fresh();
            conflicts.push((unit.variable() - 1, 1));
            for &edge in edges {
                conflict::separate(&colours, edge, Some(unit), &mut rows);
            }
        }
        let graphs = feature_graphs(instance);
        for edges in instance.self_units() {
            let unit = rows.fresh();
            conflicts.push((unit.variable() - 1, 1));
            for &[a, b] in edges {
                if let Some(graph) = graphs.get(instance.feature_of(a) as usize) {
                    self_spacing::encode(&colours, [a, b], graph, Some(unit), &mut rows);
                }
            }
        }
        for tie in instance.ties() {
            ties::encode(&colours, tie, &mut rows);
        }
        let mut stitches = Vec::with_capacity(instance.stitches().len());
        for stitch in instance.stitches() {
            let used = rows.fresh();
            stitches.push((used.variable() - 1, i64::from(stitch.weight)));
            conflict::join(&colours, [stitch.a, stitch.b], used, &mut rows);
        }
        if instance.is_unrestricted() {
            let first: Vec<u32> = (0..count.min(u32::from(instance.masks()))).collect();
            symmetry::precedence(&colours, &first, &mut rows);
        }
        AssignmentModel {
            variables: rows.variables,
            rows: rows.rows,
            conflicts,
            stitches,
            colours,
        }
    }
}

/// The rows "sum over m of x(f,m) = 1" in place of the clauses "at least one"; fragments with two masks
/// have one variable for both and need none.
fn state_exactly_one(instance: &Instance, colours: &Colours, rows: &mut Rows) {
    rows.rows.clear();
    for fragment in 0..instance.fragment_count() as u32 {
        let set: MaskSet = instance.allowed(fragment);
        if set.len() == 2 {
            continue;
        }
        let lits = set.iter().filter_map(|mask| colours.lit(fragment, mask));
        rows.rows.push(Row {
            terms: lits.map(|lit| (lit.variable() - 1, 1)).collect(),
            sense: Sense::Equal,
            right: 1,
        });
    }
}

/// The stitch graph of each feature; empty where no self-spacing asks for it.
pub fn feature_graphs(instance: &Instance) -> Vec<FeatureGraph> {
    if instance.self_spacings().is_empty() {
        return Vec::new();
    }
    let mut graphs: Vec<FeatureGraph> = (0..instance.feature_count() as u32)
        .map(|feature| FeatureGraph {
            fragments: instance.fragments_of(feature).collect(),
            stitches: Vec::new(),
        })
        .collect();
    for stitch in instance.stitches() {
        graphs[instance.feature_of(stitch.a) as usize]
            .stitches
            .push([stitch.a, stitch.b]);
    }
    graphs
}
