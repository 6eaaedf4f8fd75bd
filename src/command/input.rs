//! What is given on the command line, as a list of notes.

use super::files;
use crate::answer::Filled;
use crate::sheets::SheetForm;
use crate::source::{Code, Problem, Sources, Span};
use globset::GlobBuilder;
use ignore::WalkBuilder;
use rustc_hash::FxHashSet;
use std::io::Read;
use std::path::{Path, PathBuf};

/// Standard input, as an argument.
const STDIN: &str = "-";

/// One text to work on.
#[derive(Clone, Debug)]
pub(super) enum Input {
    /// Standard input.
    Stdin,
    /// A file.
    File {
        /// Where it is, relative as it was given.
        path: PathBuf,
        /// Whether it was named itself, and not found in a folder or by a pattern.
        named: bool,
    },
    /// An argument that gives no file, and why.
    Nothing(String, Box<Problem>),
}

impl Input {
    /// One argument that can only be one file.
    pub(super) fn one(argument: &str) -> Input {
        match argument {
            STDIN => Input::Stdin,
            _ => Input::File { path: shown(Path::new(argument)), named: true },
        }
    }

    /// The name that messages show.
    pub(super) fn name(&self) -> String {
        match self {
            Input::Stdin => "standard input".to_string(),
            Input::File { path, .. } => path.to_string_lossy().into_owned(),
            Input::Nothing(argument, _) => argument.clone(),
        }
    }

    /// Whether it was named itself.
    pub(super) fn named(&self) -> bool {
        !matches!(self, Input::File { named: false, .. })
    }

    /// Where it is, if it is a file.
    pub(super) fn path(&self) -> Option<&Path> {
        match self {
            Input::File { path, .. } => Some(path),
            _ => None,
        }
    }

    /// What sort of sheets it holds; `None` for a note.
    pub(super) fn sheet_form(&self) -> Option<SheetForm> {
        sheet_form(self.path()?)
    }

    /// Its text.
    pub(super) fn read(&self) -> Result<String, Box<Unread>> {
        String::from_utf8(self.bytes()?).map_err(|error| self.not_utf8(error))
    }

    /// Its bytes.
    pub(super) fn bytes(&self) -> Result<Vec<u8>, Box<Unread>> {
        let bytes = match self {
            Input::Stdin => {
                let mut bytes = Vec::new();
                match std::io::stdin().lock().read_to_end(&mut bytes) {
                    Ok(_) => Ok(bytes),
                    Err(error) => Err((files::cause(&error), "pipe the text of a note into it".to_string())),
                }
            }
            Input::File { path, .. } => files::read(path).map_err(|trouble| (trouble.cause, trouble.mend)),
            Input::Nothing(_, problem) => return Err(Unread::because((**problem).clone())),
        };
        let bytes = bytes.map_err(|(cause, mend)| {
            let message = format!("cannot read \"{}\": {cause}", self.name());
            let problem = Problem::error(Code::FileAccess, Span::default(), message);
            Unread::because(problem.mend(mend))
        })?;
        if bytes.len() > Sources::LIMIT {
            let message = format!("cannot read \"{}\": it is larger than 4 GiB", self.name());
            let problem = Problem::error(Code::FileAccess, Span::default(), message);
            return Err(Unread::because(problem.mend("split it into several files")));
        }
        Ok(bytes)
    }

    /// The error for bytes that are not UTF-8, with the place of the first in
    /// a copy of the text up to the end of its line.
    fn not_utf8(&self, error: std::string::FromUtf8Error) -> Box<Unread> {
        let at = error.utf8_error().valid_up_to();
        let bytes = error.into_bytes();
        let bad = bytes.get(at).copied().unwrap_or_default();
        let end = bytes[at..].iter().position(|b| *b == b'\n').map_or(bytes.len(), |n| at + n);
        let text = String::from_utf8_lossy(&bytes[..end]);
        let problem = Problem::error(
            Code::NotUtf8,
            Span::new(at, at + char::REPLACEMENT_CHARACTER.len_utf8()),
            format!("byte {} of the file, 0x{bad:02X}, is not UTF-8 text", at + 1),
        )
        .mend("save the note as UTF-8; tieback has left it as it is");
        let mut unread = Unread::because(problem);
        if unread.filled.sources.add(self.name(), text.as_ref()).is_none() {
            unread.filled.problems.iter_mut().for_each(|p| p.place = Span::default());
        }
        unread.bytes = Some(bytes);
        unread
    }
}

/// An input that gave no text, in the form of a note that gave no answers.
#[derive(Debug)]
pub(super) struct Unread {
    /// What is to be said about it.
    pub(super) filled: Filled,
    /// Its bytes, where they could be read.
    pub(super) bytes: Option<Vec<u8>>,
}

impl Unread {
    fn because(problem: Problem) -> Box<Unread> {
        Box::new(Unread { filled: Filled::nothing(Sources::default(), vec![problem]), bytes: None })
    }
}

/// The notes that arguments stand for: files, folders and patterns, in the
/// order given, those of a folder or pattern by path, each file once.
pub(super) fn expand(arguments: &[PathBuf]) -> Vec<Input> {
    let mut inputs = Vec::new();
    for argument in arguments {
        if argument.as_os_str() == STDIN {
            inputs.push(Input::Stdin);
        } else if argument.is_dir() {
            folder(argument, &mut inputs);
        } else if is_pattern(argument) && !argument.exists() {
            pattern(argument, &mut inputs);
        } else {
            inputs.push(Input::File { path: shown(argument), named: true });
        }
    }
    if inputs.len() > 1 {
        keep_first(&mut inputs);
    }
    inputs
}

/// One file may be meant by several arguments; it is filled once, since two
/// threads that save one file would race.
fn keep_first(inputs: &mut Vec<Input>) {
    let mut seen: FxHashSet<PathBuf> = FxHashSet::default();
    inputs.retain(|input| match input {
        Input::Stdin => seen.insert(PathBuf::from(STDIN)),
        Input::File { path, .. } => seen.insert(path.canonicalize().unwrap_or_else(|_| path.clone())),
        Input::Nothing(..) => true,
    });
}

fn folder(root: &Path, inputs: &mut Vec<Input>) {
    let before = inputs.len();
    walk(root, inputs, is_document);
    if inputs.len() == before {
        let message = format!("there is no note and no parts list in the folder \"{}\"", name(root));
        let problem = Problem::remark(Code::NothingToDo, Span::default(), message);
        inputs.push(Input::Nothing(
            name(root),
            Box::new(
                problem
                    .mend("notes end in .md or .markdown, parts lists in .xlsx, .xlsm, .ods, .csv or .tsv"),
            ),
        ));
    }
}

fn pattern(pattern: &Path, inputs: &mut Vec<Input>) {
    let wanted = shown(pattern);
    let text = wanted.to_string_lossy();
    let nothing = |message: String, mend: &str| {
        let problem = Problem::error(Code::FileAccess, Span::default(), message).mend(mend);
        Input::Nothing(text.to_string(), Box::new(problem))
    };
    let glob = match GlobBuilder::new(&text).literal_separator(true).build() {
        Ok(glob) => glob.compile_matcher(),
        Err(error) => {
            let message = format!("\"{text}\" is no pattern: {}", error.kind());
            inputs.push(nothing(message, "patterns are made of `*`, `**`, `?`, `[ab]` and `{a,b}`"));
            return;
        }
    };
    // What stands before the first part with a sign in it is the folder to walk.
    let root: PathBuf =
        wanted.components().take_while(|c| !has_sign(&c.as_os_str().to_string_lossy())).collect();
    let root = if root.as_os_str().is_empty() { PathBuf::from(".") } else { root };
    // A pattern that spells the ending out means files with that ending.
    let spelt = text.rsplit_once('.').is_some_and(|(_, end)| !end.contains('/') && !has_sign(end));
    let before = inputs.len();
    walk(&root, inputs, |path| (spelt || is_document(path)) && glob.is_match(path));
    if inputs.len() == before {
        inputs.push(nothing(
            format!("no file matches \"{text}\""),
            "check the pattern and the folder it starts from",
        ));
    }
}

/// Adds the files under `root` that are wanted. Hidden files and what a
/// `.gitignore` names are passed over, with or without a repository around.
fn walk(root: &Path, inputs: &mut Vec<Input>, wanted: impl Fn(&Path) -> bool) {
    let mut found = Vec::new();
    let walker = WalkBuilder::new(root).require_git(false).git_global(false).git_exclude(false).build();
    for entry in walker {
        match entry {
            Ok(entry) => {
                let path = shown(entry.path());
                if entry.file_type().is_some_and(|t| t.is_file()) && wanted(&path) {
                    found.push(path);
                }
            }
            // A root that is not there matches nothing, which is said by the caller.
            Err(error) if error.depth() == Some(0) => {}
            Err(error) => {
                let cause = error.io_error().map_or_else(|| error.to_string(), files::cause);
                let message = format!("cannot read all of \"{}\": {cause}", name(root));
                let problem = Problem::error(Code::FileAccess, Span::default(), message);
                inputs.push(Input::Nothing(name(root), Box::new(problem)));
            }
        }
    }
    found.sort();
    inputs.extend(found.into_iter().map(|path| Input::File { path, named: false }));
}

/// Whether a file is taken that was only found on the way. Workbooks that are
/// only read are not, nor the lock files of open ones.
fn is_document(path: &Path) -> bool {
    const ENDINGS: &[&str] = &["md", "markdown", "xlsx", "xlsm", "ods", "csv", "tsv"];
    let locks = path.file_name().is_some_and(|name| name.to_string_lossy().starts_with("~$"));
    let ending = path.extension().and_then(|e| e.to_str());
    !locks && ending.is_some_and(|ending| ENDINGS.iter().any(|known| ending.eq_ignore_ascii_case(known)))
}

/// The form of a file of sheets, by the ending of its name.
pub(super) fn sheet_form(path: &Path) -> Option<SheetForm> {
    SheetForm::of_ending(path.extension()?.to_str()?)
}

fn is_pattern(path: &Path) -> bool {
    has_sign(&path.to_string_lossy())
}

fn has_sign(text: &str) -> bool {
    text.contains(['*', '?', '[', '{'])
}

fn name(path: &Path) -> String {
    shown(path).to_string_lossy().into_owned()
}

/// A path as messages show it: without `./` before it.
fn shown(path: &Path) -> PathBuf {
    match path.strip_prefix(".") {
        Ok(rest) if !rest.as_os_str().is_empty() => rest.to_path_buf(),
        _ => path.to_path_buf(),
    }
}
