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
            opt((char('~'), space0)),
            alt((recognize((alt((tag("1 - "), tag("100 - "), tag("1 in "))), number)), number)),
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
