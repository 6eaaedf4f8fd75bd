use super::*;
use crate::source::{Code, Span};
use proptest::prelude::*;

const BASE: u32 = 1000;

fn at(text: &str, span: Span) -> &str {
    &text[(span.start - BASE) as usize..(span.end - BASE) as usize]
}

/// Every place in one line of text.
fn show(text: &str) -> Vec<String> {
    let cell = |c: &Cell| if c.missing { "missing".to_string() } else { format!("{:?}", at(text, c.text)) };
    let row = |r: &Row| r.cells.iter().map(cell).collect::<Vec<_>>().join(",");
    find(text, BASE)
        .places
        .iter()
        .map(|place| match place {
            Place::Fence(f) => {
                let lines: Vec<_> = f.lines.iter().map(|l| at(text, l.text)).collect();
                format!("fence {lines:?}")
            }
            Place::Pair(p) => {
                let form = match p.form {
                    PairForm::Inline { in_cell: true, .. } => "cell".to_string(),
                    PairForm::Inline { in_html: true, .. } => "html".to_string(),
                    PairForm::Inline { .. } => "inline".to_string(),
                    PairForm::Block { prefix, on_line, .. } => {
                        format!("block{} {:?}", if on_line { " line" } else { "" }, at(text, prefix))
                    }
                };
                let answer = p.answer.map_or("-".to_string(), |a| format!("{:?}", at(text, a)));
                format!("{form} {:?} {answer}", at(text, p.question))
            }
            Place::Table(t) => {
                let rows: Vec<_> = t.rows.iter().map(row).collect();
                format!("table {} / {}", row(&t.header), rows.join(" / "))
            }
        })
        .collect()
}

fn codes(text: &str) -> Vec<Code> {
    find(text, BASE).problems.iter().map(|p| p.code).collect()
}

#[track_caller]
fn finds(text: &str, places: &[&str], problems: &[Code]) {
    assert_eq!(show(text), places, "{text:?}");
    assert_eq!(codes(text), problems, "{text:?}");
}

#[test]
fn a_line_is_small() {
    assert_eq!(size_of::<Line>(), 16);
}

#[test]
fn fences() {
    finds("# T\n\n```tieback\nA = 1\n\nR(A) ?\n```\nx\n", &[r#"fence ["A = 1", "", "R(A) ?"]"#], &[]);
    finds("~~~~~ tieback title\nA\n~~~\n~~~~~~\n", &[r#"fence ["A", "~~~"]"#], &[]);
    finds("``` \ttieback\n```\n", &["fence []"], &[]);
    finds("```tiebackish\nA\n```\n```rust tieback\n```\n    ```tieback\n", &[], &[]);
    for near in ["tiebacks", "Tieback", "tieback,", "tibeack", "tieack", "{tieback}"] {
        finds(&format!("tieback\n~~~{near} x\nA\n~~~\n"), &[], &[Code::NearlyABlock]);
    }
    finds("\n```tieback\u{feff}\\|\n", &[], &[Code::NearlyABlock]);
    finds("tieback\n```tie\n```\n```text\n```\n```back\n```\n", &[], &[]);
    finds("````md\n```tieback\nA\n```\n````\n", &[], &[]);
    finds("\u{feff}```tieback\nA\n```\n", &[r#"fence ["A"]"#], &[]);
    finds(
        "```tieback\nA\u{2028}b \0 e\u{301}  \n```",
        &[&format!("fence {:?}", ["A\u{2028}b \0 e\u{301}  "])],
        &[],
    );
    finds("```tieback\nA\n```\n~~~tieback\nB\n~~~", &[r#"fence ["A"]"#, r#"fence ["B"]"#], &[]);
}

#[test]
fn fences_in_containers() {
    finds("> ```tieback\n> A\n>\n>   B\n> ```\n", &[r#"fence ["A", "", "  B"]"#], &[]);
    finds("- a\n  ```tieback\n  A\n\n  B\n  ```\n", &[r#"fence ["A", "", "B"]"#], &[]);
    finds("1. > - ~~~tieback\n   >   A\n   >   ~~~\n", &[r#"fence ["A"]"#], &[]);
    finds("- ```tieback\n\tA\n  \tB\n  ```\n", &["fence [\"A\", \"\\tB\"]"], &[]);
    finds("  ```tieback\n  A\n B\n  ```\n", &[r#"fence ["A", "B"]"#], &[]);
    finds("[^1]: note\n\n    ```tieback\n    A\n    ```\n\nx[^1]\n", &[r#"fence ["A"]"#], &[]);
}

#[test]
fn lines_know_their_bytes() {
    let text = "> ```tieback\r\n> A\r\n>\r\n> B\r\n> ```\r\n";
    let found = find(text, BASE);
    let Some(Place::Fence(fence)) = found.places.first() else { panic!("no fence") };
    let lines: Vec<_> = fence
        .lines
        .iter()
        .map(|l| (at(text, l.text), at(text, Span { start: l.start, end: l.next })))
        .collect();
    assert_eq!(lines, [("A", "> A\r\n"), ("", ">\r\n"), ("B", "> B\r\n")]);
    finds("```tieback\r\nA\r\n\r\nB\nC\r\n```\r\n", &[r#"fence ["A", "", "B", "C"]"#], &[]);
}

#[test]
fn unclosed_fences() {
    finds("```tieback\nA\n", &[r#"fence ["A"]"#], &[Code::UnclosedFence]);
    finds("```tieback\nx```", &[r#"fence ["x```"]"#], &[Code::UnclosedFence]);
    finds("```tieback", &["fence []"], &[Code::UnclosedFence]);
    finds("> ~~~tieback\n> A\nlazy\n", &[r#"fence ["A"]"#], &[Code::UnclosedFence]);
    finds("- ```tieback\n  A\n- b\n", &[r#"fence ["A"]"#], &[Code::UnclosedFence]);
}

#[test]
fn inline_pairs() {
    finds(
        "a <!--? R(x) -->0.9<!--/?--> b <!--?F(x)-->\n",
        &[r#"inline "R(x)" "0.9""#, r#"inline "F(x)" -"#],
        &[],
    );
    finds("# H <!--? R(x) --> #\n", &[r#"inline "R(x)" -"#], &[]);
    finds("S <!--? q -->\n===\n", &[r#"inline "q" -"#], &[]);
    finds("*a <!--? q -->1<!--/?--> b*\n", &[r#"inline "q" "1""#], &[]);
    finds("[l <!--? q -->1<!--/?-->](u)\n", &[r#"inline "q" "1""#], &[]);
    finds("x[^1]\n\n[^1]: f <!--? q -->\n", &[r#"inline "q" -"#], &[]);
    finds("- i <!--? q -->\n- j <!--? r -->1<!--/?-->\n", &[r#"inline "q" -"#, r#"inline "r" "1""#], &[]);
    finds(
        "| a <!--? q --> | b |\n|-|-|\n| <!--? r -->1<!--/?--> | c |\n",
        &[r#"cell "q" -"#, r#"cell "r" "1""#],
        &[],
    );
    // The nearest opener has the closer.
    finds("a <!--? q --> <!--? r -->1<!--/?-->\n", &[r#"inline "q" -"#, r#"inline "r" "1""#], &[]);
    // Over a soft line break, in a quote.
    finds("> a <!--? q -->met:\n> 1<!--/?-->\n", &["inline \"q\" \"met:\\n> 1\""], &[]);
    finds("a <!--?-->\n", &[r#"inline "" -"#], &[]);
}

#[test]
fn closers_stay_in_their_paragraph() {
    finds("a <!--? q -->\n\nb <!--/?-->\n", &[r#"inline "q" -"#], &[Code::StrayCloser]);
    finds("- a <!--? q -->\n- b <!--/?-->\n", &[r#"inline "q" -"#], &[Code::StrayCloser]);
    finds("|a <!--? q -->| b <!--/?-->|\n|-|-|\n", &[r#"cell "q" -"#], &[Code::StrayCloser]);
    finds("a <!--/?-->\n", &[], &[Code::StrayCloser]);
}

#[test]
fn what_is_no_pair() {
    for text in [
        "a `<!--? q -->` b\n",
        "    <!--? q -->\n",
        "```\n<!--? q -->\n```\n",
        "[l](u \"<!--? q -->\")\n",
        "a <!-- <!--? q --> b\n",
        "<!-- <!--? q --> b\n",
        "---\nt: <!--? q -->\n---\nx\n",
        "+++\nt = \"<!--? q -->\"\n+++\nx\n",
        "\u{feff}---\r\nt: <!--? q -->\r\n---\r\n",
        "<div title=\"<!--? q -->\">\nx\n</div>\n",
        "<pre>\n<!--? q -->\n</pre>\n",
        "a <b title='<!--? q -->'>b</b>\n",
        "a \\<!--? q -->\n",
    ] {
        finds(text, &[], &[]);
    }
    // Two rules are no front matter.
    finds("a\n\n---\nb <!--? q -->\n\n---\n", &[r#"inline "q" -"#], &[]);
    finds("---\n\nb <!--? q -->\n\n---\n", &[r#"inline "q" -"#], &[]);
}

#[test]
fn pairs_in_html() {
    finds("<details>\n<summary>R <!--? q -->1<!--/?--></summary>\n", &[r#"html "q" "1""#], &[]);
    finds("<!--? q --> of *x*\n", &[r#"html "q" -"#], &[Code::PairStartsLine]);
    finds(
        "t\n<!--? q -->1<!--/?--> and <!--? r -->2<!--/?-->\n",
        &[r#"html "q" "1""#, r#"html "r" "2""#],
        &[Code::PairStartsLine],
    );
    finds("<!-- n --> a <!--? q -->\n", &[r#"html "q" -"#], &[]);
    finds("t <!--? q -->1\n<!--/?--> u\n", &[r#"inline "q" -"#], &[Code::StrayCloser]);
}

#[test]
fn broken_openers() {
    finds("a <!--? q\n", &[], &[Code::UnclosedPair]);
    finds("<!--? q\n\nb\n", &[], &[Code::UnclosedPair]);
    finds("a <!--? x -- y --> b\n", &[], &[Code::MisplacedPair]);
    finds("<!--? x -- y -->\n", &[], &[Code::MisplacedPair]);
    finds("a <!--? x\ny --> b\n", &[], &[Code::MisplacedPair]);
    finds("a <!--? table --> b\n", &[], &[Code::TableShape]);
}

#[test]
fn block_pairs() {
    finds("<!--? q -->", &[r#"block "" "q" -"#], &[]);
    finds("t\n<!--? q -->  \nu\n", &[r#"block "" "q" -"#], &[]);
    finds("<!--? q -->1<!--/?-->\n", &[r#"block line "" "q" "1""#], &[]);
    finds("<!--? q -->\n<!--/?-->\n", &[r#"block "" "q" "\n""#], &[]);
    for answer in
        ["|a|\n|-|\n|1|", "- a\n- b", "\n1. a\n\n   b\n", "![p](x.svg)", "! no such name", "\n[![p](x)](y)\n"]
    {
        let text = format!("t\n\n<!--? q -->\n{answer}\n<!--/?-->\nu\n");
        finds(&text, &[&format!("block \"\" \"q\" {:?}", format!("\n{answer}\n"))], &[]);
        let item = format!("- t\n  <!--? q -->\n{answer}\n<!--/?-->\nu")
            .replace('\n', "\n  ")
            .replacen("    ", "  ", 1);
        let shown = show(&item);
        assert!(shown[0].starts_with("block \"  \" \"q\" \"\\n"), "{item:?} {shown:?}");
        let quote = format!("<!--? q -->\n{answer}\n<!--/?-->\nu").replace('\n', "\n> ");
        let shown = show(&format!("> {quote}"));
        assert!(shown[0].starts_with("block \"> \" \"q\" \"\\n"), "{quote:?} {shown:?}");
    }
    for between in
        ["text", "- a\n\ntext", "|a|\n|-|\n\n- b", "# h", "---", "```\nx\n```", "- a\n  ```tieback\n  ```"]
    {
        let text = format!("<!--? q -->\n{between}\n\n<!--/?-->\n");
        assert_eq!(show(&text)[0], r#"block "" "q" -"#, "{text:?}");
        assert_eq!(codes(&text), [Code::StrayCloser], "{text:?}");
    }
    // Another parent.
    finds("- <!--? q -->\n  - a\n\n<!--/?-->\n", &[r#"block "- " "q" -"#], &[Code::StrayCloser]);
    finds(
        "<!--? q -->\n<!--? r -->\n- a\n<!--/?-->\n",
        &[r#"block "" "q" -"#, "block \"\" \"r\" \"\\n- a\\n\""],
        &[],
    );
    finds("\u{feff}<!--? q -->\r\n- a\r\n<!--/?-->\r\n", &["block \"\" \"q\" \"\\r\\n- a\\r\\n\""], &[]);
}

#[test]
fn tables() {
    finds(
        "<!--? table -->\n| name | R ? |\n|---|---|\n| a |  |\n| b | 0.9 |\n| c\n",
        &[r#"table "name","R ?" / "a","" / "b","0.9" / "c",missing"#],
        &[],
    );
    finds(
        "<!--?table-->\n\nname | R ?\n--|--\na\\|b | \nc ||\n",
        &[r#"table "name","R ?" / "a\\|b",missing / "c","""#],
        &[],
    );
    finds(
        "> <!--? table -->\n> |n|R ?|\n> |-|-|\n> |a|b|c|\n> |a|b\\|c|\n",
        &[r#"table "n","R ?" / "a","b" / "a","b\\|c""#],
        &[Code::TableShape],
    );
    finds(
        "<!--? table -->\n|n|F <!--? q -->|\n|-|-|\n|a|1|\n",
        &[r#"cell "q" -"#, r#"table "n","F <!--? q -->" / "a","1""#],
        &[],
    );
    finds("<!--? table -->\ntext\n", &[], &[Code::TableShape]);
    finds("<!--? table -->", &[], &[Code::TableShape]);
    finds("- <!--? table -->\n\n|n|\n|-|\n|a|\n", &[], &[Code::TableShape]);
    finds("|n|R ?|\n|-|-|\n|a|1|2|\n<!--? q -->\n", &[r#"block "" "q" -"#], &[]);
}

#[test]
fn quick_exit() {
    assert_eq!(find("no question here <!-- ? --> ```x", 0), Found::default());
}

fn pieces() -> impl Strategy<Value = String> {
    let piece = prop::sample::select(vec![
        "<!--? R(a) -->",
        "<!--?",
        "-->",
        "<!--/?-->",
        "<!--? table -->",
        "--",
        "```tieback",
        "~~~",
        "```",
        "\n",
        "\n",
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
        "|-|-|",
        "| a | R ? |",
        "\\|",
        "`",
        "*",
        "[",
        "](u)",
        "![",
        "! e",
        "<div>",
        "<pre>",
        "</pre>",
        "<b t=\"",
        "[^1]",
        "[^1]: ",
        "---",
        "# ",
        "é",
        "\u{2028}",
        "\u{feff}",
        "\0",
        "x",
        "R(a) ?",
        "? 0.9",
        "\r",
    ]);
    prop::collection::vec(piece, 0..40).prop_map(|p| p.concat())
}

fn check(text: &str) -> Result<(), TestCaseError> {
    let found = find(text, BASE);
    let end = BASE as usize + text.len();
    let mut spans: Vec<Span> = found.problems.iter().map(|p| p.place).collect();
    let mut order = Vec::new();
    for place in &found.places {
        match place {
            Place::Fence(f) => {
                order.push(f.whole.start);
                spans.push(f.whole);
                for l in &f.lines {
                    prop_assert!(l.start <= l.text.start && l.text.end <= l.next);
                    spans.extend([l.text, Span { start: l.start, end: l.next }]);
                }
                for two in f.lines.windows(2) {
                    prop_assert_eq!(two[0].next, two[1].start);
                }
            }
            Place::Pair(p) => {
                order.push(p.opener.start);
                spans.extend([p.question, p.opener, p.whole]);
                spans.extend(p.answer);
                if let PairForm::Block { prefix, blanks, .. } = p.form {
                    spans.extend([prefix, Span { start: p.opener.end, end: blanks }]);
                }
                if let Some(a) = p.answer {
                    prop_assert_eq!(&text[(a.end - BASE) as usize..(p.whole.end - BASE) as usize], CLOSER);
                }
            }
            Place::Table(t) => {
                order.push(t.rows.last().unwrap_or(&t.header).end);
                spans.push(t.opener);
                for row in t.rows.iter().chain([&t.header]) {
                    prop_assert_eq!(row.cells.len(), t.header.cells.len());
                    spans.push(Span { start: row.end, end: row.end });
                    spans.extend(row.cells.iter().map(|c| c.text));
                }
            }
        }
    }
    prop_assert!(order.is_sorted(), "{:?}", text);
    for span in spans {
        prop_assert!(BASE <= span.start && span.start <= span.end && span.end as usize <= end);
        prop_assert!(text.get((span.start - BASE) as usize..(span.end - BASE) as usize).is_some());
    }
    Ok(())
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 3000, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn awkward_notes(text in pieces()) {
        check(&text)?;
    }

    #[test]
    fn arbitrary_text(text in "\\PC*", tail in "(?s).*") {
        check(&format!("{text}\n```tieback\n{tail}"))?;
        check(&format!("{tail}<!--? q -->{text}"))?;
    }
}
