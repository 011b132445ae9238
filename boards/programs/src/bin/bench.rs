//! Instructions and stack of the check, by kind of target and budget.
//!
//! Lines that begin with `#` hold measured figures.
#![no_std]
#![no_main]

use balk_board_programs::cases::{Case, CaseError, Cases, UNREACHABLE};
use balk_board_programs::{screen_entry, spherical};
use balk_core::record::fingerprint;
use balk_core::screen::{Options, Verdict, Workspace6};
use balk_core::target::Target;
use support::{Clock, ClockError, Status, program, say, stack_used};

program!(run);

/// Kinds of target, as the maker of cases numbers them.
const KINDS: [&str; 4] = ["pose", "point", "cone", "box"];
/// Splits and pivots of each budget.
const BUDGETS: [(u16, u16); 4] = [(1, 0), (1, 200), (4, 200), (8, 200)];
/// Most cases of one kind.
const MOST: usize = 500;

/// Why there are no figures.
#[derive(Debug)]
enum BenchError {
    Cases(#[allow(dead_code, reason = "printed")] CaseError),
    Clock(#[allow(dead_code, reason = "printed")] ClockError),
    /// A case is of an unknown kind, or out of order.
    OtherKind,
    /// The machine of the cases is not the one compiled in.
    OtherMachine,
    /// More cases of a kind than there is room for.
    TooMany,
}

fn run() -> Status {
    match bench() {
        Ok(()) => Status::Success,
        Err(error) => {
            say!("{error:?}");
            Status::Failed
        }
    }
}

/// What one kind of target took under one budget.
struct Figures {
    /// Of targets in all, instructions.
    all: Counts,
    /// Of unreachable ones.
    unreachable: Counts,
    refused: u32,
    stack: usize,
}

impl Figures {
    const NONE: Figures = Figures {
        all: Counts::NONE,
        unreachable: Counts::NONE,
        refused: 0,
        stack: 0,
    };
}

struct Counts {
    counts: [u32; MOST],
    length: usize,
}

impl Counts {
    const NONE: Counts = Counts {
        counts: [0; MOST],
        length: 0,
    };

    fn add(&mut self, count: u32) -> Result<(), BenchError> {
        *self
            .counts
            .get_mut(self.length)
            .ok_or(BenchError::TooMany)? = count;
        self.length += 1;
        Ok(())
    }

    /// The count that this share of all, in hundredths, does not exceed.
    fn share(&mut self, hundredths: usize) -> u32 {
        let counts = &mut self.counts[..self.length];
        counts.sort_unstable();
        let at = (counts.len() * hundredths).div_ceil(100);
        counts.get(at.saturating_sub(1)).copied().unwrap_or(0)
    }
}

/// What every screening uses.
struct Bench {
    clock: Clock,
    workspace: Workspace6,
    cases: Cases,
    /// Cases not yet read, and the one read too early.
    left: u32,
    next: Option<Case>,
}

impl Bench {
    /// The next case if it is of this kind.
    fn case(&mut self, kind: u8) -> Result<Option<Case>, BenchError> {
        if self.next.is_none() && self.left > 0 {
            self.left -= 1;
            self.next = Some(self.cases.case().map_err(BenchError::Cases)?);
        }
        Ok(self.next.take_if(|case| case.kind == kind))
    }

    /// Screens all cases of a kind, which follow each other in the file, under every budget.
    fn kind(&mut self, kind: u8) -> Result<[Figures; BUDGETS.len()], BenchError> {
        let mut figures = [const { Figures::NONE }; BUDGETS.len()];
        while let Some(case) = self.case(kind)? {
            for ((splits, pivots), figures) in BUDGETS.into_iter().zip(&mut figures) {
                let options = Options {
                    splits,
                    pivots,
                    ..Options::default()
                };
                let (refused, instructions, stack) = self.screen(&case.record.target, &options)?;
                figures.all.add(instructions)?;
                if case.truth == UNREACHABLE {
                    figures.unreachable.add(instructions)?;
                }
                figures.refused += u32::from(refused);
                figures.stack = figures.stack.max(stack);
            }
        }
        Ok(figures)
    }

    /// One screening: whether it refused, its instructions, its stack.
    fn screen(
        &mut self,
        target: &Target,
        options: &Options,
    ) -> Result<(bool, u32, usize), BenchError> {
        let Bench {
            clock, workspace, ..
        } = self;
        let (stack, counted) = stack_used(|| {
            clock.count(|| {
                let verdict = screen_entry(&spherical::MACHINE, target, options, workspace);
                matches!(verdict, Verdict::Refused(_))
            })
        });
        let (instructions, refused) = counted.map_err(BenchError::Clock)?;
        Ok((refused, instructions, stack))
    }
}

fn bench() -> Result<(), BenchError> {
    let mut cases = Cases::open(c"bench.cases").map_err(BenchError::Cases)?;
    let section = cases.section().map_err(BenchError::Cases)?;
    let section = section.ok_or(BenchError::OtherMachine)?;
    let identity = fingerprint(&spherical::MACHINE);
    if identity != spherical::FINGERPRINT || identity != fingerprint(&section.machine) {
        return Err(BenchError::OtherMachine);
    }
    say!("machine {identity:016x}");
    say!("memory beside the stack: {} bytes", size_of::<Workspace6>());
    let mut bench = Bench {
        clock: Clock::start().map_err(BenchError::Clock)?,
        workspace: Workspace6::new(),
        cases,
        left: section.cases,
        next: None,
    };
    for (kind, name) in (0..).zip(KINDS) {
        let mut figures = bench.kind(kind)?;
        for ((splits, pivots), figures) in BUDGETS.into_iter().zip(&mut figures) {
            let Figures {
                all,
                unreachable,
                refused,
                stack,
            } = figures;
            say!(
                "{name}, splits {splits}, pivots {pivots}: {refused} of {} refused, {} unreachable",
                all.length,
                unreachable.length
            );
            say!(
                "# instructions: median {}, 99 % {}, largest {}; unreachable: median {}, largest {}; stack {stack}",
                all.share(50),
                all.share(99),
                all.share(100),
                unreachable.share(50),
                unreachable.share(100),
            );
        }
    }
    if bench.left > 0 || bench.next.is_some() {
        return Err(BenchError::OtherKind);
    }
    Ok(())
}
