//! What the audit derives from a layer, against what the extraction gives: the two share no method. Random layouts, the
//! routed block, and certificates that say what is not so.
#![allow(clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod common;

use common::certified::certificate;
use encodings::Instance;
use maskproof::audit::layer::derive;
use maskproof::audit::problem::Tie;
use maskproof::audit::{Problem, Rejection, Step, problem};
use maskproof::certificate::{Certificate, Cut, Rules as Subject, SplitFeature};
use maskproof::extract::{Extraction, extract};
use maskproof::formats::gdsii;
use maskproof::geometry::{COORDINATE_LIMIT, Point, Rect};
use maskproof::layout::{
    KeepOut, LayerId, Layout, Metric, Policy, Rules, Shape, Shapes, StitchRules, WideSpacing,
};
use rand::seq::SliceRandom;
use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

const LAYER: LayerId = LayerId {
    layer: 1,
    datatype: 0,
};

fn rules(spacing: i32, stitch: StitchRules) -> Rules {
    Rules {
        layer: LAYER,
        masks: 3,
        spacing,
        stitch,
        spacings: Default::default(),
        hand: Default::default(),
    }
}

fn layout(shapes: Shapes) -> Layout {
    Layout {
        top: "top".into(),
        layer: LAYER,
        unit_pm: 1000,
        shapes,
        fixed: Vec::new(),
        keep_outs: Vec::new(),
    }
}

fn stitch(policy: Policy, overlap: i32, fragment_length: i32, corner: i32) -> StitchRules {
    StitchRules {
        policy,
        overlap,
        fragment_length,
        corner,
        weight: 3,
        ..StitchRules::default()
    }
}

/// The problem of an instance, whose feature f and fragment i are those of number `feature[f]` and `fragment[i]`.
fn renumbered(instance: &Instance, feature: &[u32], fragment: &[u32]) -> Problem {
    let edge = |[a, b]: [u32; 2]| {
        let [a, b] = [fragment[a as usize], fragment[b as usize]];
        [a.min(b), a.max(b)]
    };
    let edges = instance.edges().iter().chain(instance.self_spacings());
    let mut close: Vec<[u32; 2]> = edges.map(|&ends| edge(ends)).collect();
    close.sort_unstable();
    let mut stitches: Vec<problem::Stitch> = (instance.stitches().iter())
        .map(|stitch| problem::Stitch {
            ends: edge([stitch.a, stitch.b]),
            weight: stitch.weight,
        })
        .collect();
    stitches.sort_unstable();
    let mut sizes = vec![0; instance.feature_count()];
    for f in 0..instance.feature_count() as u32 {
        sizes[feature[f as usize] as usize] = instance.fragments_of(f).len() as u32;
    }
    let mut feature_start = vec![0];
    for size in sizes {
        feature_start.push(feature_start.last().unwrap() + size);
    }
    let masks = instance.masks();
    let mut allowed = vec![0; instance.fragment_count()];
    for i in 0..instance.fragment_count() as u32 {
        let own = instance.allowed(i);
        let bits = (0..masks).filter(|&mask| own.contains(mask));
        allowed[fragment[i as usize] as usize] = bits.map(|mask| 1 << mask).sum();
    }
    Problem {
        ties: ties(instance, &edge),
        masks,
        feature_start,
        allowed,
        close,
        stitches,
    }
}

/// The ties, renumbered. Those of features that share a mask are replaced by all pairs that follow, since sets may be told by few pairs.
fn ties(instance: &Instance, edge: &impl Fn([u32; 2]) -> [u32; 2]) -> Vec<Tie> {
    let tie = |tie: &encodings::Tie| match tie {
        encodings::Tie::Same(ends) => Tie::Same(edge(*ends)),
        encodings::Tie::Different(ends) => Tie::Different(edge(*ends)),
        encodings::Tie::AtMost { most, stitches } => {
            let stitch = |stitch: &encodings::Stitch| problem::Stitch {
                ends: edge([stitch.a, stitch.b]),
                weight: stitch.weight,
            };
            let mut stitches: Vec<problem::Stitch> = stitches.iter().map(stitch).collect();
            stitches.sort_unstable();
            let most = u64::from(*most);
            Tie::AtMost { most, stitches }
        }
    };
    closed(instance.ties().iter().map(tie).collect())
}

fn closed(mut ties: Vec<Tie>) -> Vec<Tie> {
    let mut again = true;
    while std::mem::take(&mut again) {
        ties.sort_by_key(|tie| (tie.first(), tie.clone()));
        ties.dedup();
        let same: Vec<[u32; 2]> = (ties.iter())
            .filter_map(|tie| match tie {
                Tie::Same(ends) => Some(*ends),
                _ => None,
            })
            .collect();
        for one in &same {
            for other in same.iter().filter(|other| *other != one) {
                let shared = one.iter().find(|end| other.contains(end));
                let mut ends: Vec<u32> = one.iter().chain(other).copied().collect();
                ends.retain(|end| Some(end) != shared);
                if let [a, b] = ends[..] {
                    let tie = Tie::Same([a.min(b), a.max(b)]);
                    if !ties.contains(&tie) {
                        ties.push(tie);
                        again = true;
                    }
                }
            }
        }
    }
    ties
}

/// Shuffles the features of a certificate and the fragments of each; gives their new numbers.
fn shuffle(
    certificate: &mut Certificate,
    instance: &Instance,
    rng: &mut Pcg64Mcg,
) -> (Vec<u32>, Vec<u32>) {
    let count = instance.feature_count();
    let mut order: Vec<u32> = (0..count as u32).collect();
    order.shuffle(rng);
    let points = certificate.features.clone();
    let mut feature = vec![0; count];
    let mut fragment = vec![0; instance.fragment_count()];
    let mut start = 0;
    let mut split: Vec<SplitFeature> = Vec::new();
    for (new, &old) in (0u32..).zip(&order) {
        certificate.features[new as usize] = points[old as usize];
        feature[old as usize] = new;
        let own = instance.fragments_of(old);
        let mut local: Vec<u32> = (0..own.len() as u32).collect();
        local.shuffle(rng);
        for (i, number) in own.clone().zip(&local) {
            fragment[i as usize] = start + number;
        }
        start += own.len() as u32;
        if let Some(one) = certificate.split.iter().find(|one| one.feature == old) {
            let mut one = one.clone();
            one.feature = new;
            for cut in &mut one.cuts {
                cut.sides = cut.sides.map(|side| local[side as usize]);
            }
            one.cuts.shuffle(rng);
            split.push(one);
        }
    }
    certificate.split = split;
    (feature, fragment)
}

/// Holds the audit against the extraction, as numbered there and in a random order.
fn check(layout: &Layout, rules: &Rules, seed: u64) -> Extraction {
    let found = extract(layout, rules, &|_| ()).unwrap();
    let mut certificate = certificate(layout, rules, &found);
    let instance = &found.instance;
    let same: Vec<u32> = (0..instance.fragment_count() as u32).collect();
    let expected = renumbered(instance, &same, &same);
    let derive = |certificate: &Certificate| {
        let mut derived = derive(layout, rules, certificate)?;
        derived.ties = closed(derived.ties);
        Ok(derived)
    };
    let derived: Result<Problem, Rejection> = derive(&certificate);
    assert!(
        derived.as_ref() == Ok(&expected),
        "seed {seed}: {rules:?}\n{:?}\nderived {derived:?}\nextracted {expected:?}",
        layout.shapes
    );
    let rng = &mut Pcg64Mcg::seed_from_u64(seed);
    let (feature, fragment) = shuffle(&mut certificate, instance, rng);
    let expected = renumbered(instance, &feature, &fragment);
    assert_eq!(derive(&certificate), Ok(expected), "shuffled, seed {seed}");
    found
}

fn routed(layer: u16, datatype: u16) -> Layout {
    let bytes = include_bytes!("data/routed_sky130.gds");
    let id = LayerId { layer, datatype };
    gdsii::read(bytes, &gdsii::Request::new("routed_sky130.gds", id)).unwrap()
}

/// The ten rows of the README's table, with and without stitches, and the other layers of the block.
#[test]
fn the_routed_block_is_derived_as_it_is_extracted() {
    let mut cuts = 0;
    for (layer, datatype, spacing, masks) in [
        (67, 20, 180, 3),
        (67, 20, 250, 3),
        (67, 20, 340, 3),
        (67, 20, 250, 2),
        (67, 20, 500, 4),
        (68, 20, 500, 2),
        (68, 20, 500, 3),
        (66, 44, 400, 3),
        (66, 44, 500, 3),
        (67, 44, 600, 2),
        (68, 44, 500, 2),
        (69, 20, 700, 2),
        (69, 44, 700, 3),
        (70, 20, 900, 2),
    ] {
        let layout = routed(layer, datatype);
        for policy in [Policy::None, Policy::Uncovered] {
            let rules = Rules {
                layer: layout.layer,
                masks,
                spacing,
                stitch: StitchRules {
                    weight: 1,
                    ..stitch(policy, 40, 100, 20)
                },
                spacings: Default::default(),
                hand: Default::default(),
            };
            cuts += check(&layout, &rules, spacing as u64)
                .fragments
                .cuts()
                .len();
        }
    }
    assert!(cuts > 500, "{cuts} cuts");
}

type Outline = Vec<(i32, i32)>;

fn rect([x0, y0, x1, y1]: [i32; 4]) -> Outline {
    vec![(x0, y0), (x1, y0), (x1, y1), (x0, y1)]
}

/// Random shapes of many kinds in a square of the given size.
struct Random {
    rng: Pcg64Mcg,
    size: i32,
}

impl Random {
    fn to(&mut self, end: i32) -> i32 {
        self.rng.random_range(0..end.max(1))
    }

    fn corner(&mut self) -> (i32, i32) {
        (self.to(self.size), self.to(self.size))
    }

    fn block(&mut self) -> Outline {
        let (x, y) = self.corner();
        let (w, h) = (1 + self.to(9), 1 + self.to(9));
        rect([x, y, x + w, y + h])
    }

    /// A wire, long one way.
    fn wire(&mut self) -> Outline {
        let (x, y) = self.corner();
        let (long, wide) = (10 + self.to(self.size), 2 + self.to(3));
        match self.rng.random() {
            true => rect([x, y, x + long, y + wide]),
            false => rect([x, y, x + wide, y + long]),
        }
    }

    /// A walk along the axes, that crosses, retraces and repeats itself as it comes.
    fn walk(&mut self) -> Outline {
        let (x, y) = self.corner();
        let reach = 2 + self.to(20);
        let (mut px, mut py) = (self.to(reach), self.to(reach));
        let start = (px, py);
        let mut outline = Vec::new();
        for _ in 0..1 + self.to(6) {
            outline.push((px, py));
            px = self.to(reach);
            outline.push((px, py));
            py = self.to(reach);
        }
        outline.push((px, py));
        outline.push((start.0, py));
        outline.iter().map(|&(px, py)| (x + px, y + py)).collect()
    }

    /// A ring, as an outline with a keyhole or as a spine with both its rims.
    fn keyhole(&mut self) -> Outline {
        let (x, y) = self.corner();
        let (s, w) = (8 + self.to(30), 2 + self.to(2));
        let (x1, y1) = (x + s, y + s);
        let mut outline = rect([x, y, x1, y1]);
        outline.push((x, y));
        outline.extend([(x, y + w), (x + w, y + w), (x + w, y1 - w)]);
        outline.extend([(x1 - w, y1 - w), (x1 - w, y + w), (x, y + w)]);
        outline
    }

    /// A spine with teeth.
    fn comb(&mut self) -> Vec<Outline> {
        let (x, y) = self.corner();
        let (teeth, pitch) = (1 + self.to(5), 5 + self.to(8));
        let turned = self.rng.random();
        let mut outlines = vec![rect([x, y, x + teeth * pitch, y + 3])];
        for tooth in 0..teeth {
            let at = x + tooth * pitch + self.to(pitch);
            outlines.push(rect([at, y + self.to(4), at + 2, y + 4 + self.to(25)]));
        }
        if turned {
            for point in outlines.iter_mut().flatten() {
                *point = (point.1, point.0);
            }
        }
        outlines
    }

    /// Any polygon at all, of few vertices.
    fn polygon(&mut self) -> Outline {
        let (x, y) = self.corner();
        let reach = 2 + self.to(16);
        let vertices = 3 + self.to(4);
        (0..vertices)
            .map(|_| (x + self.to(reach), y + self.to(reach)))
            .collect()
    }

    /// A rectangle with lines of no width that stick out of it, some of them slanted.
    fn spiked(&mut self) -> Outline {
        let mut outline = self.block();
        for _ in 0..1 + self.to(2) {
            let at = self.rng.random_range(1..outline.len());
            let (x, y) = outline[at];
            let d = 1 + self.to(6);
            let tip = [(x + d, y), (x, y - d), (x - d, y), (x + d, y + 1)][self.to(4) as usize];
            outline.insert(at, tip);
            outline.insert(at, (x, y));
        }
        outline
    }

    fn shapes(&mut self, slanted: bool) -> Vec<Outline> {
        let mut outlines: Vec<Outline> = Vec::new();
        let count = 1 + self.to(14);
        let kinds = if slanted { 9 } else { 7 };
        let wires_only = self.rng.random_bool(0.3);
        while (outlines.len() as i32) < count {
            let kind = self.to(if wires_only { 3 } else { kinds });
            match kind {
                0..=2 => outlines.push(self.wire()),
                3 => outlines.push(self.block()),
                4 => outlines.push(self.walk()),
                5 => outlines.push(self.keyhole()),
                6 => outlines.extend(self.comb()),
                7 => outlines.push(self.polygon()),
                _ => outlines.push(self.spiked()),
            }
            if self.rng.random_bool(0.1) {
                let again = outlines[self.to(outlines.len() as i32) as usize].clone();
                outlines.push(again);
            }
        }
        outlines
    }

    fn rules(&mut self) -> Rules {
        let policy = match self.to(5) {
            0 => Policy::None,
            _ => Policy::Uncovered,
        };
        let (overlap, length) = (2 * self.to(3), self.to(9));
        let corner = self.to(4);
        let mut rules = rules(1 + self.to(12), stitch(policy, overlap, length, corner));
        rules.masks = 1 + self.to(8) as u8;
        rules
    }
}

impl Random {
    fn spacings(&mut self, rules: &mut Rules) {
        let most = 3 + self.to(9);
        let spacings = &mut rules.spacings;
        if self.rng.random() {
            spacings.metric = Metric::Square;
        }
        spacings.end_length = self.to(8);
        for kind in [
            &mut spacings.side_to_side,
            &mut spacings.side_to_end,
            &mut spacings.end_to_end,
            &mut spacings.corner_to_corner,
        ] {
            *kind = self.rng.random_bool(0.5).then(|| 1 + self.to(most));
        }
        let rows = self.to(3);
        spacings.wide = (0..rows)
            .map(|_| WideSpacing {
                width: 1 + self.to(8),
                run_length: self.to(12),
                spacing: 1 + self.to(most + 3),
            })
            .collect();
    }
}

fn shapes_of(outlines: &[Outline]) -> Shapes {
    let mut shapes = Shapes::default();
    for outline in outlines {
        let points: Vec<Point> = outline.iter().map(|&(x, y)| Point::new(x, y)).collect();
        shapes.push_polygon(&points);
    }
    shapes
}

/// Derives `rounds` random layouts; returns how many cuts, self-spacings and features that cannot be cut there were.
fn random(rounds: u64, slanted: bool) -> [usize; 3] {
    let mut seen = [0; 3];
    for seed in 0..rounds {
        let rng = Pcg64Mcg::seed_from_u64(seed * 2 + u64::from(slanted));
        let mut random = Random { rng, size: 40 };
        random.size = [10, 30, 60][random.to(3) as usize];
        let layout = layout(shapes_of(&random.shapes(slanted)));
        let rules = random.rules();
        let found = check(&layout, &rules, seed);
        let counts = [
            found.fragments.cuts().len(),
            found.instance.self_spacings().len(),
            found.unstitchable.len(),
        ];
        seen = [0, 1, 2].map(|i| seen[i] + counts[i]);
    }
    seen
}

/// The same with spacings by kind, in either metric.
fn random_spacings(rounds: u64, slanted: bool) -> [usize; 3] {
    let mut seen = [0; 3];
    for seed in 0..rounds {
        let rng = Pcg64Mcg::seed_from_u64(seed * 4 + 2 + u64::from(slanted));
        let mut random = Random { rng, size: 40 };
        random.size = [10, 30, 60][random.to(3) as usize];
        let layout = layout(shapes_of(&random.shapes(slanted)));
        let mut rules = random.rules();
        random.spacings(&mut rules);
        let found = check(&layout, &rules, seed);
        let counts = [
            found.fragments.cuts().len(),
            found.instance.self_spacings().len(),
            found.instance.edges().len(),
        ];
        seen = [0, 1, 2].map(|i| seen[i] + counts[i]);
    }
    seen
}

#[test]
fn random_layouts_with_many_spacings_are_derived_as_they_are_extracted() {
    for slanted in [false, true] {
        let seen = random_spacings(4_000, slanted);
        assert!(seen.iter().all(|&count| count > 300), "{seen:?}");
    }
}

/// The same under every stitch policy, with keep-outs, a limit of stitches and masks decided by hand; half of them
/// with spacings by kind. Returns how many cuts, ties and restricted fragments there were.
fn random_policies(rounds: u64) -> [usize; 3] {
    let mut seen = [0; 3];
    for seed in 0..rounds {
        let rng = Pcg64Mcg::seed_from_u64(seed * 4 + 1);
        let mut random = Random { rng, size: 40 };
        random.size = [10, 30, 60][random.to(3) as usize];
        let mut layout = layout(shapes_of(&random.shapes(seed % 3 == 0)));
        let mut rules = random.rules();
        rules.masks = 2 + random.to(4) as u8;
        if random.rng.random() {
            random.spacings(&mut rules);
        }
        rules.stitch.policy = [Policy::Uncovered, Policy::EveryInterval][random.to(2) as usize];
        rules.stitch.most_per_feature = random.rng.random_bool(0.3).then(|| random.to(3) as u32);
        if random.rng.random() {
            let layer = LayerId {
                layer: 9,
                datatype: 0,
            };
            let distance = random.to(4);
            rules.stitch.keep_outs = vec![KeepOut { layer, distance }];
            layout.keep_outs = vec![(layer, shapes_of(&random.shapes(false)))];
        }
        random.hand(&layout, &mut rules);
        // Those that contradict themselves are refused before anything is derived.
        if extract(&layout, &rules, &|_| ()).is_err() {
            continue;
        }
        let found = check(&layout, &rules, seed);
        let all = found.instance.masks();
        let restricted = (0..found.instance.fragment_count() as u32)
            .filter(|&f| found.instance.allowed(f).len() < u32::from(all));
        let counts = [
            found.fragments.cuts().len(),
            found.instance.ties().len(),
            restricted.count(),
        ];
        seen = [0, 1, 2].map(|i| seen[i] + counts[i]);
    }
    seen
}

impl Random {
    /// Decides some features by hand, at the first points of their shapes.
    fn hand(&mut self, layout: &Layout, rules: &mut Rules) {
        let count = layout.shapes.len() as i32;
        let mut point = || match layout.shapes.get(self.to(count) as u32) {
            Shape::Rect(rect) => rect.min,
            Shape::Polygon(vertices) => vertices[0],
        };
        let points = [point(), point(), point(), point(), point()];
        let mask = self.to(i32::from(rules.masks)) as u8;
        match self.to(6) {
            0 => rules.hand.fixed = vec![(points[0], mask)],
            1 => rules.hand.same = vec![points[..2].to_vec()],
            2 => rules.hand.different = vec![points[..2].to_vec()],
            3 => {
                rules.hand.fixed = vec![(points[0], mask)];
                rules.hand.same = vec![points[1..4].to_vec()];
                rules.hand.different = vec![vec![points[1], points[4]]];
            }
            _ => {}
        }
    }
}

#[test]
fn random_layouts_under_every_policy_are_derived_as_they_are_extracted() {
    let seen = random_policies(4_000);
    assert!(seen.iter().all(|&count| count > 300), "{seen:?}");
}

#[test]
fn random_layouts_along_the_axes_are_derived_as_they_are_extracted() {
    let seen = random(6_000, false);
    assert!(seen[0] > 3_000 && seen[1] > 300, "{seen:?}");
}

#[test]
fn random_layouts_at_any_angle_are_derived_as_they_are_extracted() {
    let seen = random(6_000, true);
    assert!(seen.iter().all(|&count| count > 300), "{seen:?}");
}

/// A wire between neighbours, with candidates at x = 75 and x = 135; a ring by itself, with four; one that its
/// neighbours leave a single place, which separates nothing.
fn example() -> (Layout, Rules) {
    let mut rects = vec![
        Rect::new(0, 0, 200, 10),
        Rect::new(0, 14, 60, 24),
        Rect::new(90, 14, 120, 24),
        Rect::new(150, 14, 200, 24),
        Rect::new(488, 5, 498, 55),
        Rect::new(505, 62, 555, 72),
        Rect::new(562, 5, 572, 55),
    ];
    for (x, side) in [(300, 100), (500, 60)] {
        let (x1, inner) = (x + side, side - 10);
        rects.extend([Rect::new(x, 0, x1, 10), Rect::new(x, inner, x1, side)]);
        rects.extend([
            Rect::new(x, 0, x + 10, side),
            Rect::new(x + inner, 0, x1, side),
        ]);
    }
    let mut shapes = Shapes::default();
    rects.into_iter().for_each(|rect| shapes.push_rect(rect));
    let rules = rules(5, stitch(Policy::Uncovered, 8, 20, 6));
    (layout(shapes), rules)
}

/// What the audit says to a changed certificate of the example.
fn changed(change: impl FnOnce(&mut Certificate, Wire)) -> Rejection {
    let (layout, rules) = example();
    let found = extract(&layout, &rules, &|_| ()).unwrap();
    let mut certificate = certificate(&layout, &rules, &found);
    derive(&layout, &rules, &certificate).unwrap();
    let at = |point| {
        certificate
            .features
            .iter()
            .position(|&p| p == point)
            .unwrap()
    };
    let split = |point| {
        let feature = at(point) as u32;
        certificate
            .split
            .iter()
            .position(|split| split.feature == feature)
            .unwrap()
    };
    let places = Wire {
        feature: at([0, 0]),
        wire: split([0, 0]),
        ring: split([300, 0]),
        lone: at([500, 0]) as u32,
    };
    change(&mut certificate, places);
    derive(&layout, &rules, &certificate).unwrap_err()
}

/// Where the example's certificate has its parts.
struct Wire {
    /// The wire among the features.
    feature: usize,
    /// The wire and the ring among those that are cut.
    wire: usize,
    ring: usize,
    /// The feature that is the ring with one place.
    lone: u32,
}

fn cut(x: i32, sides: [u32; 2]) -> Cut {
    Cut {
        line: [x, 0, x, 10],
        sides,
    }
}

#[track_caller]
fn assert_rejected(rejection: &Rejection, step: Step, reason: &str) {
    assert_eq!(rejection.step, step, "{rejection}");
    assert!(
        rejection.reason.contains(reason),
        "{rejection}\nshould say {reason}"
    );
}

#[test]
fn features_that_are_not_those_of_the_layer() {
    let moved = changed(|it, at| it.features[at.feature] = [1, 0]);
    let reason = "is said to begin at (1, 0): no feature of the layer has its smallest point there";
    assert_rejected(&moved, Step::Features, reason);
    let missing = changed(|it, at| {
        it.features.remove(at.feature);
    });
    let reason =
        "the feature that begins at (0, 0) is not listed: the layer has 9 features, 8 are listed";
    assert_rejected(&missing, Step::Features, reason);
    let doubled = changed(|it, at| it.features.push(it.features[at.feature]));
    let reason = "and 9 are both said to begin at (0, 0): each is listed once";
    assert_rejected(&doubled, Step::Features, reason);
    let far = changed(|it, _| it.features.push([i32::MIN, i32::MAX]));
    assert_rejected(&far, Step::Features, "no feature of the layer");
}

#[test]
fn cuts_that_are_no_candidates() {
    let moved = changed(|it, at| it.split[at.wire].cuts[0].line = [76, 0, 76, 10]);
    let reason = "which begins at (0, 0): no cut is allowed at (76, 0) to (76, 10): the policy places none there on the run \
                  from (0, 0) to (200, 10), or it separates nothing";
    assert_rejected(&moved, Step::Stitches, reason);
    let added = |cut: Cut| {
        changed(move |it, at| {
            it.split[at.wire].cuts.push(cut);
            it.split[at.wire].fragments += 1;
        })
    };
    let reason = "no cut is allowed at (100, 0) to (100, 10): the policy places none there";
    assert_rejected(&added(cut(100, [2, 3])), Step::Stitches, reason);
    let reason = "it is 10 from the line end at (0, 0), at least 20 is needed";
    assert_rejected(&added(cut(10, [3, 0])), Step::Stitches, reason);
    let reason = "it does not cross a straight run from one side to the other";
    for line in [
        [100, 0, 100, 9],
        [0, 0, 10, 10],
        [75, 10, 75, 0],
        [300, 0, 300, 10],
        [0, 5, 200, 5],
    ] {
        let wrong = added(Cut {
            line,
            sides: [2, 3],
        });
        assert_rejected(&wrong, Step::Stitches, reason);
    }
    let corner = changed(|it, at| {
        let cuts = &mut it.split[at.ring].cuts;
        let lower = cuts.iter_mut().find(|cut| cut.line == [350, 0, 350, 10]);
        lower.unwrap().line = [315, 0, 315, 10];
    });
    let reason = "it is 5 from the corner at (310, 0), at least 10 is needed";
    assert_rejected(&corner, Step::Stitches, reason);
}

#[test]
fn a_ring_cut_once_is_not_cut() {
    let once = |fragments, sides| {
        changed(move |it, at| {
            let (feature, cuts) = (at.lone, vec![cut(530, sides)]);
            it.split.push(SplitFeature {
                feature,
                fragments,
                cuts,
            });
            it.split.sort_by_key(|split| split.feature);
        })
    };
    let reason = "no cut is allowed at (530, 0) to (530, 10): the policy places none there on the run \
                  from (510, 0) to (550, 10), or it separates nothing";
    assert_rejected(&once(2, [0, 1]), Step::Stitches, reason);
    assert_rejected(&once(1, [0, 0]), Step::Stitches, reason);
    let three = changed(|it, at| {
        let ring = &mut it.split[at.ring];
        ring.cuts.remove(0);
        ring.fragments = 3;
    });
    assert_rejected(&three, Step::Stitches, "the policy places a candidate at");
}

#[test]
fn candidates_that_are_not_listed() {
    let removed = changed(|it, at| {
        let wire = &mut it.split[at.wire];
        wire.cuts.retain(|cut| cut.line[0] == 75);
        wire.fragments = 2;
    });
    let reason = "the policy places a candidate at (135, 0) to (135, 10), which is not listed";
    assert_rejected(&removed, Step::Stitches, reason);
    let whole = changed(|it, at| {
        it.split.remove(at.wire);
    });
    let reason = "which begins at (0, 0): the policy places a candidate at (75, 0) to (75, 10), which is not listed";
    assert_rejected(&whole, Step::Stitches, reason);
}

#[test]
fn fragments_that_are_named_amiss() {
    let swapped = changed(|it, at| it.split[at.wire].cuts[1].sides.reverse());
    let reason = "the cut at (135, 0) to (135, 10) names fragment 2 on the side of what other cuts name fragment 1";
    assert_rejected(&swapped, Step::Stitches, reason);
    let alike = changed(|it, at| it.split[at.wire].cuts[1].sides[1] = 0);
    let reason = "the cut at (135, 0) to (135, 10) names fragment 0 on the side of another fragment than other cuts name so";
    assert_rejected(&alike, Step::Stitches, reason);
    let beyond = changed(|it, at| it.split[at.wire].cuts[1].sides[1] = 3);
    assert_rejected(
        &beyond,
        Step::Stitches,
        "names fragment 3: there are 3, numbered from 0",
    );
    for (count, reason) in [
        (
            4_000_000_000,
            "it is listed as cut into 4000000000 fragments, there are 3",
        ),
        (2, "it is listed as cut into 2 fragments, there are 3"),
        (0, "it is listed as cut into 0 fragments, there are 3"),
    ] {
        let said = changed(|it, at| it.split[at.wire].fragments = count);
        assert_rejected(&said, Step::Stitches, reason);
    }
}

#[test]
fn lists_that_are_out_of_order() {
    let twice = changed(|it, at| {
        let again = it.split[at.wire].cuts[0];
        it.split[at.wire].cuts.push(again);
    });
    assert_rejected(
        &twice,
        Step::Stitches,
        "the cut at (75, 0) to (75, 10) is listed twice",
    );
    let order = changed(|it, _| it.split.reverse());
    assert_rejected(
        &order,
        Step::Stitches,
        "they must be listed in order, each once",
    );
    let again = changed(|it, at| {
        let again = it.split[at.wire].clone();
        it.split.insert(at.wire, again);
    });
    assert_rejected(
        &again,
        Step::Stitches,
        "they must be listed in order, each once",
    );
    for feature in [9, u32::MAX] {
        let beyond = changed(|it, _| {
            let cuts = vec![cut(75, [0, 1])];
            it.split.push(SplitFeature {
                feature,
                fragments: 2,
                cuts,
            });
        });
        let reason = format!("feature {feature} is cut: there are 9, numbered from 0");
        assert_rejected(&beyond, Step::Stitches, &reason);
    }
    for fragments in [0, 1, 5] {
        let uncut = changed(|it, at| {
            let (feature, cuts) = (at.lone, Vec::new());
            it.split.push(SplitFeature {
                feature,
                fragments,
                cuts,
            });
            it.split.sort_by_key(|split| split.feature);
        });
        let reason = format!("it is listed as cut into {fragments} fragments, there are 1");
        assert_rejected(&uncut, Step::Stitches, &reason);
    }
}

#[test]
fn rules_that_do_not_fit() {
    let policy = |name: &str| {
        changed(|it, _| {
            let Subject::Layer(rules) = &mut it.rules else {
                panic!()
            };
            rules.stitch = name.into();
        })
    };
    for name in ["none", "everywhere", ""] {
        let reason = format!(
            "the certificate names the stitch policy {name:?}, the rules say \"uncovered\""
        );
        assert_rejected(&policy(name), Step::Stitches, &reason);
    }
    let graph = changed(|it, _| it.rules = Subject::of_graph(3));
    assert_rejected(&graph, Step::Rules, "the certificate is of a graph");
    let (layout, cut_rules) = example();
    let found = extract(&layout, &cut_rules, &|_| ()).unwrap();
    let of_cut = certificate(&layout, &cut_rules, &found);
    let mut rules = cut_rules.clone();
    rules.stitch.policy = Policy::None;
    let mut whole = of_cut.clone();
    whole.rules = certificate(&layout, &rules, &found).rules;
    let cut = derive(&layout, &rules, &whole).unwrap_err();
    assert_rejected(&cut, Step::Stitches, "the policy none places no candidates");
    let mut heavy = cut_rules.clone();
    heavy.stitch.weight = u32::MAX;
    derive(&layout, &heavy, &of_cut).unwrap();
    for bad in [
        Rules {
            masks: 0,
            ..cut_rules.clone()
        },
        Rules {
            masks: 9,
            ..cut_rules.clone()
        },
        Rules {
            spacing: 0,
            ..cut_rules.clone()
        },
        Rules {
            stitch: stitch(Policy::Uncovered, 3, 0, 0),
            ..cut_rules.clone()
        },
        Rules {
            stitch: stitch(Policy::Uncovered, 2, -1, 0),
            ..cut_rules.clone()
        },
    ] {
        let rejection = derive(&layout, &bad, &of_cut).unwrap_err();
        assert_rejected(&rejection, Step::Rules, "are needed");
    }
}

/// A ring whose two candidates are between the same two fragments.
#[test]
fn the_weight_of_parallel_cuts_adds_up() {
    let ring = [
        Rect::new(0, 0, 100, 10),
        Rect::new(0, 20, 100, 30),
        Rect::new(0, 0, 10, 30),
        Rect::new(90, 0, 100, 30),
    ];
    let mut shapes = Shapes::default();
    ring.into_iter().for_each(|rect| shapes.push_rect(rect));
    let layout = layout(shapes);
    let mut rules = rules(5, stitch(Policy::Uncovered, 8, 20, 6));
    let found = check(&layout, &rules, 0);
    let certificate = certificate(&layout, &rules, &found);
    let weights = |derived: Problem| {
        derived
            .stitches
            .iter()
            .map(|s| s.weight)
            .collect::<Vec<_>>()
    };
    assert_eq!(weights(derive(&layout, &rules, &certificate).unwrap()), [6]);
    rules.stitch.weight = 1 << 31;
    let heavy = derive(&layout, &rules, &certificate).unwrap_err();
    let reason = "is one of 2 between two fragments: their weights add up to more than 2^32 - 1";
    assert_rejected(&heavy, Step::Stitches, reason);
    rules.stitch.weight = (1 << 31) - 1;
    assert_eq!(
        weights(derive(&layout, &rules, &certificate).unwrap()),
        [u32::MAX - 1]
    );
}

#[test]
fn coordinates_at_the_limit_and_beyond() {
    let l = COORDINATE_LIMIT;
    let corners = [
        Rect::new(-l, -l, 1 - l, 1 - l),
        Rect::new(l - 1, l - 1, l, l),
        Rect::new(-l, l - 3, l - 4, l),
        Rect::new(-l, -5, l, -1),
    ];
    let mut shapes = Shapes::default();
    corners.into_iter().for_each(|rect| shapes.push_rect(rect));
    shapes.push_polygon(&[Point::new(-l, 1), Point::new(l, 2), Point::new(l, 1 << 20)]);
    for spacing in [1, 3, 4, 1 << 20, i32::MAX] {
        for policy in [Policy::None, Policy::Uncovered] {
            check(
                &layout(shapes.clone()),
                &rules(spacing, stitch(policy, 0, 0, 0)),
                1,
            );
        }
    }
    shapes.push_rect(Rect::new(0, 0, 1, l + 1));
    let beyond = layout(shapes);
    let rules = rules(5, stitch(Policy::None, 0, 0, 0));
    let (example, of_example) = (example().0, rules.clone());
    let found = extract(&example, &of_example, &|_| ()).unwrap();
    let certificate = certificate(&example, &of_example, &found);
    let rejection = derive(&beyond, &rules, &certificate).unwrap_err();
    let reason = format!("shape 5 has a vertex at (1, {}), beyond {l}", l + 1);
    assert_rejected(&rejection, Step::Features, &reason);
}
