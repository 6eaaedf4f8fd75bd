//! The review workbook, recalculated by a spreadsheet engine that knows nothing of tieback.

use ironcalc::base::Model as Sheets;
use ironcalc::base::cell::CellValue;
use ironcalc::import::load_from_xlsx_bytes;
use std::collections::HashMap;
use tieback::note::syntax;
use tieback::view::{Stamp, gather, write};

/// Sheets of the workbook by number, and where the steps and inputs begin.
const INPUTS: u32 = 1;
const STEPS: u32 = 2;
const FIRST: i32 = 4;

fn workbook(note: &str) -> Vec<u8> {
    let (sources, tree, problems) = syntax("note.md", &format!("```tieback\n{note}\n```\n"));
    assert!(problems.is_empty(), "{problems:?}");
    let review = gather(&tree, &sources);
    assert!(review.problems.is_empty(), "{:?}", review.problems);
    write(&review, &sources, &Stamp { name: "note.md".to_string(), date: None }).unwrap()
}

fn opened(bytes: &[u8]) -> Sheets<'static> {
    let book = load_from_xlsx_bytes(bytes, "review", "en", "UTC").unwrap();
    let mut sheets = Sheets::from_workbook(book, "en").unwrap();
    sheets.evaluate();
    sheets
}

fn number(sheets: &Sheets<'_>, sheet: u32, row: i32, column: i32) -> Option<f64> {
    match sheets.get_cell_value_by_index(sheet, row, column).unwrap() {
        CellValue::Number(value) => Some(value),
        CellValue::None => None,
        other => panic!("sheet {sheet}, row {row}, column {column}: {other:?}"),
    }
}

fn words(sheets: &Sheets<'_>, sheet: u32, row: i32, column: i32) -> String {
    match sheets.get_cell_value_by_index(sheet, row, column).unwrap() {
        CellValue::String(text) => text,
        CellValue::None => String::new(),
        other => panic!("sheet {sheet}, row {row}, column {column}: {other:?}"),
    }
}

/// The steps: thing, both live values, both of tieback's, and the agreement.
#[derive(Debug)]
struct Row {
    thing: String,
    live: [Option<f64>; 2],
    own: [Option<f64>; 2],
    agreement: String,
}

fn steps(sheets: &Sheets<'_>) -> Vec<Row> {
    let mut rows = Vec::new();
    for row in FIRST.. {
        let thing = words(sheets, STEPS, row, 2);
        if thing.is_empty() {
            return rows;
        }
        let pair = |column| [number(sheets, STEPS, row, column), number(sheets, STEPS, row, column + 1)];
        rows.push(Row { thing, live: pair(8), own: pair(10), agreement: words(sheets, STEPS, row, 12) });
    }
    rows
}

fn gap(a: f64, b: f64) -> f64 {
    if a == b { 0.0 } else { (a - b).abs() / b.abs() }
}

/// Doubles keep 2^-53 of each operation, and a complement by `ROUND(1-x,15)` 5e-16
/// of what may be 1e-4; distribution functions of the engine have fewer digits.
const FINE: f64 = 1e-12;

fn agree(note: &str, tolerance: f64, value_only: &[&str]) -> Vec<Row> {
    let rows = steps(&opened(&workbook(note)));
    assert!(!rows.is_empty(), "{note}");
    for row in &rows {
        let only = row.agreement == "value only";
        assert_eq!(only, value_only.iter().any(|v| row.thing.starts_with(v)), "{note}: {row:?}");
        assert!(only || row.agreement == "agrees", "{note}: {row:?}");
        for (live, own) in row.live.iter().zip(&row.own) {
            match (live, own) {
                (Some(live), Some(own)) => assert!(gap(*live, *own) <= tolerance, "{note}: {row:?}"),
                (None, None) => {}
                _ => panic!("{note}: {row:?}"),
            }
        }
    }
    rows
}

const PLANT: &str = "\
exposure start
mission start-up 2 h stress 3, steady 4 kh, 6 start
base = 12 /Mh
fan = rate 18 /Mh, duty 30%, stress 2
coupling = mttf 50 kh
belt = 0.98 over 1000 h
guard = fails 2% over 1 yr
relay = fails 0.0008 /start, rate 6 /Mh
plug = fails 1 in 2000
lamp = 98%
gear = rate (base * 1.4)
F1, F2, F3 = a fan
row = (2 of (F1, F2, F3)) -> plug -> lamp -> coupling -> belt -> guard -> gear -> relay
pair = 1 of 2 gear
mixed = 2 of (fan, lamp, coupling)
twelve = 9 of 12 lamp
many = 26 of 30 lamp
i1, i2, i3, i4, i5 = a fan
bridge = (i1 -> i4) // (i2 -> i5) // (i1 -> i3 -> i5) // (i2 -> i3 -> i4)
nest = (bridge -> F1) // (F1 -> lamp) // (lane -> plug) // (lane -> belt)
lane = F2 -> gear
safe = fails 1e-13
tiny = any of 2 safe
firm = 0.9999999999999
solid = all of 8 firm
gain = F(row) / F(bridge)
R(row) ?
F(row, 500 h, 3 start) ?
R(mixed) ?
F(twelve) ?
F(many) ?
R(bridge) ?
F(nest) ?
F(tiny) ?
F(solid) ?
gain ?
RAW(row, plug) ?
Birnbaum(bridge, i3) ?
1 - R(row) * R(nest) ?
sqrt(F(row)) + max(R(row), 0.2) ?
require R(row) >= 0.5
require F(nest) <= 1e-9";

#[test]
fn every_step_agrees() {
    agree(PLANT, FINE, &[]);
}

#[test]
fn steps_that_no_formula_holds_keep_their_value() {
    let wide = "a = fails 0.01\nb = fails 0.02\nc, d, e = a a\nw = 3 of (a, b, c, d, e)\nbig = 400 of 500 a\nR(w) ?\nR(big) ?";
    agree(wide, FINE, &["w", "big"]);
}

/// The last live values of `R(x)`-like steps by thing.
fn live(rows: &[Row]) -> HashMap<&str, [Option<f64>; 2]> {
    rows.iter().map(|row| (row.thing.as_str(), row.live)).collect()
}

#[test]
fn a_changed_input_runs_through() {
    let note = |rate: &str, mission: &str, p: &str| {
        format!(
            "mission {mission} h\npump = rate {rate} /h\nvalve = {p}\nA, B = a pump\nshared = rate 2e-6 /h\n\
             sys = (A -> shared -> valve) // (B -> shared) // (2 of 3 pump)\nvote = 2 of 3 pump\nR(sys) ?\nF(vote) ?\nrequire F(sys) <= 1e-3"
        )
    };
    let (before, after) = (note("1e-4", "1000", "0.98"), note("3e-4", "400", "0.9"));
    let mut sheets = opened(&workbook(&before));
    let mut changed = 0;
    for row in FIRST.. {
        let symbol = words(&sheets, INPUTS, row, 3);
        if symbol.is_empty() {
            break;
        }
        let value = number(&sheets, INPUTS, row, 4).unwrap();
        let new = match (symbol.as_str(), value) {
            ("λ", 1e-4) => 3e-4,
            ("t", _) => 400.0,
            ("p", _) => 0.9,
            _ => continue,
        };
        sheets.update_cell_with_number(INPUTS, row, 4, new).unwrap();
        changed += 1;
    }
    assert!(changed >= 3, "{changed}");
    sheets.evaluate();
    let (moved, wanted) = (steps(&sheets), steps(&opened(&workbook(&after))));
    let (moved_values, wanted_values) = (live(&moved), live(&wanted));
    for (thing, values) in &wanted_values {
        let got = moved_values.get(thing).unwrap_or_else(|| panic!("{thing}"));
        for (a, b) in got.iter().zip(values) {
            assert!(gap(a.unwrap(), b.unwrap()) <= FINE, "{thing}: {got:?} {values:?}");
        }
    }
    // The steps say that they are no longer tieback's, and the verdict follows.
    assert!(moved.iter().any(|row| row.agreement == "changed"), "{moved:?}");
    let verdict = |sheets: &Sheets<'_>| {
        (1..60).map(|row| words(sheets, 0, row, 4)).find(|w| w == "met" || w == "NOT met").unwrap()
    };
    assert_eq!(verdict(&opened(&workbook(&before))), verdict_of(&before));
    assert_eq!(verdict(&sheets), verdict_of(&after));
}

fn verdict_of(note: &str) -> String {
    let filled = tieback::note::fill("note.md", &format!("```tieback\n{note} ?\n```\n"));
    let last = filled.asked.last().unwrap();
    last.new.split(':').next().unwrap().to_string()
}

#[test]
fn random_systems_agree() {
    // xorshift64*, S. Vigna (2016), from memory.
    let mut state = 88_172_645_463_325_252_u64;
    let mut below = |n: u64| {
        state ^= state >> 12;
        state ^= state << 25;
        state ^= state >> 27;
        (state.wrapping_mul(0x2545_f491_4f6c_dd1d) >> 33) % n
    };
    for _ in 0..40 {
        let n = 3 + below(4);
        let mut note = "mission 1000 h\n".to_string();
        for i in 0..n {
            note += &match below(3) {
                0 => format!("t{i} = fails {}e-{}\n", 1 + below(9), 1 + below(12)),
                1 => format!("t{i} = rate {}e-{} /h\n", 1 + below(9), 3 + below(12)),
                _ => format!("t{i} = 0.9{}\n", below(1000)),
            };
        }
        for j in 0..3 {
            let mut one = || format!("t{}", below(n));
            let (a, b, c, d) = (one(), one(), one(), one());
            note += &match below(3) {
                0 => format!("s{j} = ({a} -> {b}) // ({c} -> {d})\n"),
                1 => format!("s{j} = {a} -> (2 of ({b}, {c}, {d}))\n"),
                _ => format!("s{j} = {a} // ({b} -> {c})\n"),
            };
        }
        note += "top = (s0 // s1) -> s2\nR(top) ?\nF(top) ?";
        let rows = steps(&opened(&workbook(&note)));
        for row in rows {
            for (live, own) in row.live.iter().zip(&row.own) {
                let (live, own) = (live.unwrap(), own.unwrap());
                assert!(gap(live, own) <= FINE, "{note}\n{row:?}");
            }
        }
    }
}

#[test]
fn two_runs_write_the_same_bytes() {
    let note = "a = 0.9\nb = rate 1 /h\nmission 1 h\nR(a // b) ?";
    assert_eq!(workbook(note), workbook(note));
}
