//! Fixed-memory proof that a tool target is out of reach.
#![no_std]
#![forbid(unsafe_code)]

pub mod fixed;
