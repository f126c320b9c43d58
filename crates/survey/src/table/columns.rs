//! Which column is what: by usual names or by the names given as options.
use super::TableOptions;
use crate::error::TableProblem;

/// Names of a station's name, the better first (common practice, no source). Several in one line are ambiguous.
const ID_NAMES: [&[&str]; 4] = [
    &[
        "station",
        "station_id",
        "station_name",
        "station_no",
        "station_nr",
        "stationid",
        "stn",
    ],
    &["id"],
    &[
        "point",
        "point_id",
        "point_name",
        "point_no",
        "pointid",
        "pt",
    ],
    &["name"],
];
const LON_NAMES: &[&str] = &["lon", "long", "longitude", "lng"];
const LAT_NAMES: &[&str] = &["lat", "latitude"];
const X_NAMES: &[&str] = &["x", "easting", "east", "e", "x_coord", "xcoord"];
const Y_NAMES: &[&str] = &["y", "northing", "north", "n", "y_coord", "ycoord"];
const HEIGHT_NAMES: &[&str] = &[
    "height",
    "elevation",
    "elev",
    "h",
    "z",
    "altitude",
    "alt",
    "station_height",
];

/// Units that may follow a name. Feet are not among them: such a column must be converted first.
const UNIT_SUFFIXES: [&str; 8] = [
    "_m", "_metre", "_metres", "_meters", "_masl", "_deg", "_degree", "_degrees",
];
const UNIT_BRACKETS: [&str; 9] = [
    "m", "metre", "metres", "meters", "m asl", "masl", "deg", "degrees", "°",
];

/// The columns used.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Columns {
    pub(crate) id: Option<usize>,
    /// Columns of x and y; `None`: the layer's geometry.
    pub(crate) xy: Option<(usize, usize)>,
    /// Column of the height; `None`: the third coordinate of the geometry.
    pub(crate) height: Option<usize>,
    /// x and y bear the names of longitude and latitude.
    pub(crate) degrees: bool,
    /// x and y were named by option.
    pub(crate) xy_named: bool,
}

/// What is known besides the names.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Circumstances {
    /// Points come with the layer.
    pub(crate) geometry: bool,
    /// The points have a third coordinate.
    pub(crate) geometry_z: bool,
    /// A coordinate reference system was given and is a projected one.
    pub(crate) projected: bool,
}

/// Finds the columns.
pub(crate) fn find_columns(
    names: &[String],
    options: &TableOptions,
    given: Circumstances,
    notes: &mut Vec<String>,
) -> Result<Columns, TableProblem> {
    let finder = Finder {
        plain: names.iter().map(|n| plain_name(n)).collect(),
        names,
    };
    let id = finder.find_id(options.id.as_deref(), notes)?;
    let xy_named = options.x.is_some() || options.y.is_some();
    let (xy, degrees) = if given.geometry && !xy_named {
        (None, false)
    } else {
        let (x, y, degrees) = finder.find_xy(options, given.projected, notes)?;
        (Some((x, y)), degrees)
    };
    let height = match &options.height {
        Some(name) => Some(finder.named("--height", name)?),
        None => match finder.any_of(HEIGHT_NAMES)[..] {
            [] if given.geometry_z && xy.is_none() => {
                notes.push(
                    "no height column: heights are the third coordinate of the points".to_owned(),
                );
                None
            }
            [] => return Err(finder.missing("height", "--height")),
            [one] => Some(one),
            ref several => return Err(finder.ambiguous("height", "--height", several)),
        },
    };
    Ok(Columns {
        id,
        xy,
        height,
        degrees,
        xy_named,
    })
}

struct Finder<'a> {
    names: &'a [String],
    plain: Vec<String>,
}

impl Finder<'_> {
    fn any_of(&self, wanted: &[&str]) -> Vec<usize> {
        (0..self.plain.len())
            .filter(|&i| wanted.contains(&self.plain[i].as_str()))
            .collect()
    }

    fn present(&self) -> Vec<String> {
        self.names.iter().map(|n| n.trim().to_owned()).collect()
    }

    fn missing(&self, what: &'static str, option: &'static str) -> TableProblem {
        TableProblem::NoColumn {
            what,
            option,
            present: self.present(),
        }
    }

    fn ambiguous(
        &self,
        what: &'static str,
        option: &'static str,
        candidates: &[usize],
    ) -> TableProblem {
        TableProblem::AmbiguousColumn {
            what,
            option,
            candidates: candidates
                .iter()
                .map(|&i| self.names[i].trim().to_owned())
                .collect(),
            present: self.present(),
        }
    }

    /// The column an option names: as written, else without regard to case.
    fn named(&self, option: &'static str, name: &str) -> Result<usize, TableProblem> {
        let wanted = name.trim();
        let exact: Vec<usize> = (0..self.names.len())
            .filter(|&i| self.names[i].trim() == wanted)
            .collect();
        let found = if exact.is_empty() {
            let folded = wanted.to_lowercase();
            (0..self.names.len())
                .filter(|&i| self.names[i].trim().to_lowercase() == folded)
                .collect()
        } else {
            exact
        };
        match found[..] {
            [one] => Ok(one),
            [] => Err(TableProblem::NamedColumnMissing {
                option,
                name: name.to_owned(),
                present: self.present(),
            }),
            ref several => Err(self.ambiguous("column named by option", option, several)),
        }
    }

    fn find_id(
        &self,
        named: Option<&str>,
        notes: &mut Vec<String>,
    ) -> Result<Option<usize>, TableProblem> {
        if let Some(name) = named {
            return self.named("--id", name).map(Some);
        }
        for group in ID_NAMES {
            match self.any_of(group)[..] {
                [] => {}
                [one] => return Ok(Some(one)),
                ref several => return Err(self.ambiguous("station's name", "--id", several)),
            }
        }
        notes.push(
            "no column with station names: stations are named by their row (--id names a column)"
                .to_owned(),
        );
        Ok(None)
    }

    fn one_of(
        &self,
        found: &[usize],
        what: &'static str,
        option: &'static str,
    ) -> Result<usize, TableProblem> {
        match *found {
            [one] => Ok(one),
            [] => Err(self.missing(what, option)),
            _ => Err(self.ambiguous(what, option, found)),
        }
    }

    /// Columns of x and y, and whether they are called longitude and latitude.
    fn find_xy(
        &self,
        options: &TableOptions,
        projected: bool,
        notes: &mut Vec<String>,
    ) -> Result<(usize, usize, bool), TableProblem> {
        let named_x = options
            .x
            .as_deref()
            .map(|n| self.named("--x", n))
            .transpose()?;
        let named_y = options
            .y
            .as_deref()
            .map(|n| self.named("--y", n))
            .transpose()?;
        let (lon, lat) = (self.any_of(LON_NAMES), self.any_of(LAT_NAMES));
        let (x, y) = (self.any_of(X_NAMES), self.any_of(Y_NAMES));
        let degrees = match (named_x, named_y) {
            (Some(x), Some(y)) => return Ok((x, y, lon.contains(&x) && lat.contains(&y))),
            // One is named: its partner is of the same kind, if there is one.
            (Some(named), None) => lon.contains(&named) || y.is_empty(),
            (None, Some(named)) => lat.contains(&named) || x.is_empty(),
            (None, None) => self.use_degrees([&lon, &lat, &x, &y], projected, notes)?,
        };
        let (xs, ys) = if degrees { (&lon, &lat) } else { (&x, &y) };
        let x = named_x.map_or_else(|| self.one_of(xs, "longitude or x", "--x"), Ok)?;
        let y = named_y.map_or_else(|| self.one_of(ys, "latitude or y", "--y"), Ok)?;
        Ok((x, y, lon.contains(&x) && lat.contains(&y)))
    }

    /// Whether longitude and latitude are used, not x and y, where no option names either.
    fn use_degrees(
        &self,
        [lon, lat, x, y]: [&[usize]; 4],
        projected: bool,
        notes: &mut Vec<String>,
    ) -> Result<bool, TableProblem> {
        let have_degrees = !lon.is_empty() && !lat.is_empty();
        let have_xy = !x.is_empty() && !y.is_empty();
        if !have_degrees && !have_xy {
            let x_missing = lon.is_empty() && x.is_empty();
            return Err(if x_missing {
                self.missing("longitude or x", "--x")
            } else {
                self.missing("latitude or y", "--y")
            });
        }
        if have_degrees && have_xy {
            let used = if projected {
                "x and y"
            } else {
                "longitude and latitude"
            };
            notes.push(format!(
                "the table has both longitude, latitude and x, y: {used} are used (--x and --y name others)"
            ));
            return Ok(!projected);
        }
        Ok(have_degrees)
    }
}

/// A column name in lower case, without unit and with `_` between words.
fn plain_name(name: &str) -> String {
    let mut plain = name.trim().to_lowercase();
    for (open, close) in [('(', ')'), ('[', ']')] {
        if let Some(inner) = plain.strip_suffix(close)
            && let Some((before, unit)) = inner.rsplit_once(open)
            && UNIT_BRACKETS.contains(&unit.trim())
        {
            plain = before.trim().to_owned();
        }
    }
    let mut plain: String = plain
        .split([' ', '-', '_', '.'])
        .filter(|w| !w.is_empty())
        .collect::<Vec<_>>()
        .join("_");
    for suffix in UNIT_SUFFIXES {
        if let Some(before) = plain.strip_suffix(suffix) {
            plain = before.to_owned();
            break;
        }
    }
    plain
}

#[cfg(test)]
mod tests {
    use super::*;

    fn find(
        header: &str,
        options: &TableOptions,
        given: Circumstances,
    ) -> Result<Columns, TableProblem> {
        let names: Vec<String> = header.split(',').map(str::to_owned).collect();
        find_columns(&names, options, given, &mut Vec::new())
    }

    fn usual(header: &str) -> Result<Columns, TableProblem> {
        find(header, &TableOptions::default(), Circumstances::default())
    }

    #[test]
    fn usual_names_in_any_case_and_with_units() {
        for header in [
            "Station,Lon,Lat,Height",
            "ID,LONGITUDE,LATITUDE,ELEVATION",
            "point,lon_deg,lat_deg,height_m",
            "Name,Long (deg),Lat (deg),Elev [m]",
            " stn , longitude , latitude , H (m) ",
        ] {
            let c = usual(header).unwrap();
            assert_eq!(
                (c.id, c.xy, c.height, c.degrees),
                (Some(0), Some((1, 2)), Some(3), true),
                "{header}"
            );
        }
        for header in [
            "id,x,y,z",
            "id,Easting,Northing,h",
            "id,E,N,height_m",
            "id,x_m,y (m),Height-m",
        ] {
            let c = usual(header).unwrap();
            assert_eq!(
                (c.xy, c.height, c.degrees),
                (Some((1, 2)), Some(3), false),
                "{header}"
            );
        }
    }

    #[test]
    fn feet_are_not_taken_for_metres() {
        assert!(matches!(
            usual("id,lon,lat,height_ft"),
            Err(TableProblem::NoColumn {
                what: "height",
                option: "--height",
                ..
            })
        ));
        assert!(matches!(
            usual("id,lon,lat,height (ft)"),
            Err(TableProblem::NoColumn { .. })
        ));
    }

    #[test]
    fn ambiguous_and_missing_columns_are_named() {
        let Err(TableProblem::AmbiguousColumn {
            what,
            option,
            candidates,
            present,
        }) = usual("id,lon,lat,h,elevation,g")
        else {
            panic!("ambiguous height not seen")
        };
        assert_eq!((what, option), ("height", "--height"));
        assert_eq!(candidates, ["h", "elevation"]);
        assert_eq!(present, ["id", "lon", "lat", "h", "elevation", "g"]);
        assert!(matches!(
            usual("id,lon,h"),
            Err(TableProblem::NoColumn { option: "--y", .. })
        ));
        assert!(matches!(
            usual("id,lat,h"),
            Err(TableProblem::NoColumn { option: "--x", .. })
        ));
        assert!(matches!(
            usual("id,lon,lon,lat,h"),
            Err(TableProblem::AmbiguousColumn { option: "--x", .. })
        ));
    }

    #[test]
    fn options_name_columns() {
        let options = TableOptions {
            id: Some("benchmark".into()),
            height: Some("ELEVATION".into()),
            x: Some("rechts".into()),
            y: Some("hoch".into()),
            crs: None,
        };
        let c = find(
            "benchmark,h,elevation,rechts,hoch,lon,lat",
            &options,
            Circumstances::default(),
        )
        .unwrap();
        assert_eq!(
            c,
            Columns {
                id: Some(0),
                xy: Some((3, 4)),
                height: Some(2),
                degrees: false,
                xy_named: true
            }
        );
        let wrong = TableOptions {
            id: Some("nix".into()),
            ..Default::default()
        };
        assert!(matches!(
            find("id,lon,lat,h", &wrong, Circumstances::default()),
            Err(TableProblem::NamedColumnMissing { option: "--id", .. })
        ));
    }

    #[test]
    fn a_projected_system_asks_for_x_and_y() {
        let header = "id,lon,lat,x,y,h";
        assert_eq!(usual(header).unwrap().xy, Some((1, 2)));
        let given = Circumstances {
            projected: true,
            ..Default::default()
        };
        assert_eq!(
            find(header, &TableOptions::default(), given).unwrap().xy,
            Some((3, 4))
        );
    }

    #[test]
    fn geometry_stands_in_for_columns() {
        let given = Circumstances {
            geometry: true,
            geometry_z: true,
            projected: false,
        };
        let c = find("name,x,y", &TableOptions::default(), given).unwrap();
        assert_eq!((c.xy, c.height), (None, None));
        let flat = Circumstances {
            geometry: true,
            ..Default::default()
        };
        assert!(matches!(
            find("name,x,y", &TableOptions::default(), flat),
            Err(TableProblem::NoColumn { .. })
        ));
    }
}
