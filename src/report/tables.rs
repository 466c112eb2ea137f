//! The one look of all tables: columns apart by space, a line under the heads.

use comfy_table::{
    CellAlignment, ColumnConstraint, ContentArrangement, Table, TableComponent, presets,
};

/// Characters a table may take; long words wrap inside their column.
const WIDTH: u16 = 118;

/// How a column sets its entries.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Column {
    Text,
    /// Text that is not broken into lines.
    Title,
    /// Set to the right, never broken.
    Number,
}

pub fn table(heads: &[(&str, Column)]) -> Table {
    let mut table = Table::new();
    table
        .load_preset(presets::NOTHING)
        .set_style(TableComponent::HeaderLines, '-')
        .set_style(TableComponent::MiddleHeaderIntersections, '-')
        .set_content_arrangement(ContentArrangement::Dynamic)
        .set_width(WIDTH)
        .set_header(heads.iter().map(|(head, _)| *head));
    for (index, (_, column)) in heads.iter().enumerate() {
        let column_of_table = table.column_mut(index).expect("made with the header");
        column_of_table.set_padding((0, 2));
        column_of_table.set_cell_alignment(match column {
            Column::Text | Column::Title => CellAlignment::Left,
            Column::Number => CellAlignment::Right,
        });
        if *column != Column::Text {
            column_of_table.set_constraint(ColumnConstraint::ContentWidth);
        }
    }
    table
}

/// The table as lines without blanks at their ends.
pub fn lines(table: &Table) -> String {
    let mut text = String::new();
    for line in table.lines() {
        text.push_str(line.trim_end());
        text.push('\n');
    }
    text
}

/// A paragraph of whole words, its lines after the first indented by `indent`.
pub fn wrapped(text: &str, indent: usize) -> String {
    let mut lines = String::new();
    let mut width = 0;
    for word in text.split_whitespace() {
        if width > 0 && width + 1 + word.len() > usize::from(WIDTH) {
            lines.push('\n');
            lines.push_str(&" ".repeat(indent));
            width = indent;
        } else if width > 0 {
            lines.push(' ');
            width += 1;
        }
        lines.push_str(word);
        width += word.len();
    }
    lines
}
