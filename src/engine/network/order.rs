//! In which order stops are taken, so that few stand open at a time.
//!
//! Breadth first from several stops (on a grid this sweeps its diagonals,
//! from a corner), and greedily by the fewest open stops; the order with the
//! least estimated number of states is taken. The problem is that of vertex
//! separation or pathwidth, for which good orders are searched and not
//! proved: see H. L. Bodlaender, "A tourist guide through treewidth" (1993),
//! from memory.

/// Above this many stops the greedy order is not tried: it looks at every
/// neighbour of what is open in each step.
const GREEDY: usize = 4000;
/// What it takes to look at one stop for one order, in states.
const LOOK: f64 = 1000.0;
/// How many stops are tried as the first.
const FIRSTS: usize = 24;

/// An order of the stops of an undirected graph. `firsts` are tried as the
/// first stop before others; `given` are whole orders to try as well, each
/// with the factor by which one open stop multiplies the states.
pub(super) fn order(near: &[Vec<u32>], firsts: &[u32], given: Vec<(Vec<u32>, f64)>, growth: f64) -> Vec<u32> {
    let n = near.len();
    let mut best: (f64, Vec<u32>) = (f64::INFINITY, (0..n as u32).collect());
    let mut consider = |order: Vec<u32>, growth: f64| {
        let cost = cost(near, &order, growth);
        if cost < best.0 {
            best = (cost, order);
        }
        best.0
    };
    for (order, growth) in given {
        consider(order, growth);
    }
    let tries = if n > GREEDY { 2 } else { FIRSTS };
    let step = (n / tries.max(1)).max(1);
    let mut starts: Vec<u32> = firsts.to_vec();
    if n <= GREEDY {
        starts.extend((0..n as u32).step_by(step));
    } else {
        starts.truncate(tries);
    }
    for (i, &first) in starts.iter().enumerate() {
        let least = consider(breadth_first(near, first), growth);
        // Looking must not take longer than what it can save.
        if i >= 2 && (i * n) as f64 * LOOK > least {
            break;
        }
        if n <= GREEDY && (i < 4 || n <= 400) {
            consider(greedy(near, first), growth);
        }
    }
    best.1
}

/// Sum over the steps of `growth` to the number of open stops, in relation to
/// the widest where that is beyond a double.
fn cost(near: &[Vec<u32>], order: &[u32], growth: f64) -> f64 {
    let mut left: Vec<usize> = near.iter().map(Vec::len).collect();
    let mut seen = vec![false; near.len()];
    let (mut open, mut total) = (0usize, 0.0f64);
    for &v in order {
        seen[v as usize] = true;
        open += 1;
        total += growth.powf((open as f64).min(400.0));
        for &u in near[v as usize].iter().filter(|&&u| seen[u as usize]) {
            for end in [u, v] {
                left[end as usize] -= 1;
                if left[end as usize] == 0 {
                    open = open.saturating_sub(1);
                }
            }
        }
        total += growth.powf((open as f64).min(400.0));
    }
    total
}

/// By distance from `first`, then in the order in which they were found.
fn breadth_first(near: &[Vec<u32>], first: u32) -> Vec<u32> {
    let n = near.len();
    let mut seen = vec![false; n];
    let mut order = Vec::with_capacity(n);
    for root in std::iter::once(first).chain(0..n as u32) {
        if std::mem::replace(&mut seen[root as usize], true) {
            continue;
        }
        let mut next = order.len();
        order.push(root);
        while let Some(&at) = order.get(next) {
            next += 1;
            let mut found: Vec<u32> =
                near[at as usize].iter().copied().filter(|&u| !seen[u as usize]).collect();
            // Those that close soonest first, as in the order of Cuthill and McKee.
            found.sort_by_key(|&u| (near[u as usize].len(), u));
            found.dedup();
            for u in found {
                seen[u as usize] = true;
                order.push(u);
            }
        }
    }
    order
}

/// The stop next that leaves the fewest open; of equals the one whose
/// neighbour has been open longest.
fn greedy(near: &[Vec<u32>], first: u32) -> Vec<u32> {
    let n = near.len();
    let mut left: Vec<usize> = near.iter().map(Vec::len).collect();
    let mut date = vec![u32::MAX; n];
    let mut order: Vec<u32> = Vec::with_capacity(n);
    let mut rim: Vec<u32> = vec![first];
    let mut rest = 0u32..n as u32;
    while order.len() < n {
        let pick = |&v: &u32| {
            let (mut closes, mut oldest) = (0, u32::MAX);
            let mut own = left[v as usize];
            for &u in near[v as usize].iter().filter(|&&u| date[u as usize] != u32::MAX) {
                own -= 1;
                closes += usize::from(left[u as usize] == 1);
                oldest = oldest.min(date[u as usize]);
            }
            (usize::from(own > 0) + n - closes, oldest, v)
        };
        let v = match rim.iter().copied().min_by_key(pick) {
            Some(v) => v,
            None => match rest.find(|&v| date[v as usize] == u32::MAX) {
                Some(v) => v,
                None => break,
            },
        };
        rim.retain(|&r| r != v);
        date[v as usize] = order.len() as u32;
        order.push(v);
        for &u in &near[v as usize] {
            if date[u as usize] == u32::MAX {
                if !rim.contains(&u) {
                    rim.push(u);
                }
            } else {
                left[u as usize] -= 1;
                left[v as usize] -= 1;
            }
        }
    }
    order
}
