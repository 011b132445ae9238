//! Decide tool targets of a jointed machine: reachable with a posture, or proved unreachable.

pub mod cli;
pub mod evidence;
pub mod firmware;
pub mod kinematics;
pub mod log;
pub mod model;
pub mod pack;
pub mod posture;
pub mod prove;
pub mod read;
pub mod search;
pub mod write;
