//! Keys and values of a survey file, each error with its place.
use super::{BelowZero, SurveyFile, ground_from_word};
use crate::error::FileProblem;
use std::path::{Path, PathBuf};
use toml::Spanned;
use toml::de::{DeTable, DeValue};

/// What is wrong and at which byte.
type Fault = (Option<usize>, FileProblem);

const GROUND_WORDS: [&str; 3] = ["bend", "settle", "given"];
const BELOW_ZERO_WORDS: [&str; 1] = ["land"];
/// Likeness (Jaro-Winkler, 0 to 1) from which a known key is worth suggesting.
const NEAR: f64 = 0.75;

pub(crate) fn parse(text: &str, folder: &Path) -> Result<SurveyFile, Fault> {
    let table = DeTable::parse(text).map_err(|e| {
        (
            e.span().map(|s| s.start),
            FileProblem::Syntax {
                detail: e.message().trim().to_owned(),
            },
        )
    })?;
    let mut file = SurveyFile::default();
    // In the order they stand in the file, so that the first error reported is the first in the file.
    let mut entries: Vec<_> = table.into_inner().into_iter().collect();
    entries.sort_by_key(|(key, _)| key.span().start);
    for (key, value) in &entries {
        let value = Value {
            key: key.get_ref(),
            value,
            folder,
        };
        match value.key {
            "stations" => file.stations = Some(value.path()?),
            "dem" => file.dem = value.paths()?,
            "out" => file.out = Some(value.path()?),
            "crs" => file.crs = Some(value.text()?),
            "density" => file.density_kg_m3 = Some(value.number()?),
            "outer" => file.outer_m = Some(value.number()?),
            "zones" => file.zones_m = Some(value.numbers()?),
            "tolerance" => file.tolerance_ugal = Some(value.number()?),
            "ground" => file.ground = Some(value.ground()?),
            "below-zero" => file.below_zero = Some(value.below_zero()?),
            "threads" => file.threads = Some(value.count()?),
            "id" => file.id = Some(value.text()?),
            "x" => file.x = Some(value.text()?),
            "y" => file.y = Some(value.text()?),
            "height" => file.height = Some(value.text()?),
            "big-g" => file.big_g = Some(value.number()?),
            "resample" => file.resample = Some(value.yes_or_no()?),
            unknown => {
                return Err((
                    Some(key.span().start),
                    FileProblem::UnknownKey {
                        key: unknown.to_owned(),
                        nearest: nearest_key(unknown),
                    },
                ));
            }
        }
    }
    Ok(file)
}

/// The known key most like `key`, if one is like it at all.
fn nearest_key(key: &str) -> Option<&'static str> {
    let plain = key.trim_start_matches('-').to_lowercase().replace('_', "-");
    SurveyFile::KEYS
        .iter()
        .map(|&known| (strsim::jaro_winkler(&plain, known), known))
        .filter(|(likeness, _)| *likeness >= NEAR)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, known)| known)
}

struct Value<'a> {
    key: &'a str,
    value: &'a Spanned<DeValue<'a>>,
    folder: &'a Path,
}

impl Value<'_> {
    fn wrong(&self, at: &Spanned<DeValue<'_>>, wanted: &'static str) -> Fault {
        let found = match at.get_ref() {
            DeValue::String(text) => format!("the text {text:?}"),
            DeValue::Integer(number) => format!("the number {number}"),
            DeValue::Float(number) => format!("the number {}", number.as_str()),
            DeValue::Boolean(value) => format!("{value}"),
            DeValue::Datetime(_) => "a date".to_owned(),
            DeValue::Array(_) => "a list".to_owned(),
            DeValue::Table(_) => "a table".to_owned(),
        };
        (
            Some(at.span().start),
            FileProblem::WrongType {
                key: self.key.to_owned(),
                found,
                wanted,
            },
        )
    }

    fn text(&self) -> Result<String, Fault> {
        self.text_of(self.value, "text in quotes")
    }

    fn text_of(&self, at: &Spanned<DeValue<'_>>, wanted: &'static str) -> Result<String, Fault> {
        match at.get_ref() {
            DeValue::String(text) => Ok(text.to_string()),
            _ => Err(self.wrong(at, wanted)),
        }
    }

    fn path(&self) -> Result<PathBuf, Fault> {
        Ok(self.in_folder(self.text_of(self.value, "a file name in quotes")?))
    }

    /// `-` is standard output and stays what it is; `join` keeps absolute paths.
    fn in_folder(&self, name: String) -> PathBuf {
        if name == "-" {
            PathBuf::from(name)
        } else {
            self.folder.join(name)
        }
    }

    fn paths(&self) -> Result<Vec<PathBuf>, Fault> {
        const WANTED: &str = "a file name in quotes or a list of them";
        match self.value.get_ref() {
            DeValue::Array(list) => list
                .iter()
                .map(|v| Ok(self.in_folder(self.text_of(v, WANTED)?)))
                .collect(),
            _ => Ok(vec![self.in_folder(self.text_of(self.value, WANTED)?)]),
        }
    }

    fn number(&self) -> Result<f64, Fault> {
        self.number_of(self.value, "a number")
    }

    fn number_of(&self, at: &Spanned<DeValue<'_>>, wanted: &'static str) -> Result<f64, Fault> {
        let number = match at.get_ref() {
            DeValue::Integer(v) if v.radix() == 10 => v.as_str().parse::<f64>().ok(),
            DeValue::Float(v) => v.as_str().parse::<f64>().ok(),
            _ => None,
        };
        number
            .filter(|v| v.is_finite())
            .ok_or_else(|| self.wrong(at, wanted))
    }

    fn numbers(&self) -> Result<Vec<f64>, Fault> {
        const WANTED: &str = "a list of numbers";
        match self.value.get_ref() {
            DeValue::Array(list) => list.iter().map(|v| self.number_of(v, WANTED)).collect(),
            _ => Err(self.wrong(self.value, WANTED)),
        }
    }

    fn count(&self) -> Result<usize, Fault> {
        const WANTED: &str = "a whole number, 1 or more";
        let count = match self.value.get_ref() {
            DeValue::Integer(v) => usize::from_str_radix(v.as_str(), v.radix())
                .ok()
                .filter(|&n| n > 0),
            _ => None,
        };
        count.ok_or_else(|| self.wrong(self.value, WANTED))
    }

    fn yes_or_no(&self) -> Result<bool, Fault> {
        self.value
            .get_ref()
            .as_bool()
            .ok_or_else(|| self.wrong(self.value, "true or false"))
    }

    fn ground(&self) -> Result<hillpull_engine::Ground, Fault> {
        let word = self.text()?;
        ground_from_word(&word).ok_or_else(|| self.wrong_word("ground", word, &GROUND_WORDS))
    }

    fn below_zero(&self) -> Result<BelowZero, Fault> {
        match self.text()?.as_str() {
            "land" => Ok(BelowZero::Land),
            word => Err(self.wrong_word("below-zero", word.to_owned(), &BELOW_ZERO_WORDS)),
        }
    }

    fn wrong_word(
        &self,
        key: &'static str,
        found: String,
        allowed: &'static [&'static str],
    ) -> Fault {
        (
            Some(self.value.span().start),
            FileProblem::WrongWord {
                key,
                found,
                allowed,
            },
        )
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::error::SurveyError;
    use hillpull_engine::Ground;

    fn read(text: &str) -> Result<SurveyFile, SurveyError> {
        SurveyFile::parse(text, Path::new("field/survey.toml"))
    }

    fn fault(text: &str) -> (Option<usize>, String, Option<String>) {
        let error = read(text).unwrap_err();
        let hint = error.hint();
        let SurveyError::SurveyFile { line, problem, .. } = error else {
            panic!("not a survey file error: {error}")
        };
        (line, problem.to_string(), hint)
    }

    #[test]
    fn every_key() {
        let text = r#"
            stations = "stations.csv"
            dem = ["fine.tif", "/data/far.tif"]
            out = "-"
            crs = "EPSG:32632"
            density = 2670
            outer = 166735
            zones = [230, 5240.0, 28800]
            tolerance = 0.5
            ground = "settle"
            below-zero = "land"
            threads = 2
            id = "benchmark"
            x = "E"
            y = "N"
            height = "H"
            big-g = 6.6743e-11
            resample = true
        "#;
        let f = read(text).unwrap();
        let expected = SurveyFile {
            stations: Some("field/stations.csv".into()),
            dem: vec!["field/fine.tif".into(), "/data/far.tif".into()],
            out: Some("-".into()),
            crs: Some("EPSG:32632".into()),
            density_kg_m3: Some(2670.0),
            outer_m: Some(166_735.0),
            zones_m: Some(vec![230.0, 5240.0, 28_800.0]),
            tolerance_ugal: Some(0.5),
            ground: Some(Ground::Settle),
            below_zero: Some(BelowZero::Land),
            threads: Some(2),
            id: Some("benchmark".into()),
            x: Some("E".into()),
            y: Some("N".into()),
            height: Some("H".into()),
            big_g: Some(6.6743e-11),
            resample: Some(true),
        };
        assert_eq!(f, expected);
        // No key is known to the list and unknown to the reader, or the other way round.
        let used = text
            .lines()
            .filter_map(|l| Some(l.split_once('=')?.0.trim()))
            .collect::<Vec<_>>();
        assert_eq!(used, SurveyFile::KEYS);
    }

    #[test]
    fn one_dem_needs_no_list() {
        assert_eq!(
            read("dem = \"a.tif\"").unwrap().dem,
            [PathBuf::from("field/a.tif")]
        );
        assert_eq!(read("").unwrap(), SurveyFile::default());
    }

    #[test]
    fn unknown_keys_get_the_nearest_known() {
        for (text, line, hint) in [
            ("density = 2670\n\ndenstiy = 3", 3, "\"density\""),
            ("below_zero = \"land\"", 1, "\"below-zero\""),
            ("# a\nstation = \"a.csv\"", 2, "\"stations\""),
            ("big_g = 1.0", 1, "\"big-g\""),
            ("Tolerance = 1", 1, "\"tolerance\""),
        ] {
            let (at, said, hinted) = fault(text);
            assert_eq!(at, Some(line), "{text}");
            assert!(said.starts_with("unknown key"), "{said}");
            assert!(
                hinted.as_deref().unwrap().contains(hint),
                "{text}: {hinted:?}"
            );
        }
        assert!(
            fault("qqqqq = 1")
                .2
                .unwrap()
                .starts_with("known keys: stations, dem")
        );
        assert_eq!(fault("[effect]\ndensity = 1").0, Some(1));
    }

    #[test]
    fn wrong_kinds_are_named() {
        for (text, line, said) in [
            (
                "density = \"heavy\"",
                1,
                "density is the text \"heavy\", it must be a number",
            ),
            (
                "\nzones = 230",
                2,
                "zones is the number 230, it must be a list of numbers",
            ),
            (
                "zones = [230,\n \"a\"]",
                2,
                "zones is the text \"a\", it must be a list of numbers",
            ),
            (
                "threads = 0",
                1,
                "threads is the number 0, it must be a whole number, 1 or more",
            ),
            (
                "threads = 1.5",
                1,
                "threads is the number 1.5, it must be a whole number, 1 or more",
            ),
            (
                "outer = inf",
                1,
                "outer is the number inf, it must be a number",
            ),
            (
                "resample = \"yes\"",
                1,
                "resample is the text \"yes\", it must be true or false",
            ),
            (
                "dem = [1]",
                1,
                "dem is the number 1, it must be a file name in quotes or a list of them",
            ),
            (
                "ground = \"bent\"",
                1,
                "ground is \"bent\", it must be one of bend, settle, given",
            ),
            (
                "below-zero = \"swamp\"",
                1,
                "below-zero is \"swamp\", it must be one of land",
            ),
        ] {
            let (at, problem, _) = fault(text);
            assert_eq!((at, problem.as_str()), (Some(line), said));
        }
    }

    #[test]
    fn broken_toml_has_a_line() {
        assert_eq!(fault("density = 1\ndensity = 2").0, Some(2));
        assert_eq!(fault("\n\nouter 5").0, Some(3));
    }
}
