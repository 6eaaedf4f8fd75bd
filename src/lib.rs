//! tieback fills exact reliability answers into Markdown notes and changes no other byte of them.
//!
//! The way of one note, from top to bottom. Data goes one way; a module imports from those above it in
//! this list and never from those below.
//!
//! | module | from | to |
//! | --- | --- | --- |
//! | [`source`] | texts | spans that point into them, and problems that say what is wrong at one |
//! | [`number`] | decimals | reals of about 31 digits with error bounds; chances with both tails; decided digits |
//! | [`document`] | bytes of a note | the places in it where questions stand, and edits of what stands right of a `?` |
//! | [`language`] | text of a place | a syntax tree whose every node knows its span |
//! | [`system`] | syntax tree | things: names bound, copies made, units checked; one node for one physical thing |
//! | [`engine`] | system | a plan, then numbers: closed forms, cases, decision diagrams, cut sets, importance |
//! | [`steps`] | plan and numbers | numbered formulas, each computed from what it shows |
//! | [`answer`] | numbers | what is written: figures, tables, lists, requirements |
//! | [`sheets`] | one workbook or delimited file | the same way, from cells to cells: [`sheets::fill`] |
//! | [`note`] | one note | all of the above, once through: [`note::fill`] |
//! | [`view`] | answers and steps | what a reviewer signs from: a workbook of live formulas |
//! | [`report`] | problems | text for a terminal, JSON, and the long explanation of each code |
//! | [`command`] | arguments, files | an exit code: the only module that opens files and writes streams |
//!
//! ```
//! let note = "The pair fails <!--? F(pair) in chances -->.\n\n\
//!             ```tieback\npump = fails 1 in 50\npair = 1 of 2 pump\n```\n";
//! let filled = tieback::note::fill("pumps.md", note);
//! assert!(filled.problems.is_empty());
//! let tieback::note::Rewrite::Patched(bytes) = filled.rewrite else { panic!("nothing was filled") };
//! let text = String::from_utf8(bytes).unwrap();
//! assert!(text.starts_with("The pair fails <!--? F(pair) in chances -->1 in 2500<!--/?-->.\n"));
//! ```
//!
//! What holds everywhere below [`command`]:
//!
//! - No clock, no file, no environment, no locale, no random number. The same text gives the same bytes.
//! - Every byte outside the span of an answer is copied. Filling twice is filling once.
//! - No input makes it panic, and none makes it recurse without a bound. A limit that is reached is an
//!   answer that says so.
//! - A digit is printed only where the error bound decides it.
//! - A step's result is what its formula gives; there is no second calculation to describe.
//! - No `unsafe`.

pub mod answer;
pub mod command;
pub mod document;
pub mod engine;
pub mod language;
pub mod note;
pub mod number;
pub mod report;
pub mod sheets;
pub mod source;
pub mod steps;
pub mod system;
pub mod view;
