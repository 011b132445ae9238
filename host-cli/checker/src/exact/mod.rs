//! Exact numbers: decimals as fractions, intervals of whole grains, enclosures of functions.

pub mod decimal;
pub mod function;
pub mod interval;
