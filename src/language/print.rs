//! A tree written back as text, so that a message can show a reading of it and
//! a step can name a thing that has no name.

use super::tree::*;
use super::words::ClauseWord;

/// The text of an expression, in the spacing that the design's examples use.
///
/// `literal` gives the text of a literal's digits (the tree holds only their
/// place). Iterative, like everything that walks a tree of unknown depth.
pub fn print(tree: &Tree, root: ExprId, digits: &dyn Fn(crate::source::Span) -> String) -> String {
    print_start(tree, root, digits, usize::MAX)
}

/// The first `most` bytes of that text and what completes their last piece:
/// names of nested things would otherwise take quadratic time.
pub fn print_start(
    tree: &Tree,
    root: ExprId,
    digits: &dyn Fn(crate::source::Span) -> String,
    most: usize,
) -> String {
    let mut out = String::new();
    let mut stack = vec![Piece::Node(root)];
    while out.len() <= most
        && let Some(piece) = stack.pop()
    {
        match piece {
            Piece::Text(text) => out.push_str(&text),
            Piece::Node(id) => {
                let mut pieces = pieces(tree, id, digits);
                pieces.reverse();
                stack.append(&mut pieces);
            }
        }
    }
    out
}

enum Piece {
    Text(String),
    Node(ExprId),
}

fn text(t: impl Into<String>) -> Piece {
    Piece::Text(t.into())
}

fn joined(tree: &Tree, list: List, between: &str) -> Vec<Piece> {
    let mut out = Vec::new();
    for (i, id) in tree.list(list).iter().enumerate() {
        if i > 0 {
            out.push(text(between));
        }
        out.push(Piece::Node(*id));
    }
    out
}

fn unit(tree: &Tree, unit: Unit) -> String {
    let word = tree.names.written(unit.word);
    match unit.form {
        UnitForm::Plain => format!(" {word}"),
        UnitForm::Per => format!(" /{word}"),
        UnitForm::PercentPer => format!(" %/{word}"),
    }
}

fn literal(tree: &Tree, id: u32, digits: &dyn Fn(crate::source::Span) -> String) -> String {
    let literal = tree.literals[id as usize];
    let number = digits(literal.number);
    match literal.suffix {
        Suffix::None => number,
        Suffix::Percent => format!("{number}%"),
        Suffix::Unit(u) => format!("{number}{}", unit(tree, u)),
        Suffix::In(second) => format!("{number} in {}", digits(second)),
    }
}

fn pieces(tree: &Tree, id: ExprId, digits: &dyn Fn(crate::source::Span) -> String) -> Vec<Piece> {
    match tree.expr(id) {
        Expr::Literal(n) => vec![text(literal(tree, n, digits))],
        Expr::Name(sym) => vec![text(path(tree, sym))],
        Expr::WithUnit(inner, u) => {
            vec![Piece::Node(inner), text(unit(tree, tree.units[u as usize]))]
        }
        Expr::Group(inner) => vec![text("("), Piece::Node(inner), text(")")],
        Expr::Negate(inner) => vec![text("-"), Piece::Node(inner)],
        Expr::Arith(op, a, b) => {
            let op = match op {
                ArithOp::Add => " + ",
                ArithOp::Sub => " - ",
                ArithOp::Mul => " * ",
                ArithOp::Div => " / ",
                ArithOp::Pow => "^",
            };
            vec![Piece::Node(a), text(op), Piece::Node(b)]
        }
        Expr::Series(list) => joined(tree, list, " -> "),
        Expr::Parallel(list) => joined(tree, list, " // "),
        Expr::Routes(id) => routes(tree, &tree.routes[id as usize]),
        Expr::Terminal(start) => vec![text(if start { "in" } else { "out" })],
        Expr::And(list) => joined(tree, list, " and "),
        Expr::Or(list) => joined(tree, list, " or "),
        Expr::AtLeast(need, list) => at_least(tree, need, list),
        Expr::Counted(count, of) => vec![Piece::Node(count), text(" "), Piece::Node(of)],
        Expr::Copy(of) => vec![text("a "), Piece::Node(of)],
        Expr::Settled(of, id) => {
            let settles = &tree.settles[id as usize];
            let mut out = vec![Piece::Node(of)];
            for (word, names) in [("sharing", &settles.sharing), ("separate", &settles.separate)] {
                if !names.is_empty() {
                    let names: Vec<String> = names.iter().map(|(s, _)| path(tree, *s)).collect();
                    out.push(text(format!(" {word} ({})", names.join(", "))));
                }
            }
            out
        }
        Expr::FailsWhen(inner) => vec![text("fails when "), Piece::Node(inner)],
        Expr::Call(word, args) => {
            let mut out = vec![text(format!("{}(", tree.names.text(word)))];
            out.extend(joined(tree, args, ", "));
            out.push(text(")"));
            out
        }
        Expr::Choice(word, value) => {
            vec![text(format!("{} ", tree.names.written(word))), Piece::Node(value)]
        }
        Expr::Item(clauses) => clause_pieces(tree, clauses),
        Expr::Changed(copy, clauses) => {
            let mut out = vec![Piece::Node(copy), text(", ")];
            out.extend(clause_pieces(tree, clauses));
            out
        }
        Expr::Mixed(id) => match tree.mixed[id as usize].readings.first() {
            Some(first) => vec![Piece::Node(*first)],
            None => vec![text("…")],
        },
        Expr::Broken => vec![text("…")],
    }
}

fn routes(tree: &Tree, routes: &Routes) -> Vec<Piece> {
    let mut out = vec![text("routes(")];
    let stops = tree.list(routes.stops);
    for (i, (stop, link)) in stops.iter().zip(&routes.links).enumerate() {
        out.push(Piece::Node(*stop));
        match link {
            Link::Forth => out.push(text(" -> ")),
            Link::Both => out.push(text(" <-> ")),
            Link::End if i + 1 < stops.len() => out.push(text(", ")),
            Link::End => {}
        }
    }
    out.push(text(")"));
    if let Some((need, list)) = routes.ends {
        out.push(text(" with ends "));
        out.extend(at_least(tree, need, list));
    }
    out
}

fn at_least(tree: &Tree, need: Need, list: List) -> Vec<Piece> {
    let mut out = match need {
        Need::All => vec![text("all of ")],
        Need::Any => vec![text("any of ")],
        Need::Count(k) => vec![Piece::Node(k), text(" of ")],
    };
    let members = tree.list(list);
    match members {
        [only] if matches!(tree.expr(*only), Expr::Counted(..)) => out.push(Piece::Node(*only)),
        _ => {
            out.push(text("("));
            out.extend(joined(tree, list, ", "));
            out.push(text(")"));
        }
    }
    out
}

fn clause_pieces(tree: &Tree, clauses: List) -> Vec<Piece> {
    let mut out = Vec::new();
    for (i, clause) in tree.clauses(clauses).iter().enumerate() {
        if i > 0 {
            out.push(text(", "));
        }
        let word = tree.names.text(clause.name);
        if !word.is_empty() {
            out.push(text(word));
        }
        if let Some(value) = clause.value {
            if !word.is_empty() {
                out.push(text(" "));
            }
            match (clause.word, tree.expr(value)) {
                (ClauseWord::Source, Expr::Name(sym)) => {
                    out.push(text(format!("\"{}\"", tree.names.text(sym).replace('"', "\"\""))));
                }
                _ => out.push(Piece::Node(value)),
            }
        }
        if let Some(over) = clause.over {
            out.push(text(" over "));
            out.push(Piece::Node(over));
        }
    }
    out
}

/// A name or a path as it is written: `feed.pump[1]` stays as it is.
fn path(tree: &Tree, sym: Sym) -> String {
    tree.names.written(sym)
}
