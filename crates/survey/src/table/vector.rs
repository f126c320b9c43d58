//! Station tables that are vector layers: GeoPackage, shapefile, GeoJSON and whatever else GDAL reads.
use super::data::{Field, FieldType, Values};
use crate::error::TableProblem;
use crate::gdal_log;
use gdal::errors::GdalError;
use gdal::vector::{
    Feature, LayerAccess, OGRFieldType, OGRwkbGeometryType, geometry_type_flatten,
    geometry_type_has_z,
};
use gdal::{Dataset, DatasetOptions, GdalOpenFlags};
use std::path::Path;

/// A point layer as read.
#[derive(Debug)]
pub(crate) struct VectorTable {
    pub(crate) names: Vec<String>,
    pub(crate) fields: Vec<Field>,
    pub(crate) rows: usize,
    /// `None` for a layer without geometry.
    pub(crate) points: Option<Points>,
}

/// Points of a layer, one a row; NaN where a feature has none.
#[derive(Debug, Default)]
pub(crate) struct Points {
    pub(crate) x: Vec<f64>,
    pub(crate) y: Vec<f64>,
    /// Third coordinates, if the layer is declared to have them.
    pub(crate) z: Option<Vec<f64>>,
    /// Authority and code if the layer's system has them, else WKT; `None` if the layer names no system.
    pub(crate) crs: Option<String>,
}

/// Reads the one layer of a file that can hold stations.
pub(crate) fn read_vector(path: &Path) -> Result<VectorTable, TableProblem> {
    let gdal = gdal_log::listen();
    let not_a_table = |e: GdalError| TableProblem::NotATable {
        detail: gdal.detail(&e),
    };
    let options = DatasetOptions {
        open_flags: GdalOpenFlags::GDAL_OF_VECTOR | GdalOpenFlags::GDAL_OF_VERBOSE_ERROR,
        ..Default::default()
    };
    let dataset = Dataset::open_ex(path, options).map_err(not_a_table)?;
    let mut layer = dataset
        .layer(station_layer(&dataset)?)
        .map_err(not_a_table)?;

    let mut names = Vec::new();
    let mut fields = Vec::new();
    for field in layer.defn().fields() {
        let kind = field_type(field.field_type());
        let values = match kind {
            FieldType::Integer | FieldType::Integer64 => Values::Integer(Vec::new()),
            FieldType::Real => Values::Real(Vec::new()),
            _ => Values::Text(Vec::new()),
        };
        let width = if kind == FieldType::Text {
            field.width()
        } else {
            0
        };
        names.push(field.name());
        fields.push(Field {
            kind,
            width,
            values,
        });
    }
    let declared = layer.defn().geometry_type();
    let mut points = (declared != OGRwkbGeometryType::wkbNone).then(|| Points {
        z: geometry_type_has_z(declared).then(Vec::new),
        crs: layer
            .spatial_ref()
            .and_then(|srs| srs.authority().ok().or_else(|| srs.to_wkt().ok())),
        ..Points::default()
    });
    let expected = layer.feature_count();

    let mut rows = 0;
    for feature in layer.features() {
        rows += 1;
        for (i, field) in fields.iter_mut().enumerate() {
            push_value(&feature, i, field).map_err(not_a_table)?;
        }
        if let Some(points) = &mut points {
            push_point(&feature, points, rows as u64)?;
        }
    }
    // The reader ends at the first feature it cannot read, without a word.
    if (rows as u64) < expected {
        return Err(TableProblem::NotATable {
            detail: format!("only {rows} of its {expected} features can be read"),
        });
    }
    if rows == 0 {
        return Err(TableProblem::HeaderOnly);
    }
    Ok(VectorTable {
        names,
        fields,
        rows,
        points,
    })
}

/// The only layer, or the only one that is declared to hold points.
fn station_layer(dataset: &Dataset) -> Result<usize, TableProblem> {
    let layers: Vec<(String, u32)> = dataset
        .layers()
        .map(|l| (l.name(), l.defn().geometry_type()))
        .collect();
    if layers.is_empty() {
        return Err(TableProblem::NotATable {
            detail: "it has no layer".to_owned(),
        });
    }
    if layers.len() == 1 {
        return Ok(0);
    }
    let of_points: Vec<usize> = (0..layers.len())
        .filter(|&i| geometry_type_flatten(layers[i].1) == OGRwkbGeometryType::wkbPoint)
        .collect();
    match of_points[..] {
        [one] => Ok(one),
        [] => Err(TableProblem::WhichLayer {
            layers: layers.into_iter().map(|l| l.0).collect(),
        }),
        _ => Err(TableProblem::WhichLayer {
            layers: of_points.into_iter().map(|i| layers[i].0.clone()).collect(),
        }),
    }
}

fn field_type(ogr: OGRFieldType::Type) -> FieldType {
    match ogr {
        OGRFieldType::OFTInteger => FieldType::Integer,
        OGRFieldType::OFTInteger64 => FieldType::Integer64,
        OGRFieldType::OFTReal => FieldType::Real,
        OGRFieldType::OFTDate => FieldType::Date,
        OGRFieldType::OFTTime => FieldType::Time,
        OGRFieldType::OFTDateTime => FieldType::DateTime,
        _ => FieldType::Text,
    }
}

fn push_value(feature: &Feature<'_>, index: usize, field: &mut Field) -> Result<(), GdalError> {
    match &mut field.values {
        Values::Integer(v) => v.push(feature.field_as_integer64(index)?),
        Values::Real(v) => v.push(feature.field_as_double(index)?),
        Values::Text(v) => {
            let text = feature.field_as_string(index)?;
            // A field that was never set is not null to GDAL, but its text is empty.
            let dated = field.kind != FieldType::Text;
            v.push(text.filter(|t| !(dated && t.is_empty())).map(|t| {
                if dated {
                    iso_8601(&t).into_boxed_str()
                } else {
                    t.into_boxed_str()
                }
            }));
        }
    }
    Ok(())
}

/// GDAL's `2026/05/01 12:00:00+02` as ISO 8601; both forms are read by it.
fn iso_8601(text: &str) -> String {
    let text = text.replace('/', "-").replacen(' ', "T", 1);
    match text.strip_suffix("+00") {
        Some(utc) => format!("{utc}Z"),
        None => text,
    }
}

fn push_point(feature: &Feature<'_>, points: &mut Points, row: u64) -> Result<(), TableProblem> {
    let mut point = (f64::NAN, f64::NAN, f64::NAN);
    let mut third = false;
    // A feature without geometry counts as empty.
    if let Some(geometry) = feature.geometry().filter(|g| !g.is_empty()) {
        let kind = geometry.geometry_type();
        third = geometry_type_has_z(kind);
        point = match geometry_type_flatten(kind) {
            OGRwkbGeometryType::wkbPoint => geometry.get_point(0),
            OGRwkbGeometryType::wkbMultiPoint if geometry.geometry_count() == 1 => {
                geometry.get_geometry(0).get_point(0)
            }
            _ => {
                return Err(TableProblem::NotAPoint {
                    row,
                    found: geometry.geometry_name().to_lowercase(),
                });
            }
        };
    }
    // GeoJSON and the like declare "unknown" and show the third coordinate only in the features.
    if third && points.z.is_none() {
        points.z = Some(vec![f64::NAN; points.x.len()]);
    }
    points.x.push(point.0);
    points.y.push(point.1);
    if let Some(z) = &mut points.z {
        z.push(if third { point.2 } else { f64::NAN });
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn dates_become_iso_8601() {
        assert_eq!(iso_8601("2026/05/01"), "2026-05-01");
        assert_eq!(iso_8601("2026/05/01 12:30:00+00"), "2026-05-01T12:30:00Z");
        assert_eq!(
            iso_8601("2026/05/01 12:30:00.250+02"),
            "2026-05-01T12:30:00.250+02"
        );
        assert_eq!(iso_8601("12:30:00"), "12:30:00");
    }
}
