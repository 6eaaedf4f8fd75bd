//! Text to tokens, one line at a time, with nom.
//!
//! A line ends at its first comment or question mark outside quotes; what
//! stands right of the question mark is tieback's and is not read as language.

use super::tree::{Mark, Names, Sym};
use super::words;
use crate::source::{Code, Problem, Span};
use nom::branch::alt;
use nom::bytes::complete::{is_not, tag, take_while, take_while1};
use nom::character::complete::{char, digit1, one_of, satisfy};
use nom::combinator::{opt, peek, recognize, value};
use nom::multi::many0_count;
use nom::{IResult, Parser};

/// What a token is.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) enum Tok {
    /// A name or word; `quoted` when any part of it stands in quotes.
    Name {
        sym: Sym,
        quoted: bool,
    },
    Number,
    Percent,
    Arrow,
    Bars,
    Both,
    Plus,
    Minus,
    Star,
    Slash,
    Caret,
    Open,
    Close,
    Comma,
    Equals,
    AtLeast,
    AtMost,
    PlusMinus,
    Dots,
}

impl Tok {
    /// Whether a line that ends with this token goes on.
    pub(crate) fn goes_on(self) -> bool {
        use Tok::*;
        matches!(
            self,
            Arrow | Bars | Both | Plus | Minus | Star | Slash | Caret | Equals | AtLeast | AtMost | Comma
        )
    }
}

/// A token with its place.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) struct Token {
    pub(crate) tok: Tok,
    pub(crate) span: Span,
}

fn starts_name(c: char) -> bool {
    c.is_alphabetic() || c == '_'
}

fn continues_name(c: char) -> bool {
    c.is_alphanumeric() || c == '_' || (!c.is_ascii() && unicode_normalization::char::is_combining_mark(c))
}

fn plain(input: &str) -> IResult<&str, &str> {
    recognize((
        satisfy(starts_name),
        many0_count(alt((
            value((), take_while1(continues_name)),
            value((), (one_of(".-"), peek(satisfy(continues_name)))),
        ))),
    ))
    .parse(input)
}

fn quoted(input: &str) -> IResult<&str, &str> {
    recognize((char('"'), many0_count(alt((is_not("\""), tag("\"\"")))), char('"'))).parse(input)
}

/// `feed.pump[1]`, `"Main pump".rate`
fn path(input: &str) -> IResult<&str, &str> {
    // Most names are of plain letters and digits, and end there.
    let end = input.bytes().take_while(|b| b.is_ascii_alphanumeric() || *b == b'_').count();
    if input.starts_with(|c: char| c.is_ascii_alphabetic() || c == '_')
        && input.as_bytes().get(end).is_none_or(|b| b.is_ascii() && !b".-[\"".contains(b))
    {
        return Ok((&input[end..], &input[..end]));
    }
    recognize((
        alt((plain, quoted)),
        many0_count(alt((
            recognize((char('['), digit1, char(']'))),
            recognize((char('.'), alt((plain, quoted)))),
        ))),
    ))
    .parse(input)
}

fn number(input: &str) -> IResult<&str, &str> {
    // The same for numbers without an exponent.
    let bytes = input.as_bytes();
    let digits = |from: usize| bytes[from..].iter().take_while(|b| b.is_ascii_digit()).count();
    let mut end = digits(0);
    if end > 0 && bytes.get(end) == Some(&b'.') {
        let decimals = digits(end + 1);
        end += if decimals > 0 { decimals + 1 } else { 0 };
    }
    if end > 0 && !matches!(bytes.get(end), Some(b'e' | b'E')) {
        return Ok((&input[end..], &input[..end]));
    }
    recognize((digit1, opt((char('.'), digit1)), opt((one_of("eE"), opt(one_of("+-")), digit1)))).parse(input)
}

fn symbol(input: &str) -> IResult<&str, Tok> {
    // These begin nothing longer; trying all others first took a twentieth of the time of a note.
    let single = match input.as_bytes().first() {
        Some(b'(') => Some(Tok::Open),
        Some(b')') => Some(Tok::Close),
        Some(b',') => Some(Tok::Comma),
        Some(b'=') => Some(Tok::Equals),
        _ => None,
    };
    if let Some(tok) = single {
        return Ok((&input[1..], tok));
    }
    alt((
        value(Tok::Both, tag("<->")),
        value(Tok::Arrow, alt((tag("->"), tag("→")))),
        value(Tok::Bars, alt((tag("//"), tag("∥")))),
        value(Tok::PlusMinus, alt((tag("+/-"), tag("±")))),
        value(Tok::AtLeast, tag(">=")),
        value(Tok::AtMost, tag("<=")),
        value(Tok::Dots, tag("..")),
        alt((
            value(Tok::Plus, char('+')),
            value(Tok::Minus, char('-')),
            value(Tok::Star, char('*')),
            value(Tok::Slash, char('/')),
            value(Tok::Caret, char('^')),
            value(Tok::Percent, char('%')),
        )),
    ))
    .parse(input)
}

fn blanks(input: &str) -> IResult<&str, &str> {
    let end = input.bytes().take_while(|b| *b == b' ').count();
    if input.as_bytes().get(end).is_none_or(u8::is_ascii_graphic) {
        return Ok((&input[end..], &input[..end]));
    }
    take_while(|c: char| c.is_whitespace() || c == '\u{feff}').parse(input)
}

/// Whether `name` can stand without quotes (reserved words apart).
pub(crate) fn is_plain_name(name: &str) -> bool {
    matches!(path(name), Ok(("", _))) && !name.contains('"')
}

/// How a line of tokens ended.
#[derive(Clone, Copy, PartialEq, Debug)]
pub(crate) struct LineEnd {
    /// The question mark, if one stands on the line.
    pub(crate) mark: Option<Mark>,
    /// Whether a problem was found on the line.
    pub(crate) broken: bool,
}

/// Reads the tokens of one line, without its line ending, into `out`.
///
/// `at` is the offset of its first byte in the common count; `line` its number
/// in the block, kept in the mark.
pub(crate) fn line(
    text: &str,
    at: u32,
    line: u32,
    names: &mut Names,
    out: &mut Vec<Token>,
    problems: &mut Vec<Problem>,
) -> LineEnd {
    let place = |from: &str, to: &str| Span {
        start: at + (text.len() - from.len()) as u32,
        end: at + (text.len() - to.len()) as u32,
    };
    let mut rest = text;
    let mut broken = false;
    loop {
        let before = rest;
        rest = blanks(rest).map_or(rest, |(r, _)| r);
        let Some(c) = rest.chars().next() else { return LineEnd { mark: None, broken } };
        if c == '#' && (before.len() == text.len() || before.len() > rest.len()) {
            return LineEnd { mark: None, broken };
        }
        if c == '?' {
            let mark = at + (text.len() - rest.len()) as u32;
            let answer = answer_span(&rest[1..], mark + 1);
            return LineEnd { mark: Some(Mark { at: mark, answer, line }), broken };
        }
        let found = if starts_name(c) || c == '"' {
            path(rest).ok().map(|(after, text)| (after, name_token(text, names)))
        } else if c.is_ascii_digit() {
            number(rest).ok().map(|(after, _)| (after, Tok::Number))
        } else {
            symbol(rest).ok()
        };
        match found {
            Some((after, Tok::Number)) if malformed_after(after, out, names) => {
                let end = after.trim_start_matches(|c: char| ".,'_".contains(c) || c.is_ascii_digit());
                // What only ends the number is none of it: a comma that goes on to the next clause.
                let end = &after[after[..after.len() - end.len()].trim_end_matches([',', '\'', '_']).len()..];
                problems.push(bad_number(&rest[..rest.len() - end.len()], place(rest, end)));
                broken = true;
                out.push(Token { tok: Tok::Number, span: place(rest, end) });
                rest = end;
            }
            Some((after, tok)) => {
                out.push(Token { tok, span: place(rest, after) });
                rest = after;
            }
            None => {
                let mut after = &rest[c.len_utf8()..];
                if c == '.' {
                    after = after.trim_start_matches(|d: char| d == '.' || d.is_ascii_digit());
                }
                let problem = stray(c, rest, place(rest, after), place(rest, ""));
                // One message for a run of strays on a line: the rest follow from the first.
                if !broken {
                    problems.push(problem);
                }
                broken = true;
                let end = if c == '"' { "" } else { after };
                // Something stands here: the line does not go on only because what follows
                // an operator could not be read, and `pump: 0.98` was to define `pump`.
                let tok = if c == ':' { Tok::Equals } else { Tok::Number };
                out.push(Token { tok, span: place(rest, end) });
                rest = end;
            }
        }
    }
}

fn name_token(text: &str, names: &mut Names) -> Tok {
    if !text.contains('"') {
        return Tok::Name { sym: names.intern(text), quoted: false };
    }
    // Quotes come off; `""` inside them is one quote.
    let mut plain = String::with_capacity(text.len());
    let mut inside = false;
    let mut chars = text.chars().peekable();
    while let Some(c) = chars.next() {
        if c != '"' {
            plain.push(c);
        } else if inside && chars.peek() == Some(&'"') {
            chars.next();
            plain.push('"');
        } else {
            inside = !inside;
        }
    }
    Tok::Name { sym: names.intern(&plain), quoted: true }
}

/// `1.` and `1.2.3`, `12'500` and `12_500`, and `0,98` where no list of numbers can
/// stand; `0.97..0.99` is a range.
fn malformed_after(after: &str, before: &[Token], names: &Names) -> bool {
    let digit = |s: &str| s.starts_with(|c: char| c.is_ascii_digit());
    if after.starts_with('.') {
        return !after.starts_with("..");
    }
    match after.strip_prefix(['\'', '_', ',']) {
        Some(more) if digit(more) => !after.starts_with(',') || !numbers_may_follow(before, names),
        _ => false,
    }
}

/// Whether `1,2` may be two numbers here: in parentheses, those of a question apart.
fn numbers_may_follow(before: &[Token], names: &Names) -> bool {
    // Far enough back for any question; long lists stay linear.
    const FAR: usize = 64;
    let mut depth = 0;
    for (back, token) in before.iter().rev().take(FAR).enumerate() {
        match token.tok {
            Tok::Close => depth += 1,
            Tok::Open if depth > 0 => depth -= 1,
            Tok::Open => {
                let word = before.len().checked_sub(back + 2).and_then(|i| before.get(i));
                return match word.map(|w| w.tok) {
                    Some(Tok::Name { sym, quoted: false }) => {
                        let text = names.text(sym);
                        !words::QUESTIONS.contains(&text) && !words::LATER_QUESTIONS.contains(&text)
                    }
                    _ => true,
                };
            }
            _ => {}
        }
    }
    before.len() > FAR
}

/// A number that is none, as it was written.
fn bad_number(text: &str, place: Span) -> Problem {
    let error = |message| Problem::error(Code::MalformedNumber, place, message);
    if let Some((whole, part)) = text.split_once(',') {
        let problem = error("a comma stands between digits");
        let plain = text.bytes().all(|b| b == b',' || b.is_ascii_digit());
        return if plain && text.matches(',').count() > 1 {
            problem.mend(format!("write `{}`, without separators of thousands", text.replace(',', "")))
        } else if plain && part.len() == 3 && whole != "0" {
            problem
                .mend(format!("write `{whole}{part}` if the comma sets thousands apart"))
                .mend(format!("write `{whole}.{part}` if it is a decimal point"))
        } else if plain {
            problem.mend(format!("write `{whole}.{part}`: a decimal has a point"))
        } else {
            problem.mend("write a decimal with one point, and no separators of thousands")
        };
    }
    if text.contains(['\'', '_']) {
        let plain = text.replace(['\'', '_'], "");
        return error("a number has no separators of thousands").mend(format!("write `{plain}`"));
    }
    let problem = error("a decimal has one point, with a digit on both sides of it");
    match text.split_once('.') {
        Some(("", part)) if !part.contains('.') => problem.mend(format!("write `0.{part}`")),
        Some((whole, "")) => problem.mend(format!("write `{whole}` or `{whole}.0`")),
        _ => problem.mend("keep one of its points; thousands are not set apart"),
    }
}

fn stray(c: char, rest: &str, place: Span, to_end: Span) -> Problem {
    let after = &rest[c.len_utf8()..];
    match c {
        '–' | '—' | '−' if after.starts_with('>') => {
            Problem::error(Code::TypographicCharacter, place, format!("the dash `{c}` makes no arrow here"))
                .mend("write `->` with the plain `-`")
        }
        '"' => Problem::error(Code::UnclosedQuote, to_end, "this quoted name or text has no closing quote")
            .mend("close it with `\"` on the same line; a quote inside is written `\"\"`"),
        '“' | '”' | '„' | '‟' | '‘' | '’' => Problem::error(
            Code::TypographicCharacter,
            place,
            format!("the curly quote `{c}` is no quote here"),
        )
        .mend("write the straight quote `\"`"),
        '–' | '—' | '−' | '‐' | '‑' => {
            Problem::error(Code::TypographicCharacter, place, format!("the dash `{c}` is no minus sign here"))
                .mend("write the plain `-`")
        }
        '.' if after.starts_with(|d: char| d.is_ascii_digit()) => bad_number(&rest[..place.len()], place),
        ':' => Problem::error(Code::StrayCharacter, place, "`:` is not used here")
            .mend("write `=` between a name and what it stands for"),
        ';' => Problem::error(Code::StrayCharacter, place, "`;` is not used here")
            .mend("end the line without it; clauses are separated by commas"),
        '×' | '·' => Problem::error(Code::StrayCharacter, place, format!("`{c}` is not used here"))
            .mend("write `*` for a product"),
        '÷' => Problem::error(Code::StrayCharacter, place, "`÷` is not used here").mend("write `/`"),
        '≥' => Problem::error(Code::StrayCharacter, place, "`≥` is not used here").mend("write `>=`"),
        '≤' => Problem::error(Code::StrayCharacter, place, "`≤` is not used here").mend("write `<=`"),
        '>' | '<' => Problem::error(Code::StrayCharacter, place, format!("`{c}` alone is not used here"))
            .mend("write `>=` or `<=` in a requirement, `->` for series"),
        '#' => Problem::error(Code::StrayCharacter, place, "a comment starts after a space")
            .mend("put a space before the number sign, or quote the name that holds it"),
        '|' | '&' => Problem::error(Code::StrayCharacter, place, format!("`{c}` is not used here"))
            .mend("write `//` for parallel and `->` for series; `and` and `or` belong in `fails when`")
            .mend("a name that holds it stands in double quotes"),
        '[' | ']' => {
            Problem::error(Code::StrayCharacter, place, format!("`{c}` stands only in names of copies"))
                .mend("write the number of a copy directly after its name, as in `pump[1]`")
        }
        '\'' => {
            Problem::error(Code::StrayCharacter, place, "a name is quoted with `\"`").mend("write `\"…\"`")
        }
        c if c.is_control() => Problem::error(
            Code::StrayCharacter,
            place,
            format!("a control character (U+{:04X}) stands here", c as u32),
        )
        .mend("delete it"),
        c => Problem::error(Code::StrayCharacter, place, format!("the language does not use `{c}`"))
            .mend("delete it, or put the name that holds it in double quotes"),
    }
}

/// The answer in `rest`, the text right of a question mark that ends at `at`:
/// without blanks around it, up to the first `#` outside quotes after a space.
fn answer_span(rest: &str, at: u32) -> Span {
    let mut end = rest.len();
    let mut inside = false;
    // A `#` directly after the mark begins no comment: an answer put between
    // the two would swallow it.
    let mut blank = false;
    for (i, c) in rest.char_indices() {
        match c {
            '"' => inside = !inside,
            '#' if !inside && blank => {
                end = i;
                break;
            }
            _ => {}
        }
        blank = c.is_whitespace();
    }
    // A lone quote must not swallow the user's comment.
    if inside && end == rest.len() {
        let hash = rest.match_indices('#').find(|(i, _)| rest[..*i].ends_with(char::is_whitespace));
        end = hash.map_or(end, |(i, _)| i);
    }
    let text = rest[..end].trim_end();
    let start = text.len() - text.trim_start().len();
    let start = if text.trim_start().is_empty() { 0 } else { start };
    Span { start: at + start as u32, end: at + text.len() as u32 }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn lex(text: &str) -> (Vec<String>, LineEnd, Vec<Problem>) {
        let (mut names, mut out, mut problems) = (Names::default(), Vec::new(), Vec::new());
        let end = line(text, 0, 0, &mut names, &mut out, &mut problems);
        let shown =
            out.iter().map(|t| text[t.span.start as usize..t.span.end as usize].to_string()).collect();
        (shown, end, problems)
    }

    #[test]
    fn names_take_tags_and_paths() {
        let (t, _, p) = lex(r#"P-101A -> U3.1->"Main ""x"" pump".rate // feed.pump[1].x-2"#);
        assert_eq!(
            t,
            ["P-101A", "->", "U3.1", "->", "\"Main \"\"x\"\" pump\".rate", "//", "feed.pump[1].x-2"]
        );
        assert!(p.is_empty());
    }

    #[test]
    fn minus_between_names_needs_spaces() {
        assert_eq!(lex("a-b a - b a -b").0, ["a-b", "a", "-", "b", "a", "-", "b"]);
    }

    #[test]
    fn the_first_question_mark_outside_quotes_ends_the_line() {
        let (t, end, _) = lex(r#"R("a?b") ? 0.5   # why?"#);
        assert_eq!(t, ["R", "(", "\"a?b\"", ")"]);
        let mark = end.mark.expect("a mark");
        assert_eq!((mark.at, mark.answer), (9, Span { start: 11, end: 14 }));
        assert_eq!(lex("A # is it?").1.mark, None);
    }

    #[test]
    fn answers_end_before_a_comment_outside_quotes() {
        let answer = |s: &str| {
            let mark = lex(s).1.mark.expect("a mark");
            s[mark.answer.start as usize..mark.answer.end as usize].to_string()
        };
        assert_eq!(answer("R(x) ? ! unknown name \"a # b\" # mine"), "! unknown name \"a # b\"");
        assert_eq!(answer("R(x) ?   "), "");
        assert_eq!(answer("R(x) ? a#b"), "a#b");
        assert_eq!(answer("R(x) ?# mine"), "# mine");
        assert_eq!(answer("R(x) ? it's 5\" # mine"), "it's 5\"");
    }

    #[test]
    fn numbers_need_digits_around_the_point() {
        for bad in ["1.", ".5", "1.2.3", "3. h"] {
            assert_eq!(lex(bad).2.first().map(|p| p.code), Some(Code::MalformedNumber), "{bad}");
        }
        assert_eq!(lex("0.97..0.99").0, ["0.97", "..", "0.99"]);
        assert_eq!(lex("10h 1e-6 1e 2of3").0, ["10", "h", "1e-6", "1", "e", "2", "of3"]);
    }
}
