//! What goes into the engine and what comes out.

/// What is done where a ground station's height and the surface below it disagree.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ground {
    /// The surface is bent to pass through the station.
    Bend,
    /// The station is put on the surface, for the terrain effect only.
    Settle,
    /// Heights as given, surface as given.
    Given,
}

/// A station as the engine sees it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Station {
    /// Geodetic longitude on WGS 84, degrees.
    pub lon_deg: f64,
    /// Geodetic latitude on WGS 84, degrees.
    pub lat_deg: f64,
    /// Height above the datum of the DEM, metres.
    pub height_m: f64,
    /// Ground policy of this station.
    pub ground: Ground,
}

/// What holds for all stations of a run.
#[derive(Clone, Debug, PartialEq)]
pub struct Settings {
    /// Density of rock, kg/m3.
    pub density_kg_m3: f64,
    /// Gravitational constant, m3 kg-1 s-2.
    pub big_g: f64,
    /// Outer radius along the ground, metres.
    pub outer_radius_m: f64,
    /// Zone edges inside the outer radius, metres along the ground, ascending, without 0 and without the outer radius.
    pub zone_edges_m: Vec<f64>,
    /// Largest numeric error allowed in a station's total, mGal.
    pub tolerance_mgal: f64,
    /// Bending radius, metres; raised to three posts of the DEM under the station.
    pub bend_radius_m: f64,
}

impl Settings {
    /// The zones as (from, to) in metres along the ground, innermost first, ending at the outer radius.
    #[must_use]
    pub fn zones_m(&self) -> Vec<(f64, f64)> {
        let mut from = 0.0;
        let mut zones = Vec::with_capacity(self.zone_edges_m.len() + 1);
        for &to in self.zone_edges_m.iter().chain([&self.outer_radius_m]) {
            zones.push((from, to));
            from = to;
        }
        zones
    }
}

/// The terrain effect at one station.
#[derive(Clone, Debug, PartialEq)]
pub struct StationEffect {
    /// Attraction of the body between the station's level and the surface, mGal, positive down.
    pub terrain_effect_mgal: f64,
    /// The same by zone, innermost first; sums to the total.
    pub zone_effect_mgal: Vec<f64>,
    /// Attraction of everything between the datum and the surface, mGal: cap plus terrain effect.
    pub topography_mgal: f64,
    /// Bound of the numeric error of the total, mGal.
    pub numeric_bound_mgal: f64,
    /// Height of the DEM's surface at the station, metres.
    pub dem_height_m: f64,
    /// Station height minus `dem_height_m`, metres.
    pub height_misfit_m: f64,
    /// Share of the disc to the outer radius that some layer covers, 0 to 1.
    pub covered: f64,
    /// The same by zone.
    pub zone_covered: Vec<f64>,
    /// Index of the layer under the station.
    pub layer: usize,
    /// Kernel evaluations spent.
    pub evaluations: u64,
}

/// Why a station has no result.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum StationProblem {
    /// No layer covers the station (outside every DEM, or in a void of all of them).
    #[error("no DEM covers the station")]
    NotCovered,
    /// The run was interrupted before this station was done.
    #[error("interrupted before this station was computed")]
    Interrupted,
    /// The tolerance could not be met within the limit of refinement.
    #[error("the numeric bound {bound_mgal} mGal stays above the tolerance")]
    ToleranceNotMet {
        /// The bound reached, mGal.
        bound_mgal: f64,
    },
}
