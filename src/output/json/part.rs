//! What a part of a sweep has.

use std::path::Path;

use serde::Serialize;

use super::parts::OneLine;
use crate::sweep::{Part, Ranges};

#[derive(Serialize)]
struct Document<'a> {
    format: u32,
    file: String,
    title: &'a str,
    samples_asked: u64,
    seed: u64,
    tries: u64,
    draw: &'static str,
    done: Vec<Done<'a>>,
}

#[derive(Serialize)]
struct Done<'a> {
    condition: &'a str,
    samples: u64,
    ranges: OneLine<Vec<[u64; 2]>>,
}

/// First and last number of each range.
pub(super) fn ends(ranges: &Ranges) -> OneLine<Vec<[u64; 2]>> {
    OneLine(ranges.iter().map(|it| [it.start, it.end - 1]).collect())
}

/// The document of a part that was written to a file. `ranges` has the first and the last sample of each range.
pub fn part(part: &Part, file: &Path) -> String {
    let done = part.cases.0.iter().map(|case| Done {
        condition: &case.condition,
        samples: case.done.count(),
        ranges: ends(&case.done),
    });
    super::document(&Document {
        format: super::FORMAT,
        file: file.display().to_string(),
        title: &part.title,
        samples_asked: part.plan.samples,
        seed: part.plan.seed,
        tries: part.plan.tries,
        draw: part.plan.draw.name(),
        done: done.collect(),
    })
}
