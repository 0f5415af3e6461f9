//! Lines of text of limited width: wrapping, aligned columns, and colour where it is wanted.

use super::blocks::Block;
use crate::time::Unit;

/// How a terminal shows text.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Style {
    /// Plain text, for files and pipes.
    #[default]
    Plain,
    /// With ANSI escapes for bold and colour. Words say everything that colour says.
    Ansi,
}

/// What a line is like.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(in crate::output) enum Tone {
    #[default]
    Plain,
    Strong,
    Bad,
    Unsure,
    Quiet,
}

impl Tone {
    /// The escape that begins it; nothing for plain.
    fn escape(self) -> &'static str {
        match self {
            Tone::Plain => "",
            Tone::Strong => "\x1b[1m",
            Tone::Bad => "\x1b[31m",
            Tone::Unsure => "\x1b[33m",
            Tone::Quiet => "\x1b[2m",
        }
    }
}

/// Widest and narrowest page, in columns.
const WIDTHS: (usize, usize) = (60, WIDEST);
/// The widest page.
pub(super) const WIDEST: usize = 100;
/// Before every line of a table.
const INDENT: usize = 2;
/// Between two columns of a table.
const GAP: usize = 2;
/// A column of texts becomes as narrow as this before others go below their rows.
const FIRST_CUT: usize = 18;
/// And as this once no other can.
const LAST_CUT: usize = 6;

/// A page that is being written.
pub(super) struct Paper {
    style: Style,
    width: usize,
    text: String,
    /// What stands on a recorded paper; `None`: lines are written.
    blocks: Option<Vec<Block>>,
}

impl Paper {
    pub fn new(style: Style, width: usize) -> Paper {
        Paper { style, width: width.clamp(WIDTHS.0, WIDTHS.1), text: String::new(), blocks: None }
    }

    /// A paper without width and lines that remembers what was put on it, for pages with a layout of their own.
    pub fn recorded() -> Paper {
        Paper { style: Style::Plain, width: usize::MAX / 4, text: String::new(), blocks: Some(Vec::new()) }
    }

    /// What stands on a recorded paper; nothing of any other.
    pub fn blocks(self) -> Vec<Block> {
        self.blocks.unwrap_or_default()
    }

    /// How many entries a list may have: on a screen, or on a recorded paper.
    pub fn most(&self, screen: usize, recorded: usize) -> usize {
        if self.blocks.is_some() { recorded } else { screen }
    }

    pub fn finish(self) -> String {
        self.text
    }

    /// An empty line, unless the page is empty or has one there.
    pub fn gap(&mut self) {
        if !self.text.is_empty() && !self.text.ends_with("\n\n") {
            self.text.push('\n');
        }
    }

    /// A heading after a gap.
    pub fn heading(&mut self, text: &str) {
        if let Some(blocks) = &mut self.blocks {
            return blocks.push(Block::Heading(text.to_string()));
        }
        self.gap();
        self.say(0, Tone::Strong, text);
    }

    /// A paragraph, wrapped at spaces, every line indented.
    pub fn say(&mut self, indent: usize, tone: Tone, text: &str) {
        self.hang(indent, indent, tone, text);
    }

    /// An entry of a list: a dash, and further lines below its text.
    pub fn item(&mut self, tone: Tone, text: &str) {
        if let Some(blocks) = &mut self.blocks {
            return blocks.push(Block::Item(tone, text.to_string()));
        }
        self.hang(2, 4, tone, &format!("- {text}"));
    }

    /// A paragraph whose first line has an indent of its own.
    pub fn hang(&mut self, first: usize, indent: usize, tone: Tone, text: &str) {
        if let Some(blocks) = &mut self.blocks {
            return blocks.push(Block::Text(tone, text.to_string()));
        }
        let mut line = " ".repeat(first);
        let mut is_empty = true;
        let mut used = first;
        for word in words(text) {
            let mut rest: Vec<char> = word.chars().map(shown).collect();
            if !is_empty && used + 1 + rest.len() > self.width {
                self.put(tone, &line);
                line = " ".repeat(indent);
                (is_empty, used) = (true, indent);
            }
            if !is_empty {
                line.push(' ');
                used += 1;
            }
            // a word that is longer than a line is broken
            while used + rest.len() > self.width {
                let tail = rest.split_off(self.width - used);
                line.extend(&rest);
                self.put(tone, &line);
                line = " ".repeat(indent);
                used = indent;
                rest = tail;
            }
            line.extend(&rest);
            used += rest.len();
            is_empty = false;
        }
        self.put(tone, &line);
    }

    /// A line that must stay whole to be copied, such as a command; it may be wider than the page.
    pub fn whole(&mut self, indent: usize, text: &str) {
        if let Some(blocks) = &mut self.blocks {
            return blocks.push(Block::Command(text.to_string()));
        }
        let text: String = text.chars().map(shown).collect();
        self.put(Tone::Plain, &format!("{}{text}", " ".repeat(indent)));
    }

    /// A table, indented by two. Where there is no room a cell goes on below itself, and a column that would leave too little
    /// for the others goes below its row, with its title.
    pub fn table(&mut self, table: &Table) {
        if let Some(blocks) = &mut self.blocks {
            return blocks.push(Block::from(table));
        }
        let (columns, widths) = table.fit(self.width - INDENT);
        let below: Vec<usize> = (0..table.columns.len()).filter(|column| !columns.contains(column)).collect();
        let titles: Vec<&str> = table.columns.iter().map(|column| column.title.as_str()).collect();
        self.row(table, Tone::Quiet, &titles, (&columns, &widths));
        for (tone, cells) in &table.rows {
            let cells: Vec<&str> = cells.iter().map(String::as_str).collect();
            self.row(table, *tone, &cells, (&columns, &widths));
            let more = below.iter().filter(|column| !cells[**column].trim().is_empty());
            let more: Vec<String> = more.map(|column| format!("{} {}", titles[*column], cells[*column])).collect();
            if !more.is_empty() {
                self.hang(2 * INDENT, 2 * INDENT, *tone, &more.join(", "));
            }
        }
    }

    /// One row, on as many lines as its highest cell takes.
    fn row(&mut self, table: &Table, tone: Tone, cells: &[&str], (columns, widths): (&[usize], &[usize])) {
        let cells: Vec<Vec<String>> =
            columns.iter().zip(widths).map(|(column, width)| within(cells[*column], *width)).collect();
        for i in 0..cells.iter().map(Vec::len).max().unwrap_or(0) {
            let mut line = " ".repeat(INDENT);
            for (k, (column, width)) in columns.iter().zip(widths).enumerate() {
                let cell = cells[k].get(i).map_or("", String::as_str);
                let pad = " ".repeat(width.saturating_sub(cell.chars().count()));
                if k > 0 {
                    line += &" ".repeat(GAP);
                }
                line += &if table.columns[*column].right { pad + cell } else { cell.to_string() + &pad };
            }
            self.put(tone, line.trim_end());
        }
    }

    fn put(&mut self, tone: Tone, line: &str) {
        let line = line.trim_end();
        match (self.style, tone.escape()) {
            (Style::Ansi, escape @ ("\x1b[1m" | "\x1b[31m" | "\x1b[33m" | "\x1b[2m")) if !line.is_empty() => {
                let text = line.trim_start();
                let indent = &line[..line.len() - text.len()];
                self.text += &format!("{indent}{escape}{text}\x1b[0m\n");
            }
            _ => self.text += &format!("{line}\n"),
        }
    }
}

/// The words of a text; a number stays with its unit.
fn words(text: &str) -> Vec<String> {
    let mut words: Vec<String> = Vec::new();
    for word in text.split_whitespace() {
        let bare = word.trim_end_matches([',', '.', ';', ')', ']', ':']);
        let is_unit = bare == "%" || Unit::ALL.iter().any(|unit| unit.name() == bare);
        match words.last_mut() {
            Some(last) if is_unit && last.ends_with(|letter: char| letter.is_ascii_digit()) => {
                last.push(' ');
                last.push_str(word);
            }
            _ => words.push(word.to_string()),
        }
    }
    words
}

/// Control characters could steer a terminal.
fn shown(letter: char) -> char {
    if letter.is_control() { '\u{fffd}' } else { letter }
}

/// Most lines of one cell; of a longer one the end is left out.
const MOST_LINES: usize = 6;

/// A text in lines of at most `width` letters, at least one: broken at spaces, and within words that are longer.
fn within(text: &str, width: usize) -> Vec<String> {
    let width = width.max(1);
    let text: String = text.chars().map(|letter| if letter == '\n' { ' ' } else { shown(letter) }).collect();
    if text.chars().count() <= width {
        return vec![text];
    }
    let mut lines = vec![String::new()];
    let mut used = 0;
    for word in text.split_whitespace() {
        let mut rest: Vec<char> = word.chars().collect();
        if used > 0 && used + 1 + rest.len() > width {
            lines.push(String::new());
            used = 0;
        }
        while rest.len() > width {
            let tail = rest.split_off(width);
            if let Some(line) = lines.last_mut() {
                line.extend(&rest);
            }
            lines.push(String::new());
            rest = tail;
        }
        if let Some(line) = lines.last_mut() {
            if used > 0 {
                line.push(' ');
                used += 1;
            }
            line.extend(&rest);
            used += rest.len();
        }
    }
    if lines.len() > MOST_LINES {
        lines.truncate(MOST_LINES);
        if let Some(last) = lines.last_mut() {
            *last = last.chars().take(width - 1).chain(['…']).collect();
        }
    }
    lines
}

/// One column of a table.
pub(super) struct Column {
    title: String,
    right: bool,
    may_wrap: bool,
    /// Columns with a greater number go below their row first where there is no room; 0 stays.
    drop: u8,
}

/// A table: every row has a cell for every column.
pub(super) struct Table {
    columns: Vec<Column>,
    rows: Vec<(Tone, Vec<String>)>,
}

impl Table {
    pub fn new() -> Table {
        Table { columns: Vec::new(), rows: Vec::new() }
    }

    /// A column of texts that may take several lines.
    pub fn text(mut self, title: impl Into<String>) -> Table {
        self.columns.push(Column { title: title.into(), right: false, may_wrap: true, drop: 0 });
        self
    }

    /// A column of numbers, aligned right; it goes below its row where there is no room if `drop` is above 0.
    pub fn number(mut self, title: impl Into<String>, drop: u8) -> Table {
        self.columns.push(Column { title: title.into(), right: true, may_wrap: false, drop });
        self
    }

    /// A column of short words.
    pub fn word(mut self, title: impl Into<String>) -> Table {
        self.columns.push(Column { title: title.into(), right: false, may_wrap: false, drop: 0 });
        self
    }

    pub fn row(&mut self, tone: Tone, cells: Vec<String>) {
        debug_assert_eq!(cells.len(), self.columns.len());
        self.rows.push((tone, cells));
    }

    /// Titles, each with whether its column holds numbers.
    pub fn titles(&self) -> Vec<(String, bool)> {
        self.columns.iter().map(|column| (column.title.clone(), column.right)).collect()
    }

    pub fn rows(&self) -> &[(Tone, Vec<String>)] {
        &self.rows
    }

    /// Does all of it fit a page, in one line a row?
    pub fn fits(&self, paper: &Paper) -> bool {
        let room = paper.width - INDENT;
        let whole: usize = self.natural().iter().sum::<usize>() + GAP * self.columns.len().saturating_sub(1);
        whole <= room
    }

    /// The widths that show every cell whole.
    fn natural(&self) -> Vec<usize> {
        let width = |(c, column): (usize, &Column)| {
            let cells = self.rows.iter().map(|row| row.1[c].chars().count());
            cells.chain([column.title.chars().count()]).max().unwrap_or(0)
        };
        self.columns.iter().enumerate().map(width).collect()
    }

    /// Which columns stand beside each other, and how wide.
    fn fit(&self, room: usize) -> (Vec<usize>, Vec<usize>) {
        let natural = self.natural();
        let mut shown: Vec<usize> = (0..self.columns.len()).collect();
        loop {
            let mut widths: Vec<usize> = shown.iter().map(|c| natural[*c]).collect();
            let total = |widths: &[usize]| widths.iter().sum::<usize>() + GAP * widths.len().saturating_sub(1);
            let droppable = shown.iter().copied().filter(|c| self.columns[*c].drop > 0);
            let next = droppable.max_by_key(|c| self.columns[*c].drop);
            let least = if next.is_some() { FIRST_CUT } else { LAST_CUT };
            while total(&widths) > room {
                let may_wrap = (0..shown.len()).filter(|k| self.columns[shown[*k]].may_wrap && widths[*k] > least);
                let Some(widest) = may_wrap.max_by_key(|k| widths[*k]) else { break };
                widths[widest] -= 1;
            }
            match next {
                Some(column) if total(&widths) > room => shown.retain(|c| *c != column),
                _ => return (shown, widths),
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn paper(width: usize) -> Paper {
        Paper::new(Style::Plain, width)
    }

    #[test]
    fn text_is_wrapped_and_long_words_are_broken() {
        let mut page = paper(60);
        page.say(2, Tone::Plain, &format!("a word {} end", "x".repeat(130)));
        let text = page.finish();
        assert!(text.lines().all(|line| line.chars().count() <= 60), "{text}");
        assert_eq!(text.replace([' ', '\n'], ""), format!("aword{}end", "x".repeat(130)));
    }

    #[test]
    fn a_table_without_room_takes_more_lines_and_loses_nothing() {
        let mut table = Table::new().text("step").number("median", 2).number("longest", 0);
        let name = "both_let_go ".repeat(7);
        table.row(Tone::Plain, vec![name.clone(), "1 ns".into(), "2 ns".into()]);
        table.row(Tone::Plain, vec!["s".repeat(90), "3 ns".into(), "4 ns".into()]);
        let mut page = paper(60);
        page.table(&table);
        let text = page.finish();
        assert!(text.lines().all(|line| line.chars().count() <= 60), "{text}");
        assert_eq!(text.matches("both_let_go").count(), 7, "{text}");
        assert_eq!(text.matches('s').count(), 90 + "step longest 2 ns 1 ns 3 ns 4 ns".matches('s').count(), "{text}");
        assert!(text.contains("median") && text.contains("2 ns") && !text.contains('…'), "{text}");
    }

    #[test]
    fn columns_without_room_go_below_their_rows() {
        let mut table = Table::new().text("step");
        for column in 0..8 {
            table = table.number(format!("column {column}"), column);
        }
        table.row(Tone::Plain, [vec!["a step".to_string()], vec!["12.5 ns".to_string(); 8]].concat());
        let mut page = paper(60);
        page.table(&table);
        let text = page.finish();
        assert!(text.lines().all(|line| line.chars().count() <= 60), "{text}");
        assert!((0..8).all(|column| text.contains(&format!("column {column}"))), "{text}");
        assert_eq!(text.matches("12.5 ns").count(), 8, "{text}");
    }

    #[test]
    fn a_cell_is_broken_at_spaces_and_ends_somewhere() {
        assert_eq!(within("let go, then call", 8), ["let go,", "then", "call"]);
        assert_eq!(within("abcdefghij kl", 4), ["abcd", "efgh", "ij", "kl"]);
        assert_eq!(within("", 4), [""]);
        let long = within(&"x".repeat(1000), 10);
        assert!(long.len() == MOST_LINES && long[MOST_LINES - 1].ends_with('…'), "{long:?}");
    }

    #[test]
    fn colour_is_only_added_to_the_same_words() {
        let write = |style| {
            let mut page = Paper::new(style, 80);
            page.heading("Findings");
            page.item(Tone::Bad, "both gates open");
            page.finish()
        };
        let plain = write(Style::Plain);
        let colour = write(Style::Ansi);
        assert!(!plain.contains('\x1b') && colour.contains('\x1b'));
        let mut bare = colour;
        for escape in ["\x1b[1m", "\x1b[31m", "\x1b[0m"] {
            bare = bare.replace(escape, "");
        }
        assert_eq!(bare, plain);
    }

    #[test]
    fn names_cannot_steer_a_terminal() {
        let mut page = Paper::new(Style::Ansi, 80);
        page.say(0, Tone::Plain, "title\x1b[2J");
        assert!(!page.finish().contains('\x1b'));
    }
}
