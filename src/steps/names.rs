//! Names of like things, folded: `feed.pump[1..3]`.

use rustc_hash::FxHashMap;

/// Names shown where a list stands inside a line.
const SHOWN: usize = 3;
/// Names shown where a reader signs for each.
const LISTED: usize = 200;

/// Names in few words, for the head of a step or inside a sentence.
pub fn folded(names: &[String]) -> String {
    // `packA, given s works` and `packB, given s works` have one condition.
    if let Some((_, condition)) = names.first().and_then(|n| n.split_once(", given "))
        && names.len() > 1
    {
        let heads: Option<Vec<String>> = names
            .iter()
            .map(|n| n.strip_suffix(condition)?.strip_suffix(", given ").map(str::to_string))
            .collect();
        if let Some(heads) = heads {
            return format!("{}, given {condition}", joined(&heads, SHOWN));
        }
    }
    joined(names, SHOWN)
}

/// Every name, like copies as a range.
pub fn listed(names: &[String]) -> String {
    joined(names, LISTED)
}

/// The names of a step, all of them, and the one that stands in formulas: the
/// range where there is one, else the first name for any of them.
pub(super) fn head_and_symbol(names: &[String]) -> (String, String) {
    let head =
        if names.first().is_some_and(|n| n.contains(", given ")) { folded(names) } else { listed(names) };
    let symbol =
        if runs(names).len() == 1 { head.clone() } else { names.first().cloned().unwrap_or_default() };
    (head, symbol)
}

fn joined(names: &[String], most: usize) -> String {
    let runs = runs(names);
    let mut out = runs.iter().take(most).cloned().collect::<Vec<_>>().join(", ");
    if runs.len() > most {
        out.push_str(&format!(" and {} more", runs.len() - most));
    }
    out
}

/// One entry for each run of names that differ in one number of a copy that counts on.
fn runs(names: &[String]) -> Vec<String> {
    struct Run {
        first: String,
        // Place of the number, and what it has come to.
        number: Option<(usize, usize, u32)>,
    }
    let mut runs: Vec<Run> = Vec::new();
    // The names that would go on with a run, and how.
    let mut wanted: FxHashMap<String, (usize, usize, usize, u32)> = FxHashMap::default();
    for name in names {
        let found = wanted.remove(name).filter(|(run, at, ..)| match runs[*run].number {
            None => true,
            Some((place, ..)) => place == *at,
        });
        let run = match found {
            Some((run, at, close, number)) => {
                runs[run].number = Some((at, close, number));
                run
            }
            None => {
                runs.push(Run { first: name.clone(), number: None });
                runs.len() - 1
            }
        };
        for (open, close, number) in numbers(name) {
            let next = format!("{}{}{}", &name[..=open], number + 1, &name[close..]);
            wanted.entry(next).or_insert((run, open, numbers_end(&runs[run].first, open), number + 1));
        }
    }
    runs.into_iter()
        .map(|run| match run.number {
            None => run.first,
            Some((open, close, last)) => {
                let first = &run.first;
                format!("{}{}..{last}{}", &first[..=open], &first[open + 1..close], &first[close..])
            }
        })
        .collect()
}

/// The numbers of copies in a name: where each opens, where it closes, and what it is.
fn numbers(name: &str) -> Vec<(usize, usize, u32)> {
    name.match_indices('[')
        .filter_map(|(open, _)| {
            let close = open + name[open..].find(']')?;
            Some((open, close, name[open + 1..close].parse().ok()?))
        })
        .collect()
}

fn numbers_end(name: &str, open: usize) -> usize {
    name[open..].find(']').map_or(name.len(), |n| open + n)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn fold(names: &[&str]) -> String {
        folded(&names.iter().map(|n| (*n).to_string()).collect::<Vec<_>>())
    }

    #[test]
    fn copies_become_ranges() {
        assert_eq!(fold(&["p[1]", "p[2]", "p[3]"]), "p[1..3]");
        assert_eq!(fold(&["f.l[9].p", "f.l[10].p"]), "f.l[9..10].p");
        assert_eq!(fold(&["l[1].a", "l[1].b", "l[2].a", "l[2].b"]), "l[1..2].a, l[1..2].b");
        assert_eq!(fold(&["p[1]", "p[3]"]), "p[1], p[3]");
        assert_eq!(fold(&["a", "b", "c", "d", "e"]), "a, b, c and 2 more");
    }

    #[test]
    fn one_condition_is_said_once() {
        assert_eq!(fold(&["packA, given s works", "packB, given s works"]), "packA, packB, given s works");
        assert_eq!(fold(&["a, given s works", "b"]), "a, given s works, b");
    }
}
