//! The modes of all junctions at one instant: block principal pivoting (Portugal, Júdice & Vicente, Math. Comp. 63
//! (1994) 625-643), and least-index pivoting (Murty 1974) where it does not make headway.

use super::solver::{Answer, Solver};
use super::system::Mode;

/// How far a test may miss before a mode counts as wrong.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Slack {
    /// Volts.
    pub voltage: f64,
    /// Amperes.
    pub current: f64,
}

/// Rounds of flipping everything without progress.
const PATIENCE: usize = 10;

impl Solver {
    /// The mode that junction `n` should change to, where its test says that the assumed one is wrong.
    pub(super) fn wrong(&self, n: usize, test: f64, slack: Slack) -> Option<Mode> {
        let junction = &self.system().junctions[n];
        match self.pattern.modes[n] {
            Mode::Blocking if test > junction.forward + slack.voltage => Some(Mode::Forward),
            Mode::Blocking if test < -junction.reverse - slack.voltage => Some(Mode::Reverse),
            Mode::Forward if test < -slack.current => Some(Mode::Blocking),
            Mode::Reverse if test > slack.current => Some(Mode::Blocking),
            _ => None,
        }
    }

    /// Whether some assumed mode is wrong.
    pub(super) fn is_any_wrong(&self, tests: &[f64], slack: Slack) -> bool {
        tests.iter().enumerate().any(|(n, &test)| self.wrong(n, test, slack).is_some())
    }

    /// Finds modes of which none is wrong in a stage of length `g`, and that stage's answer. `false` where no such
    /// set was found; the modes are then as they were.
    pub(super) fn settle(
        &mut self,
        slack: impl Fn(&Solver) -> Slack,
        answer: &mut Answer,
        mut stage: impl FnMut(&mut Solver, &mut Answer) -> bool,
    ) -> bool {
        let before = self.pattern.modes.clone();
        let limit = 60 + 4 * self.pattern.modes.len();
        let (mut fewest, mut patience) = (usize::MAX, PATIENCE);
        for _ in 0..limit {
            if !stage(self, answer) {
                break;
            }
            let slack = slack(self);
            let flips: Vec<(usize, Mode)> = answer
                .tests
                .iter()
                .enumerate()
                .filter_map(|(n, &test)| Some((n, self.wrong(n, test, slack)?)))
                .collect();
            if flips.is_empty() {
                return true;
            }
            if flips.len() < fewest {
                (fewest, patience) = (flips.len(), PATIENCE);
            } else {
                patience = patience.saturating_sub(1);
            }
            let taken = if patience > 0 { &flips[..] } else { &flips[flips.len() - 1..] };
            for &(n, mode) in taken {
                self.pattern.modes[n] = mode;
            }
            self.pattern_changed();
        }
        self.set_modes(&before);
        false
    }
}
