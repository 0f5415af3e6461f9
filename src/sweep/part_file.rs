//! The file of a part: two lines of text and one JSON object. The format is described in `docs/parts.md`.

use std::fmt::Write;

use sha2::{Digest, Sha256};

use super::part::Part;
use crate::instance::LAYOUT;

/// The number of the format. It counts up with everything that changes what a part holds, what its figures mean, or what
/// a sample is judged to be: parts of different formats cannot be put together.
pub const FORMAT: u32 = 4;

/// The beginning of the first line.
const MAGIC: &str = "stillgate part, ";

/// Why bytes are no part.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum Damage {
    /// They do not begin like one.
    #[error("not a part of a sweep: it does not begin with `stillgate part`")]
    NotAPart,
    /// They are of a program that counts otherwise.
    #[error(
        "of another version of the program: it has {found}; this program has format {FORMAT}, layout {LAYOUT} of the draws"
    )]
    OtherFormat {
        /// What the first line says.
        found: String,
    },
    /// The end is missing.
    #[error("truncated: {found} of {wanted} bytes are there")]
    Truncated {
        /// Bytes behind the first two lines.
        found: usize,
        /// Bytes that there should be.
        wanted: usize,
    },
    /// The bytes are not those that were written.
    #[error("damaged: {0}")]
    Damaged(&'static str),
}

impl Damage {
    /// What would help.
    pub const fn help(&self) -> &'static str {
        match self {
            Damage::NotAPart => "name files that `stillgate sweep` wrote with --samples-from, --part or --keep-every",
            Damage::OtherFormat { .. } => "sweep its samples again with this program",
            Damage::Truncated { .. } | Damage::Damaged(_) => {
                "copy it again from where it was made, or sweep its samples again"
            }
        }
    }
}

impl Part {
    /// The bytes of its file.
    pub fn to_bytes(&self) -> Vec<u8> {
        let body = serde_json::to_string(self).expect("a part has text, integers and lists alone");
        let mut file = head(&body);
        file.push_str(&body);
        file.push('\n');
        file.into_bytes()
    }

    /// The part in the bytes of a file. Whether its figures can be is told by [`Part::fits`].
    ///
    /// Errors: the bytes are not, to the last one, what [`Part::to_bytes`] wrote.
    pub fn from_bytes(bytes: &[u8]) -> Result<Part, Damage> {
        let mut lines = bytes.splitn(3, |byte| *byte == b'\n');
        let (first, second) = (lines.next().unwrap_or_default(), lines.next().unwrap_or_default());
        let numbers = first.strip_prefix(MAGIC.as_bytes()).ok_or(Damage::NotAPart)?;
        if numbers != self::numbers().as_bytes() {
            let found = String::from_utf8_lossy(&numbers[..numbers.len().min(60)]);
            let found: String = found.chars().map(|it| if it.is_control() { '?' } else { it }).collect();
            return Err(Damage::OtherFormat { found });
        }
        let rest = lines.next().unwrap_or_default();
        let length = std::str::from_utf8(second).ok().and_then(|line| line.split(' ').next()?.parse::<usize>().ok());
        let wanted = length.ok_or(Damage::Damaged("its second line does not say its length"))?;
        match rest.len().checked_sub(wanted.saturating_add(1)) {
            Some(0) => {}
            Some(_) => return Err(Damage::Damaged("there is more than it says")),
            None => return Err(Damage::Truncated { found: rest.len(), wanted }),
        }
        let body = rest.strip_suffix(b"\n").and_then(|body| std::str::from_utf8(body).ok());
        let body = body.ok_or(Damage::Damaged("it is no text"))?;
        // the head is held against one made anew, so that no byte of it can differ either
        if !bytes.starts_with(head(body).as_bytes()) {
            return Err(Damage::Damaged("its checksum is not that of what it holds"));
        }
        serde_json::from_str(body).map_err(|_| Damage::Damaged("it does not hold the figures of a sweep"))
    }
}

fn numbers() -> String {
    format!("format {FORMAT}, layout {LAYOUT}")
}

/// The first two lines: numbers of format and layout, length and checksum of what follows.
fn head(body: &str) -> String {
    let mut head = format!("{MAGIC}{}\n{} bytes, sha256 ", numbers(), body.len());
    for byte in Sha256::digest(body.as_bytes()) {
        let _ = write!(head, "{byte:02x}");
    }
    head.push('\n');
    head
}
