//! Tables without frames: columns, a head, and nothing that a person has to look past.

use comfy_table::{CellAlignment, ColumnConstraint, ContentArrangement, Table, presets};

/// A table with this head; the columns in `right` are set to the right.
pub(crate) fn table(head: &[&str], right: &[usize]) -> Table {
    let mut table = Table::new();
    table.load_style(presets::NOTHING);
    table.set_content_arrangement(ContentArrangement::Dynamic);
    table.set_width(78);
    table.set_header(head.iter().copied());
    // An identity that is broken in two cannot be copied.
    if let Some(column) = table.column_mut(0) {
        column.set_constraint(ColumnConstraint::ContentWidth);
    }
    for &column in right {
        if let Some(column) = table.column_mut(column) {
            column.set_cell_alignment(CellAlignment::Right);
        }
    }
    table
}

/// The table's lines, without blanks at their ends.
pub(crate) fn lines(table: &Table) -> String {
    table.lines().map(|line| line.trim_end().to_owned()).collect::<Vec<_>>().join("\n")
}
