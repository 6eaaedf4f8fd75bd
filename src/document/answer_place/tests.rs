use super::super::markdown::{Place, find};
use super::super::patch::{Rewrite, apply};
use super::*;
use proptest::prelude::*;

const BASE: u32 = 77;

/// Answers every question: in fences `S ?` with lines, others with `0.9`; in
/// pairs `table`/`list` words with blocks; tables in their last column.
fn edits(text: &str, value: &str) -> Vec<Edit> {
    let mut edits = Vec::new();
    for place in find(text, BASE).places {
        match place {
            Place::Fence(fence) => {
                for (i, line) in fence.lines.iter().enumerate() {
                    let content = slice(text, BASE, line.text);
                    let Some(mark) = content.find(" ?").map(|n| n + 1) else { continue };
                    if content.trim_start().starts_with('?') || content[..mark].contains('<') {
                        continue;
                    }
                    let after = &content[mark + 1..];
                    let old = after.find(" #").map_or(after, |n| &after[..n]).trim_end();
                    let after = line.text.start + mark as u32 + 1;
                    let many = content.contains('S');
                    let answer = FenceAnswer {
                        inline: (!many).then(|| value.to_string()),
                        lines: if many { vec![format!("? 1 {value}"), "? 2".into()] } else { vec![] },
                    };
                    let rows = bytes_of_lines(&fence, old_answer_lines(text, BASE, &fence, i));
                    let end = after + old.len() as u32;
                    edits.extend(fence_edits(text, BASE, line, after, end, rows, &answer));
                }
            }
            Place::Pair(pair) => {
                let lines: Option<&[&str]> = match slice(text, BASE, pair.question) {
                    "T" => Some(&["| a | b |", "|---|--:|", "| x\\|y | 1 |"]),
                    "L" => Some(&["1. one", "   - deep", "2. two"]),
                    "P" => Some(&["![p](x.svg)"]),
                    "E" => Some(&["! unknown name"]),
                    _ => None,
                };
                let lines: Option<Vec<String>> = lines.map(|l| l.iter().map(ToString::to_string).collect());
                edits.extend(match lines {
                    Some(lines) if pair.is_block() => block_edit(text, BASE, &pair, &lines),
                    _ => inline_edit(text, BASE, &pair, value),
                });
            }
            Place::Table(table) => {
                for row in &table.rows {
                    edits.extend(row_edits(text, BASE, row, &[(table.header.cells.len() - 1, value)]));
                }
            }
        }
    }
    edits
}

fn fill(text: &str, value: &str) -> String {
    match apply(text.as_bytes(), &edits(text, value)).unwrap() {
        Rewrite::Unchanged => text.to_string(),
        Rewrite::Patched(bytes) => String::from_utf8(bytes).unwrap(),
    }
}

#[track_caller]
fn fills(before: &str, after: &str) {
    assert_eq!(fill(before, "0.9"), after);
    assert_eq!(fill(after, "0.9"), after, "a second time");
    assert_eq!(edits(after, "0.9"), [], "a second time");
    let other = fill(after, "1 in 2000");
    assert_eq!(fill(&other, "0.9"), after, "and back from {other:?}");
}

#[test]
fn in_fences() {
    fills("```tieback\nR(A) ?\n```\n", "```tieback\nR(A) ? 0.9\n```\n");
    fills(
        "```tieback\nR ?   0.12  # mine\nF ?  # c\nG ?  \n```",
        "```tieback\nR ? 0.9  # mine\nF ? 0.9  # c\nG ? 0.9  \n```",
    );
    fills("```tieback\r\nS ?\r\nB\r\n```\r\n", "```tieback\r\nS ?\r\n? 1 0.9\r\n? 2\r\nB\r\n```\r\n");
    fills(
        "> - ~~~tieback\n>     S ? # c\n>     ? old\n>    ? older\n>     ?\n>   B\n",
        "> - ~~~tieback\n>     S ? # c\n>     ? 1 0.9\n>     ? 2\n>   B\n",
    );
    fills("```tieback\n\tS ? gone", "```tieback\n\tS ?\n\t? 1 0.9\n\t? 2");
    fills("```tieback\r\nS ?\r\n? x", "```tieback\r\nS ?\r\n? 1 0.9\r\n? 2");
    fills("```tieback\nS ?\n", "```tieback\nS ?\n? 1 0.9\n? 2\n");
    // A question that has become a short one loses its lines.
    fills("```tieback\nR ?\n? a\n? b\nB\n```\n", "```tieback\nR ? 0.9\nB\n```\n");
    fills("```tieback\nR ?\n? a\n? b", "```tieback\nR ? 0.9");
    fills("```tieback\r\nR ?\n? a\r\nQ ?\r\n```\n", "```tieback\r\nR ? 0.9\nQ ? 0.9\r\n```\n");
}

#[test]
fn in_prose() {
    fills("a <!--? R -->, <!--?F--> b\n", "a <!--? R -->0.9<!--/?-->, <!--?F-->0.9<!--/?--> b\n");
    fills("# a <!--? R -->0.1<!--/?-->\n", "# a <!--? R -->0.9<!--/?-->\n");
    fills("| a <!--? R --> |\n|---|\n", "| a <!--? R -->0.9<!--/?--> |\n|---|\n");
    fills("<!--? R -->  \r\ntext", "<!--? R -->0.9<!--/?-->  \r\ntext");
    fills("<!--? R --> text\n", "<!--? R -->0.9<!--/?--> text\n");
    // From lines to one line, and blanks stay.
    fills("<!--? R -->  \n- a\n- b\n<!--/?--> \nx\n", "<!--? R -->0.9<!--/?-->   \nx\n");
    assert_eq!(fill("a <!--? R -->", "x[1] | <b>"), r"a <!--? R -->x\[1\] | \<b><!--/?-->");
    assert_eq!(fill("<!--? R -->", "x[1] | <b>"), r"<!--? R -->x[1] | &lt;b><!--/?-->");
    assert_eq!(fill("a|<!--? R -->\n-|-\n", "x | y"), "a|<!--? R -->x \\| y<!--/?-->\n-|-\n");
}

#[test]
fn in_blocks() {
    let table = "| a | b |\n|---|--:|\n| x\\|y | 1 |\n";
    fills("t\n<!--? T -->\nu\n", &format!("t\n<!--? T -->\n{table}<!--/?-->\nu\n"));
    fills("<!--? T -->", &format!("<!--? T -->\n{table}<!--/?-->"));
    fills("<!--? T -->0.3<!--/?-->\n", &format!("<!--? T -->\n{table}<!--/?-->\n"));
    fills(
        "<!--? L -->  \r\n\r\n* old\r\n\r\n<!--/?-->\r\nx",
        "<!--? L -->  \r\n1. one\r\n   - deep\r\n2. two\r\n<!--/?-->\r\nx",
    );
    fills(
        "> - <!--? L -->\n>\n> x\n",
        "> - <!--? L -->\n>   1. one\n>      - deep\n>   2. two\n>   <!--/?-->\n>\n> x\n",
    );
    fills(
        "10. a\n\n    <!--? P -->\n    b\n",
        "10. a\n\n    <!--? P -->\n    ![p](x.svg)\n    <!--/?-->\n    b\n",
    );
    fills("- <!--? E -->\n- b\n", "- <!--? E -->\n  ! unknown name\n  <!--/?-->\n- b\n");
    fills(
        "[^long-name]: <!--? T -->\n\nx[^long-name]\n",
        "[^long-name]: <!--? T -->\n    | a | b |\n    |---|--:|\n    | x\\|y | 1 |\n    <!--/?-->\n\nx[^long-name]\n",
    );
    fills("\u{feff}<!--? P -->\nx\n", "\u{feff}<!--? P -->\n![p](x.svg)\n<!--/?-->\nx\n");
    fills("a <!--? T --> b\n", "a <!--? T -->0.9<!--/?--> b\n");
}

#[test]
fn in_tables() {
    fills(
        "<!--? table -->\n| n | R ? |\n|---|---|\n| a |  |\n| b |      |\n| c | 0.12 |\n| d ||\n| e | |\n",
        "<!--? table -->\n| n | R ? |\n|---|---|\n| a | 0.9 |\n| b | 0.9     |\n| c | 0.9 |\n| d | 0.9 |\n| e | 0.9 |\n",
    );
    fills(
        "<!--? table -->\r\nn|m|R ?\r\n-|-|-\r\na  \r\n| b |\r\nc|x|1\r\nd|e",
        "<!--? table -->\r\nn|m|R ?\r\n-|-|-\r\na |  | 0.9  \r\n| b |  | 0.9 |\r\nc|x|0.9\r\nd|e | 0.9",
    );
    fills(
        "> <!--? table -->\n> |n|R ?|\n> |-|-|\n> |a|b|c|\n> |a\n",
        "> <!--? table -->\n> |n|R ?|\n> |-|-|\n> |a|b|c|\n> |a | 0.9\n",
    );
}

#[test]
fn nothing_else_changes() {
    let note = "\u{feff}---\r\na: b\r\n---\n\ttab  \r\n\r\ne\u{301}\0\u{2028} <!--? R -->x\n\n- a\n\n\n  b  ";
    let filled = fill(note, "0.9");
    assert_eq!(filled.replace("0.9<!--/?-->", ""), note);
}

fn pieces() -> impl Strategy<Value = String> {
    let piece = prop::sample::select(vec![
        "<!--? R -->",
        "<!--? T -->",
        "\n\n<!--? L -->\n",
        "\n<!--? P -->\n",
        "<!--/?-->",
        "\n<!--/?-->\n",
        "<!--? table -->\n| a | R ? |\n|--|--|\n| b",
        "```tieback\n",
        "\n~~~tieback\nR ?\n",
        "\n```\n",
        "\n",
        "\r\n",
        "\n\n",
        "> ",
        "- ",
        "1. ",
        "  ",
        "    ",
        "\t",
        "|",
        "*",
        "[x](u)",
        "![",
        "\n! e\n",
        "<div>",
        "x",
        "R ? 0.8 # c\n",
        "S ?\n",
        "? old\n",
        "- a\n- b\n",
    ]);
    prop::collection::vec(piece, 0..25).prop_map(|p| p.concat())
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 3000, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn twice_is_once(text in pieces()) {
        let once = fill(&text, "0.9");
        prop_assert_eq!(fill(&once, "0.9"), once);
    }
}
