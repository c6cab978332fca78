//! A feature cut at its candidates: which parts come off, and in what order they lie.
//!
//! Cut lines divide the slab cells of the feature: one across a horizontal run divides one cell, one across
//! a vertical run divides every cell that its line passes through (runs do not cross, so no cell is divided
//! both ways). Fragments are the connected parts of the divided cells, where cells that share a point hang
//! together unless a cut line is between them. A cut with the same fragment on both sides, as a single cut
//! of a ring, separates nothing and is dropped.
//!
//! Fragments are numbered along the feature: depth first over the cuts, from the lowest leftmost fragment at
//! the end of a branch, nearer corners first.

use super::runs::{Direction, Run};
use crate::geometry::{Point, Rect};
use crate::layout::Cut;

/// A candidate: a run and a place on it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Candidate {
    /// The run.
    pub run: Run,
    /// The place along it, strictly inside.
    pub place: i32,
}

/// A split feature; fragments are numbered from 0.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Split {
    /// The cells of each fragment.
    pub fragments: Vec<Vec<Rect>>,
    /// The cuts between them, in their order.
    pub cuts: Vec<Cut>,
    /// The candidate of each cut.
    pub candidates: Vec<Candidate>,
}

/// What becomes of a feature.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Cutting {
    /// It stays whole: no cut separates anything.
    Whole,
    /// It falls into two fragments or more.
    Split(Split),
    /// Its cells do not hang together, but by a line of no width: it cannot be cut.
    Apart,
}

/// Cuts the feature of the given slab cells, sorted by their lower left corners.
pub fn cut(cells: &[Rect], candidates: &[Candidate]) -> Cutting {
    if candidates.is_empty() {
        return Cutting::Whole;
    }
    let (pieces, sides) = divide(cells, candidates);
    let (part_of, parts) = connected_parts(&pieces);
    let cuts: Vec<(Cut, Candidate)> = (candidates.iter().zip(sides))
        .filter_map(|(candidate, sides)| {
            let sides = sides?.map(|piece| part_of[piece as usize]);
            let line = candidate.run.line(candidate.place);
            (sides[0] != sides[1]).then_some((Cut { line, sides }, *candidate))
        })
        .collect();
    if parts == 1 {
        return Cutting::Whole;
    }
    match along(&pieces, &part_of, parts, &cuts) {
        None => Cutting::Apart,
        Some(number) => Cutting::Split(renumbered(&pieces, &part_of, cuts, &number)),
    }
}

/// A cell or what cuts left of it.
#[derive(Clone, Copy, Debug)]
struct Piece {
    rect: Rect,
    /// Whether its left, right, lower and upper sides are cut lines.
    is_cut: [bool; 4],
}

const LEFT: usize = 0;
const RIGHT: usize = 1;
const LOWER: usize = 2;
const UPPER: usize = 3;

/// Divides the cells; also gives the pieces on the two sides of each candidate.
fn divide(cells: &[Rect], candidates: &[Candidate]) -> (Vec<Piece>, Vec<Option<[u32; 2]>>) {
    let hits = divided_cells(cells, candidates);
    let mut rest = &hits[..];
    let mut pieces = Vec::with_capacity(cells.len() + hits.len());
    let mut sides = vec![None; candidates.len()];
    for (index, &cell) in cells.iter().enumerate() {
        let count = rest.partition_point(|&(of, _, _)| of == index);
        let (here, later) = rest.split_at(count);
        rest = later;
        let mut left = Piece {
            rect: cell,
            is_cut: [false; 4],
        };
        for &(_, place, candidate) in here {
            let (below, above) = halves(left, place, candidates[candidate].run.direction);
            sides[candidate] = Some([pieces.len() as u32, pieces.len() as u32 + 1]);
            pieces.push(below);
            left = above;
        }
        pieces.push(left);
    }
    (pieces, sides)
}

/// The cells that candidates divide: cell, place and candidate, sorted.
fn divided_cells(cells: &[Rect], candidates: &[Candidate]) -> Vec<(usize, i32, usize)> {
    let mut hits = Vec::new();
    for (index, candidate) in candidates.iter().enumerate() {
        let Candidate { run, place } = *candidate;
        let mut hit = |cell| hits.push((cell, place, index));
        match run.direction {
            Direction::Horizontal => {
                let corner = Point::new(run.from, run.low);
                if let Ok(cell) = cells.binary_search_by_key(&corner, |cell| cell.min) {
                    hit(cell);
                }
            }
            Direction::Vertical => {
                let first = cells.partition_point(|cell| cell.min.x < run.low);
                let under = cells[first..].iter().take_while(|c| c.min.x < run.high);
                for (offset, cell) in under.enumerate() {
                    if cell.min.y < place && place < cell.max.y {
                        hit(first + offset);
                    }
                }
            }
        }
    }
    hits.sort_unstable();
    hits
}

fn halves(piece: Piece, place: i32, direction: Direction) -> (Piece, Piece) {
    let (mut below, mut above) = (piece, piece);
    match direction {
        Direction::Horizontal => {
            below.rect.max.x = place;
            below.is_cut[RIGHT] = true;
            above.rect.min.x = place;
            above.is_cut[LEFT] = true;
        }
        Direction::Vertical => {
            below.rect.max.y = place;
            below.is_cut[UPPER] = true;
            above.rect.min.y = place;
            above.is_cut[LOWER] = true;
        }
    }
    (below, above)
}

/// The part of each piece, and how many parts there are. Pieces only meet at their left and right sides:
/// what lies above each other in a slab is apart, or a cut is between.
fn connected_parts(pieces: &[Piece]) -> (Vec<u32>, u32) {
    let mut parent: Vec<u32> = (0..pieces.len() as u32).collect();
    let mut starts: Vec<u32> = (0..pieces.len() as u32)
        .filter(|&piece| !pieces[piece as usize].is_cut[LEFT])
        .collect();
    let key = |piece: u32| {
        let rect = pieces[piece as usize].rect;
        (rect.min.x, rect.max.y)
    };
    starts.sort_unstable_by_key(|&piece| (key(piece), piece));
    for (index, piece) in (0u32..).zip(pieces) {
        if piece.is_cut[RIGHT] {
            continue;
        }
        let (x, low) = (piece.rect.max.x, piece.rect.min.y);
        let first = starts.partition_point(|&other| key(other) < (x, low));
        for &other in &starts[first..] {
            let next = &pieces[other as usize];
            if next.rect.min.x != x || next.rect.min.y > piece.rect.max.y {
                break;
            }
            if !only_a_cut_joins(piece, next) {
                let (a, b) = (find(&mut parent, index), find(&mut parent, other));
                parent[a.max(b) as usize] = a.min(b);
            }
        }
    }
    let mut parts = 0;
    let mut part_of = vec![0; pieces.len()];
    for piece in 0..pieces.len() as u32 {
        let root = find(&mut parent, piece);
        if root == piece {
            part_of[piece as usize] = parts;
            parts += 1;
        } else {
            part_of[piece as usize] = part_of[root as usize];
        }
    }
    (part_of, parts)
}

/// Whether the pieces meet at one point only, and that on a cut line of both.
fn only_a_cut_joins(a: &Piece, b: &Piece) -> bool {
    (a.rect.max.y == b.rect.min.y && a.is_cut[UPPER] && b.is_cut[LOWER])
        || (b.rect.max.y == a.rect.min.y && b.is_cut[UPPER] && a.is_cut[LOWER])
}

fn find(parent: &mut [u32], mut at: u32) -> u32 {
    while parent[at as usize] != at {
        parent[at as usize] = parent[parent[at as usize] as usize];
        at = parent[at as usize];
    }
    at
}

/// The number of each part along the feature, unless the cuts do not connect them.
fn along(
    pieces: &[Piece],
    part_of: &[u32],
    parts: u32,
    cuts: &[(Cut, Candidate)],
) -> Option<Vec<u32>> {
    let mut corner: Vec<Option<Point>> = vec![None; parts as usize];
    for (piece, &part) in pieces.iter().zip(part_of) {
        let lowest = &mut corner[part as usize];
        *lowest = Some(lowest.map_or(piece.rect.min, |seen| seen.min(piece.rect.min)));
    }
    let mut next: Vec<Vec<u32>> = vec![Vec::new(); parts as usize];
    for &(Cut { sides: [a, b], .. }, _) in cuts {
        next[a as usize].push(b);
        next[b as usize].push(a);
    }
    for others in &mut next {
        others.sort_unstable_by_key(|&part| (corner[part as usize], part));
        others.dedup();
    }
    let is_inner = |part: u32| next[part as usize].len() > 1;
    let first = (0..parts).min_by_key(|&part| (is_inner(part), corner[part as usize], part))?;
    let mut number = vec![None; parts as usize];
    let mut count = 0;
    let mut stack = vec![first];
    while let Some(part) = stack.pop() {
        if number[part as usize].is_none() {
            number[part as usize] = Some(count);
            count += 1;
            stack.extend(next[part as usize].iter().rev());
        }
    }
    number.into_iter().collect()
}

fn renumbered(
    pieces: &[Piece],
    part_of: &[u32],
    cuts: Vec<(Cut, Candidate)>,
    number: &[u32],
) -> Split {
    let mut fragments = vec![Vec::new(); number.len()];
    for (piece, &part) in pieces.iter().zip(part_of) {
        fragments[number[part as usize] as usize].push(piece.rect);
    }
    let turned = |(cut, candidate): (Cut, Candidate)| {
        let sides = cut.sides.map(|part| number[part as usize]);
        let line = cut.line;
        (Cut { line, sides }, candidate)
    };
    let mut cuts: Vec<(Cut, Candidate)> = cuts.into_iter().map(turned).collect();
    let place = |(cut, _): &(Cut, Candidate)| {
        let [a, b] = cut.sides;
        (a.min(b), a.max(b), cut.line)
    };
    cuts.sort_unstable_by_key(place);
    let (cuts, candidates) = cuts.into_iter().unzip();
    Split {
        fragments,
        cuts,
        candidates,
    }
}
