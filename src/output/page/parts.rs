//! Pieces of every section: tables, figures, lists that were cut, texts that were recorded.

use maud::{Markup, PreEscaped, html};

use crate::output::text::{Block, Tone};
use crate::output::words::{clean, count};

/// Rows of a table that is kept on one sheet of paper.
const SHORT: usize = 14;

/// One cell of a table.
pub(super) enum Cell {
    /// Words.
    Text(String),
    /// A number with its unit, aligned right.
    Number(String),
    /// What can be copied: an expression, a command.
    Code(String),
    /// A state of things that is marked, and says itself what it is.
    Marked(Tone, String),
    /// A link to a place of the page.
    Link(String, String),
    /// Nothing: it does not apply, or is the same as above.
    Empty,
}

/// A table with its caption. The first column heads its row.
pub(super) struct Table<'a> {
    /// Unique in the page.
    pub id: &'a str,
    pub caption: &'a str,
    /// Titles, each with whether its column holds numbers.
    pub head: Vec<(&'a str, bool)>,
    pub rows: Vec<Vec<Cell>>,
}

impl Table<'_> {
    /// In a region of its own that scrolls where the page is narrow. Columns in which nothing stands are left out.
    pub fn draw(&self) -> Markup {
        self.draw_below("")
    }

    /// As [`draw`](Self::draw), below a heading: a caption that says the same is there for those who hear the page.
    fn draw_below(&self, heading: &str) -> Markup {
        let caption = format!("{}-caption", self.id);
        let filled = |column: &usize| {
            *column == 0
                || self.rows.iter().any(|row| row.get(*column).is_some_and(|cell| !matches!(cell, Cell::Empty)))
        };
        let columns: Vec<usize> = (0..self.head.len()).filter(filled).collect();
        html! {
            div.scroll role="region" tabindex="0" aria-labelledby=(caption) {
                table id=(self.id) class=[(self.rows.len() <= SHORT).then_some("short")] {
                    caption id=(caption) class=[(self.caption == heading).then_some("unseen")] { (clean(self.caption)) }
                    thead { tr {
                        @for (title, number) in columns.iter().map(|column| &self.head[*column]) {
                            // a corner without a title is no header
                            @if title.is_empty() {
                                td {}
                            } @else {
                                th scope="col" class=[number.then_some("number")] { (clean(title)) }
                            }
                        }
                    } }
                    tbody {
                        @for row in &self.rows {
                            tr { @for column in &columns { (draw_cell(&row[*column], *column == 0)) } }
                        }
                    }
                }
            }
        }
    }
}

fn draw_cell(cell: &Cell, first: bool) -> Markup {
    let content = match cell {
        Cell::Text(text) | Cell::Number(text) => html! { (clean(text)) },
        Cell::Code(text) => html! { code { (clean(text)) } },
        Cell::Marked(tone, text) => html! { span class=[class(*tone)] { (clean(text)) } },
        Cell::Link(to, text) => html! { a href=(format!("#{to}")) { (clean(text)) } },
        Cell::Empty => return html! { td {} },
    };
    match (first, cell) {
        (true, _) => html! { th scope="row" { (content) } },
        (false, Cell::Number(_)) => html! { td.number { (content) } },
        (false, _) => html! { td { (content) } },
    }
}

/// The class of a tone; words always say the same.
pub(super) const fn class(tone: Tone) -> Option<&'static str> {
    match tone {
        Tone::Bad => Some("bad"),
        Tone::Unsure => Some("unsure"),
        Tone::Strong => Some("strong"),
        Tone::Quiet => Some("quiet"),
        Tone::Plain => None,
    }
}

/// What is left out of a list, and where it is; nothing if all is there.
pub(super) fn cut(left: usize, what: &str, place: &str) -> Markup {
    html! {
        @if left > 0 {
            p.note { "Left out here: " (count(left as u64)) " more " (what) "; " (place) " has all." }
        }
    }
}

/// A picture that is a file, too. The element gets an id that scripts can find.
pub(super) fn figure(id: &str, svg: &str, caption: &Markup) -> Markup {
    html! {
        figure id=(format!("figure-{id}")) {
            div.picture { (inline(id, svg)) }
            figcaption { (caption) }
        }
    }
}

/// An SVG element of this program as part of the page, with this id.
fn inline(id: &str, svg: &str) -> PreEscaped<String> {
    PreEscaped(svg.trim_end().replacen("<svg ", &format!("<svg id=\"{id}\" "), 1))
}

/// A recorded text. Its tables are called after the heading above them, or after the section.
pub(super) fn blocks(id: &str, section: &str, blocks: &[Block]) -> Markup {
    let mut out = Vec::new();
    let mut title = section.to_string();
    let mut heading = String::new();
    let mut rest = blocks;
    let mut number = 0;
    while let Some((first, mut tail)) = rest.split_first() {
        out.push(match first {
            Block::Heading(text) => {
                title.clone_from(text);
                heading.clone_from(text);
                html! { h3 { (clean(text)) } }
            }
            Block::Text(tone, text) => html! { p class=[class(*tone)] { (clean(text)) } },
            Block::Command(text) => command(text),
            Block::Item(..) => {
                let many = rest.iter().take_while(|block| matches!(block, Block::Item(..))).count();
                tail = &rest[many..];
                html! {
                    ul {
                        @for block in &rest[..many] {
                            @if let Block::Item(tone, text) = block { li class=[class(*tone)] { (clean(text)) } }
                        }
                    }
                }
            }
            Block::Table { head, rows } => {
                number += 1;
                let cell = |(tone, column, text): (Tone, usize, &String)| match (column, head[column].1) {
                    _ if text.is_empty() => Cell::Empty,
                    (_, true) => Cell::Number(text.clone()),
                    (0, _) => Cell::Text(text.clone()),
                    _ => Cell::Marked(tone, text.clone()),
                };
                let row = |(tone, cells): &(Tone, Vec<String>)| {
                    cells.iter().enumerate().map(|(column, text)| cell((*tone, column, text))).collect()
                };
                let table = Table {
                    id: &format!("{id}-{number}"),
                    caption: &title,
                    head: head.iter().map(|(title, number)| (title.as_str(), *number)).collect(),
                    rows: rows.iter().map(row).collect(),
                };
                table.draw_below(&heading)
            }
        });
        rest = tail;
    }
    html! { @for part in out { (part) } }
}

/// A command to copy.
pub(super) fn command(text: &str) -> Markup {
    html! { pre.command { code { (clean(text)) } } }
}
