//! What every program on a board needs: start, output, exit status, instruction counts and stack
//! use.
//!
//! All of it goes through *semihosting*: the emulator, or a debug probe, carries out requests to
//! print, read files and exit. Source: Arm, *Semihosting for AArch32 and AArch64*, 2020; RISC-V
//! International, *RISC-V Semihosting*, 2024.
#![no_std]

mod clock;
mod semihosting;
mod stack;
mod start;

pub use clock::{Clock, ClockError};
pub use semihosting::{File, Output, exit};
pub use stack::stack_used;

use core::fmt::Write;

/// How a program ends; the number is the exit status of the emulator.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Status {
    /// Everything was as expected.
    Success = 0,
    /// A check of the program's own failed.
    Failed = 10,
    /// The program panicked.
    Panicked = 20,
    /// The processor met an instruction or access it does not allow.
    Faulted = 30,
}

/// Makes a function without arguments, returning a [`Status`], the program.
#[macro_export]
macro_rules! program {
    ($run:path) => {
        #[unsafe(no_mangle)]
        fn board_program() -> $crate::Status {
            $run()
        }
    };
}

/// Prints a line.
#[macro_export]
macro_rules! say {
    ($($arguments:tt)*) => {{
        use core::fmt::Write;
        let _ = writeln!($crate::Output, $($arguments)*);
    }};
}

#[panic_handler]
fn panicked(info: &core::panic::PanicInfo) -> ! {
    let _ = writeln!(Output, "{info}");
    exit(Status::Panicked)
}
