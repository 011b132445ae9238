//! Records that no screening made, and numbers that look random.

use balk_core::fixed::{Interval, ONE};
use balk_core::propagate::{MOST_JOINTS, Rules};
use balk_core::record::Record;
use balk_core::screen::{Options, Step};
use balk_core::target::{Cone, Orientation, Target};

/// Reproducible numbers: the xorshift generator of Marsaglia, *Xorshift RNGs*, Journal of
/// Statistical Software 8(14), 2003, with shifts 13, 7, 17.
pub struct Numbers(pub u64);

impl Numbers {
    pub fn next(&mut self) -> u64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        self.0
    }

    pub fn below(&mut self, bound: usize) -> usize {
        (self.next() % bound as u64) as usize
    }

    fn length(&mut self) -> i32 {
        self.next() as i32 >> 1
    }

    fn half_sine(&mut self) -> i32 {
        self.length().abs()
    }

    fn cone(&mut self) -> Cone {
        let axes = [
            [0, 0, ONE],
            [0, -ONE, 1],
            // 0.6 and 0.8, rounded.
            [644_245_094, 0, 858_993_459],
        ];
        Cone {
            tip: axes[self.below(3)],
            base: axes[self.below(3)],
            half_sine: self.half_sine(),
        }
    }

    /// The steps of a tree of `parts` parts.
    pub fn tree(&mut self, parts: usize) -> Vec<Step> {
        let mut steps = Vec::new();
        // Parts that wait, by the number of parts each is still to be cut into.
        let mut open = vec![parts];
        while let Some(parts) = open.pop() {
            if parts == 1 {
                steps.push([Step::Bounds, Step::Rows][self.below(2)]);
                continue;
            }
            steps.push(Step::Cut(self.below(MOST_JOINTS) as u8));
            let lower = 1 + self.below(parts - 1);
            open.extend([parts - lower, lower]);
        }
        steps
    }

    /// A record with a tree of that many parts and as many cones, or another orientation.
    pub fn record(&mut self, parts: usize, cones: Option<usize>) -> Record {
        let orientation = match (cones, self.below(2)) {
            (Some(count), _) => Orientation::Axes((0..count).map(|_| self.cone()).collect()),
            (None, 0) => Orientation::Free,
            (None, _) => Orientation::Near {
                quaternion: [0; 4].map(|_| self.length()),
                half_sine: self.half_sine(),
            },
        };
        Record {
            sequence: self.next() as u32,
            digest: self.next(),
            fingerprint: self.next(),
            options: Options {
                splits: parts as u16,
                pivots: self.next() as u16,
                candidates: self.next() as u8,
                rules: Rules(self.next() as u8 & Rules::ALL.0),
            },
            target: Target {
                position: [0; 3]
                    .map(|_| Interval::clamped(self.length().into(), self.length().into())),
                orientation,
            },
            steps: self.tree(parts).into_iter().collect(),
        }
    }
}
