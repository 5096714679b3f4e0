//! Aligned columns that fit a width.

use unicode_width::UnicodeWidthStr;

use super::words::shortened;

/// How a column stands, and what it is worth.
#[derive(Debug, Clone, Copy)]
pub(super) struct Column {
    pub(super) title: &'static str,
    pub(super) right: bool,
    /// Columns of lower worth are dropped first when the table is too wide; the highest are never dropped.
    pub(super) worth: u8,
}

/// The columns that are never dropped.
pub(super) const KEPT: u8 = u8::MAX;

/// Names are not cut below this.
const SHORTEST_NAME: usize = 16;

/// A table that fits.
pub(super) struct Table {
    /// Its cells line by line, heading first.
    pub(super) lines: Vec<Vec<String>>,
    /// Titles of the columns that were dropped.
    pub(super) dropped: Vec<&'static str>,
}

/// Fits a table to a width. The first column holds names and is cut if nothing else helps.
pub(super) fn table(columns: &[Column], rows: &[Vec<String>], width: usize) -> Table {
    let widest = |at: usize| {
        let cells = rows.iter().map(|row| row[at].width());
        cells.chain([columns[at].title.width()]).max().unwrap_or(0)
    };
    let widths: Vec<usize> = (0..columns.len()).map(widest).collect();
    let mut in_use: Vec<usize> = (0..columns.len()).collect();
    let total = |in_use: &[usize]| in_use.iter().map(|at| widths[*at] + 2).sum::<usize>() - 2;
    while total(&in_use) > width {
        let least = in_use.iter().copied().filter(|at| columns[*at].worth < KEPT).min_by_key(|at| columns[*at].worth);
        let Some(least) = least else { break };
        in_use.retain(|at| *at != least);
    }
    let excess = total(&in_use).saturating_sub(width);
    let name_width = widths[0].saturating_sub(excess).max(SHORTEST_NAME.min(widths[0]));
    let cell = |at: usize, text: &str| {
        let columns_wide = if at == 0 { name_width } else { widths[at] };
        let text = if at == 0 { shortened(text, name_width) } else { text.to_owned() };
        let padding = " ".repeat(columns_wide.saturating_sub(text.width()));
        if columns[at].right { format!("{padding}{text}") } else { format!("{text}{padding}") }
    };
    let heading = in_use.iter().map(|at| cell(*at, columns[*at].title)).collect();
    let body = rows.iter().map(|row| in_use.iter().map(|at| cell(*at, &row[*at])).collect());
    let dropped = (0..columns.len()).filter(|at| !in_use.contains(at)).map(|at| columns[at].title).collect();
    Table { lines: std::iter::once(heading).chain(body).collect(), dropped }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_least_worthy_columns_go_first_and_names_are_cut_last() {
        let columns = [
            Column { title: "quantity", right: false, worth: KEPT },
            Column { title: "exact", right: true, worth: 2 },
            Column { title: "extra", right: true, worth: 1 },
            Column { title: "verdict", right: false, worth: KEPT },
        ];
        let rows = vec![vec!["absorption_probability:shipped".into(), "0.5".into(), "12345".into(), "agree".into()]];
        let at =
            |width: usize| table(&columns, &rows, width).lines.iter().map(|line| line.join("  ")).collect::<Vec<_>>();
        assert_eq!(at(80)[1], "absorption_probability:shipped    0.5  12345  agree  ");
        assert_eq!(at(50)[1], "absorption_probability:shipped    0.5  agree  ");
        assert_eq!(at(40)[1], "absorption_probability:shipped  agree  ");
        assert_eq!(at(30)[1], "absorption…ty:shipped  agree  ");
        assert!(table(&columns, &rows, 80).dropped.is_empty());
        assert_eq!(table(&columns, &rows, 50).dropped, ["extra"]);
        for width in 26..90 {
            assert!(at(width).iter().all(|line| line.width() <= width), "{width}");
        }
    }
}
