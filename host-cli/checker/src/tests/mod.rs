//! Rules against true postures, computed in floating point by code of their own.

mod functions;
mod rules;
mod world;
