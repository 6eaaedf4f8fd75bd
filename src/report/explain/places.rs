//! Codes about places in documents, and about files.

use super::{Explanation, lines, note};

pub(super) const UNCLOSED_PAIR: Explanation = Explanation {
    what: "A question in a comment has no end that can be found. The comment of a question is `<!--? … -->`, and its answer \
           stands between it and the closer `<!--/?-->` that tieback writes. Without the `-->` the rest of the \
           paragraph would be hidden. Close the comment.",
    wrong: lines!("```tieback", "gate = 0.98", "```", "", "The gate reaches <!--? R(gate)", "in one season."),
    mended: lines!(
        "```tieback",
        "gate = 0.98",
        "```",
        "",
        "The gate reaches <!--? R(gate) -->",
        "in one season."
    ),
};

pub(super) const STRAY_CLOSER: Explanation = Explanation {
    what: "A closer `<!--/?-->` stands without a question before it. A closer belongs to the nearest opener before it in the \
           same paragraph, heading or cell. The opener may have been deleted or moved. Delete the closer, and \
           the old answer with it.",
    wrong: lines!("```tieback", "gate = 0.98", "```", "", "The gate reaches 0.98000<!--/?--> in one season."),
    mended: lines!(
        "```tieback",
        "gate = 0.98",
        "```",
        "",
        "The gate reaches <!--? R(gate) --> in one season."
    ),
};

pub(super) const MISPLACED_PAIR: Explanation = Explanation {
    what: "A question in a comment stands where it cannot be filled as it is. An answer of several lines needs the opener \
           alone on its line, since it becomes a table or a list. An answer of one line may stand in the \
           middle of a text.",
    wrong: lines!(
        "```tieback",
        "V1, V2 = 0.98",
        "pair = V1 // V2",
        "```",
        "",
        "Cut sets: <!--? cuts(pair) --> in full."
    ),
    mended: lines!(
        "```tieback",
        "V1, V2 = 0.98",
        "pair = V1 // V2",
        "```",
        "",
        "Cut sets in full:",
        "",
        "<!--? cuts(pair) -->"
    ),
};

pub(super) const PAIR_STARTS_LINE: Explanation = Explanation {
    what: "A comment pair begins its line, and Markdown shows such a line as HTML. The answer is filled all the same. \
           Emphasis, links and code on that line are then shown as they are typed. Put a word before the pair to \
           keep the line a paragraph.",
    wrong: lines!("```tieback", "gate = 0.98", "```", "", "<!--? R(gate) --> is what the gate reaches."),
    mended: lines!("```tieback", "gate = 0.98", "```", "", "The gate reaches <!--? R(gate) -->."),
};

pub(super) const TABLE_SHAPE: Explanation = Explanation {
    what: "A table cannot take part as it stands. A line `<!--? table -->` announces a table directly below it. Its header row has \
           a `name` column and an `is` column, a clause or a question. A row with more cells than the header \
           is an error, since nobody can tell which cell is too many.",
    wrong: lines!("<!--? table -->", "", "The pumps are listed in the annex."),
    mended: lines!(
        "<!--? table -->",
        "",
        "| name | is          |",
        "| ---- | ----------- |",
        "| P1   | rate 18 /Mh |"
    ),
};

pub(super) const TABLE_HEADER: Explanation = Explanation {
    what: "A header looks like one that tieback knows and is not quite it. Only a header that reads as a question is written \
           under, and only a clause word gives data. A column that is yours keeps its header; if a question \
           was meant, write it as in a block.",
    wrong: lines!(
        "<!--? table -->",
        "",
        "| name | is   | enough ? |",
        "| ---- | ---- | -------- |",
        "| P1   | 0.98 |          |"
    ),
    mended: lines!(
        "<!--? table -->",
        "",
        "| name | is   | R ? |",
        "| ---- | ---- | --- |",
        "| P1   | 0.98 |     |"
    ),
};

pub(super) const TABLE_CELL: Explanation = Explanation {
    what: "A cell holds what cannot stand in its column. A cell of a clause column holds a value, with its unit if the header \
           names none. A cell under `qty` or `need` holds a whole number. Text that is a remark belongs in a \
           column of its own.",
    wrong: lines!(
        "<!--? table -->",
        "",
        "| name | rate (FIT) | qty  |",
        "| ---- | ---------- | ---- |",
        "| relay | 12 /Mh    | 2    |"
    ),
    mended: lines!(
        "<!--? table -->",
        "",
        "| name | rate (FIT) | qty |",
        "| ---- | ---------- | --- |",
        "| relay | 12        | 3   |"
    ),
};

pub(super) const NEARLY_A_BLOCK: Explanation = Explanation {
    what: "A block has nearly the info word that is read. It differs from `tieback` by case, by a sign or by one letter. Only \
           exactly `tieback` is read, so that blocks of other languages are left alone; this one was most probably meant to be.",
    wrong: lines!("```tieback", "pump = 0.98", "```", "", "```Tieback", "R(pump) ?", "```"),
    mended: lines!("```tieback", "pump = 0.98", "```", "", "```tieback", "R(pump) ?", "```"),
};

pub(super) const UNUSABLE_FILE: Explanation = Explanation {
    what: "A file that the note uses cannot be had, or defines nothing. Its path is written relative to the note, with `/`, \
           without `..`, and the file lies at or below the note's folder, also after links are followed. The option \
           `--use-from FOLDER` allows files of another folder.",
    wrong: note!("use \"../stores/parts.md\"", "pump = 0.98", "R(pump) ?"),
    mended: note!("pump = 0.98", "R(pump) ?"),
};

pub(super) const UNCLOSED_FENCE: Explanation = Explanation {
    what: "A block is never closed. Markdown then takes everything up to the end of the note for its content, prose as well. Close \
           the block with as many backticks or tildes as open it, on a line of their own.",
    wrong: "```tieback\ngate = 0.98\nR(gate) ?",
    mended: note!("gate = 0.98", "R(gate) ?"),
};

pub(super) const NOT_UTF8: Explanation = Explanation {
    what: "The file holds bytes that are not UTF-8 text. tieback changes no byte that is not its own, and could not promise \
           that for text in an unknown encoding, so the file is left alone. Save the note as UTF-8 in your \
           editor; the message gives the place of the first such byte.",
    wrong: lines!("tieback fill old-note.md", "# where old-note.md was saved as Latin-1"),
    mended: lines!("tieback fill old-note.md", "# where old-note.md was saved as UTF-8"),
};

pub(super) const FILE_ACCESS: Explanation = Explanation {
    what: "A file could not be read or written. The message says what the system answered. A pattern in quotes, such as \
           `'notes/*.md'`, that fits no file counts as well. Other files of the same run are still done; a \
           file that could not be written is as it was.",
    wrong: lines!("tieback fill fload-gate.md"),
    mended: lines!("tieback fill flood-gate.md"),
};

pub(super) const OUT_OF_DATE_FORMULA: Explanation = Explanation {
    what: "A formula of the workbook rests on an answer that has just changed. tieback writes answers and never the stored value \
           of a formula. The workbook asks for all formulas to be computed when it is opened next; a program that \
           only reads stored values would take the old ones until then. Open the workbook and save it.",
    wrong: lines!("tieback fill parts.xlsx", "# where a sum in parts.xlsx takes in a column of answers"),
    mended: lines!("tieback fill parts.xlsx", "# then open parts.xlsx in a spreadsheet program and save it"),
};

pub(super) const OPEN_ELSEWHERE: Explanation = Explanation {
    what: "The workbook seems to be open in a spreadsheet program. A lock file of such a program lies beside it. The answers are written \
           all the same; what is saved from the open window later replaces them. Close the workbook there, or \
           open it anew after filling. A lock file that a crash left behind may be deleted.",
    wrong: lines!("tieback fill parts.xlsx", "# while parts.xlsx is open"),
    mended: lines!("tieback fill parts.xlsx", "# after parts.xlsx was closed"),
};

pub(super) const NOTHING_TO_DO: Explanation = Explanation {
    what: "A file holds nothing for tieback. It has neither a block whose info word is exactly `tieback`, nor a question in a \
           comment, nor a table that is announced. A misspelt info word is the usual cause. Files found in a \
           folder are passed over without this remark.",
    wrong: lines!("tieback fill shopping.md", "# where shopping.md holds prose only"),
    mended: lines!("tieback fill flood-gate.md", "# where flood-gate.md holds a tieback block"),
};
