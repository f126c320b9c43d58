//! Results as a GeoPackage.
use super::columns::{Layout, NOTES, NOTES_BESIDE_USERS};
use super::{Outcome, has_notes_column};
use crate::gdal_log::{self, Listening};
use crate::provenance::Provenance;
use crate::table::{Data, FieldType, StationTable, Values};
use gdal::errors::GdalError;
use gdal::spatial_ref::{AxisMappingStrategy, SpatialRef};
use gdal::vector::{
    Feature, FieldDefn, Geometry, LayerAccess, LayerOptions, OGRFieldType, OGRwkbGeometryType,
};
use gdal::{Dataset, DatasetOptions, DriverManager, GdalOpenFlags};
use hillpull_engine::Settings;
use std::path::Path;

/// Layer with the stations and the results.
pub(crate) const LAYER: &str = "terrain_effect";
/// Table, without geometry, with the provenance.
pub(crate) const PROVENANCE_TABLE: &str = "provenance";

/// Writes a new GeoPackage. Text columns stay text, fields of vector layers keep their type (lists and binary fields
/// become text, booleans integers 0 and 1), results are reals rounded as in CSV, null where there is none.
pub(crate) fn write_gpkg(
    path: &Path,
    table: &StationTable,
    outcomes: &[Outcome],
    settings: &Settings,
    provenance: &Provenance,
) -> Result<(), String> {
    let gdal = gdal_log::listen();
    // Dates inside the file are those of the provenance, so that equal runs give equal files.
    let date = "OGR_CURRENT_DATE";
    let _ = gdal::config::set_thread_local_config_option(date, &provenance.written);
    let written = write_layers(path, table, outcomes, settings, provenance);
    let _ = gdal::config::clear_thread_local_config_option(date);
    written.map_err(|e| gdal.detail(&e))?;
    verify(path, outcomes.len(), &gdal)
}

fn write_layers(
    path: &Path,
    table: &StationTable,
    outcomes: &[Outcome],
    settings: &Settings,
    provenance: &Provenance,
) -> Result<(), GdalError> {
    let mut dataset = DriverManager::get_driver_by_name("GPKG")?.create_vector_only(path)?;
    let mut transaction = dataset.start_transaction()?;
    write_stations(&mut transaction, table, outcomes, settings)?;
    write_provenance(&mut transaction, provenance)?;
    transaction.commit()?;
    dataset.close()
}

fn write_stations(
    dataset: &mut Dataset,
    table: &StationTable,
    outcomes: &[Outcome],
    settings: &Settings,
) -> Result<(), GdalError> {
    let mut srs = SpatialRef::from_definition(table.crs())?;
    srs.set_axis_mapping_strategy(AxisMappingStrategy::TraditionalGisOrder);
    let z = table.z().filter(|_| table.own_points());
    let point_type = if z.is_some() {
        OGRwkbGeometryType::wkbPoint25D
    } else {
        OGRwkbGeometryType::wkbPoint
    };
    let names = table.column_names();
    let fid = format!("FID={}", free_name(&names, "fid"));
    let geometry = format!("GEOMETRY_NAME={}", free_name(&names, "geom"));
    let layer = dataset.create_layer(LayerOptions {
        name: LAYER,
        srs: Some(&srs),
        ty: point_type,
        options: Some(&[&fid, &geometry]),
    })?;

    for (i, name) in names.iter().enumerate() {
        let (kind, width) = match table.data() {
            Data::Text(_) => (OGRFieldType::OFTString, 0),
            Data::Typed { fields, .. } => (ogr_type(fields[i].kind), fields[i].width),
        };
        let field = FieldDefn::new(name.trim(), kind)?;
        field.set_width(width);
        field.add_to_layer(&layer)?;
    }
    let layout = Layout::new(settings);
    for name in &layout.numbers {
        FieldDefn::new(name, OGRFieldType::OFTReal)?.add_to_layer(&layer)?;
    }
    let notes = if has_notes_column(table) {
        NOTES_BESIDE_USERS
    } else {
        NOTES
    };
    FieldDefn::new(notes, OGRFieldType::OFTString)?.add_to_layer(&layer)?;

    let mut values = Vec::new();
    for (row, outcome) in outcomes.iter().enumerate() {
        let mut feature = Feature::new(layer.defn())?;
        for column in 0..names.len() {
            set_user_field(&mut feature, table.data(), row, column)?;
        }
        match &outcome.effect {
            Some(effect) => {
                layout.values(effect, &mut values);
                for (k, value) in values.iter().enumerate() {
                    feature.set_field_double(names.len() + k, value.value())?;
                }
            }
            None => {
                for k in 0..layout.numbers.len() {
                    feature.set_field_null(names.len() + k)?;
                }
            }
        }
        let notes_at = names.len() + layout.numbers.len();
        if outcome.notes.is_empty() {
            feature.set_field_null(notes_at)?;
        } else {
            feature.set_field_string(notes_at, &outcome.notes.join("; "))?;
        }
        let station = &table.stations()[row];
        if station.x.is_finite() {
            let mut point = Geometry::empty(point_type)?;
            match z {
                Some(z) => point.add_point((station.x, station.y, z[row])),
                None => point.add_point_2d((station.x, station.y)),
            }
            feature.set_geometry(point)?;
        }
        feature.create(&layer)?;
    }
    Ok(())
}

fn set_user_field(
    feature: &mut Feature<'_>,
    data: &Data,
    row: usize,
    column: usize,
) -> Result<(), GdalError> {
    match data {
        Data::Text(rows) => feature.set_field_string(column, rows.field(row, column)),
        Data::Typed { fields, .. } => match &fields[column].values {
            Values::Text(v) => match &v[row] {
                Some(text) => feature.set_field_string(column, text),
                None => feature.set_field_null(column),
            },
            Values::Integer(v) => match v[row] {
                Some(value) => feature.set_field_integer64(column, value),
                None => feature.set_field_null(column),
            },
            Values::Real(v) => match v[row] {
                Some(value) => feature.set_field_double(column, value),
                None => feature.set_field_null(column),
            },
        },
    }
}

fn ogr_type(kind: FieldType) -> OGRFieldType::Type {
    match kind {
        FieldType::Text => OGRFieldType::OFTString,
        FieldType::Integer => OGRFieldType::OFTInteger,
        FieldType::Integer64 => OGRFieldType::OFTInteger64,
        FieldType::Real => OGRFieldType::OFTReal,
        FieldType::Date => OGRFieldType::OFTDate,
        FieldType::Time => OGRFieldType::OFTTime,
        FieldType::DateTime => OGRFieldType::OFTDateTime,
    }
}

/// A name for a column of the format's own that no column of the user has.
fn free_name(taken: &[&str], wanted: &str) -> String {
    let mut name = wanted.to_owned();
    while taken.iter().any(|t| t.trim().eq_ignore_ascii_case(&name)) {
        name = format!("hillpull_{name}");
    }
    name
}

fn write_provenance(dataset: &mut Dataset, provenance: &Provenance) -> Result<(), GdalError> {
    let layer = dataset.create_layer(LayerOptions {
        name: PROVENANCE_TABLE,
        srs: None,
        ty: OGRwkbGeometryType::wkbNone,
        options: Some(&["ASPATIAL_VARIANT=GPKG_ATTRIBUTES"]),
    })?;
    for name in ["item", "value"] {
        FieldDefn::new(name, OGRFieldType::OFTString)?.add_to_layer(&layer)?;
    }
    for (item, value) in provenance.items() {
        let mut feature = Feature::new(layer.defn())?;
        feature.set_field_string(0, &item)?;
        feature.set_field_string(1, &value)?;
        feature.create(&layer)?;
    }
    Ok(())
}

/// Reads the file back: GDAL does not say when closing fails (before version 3.7).
fn verify(path: &Path, expected: usize, gdal: &Listening) -> Result<(), String> {
    let options = DatasetOptions {
        open_flags: GdalOpenFlags::GDAL_OF_VECTOR | GdalOpenFlags::GDAL_OF_VERBOSE_ERROR,
        ..Default::default()
    };
    let dataset = Dataset::open_ex(path, options).map_err(|e| gdal.detail(&e))?;
    let layer = dataset.layer_by_name(LAYER).map_err(|e| gdal.detail(&e))?;
    let found = layer.feature_count();
    if found == expected as u64 {
        Ok(())
    } else {
        Err(format!("only {found} of {expected} stations were written"))
    }
}
