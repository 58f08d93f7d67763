//! Owns how a page is set: tables in the house look, words broken at its width, what stands out.

use comfy_table::presets::NOTHING;
use comfy_table::{CellAlignment, ColumnConstraint, ContentArrangement, ContentLineStyle, LineStyle, Table};

/// How a page is set.
#[derive(Debug, Clone, Copy, Default)]
pub struct Page {
    /// Columns of the terminal; `None`: lines are not wrapped.
    pub width: Option<u16>,
    /// Whether colour may be used. Nothing is said by colour alone.
    pub colour: bool,
}

/// Narrower pages leave out descriptions.
pub(super) const DESCRIBED: u16 = 72;
/// Pages up to this width have one space between columns, wider ones two.
const NARROW: u16 = 90;

/// A table in the house look: a ruled header, a gap between columns. On a narrow page only the columns of free
/// text in `wraps` give way.
pub(super) fn sheet(header: &[&str], numbers: &[usize], wraps: &[usize], page: Page) -> Table {
    let mut table = Table::new();
    table
        .load_style(
            NOTHING
                .header_separator(LineStyle::none().fill('-').junction(' '))
                .content_lines(ContentLineStyle::none()),
        )
        .set_header(header.iter().copied());
    match page.width {
        Some(width) => table
            .set_content_arrangement(ContentArrangement::Dynamic)
            .set_width(width),
        None => table.set_content_arrangement(ContentArrangement::Disabled),
    };
    let gap = if page.width.is_some_and(|width| width <= NARROW) {
        1
    } else {
        2
    };
    for (place, column) in table.column_iter_mut().enumerate() {
        column.set_padding((0, if place + 1 == header.len() { 0 } else { gap }));
        if !wraps.contains(&place) {
            column.set_constraint(ColumnConstraint::ContentWidth);
        }
    }
    for &place in numbers {
        if let Some(column) = table.column_mut(place) {
            column.set_cell_alignment(CellAlignment::Right);
        }
    }
    table
}

pub(super) fn set(table: &Table) -> String {
    table.lines().map(|line| format!("{}\n", line.trim_end())).collect()
}

/// Words broken at the page's width, later lines indented.
pub(super) fn wrapped(text: &str, first: &str, later: &str, width: Option<u16>) -> String {
    let most = width.map_or(usize::MAX, usize::from).max(20);
    let mut out = String::new();
    let mut line = first.to_owned();
    let mut empty = true;
    for word in text.split(' ') {
        if !empty && line.chars().count() + 1 + word.chars().count() > most {
            out.push_str(&line);
            out.push('\n');
            line = later.to_owned();
            empty = true;
        }
        if !empty {
            line.push(' ');
        }
        line.push_str(word);
        empty = false;
    }
    out + &line + "\n"
}

pub(super) fn strong(text: &str, good: bool, page: Page) -> String {
    match (page.colour, good) {
        (false, _) => text.to_owned(),
        (true, true) => format!("\u{1b}[1;32m{text}\u{1b}[0m"),
        (true, false) => format!("\u{1b}[1;31m{text}\u{1b}[0m"),
    }
}

/// A line that stands out, broken at the page's width.
pub(super) fn headline(text: &str, good: bool, page: Page) -> String {
    let lines = wrapped(text, "", "  ", page.width);
    strong(lines.trim_end(), good, page) + "\n"
}

pub(super) fn counted(n: u64, what: &str) -> String {
    if n == 1 {
        format!("1 {what}")
    } else {
        format!("{n} {what}s")
    }
}
