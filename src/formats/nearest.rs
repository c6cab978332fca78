//! The nearest of the right names to a wrong one, by edit distance.
//!
//! Distance: V. I. Levenshtein, "Binary codes capable of correcting deletions, insertions and
//! reversals", 1966; case is ignored, and `-` and `_` count as one letter.

/// The name of `right` nearest to `wrong`; the first of equally near ones. `None` for no names.
pub fn nearest<'a>(wrong: &str, right: &[&'a str]) -> Option<&'a str> {
    // A key is short; cutting a hostile one keeps the cost linear.
    let wrong: Vec<char> = wrong.chars().take(64).map(plain).collect();
    right
        .iter()
        .copied()
        .min_by_key(|name| distance(&wrong, &name.chars().map(plain).collect::<Vec<_>>()))
}

/// A wrong name as it may be shown in a message: quoted, and cut where it is absurdly long.
pub fn shown(name: &str) -> String {
    let mut cut: String = name.chars().take(80).collect();
    if cut.len() < name.len() {
        cut.push_str("...");
    }
    format!("{cut:?}")
}

fn plain(c: char) -> char {
    if c == '-' {
        '_'
    } else {
        c.to_ascii_lowercase()
    }
}

fn distance(a: &[char], b: &[char]) -> usize {
    let mut row: Vec<usize> = (0..=b.len()).collect();
    for (i, x) in a.iter().enumerate() {
        let mut diagonal = row[0];
        row[0] = i + 1;
        for (j, y) in b.iter().enumerate() {
            let swapped = diagonal + usize::from(x != y);
            diagonal = row[j + 1];
            row[j + 1] = swapped.min(diagonal + 1).min(row[j] + 1);
        }
    }
    row[b.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nearest_name_wins() {
        let names = ["layer", "masks", "spacing", "fragment_length"];
        assert_eq!(nearest("spcing", &names), Some("spacing"));
        assert_eq!(nearest("Fragment-Length", &names), Some("fragment_length"));
        assert_eq!(nearest("mask", &names), Some("masks"));
        assert_eq!(nearest("x", &[]), None);
    }

    #[test]
    fn distances_from_the_literature() {
        // Wagner and Fischer's usual examples.
        let d = |a: &str, b: &str| {
            distance(
                &a.chars().collect::<Vec<_>>(),
                &b.chars().collect::<Vec<_>>(),
            )
        };
        assert_eq!(d("kitten", "sitting"), 3);
        assert_eq!(d("saturday", "sunday"), 3);
        assert_eq!(d("", "abc"), 3);
    }
}
