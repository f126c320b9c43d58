//! From columns to stations: which column is what, numbers, faults, positions.
use super::columns::{Circumstances, Columns, find_columns};
use super::data::{Data, Values};
use super::number::{Mark, Number, read_number};
use super::place::{Crs, WGS_84, place};
use super::text::TextTable;
use super::vector::{Points, VectorTable};
use super::{StationFault, StationTable, TableOptions, TableStation, station_name};
use crate::error::TableProblem;
use std::borrow::Cow;
use std::collections::HashMap;
use std::path::Path;

/// Heights outside these metres are no heights of a station: below every sea floor, above every survey aircraft.
const HEIGHT_RANGE_M: (f64, f64) = (-12_000.0, 20_000.0);

pub(crate) fn from_text(
    path: &Path,
    table: TextTable,
    options: &TableOptions,
) -> Result<StationTable, TableProblem> {
    let TextTable {
        names,
        rows,
        lines,
        dialect,
        notes,
    } = table;
    let mut builder = Builder {
        names,
        data: Data::Text(rows),
        rows: lines,
        points: None,
        layer_crs: None,
        comma_allowed: dialect.delimiter != b',',
        mark: None,
        notes,
    };
    let mut table = builder.stations(path, options)?;
    let decimal_comma = builder.mark == Some(Mark::Comma);
    table.dialect = Some(super::Dialect {
        decimal_comma,
        ..dialect
    });
    Ok(table)
}

pub(crate) fn from_vector(
    path: &Path,
    table: VectorTable,
    options: &TableOptions,
) -> Result<StationTable, TableProblem> {
    let VectorTable {
        names,
        fields,
        rows,
        mut points,
    } = table;
    let layer_crs = points.as_mut().and_then(|p| p.crs.take());
    Builder {
        names,
        data: Data::Typed { rows, fields },
        rows: (1..=rows as u64).collect(),
        points,
        layer_crs,
        comma_allowed: false,
        mark: None,
        notes: Vec::new(),
    }
    .stations(path, options)
}

struct Builder {
    names: Vec<String>,
    data: Data,
    rows: Vec<u64>,
    points: Option<Points>,
    layer_crs: Option<String>,
    comma_allowed: bool,
    /// Decimal mark seen so far.
    mark: Option<Mark>,
    notes: Vec<String>,
}

impl Builder {
    fn stations(
        &mut self,
        path: &Path,
        options: &TableOptions,
    ) -> Result<StationTable, TableProblem> {
        let given = options.crs.as_deref().map(Crs::new).transpose()?;
        let circumstances = Circumstances {
            geometry: self.points.is_some(),
            geometry_z: self.points.as_ref().is_some_and(|p| p.z.is_some()),
            projected: given.as_ref().is_some_and(|c| c.projected),
        };
        let columns = find_columns(&self.names, options, circumstances, &mut self.notes)?;
        let crs = self.system(&columns, given)?;
        self.check_ids(columns.id)?;

        let mut stations = Vec::with_capacity(self.data.rows());
        for i in 0..self.data.rows() {
            let station = self.station(i, &columns)?;
            stations.push(station);
        }
        place(&mut stations, &crs, |i| {
            self.name(columns.id, i).into_owned()
        })?;
        if let Some(fault) = stations[0].fault
            && stations.iter().all(|s| s.fault.is_some())
        {
            return Err(TableProblem::NothingUsable {
                stations: stations.len(),
                row: stations[0].row,
                station: self.name(columns.id, 0).into_owned(),
                fault,
            });
        }
        let points = self.points.take();
        Ok(StationTable {
            path: path.to_owned(),
            names: std::mem::take(&mut self.names),
            data: std::mem::replace(
                &mut self.data,
                Data::Typed {
                    rows: 0,
                    fields: Vec::new(),
                },
            ),
            id_column: columns.id,
            stations,
            z: points.and_then(|p| p.z),
            own_points: columns.xy.is_none(),
            crs: crs.definition,
            dialect: None,
            notes: std::mem::take(&mut self.notes),
        })
    }

    fn name(&self, id: Option<usize>, index: usize) -> Cow<'_, str> {
        station_name(&self.data, id, index, self.rows[index])
    }

    /// The system of the coordinates: the one given, else the layer's, else WGS 84 for longitude and latitude.
    fn system(&mut self, columns: &Columns, given: Option<Crs>) -> Result<Crs, TableProblem> {
        let (x, y) = match columns.xy {
            Some((x, y)) => (
                self.names[x].trim().to_owned(),
                self.names[y].trim().to_owned(),
            ),
            None => ("geometry x".to_owned(), "geometry y".to_owned()),
        };
        match given {
            Some(crs) if crs.projected && columns.degrees && !columns.xy_named => {
                Err(TableProblem::DegreesInProjectedCrs {
                    x,
                    y,
                    crs: crs.definition,
                })
            }
            Some(crs) => {
                if let Some(own) = self
                    .layer_crs
                    .as_ref()
                    .filter(|own| **own != crs.definition && columns.xy.is_none())
                {
                    let own = own.lines().next().unwrap_or_default();
                    self.notes.push(format!(
                        "--crs {} is used, although the layer says {own}",
                        crs.definition
                    ));
                }
                Ok(crs)
            }
            None if columns.degrees => Crs::new(WGS_84),
            None => match &self.layer_crs {
                Some(own) => Crs::new(own),
                None => Err(TableProblem::NoCrs { x, y }),
            },
        }
    }

    fn station(&mut self, i: usize, columns: &Columns) -> Result<TableStation, TableProblem> {
        let (x, y) = match columns.xy {
            Some((x, y)) => (
                self.coordinate(i, x, columns.id)?,
                self.coordinate(i, y, columns.id)?,
            ),
            None => self
                .points
                .as_ref()
                .map_or((f64::NAN, f64::NAN), |p| (p.x[i], p.y[i])),
        };
        let height = match columns.height {
            Some(column) => self.number(i, column)?,
            None => {
                let z = self
                    .points
                    .as_ref()
                    .and_then(|p| p.z.as_ref())
                    .map_or(f64::NAN, |z| z[i]);
                if z.is_finite() {
                    Number::Value(z, None)
                } else {
                    Number::Missing
                }
            }
        };
        // Both or neither: half a position is none.
        let (x, y) = if x.is_finite() && y.is_finite() {
            (x, y)
        } else {
            (f64::NAN, f64::NAN)
        };
        let (height_m, height_fault) = match height {
            Number::Missing => (f64::NAN, Some(StationFault::HeightMissing)),
            Number::Text => (f64::NAN, Some(StationFault::HeightNotANumber)),
            Number::Value(h, _) if (HEIGHT_RANGE_M.0..=HEIGHT_RANGE_M.1).contains(&h) => (h, None),
            Number::Value(h, _) => (h, Some(StationFault::HeightAbsurd { height_m: h })),
        };
        let fault = if x.is_nan() {
            Some(StationFault::CoordinatesMissing)
        } else {
            height_fault
        };
        Ok(TableStation {
            row: self.rows[i],
            x,
            y,
            lon_deg: f64::NAN,
            lat_deg: f64::NAN,
            height_m,
            fault,
        })
    }

    /// A coordinate, NaN where missing. Text in a coordinate column stops the reading: the column is the wrong one or
    /// holds degrees, minutes and seconds.
    fn coordinate(
        &mut self,
        i: usize,
        column: usize,
        id: Option<usize>,
    ) -> Result<f64, TableProblem> {
        match self.number(i, column)? {
            Number::Value(v, _) => Ok(v),
            Number::Missing => Ok(f64::NAN),
            Number::Text => Err(TableProblem::NotANumber {
                row: self.rows[i],
                station: self.name(id, i).into_owned(),
                column: self.names[column].trim().to_owned(),
                value: self.data.text(i, column).into_owned(),
            }),
        }
    }

    fn number(&mut self, i: usize, column: usize) -> Result<Number, TableProblem> {
        if let Data::Typed { fields, .. } = &self.data {
            let value = match &fields[column].values {
                Values::Real(v) => v[i].filter(|v| v.is_finite()),
                #[expect(
                    clippy::cast_precision_loss,
                    reason = "coordinates and heights are far below 2^53"
                )]
                Values::Integer(v) => v[i].map(|v| v as f64),
                Values::Text(v) => {
                    return Ok(v[i]
                        .as_deref()
                        .map_or(Number::Missing, |t| read_number(t, false)));
                }
            };
            return Ok(value.map_or(Number::Missing, |v| Number::Value(v, None)));
        }
        let text = self.data.text(i, column);
        let number = read_number(&text, self.comma_allowed);
        if let Number::Value(_, Some(mark)) = number {
            // "1,234" among decimal points is a thousands separator, not 1.234: better to ask than to guess.
            if self.mark.is_some_and(|seen| seen != mark) {
                return Err(TableProblem::MixedDecimals {
                    row: self.rows[i],
                    column: self.names[column].trim().to_owned(),
                    value: text.into_owned(),
                    mark: mark.word(),
                });
            }
            self.mark = Some(mark);
        }
        Ok(number)
    }

    fn check_ids(&self, id: Option<usize>) -> Result<(), TableProblem> {
        let Some(column) = id else { return Ok(()) };
        let mut first_at: HashMap<Cow<'_, str>, usize> = HashMap::with_capacity(self.data.rows());
        let mut repeated: Vec<usize> = Vec::new();
        for i in 0..self.data.rows() {
            if self.data.text(i, column).trim().is_empty() {
                continue;
            }
            let first = *first_at.entry(self.name(id, i)).or_insert(i);
            if first != i {
                repeated.push(first);
            }
        }
        let Some(&first) = repeated.iter().min() else {
            return Ok(());
        };
        let station = self.name(id, first);
        let rows = (first..self.data.rows())
            .filter(|&i| self.name(id, i) == station)
            .map(|i| self.rows[i])
            .collect();
        repeated.sort_unstable();
        repeated.dedup();
        Err(TableProblem::DuplicateId {
            station: station.into_owned(),
            rows,
            others: repeated.len() - 1,
        })
    }
}
