//! The cut lines of a certificate held against those of the layer, and the fragments in its numbering.

use super::cuts::{Cuts, Line, Piece, range_of};
use crate::audit::{Rejection, Step};
use crate::certificate::{Cut, SplitFeature};
use crate::geometry::Rect;

/// The fragments of a layer.
#[derive(Debug, Default)]
pub(super) struct Numbering {
    /// Those of feature f are `start[f]..start[f + 1]`.
    pub(super) start: Vec<u32>,
    /// The fragment of each piece.
    pub(super) of_piece: Vec<u32>,
    /// The fragments on the two sides of each line.
    pub(super) sides: Vec<[u32; 2]>,
}

/// Numbers the parts of the features that are cut as the certificate does. `first` is where each feature begins; `objection`
/// says what is wrong with a line of a feature that is no candidate.
pub(super) fn numbered(
    cuts: &Cuts,
    listed: &[SplitFeature],
    first: &[[i32; 2]],
    objection: impl Fn(u32, [i32; 4]) -> String,
) -> Result<Numbering, Rejection> {
    in_order(listed, first.len())?;
    let mut found = Numbering {
        start: vec![0],
        ..Numbering::default()
    };
    let mut listed = listed.iter().peekable();
    let mut total = 0u32;
    for (feature, &first) in (0u32..).zip(first) {
        let own = Own {
            feature,
            first,
            lines: &cuts.lines[range_of(&cuts.lines, feature, |line| line.feature)],
            pieces: &cuts.pieces[range_of(&cuts.pieces, feature, |piece| piece.feature)],
        };
        let split = listed.next_if(|split| split.feature == feature);
        let count = match (split, own.lines) {
            (None, []) => 1,
            (None, [line, ..]) => return Err(own.missing(line)),
            (Some(split), _) => own.number(split, total, &objection, &mut found)?,
        };
        let more = total.checked_add(count);
        total = more.ok_or_else(|| own.wrong("it has more fragments than 32 bits count"))?;
        found.start.push(total);
    }
    Ok(found)
}

fn in_order(listed: &[SplitFeature], features: usize) -> Result<(), Rejection> {
    let reject = |reason| Err(Rejection::new(Step::Stitches, reason));
    if let Some(two) = listed
        .windows(2)
        .find(|two| two[0].feature >= two[1].feature)
    {
        let [one, other] = [two[0].feature, two[1].feature];
        return reject(format!(
            "cut feature {other} is listed after cut feature {one}: they must be listed in order, each once"
        ));
    }
    match listed
        .last()
        .filter(|split| split.feature as usize >= features)
    {
        Some(split) => reject(format!(
            "feature {} is cut: there are {features}, numbered from 0",
            split.feature
        )),
        None => Ok(()),
    }
}

/// A feature as it is cut.
struct Own<'a> {
    feature: u32,
    first: [i32; 2],
    lines: &'a [Line],
    pieces: &'a [Piece],
}

impl Own<'_> {
    fn wrong(&self, reason: impl std::fmt::Display) -> Rejection {
        let ([x, y], feature) = (self.first, self.feature);
        Rejection::new(
            Step::Stitches,
            format!("feature {feature}, which begins at ({x}, {y}): {reason}"),
        )
    }

    fn missing(&self, line: &Line) -> Rejection {
        let line = shown(ends(line.line));
        self.wrong(format!(
            "the policy places a candidate at {line}, which is not listed"
        ))
    }

    /// Numbers the fragments, from `start` on; returns how many there are.
    fn number(
        &self,
        split: &SplitFeature,
        start: u32,
        objection: impl Fn(u32, [i32; 4]) -> String,
        found: &mut Numbering,
    ) -> Result<u32, Rejection> {
        let named = self.named(split, objection)?;
        let mut parts: Vec<u32> = self.pieces.iter().map(|piece| piece.part).collect();
        parts.dedup();
        let (count, said) = (parts.len().max(1) as u32, split.fragments);
        if said != count || count == 1 {
            return Err(self.wrong(format!(
                "it is listed as cut into {said} fragments, there are {count}"
            )));
        }
        let mut number: Vec<Option<u32>> = vec![None; parts.len()];
        let mut taken: Vec<Option<usize>> = vec![None; parts.len()];
        for (line, cut) in self.lines.iter().zip(&named) {
            for (part, side) in line.sides.into_iter().zip(cut.sides) {
                let at = shown(cut.line);
                let (Some(taken), Ok(place)) =
                    (taken.get_mut(side as usize), parts.binary_search(&part))
                else {
                    return Err(self.wrong(format!(
                        "the cut at {at} names fragment {side}: there are {count}, numbered from 0"
                    )));
                };
                let known = *number[place].get_or_insert(side);
                if known != side || *taken.get_or_insert(place) != place {
                    let right = match known == side {
                        true => "another fragment than other cuts name so".to_owned(),
                        false => format!("what other cuts name fragment {known}"),
                    };
                    return Err(self.wrong(format!(
                        "the cut at {at} names fragment {side} on the side of {right}"
                    )));
                }
            }
        }
        let global = |part: &u32| {
            let place = parts.binary_search(part).ok();
            start + place.and_then(|place| number[place]).unwrap_or_default()
        };
        found
            .of_piece
            .extend(self.pieces.iter().map(|piece| global(&piece.part)));
        found.sides.extend(
            self.lines
                .iter()
                .map(|line| line.sides.map(|part| global(&part))),
        );
        Ok(count)
    }

    /// The cuts of the certificate in the order of the lines.
    fn named(
        &self,
        split: &SplitFeature,
        objection: impl Fn(u32, [i32; 4]) -> String,
    ) -> Result<Vec<Cut>, Rejection> {
        let mut named = split.cuts.clone();
        named.sort_unstable_by_key(|cut| cut.line);
        if let Some(two) = named.windows(2).find(|two| two[0].line == two[1].line) {
            let line = shown(two[0].line);
            return Err(self.wrong(format!("the cut at {line} is listed twice")));
        }
        let lines: Vec<[i32; 4]> = self.lines.iter().map(|line| ends(line.line)).collect();
        if let Some(cut) = named
            .iter()
            .find(|cut| lines.binary_search(&cut.line).is_err())
        {
            let (line, reason) = (shown(cut.line), objection(self.feature, cut.line));
            return Err(self.wrong(format!("no cut is allowed at {line}: {reason}")));
        }
        let is_named = |line: &[i32; 4]| named.binary_search_by_key(line, |cut| cut.line).is_ok();
        match (self.lines.iter().zip(&lines)).find(|(_, line)| !is_named(line)) {
            Some((line, _)) => Err(self.missing(line)),
            None => Ok(named),
        }
    }
}

fn ends(line: Rect) -> [i32; 4] {
    [line.min.x, line.min.y, line.max.x, line.max.y]
}

/// A line, in words.
fn shown([x0, y0, x1, y1]: [i32; 4]) -> String {
    format!("({x0}, {y0}) to ({x1}, {y1})")
}
