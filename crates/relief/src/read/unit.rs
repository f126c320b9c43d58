//! Units of height: words to metres.

/// Metres in one international foot: exact by the 1959 agreement on the yard (common knowledge, no source).
const FOOT_M: f64 = 0.3048;
/// Metres in one US survey foot: exact, from 39.37 inches to the metre (Mendenhall order, 1893).
const US_SURVEY_FOOT_M: f64 = 1200.0 / 3937.0;

/// Metres in one unit, by the words that files use; None for words that are no known unit of length.
pub(super) fn metres_in(word: &str) -> Option<f64> {
    let plain: String = word
        .chars()
        .filter(|c| !matches!(c, '(' | ')' | '[' | ']' | '.'))
        .map(|c| if matches!(c, '_' | '-') { ' ' } else { c })
        .collect::<String>()
        .to_lowercase();
    let plain = plain.split_whitespace().collect::<Vec<_>>().join(" ");
    let factor = match plain.as_str() {
        "m" | "metre" | "metres" | "meter" | "meters" => 1.0,
        "km" | "kilometre" | "kilometres" | "kilometer" | "kilometers" => 1000.0,
        "dm" | "decimetre" | "decimetres" | "decimeter" | "decimeters" => 0.1,
        "cm" | "centimetre" | "centimetres" | "centimeter" | "centimeters" => 0.01,
        "mm" | "millimetre" | "millimetres" | "millimeter" | "millimeters" => 0.001,
        "ft" | "foot" | "feet" | "international foot" | "international feet"
        | "foot international" | "feet international" | "ft int" | "ift" => FOOT_M,
        "us ft" | "usft" | "ftus" | "ft us" | "foot us" | "feet us" | "us foot" | "us feet"
        | "us survey foot" | "us survey feet" | "us survey ft" | "survey foot" | "survey feet"
        | "foot us survey" | "feet us survey" => US_SURVEY_FOOT_M,
        _ => return None,
    };
    Some(factor)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_of_files() {
        for word in ["m", "metre", " Meters ", "METER"] {
            assert_eq!(metres_in(word), Some(1.0), "{word}");
        }
        for word in ["ft", "foot", "Feet", "foot (International)"] {
            assert_eq!(metres_in(word), Some(0.3048), "{word}");
        }
        // EPSG::9003: the US survey foot is 0.304800609601219 m
        for word in [
            "US survey foot",
            "us-ft",
            "Foot_US",
            "US_survey_foot",
            "ftUS",
        ] {
            let factor = metres_in(word).unwrap();
            assert!((factor - 0.304_800_609_601_219).abs() < 1e-15, "{word}");
        }
        for word in ["", "K", "degree", "mgal", "furlong", "m s"] {
            assert_eq!(metres_in(word), None, "{word}");
        }
    }
}
