//! The demo's DEMs and stations are the committed ones, and fit together.

use std::sync::OnceLock;

use hillpull_demo::{
    dems::{self, FAR, FINE, Posts, REGIONAL},
    place::{lon_lat_deg, plane_from_survey},
    relief::Relief,
    stations::{self, Station},
};

fn relief() -> &'static Relief {
    static RELIEF: OnceLock<Relief> = OnceLock::new();
    RELIEF.get_or_init(Relief::new)
}

fn survey() -> Vec<Station> {
    stations::stations(relief())
}

/// Whether a place in the grid's CRS lies in the hull of its posts, with a margin in the CRS's units.
fn covers(posts: &Posts, x: f64, y: f64, margin: f64) -> bool {
    let (half, east) = (
        0.5 * posts.step,
        posts.west + posts.columns as f64 * posts.step,
    );
    let south = posts.north - posts.rows as f64 * posts.step;
    let (west, north) = (posts.west + half + margin, posts.north - half - margin);
    x > west && x < east - half - margin && y < north && y > south + half + margin
}

/// The README shows results of these very heights.
#[test]
fn heights_are_the_same_bits_everywhere() {
    let mut bits = blake3::Hasher::new();
    for height in dems::fine_heights(relief()) {
        bits.update(&height.to_le_bytes());
    }
    for height in dems::regional_heights(relief())
        .into_iter()
        .chain(dems::far_heights(relief()))
    {
        bits.update(&height.to_le_bytes());
    }
    assert_eq!(
        bits.finalize().to_hex().as_str(),
        include_str!("heights.blake3").trim()
    );
}

#[test]
fn committed_table_is_the_made_one() {
    assert_eq!(stations::table(&survey()), include_str!("../stations.csv"));
}

#[test]
fn stations_stand_on_the_dems_but_not_quite() {
    let fine = dems::fine_heights(relief());
    let mut misfits = Vec::new();
    for s in survey() {
        let (lon, lat) = lon_lat_deg(s.easting_m, s.northing_m);
        assert!(
            covers(&REGIONAL, lon, lat, 0.2),
            "{} is near the regional DEM's edge",
            s.id
        );
        if covers(&FINE, s.easting_m, s.northing_m, 0.0) {
            let column = ((s.easting_m - FINE.west) / FINE.step) as usize;
            let row = ((FINE.north - s.northing_m) / FINE.step) as usize;
            misfits.push((s.height_m - f64::from(fine[row * FINE.columns + column])).abs());
        }
    }
    misfits.sort_by(f64::total_cmp);
    let (median, worst) = (misfits[misfits.len() / 2], misfits[misfits.len() - 1]);
    assert!(
        misfits.len() >= 50,
        "{} stations on the fine DEM",
        misfits.len()
    );
    assert!(
        median > 0.05 && median < 1.0,
        "median misfit {median} m: decimetres"
    );
    assert!(worst < 5.0, "worst misfit {worst} m: metres");
}

/// Great circle, R = 6371 km: 166.735 km are 1.4995 degrees of latitude, and in longitude
/// asin(sin(1.4995) / cos(latitude)) degrees. Half a percent is added for the ellipsoid.
#[test]
fn far_dem_reaches_the_outer_radius_and_is_land() {
    let arc = 1.005 * 166_735.0 / 6_371_000.0f64;
    for s in survey() {
        let (lon, lat) = lon_lat_deg(s.easting_m, s.northing_m);
        let (north, east) = (
            arc.to_degrees(),
            (arc.sin() / lat.to_radians().cos()).asin().to_degrees(),
        );
        for (x, y) in [
            (lon - east, lat),
            (lon + east, lat),
            (lon, lat - north),
            (lon, lat + north),
        ] {
            assert!(
                covers(&FAR, x, y, 0.0),
                "{}: {x} {y} is beyond the far DEM",
                s.id
            );
        }
    }
    assert!(
        dems::far_heights(relief())
            .into_iter()
            .all(|height| height > 0)
    );
}

/// Two places of the story are where the story says: a flat top, and the massif's highest ground.
#[test]
fn landfill_and_summit_stand_out() {
    let height = |easting: f64, northing: f64| {
        let (x, y) = plane_from_survey(easting, northing);
        relief().height_m(x, y)
    };
    let top = height(338_434.0, 5_146_466.0);
    assert!(
        (height(338_464.0, 5_146_466.0) - top).abs() < 1.0,
        "the top is flat"
    );
    assert!(
        top - height(338_434.0, 5_146_346.0) > 15.0,
        "the margin falls away"
    );
    let highest = dems::fine_heights(relief())
        .into_iter()
        .fold(f32::MIN, f32::max);
    let summit = survey().iter().map(|s| s.height_m).fold(f64::MIN, f64::max);
    assert!(
        f64::from(highest) - summit < 30.0 && summit > 2_900.0,
        "{summit} m against {highest} m"
    );
}
