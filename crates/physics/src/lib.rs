//! Constants, the ellipsoid and closed-form bodies of the terrain effect: pure functions, no I/O.
//!
//! Lengths are metres, angles radians, attractions positive down. Functions that return mGal say so
//! in their name; the others return geometry in metres (or 1/m per area), to be multiplied by `G
//! rho`. Sources stand in [`bibliography`].

pub mod bibliography;
pub mod bodies;
pub mod constants;
pub mod ellipsoid;
