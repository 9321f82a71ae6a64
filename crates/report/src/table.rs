//! Tables for the terminal and for the page, from the same cells.

use crate::number::column;

/// A table; columns of numbers are set right, columns of words left.
#[derive(Debug, Default)]
pub(crate) struct Table {
    columns: Vec<Column>,
}

#[derive(Debug)]
struct Column {
    head: String,
    cells: Cells,
}

#[derive(Debug)]
enum Cells {
    Numbers(Vec<String>),
    /// Brought to one number of decimals when the table is shown.
    Levels(Vec<f64>),
    Words(Vec<String>),
}

impl Cells {
    fn len(&self) -> usize {
        match self {
            Self::Numbers(cells) | Self::Words(cells) => cells.len(),
            Self::Levels(cells) => cells.len(),
        }
    }

    fn text(&self) -> Vec<String> {
        match self {
            Self::Numbers(cells) | Self::Words(cells) => cells.clone(),
            Self::Levels(values) => column(values),
        }
    }
}

/// A column ready to be shown.
struct Shown {
    words: bool,
    head: String,
    cells: Vec<String>,
    width: usize,
}

impl Table {
    /// Adds a column of numbers; the unit belongs into the head.
    pub(crate) fn numbers(&mut self, head: impl Into<String>, cells: Vec<String>) -> &mut Self {
        self.add(head.into(), Cells::Numbers(cells))
    }

    /// Adds a column of levels, their points in line.
    pub(crate) fn levels(&mut self, head: impl Into<String>, values: Vec<f64>) -> &mut Self {
        self.add(head.into(), Cells::Levels(values))
    }

    /// Adds a column of words.
    pub(crate) fn words(&mut self, head: impl Into<String>, cells: Vec<String>) -> &mut Self {
        self.add(head.into(), Cells::Words(cells))
    }

    fn add(&mut self, head: String, cells: Cells) -> &mut Self {
        self.columns.push(Column { head, cells });
        self
    }

    fn rows(&self) -> usize {
        let lengths = self.columns.iter().map(|c| c.cells.len());
        lengths.min().unwrap_or(0)
    }

    /// One table of several, a first column naming each one's rows; `None` where their heads
    /// differ.
    pub(crate) fn stacked(head: &str, tables: &[(String, Self)]) -> Option<Self> {
        let (_, first) = tables.first()?;
        let heads = |t: &Self| t.columns.iter().map(|c| c.head.clone()).collect::<Vec<_>>();
        if tables.iter().any(|(_, t)| heads(t) != heads(first)) {
            return None;
        }
        let mut out = Self::default();
        let names = tables
            .iter()
            .flat_map(|(name, table)| vec![name.clone(); table.rows()]);
        out.numbers(head, names.collect());
        for (i, of_first) in first.columns.iter().enumerate() {
            let all = || tables.iter().map(|(_, table)| &table.columns[i].cells);
            let text = || all().flat_map(Cells::text).collect::<Vec<_>>();
            let cells = match of_first.cells {
                Cells::Numbers(_) => Cells::Numbers(text()),
                Cells::Words(_) => Cells::Words(text()),
                Cells::Levels(_) => Cells::Levels(
                    all()
                        .flat_map(|cells| match cells {
                            Cells::Levels(values) => values.clone(),
                            Cells::Numbers(_) | Cells::Words(_) => Vec::new(),
                        })
                        .collect(),
                ),
            };
            out.add(of_first.head.clone(), cells);
        }
        Some(out)
    }

    fn shown(&self, dress: impl Fn(&str) -> String) -> Vec<Shown> {
        let show = |column: &Column| {
            let head = dress(&column.head);
            let cells: Vec<String> = column.cells.text().iter().map(|c| dress(c)).collect();
            let longest = cells.iter().map(|c| c.chars().count()).max().unwrap_or(0);
            Shown {
                words: matches!(column.cells, Cells::Words(_)),
                width: longest.max(head.chars().count()).max(3),
                head,
                cells,
            }
        };
        self.columns.iter().map(show).collect()
    }

    /// Lines of plain characters, two blanks between columns.
    pub(crate) fn plain(&self) -> Vec<String> {
        let shown = self.shown(str::to_owned);
        let line = |cell: &dyn Fn(&Shown) -> String| {
            let cells: Vec<String> = shown.iter().map(|c| c.padded(&cell(c))).collect();
            cells.join("  ").trim_end().to_owned()
        };
        let mut lines = vec![line(&|c| c.head.clone())];
        lines.extend((0..self.rows()).map(|row| line(&|c| c.cells[row].clone())));
        lines
    }

    /// A Markdown table, padded so that its source reads as well.
    pub(crate) fn markdown(&self) -> String {
        let shown = self.shown(escape);
        let line = |cell: &dyn Fn(&Shown) -> String| {
            let cells: Vec<String> = shown.iter().map(|c| c.padded(&cell(c))).collect();
            format!("| {} |\n", cells.join(" | "))
        };
        let mut out = line(&|c| c.head.clone());
        out += &line(&|c| {
            if c.words {
                "-".repeat(c.width)
            } else {
                format!("{}:", "-".repeat(c.width - 1))
            }
        });
        for row in 0..self.rows() {
            out += &line(&|c| c.cells[row].clone());
        }
        out
    }
}

impl Shown {
    fn padded(&self, cell: &str) -> String {
        let gap = " ".repeat(self.width - cell.chars().count());
        if self.words {
            format!("{cell}{gap}")
        } else {
            format!("{gap}{cell}")
        }
    }
}

/// Text that Markdown shows as it stands.
pub(crate) fn escape(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        if matches!(
            c,
            '\\' | '`' | '*' | '_' | '[' | ']' | '<' | '>' | '|' | '#' | '~'
        ) {
            out.push('\\');
        }
        out.push(c);
    }
    out
}

/// Lines of at most `width` characters, broken at blanks; longer words stand alone.
pub(crate) fn wrap(text: &str, width: usize) -> Vec<String> {
    let mut lines = Vec::new();
    let mut line = String::new();
    for word in text.split(' ') {
        let longer = line.chars().count() + 1 + word.chars().count();
        if !line.is_empty() && longer > width {
            lines.push(std::mem::take(&mut line));
        }
        if !line.is_empty() {
            line.push(' ');
        }
        line.push_str(word);
    }
    lines.push(line);
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    fn table() -> Table {
        let mut table = Table::default();
        table
            .numbers("order", vec!["1.00".into(), "10.00".into()])
            .words("verdict | seen", vec!["wanders".into(), "a|b".into()]);
        table
    }

    #[test]
    fn columns_line_up() {
        assert_eq!(
            table().plain(),
            ["order  verdict | seen", " 1.00  wanders", "10.00  a|b"]
        );
    }

    #[test]
    fn a_stroke_in_a_cell_does_not_end_it() {
        assert_eq!(
            table().markdown(),
            "| order | verdict \\| seen |\n\
             | ----: | --------------- |\n\
             |  1.00 | wanders         |\n\
             | 10.00 | a\\|b            |\n"
        );
    }

    #[test]
    fn tables_of_one_head_stand_under_one_another() {
        let level = |value: f64| {
            let mut table = Table::default();
            table.levels("m/s²", vec![value]);
            table
        };
        let two = [("1".to_owned(), level(2.4)), ("2".to_owned(), level(0.123))];
        let stacked = Table::stacked("ch", &two).map(|t| t.plain());
        let lines = ["ch   m/s²", "  1  2.400", "  2  0.123"].map(str::to_owned);
        assert_eq!(
            stacked,
            Some(vec![
                " ch   m/s²".to_owned(),
                lines[1].clone(),
                lines[2].clone()
            ])
        );
        let other = [("1".to_owned(), level(2.4)), ("2".to_owned(), table())];
        assert!(Table::stacked("ch", &other).is_none());
    }

    #[test]
    fn long_text_is_broken_at_blanks() {
        assert_eq!(wrap("one two three", 8), ["one two", "three"]);
        assert_eq!(wrap("unbreakable x", 4), ["unbreakable", "x"]);
        assert_eq!(wrap("", 4), [""]);
    }
}
