//! Numbers in text tables: decimal point or decimal comma, and what counts as missing.
use std::borrow::Cow;

/// Decimal mark of a number.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Mark {
    Point,
    Comma,
}

impl Mark {
    pub(crate) fn word(self) -> &'static str {
        match self {
            Self::Point => "point",
            Self::Comma => "comma",
        }
    }
}

/// What a field holds where a number is wanted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum Number {
    /// Empty, NaN, or a usual word for "no value".
    Missing,
    /// A finite number and its decimal mark, if it shows one.
    Value(f64, Option<Mark>),
    /// Something else.
    Text,
}

/// Words for "no value", besides nothing at all (common practice, no source).
const MISSING_WORDS: [&str; 8] = ["nan", "na", "n/a", "null", "none", "nil", "-", "--"];

/// Reads a number. A comma counts as decimal mark only if `comma_allowed` (the table's separator is another one);
/// thousands separators are never accepted: `1.234,5` is [`Number::Text`].
pub(crate) fn read_number(text: &str, comma_allowed: bool) -> Number {
    let text = text.trim();
    if text.is_empty() || MISSING_WORDS.iter().any(|w| text.eq_ignore_ascii_case(w)) {
        return Number::Missing;
    }
    let (points, commas) = (text.matches('.').count(), text.matches(',').count());
    let mark = match (points, commas) {
        (0, 0) => None,
        (1, 0) => Some(Mark::Point),
        (0, 1) if comma_allowed => Some(Mark::Comma),
        _ => return Number::Text,
    };
    // Spreadsheets write the typographic minus.
    let body = match text.strip_prefix('\u{2212}') {
        Some(rest) => Cow::Owned(format!("-{rest}")),
        None => Cow::Borrowed(text),
    };
    // The standard parser also takes "inf" and "infinity", which are no coordinates.
    if !body
        .bytes()
        .all(|b| matches!(b, b'0'..=b'9' | b'.' | b',' | b'+' | b'-' | b'e' | b'E'))
    {
        return Number::Text;
    }
    let parsed = if mark == Some(Mark::Comma) {
        body.replace(',', ".").parse::<f64>()
    } else {
        body.parse::<f64>()
    };
    match parsed {
        Ok(v) if v.is_finite() => Number::Value(v, mark),
        _ => Number::Text,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn points_and_commas() {
        assert_eq!(
            read_number(" 46.25 ", false),
            Number::Value(46.25, Some(Mark::Point))
        );
        assert_eq!(
            read_number("46,25", true),
            Number::Value(46.25, Some(Mark::Comma))
        );
        assert_eq!(read_number("46,25", false), Number::Text);
        assert_eq!(read_number("-7e-3", true), Number::Value(-0.007, None));
        assert_eq!(read_number("\u{2212}12", true), Number::Value(-12.0, None));
        assert_eq!(
            read_number("+.5", true),
            Number::Value(0.5, Some(Mark::Point))
        );
    }

    #[test]
    fn no_thousands_no_words_no_infinity() {
        for text in [
            "1.234,5",
            "1,234.5",
            "1,234,567",
            "1.2.3",
            "inf",
            "-infinity",
            "46°",
            "12 m",
            "1e999",
            "\u{2212}-3",
            "e",
            "0x10",
        ] {
            assert_eq!(read_number(text, true), Number::Text, "{text}");
        }
    }

    #[test]
    fn missing_words() {
        for text in ["", "  ", "NaN", "n/a", "NULL", "-"] {
            assert_eq!(read_number(text, false), Number::Missing, "{text:?}");
        }
    }
}
