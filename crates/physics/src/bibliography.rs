//! The one bibliography: every source a doc comment of hillpull names.

macro_rules! sources {
    ($($name:ident = $text:literal;)*) => {
        $(#[doc = $text] pub const $name: &str = $text;)*
    };
}

sources! {
    CODATA_2018 = "Tiesinga E., Mohr P. J., Newell D. B., Taylor B. N., 2021, CODATA recommended values of the fundamental physical constants: 2018, Reviews of Modern Physics 93, 025010.";
    WGS84 = "NIMA TR8350.2, 2000, Department of Defense World Geodetic System 1984, its definition and relationships with local geodetic systems, 3rd edition, amendment 1, table 3.1.";
    HAYFORD_BOWIE_1912 = "Hayford J. F., Bowie W., 1912, The effect of topography and isostatic compensation upon the intensity of gravity, US Coast and Geodetic Survey Special Publication 10.";
    HINZE_2003 = "Hinze W. J., 2003, Bouguer reduction density, why 2.67?, Geophysics 68, 1559-1560.";
    LAFEHR_1991 = "LaFehr T. R., 1991, An exact solution for the gravity curvature (Bullard B) correction, Geophysics 56, 1179-1184.";
    HAMMER_1939 = "Hammer S., 1939, Terrain corrections for gravimeter stations, Geophysics 4, 184-194.";
    NAGY_1966 = "Nagy D., 1966, The gravitational attraction of a right rectangular prism, Geophysics 31, 362-371.";
    NAGY_2000 = "Nagy D., Papp G., Benedek J., 2000, The gravitational potential and its derivatives for the prism, Journal of Geodesy 74, 552-560.";
    CARLSON_1995 = "Carlson B. C., 1995, Numerical computation of real or complex elliptic integrals, Numerical Algorithms 10, 13-26.";
    ABRAMOWITZ_STEGUN_1964 = "Abramowitz M., Stegun I. A. (eds), 1964, Handbook of mathematical functions, National Bureau of Standards Applied Mathematics Series 55.";
    BOWRING_1976 = "Bowring B. R., 1976, Transformation from spatial to geographical coordinates, Survey Review 23, 323-327.";
    BADOIU_CLARKSON_2003 = "Badoiu M., Clarkson K. L., 2003, Smaller core-sets for balls, Proceedings of the 14th ACM-SIAM Symposium on Discrete Algorithms, 801-802.";
}
