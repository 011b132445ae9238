//! Damage to logs of refusals, and the size of a record.

use crate::families::{Family, Kind};
use balk::log::{Content, Continuity, Items};
use balk::search::Screening;
use balk_core::record::Log;
use rand::seq::index::sample;
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rayon::prelude::*;
use std::ops::Range;

/// Screenings that the sizes of records are told for.
pub const SPLITS: [u16; 4] = [1, 4, 8, 16];

/// A log as a controller sends it.
pub struct Reference {
    /// All of it.
    pub bytes: Vec<u8>,
    /// Where each frame lies, with its two zero bytes; the last is the seal's.
    pub frames: Vec<Range<usize>>,
    /// The records, by number and digest.
    pub records: Vec<(u32, u64)>,
}

/// What was read of a log.
pub struct Seen {
    /// Whether nothing at all was found wrong with it.
    pub clean: bool,
    /// The records in order, by number and digest.
    pub records: Vec<(u32, u64)>,
}

/// The result of damaging a log in many ways.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Damage {
    /// Damaged logs read.
    pub tried: u64,
    /// Of those, found without fault.
    pub undetected: u64,
    /// Of those, with an undamaged record that was not read.
    pub unread: u64,
}

impl Damage {
    fn plus(self, other: Damage) -> Damage {
        Damage {
            tried: self.tried + other.tried,
            undetected: self.undetected + other.undetected,
            unread: self.unread + other.unread,
        }
    }
}

/// What [`Items`] and [`Continuity`] say of a log.
pub fn see(log: &[u8]) -> Seen {
    let mut seen = Seen {
        clean: true,
        records: Vec::new(),
    };
    let Ok(items) = Items::open(log) else {
        seen.clean = false;
        return seen;
    };
    let mut continuity = Continuity::new();
    for item in items {
        let item = item.expect("memory can be read");
        seen.clean &= continuity.see(&item.content).is_none();
        match &item.content {
            Content::Damaged(_) => seen.clean = false,
            Content::Record(record) => seen.records.push((record.sequence, record.digest)),
            Content::Seal(_) => {}
        }
    }
    seen.clean &= continuity.end().is_none();
    seen
}

impl Reference {
    /// A log of that many refusals of all arms and kinds of target in turn, at eight splits.
    pub fn new(records: usize) -> Reference {
        let mut log = Box::new(Log::<{ 1 << 16 }>::new());
        let families = Family::all();
        let mut each: Vec<_> = families
            .iter()
            .flat_map(|family| Kind::ALL.map(|kind| (family, kind)))
            .map(|(family, kind)| {
                let targets = family.targets(kind, 20 + 2 * records, 31);
                targets
                    .into_iter()
                    .filter_map(|target| match family.solver.screen(&target, 8) {
                        Screening::Refused { record } => Some(record),
                        Screening::Passed { .. } => None,
                    })
            })
            .collect();
        let turns = each.len();
        for number in 0..records {
            log.push(
                each[number % turns]
                    .next()
                    .expect("enough targets are refused"),
            );
        }
        log.seal().expect("the log is large enough");
        assert_eq!(log.lost(), 0, "the log is large enough");
        let mut bytes = vec![0; 1 << 16];
        let count = log.read(&mut bytes);
        bytes.truncate(count);
        Reference::of(bytes)
    }

    fn of(bytes: Vec<u8>) -> Reference {
        let zeros: Vec<usize> = (0..bytes.len()).filter(|at| bytes[*at] == 0).collect();
        Reference {
            frames: zeros.chunks(2).map(|pair| pair[0]..pair[1] + 1).collect(),
            records: see(&bytes).records,
            bytes,
        }
    }

    /// Reads the log with the bytes in `hit` damaged by `damage`.
    fn damaged(&self, hit: &[usize], damage: impl Fn(&mut [u8])) -> Damage {
        let mut bytes = self.bytes.clone();
        damage(&mut bytes);
        self.judge(&bytes, |frame| hit.iter().any(|at| frame.contains(at)))
    }

    /// Reads a damaged log; all records but those whose frames are `hit` must be there.
    fn judge(&self, bytes: &[u8], hit: impl Fn(&Range<usize>) -> bool) -> Damage {
        let seen = see(bytes);
        let mut found = seen.records.iter();
        let mut whole = self
            .records
            .iter()
            .zip(&self.frames)
            .filter(|(_, frame)| !hit(frame));
        Damage {
            tried: 1,
            undetected: seen.clean.into(),
            unread: (!whole.all(|(record, _)| found.any(|other| other == record))).into(),
        }
    }

    /// Every beginning of the log shorter than the whole.
    pub fn truncations(&self) -> Damage {
        sum((0..self.bytes.len())
            .into_par_iter()
            .map(|length| self.judge(&self.bytes[..length], |frame| frame.end > length)))
    }

    /// Every bit flipped.
    pub fn flips(&self) -> Damage {
        sum(self
            .bits()
            .into_par_iter()
            .map(|bit| self.flipped([bit, bit + self.bytes.len() * 8])))
    }

    fn bits(&self) -> Range<usize> {
        0..self.bytes.len() * 8
    }

    /// These bits flipped; those beyond the end are none.
    fn flipped(&self, bits: [usize; 2]) -> Damage {
        self.damaged(&bits.map(|bit| bit / 8), |bytes| {
            for bit in bits {
                if let Some(byte) = bytes.get_mut(bit / 8) {
                    *byte ^= 1 << (bit % 8);
                }
            }
        })
    }

    /// Every two bits of one frame flipped, its zero bytes included.
    pub fn pairs_within_frames(&self) -> Damage {
        let frames = self.frames.par_iter();
        sum(frames.map(|frame| self.pairs(frame.start * 8..frame.end * 8)))
    }

    /// Every two bits flipped: minutes for a dozen records, growing with the cube of their number.
    pub fn all_pairs(&self) -> Damage {
        self.pairs(self.bits())
    }

    fn pairs(&self, bits: Range<usize>) -> Damage {
        let end = bits.end;
        sum(bits.into_par_iter().map(|first| {
            let others = first + 1..end;
            others
                .map(|second| self.flipped([first, second]))
                .fold(Damage::default(), Damage::plus)
        }))
    }

    /// That many random pairs of bits flipped.
    pub fn random_pairs(&self, count: u64, seed: u64) -> Damage {
        sum((0..count).into_par_iter().map(|number| {
            let mut random = ChaCha8Rng::seed_from_u64(seed + number);
            let two = sample(&mut random, self.bits().end, 2);
            self.flipped([two.index(0), two.index(1)])
        }))
    }

    /// That many bursts: up to 40 bytes in a row replaced by random ones, at least one of them by
    /// another.
    pub fn bursts(&self, count: u64, seed: u64) -> Damage {
        sum((0..count).into_par_iter().map(|number| {
            let mut random = ChaCha8Rng::seed_from_u64(seed + number);
            let length = random.random_range(1..=40);
            let start = random.random_range(0..self.bytes.len() - length);
            let mut noise: Vec<u8> = (0..length).map(|_| random.random()).collect();
            if noise == self.bytes[start..start + length] {
                noise[0] ^= 0xff;
            }
            let hit: Vec<usize> = (start..start + length).collect();
            self.damaged(&hit, |bytes| {
                bytes[start..start + length].copy_from_slice(&noise)
            })
        }))
    }

    /// Every record deleted, every record put a second time after any frame but its own, every two
    /// records swapped.
    pub fn rearrangements(&self) -> Damage {
        let count = self.records.len();
        let order: Vec<usize> = (0..=count).collect();
        let mut orders = Vec::new();
        for one in 0..count {
            let mut deleted = order.clone();
            deleted.remove(one);
            orders.push((deleted, Some(one)));
            for other in 0..=count {
                let mut repeated = order.clone();
                repeated.insert(other + 1, one);
                orders.push((repeated, None));
            }
            for other in one + 1..count {
                let mut swapped = order.clone();
                swapped.swap(one, other);
                orders.push((swapped, None));
            }
        }
        sum(orders.par_iter().map(|(order, deleted)| {
            let frames = order
                .iter()
                .map(|frame| &self.bytes[self.frames[*frame].clone()]);
            let seen = see(&frames.collect::<Vec<_>>().concat());
            let there = |number: &usize| seen.records.contains(&self.records[*number]);
            Damage {
                tried: 1,
                undetected: seen.clean.into(),
                unread: (!(0..count)
                    .filter(|number| Some(*number) != *deleted)
                    .all(|n| there(&n)))
                .into(),
            }
        }))
    }
}

fn sum(damages: impl ParallelIterator<Item = Damage>) -> Damage {
    damages.reduce(Damage::default, Damage::plus)
}

/// Bytes of the records of one arm's refused targets.
#[derive(Clone, Copy, Debug)]
pub struct Sizes {
    /// Refused targets.
    pub refused: usize,
    /// Half of the records are no longer.
    pub median: usize,
    /// The longest.
    pub most: usize,
}

/// Sizes of the records of an arm's refusals, over `targets` targets of every kind.
pub fn sizes(family: &Family, splits: u16, targets: usize, seed: u64) -> Sizes {
    let all: Vec<_> = Kind::ALL
        .into_iter()
        .flat_map(|kind| family.targets(kind, targets, seed))
        .collect();
    let size = |target| match family.solver.screen(target, splits) {
        Screening::Refused { record } => Some(record.len()),
        Screening::Passed { .. } => None,
    };
    let mut sizes: Vec<usize> = all.par_iter().filter_map(size).collect();
    sizes.sort_unstable();
    Sizes {
        refused: sizes.len(),
        median: sizes.get(sizes.len() / 2).copied().unwrap_or(0),
        most: sizes.last().copied().unwrap_or(0),
    }
}

/// Prints the sizes of records of the two six-joint arms, `targets` targets of every kind; returns
/// them with the splits.
pub fn print_sizes(targets: usize, seed: u64) -> Vec<(u16, Sizes)> {
    let mut all = Vec::new();
    println!("| arm | splits | refused | median, bytes | most, bytes |");
    println!("|---|---|---|---|---|");
    for name in ["spherical", "offset"] {
        let family = Family::read(name);
        for splits in SPLITS {
            let sizes = sizes(&family, splits, targets, seed);
            let Sizes {
                refused,
                median,
                most,
            } = sizes;
            println!("| {name} | {splits} | {refused} | {median} | {most} |");
            all.push((splits, sizes));
        }
    }
    all
}

/// Prints what damage to a log of that many records was noticed; with `all_pairs`, every two bits.
pub fn print_damage(records: usize, all_pairs: bool, seed: u64) {
    let reference = Reference::new(records);
    println!(
        "a log of {records} records and a seal, {} bytes\n",
        reference.bytes.len()
    );
    println!("| damage | logs | undetected | an undamaged record unread |");
    println!("|---|---|---|---|");
    let row = |name: &str, damage: Damage| {
        let Damage {
            tried,
            undetected,
            unread,
        } = damage;
        println!("| {name} | {tried} | {undetected} | {unread} |");
    };
    row("truncated", reference.truncations());
    row("one bit", reference.flips());
    row("two bits of a frame", reference.pairs_within_frames());
    if all_pairs {
        row("two bits", reference.all_pairs());
    } else {
        row("two bits, at random", reference.random_pairs(100_000, seed));
    }
    row("burst of up to 40 bytes", reference.bursts(100_000, seed));
    row("deleted, repeated or swapped", reference.rearrangements());
}
