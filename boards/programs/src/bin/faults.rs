//! A deliberate fault, an undefined instruction, to see its exit status.
#![no_std]
#![no_main]

use core::arch::asm;
use support::{Status, program};

program!(run);

fn run() -> Status {
    // Safety: the processor stops here.
    #[cfg(target_arch = "arm")]
    unsafe {
        asm!("udf #0");
    }
    // Safety: as above.
    #[cfg(target_arch = "riscv32")]
    unsafe {
        asm!("unimp");
    }
    Status::Success
}
