//! Fixed-memory proof that a tool target is out of reach.
#![no_std]
#![forbid(unsafe_code)]

pub mod certificate;
pub mod fixed;
pub mod image;
pub mod machine;
pub mod propagate;
pub mod record;
pub mod relaxation;
pub mod rows;
pub mod screen;
pub mod simplex;
pub mod target;
