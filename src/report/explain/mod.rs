//! What each code means, with an example and its mend.
//!
//! Every example is a whole note (or, for what the program itself reports, a
//! command line), so that a test can fill it and see that it gives its code.

mod data;
mod places;
mod reading;
mod things;

use crate::language::words;
use crate::source::Code;
use std::fmt::Write;

/// A code at length.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Explanation {
    /// What has happened and why it matters; the first sentence is short and stands alone in lists.
    pub what: &'static str,
    /// A note that gives exactly this code.
    pub wrong: &'static str,
    /// The same note, mended.
    pub mended: &'static str,
}

/// A note that holds one block with these lines.
macro_rules! note {
    ($($line:expr),+ $(,)?) => { concat!("```tieback\n", $($line, "\n",)+ "```\n") };
}
/// A text of these lines.
macro_rules! lines {
    ($($line:expr),+ $(,)?) => { concat!($($line, "\n",)+) };
}
use {lines, note};

/// The explanation of a code.
pub fn of(code: Code) -> Explanation {
    match code {
        Code::StrayCharacter => reading::STRAY_CHARACTER,
        Code::TypographicCharacter => reading::TYPOGRAPHIC_CHARACTER,
        Code::MalformedNumber => reading::MALFORMED_NUMBER,
        Code::UnclosedQuote => reading::UNCLOSED_QUOTE,
        Code::UnbalancedParenthesis => reading::UNBALANCED_PARENTHESIS,
        Code::UnexpectedToken => reading::UNEXPECTED_TOKEN,
        Code::UnfinishedLine => reading::UNFINISHED_LINE,
        Code::MixedOperators => reading::MIXED_OPERATORS,
        Code::ReservedWord => reading::RESERVED_WORD,
        Code::UnknownClause => reading::UNKNOWN_CLAUSE,
        Code::RepeatedClause => reading::REPEATED_CLAUSE,
        Code::NotKnownYet => reading::NOT_KNOWN_YET,
        Code::TooDeep => reading::TOO_DEEP,
        Code::NotAnAnswer => reading::NOT_AN_ANSWER,
        Code::MalformedQuestion => reading::MALFORMED_QUESTION,
        Code::UnclosedPair => places::UNCLOSED_PAIR,
        Code::StrayCloser => places::STRAY_CLOSER,
        Code::MisplacedPair => places::MISPLACED_PAIR,
        Code::PairStartsLine => places::PAIR_STARTS_LINE,
        Code::TableShape => places::TABLE_SHAPE,
        Code::TableHeader => places::TABLE_HEADER,
        Code::TableCell => places::TABLE_CELL,
        Code::UnclosedFence => places::UNCLOSED_FENCE,
        Code::NearlyABlock => places::NEARLY_A_BLOCK,
        Code::NotUtf8 => places::NOT_UTF8,
        Code::FileAccess => places::FILE_ACCESS,
        Code::UnusableFile => places::UNUSABLE_FILE,
        Code::NothingToDo => places::NOTHING_TO_DO,
        Code::UnknownName => things::UNKNOWN_NAME,
        Code::DefinedTwice => things::DEFINED_TWICE,
        Code::Circle => things::CIRCLE,
        Code::SeveralNames => things::SEVERAL_NAMES,
        Code::LookAlikeNames => things::LOOK_ALIKE_NAMES,
        Code::SameThing => things::SAME_THING,
        Code::WrongKind => things::WRONG_KIND,
        Code::UsedBothWays => things::USED_BOTH_WAYS,
        Code::UnsettledCopy => things::UNSETTLED_COPY,
        Code::SettlesNothing => things::SETTLES_NOTHING,
        Code::WrongArguments => things::WRONG_ARGUMENTS,
        Code::BadSetting => things::BAD_SETTING,
        Code::AmbiguousName => things::AMBIGUOUS_NAME,
        Code::MissingUnit => data::MISSING_UNIT,
        Code::UnknownUnit => data::UNKNOWN_UNIT,
        Code::WrongUnit => data::WRONG_UNIT,
        Code::Undeclared => data::UNDECLARED,
        Code::OutsideRange => data::OUTSIDE_RANGE,
        Code::ImpossibleCount => data::IMPOSSIBLE_COUNT,
        Code::WrongRoutes => data::WRONG_ROUTES,
        Code::ContradictoryData => data::CONTRADICTORY_DATA,
        Code::MissingData => data::MISSING_DATA,
        Code::ExposureNotGiven => data::EXPOSURE_NOT_GIVEN,
        Code::FixedProbability => data::FIXED_PROBABILITY,
        Code::MissingAttribute => data::MISSING_ATTRIBUTE,
        Code::NoValue => data::NO_VALUE,
        Code::UsedTwice => data::USED_TWICE,
        Code::TooLarge => data::TOO_LARGE,
        Code::CutShort => data::CUT_SHORT,
        Code::NotMet => data::NOT_MET,
        Code::OutOfDateFormula => places::OUT_OF_DATE_FORMULA,
        Code::OpenElsewhere => places::OPEN_ELSEWHERE,
        Code::Stale => data::STALE,
    }
}

impl Explanation {
    /// The first sentence, for lists.
    pub fn short(&self) -> &'static str {
        self.what.split_once(". ").map_or(self.what.trim_end_matches('.'), |(first, _)| first)
    }
}

/// The code that is written so, with or without the brackets that messages put around it.
pub fn find(written: &str) -> Option<Code> {
    let id = cleaned(written);
    Code::ALL.iter().copied().find(|c| c.id() == id)
}

/// Up to three codes that may have been meant.
pub fn nearest(written: &str) -> Vec<&'static str> {
    let id = cleaned(written);
    let mut found: Vec<&str> = words::nearest(&id, Code::ALL.iter().map(|c| c.id())).into_iter().collect();
    let parts: Vec<&str> = id.split('-').filter(|p| p.len() > 2).collect();
    for code in Code::ALL {
        let shares = code.id().split('-').any(|p| parts.contains(&p));
        if found.len() < 3 && shares && !found.contains(&code.id()) {
            found.push(code.id());
        }
    }
    found
}

fn cleaned(written: &str) -> String {
    let word = written.trim().trim_start_matches("error").trim_start_matches("remark");
    word.trim_matches(['[', ']', ' ']).to_lowercase().replace(['_', ' '], "-")
}

/// A code at length, as text.
pub fn text(code: Code) -> String {
    let explanation = of(code);
    let mut text = format!("{}\n\n", code.id());
    wrap(explanation.what, 80, &mut text);
    for (title, example) in [("wrong", explanation.wrong), ("mended", explanation.mended)] {
        let _ = write!(text, "\n{title}:\n\n");
        for line in example.lines() {
            if line.is_empty() {
                text.push('\n');
            } else {
                let _ = writeln!(text, "    {line}");
            }
        }
    }
    text
}

/// Every code with its first sentence, one a line.
pub fn list() -> String {
    let wide = Code::ALL.iter().map(|c| c.id().len()).max().unwrap_or(0);
    Code::ALL.iter().fold(String::new(), |mut text, code| {
        let _ = writeln!(text, "{:wide$}  {}", code.id(), of(*code).short());
        text
    })
}

fn wrap(words: &str, width: usize, text: &mut String) {
    let mut column = 0;
    for word in words.split_whitespace() {
        let length = word.chars().count();
        if column > 0 && column + 1 + length > width {
            text.push('\n');
            column = 0;
        } else if column > 0 {
            text.push(' ');
            column += 1;
        }
        text.push_str(word);
        column += length;
    }
    text.push('\n');
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_code_is_explained_in_two_to_five_sentences() {
        for code in Code::ALL {
            let explanation = of(*code);
            let sentences = explanation.what.split_inclusive(['.', '?']).filter(|s| s.len() > 3).count();
            assert!((2..=8).contains(&sentences), "{}: {sentences} sentences", code.id());
            assert!(explanation.what.ends_with('.'), "{}", code.id());
            assert!(explanation.short().len() <= 100, "{}: {}", code.id(), explanation.short());
            assert_ne!(explanation.wrong, explanation.mended, "{}", code.id());
            assert!(explanation.wrong.ends_with('\n') || *code == Code::UnclosedFence, "{}", code.id());
        }
    }

    #[test]
    fn codes_are_found_as_messages_write_them() {
        assert_eq!(find("error[unknown-name]"), Some(Code::UnknownName));
        assert_eq!(find("Unknown_Name"), Some(Code::UnknownName));
        assert_eq!(find("unkown-name"), None);
        assert_eq!(nearest("unkown-name")[0], "unknown-name");
        assert!(nearest("unit").contains(&"missing-unit"));
    }
}
