//! "Did you mean": the declared name nearest to a mistyped one.

use super::Lowering;
use crate::circuit::Gate;

/// Longer names are not compared.
const LONGEST: usize = 40;
/// No more names than this are compared.
const MOST: usize = 10_000;

impl<'a> Lowering<'a> {
    /// A declared name or a gate that is spelled nearly like `name`.
    pub(super) fn similar(&self, name: &str) -> Option<String> {
        let gates = gate_names();
        nearest(name, self.visible_names().take(MOST).chain(gates))
    }
}

/// The names of the library gates.
pub fn gate_names<'n>() -> impl Iterator<Item = &'n str> {
    Gate::all().map(|gate| -> &'n str { gate.name() })
}

/// The candidate with the fewest single-letter changes from `name`, if they
/// are few for its length.
pub fn nearest<'n>(name: &str, candidates: impl Iterator<Item = &'n str>) -> Option<String> {
    let length = name.chars().count();
    if length > LONGEST {
        return None;
    }
    let allowed = match length {
        0..=2 => 0,
        3..=5 => 1,
        _ => 2,
    };
    candidates
        .filter(|candidate| candidate.len() <= 4 * LONGEST && *candidate != name)
        .filter_map(|candidate| {
            if candidate.to_lowercase() == name.to_lowercase() {
                return Some((0, candidate));
            }
            let distance = changes(name, candidate);
            (distance <= allowed).then_some((distance, candidate))
        })
        .min()
        .map(|(_, candidate)| candidate.to_owned())
}

/// Number of letters to insert, remove or replace (dynamic programming over
/// one row of the usual table).
fn changes(from: &str, to: &str) -> usize {
    let to: Vec<char> = to.chars().collect();
    let mut row: Vec<usize> = (0..=to.len()).collect();
    for (above, a) in from.chars().enumerate() {
        let mut diagonal = row[0];
        row[0] = above + 1;
        for (column, &b) in to.iter().enumerate() {
            let replaced = diagonal + usize::from(a != b);
            diagonal = row[column + 1];
            row[column + 1] = replaced.min(diagonal + 1).min(row[column] + 1);
        }
    }
    row[to.len()]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn distances() {
        // The textbook example.
        assert_eq!(changes("kitten", "sitting"), 3);
        assert_eq!(changes("", "abc"), 3);
        assert_eq!(changes("abc", "abc"), 0);
    }

    #[test]
    fn only_near_names_are_suggested() {
        let names = ["data", "syndrome", "cx"];
        let near = |name| nearest(name, names.iter().copied());
        assert_eq!(near("syndrme").as_deref(), Some("syndrome"));
        assert_eq!(near("CX").as_deref(), Some("cx"));
        assert_eq!(near("foo"), None);
        assert_eq!(near("cz"), None);
    }
}
