//! Tables as spreadsheets export them: commas, semicolons or tabs, quotes, with or without a byte order mark.

use super::Position;

/// A table, read row by row.
#[derive(Debug)]
pub struct Table<'t> {
    text: &'t str,
    delimiter: char,
    /// The first row.
    pub header: Vec<Cell>,
    /// Where each further row that is not empty starts.
    pub rows: Vec<RowStart>,
}

/// Where a row starts.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct RowStart {
    at: usize,
    /// Its line, from 1.
    pub line: usize,
}

/// A cell.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Cell {
    /// What stands in it, without quotes and outer blanks.
    pub text: String,
    /// Where it starts.
    pub position: Position,
}

/// What is wrong with a row as such.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RowError {
    /// Where.
    pub position: Position,
    /// What is wrong.
    pub message: &'static str,
    /// What was expected.
    pub expected: &'static str,
}

impl<'t> Table<'t> {
    /// Reads the header and finds the rows.
    ///
    /// # Errors
    ///
    /// A header that cannot be read; `None` where there is none.
    pub fn read(text: &'t str) -> Result<Self, Option<RowError>> {
        let body = text.strip_prefix('\u{feff}').unwrap_or(text);
        let mut scanner = Scanner::new(text, text.len() - body.len(), 1, ',');
        let delimiter = match stated_delimiter(body) {
            Some(delimiter) => {
                scanner.skip_line();
                delimiter
            }
            None => usual_delimiter(body),
        };
        scanner.delimiter = delimiter;
        let header = loop {
            match scanner.row() {
                None => return Err(None),
                Some(Err(error)) => return Err(Some(error)),
                Some(Ok(cells)) if is_empty(&cells) => {}
                Some(Ok(cells)) => break cells,
            }
        };
        let mut rows = Vec::new();
        loop {
            let start = scanner.start();
            match scanner.row() {
                None => break,
                Some(Ok(cells)) if is_empty(&cells) => {}
                Some(Ok(_)) => rows.push(start),
                Some(Err(_)) => {
                    // A quote left open swallows what follows: the next line is a new start.
                    rows.push(start);
                    scanner = Scanner::new(text, start.at, start.line, delimiter);
                    scanner.skip_line();
                }
            }
        }
        Ok(Self {
            text,
            delimiter,
            header,
            rows,
        })
    }

    /// Whether cells are told apart by something else than a comma, so that a comma may be a decimal one.
    pub fn has_decimal_commas(&self) -> bool {
        self.delimiter != ','
    }

    /// The cells of a row.
    ///
    /// # Errors
    ///
    /// A quote left open, or text behind a closing one.
    pub fn cells(&self, row: RowStart) -> Result<Vec<Cell>, RowError> {
        let mut scanner = Scanner::new(self.text, row.at, row.line, self.delimiter);
        scanner.row().unwrap_or_else(|| Ok(Vec::new()))
    }
}

fn is_empty(cells: &[Cell]) -> bool {
    cells.iter().all(|cell| cell.text.is_empty())
}

/// The delimiter of a first line `sep=;`, which some spreadsheets write for themselves.
fn stated_delimiter(text: &str) -> Option<char> {
    let line = text.lines().next()?.trim_end();
    let mut rest = line.strip_prefix("sep=")?.chars();
    rest.next().filter(|_| rest.next().is_none())
}

/// The delimiter that stands most often in the first line that has any text.
fn usual_delimiter(text: &str) -> char {
    let line = text.lines().find(|line| !line.trim().is_empty());
    let count = |delimiter: char| {
        let mut quoted = false;
        let of_delimiter = line.unwrap_or_default().chars().filter(|&c| {
            quoted ^= c == '"';
            !quoted && c == delimiter
        });
        of_delimiter.count()
    };
    // Of equal counts the last wins, a comma where there is none at all.
    [';', '\t', ',']
        .into_iter()
        .max_by_key(|delimiter| count(*delimiter))
        .unwrap_or(',')
}

/// Reads cells from a place in the text on.
struct Scanner<'t> {
    text: &'t str,
    at: usize,
    position: Position,
    delimiter: char,
}

impl<'t> Scanner<'t> {
    fn new(text: &'t str, at: usize, line: usize, delimiter: char) -> Self {
        Self {
            text,
            at,
            position: Position { line, column: 1 },
            delimiter,
        }
    }

    fn start(&self) -> RowStart {
        RowStart {
            at: self.at,
            line: self.position.line,
        }
    }

    fn peek(&self) -> Option<char> {
        self.text[self.at..].chars().next()
    }

    fn take(&mut self) -> Option<char> {
        let c = self.peek()?;
        self.at += c.len_utf8();
        if c == '\n' {
            self.position.line += 1;
            self.position.column = 1;
        } else {
            self.position.column += 1;
        }
        Some(c)
    }

    fn skip_line(&mut self) {
        while self.take().is_some_and(|c| c != '\n') {}
    }

    /// Whether a row ends here; takes its end.
    fn takes_end(&mut self) -> bool {
        if self.text[self.at..].starts_with("\r\n") {
            self.take();
        }
        match self.peek() {
            None => true,
            Some('\n') => {
                self.take();
                true
            }
            // Old spreadsheets end lines so.
            Some('\r') => {
                self.at += 1;
                self.position.line += 1;
                self.position.column = 1;
                true
            }
            Some(_) => false,
        }
    }

    /// The next row; `None` at the end of the text.
    fn row(&mut self) -> Option<Result<Vec<Cell>, RowError>> {
        self.peek()?;
        let mut cells = Vec::new();
        loop {
            match self.cell() {
                Ok(cell) => cells.push(cell),
                Err(error) => return Some(Err(error)),
            }
            if self.takes_end() {
                return Some(Ok(cells));
            }
            self.take();
        }
    }

    /// A cell up to the delimiter or the row's end, which is left.
    fn cell(&mut self) -> Result<Cell, RowError> {
        self.skip_blanks();
        let position = self.position;
        if self.peek() == Some('"') {
            let text = self.quoted()?;
            self.skip_blanks();
            return match self.peek() {
                Some(c) if c != self.delimiter && c != '\r' && c != '\n' => Err(RowError {
                    position: self.position,
                    message: "text stands behind a closing quote",
                    expected: "a quote within a quoted cell to be doubled",
                }),
                _ => Ok(Cell { text, position }),
            };
        }
        let from = self.at;
        while self
            .peek()
            .is_some_and(|c| c != self.delimiter && c != '\r' && c != '\n')
        {
            self.take();
        }
        let text = self.text[from..self.at].trim().to_owned();
        Ok(Cell { text, position })
    }

    /// The rest of a quoted cell, from its opening quote on.
    fn quoted(&mut self) -> Result<String, RowError> {
        let position = self.position;
        self.take();
        let mut text = String::new();
        loop {
            match self.take() {
                Some('"') if self.peek() == Some('"') => text.extend(self.take()),
                Some('"') => return Ok(text.trim().to_owned()),
                Some(c) => text.push(c),
                None => {
                    return Err(RowError {
                        position,
                        message: "a quote is left open",
                        expected: "a closing quote in the same cell",
                    });
                }
            }
        }
    }

    fn skip_blanks(&mut self) {
        while self
            .peek()
            .is_some_and(|c| (c == ' ' || c == '\u{a0}' || c == '\t') && c != self.delimiter)
        {
            self.take();
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn texts(cells: &[Cell]) -> Vec<&str> {
        cells.iter().map(|cell| cell.text.as_str()).collect()
    }

    #[track_caller]
    fn reads(text: &str, expected: &[&[&str]]) {
        let table = Table::read(text).unwrap();
        let mut rows = vec![table.header.clone()];
        rows.extend(table.rows.iter().map(|row| table.cells(*row).unwrap()));
        let rows: Vec<Vec<&str>> = rows.iter().map(|row| texts(row)).collect();
        assert_eq!(rows, expected, "{text:?}");
    }

    #[test]
    fn every_export_gives_the_same_cells() {
        let expected: [&[&str]; 2] = [&["net", "length"], &["A", "6,5"]];
        for text in [
            "net;length\nA;6,5\n",
            "\u{feff}net;length\r\nA;6,5",
            "sep=;\r\nnet;length\r\n;\r\nA;6,5\r\n\r\n",
            "net\tlength\nA\t6,5\n",
            "net,length\nA,\"6,5\"\n",
            "\"net\" ; \"length\"\n A ;\"6,5\"\n",
            "net;length\rA;6,5\r",
        ] {
            reads(text, &expected);
        }
    }

    #[test]
    fn quotes_hold_delimiters_quotes_and_lines() {
        reads(
            "net,remark\nA,\"1\"\" pitch, see\nsheet 2\"\nB,\n",
            &[
                &["net", "remark"],
                &["A", "1\" pitch, see\nsheet 2"],
                &["B", ""],
            ],
        );
    }

    #[test]
    fn a_quote_left_open_costs_its_own_row_alone() {
        let table = Table::read("net,length\nA,\"6 in\nB,5 in\nC,\"4 in\"\n").unwrap();
        let rows: Vec<_> = table.rows.iter().map(|row| table.cells(*row)).collect();
        assert_eq!(rows.len(), 3);
        let error = rows[0].clone().unwrap_err();
        assert_eq!(error.position, Position { line: 4, column: 4 });
        assert_eq!(texts(rows[1].as_ref().unwrap()), ["B", "5 in"]);
        assert_eq!(texts(rows[2].as_ref().unwrap()), ["C", "4 in"]);
    }

    #[test]
    fn cells_know_their_place() {
        let table = Table::read("net;länge\nA; 6\n").unwrap();
        let cells = table.cells(table.rows[0]).unwrap();
        assert_eq!(cells[1].position, Position { line: 2, column: 4 });
        assert_eq!(table.header[1].position, Position { line: 1, column: 5 });
        assert!(table.has_decimal_commas());
    }

    #[test]
    fn nothing_is_no_table() {
        assert_eq!(Table::read("").unwrap_err(), None);
        assert_eq!(Table::read("\u{feff}\n ;\n").unwrap_err(), None);
    }
}
