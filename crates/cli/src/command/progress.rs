//! Progress on a terminal, for work that takes longer than a second.

use std::io::{IsTerminal, Write, stderr};
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::mpsc::{RecvTimeoutError, Sender, channel};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};

/// A line on standard error that says how many zones are done; only on a terminal, only after a second.
pub(super) struct Progress {
    done: Arc<AtomicUsize>,
    stop: Option<(Sender<()>, JoinHandle<()>)>,
}

impl Progress {
    pub(super) fn new(zones: usize) -> Self {
        let done = Arc::new(AtomicUsize::new(0));
        if !stderr().is_terminal() {
            return Self { done, stop: None };
        }
        let (sender, receiver) = channel::<()>();
        let (counter, start) = (Arc::clone(&done), Instant::now());
        let thread = std::thread::spawn(move || {
            let mut wait = Duration::from_secs(1);
            while receiver.recv_timeout(wait) == Err(RecvTimeoutError::Timeout) {
                wait = Duration::from_millis(200);
                let settled = counter.load(Ordering::Relaxed);
                let _ = write!(stderr(), "\rsettled {settled} of {zones} zones, {} s ", start.elapsed().as_secs());
                let _ = stderr().flush();
            }
            if start.elapsed() > Duration::from_secs(1) {
                let _ = write!(stderr(), "\r{}\r", " ".repeat(60));
            }
        });
        Self { done, stop: Some((sender, thread)) }
    }

    pub(super) fn one_done(&self) {
        self.done.fetch_add(1, Ordering::Relaxed);
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        if let Some((sender, thread)) = self.stop.take() {
            drop(sender);
            let _ = thread.join();
        }
    }
}
