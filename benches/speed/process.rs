//! Whole processes: time from start to end, and memory.

use super::{paired, parse, row, timed};
use std::fs;
use std::io::Write;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::Duration;

/// Runs as a floor when asked to: this program itself, started again.
pub(crate) fn floor(arguments: &[String]) -> bool {
    let [what, path] = arguments else { return false };
    let path = Path::new(path);
    let text = || fs::read_to_string(path).expect("the note");
    match what.as_str() {
        "--save" => save(path, text().as_bytes()),
        "--parse-and-save" => {
            let text = text();
            assert!(parse(&text) > 0);
            save(path, text.as_bytes());
        }
        _ => return false,
    }
    true
}

/// Puts bytes in a file as safely as tieback does.
fn save(path: &Path, bytes: &[u8]) {
    let folder = path.parent().expect("a folder");
    let mut temp = tempfile::Builder::new().tempfile_in(folder).expect("a file");
    temp.write_all(bytes).expect("room");
    temp.as_file().sync_all().expect("sync");
    temp.persist(path).expect("a new name");
}

fn run(mut command: Command) -> Duration {
    command.stdout(Stdio::null()).stderr(Stdio::null());
    timed(|| assert!(command.status().expect("a process").code().is_some_and(|c| c == 0)))
}

fn tieback(path: &Path) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_tieback"));
    command.arg("fill").arg(path);
    command
}

fn itself(what: &str, path: &Path) -> Command {
    let mut command = Command::new(std::env::current_exe().expect("this program"));
    command.arg(what).arg(path);
    command
}

pub(crate) fn large(text: &str) {
    let folder = tempfile::tempdir().expect("a folder");
    let (ours, floors) = (folder.path().join("ours.md"), folder.path().join("floor.md"));
    fs::write(&floors, text).expect("room");
    let ratio = paired(
        9,
        || {
            fs::write(&ours, text).expect("room");
            run(tieback(&ours))
        },
        || run(itself("--parse-and-save", &floors)),
    );
    row("process: fill 10 MB / read, parse, save", ratio, Some(2.0));
    fs::write(&ours, text).expect("room");
    match peak(tieback(&ours)) {
        Some(bytes) => row("process: peak memory / size of the file", bytes / text.len() as f64, Some(8.0)),
        None => row("process: peak memory / size of the file: not to be had", f64::NAN, Some(8.0)),
    }
}

pub(crate) fn small(text: &str) {
    let folder = tempfile::tempdir().expect("a folder");
    let (ours, floors) = (folder.path().join("ours.md"), folder.path().join("floor.md"));
    fs::write(&floors, text).expect("room");
    let stale = || {
        fs::write(&ours, text).expect("room");
        run(tieback(&ours))
    };
    row("process: fill 5 KB / read, save", paired(301, stale, || run(itself("--save", &floors))), Some(1.5));
    let filled = || run(tieback(&ours));
    row(
        "process: fill 5 KB again / read, save",
        paired(301, filled, || run(itself("--save", &floors))),
        None,
    );
}

/// The most memory that a process held: the kernel's high-water mark, read
/// from `/proc` until the process has ended, so that only what it takes in its
/// last half millisecond can be missed.
fn peak(mut command: Command) -> Option<f64> {
    let mut child = command.stdout(Stdio::null()).stderr(Stdio::null()).spawn().ok()?;
    let status = format!("/proc/{}/status", child.id());
    let mut most = None;
    while child.try_wait().ok()?.is_none() {
        let text = fs::read_to_string(&status).unwrap_or_default();
        let line = text.lines().find_map(|l| l.strip_prefix("VmHWM:"));
        let kilobytes = line.and_then(|l| l.trim().trim_end_matches("kB").trim().parse::<f64>().ok());
        most = kilobytes.map(|k| k * 1024.0).or(most);
        std::thread::sleep(Duration::from_micros(500));
    }
    most
}
