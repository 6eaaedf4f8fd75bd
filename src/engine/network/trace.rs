//! A sweep kept as a decision diagram: one node for each state, with equal
//! ones joined. For cut sets, importance and steps.

use super::super::diagram::{Builder, FAILS, TooLarge, WORKS};
use super::sweep::{Next, State, Step, Sweep};
use rustc_hash::FxHashMap;

const TO_WORKS: u32 = u32::MAX;
const TO_FAILS: u32 = u32::MAX - 1;

/// Adds the sweep's function to a builder; `variable` gives the diagram that
/// stands for a thing. It is quick where these are variables in the order of
/// the sweep.
///
/// # Errors
/// If it has more states, or the diagram more nodes, than the limit.
pub(super) fn diagram<T: Sweep>(
    sweep: &T,
    builder: &mut Builder,
    variable: impl Fn(u32) -> u32,
    limit: usize,
) -> Result<u32, TooLarge> {
    let mut layers: Vec<Vec<(u32, u32)>> = Vec::new();
    let mut total = 0usize;
    let mut now: Vec<T::State> = Vec::new();
    let mut known: FxHashMap<T::State, u32> = FxHashMap::default();
    let root = place(sweep.first(), &mut known, &mut now);
    for layer in 0..sweep.layers() {
        total += now.len();
        if total > limit {
            return Err(TooLarge { limit });
        }
        let mut next: Vec<T::State> = Vec::new();
        known.clear();
        let moves = now.iter().map(|&state| match sweep.step(layer, state) {
            Step::Same(to) => {
                let to = place(to, &mut known, &mut next);
                (to, to)
            }
            Step::Split(works, fails) => {
                (place(works, &mut known, &mut next), place(fails, &mut known, &mut next))
            }
        });
        layers.push(moves.collect());
        now = next;
    }
    let mut made: Vec<u32> = Vec::new();
    let find = |to: u32, made: &[u32]| match to {
        TO_WORKS => WORKS,
        TO_FAILS => FAILS,
        at => made.get(at as usize).copied().unwrap_or(FAILS),
    };
    for (layer, moves) in layers.iter().enumerate().rev() {
        let on = sweep.thing(layer).map(&variable);
        let mut here = Vec::with_capacity(moves.len());
        for &(works, fails) in moves {
            let (works, fails) = (find(works, &made), find(fails, &made));
            here.push(match on {
                Some(on) if works != fails => builder.choose(on, works, fails)?,
                _ => works,
            });
        }
        made = here;
    }
    Ok(find(root, &made))
}

fn place<S: State>(to: Next<S>, known: &mut FxHashMap<S, u32>, list: &mut Vec<S>) -> u32 {
    match to {
        Next::Works => TO_WORKS,
        Next::Fails => TO_FAILS,
        Next::On(state) => *known.entry(state).or_insert_with(|| {
            list.push(state);
            list.len() as u32 - 1
        }),
    }
}
