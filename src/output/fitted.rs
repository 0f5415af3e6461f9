//! Texts of a chart that are cut to their room, each with the whole text where a reader points at it.

use crate::output::measure::{cut_end, cut_middle};
use crate::output::words;

/// The texts of one picture that were cut.
#[derive(Default)]
pub(super) struct Fitted {
    /// What is drawn, and the whole.
    cut: Vec<(String, String)>,
}

impl Fitted {
    /// A text no wider than `room` pixels: its beginning, if need be.
    pub fn end(&mut self, text: &str, size: f64, room: f64) -> String {
        self.keep(text, |text| cut_end(text, size, room))
    }

    /// A text no wider than `room` pixels: its beginning and end, if need be.
    pub fn middle(&mut self, text: &str, size: f64, room: f64) -> String {
        self.keep(text, |text| cut_middle(text, size, room))
    }

    fn keep(&mut self, text: &str, cut: impl Fn(&str) -> Option<String>) -> String {
        let whole = words::clean(text).to_string();
        let Some(drawn) = cut(&whole) else { return whole };
        self.cut.push((drawn.clone(), whole));
        drawn
    }

    /// The picture in which each text that was cut has the whole as its title. Texts must have been drawn in the order in
    /// which they were cut if several were cut to the same.
    pub fn titled(self, mut svg: String) -> String {
        let escaped = |text: &str| maud::html! { (text) }.into_string();
        for (drawn, whole) in self.cut {
            // as the backend writes it
            let drawn = escaped(&drawn).replace('\'', "&apos;");
            let end = format!("\n{drawn}\n</text>");
            let titled = format!("\n{drawn}<title>{}</title>\n</text>", escaped(&whole));
            svg = svg.replacen(&end, &titled, 1);
        }
        svg
    }
}
