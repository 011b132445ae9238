//! Decide tool targets of a jointed machine: reachable with a posture, or proved unreachable.

pub mod cli;
pub mod kinematics;
pub mod model;
pub mod pack;
pub mod posture;
pub mod read;
pub mod search;
