//! While a run takes longer: how far it has come, on a terminal, and Ctrl-C, which ends it at the next step.

use kneewise::config::Monitor;
use std::io::{self, IsTerminal, Write};
use std::sync::mpsc::{self, RecvTimeoutError, Sender};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};

/// Work longer than this shows how far it has come.
const PATIENCE: Duration = Duration::from_secs(1);
const BLINK: Duration = Duration::from_millis(120);
const WIDTH: usize = 30;

/// Watches a run until it is dropped.
pub struct Waiting {
    /// Its end tells the thread.
    done: Option<Sender<()>>,
    thread: Option<JoinHandle<()>>,
}

impl Waiting {
    /// Begins to watch; Ctrl-C now cancels instead of killing, and a second one kills.
    pub fn new(monitor: &Monitor, with_bar: bool) -> Self {
        let asked = monitor.clone();
        // one handler a process; a second run shares the first one's, which is as good as none
        let _ = ctrlc::set_handler(move || {
            if asked.is_cancelled() {
                std::process::exit(130);
            }
            asked.cancel();
        });
        let (done, ended) = mpsc::channel::<()>();
        let monitor = monitor.clone();
        let thread = (with_bar && io::stderr().is_terminal()).then(|| {
            std::thread::spawn(move || {
                let started = Instant::now();
                let mut shown = false;
                while ended.recv_timeout(BLINK) == Err(RecvTimeoutError::Timeout) {
                    if started.elapsed() > PATIENCE {
                        shown = true;
                        let _ = write!(io::stderr(), "\r\x1b[K{}", bar(monitor.permille()));
                    }
                }
                if shown {
                    let _ = write!(io::stderr(), "\r\x1b[K");
                }
            })
        });
        Waiting { done: Some(done), thread }
    }
}

impl Drop for Waiting {
    fn drop(&mut self) {
        self.done = None;
        if let Some(thread) = self.thread.take() {
            let _ = thread.join();
        }
    }
}

/// `over time ━━━━━━━━━───────────── 31 %`
fn bar(permille: u32) -> String {
    let full = WIDTH * permille.min(1000) as usize / 1000;
    format!("over time {}{} {} %", "━".repeat(full), "─".repeat(WIDTH - full), permille / 10)
}
