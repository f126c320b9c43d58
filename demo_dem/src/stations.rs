//! The stations of the invented survey and their surveyed heights.

use crate::{
    noise::{hash, near_normal, signed_unit},
    place::plane_from_survey,
    relief::Relief,
};

/// A station as it stands in the table.
#[derive(Clone, Debug, PartialEq)]
pub struct Station {
    /// Name: the letter of the line and a number.
    pub id: String,
    /// Easting in the survey's map grid, metres.
    pub easting_m: f64,
    /// Northing, metres.
    pub northing_m: f64,
    /// Surveyed height, metres.
    pub height_m: f64,
    /// Day of the reading.
    pub date: &'static str,
    /// The observer's remark.
    pub remark: &'static str,
}

/// A line of stations along corners given in the survey's map grid, metres.
struct Line {
    letter: char,
    count: usize,
    corners: &'static [(f64, f64)],
    date: &'static str,
    /// Remarks in order of the way along the line, each up to a share of its length.
    remarks: &'static [(f64, &'static str)],
}

const LINES: [Line; 5] = [
    Line {
        letter: 'U',
        count: 21,
        corners: &[
            (335_746.0, 5_146_120.0),
            (336_803.0, 5_146_328.0),
            (337_330.0, 5_146_340.0),
            (337_909.0, 5_146_377.0),
            (338_438.0, 5_146_560.0),
            (338_806.0, 5_146_485.0),
            (339_166.0, 5_146_186.0),
            (339_527.0, 5_145_914.0),
            (339_785.0, 5_145_760.0),
        ],
        date: "2031-06-17",
        remarks: &[
            (0.2, "above the fine DEM, river terrace"),
            (0.7, "valley floor, gravel"),
            (1.0, "meadow"),
        ],
    },
    Line {
        letter: 'P',
        count: 17,
        corners: &[
            (338_971.0, 5_146_769.0),
            (339_344.0, 5_146_969.0),
            (339_668.0, 5_147_276.0),
            (339_808.0, 5_147_588.0),
            (339_885.0, 5_148_111.0),
            (339_904.0, 5_148_846.0),
            (339_910.0, 5_149_476.0),
            (339_845.0, 5_149_791.0),
        ],
        date: "2031-06-18",
        remarks: &[
            (0.3, "stream bank"),
            (0.7, "foot of the wall, blocks"),
            (1.0, "moraine, blocks"),
        ],
    },
    Line {
        letter: 'L',
        count: 12,
        corners: &[
            (338_256.0, 5_146_466.0),
            (338_314.0, 5_146_388.0),
            (338_434.0, 5_146_362.0),
            (338_554.0, 5_146_388.0),
            (338_614.0, 5_146_466.0),
            (338_546.0, 5_146_466.0),
            (338_434.0, 5_146_526.0),
            (338_322.0, 5_146_466.0),
        ],
        date: "2031-06-19",
        remarks: &[(1.0, "landfill margin; gas alarm carried")],
    },
    Line {
        letter: 'K',
        count: 7,
        corners: &[
            (339_480.0, 5_150_330.0),
            (339_590.0, 5_150_520.0),
            (339_720.0, 5_150_400.0),
        ],
        date: "2031-06-20",
        remarks: &[(1.0, "cirque floor, \"old snow\" near")],
    },
    Line {
        letter: 'S',
        count: 3,
        corners: &[
            (339_640.0, 5_151_660.0),
            (339_704.8, 5_151_646.3),
            (339_770.0, 5_151_620.0),
        ],
        date: "2031-06-20",
        remarks: &[(1.0, "summit crest, roped")],
    },
];

/// A place at a share (0 to 1) of the way along a line of corners, metres.
fn along(corners: &[(f64, f64)], share: f64) -> (f64, f64) {
    let length = |a: (f64, f64), b: (f64, f64)| {
        ((b.0 - a.0) * (b.0 - a.0) + (b.1 - a.1) * (b.1 - a.1)).sqrt()
    };
    let total: f64 = corners
        .windows(2)
        .map(|pair| length(pair[0], pair[1]))
        .sum();
    let mut left = share * total;
    for pair in corners.windows(2) {
        let step = length(pair[0], pair[1]);
        if left <= step {
            let t = left / step;
            return (
                pair[0].0 + t * (pair[1].0 - pair[0].0),
                pair[0].1 + t * (pair[1].1 - pair[0].1),
            );
        }
        left -= step;
    }
    corners[corners.len() - 1]
}

/// All stations: on the ground where the observer found room, surveyed to about 2 cm.
#[must_use]
pub fn stations(relief: &Relief) -> Vec<Station> {
    let mut stations = Vec::new();
    for line in &LINES {
        for k in 0..line.count {
            let share = k as f64 / (line.count - 1) as f64;
            let (east, north) = along(line.corners, share);
            let bits = hash(k as i64, i64::from(u32::from(line.letter)), 81);
            // Nobody stands exactly on the line; positions are kept to the centimetre.
            let easting_m = ((east + 4.0 * signed_unit(bits)) * 100.0).floor() / 100.0;
            let northing_m = ((north + 4.0 * signed_unit(bits >> 32)) * 100.0).floor() / 100.0;
            let (x, y) = plane_from_survey(easting_m, northing_m);
            let error = 0.02 * near_normal(k as i64, i64::from(u32::from(line.letter)), 82);
            let height_m = ((relief.height_m(x, y) + error) * 1000.0 + 0.5).floor() / 1000.0;
            let remark = line
                .remarks
                .iter()
                .find(|(until, _)| share <= *until)
                .map_or("", |(_, remark)| *remark);
            stations.push(Station {
                id: format!("{}{:02}", line.letter, k + 1),
                easting_m,
                northing_m,
                height_m,
                date: line.date,
                remark,
            });
        }
    }
    stations
}

/// The table as text: CSV with a header.
#[must_use]
pub fn table(stations: &[Station]) -> String {
    let mut text = String::from("station,easting,northing,height,date,remark\n");
    for s in stations {
        let quoted = s.remark.contains([',', '"']);
        let remark = if quoted {
            format!("\"{}\"", s.remark.replace('"', "\"\""))
        } else {
            s.remark.to_owned()
        };
        text += &format!(
            "{},{:.2},{:.2},{:.3},{},{remark}\n",
            s.id, s.easting_m, s.northing_m, s.height_m, s.date
        );
    }
    text
}
