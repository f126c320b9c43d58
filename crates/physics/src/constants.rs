//! Constants with their sources.

/// Newtonian constant of gravitation, m3 kg-1 s-2
/// ([`CODATA_2018`](crate::bibliography::CODATA_2018)).
pub const G_CODATA_2018: f64 = 6.67430e-11;

/// Equatorial radius of WGS 84, metres ([`WGS84`](crate::bibliography::WGS84)).
pub const WGS84_A_M: f64 = 6_378_137.0;

/// Inverse flattening of WGS 84, dimensionless ([`WGS84`](crate::bibliography::WGS84)).
pub const WGS84_INV_F: f64 = 298.257223563;

/// Radius of the sphere that ground distances and the spherical cap use, metres (mean Earth radius,
/// rounded; [`LAFEHR_1991`](crate::bibliography::LAFEHR_1991), recalled from memory).
pub const EARTH_RADIUS_M: f64 = 6_371_000.0;

/// Default outer radius, metres along the ground: outer edge of Hayford-Bowie zone O
/// ([`HAYFORD_BOWIE_1912`](crate::bibliography::HAYFORD_BOWIE_1912)).
pub const OUTER_RADIUS_M: f64 = 166_735.0;

/// Usual reduction density of rock, kg/m3 ([`HINZE_2003`](crate::bibliography::HINZE_2003)).
pub const DENSITY_ROCK_KG_M3: f64 = 2670.0;

/// mGal in 1 m/s2: the gal is 1 cm/s2 by definition.
pub const MGAL_PER_M_S2: f64 = 1e5;
