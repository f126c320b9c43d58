//! The terrain effect of a relief at a station: tree walk, cells next to the station, zones, error bounds.
//!
//! The walk is per station, sequential and in a fixed order, so that results don't depend on the number of threads.

mod bend;
mod brute;
mod effect;
mod frame;
mod kernel;
mod load;
mod near;
mod prefetch;
mod types;
mod walk;
mod zones;

pub use brute::brute_force;
pub use effect::{effect, effects};
pub use types::{Ground, Settings, Station, StationEffect, StationProblem};
