//! The data behind a figure: one table for the page, the copy and the chart specification.

use serde_json::{Map, Value};

use super::numbers;

/// A column of a table.
#[derive(Debug, Clone)]
pub struct Column {
    /// Name for programs.
    pub key: &'static str,
    /// Heading with the unit.
    pub heading: String,
}

/// A cell of a table.
#[derive(Debug, Clone, PartialEq)]
pub enum Cell {
    /// A name or words.
    Text(String),
    /// A measured number.
    Number(f64),
    /// A count.
    Count(u64),
    /// No value; the reason stands in a column of its own or in the caption.
    Missing,
}

impl Cell {
    /// A number that may be missing. Infinity is no number here.
    pub fn maybe(x: Option<f64>) -> Self {
        x.filter(|x| x.is_finite())
            .map_or(Cell::Missing, Cell::Number)
    }

    /// The text of the cell, for reading and copying.
    pub fn text(&self) -> String {
        match self {
            Cell::Text(text) => text.clone(),
            Cell::Number(x) => numbers::plain(*x),
            Cell::Count(n) => n.to_string(),
            Cell::Missing => String::new(),
        }
    }

    fn value(&self) -> Value {
        match self {
            Cell::Text(text) => Value::from(text.as_str()),
            Cell::Number(x) => Value::from(*x),
            Cell::Count(n) => Value::from(*n),
            Cell::Missing => Value::Null,
        }
    }
}

impl From<&str> for Cell {
    fn from(text: &str) -> Self {
        Cell::Text(text.to_owned())
    }
}

impl From<String> for Cell {
    fn from(text: String) -> Self {
        Cell::Text(text)
    }
}

impl From<u64> for Cell {
    fn from(n: u64) -> Self {
        Cell::Count(n)
    }
}

impl From<f64> for Cell {
    fn from(x: f64) -> Self {
        Cell::maybe(Some(x))
    }
}

/// Rows under headings. Every row has one cell a column.
#[derive(Debug, Clone, Default)]
pub struct Table {
    /// What the table holds.
    pub caption: String,
    /// The columns.
    pub columns: Vec<Column>,
    /// The rows.
    pub rows: Vec<Vec<Cell>>,
}

impl Table {
    /// A table without rows. Columns are pairs of name and heading.
    pub fn new(caption: impl Into<String>, columns: &[(&'static str, &str)]) -> Self {
        Table {
            caption: caption.into(),
            columns: columns
                .iter()
                .map(|&(key, heading)| Column {
                    key,
                    heading: heading.to_owned(),
                })
                .collect(),
            rows: Vec::new(),
        }
    }

    /// The rows as records of a chart specification.
    pub fn records(&self) -> Value {
        let record = |row: &Vec<Cell>| {
            let pairs = self.columns.iter().zip(row);
            let record: Map<String, Value> = pairs
                .map(|(column, cell)| (column.key.to_owned(), cell.value()))
                .collect();
            Value::Object(record)
        };
        self.rows.iter().map(record).collect()
    }
}

/// The three cells of an estimate: value, lower and upper limit.
pub fn cells(e: &crate::report::wire::Estimate) -> [Cell; 3] {
    [
        Cell::maybe(e.estimate),
        Cell::maybe(e.interval.map(|i| i[0])),
        Cell::maybe(e.interval.map(|i| i[1])),
    ]
}
