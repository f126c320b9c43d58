//! Bodies whose attraction has a closed form, or one that is closed but for a smooth quadrature.
//!
//! Attractions are along the station's vertical, positive down, for one unit of `G rho`.

pub mod cap;
pub mod column;
mod gauss;
pub mod prism;
pub mod sector;
