//! Places of a note to syntax: fences, comment pairs, then tables.

use super::ahead::{Ahead, LARGE};
use super::uses::{Shelf, bring_in};
use crate::document::markdown::{Found, PairForm, Place, Table, find};
use crate::language::{self, Source, Tree};
use crate::source::{Problem, Sources, Span};

/// A note as read: its places, its syntax, and what asks where.
pub(super) struct Read {
    pub(super) found: Found,
    pub(super) tree: Tree,
    pub(super) problems: Vec<Problem>,
    /// Cells that ask: statement, place, row, column; in the order of the statements.
    pub(super) cells: Vec<(usize, usize, usize, usize)>,
}

/// Finds the places of a note and reads them; of a large one both at once. What
/// it uses of other files comes from `shelf`.
pub(super) fn find_and_read(
    text: &str,
    base: u32,
    name: &str,
    shelf: &dyn Shelf,
    sources: &mut Sources,
) -> Read {
    if text.len() < LARGE {
        return read(text, base, find(text, base), Ahead::default(), name, shelf, sources);
    }
    let (found, ahead) = rayon::join(|| find(text, base), || Ahead::read(text, base));
    read(text, base, found, ahead, name, shelf, sources)
}

pub(super) fn read(
    text: &str,
    base: u32,
    found: Found,
    mut ahead: Ahead,
    name: &str,
    shelf: &dyn Shelf,
    sources: &mut Sources,
) -> Read {
    let tree = std::mem::take(&mut ahead.tree);
    let OwnLines { mut tree, mut problems } = read_own(text, base, &found, ahead, tree);
    bring_in(name, shelf, sources, &mut tree, &mut problems);
    let cells = read_tables(text, base, &found, &mut tree, &mut problems);
    Read { found, tree, problems, cells }
}

/// The lines of a note, those of its tables apart.
pub(super) struct OwnLines {
    pub(super) tree: Tree,
    pub(super) problems: Vec<Problem>,
}

/// Reads fences and pairs into a tree, which holds what has been read ahead.
pub(super) fn read_own(text: &str, base: u32, found: &Found, mut ahead: Ahead, tree: Tree) -> OwnLines {
    let slice = |span: Span| text.get((span.start - base) as usize..(span.end - base) as usize).unwrap_or("");
    let fences = found.places.iter().enumerate().filter_map(|(block, place)| match place {
        Place::Fence(fence) => Some((block as u32, fence)),
        _ => None,
    });
    let mut tree = tree;
    let mut unread = Vec::new();
    let mut problems = ahead.keep(&mut tree, fences, |block, fence| unread.push((block, fence)));
    let first = if ahead.is_empty() { tree.statements.len() } else { 0 };
    for (block, fence) in unread {
        let lines = fence.lines.iter().map(|l| Source { text: slice(l.text), at: l.text.start });
        language::read_block(lines, block, &mut tree, &mut problems);
    }
    for (block, place) in found.places.iter().enumerate() {
        if let Place::Pair(pair) = place {
            let source = Source { text: slice(pair.question), at: pair.question.start };
            match pair.form {
                PairForm::Inline { in_cell: true, .. } => {
                    language::read_cell_question(source, block as u32, &mut tree, &mut problems)
                }
                _ => language::read_question(source, block as u32, &mut tree, &mut problems),
            };
        }
    }
    // The first of two definitions is the one that stands first.
    tree.statements[first..].sort_by_key(|s| s.block);
    OwnLines { tree, problems }
}

/// Reads the tables of a note, which come last: their headers may name
/// attributes that a later block declares, and their rows may ask about things
/// that stand elsewhere. Gives the cells that ask.
pub(super) fn read_tables(
    text: &str,
    base: u32,
    found: &Found,
    tree: &mut Tree,
    problems: &mut Vec<Problem>,
) -> Vec<(usize, usize, usize, usize)> {
    let slice = |span: Span| text.get((span.start - base) as usize..(span.end - base) as usize).unwrap_or("");
    let grids: Vec<language::Grid<'_>> = found
        .places
        .iter()
        .enumerate()
        .filter_map(|(block, place)| match place {
            Place::Table(table) => Some(grid_of(block as u32, table, &slice)),
            _ => None,
        })
        .collect();
    language::read_grids(&grids, tree, problems);
    let asks = language::ask_grids(&grids, tree, problems).into_iter();
    asks.map(|ask| (ask.statement, grids[ask.grid].block as usize, ask.row, ask.column)).collect()
}

fn grid_of<'a>(block: u32, table: &Table, slice: &dyn Fn(Span) -> &'a str) -> language::Grid<'a> {
    let row = |row: &crate::document::markdown::Row| {
        row.cells.iter().map(|c| Source { text: slice(c.text), at: c.text.start }).collect::<Vec<_>>()
    };
    let broken = table.rows.iter().enumerate().filter(|(_, r)| r.too_many).map(|(i, _)| i).collect();
    language::Grid {
        opener: table.opener,
        header: row(&table.header),
        cells: Box::new(table.rows.iter().map(row).collect::<Vec<_>>()),
        broken,
        form: language::GridForm::Markdown,
        block,
    }
}
