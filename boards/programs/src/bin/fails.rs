//! A deliberate failed check, to see its exit status.
#![no_std]
#![no_main]

use support::{Status, program, say};

program!(run);

fn run() -> Status {
    say!("a check that fails");
    Status::Failed
}
