//! What is going on, for a person who waits at a terminal for more than a second.

use super::Voice;
use crate::sheets::Stage;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::mpsc::{RecvTimeoutError, Sender, channel};
use std::thread::JoinHandle;
use std::time::Duration;

/// Work that takes no longer is done before a bar could be read.
const SHOWN_AFTER: Duration = Duration::from_secs(1);
const EVERY: Duration = Duration::from_millis(100);

const READING: usize = 0;
const ANSWERING: usize = 1;
const WRITING: usize = 2;

/// How far a run is; told by those who work, read by the one who shows it.
#[derive(Debug, Default)]
pub(super) struct Watch {
    stage: AtomicUsize,
    done: AtomicUsize,
    total: AtomicUsize,
    files: AtomicUsize,
}

impl Watch {
    /// A file is at this stage.
    pub(super) fn tell(&self, stage: Stage) {
        let (stage, done, total) = match stage {
            Stage::Reading => (READING, 0, 0),
            Stage::Answering(done, total) => (ANSWERING, done, total),
            Stage::Writing => (WRITING, 0, 0),
        };
        self.stage.store(stage, Ordering::Relaxed);
        self.done.store(done, Ordering::Relaxed);
        self.total.store(total, Ordering::Relaxed);
    }

    /// A file is done.
    pub(super) fn file_done(&self) {
        self.files.fetch_add(1, Ordering::Relaxed);
    }

    fn words(&self, files: usize) -> (String, usize, usize) {
        if files > 1 {
            return ("filling files".to_string(), self.files.load(Ordering::Relaxed), files);
        }
        let words = match self.stage.load(Ordering::Relaxed) {
            READING => "reading",
            ANSWERING => "answering",
            _ => "writing",
        };
        let (done, total) = (self.done.load(Ordering::Relaxed), self.total.load(Ordering::Relaxed));
        (words.to_string(), done.min(total), total)
    }
}

/// A bar that appears after a second, on a terminal only, and is gone when it is dropped.
pub(super) struct Progress {
    stop: Option<Sender<()>>,
    thread: Option<JoinHandle<()>>,
}

impl Progress {
    /// Shows how far the work on so many files is.
    pub(super) fn start(watch: &Arc<Watch>, files: usize, voice: Voice) -> Progress {
        if voice.json || !voice.terminal.is_watched() {
            return Progress { stop: None, thread: None };
        }
        watch.files.store(0, Ordering::Relaxed);
        let watch = watch.clone();
        let (stop, stopped) = channel::<()>();
        let show = move || {
            if stopped.recv_timeout(SHOWN_AFTER) != Err(RecvTimeoutError::Timeout) {
                return;
            }
            let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::stderr());
            let style = |template| {
                ProgressStyle::with_template(template).unwrap_or_else(|_| ProgressStyle::default_bar())
            };
            loop {
                let (words, done, total) = watch.words(files);
                if total > 0 {
                    bar.set_style(style("{msg} [{bar:30}] {pos} of {len}"));
                    bar.set_length(total as u64);
                    bar.set_position(done as u64);
                } else {
                    bar.set_style(style("{spinner} {msg}"));
                }
                bar.set_message(words);
                bar.tick();
                if stopped.recv_timeout(EVERY) != Err(RecvTimeoutError::Timeout) {
                    break;
                }
            }
            bar.finish_and_clear();
        };
        // Where no thread can be had there is no bar, and the work goes on.
        let thread = std::thread::Builder::new().name("progress".to_string()).spawn(show).ok();
        Progress { stop: Some(stop), thread }
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        drop(self.stop.take());
        if let Some(thread) = self.thread.take() {
            // A bar that fell over leaves nothing behind that matters.
            let _ = thread.join();
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_words_follow_the_work() {
        let watch = Watch::default();
        assert_eq!(watch.words(1), ("reading".to_string(), 0, 0));
        watch.tell(Stage::Answering(20, 100));
        assert_eq!(watch.words(1), ("answering".to_string(), 20, 100));
        watch.tell(Stage::Writing);
        assert_eq!(watch.words(1), ("writing".to_string(), 0, 0));
        watch.file_done();
        assert_eq!(watch.words(7), ("filling files".to_string(), 1, 7));
    }
}
