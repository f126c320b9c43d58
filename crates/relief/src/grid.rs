//! One DEM as read: posts, heights and where the posts lie.

/// A grid of posts with heights, as read from one DEM.
#[derive(Clone, Debug)]
pub struct Grid {
    /// Name for messages, usually the file name.
    pub label: String,
    /// Number of rows of posts.
    pub rows: usize,
    /// Number of columns of posts.
    pub cols: usize,
    /// Heights in metres, row-major, `rows * cols` long; NaN marks a void.
    pub heights_m: Vec<f32>,
    /// Where the posts lie.
    pub placement: Placement,
}

/// Where the posts of a grid lie: an affine map to the grid's CRS, and the CRS.
#[derive(Clone, Debug, PartialEq)]
pub struct Placement {
    /// CRS x = a[0] + a[1] * col + a[2] * row, y = a[3] + a[4] * col + a[5] * row, with (row, col) = (0, 0) at the
    /// first POST (pixel centre).
    pub affine: [f64; 6],
    /// The CRS as WKT or an authority code; None stands for WGS 84 longitude and latitude in degrees.
    pub crs: Option<String>,
}
