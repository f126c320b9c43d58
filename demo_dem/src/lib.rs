//! The demo's invented country: a relief that gives the same bits everywhere, its DEMs and its stations.
//!
//! Nothing in it is real: it lies, for want of an empty place on land, in the middle of an ocean. [`Relief`](relief::Relief)
//! is the truth; [`dems`] and [`stations`] are what surveys of different kinds make of it. Heights are computed with
//! `+ - * / sqrt floor` of f64 and integer hashes only, so they do not depend on the machine or the number of threads.

pub mod dems;
pub mod erosion;
pub mod field;
pub mod noise;
pub mod place;
pub mod relief;
pub mod stations;
