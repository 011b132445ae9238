//! How many instructions a piece of work takes.
//!
//! The emulator runs with a virtual clock that advances by a fixed time an instruction. On Cortex-M
//! the SysTick counter (25 MHz) is read: with 2 ns an instruction (`-icount shift=1`) a tick is
//! twenty instructions. On RISC-V the counter of retired instructions is read, with 1 ns an
//! instruction (`shift=0`), because emulators differ in whether they count one or the other there.
//! These are counts, not cycles: memory wait states, pipelines and caches are not modelled.

use core::arch::asm;

/// Counts instructions. Only one may exist at a time: the counter is the processor's.
pub struct Clock(());

/// Why instructions cannot be counted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ClockError {
    /// A loop of known length was counted as this many instructions.
    Off(u32),
    /// The work takes more than the counter holds, 335 million instructions.
    Overflow,
}

/// Rounds of the loop of known length.
const ROUNDS: u32 = 100_000;

impl Clock {
    /// Starts the counter and checks it against a loop of known length.
    ///
    /// # Errors
    /// [`ClockError::Off`] when the count is off by more than one in a hundred: the emulator was
    /// started with another clock.
    pub fn start() -> Result<Clock, ClockError> {
        let clock = Clock(());
        platform::start();
        let (counted, ()) = clock.count(known_loop)?;
        if counted.abs_diff(2 * ROUNDS) > ROUNDS / 50 {
            return Err(ClockError::Off(counted));
        }
        Ok(clock)
    }

    /// Instructions that `work` takes, within about thirty, and what it returns.
    ///
    /// # Errors
    /// [`ClockError::Overflow`] when the counter does not hold them.
    pub fn count<T>(&self, work: impl FnOnce() -> T) -> Result<(u32, T), ClockError> {
        let before = platform::now();
        let result = work();
        let instructions = platform::since(before).ok_or(ClockError::Overflow)?;
        Ok((instructions, result))
    }
}

/// Two instructions a round.
fn known_loop() {
    // Safety: it counts a register down.
    #[cfg(target_arch = "arm")]
    unsafe {
        asm!("1:", "subs {0}, #1", "bne 1b", inout(reg) ROUNDS => _);
    }
    // Safety: as above.
    #[cfg(target_arch = "riscv32")]
    unsafe {
        asm!("1:", "addi {0}, {0}, -1", "bnez {0}, 1b", inout(reg) ROUNDS => _);
    }
}

#[cfg(target_arch = "arm")]
mod platform {
    const CONTROL: *mut u32 = 0xe000_e010 as *mut u32;
    const RELOAD: *mut u32 = 0xe000_e014 as *mut u32;
    const CURRENT: *mut u32 = 0xe000_e018 as *mut u32;
    const LARGEST: u32 = 0x00ff_ffff;
    const INSTRUCTIONS_PER_TICK: u32 = 20;
    /// In [`CONTROL`]: the counter passed zero since the last look.
    const PASSED_ZERO: u32 = 1 << 16;

    // Safety of all below: the three registers exist on every Cortex-M with SysTick, and nothing
    // else uses them.

    pub fn start() {
        unsafe {
            RELOAD.write_volatile(LARGEST);
            CURRENT.write_volatile(0);
            // Enabled, processor clock, no interrupt.
            CONTROL.write_volatile(0b101);
        }
    }

    /// Restarts the counter, which counts down.
    pub fn now() -> u32 {
        unsafe {
            CURRENT.write_volatile(0);
            // The first tick loads the counter; wait for it.
            while CURRENT.read_volatile() == 0 {}
            CONTROL.read_volatile();
            CURRENT.read_volatile()
        }
    }

    pub fn since(before: u32) -> Option<u32> {
        let (after, control) = unsafe { (CURRENT.read_volatile(), CONTROL.read_volatile()) };
        (control & PASSED_ZERO == 0).then(|| (before - after) * INSTRUCTIONS_PER_TICK)
    }
}

#[cfg(target_arch = "riscv32")]
mod platform {
    use core::arch::asm;

    pub fn start() {}

    pub fn now() -> u64 {
        let (mut high, mut low, mut again): (u32, u32, u32);
        loop {
            // Safety: reads a counter.
            unsafe {
                asm!("rdinstreth {0}", "rdinstret {1}", "rdinstreth {2}",
                    out(reg) high, out(reg) low, out(reg) again);
            }
            if high == again {
                return u64::from(high) << 32 | u64::from(low);
            }
        }
    }

    pub fn since(before: u64) -> Option<u32> {
        u32::try_from(now() - before).ok()
    }
}
