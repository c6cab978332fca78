//! The least cost of a set of features, each with a list of ways to be drawn, by plain search: every feature takes
//! each of its ways in turn, and a branch ends where it already costs as much as the best found.

/// (unresolved pairs and features with a violated self-spacing, stitches by weight).
pub type Cost = (u64, u64);

/// A way to draw a feature.
#[derive(Clone, Debug)]
pub struct Way {
    /// What it costs alone.
    pub cost: Cost,
    /// Its parts, by their numbers in the feature, each with its mask.
    pub parts: Vec<(usize, u8)>,
}

/// The features with their ways, and whether part i of a feature is close to part j of another one.
pub struct Problem<'a> {
    pub ways: Vec<Vec<Way>>,
    pub close: &'a dyn Fn(usize, usize, usize, usize) -> bool,
}

impl Problem<'_> {
    /// The least cost below `limit`, if there is any.
    pub fn least_below(mut self, limit: Cost) -> Option<Cost> {
        for ways in &mut self.ways {
            ways.sort_by_key(|way| way.cost);
        }
        let mut best = limit;
        let mut taken = vec![0; self.ways.len()];
        self.extend(0, (0, 0), &mut taken, &mut best);
        (best < limit).then_some(best)
    }

    fn extend(&self, feature: usize, cost: Cost, taken: &mut [usize], best: &mut Cost) {
        if feature == self.ways.len() {
            *best = cost;
            return;
        }
        for (index, way) in self.ways[feature].iter().enumerate() {
            let mut sum = (cost.0 + way.cost.0, cost.1 + way.cost.1);
            if sum >= *best {
                break;
            }
            for (other, &at) in taken[..feature].iter().enumerate() {
                sum.0 += u64::from(self.meet(other, &self.ways[other][at], feature, way));
            }
            if sum < *best {
                taken[feature] = index;
                self.extend(feature + 1, sum, taken, best);
            }
        }
    }

    fn meet(&self, f: usize, a: &Way, g: usize, b: &Way) -> bool {
        (a.parts.iter()).any(|&(i, mask)| {
            let same = b.parts.iter().filter(|part| part.1 == mask);
            same.into_iter().any(|&(j, _)| (self.close)(f, i, g, j))
        })
    }
}
