//! A text as a list of what stands on it, for pages that lay it out themselves.

use super::paper::{Table, Tone};

/// One thing that was put on a recorded paper.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(in crate::output) enum Block {
    /// A heading.
    Heading(String),
    /// A paragraph.
    Text(Tone, String),
    /// An entry of a list.
    Item(Tone, String),
    /// What is to be copied whole, such as a command.
    Command(String),
    /// A table: titles, each with whether its column holds numbers, and rows.
    Table {
        /// Titles of the columns.
        head: Vec<(String, bool)>,
        /// Cells, one a column.
        rows: Vec<(Tone, Vec<String>)>,
    },
}

impl From<&Table> for Block {
    fn from(table: &Table) -> Block {
        Block::Table { head: table.titles(), rows: table.rows().to_vec() }
    }
}
