//! How much room a text takes in a picture, and where labels go so that they do not overlap.
//!
//! No font is read: widths are estimates on the wide side, in the proportions of common sans-serif fonts, so that text
//! that fits by this measure fits in practice and files are the same on every machine.

/// The width of a letter, in units of the font size.
fn em(letter: char) -> f64 {
    match letter {
        'i' | 'j' | 'l' | '\'' | '|' | '.' | ',' | ':' | ';' | ' ' | '!' => 0.34,
        'f' | 't' | 'r' | '(' | ')' | '[' | ']' | '-' | '/' => 0.42,
        '_' => 0.52,
        'm' | 'w' | 'M' | 'W' | '@' | '%' | '…' => 1.0,
        '→' | '↑' | '↓' | '=' => 0.86,
        'A'..='Z' => 0.73,
        _ if letter.is_ascii() => 0.64,
        _ if letter as u32 >= 0x1100 => 1.06,
        _ => 0.72,
    }
}

/// The width of a text at a font size, in pixels.
pub(super) fn width(text: &str, size: f64) -> f64 {
    text.chars().map(em).sum::<f64>() * size
}

/// The text, or its beginning and an ellipsis, no wider than `room` pixels. `None` if it was left whole.
pub(super) fn cut_end(text: &str, size: f64, room: f64) -> Option<String> {
    if width(text, size) <= room {
        return None;
    }
    let mut used = em('…') * size;
    let mut kept: String = text
        .chars()
        .take_while(|letter| {
            used += em(*letter) * size;
            used <= room
        })
        .collect();
    kept.truncate(kept.trim_end_matches([' ', ',', ':', ';']).len());
    Some(kept + "…")
}

/// As [`cut_end`], but the middle is left out: the ends of net names tell them apart.
pub(super) fn cut_middle(text: &str, size: f64, room: f64) -> Option<String> {
    if width(text, size) <= room {
        return None;
    }
    let letters: Vec<char> = text.chars().collect();
    let mut used = em('…') * size;
    let (mut head, mut tail) = (0, letters.len());
    while head < tail {
        let from_head = head + tail <= letters.len();
        let next = if from_head { letters[head] } else { letters[tail - 1] };
        used += em(next) * size;
        if used > room {
            break;
        }
        if from_head { head += 1 } else { tail -= 1 }
    }
    let (first, last): (String, String) = (letters[..head].iter().collect(), letters[tail..].iter().collect());
    Some(format!("{first}…{last}"))
}

/// Rows of labels that must not overlap.
#[derive(Debug)]
pub(super) struct Rows {
    rows: Vec<Vec<(f64, f64)>>,
    most: usize,
}

impl Rows {
    /// No labels yet, and at most this many rows.
    pub fn new(most: usize) -> Rows {
        Rows { rows: Vec::new(), most }
    }

    /// Takes the first row with room from `from` to `to`; `None` if there is none.
    pub fn place(&mut self, from: f64, to: f64) -> Option<usize> {
        let free = |row: &Vec<(f64, f64)>| row.iter().all(|taken| to <= taken.0 || taken.1 <= from);
        let found = self.rows.iter().position(free);
        let row = match found {
            Some(row) => row,
            None if self.rows.len() < self.most => {
                self.rows.push(Vec::new());
                self.rows.len() - 1
            }
            None => return None,
        };
        self.rows[row].push((from, to));
        Some(row)
    }

    /// Rows in use.
    pub fn len(&self) -> usize {
        self.rows.len()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn long_texts_are_cut_to_their_room() {
        assert_eq!(cut_end("short", 12.0, 100.0), None);
        let cut = cut_end("a label that goes on and on", 12.0, 80.0).unwrap();
        assert!(cut.ends_with('…') && width(&cut, 12.0) <= 80.0, "{cut}");
        let long = "n".repeat(190) + "_end[12]";
        let cut = cut_middle(&long, 12.0, 120.0).unwrap();
        assert!(cut.starts_with('n') && cut.ends_with("[12]") && width(&cut, 12.0) <= 120.0, "{cut}");
        assert_eq!(cut_middle("x_y", 12.0, 1.0).unwrap(), "…");
    }

    #[test]
    fn labels_take_the_first_free_row() {
        let mut rows = Rows::new(2);
        assert_eq!(rows.place(0.0, 10.0), Some(0));
        assert_eq!(rows.place(5.0, 15.0), Some(1));
        assert_eq!(rows.place(9.0, 12.0), None);
        assert_eq!(rows.place(10.0, 20.0), Some(0));
    }
}
