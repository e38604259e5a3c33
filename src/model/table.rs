//! Tables as plain named columns with their meaning, before any file format.

/// The values of a column.
#[derive(Debug, Clone, PartialEq)]
pub enum ColumnData {
    /// Text; dictionary-encoded: codes into the list of texts, so that a repeated name costs little.
    Text {
        /// The distinct texts.
        texts: Vec<String>,
        /// One index into `texts` a row; `u32::MAX` is missing.
        codes: Vec<u32>,
    },
    /// Numbers; NaN is missing.
    Number(Vec<f64>),
    /// Whole numbers.
    Integer(Vec<i64>),
    /// UTC instants, milliseconds since 1970.
    Time(Vec<i64>),
    /// Yes or no.
    Truth(Vec<bool>),
}

impl ColumnData {
    /// Number of rows.
    pub fn len(&self) -> usize {
        match self {
            Self::Text { codes, .. } => codes.len(),
            Self::Number(values) => values.len(),
            Self::Integer(values) | Self::Time(values) => values.len(),
            Self::Truth(values) => values.len(),
        }
    }

    /// Whether there are no rows.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The same kind of column without rows.
    #[must_use]
    pub fn emptied(&self) -> Self {
        match self {
            Self::Text { .. } => Self::Text { texts: Vec::new(), codes: Vec::new() },
            Self::Number(_) => Self::Number(Vec::new()),
            Self::Integer(_) => Self::Integer(Vec::new()),
            Self::Time(_) => Self::Time(Vec::new()),
            Self::Truth(_) => Self::Truth(Vec::new()),
        }
    }

    /// A text column from one text a row; empty texts are missing.
    pub fn from_texts<'a>(rows: impl IntoIterator<Item = &'a str>) -> Self {
        let mut texts: Vec<String> = Vec::new();
        let mut known = std::collections::HashMap::new();
        let codes = rows
            .into_iter()
            .map(|text| {
                if text.is_empty() {
                    return u32::MAX;
                }
                *known.entry(text.to_owned()).or_insert_with(|| {
                    texts.push(text.to_owned());
                    texts.len() as u32 - 1
                })
            })
            .collect();
        Self::Text { texts, codes }
    }
}

/// A column: its name (units in the name), unit, one line of meaning, and values.
#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    /// Name, snake case, with its unit.
    pub name: &'static str,
    /// Unit, "1" for pure numbers, empty for text.
    pub unit: &'static str,
    /// One sentence: what it is and how it was made.
    pub meaning: &'static str,
    /// Decimals kept in CSV; `None` for the shortest text that gives back the same number.
    pub decimals: Option<usize>,
    /// The values.
    pub data: ColumnData,
}

/// A table of columns of equal length.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Table {
    /// The columns, in order.
    pub columns: Vec<Column>,
}

impl Table {
    /// Number of rows; 0 without columns.
    pub fn rows(&self) -> usize {
        self.columns.first().map_or(0, |column| column.data.len())
    }

    /// The same columns without their rows.
    #[must_use]
    pub fn without_rows(&self) -> Self {
        let columns = self.columns.iter().map(|column| Column {
            name: column.name,
            unit: column.unit,
            meaning: column.meaning,
            decimals: column.decimals,
            data: column.data.emptied(),
        });
        Self { columns: columns.collect() }
    }

    /// Adds a column.
    ///
    /// # Panics
    /// When its length differs from the others': a defect in the caller.
    pub fn push(&mut self, name: &'static str, unit: &'static str, meaning: &'static str, data: ColumnData) {
        assert!(self.columns.is_empty() || data.len() == self.rows(), "column {name} has another length");
        self.columns.push(Column { name, unit, meaning, decimals: None, data });
    }
}
