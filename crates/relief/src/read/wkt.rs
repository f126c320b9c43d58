//! Just enough of well-known text (ISO 19162) to take a compound CRS apart.

/// The keyword and the arguments of one WKT object, `KEY[a,b,...]`; None if the text is not of that form.
pub(super) fn split(wkt: &str) -> Option<(&str, Vec<&str>)> {
    let wkt = wkt.trim();
    let open = wkt.find(['[', '('])?;
    let inner = wkt[open + 1..].strip_suffix([']', ')'])?;
    let mut parts = Vec::new();
    let (mut depth, mut quoted, mut start) = (0_usize, false, 0);
    for (at, c) in inner.char_indices() {
        match c {
            // a doubled quote inside a name closes and opens again: no harm
            '"' => quoted = !quoted,
            _ if quoted => {}
            '[' | '(' => depth += 1,
            ']' | ')' => depth = depth.checked_sub(1)?,
            ',' if depth == 0 => {
                parts.push(inner[start..at].trim());
                start = at + 1;
            }
            _ => {}
        }
    }
    parts.push(inner[start..].trim());
    Some((wkt[..open].trim(), parts))
}

/// Horizontal and vertical part of a compound CRS; the whole and None for any other.
pub(super) fn horizontal_and_vertical(wkt: &str) -> (&str, Option<&str>) {
    match split(wkt) {
        Some(("COMPOUNDCRS" | "COMPD_CS", parts)) if parts.len() >= 3 => (parts[1], Some(parts[2])),
        _ => (wkt, None),
    }
}

/// The first object with one of these keywords, searched depth first.
pub(super) fn find<'w>(wkt: &'w str, keywords: &[&str]) -> Option<(&'w str, Vec<&'w str>)> {
    let (keyword, parts) = split(wkt)?;
    if keywords.contains(&keyword) {
        return Some((keyword, parts));
    }
    parts.iter().find_map(|part| find(part, keywords))
}

/// Name of a CRS given as WKT; the text itself if it is none.
pub(super) fn name(crs: &str) -> String {
    match split(crs) {
        Some((_, parts)) => unquote(parts[0]),
        None => crs.to_owned(),
    }
}

/// A quoted name without its quotes.
pub(super) fn unquote(text: &str) -> String {
    let inner = text.strip_prefix('"').and_then(|t| t.strip_suffix('"'));
    inner.unwrap_or(text).replace("\"\"", "\"")
}

/// Unit of the vertical axis: its name and the metres in it.
pub(super) fn vertical_unit(vertical: &str) -> Option<(String, f64)> {
    let (_, parts) = find(vertical, &["LENGTHUNIT", "UNIT"])?;
    let metres = parts.get(1)?.parse().ok()?;
    Some((unquote(parts.first()?), metres))
}

/// Whether a vertical CRS counts downward (depths).
pub(super) fn counts_down(vertical: &str) -> bool {
    find(vertical, &["AXIS"]).is_some_and(|(_, parts)| {
        parts
            .get(1)
            .is_some_and(|word| word.eq_ignore_ascii_case("down"))
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    const COMPOUND: &str = r#"COMPOUNDCRS["a, [odd] ""name""",PROJCRS["p",BASEGEOGCRS["g"],LENGTHUNIT["metre",1]],VERTCRS["v",VDATUM["d"],CS[vertical,1],AXIS["gravity-related height (H)",up,LENGTHUNIT["US survey foot",0.304800609601219]]]]"#;

    #[test]
    fn compound_comes_apart() {
        let (horizontal, vertical) = horizontal_and_vertical(COMPOUND);
        assert_eq!(
            horizontal,
            r#"PROJCRS["p",BASEGEOGCRS["g"],LENGTHUNIT["metre",1]]"#
        );
        let vertical = vertical.unwrap();
        let unit = vertical_unit(vertical).unwrap();
        assert_eq!(unit, ("US survey foot".to_owned(), 0.304_800_609_601_219));
        assert!(!counts_down(vertical));
        assert!(counts_down(&vertical.replace(",up,", ",down,")));
    }

    #[test]
    fn others_stay_whole() {
        assert_eq!(horizontal_and_vertical("EPSG:32632"), ("EPSG:32632", None));
        let plain = r#"GEOGCRS["x",DATUM["y"]]"#;
        assert_eq!(horizontal_and_vertical(plain), (plain, None));
        assert_eq!(split("GEOGCRS[\"x\"]]"), None);
        assert_eq!(name(COMPOUND), "a, [odd] \"name\"");
        assert_eq!(name("EPSG:32632"), "EPSG:32632");
    }
}
