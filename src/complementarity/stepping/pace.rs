//! How long the next step of a stretch is: a power of two of ticks, always on its own grid, halved where a step fails and
//! doubled where there is room; and the shortest steps, which jump over changes of modes. What fails is not known here.

use super::march::Segment;

/// A step is doubled where its error is below this share of what is allowed: an eighth, and some room.
const ROOM: f64 = 0.1;

/// Finest steps in a row after which a coarser one may carry a change.
const CROWD: u32 = 48;

/// Where a walk along a stretch stands.
pub(super) struct Pace {
    finest: u32,
    coarsest: u32,
    /// Ticks of the whole stretch.
    pub ticks: u64,
    /// Ticks that are done.
    pub at: u64,
    /// Halvings of the stretch that give the next step.
    level: u32,
    /// The same for a jump.
    jump_level: u32,
    /// Jumps of that length so far.
    crowd: u32,
    /// The next step jumps over a change of modes.
    pub must_jump: bool,
}

impl Pace {
    /// At the beginning of a stretch.
    pub fn of(segment: &Segment) -> Self {
        let finest = segment.finest.clamp(1, 40);
        Pace {
            finest,
            coarsest: segment.coarsest,
            ticks: 1 << finest,
            at: 0,
            level: (segment.coarsest + 8).min(finest),
            jump_level: finest,
            crowd: 0,
            must_jump: true,
        }
    }

    /// Ticks of the next step.
    pub fn size(&self) -> u64 {
        if self.must_jump {
            (1 << (self.finest - self.jump_level)).min(self.ticks - self.at)
        } else {
            1 << (self.finest - self.level)
        }
    }

    /// A step that fails can be tried at half its length.
    pub fn can_halve(&self) -> bool {
        self.level < self.finest
    }

    /// A jump was made.
    pub fn jumped(&mut self, size: u64) {
        self.at += size;
        self.crowd += 1;
        if self.crowd > CROWD && self.jump_level > self.coarsest {
            (self.jump_level, self.crowd) = (self.jump_level - 1, 0);
        }
        self.must_jump = false;
        // back onto the grid with the longest step that it allows, at most the last one's
        self.level = self.jump_level.max(self.finest - self.at.trailing_zeros().min(self.finest));
    }

    /// A step was kept; its error is told as a share of what is allowed.
    pub fn kept(&mut self, size: u64, error: f64) {
        self.at += size;
        if self.level <= self.coarsest + 2 {
            (self.jump_level, self.crowd) = (self.finest, 0);
        }
        if error <= ROOM && self.level > self.coarsest && self.at.is_multiple_of(2 * size) {
            self.level -= 1;
        }
    }

    /// A step was not kept: its error was too large, or a mode changed in it, which in the end a jump passes.
    pub fn rejected(&mut self, is_change: bool) {
        if is_change && self.level >= self.jump_level {
            self.must_jump = true;
        } else {
            self.level += 1;
        }
    }
}
