//! What an answer looks like: tieback overwrites nothing else.

use nom::branch::alt;
use nom::bytes::complete::{tag, take_till1, take_while1};
use nom::character::complete::{char, digit1, one_of, space0, space1};
use nom::combinator::{all_consuming, opt, recognize, rest, value};
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

fn unit(input: &str) -> IResult<&str, &str> {
    alt((
        recognize((space0, opt(char('%')), char('/'), word)),
        recognize((space0, char('%'))),
        recognize((space1, word)),
    ))
    .parse(input)
}

fn word(input: &str) -> IResult<&str, &str> {
    take_while1(|c: char| c.is_alphanumeric() || c == '_').parse(input)
}

/// `[~]number [unit]`, also `1 - 6.403e-93` and the interval of a `~` value.
fn plain(input: &str) -> IResult<&str, ()> {
    value(
        (),
        (
            opt((char('~'), space0)),
            alt((recognize((tag("1 - "), number)), recognize((tag("1 in "), number)), number)),
            opt(unit),
            opt(tag(" from bounds")),
            opt(recognize((tag(" ("), take_till1(|c| c == ')'), char(')')))),
        ),
    )
    .parse(input)
}

fn answer(input: &str) -> IResult<&str, ()> {
    alt((
        value((), all_consuming(plain)),
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
pub fn is_answer(text: &str) -> bool {
    let text = text.trim();
    text.is_empty() || text == "!" || answer(text).is_ok()
}

#[cfg(test)]
mod tests {
    use super::is_answer;

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
        ] {
            assert!(is_answer(yes), "{yes}");
        }
        for no in [
            "see above",
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
