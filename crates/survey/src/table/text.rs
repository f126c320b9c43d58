//! Text tables: separator, encoding, quotes, line ends.
use super::data::TextRows;
use crate::error::TableProblem;
use std::io::Read;

/// How a text table is written.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Dialect {
    /// `,`, `;` or a tab.
    pub(crate) delimiter: u8,
    /// Numbers have a decimal comma.
    pub(crate) decimal_comma: bool,
    /// Lines end in CR LF.
    pub(crate) crlf: bool,
}

/// A text table as read.
#[derive(Debug)]
pub(crate) struct TextTable {
    /// Column names exactly as read.
    pub(crate) names: Vec<String>,
    pub(crate) rows: TextRows,
    /// Line of each row, the header's being 1 if nothing stands above it.
    pub(crate) lines: Vec<u64>,
    /// `decimal_comma` is not known yet.
    pub(crate) dialect: Dialect,
    pub(crate) notes: Vec<String>,
}

/// Rows looked at to find the separator.
const SNIFF_ROWS: usize = 50;

/// Stands behind the table while it is read: if it does not come back as a record of its own, a quote is open.
const END_MARK: &str = "\u{1}end";

pub(crate) fn read_text(bytes: Vec<u8>) -> Result<TextTable, TableProblem> {
    let mut notes = Vec::new();
    if bytes.contains(&0) {
        return Err(TableProblem::NotATable {
            detail: "it holds zero bytes (binary, or text in UTF-16)".to_owned(),
        });
    }
    let text = decode(bytes, &mut notes);
    let text = text.strip_prefix('\u{feff}').unwrap_or(&text);
    if text.trim().is_empty() {
        return Err(TableProblem::Empty);
    }
    let delimiter = find_delimiter(text)?;

    let mut reader = reader(text, delimiter);
    let mut lines = LineCounter {
        text: text.as_bytes(),
        at: 0,
        line: 1,
    };
    let mut record = csv::StringRecord::new();
    let mut names: Option<Vec<String>> = None;
    let mut rows = TextRows::default();
    let mut row_lines = Vec::new();
    let mut line = 1;
    let mut closed = false;
    while read_record(&mut reader, &mut record)? {
        let start = record.position().map_or(0, csv::Position::byte);
        if record.len() == 1 && record.get(0) == Some(END_MARK) {
            closed = true;
            break;
        }
        line = lines.line_at(usize::try_from(start).unwrap_or(usize::MAX));
        match &names {
            None => {
                names = Some(record.iter().map(str::to_owned).collect());
                rows = TextRows::new(record.len(), text.len());
            }
            // An open quote also makes the last row ragged; it is the better thing to say.
            Some(n) if record.len() != n.len() && !record.iter().any(|f| f.ends_with(END_MARK)) => {
                return Err(TableProblem::Ragged {
                    row: line,
                    expected: n.len(),
                    found: record.len(),
                });
            }
            Some(n) if record.len() != n.len() => {
                return Err(TableProblem::OpenQuote { row: line });
            }
            Some(_) => {
                rows.push(record.iter());
                row_lines.push(line);
            }
        }
    }
    if !closed {
        return Err(TableProblem::OpenQuote { row: line });
    }
    let names = names.ok_or(TableProblem::Empty)?;
    if rows.rows() == 0 {
        return Err(TableProblem::HeaderOnly);
    }
    rows.shrink();
    let crlf = text.find('\n').is_some_and(|at| text[..at].ends_with('\r'));
    Ok(TextTable {
        names,
        rows,
        lines: row_lines,
        dialect: Dialect {
            delimiter,
            decimal_comma: false,
            crlf,
        },
        notes,
    })
}

fn decode(bytes: Vec<u8>, notes: &mut Vec<String>) -> String {
    match String::from_utf8(bytes) {
        Ok(text) => text,
        Err(e) => {
            notes.push(
                "the station table is not UTF-8; it is read as Latin-1, outputs are UTF-8"
                    .to_owned(),
            );
            // Latin-1 bytes are the first 256 code points of Unicode (ISO/IEC 8859-1 and 10646).
            e.into_bytes().into_iter().map(char::from).collect()
        }
    }
}

fn reader(text: &str, delimiter: u8) -> csv::Reader<impl Read> {
    csv::ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .delimiter(delimiter)
        .buffer_capacity(1 << 16)
        .from_reader(text.as_bytes().chain(&b"\n\x01end"[..]))
}

fn read_record<R: Read>(
    reader: &mut csv::Reader<R>,
    record: &mut csv::StringRecord,
) -> Result<bool, TableProblem> {
    // Reading from memory, flexible and in checked UTF-8: nothing is left that can fail, but say so if it does.
    reader
        .read_record(record)
        .map_err(|e| TableProblem::NotATable {
            detail: e.to_string(),
        })
}

/// The separator that gives every one of the first rows the same number of fields, most of them; failing that, the
/// one that gives the header most.
fn find_delimiter(text: &str) -> Result<u8, TableProblem> {
    let mut best: Option<(bool, usize, u8)> = None;
    for delimiter in [b',', b';', b'\t'] {
        let mut reader = reader(text, delimiter);
        let mut record = csv::StringRecord::new();
        let mut columns = 0;
        let mut same = true;
        for i in 0..SNIFF_ROWS {
            if !read_record(&mut reader, &mut record)? || record.get(0) == Some(END_MARK) {
                break;
            }
            if i == 0 {
                columns = record.len();
            } else {
                same &= record.len() == columns;
            }
        }
        if columns > 1 && best.is_none_or(|b| (same, columns) > (b.0, b.1)) {
            best = Some((same, columns, delimiter));
        }
    }
    best.map(|b| b.2).ok_or_else(|| TableProblem::NotATable {
        detail: "its first line has no comma, semicolon or tab between columns".to_owned(),
    })
}

/// Counts lines up to growing positions; LF, CR LF and CR alone end a line.
struct LineCounter<'a> {
    text: &'a [u8],
    at: usize,
    line: u64,
}

impl LineCounter<'_> {
    /// Line of the record that the reader says starts at byte `start`: it may point at line ends before it.
    fn line_at(&mut self, start: usize) -> u64 {
        let mut end = start.min(self.text.len());
        while end < self.text.len() && matches!(self.text[end], b'\r' | b'\n') {
            end += 1;
        }
        for i in self.at..end {
            let cr_alone = self.text[i] == b'\r' && self.text.get(i + 1) != Some(&b'\n');
            self.line += u64::from(self.text[i] == b'\n' || cr_alone);
        }
        self.at = self.at.max(end);
        self.line
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> Result<TextTable, TableProblem> {
        read_text(text.as_bytes().to_vec())
    }

    fn fields(t: &TextTable) -> Vec<Vec<String>> {
        (0..t.rows.rows())
            .map(|r| {
                (0..t.names.len())
                    .map(|c| t.rows.field(r, c).to_owned())
                    .collect()
            })
            .collect()
    }

    #[test]
    fn separators_are_found() {
        for (text, delimiter) in [
            ("id,lon,lat\na,1,2\n", b','),
            ("id;lon;lat\na;1,5;2,5\n", b';'),
            ("id\tlon\tlat\na\t1,5\t2,5\n", b'\t'),
            // A comma in every name must not win over the semicolons.
            ("id;lon, deg;lat, deg\na;7;46\nb;7;46\n", b';'),
            ("\u{feff}\"id\";\"x\"\r\n\"a;b\";\"1\"\r\n", b';'),
        ] {
            assert_eq!(read(text).unwrap().dialect.delimiter, delimiter, "{text:?}");
        }
    }

    #[test]
    fn quotes_line_ends_and_bom() {
        let t = read("\u{feff}id,note\r\n\"a\"\"b\",\"two\r\nlines\"\r\n\r\n c ,\r\n").unwrap();
        assert_eq!(t.names, ["id", "note"]);
        assert_eq!(fields(&t), [["a\"b", "two\r\nlines"], [" c ", ""]]);
        assert_eq!(t.lines, [2, 5]);
        assert!(t.dialect.crlf);
    }

    #[test]
    fn lines_are_those_of_an_editor() {
        assert_eq!(read("\n\nid,x\na,1\n\n\nb,2").unwrap().lines, [4, 7]);
        assert_eq!(read("id,x\ra,1\r\rb,2\r").unwrap().lines, [2, 4]);
        assert_eq!(read("id,x\r\na,1\r\nb,2\r\n").unwrap().lines, [2, 3]);
    }

    #[test]
    fn latin_1_is_read_with_a_note() {
        let t = read_text(b"id,x\nM\xfcnster,1\n".to_vec()).unwrap();
        assert_eq!(fields(&t), [["Münster", "1"]]);
        assert_eq!(t.notes.len(), 1);
    }

    #[test]
    fn faults() {
        assert_eq!(read("").unwrap_err(), TableProblem::Empty);
        assert_eq!(read("\u{feff}\r\n \n").unwrap_err(), TableProblem::Empty);
        assert_eq!(read("id,x\n").unwrap_err(), TableProblem::HeaderOnly);
        assert_eq!(
            read("id,x\na,1\nb\n").unwrap_err(),
            TableProblem::Ragged {
                row: 3,
                expected: 2,
                found: 1
            }
        );
        assert_eq!(
            read("id,x\na,1,2\n").unwrap_err(),
            TableProblem::Ragged {
                row: 2,
                expected: 2,
                found: 3
            }
        );
        assert_eq!(
            read("id,x\na,1\nb,\"2\nc,3\n").unwrap_err(),
            TableProblem::OpenQuote { row: 3 }
        );
        assert_eq!(
            read("id,x,y\na,1,2\n\"b,2,3\nc,3,3\n").unwrap_err(),
            TableProblem::OpenQuote { row: 3 }
        );
        assert!(matches!(
            read("id lon lat\na 1 2\n").unwrap_err(),
            TableProblem::NotATable { .. }
        ));
        let utf16: Vec<u8> = "id,x\n".encode_utf16().flat_map(u16::to_le_bytes).collect();
        assert!(matches!(
            read_text(utf16).unwrap_err(),
            TableProblem::NotATable { .. }
        ));
    }
}
