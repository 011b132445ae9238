//! A deliberate panic, to see its exit status.
#![no_std]
#![no_main]

use support::{Status, program};

program!(run);

fn run() -> Status {
    panic!("on purpose")
}
