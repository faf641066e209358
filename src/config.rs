//! What the user may set for a run, as plain data. Reading arguments is `cli`'s, this is only their meaning.

use crate::finding::Severity;
use std::collections::BTreeMap;
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU32, Ordering};

/// Options of one analysis.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Options {
    /// `--drop`: one drop in volts for every diode.
    pub drop: Option<f64>,
    /// `--set NAME=VALUE`: sources held at a value (volts or amperes), in the order given.
    pub set: Vec<(String, f64)>,
    /// `--include-dir`: further places where includes may lie.
    pub include_dirs: Vec<PathBuf>,
    /// Find the states too (`check` and `states`), or only read and check the wiring.
    pub states: bool,
    /// The diode that `--why` asks about: its view is computed in parts of any size.
    pub why: Option<String>,
    /// Severities that differ from the rules' own, by rule name; `None` switches a rule off.
    pub levels: BTreeMap<String, Option<Severity>>,
    /// Decades of current (powers of ten) at which drops from models are held instead of the nearest one, by
    /// lower-case full name of the diode: a comparison judges both sides by the same drops.
    pub decades: BTreeMap<String, i32>,
    /// Where remarks begin.
    pub thresholds: Thresholds,
    /// Follow the circuit over time where its sources move, and gather what the conditions span; needs `states`.
    pub swing: bool,
    /// How much work over time is worth it, as a multiple of what `check` spends; 0 counts as 1.
    pub patience: u32,
    /// Through which another thread sees how far a long run has come, and ends it.
    pub monitor: Monitor,
}

/// Where remarks begin, as `kneewise.toml` may set it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Thresholds {
    /// Share by which a current or voltage must move for `compare` to tell it: 0.05 is 5 %.
    pub moved: f64,
    /// Decades from the drop's own current beyond which a current is worth a note.
    pub swing_note: f64,
    /// The same, for a warning.
    pub swing_warning: f64,
}

impl Default for Thresholds {
    fn default() -> Self {
        Thresholds { moved: 0.05, swing_note: 1.0, swing_warning: 2.0 }
    }
}

/// Shared between a run and whoever waits for it. Clones are the same monitor.
#[derive(Debug, Clone, Default)]
pub struct Monitor(Arc<Shared>);

#[derive(Debug, Default)]
struct Shared {
    cancelled: AtomicBool,
    permille: AtomicU32,
}

impl Monitor {
    /// Asks the run to end soon; what it has found by then is told as cut short.
    pub fn cancel(&self) {
        self.0.cancelled.store(true, Ordering::Relaxed);
    }

    /// Whether somebody asked for the end.
    pub fn is_cancelled(&self) -> bool {
        self.0.cancelled.load(Ordering::Relaxed)
    }

    /// Share of the work over time that is done, at worst as much as is still ahead; 0 to 1000.
    pub fn permille(&self) -> u32 {
        self.0.permille.load(Ordering::Relaxed)
    }

    /// The run says how far it is.
    pub fn report(&self, permille: u32) {
        self.0.permille.store(permille, Ordering::Relaxed);
    }
}

/// A monitor is no setting: options that differ in nothing else are equal.
impl PartialEq for Monitor {
    fn eq(&self, _: &Self) -> bool {
        true
    }
}
