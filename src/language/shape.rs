//! What an answer looks like: tieback overwrites nothing else.

use nom::branch::alt;
use nom::bytes::complete::{tag, take_till1, take_while1};
use nom::character::complete::{char, digit1, one_of, space0, space1};
use nom::combinator::{all_consuming, opt, recognize, rest, value};
use nom::multi::many0_count;
use nom::sequence::preceded;
use nom::{IResult, Parser};

fn number(input: &str) -> IResult<&str, &str> {
    recognize((
        opt(char('-')),
        digit1,
        opt((char('.'), digit1)),
        opt((one_of("eE"), opt(one_of("+-")), digit1)),
    ))
    .parse(input)
}

/// `%`, `/yr`, `%/kh`, ` h`, ` h·kg/start^2`: what [`crate::system::Units::symbol`] writes.
fn unit(input: &str) -> IResult<&str, &str> {
    alt((
        recognize((space0, opt(char('%')), below, many0_count(below))),
        recognize((space0, char('%'))),
        recognize((space1, factor, many0_count((char('·'), factor)), many0_count(below))),
    ))
    .parse(input)
}

fn below(input: &str) -> IResult<&str, &str> {
    recognize((char('/'), factor)).parse(input)
}

fn factor(input: &str) -> IResult<&str, &str> {
    recognize((word, opt((char('^'), digit1)))).parse(input)
}

/// A name without quotes.
fn word(input: &str) -> IResult<&str, &str> {
    let run = |input| take_while1(|c: char| c.is_alphanumeric() || c == '_').parse(input);
    recognize((run, many0_count((one_of(".-"), run)))).parse(input)
}

/// `[~]number [unit]`, also `1 - 6.403e-93` and the interval of a `~` value.
fn plain(input: &str) -> IResult<&str, ()> {
    value(
        (),
        (
            alt((recognize((alt((tag("1 - "), tag("100 - "), tag("1 in "))), number)), number)),
            opt(unit),
            opt(tag(" from bounds")),
        ),
    )
    .parse(input)
}

/// A value that is not exact, with its interval.
fn about(input: &str) -> IResult<&str, ()> {
    let interval = recognize((tag(" ("), take_till1(|c| c == ')'), char(')')));
    value((), (char('~'), space0, plain, opt(interval))).parse(input)
}

fn answer(input: &str) -> IResult<&str, ()> {
    alt((
        value((), all_consuming(plain)),
        value((), all_consuming(about)),
        value((), all_consuming((tag("< "), number, opt(unit)))),
        value((), all_consuming((tag("> "), opt(alt((tag("1 - "), tag("100 - ")))), number, opt(unit)))),
        value((), all_consuming(tag("infinite"))),
        value((), all_consuming(tag("none"))),
        value((), preceded(tag("none: "), rest)),
        value((), preceded(alt((tag("met: "), tag("NOT met: "), tag("UNDECIDED: "))), rest)),
        value((), preceded((char('!'), one_of(" \t")), rest)),
    ))
    .parse(input)
}

/// Whether `text`, found right of a question mark, is something tieback wrote.
/// `is_unit` knows the units of the notes: `5 bananas` is nobody's answer.
pub fn is_answer(text: &str, is_unit: &dyn Fn(&str) -> bool) -> bool {
    let text = text.trim();
    text.is_empty() || text == "!" || (answer(text).is_ok() && units_known(text, is_unit))
}

/// Whether the words of a value are units; texts after a colon say anything.
fn units_known(text: &str, is_unit: &dyn Fn(&str) -> bool) -> bool {
    if !text.starts_with(|c: char| c.is_ascii_digit() || matches!(c, '~' | '-' | '<' | '>')) {
        return true;
    }
    let value = text.split(" (").next().unwrap_or(text).trim_end_matches(" from bounds");
    let words = value.split(|c: char| c.is_whitespace() || matches!(c, '/' | '·' | '%' | '~'));
    let mut words = words
        .map(|w| w.split('^').next().unwrap_or(w))
        .filter(|w| w.starts_with(|c: char| c.is_alphabetic() || c == '_') && *w != "in" && *w != "infinite");
    let stroke_then_digit =
        value.match_indices('/').any(|(i, _)| value[i + 1..].starts_with(|c: char| c.is_ascii_digit()));
    !stroke_then_digit && words.all(is_unit)
}

/// Whether a line that follows a question is one of a table or a list of tieback's.
pub fn is_answer_line(text: &str) -> bool {
    let text = text.trim_start().strip_prefix('?').unwrap_or(text).trim();
    let numbered =
        text.split_once(". ").is_some_and(|(n, _)| n.bytes().all(|b| b.is_ascii_digit()) && !n.is_empty());
    numbered
        || ["order  ", "thing  ", "single point  ", "- ", "assumed: ", "… "]
            .iter()
            .any(|head| text.starts_with(head))
        || text.ends_with(" for certain")
}

/// Whether the first line of a block between comments is one of tieback's.
pub fn is_answer_block(text: &str) -> bool {
    let first = text.lines().map(|l| l.trim_start_matches([' ', '>', '\t'])).find(|l| !l.trim().is_empty());
    let Some(first) = first else { return true };
    let cell = first.trim_start_matches('|').split('|').next().unwrap_or("").trim();
    first.starts_with("! ")
        || first.starts_with("- ")
        || (first.starts_with('|') && matches!(cell, "order" | "thing" | "single point"))
        || first.split_once(". ").is_some_and(|(n, _)| n.bytes().all(|b| b.is_ascii_digit()) && !n.is_empty())
}

/// Whether the text of a sheet's cell is one of tieback's: an answer of one
/// line, or the lines of a table or a list.
pub fn is_answer_cell(text: &str, is_unit: &dyn Fn(&str) -> bool) -> bool {
    let text = text.trim();
    let first = text.lines().next().unwrap_or("");
    let numbered = first.split_once(". ").is_some_and(|(n, _)| n == "1");
    let head = first.split_once(" | ").map(|(head, _)| head);
    numbered
        || first.starts_with("• ")
        || matches!(head, Some("order" | "thing" | "single point"))
        || (first.len() == text.len() && is_answer(text, is_unit))
}

#[cfg(test)]
mod tests {

    fn is_answer(text: &str) -> bool {
        super::is_answer(text, &|w| matches!(w, "h" | "kg" | "start" | "yr" | "kh" | "start-up" | "warm-up"))
    }

    #[test]
    fn cells_may_hold_lists() {
        let is_cell = |text| super::is_answer_cell(text, &|w| w == "h");
        for yes in ["", "0.98", "12 h", "order | cut set\n1 | gate", "1. R(x) = 0.9\n    b", "• none", "! no"]
        {
            assert!(is_cell(yes), "{yes}");
        }
        for no in ["see annex", "0.98\nmine", "2. second", "name | x", "- mine"] {
            assert!(!is_cell(no), "{no}");
        }
    }

    #[test]
    fn answers_are_told_from_what_a_person_wrote() {
        for yes in [
            "",
            "0.98570",
            "1 in 69.93",
            "98.57%",
            "98.57 %",
            "4.000e-5",
            "1 - 6.403e-93",
            "100 - 6.4e-91%",
            "3.2 kg·h/start^2",
            "~0.98",
            "~ 0.98 (0.97 to 0.99)",
            "12.5 h",
            "3.0 /yr",
            "3.0 %/kh",
            "-0.5",
            "< 1e-300",
            "> 1 - 1e-300",
            "infinite",
            "none: R does not tend to 0",
            "met: 0.98570, uses 71.5% of the allowed 0.02",
            "NOT met: 0.9",
            "UNDECIDED: ~0.9",
            "! unknown name \"strainr\": did you mean \"strainer\"?",
            "12",
            "1 in 1.234e8",
            "100 - 1.000e-18%",
            "6.000 /h^2",
            "0.4444 kg^2/h^2",
            "3.000 h·kg/start-up",
            "2.000 /warm-up",
        ] {
            assert!(is_answer(yes), "{yes}");
        }
        for no in [
            "see above",
            "5 bananas",
            "10/12",
            "0.9 (see annex)",
            "12 of",
            "0.9 see_annex",
            "0.98 I think",
            "about 0.98",
            "!important",
            "0,98",
            "0.98 h 3",
            "unmet: 3",
            "TBD",
            "1 in ten",
            "??",
        ] {
            assert!(!is_answer(no), "{no}");
        }
    }
}
