//! Faults of a text, placed in it and shown like a compiler's.

use std::fmt;
use std::ops::{Range, RangeInclusive};
use std::sync::Arc;

use annotate_snippets::{AnnotationKind, Group, Level, Origin, Renderer, Snippet};
use serde::Serialize;

/// Everything that is wrong with one text, in the order of the text.
#[derive(Clone, Debug)]
pub struct Diagnostics {
    name: String,
    text: Arc<str>,
    /// Lines before the text: more than none where the text is only a part of what was read.
    before: usize,
    items: Vec<Diagnostic>,
}

/// One thing that is wrong.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Diagnostic {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// What is wrong.
    pub message: String,
    /// What would be right.
    pub help: String,
    /// Other places that play a part.
    pub related: Vec<Related>,
    #[serde(skip)]
    span: Range<usize>,
}

/// Another place that plays a part in a diagnostic.
#[derive(Clone, Debug, PartialEq, Eq, Serialize)]
pub struct Related {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// What is to be seen there.
    pub label: String,
    #[serde(skip)]
    span: Range<usize>,
}

/// A fault with its places in bytes of the text.
pub(super) struct Placed {
    pub span: Range<usize>,
    pub message: String,
    pub help: String,
    pub related: Vec<(Range<usize>, String)>,
}

/// Longest line that is shown whole, in bytes; of a longer one the part around the fault is shown.
const LONGEST_LINE: usize = 400;

/// Farthest lines shown in one picture.
const LINES_APART: usize = 40;

impl Diagnostics {
    pub(super) fn new(name: &str, text: Arc<str>, mut placed: Vec<Placed>) -> Diagnostics {
        placed.sort_by_key(|fault| fault.span.start);
        let lines = Lines::of(&text, 0);
        let items = placed.into_iter().map(|fault| {
            let span = lines.shown(&text, fault.span);
            let (line, column) = lines.place(&text, span.start);
            let related = fault.related.into_iter().map(|(span, label)| {
                let span = lines.shown(&text, span);
                let (line, column) = lines.place(&text, span.start);
                Related { line, column, label, span }
            });
            let related = related.collect();
            Diagnostic { line, column, message: fault.message, help: fault.help, related, span }
        });
        let items = items.collect();
        Diagnostics { name: name.to_string(), text, before: 0, items }
    }

    /// One fault of a text of which there is only this line.
    pub(super) fn in_line(
        name: &str,
        line: usize,
        text: &str,
        span: Range<usize>,
        message: String,
        help: String,
    ) -> Diagnostics {
        let text: Arc<str> = text.into();
        let lines = Lines::of(&text, line.saturating_sub(1));
        let span = lines.shown(&text, span);
        let (line, column) = lines.place(&text, span.start);
        let item = Diagnostic { line, column, message, help, related: Vec::new(), span };
        Diagnostics { name: name.to_string(), before: lines.before, text, items: vec![item] }
    }

    /// The name of the text, as in `file:line:column`.
    pub fn name(&self) -> &str {
        &self.name
    }

    /// All of them, in the order of the text.
    pub fn items(&self) -> &[Diagnostic] {
        &self.items
    }

    /// For people: each with `name:line:column`, the line, and its remedy; with colours if `styled`.
    pub fn render(&self, styled: bool) -> String {
        let renderer = if styled { Renderer::styled() } else { Renderer::plain() };
        let lines = Lines::of(&self.text, self.before);
        let mut all = String::new();
        for item in &self.items {
            let mut group = Group::with_title(Level::ERROR.primary_title(item.message.as_str()));
            let whole = |line: usize| lines.range(line).len() <= LONGEST_LINE;
            let is_near = |r: &&Related| r.line.abs_diff(item.line) <= LINES_APART && whole(r.line) && whole(item.line);
            let (near, far): (Vec<_>, Vec<_>) = item.related.iter().partition(is_near);
            let first = near.iter().map(|r| r.line).fold(item.line, usize::min);
            let last = near.iter().map(|r| r.line).fold(item.line, usize::max);
            let mut marks = vec![(AnnotationKind::Primary, &item.span, None)];
            marks.extend(near.iter().map(|r| (AnnotationKind::Context, &r.span, Some(r.label.as_str()))));
            group = self.picture(group, &lines, first..=last, (item.line, item.column), &marks);
            for related in far {
                let mark = [(AnnotationKind::Context, &related.span, Some(related.label.as_str()))];
                let place = (related.line, related.column);
                group = self.picture(group, &lines, related.line..=related.line, place, &mark);
            }
            group = group.element(Level::HELP.message(item.help.as_str()));
            all += &renderer.render(&[group]);
            all += "\n\n";
        }
        let count = match self.items.len() {
            1 => "1 error".to_string(),
            n => format!("{n} errors"),
        };
        all + &format!("{}: {count}\n", self.name)
    }

    /// Adds some lines with marks to a report. Of a single long line only the part around the first mark is shown.
    fn picture<'a>(
        &'a self,
        group: Group<'a>,
        lines: &Lines,
        shown: RangeInclusive<usize>,
        place: (usize, usize),
        marks: &[(AnnotationKind, &Range<usize>, Option<&'a str>)],
    ) -> Group<'a> {
        let mut window = lines.range(*shown.start()).start..lines.range(*shown.end()).end;
        window.end -= usize::from(self.text[window.clone()].ends_with('\r'));
        let long = shown.start() == shown.end() && window.len() > LONGEST_LINE;
        if long {
            let mut start = marks[0].1.start.saturating_sub(LONGEST_LINE / 4).max(window.start);
            let mut end = (start + LONGEST_LINE).min(window.end);
            while !self.text.is_char_boundary(start) {
                start -= 1;
            }
            while !self.text.is_char_boundary(end) {
                end += 1;
            }
            window = start..end;
        }
        let mut picture = Snippet::source(&self.text[window.clone()]).line_start(*shown.start());
        for (kind, span, label) in marks {
            let within = |at: usize| at.clamp(window.start, window.end) - window.start;
            picture = picture.annotation(kind.span(within(span.start)..within(span.end)).label(*label));
        }
        if long {
            // the picture starts within the line, so it cannot tell the column
            let (line, column) = place;
            return group.element(Origin::path(self.name.as_str()).line(line).char_column(column)).element(picture);
        }
        group.element(picture.path(self.name.as_str()))
    }
}

impl fmt::Display for Diagnostics {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.render(false))
    }
}

impl std::error::Error for Diagnostics {}

/// Where the lines of a text start.
struct Lines {
    starts: Vec<usize>,
    len: usize,
    /// Lines before the text.
    before: usize,
}

impl Lines {
    fn of(text: &str, before: usize) -> Lines {
        let breaks = text.bytes().enumerate().filter(|(_, byte)| *byte == b'\n').map(|(at, _)| at + 1);
        Lines { starts: [0].into_iter().chain(breaks).collect(), len: text.len(), before }
    }

    /// Bytes of a line (from 1) without its line break.
    fn range(&self, line: usize) -> Range<usize> {
        let line = line - self.before;
        let end = self.starts.get(line).map_or(self.len, |next| next - 1);
        self.starts[line - 1]..end
    }

    /// The number of the line that holds this byte.
    fn line(&self, at: usize) -> usize {
        self.before + self.starts.partition_point(|start| *start <= at)
    }

    fn place(&self, text: &str, at: usize) -> (usize, usize) {
        let line = self.line(at);
        let before = &text[self.range(line).start..at];
        (line, before.trim_start_matches('\u{feff}').chars().count() + 1)
    }

    /// The part of a span in its first line, moved to letters' borders and within the text.
    fn shown(&self, text: &str, span: Range<usize>) -> Range<usize> {
        let floor = |mut at: usize| {
            at = at.min(text.len());
            while !text.is_char_boundary(at) {
                at -= 1;
            }
            at
        };
        let start = floor(span.start);
        // a place behind the last line break is shown at the end of the last line that holds something
        let end_of_line = self.range(self.line(start)).end;
        start..floor(span.end).clamp(start, end_of_line.max(start))
    }
}
