//! The members `features` and `split` of a certificate: which features a layer has and where they are cut.
//!
//! A feature is told by its point of smallest x and, among those, smallest y. Features share no point, so no two of
//! them have the same one. Shapes that enclose no area belong to no feature, and a line that an outline along
//! the axes runs to and fro is no part of its shape: the point is one of what is drawn.

use crate::certificate::{Cut, SplitFeature};
use crate::geometry::Point;
use crate::geometry::outline::{is_manhattan, without_spikes};
use crate::geometry::winding::edges;
use crate::layout::{Features, Fragments, Shape, Shapes};
use rayon::prelude::*;

/// The members `features` and `split` for the features of `shapes` and their fragments.
pub fn members(
    shapes: &Shapes,
    features: &Features,
    fragments: &Fragments,
) -> (Vec<[i32; 2]>, Vec<SplitFeature>) {
    let points = (0..features.len() as u32).into_par_iter().map(|feature| {
        let of_shapes = features.shapes_of(feature).iter();
        let first = of_shapes.filter_map(|&shape| first_point(shapes.get(shape)));
        let Point { x, y } = first.min().unwrap_or_default();
        [x, y]
    });
    (points.collect(), split(fragments))
}

/// The point of a shape with the smallest x and, among those, the smallest y; none where it encloses nothing.
fn first_point(shape: Shape<'_>) -> Option<Point> {
    match shape {
        Shape::Rect(rect) => Some(rect.min),
        Shape::Polygon(outline) if is_manhattan(outline) => first_enclosed(outline),
        Shape::Polygon(outline) => without_spikes(outline).into_iter().min(),
    }
}

/// The same of an outline along the axes. Left of the place that is looked for no winding number is other than 0: it is at
/// the first abscissa where the upright edges, added up, leave one.
fn first_enclosed(outline: &[Point]) -> Option<Point> {
    let mut turns: Vec<(Point, i32)> = edges(outline)
        .filter(|edge| edge.a.y != edge.b.y)
        // An edge upwards adds 1 from its start to its end, one downwards -1 from its end to its start.
        .flat_map(|edge| [(edge.a, 1), (edge.b, -1)])
        .collect();
    turns.sort_unstable();
    let mut winding = 0;
    for place in turns.chunk_by(|one, other| one.0 == other.0) {
        winding += place.iter().map(|turn| turn.1).sum::<i32>();
        if winding != 0 {
            return Some(place[0].0);
        }
    }
    None
}

/// The features of several fragments, ascending.
fn split(fragments: &Fragments) -> Vec<SplitFeature> {
    let mut found: Vec<SplitFeature> = Vec::new();
    let several = (0..fragments.feature_count() as u32)
        .filter(|&feature| fragments.of_feature(feature).len() > 1);
    let mut rest = fragments.cuts();
    for feature in several {
        let own = fragments.of_feature(feature);
        let (cuts, later) = rest.split_at(rest.partition_point(|cut| cut.sides[0] < own.end));
        rest = later;
        let cut = |cut: &crate::layout::Cut| Cut {
            line: [
                cut.line.min.x,
                cut.line.min.y,
                cut.line.max.x,
                cut.line.max.y,
            ],
            sides: cut.sides.map(|side| side - own.start),
        };
        found.push(SplitFeature {
            feature,
            fragments: own.len() as u32,
            cuts: cuts.iter().map(cut).collect(),
        });
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Rect;
    use crate::layout::fragments::FragmentsBuilder;

    fn first(outline: &[(i32, i32)]) -> Option<Point> {
        let points: Vec<Point> = outline.iter().map(|&(x, y)| Point::new(x, y)).collect();
        first_point(Shape::Polygon(&points))
    }

    #[test]
    fn spikes_and_empty_shapes_give_no_point() {
        let spiked = [
            (2, 0),
            (6, 0),
            (6, 6),
            (2, 6),
            (2, 3),
            (-5, 3),
            (-5, 1),
            (-5, 3),
            (2, 3),
        ];
        assert_eq!(first(&spiked), Some(Point::new(2, 0)));
        assert_eq!(first(&[(0, 0), (0, 5), (0, 2)]), None);
        // A square run around one way, then the other.
        let undone = [
            (0, 0),
            (4, 0),
            (4, 4),
            (0, 4),
            (0, 0),
            (0, 4),
            (4, 4),
            (4, 0),
        ];
        assert_eq!(first(&undone), None);
        let slanted = [(0, 0), (4, 1), (2, 5), (0, 0), (-9, -2)];
        assert_eq!(first(&slanted), Some(Point::new(0, 0)));
        assert_eq!(first(&[(3, 1), (0, 7), (0, 2)]), Some(Point::new(0, 2)));
    }

    /// Above one another at the same abscissa, the lower one that is left counts.
    #[test]
    fn the_lowest_of_what_is_left_at_the_abscissa() {
        // The lower tooth is run to and fro.
        let comb = [
            (5, 9),
            (0, 9),
            (0, 7),
            (5, 7),
            (5, 3),
            (0, 3),
            (0, 1),
            (0, 3),
            (5, 3),
            (5, 0),
            (8, 0),
            (8, 9),
        ];
        assert_eq!(first(&comb), Some(Point::new(0, 7)));
    }

    #[test]
    fn cuts_are_numbered_within_their_feature() {
        let cut = |x, sides| crate::layout::Cut {
            line: Rect::new(x, 0, x, 10),
            sides,
        };
        let cell = |from, to| [Rect::new(from, 0, to, 10)];
        let mut fragments = FragmentsBuilder::new(2);
        fragments.split(
            [cell(0, 40), cell(40, 70), cell(70, 99)],
            [cut(40, [0, 1]), cut(70, [1, 2])],
        );
        fragments.unsplit();
        fragments.split([cell(500, 540), cell(540, 600)], [cut(540, [1, 0])]);
        let shapes = Shapes::default();
        let (points, split) = members(&shapes, &Features::default(), &fragments.build());
        assert_eq!(points, [[0; 2]; 0]);
        let written = serde_json::to_string(&split).unwrap_or_default();
        assert_eq!(
            written,
            r#"[{"feature":0,"fragments":3,"cuts":[[40,0,40,10,0,1],[70,0,70,10,1,2]]},{"feature":2,"fragments":2,"cuts":[[540,0,540,10,1,0]]}]"#
        );
    }
}
