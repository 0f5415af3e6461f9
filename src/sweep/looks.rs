//! Stopping when sure: the fixed sample numbers at which a sweep looks at its shares, and what it saw there.
//!
//! Who looks several times and stops when the figures please has not the confidence of one look (P. Armitage,
//! C. K. McPherson, B. C. Rowe, "Repeated significance tests on accumulating data", Journal of the Royal Statistical
//! Society A 132 (1969) 235-244, from memory). So the looks are fixed beforehand and share the chance of error among
//! them (Bonferroni's inequality; O. J. Dunn, "Multiple comparisons among means", Journal of the American Statistical
//! Association 56 (1961) 52-64, from memory): an interval then covers its share with 95 % at whichever look the
//! sweep stops.

use std::fmt;
use std::str::FromStr;

use serde::{Deserialize, Serialize};

use super::report::SweepReport;
use crate::findings::Subject;
use crate::scenario::Plan;

/// Samples of the first look, before rounding up to whole boards; each further look has twice as many.
const FIRST: u64 = 1000;

/// How narrow every interval must be: its whole width, from its lower to its upper end.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(try_from = "String", into = "String")]
pub struct Until(String);

/// Why a text is no width.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("`{0}` is no width of an interval; write a number above 0 and below 1, such as 0.001 or 1e-4")]
pub struct UntilError(String);

impl Until {
    /// The width.
    pub fn width(&self) -> f64 {
        self.0.parse().unwrap_or(0.0)
    }
}

impl FromStr for Until {
    type Err = UntilError;

    fn from_str(text: &str) -> Result<Until, UntilError> {
        match text.parse::<f64>() {
            Ok(width) if width > 0.0 && width < 1.0 && text.len() < 40 => Ok(Until(text.to_string())),
            _ => Err(UntilError(text.chars().take(40).collect())),
        }
    }
}

impl TryFrom<String> for Until {
    type Error = UntilError;

    fn try_from(text: String) -> Result<Until, UntilError> {
        text.parse()
    }
}

impl From<Until> for String {
    fn from(until: Until) -> String {
        until.0
    }
}

impl fmt::Display for Until {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.0)
    }
}

/// The sample numbers of all looks: 1000, 2000, 4000, … in whole boards, and all samples of the plan at last.
///
/// ```
/// let plan = stillgate::scenario::Plan { samples: 5000, ..Default::default() };
/// assert_eq!(stillgate::sweep::looks(&plan), [1000, 2000, 4000, 5000]);
/// ```
pub fn looks(plan: &Plan) -> Vec<u64> {
    let mut looks = Vec::new();
    let mut next = FIRST;
    while next < plan.samples {
        let whole = next.div_ceil(plan.tries.max(1)).saturating_mul(plan.tries.max(1));
        if whole < plan.samples && looks.last() != Some(&whole) {
            looks.push(whole);
        }
        next = next.saturating_mul(2);
    }
    looks.push(plan.samples);
    looks
}

/// What one look saw of one finding.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Point {
    /// Samples that were done.
    pub samples: u64,
    /// Under which condition: 0 for the scenario's own delays, else one more than its number.
    pub case: u32,
    /// The finding.
    pub subject: Subject,
    /// Draws that show it, or boards that ever do.
    pub count: u64,
    /// Draws judged, or boards.
    pub of: u64,
}

/// How the shares of a sweep come to rest: each finding from the first look that has it.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Curve {
    /// When it may stop.
    pub until: Until,
    /// Samples of the last look; 0 before the first.
    pub looked: u64,
    /// Did the last look see every interval narrow enough?
    pub sure: bool,
    /// Look by look; within one by condition, worst finding first.
    pub points: Vec<Point>,
}

impl Curve {
    /// Before the first look.
    pub fn new(until: Until) -> Curve {
        Curve { until, looked: 0, sure: false, points: Vec::new() }
    }

    /// Looks at what the samples so far say, under all conditions. The intervals must allow for all looks.
    pub fn look(&mut self, report: &SweepReport) {
        self.looked = report.samples;
        self.sure = widest(report).is_some_and(|width| width <= self.until.width());
        for (case, report) in each(report).enumerate() {
            for finding in report.findings.iter().filter(|it| it.count > 0) {
                let (count, of) = match (finding.interval, &finding.boards) {
                    (Some(_), _) => (finding.count, finding.of),
                    (None, Some(boards)) => (boards.failing, boards.of),
                    (None, None) => continue,
                };
                self.points.push(Point {
                    samples: report.samples,
                    case: case as u32,
                    subject: finding.subject,
                    count,
                    of,
                });
            }
        }
    }
}

fn each(report: &SweepReport) -> impl Iterator<Item = &SweepReport> {
    std::iter::once(report).chain(report.conditions.iter().map(|it| &it.sweep))
}

/// The widest interval of all shares: of findings the two-sided one, of rules that no draw broke from 0 to the upper bound.
/// `None` if there is no share with an interval.
pub(super) fn widest(report: &SweepReport) -> Option<f64> {
    let of_one = |report: &SweepReport| {
        let findings = report.findings.iter().filter_map(|it| {
            let (low, high) = it.interval.or_else(|| it.boards.and_then(|boards| boards.interval))?;
            Some(high - low)
        });
        let bounds = report.rules.iter().filter_map(|it| it.at_most).chain(report.at_most);
        findings.chain(bounds.map(|it| it.share)).max_by(f64::total_cmp)
    };
    each(report).filter_map(of_one).max_by(f64::total_cmp)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn looks_double_in_whole_boards_and_end_with_the_plan() {
        let of = |samples, tries| looks(&Plan { samples, tries, ..Plan::default() });
        assert_eq!(of(10, 1), [10]);
        assert_eq!(of(1000, 1), [1000]);
        assert_eq!(of(1001, 1), [1000, 1001]);
        assert_eq!(of(8000, 7), [1001, 2002, 4004, 8000]);
        assert_eq!(of(9000, 3000), [3000, 6000, 9000]);
        assert_eq!(of((1 << 62) - 1, 1).len(), 54, "1000 times 2 to the power of 52 is below 2^62");
    }

    #[test]
    fn a_width_is_a_number_between_0_and_1() {
        for wrong in ["0", "1", "-0.1", "nan", "inf", "", "wide", "1e-5000"] {
            assert!(wrong.parse::<Until>().is_err(), "{wrong}");
        }
        let until: Until = "1e-4".parse().unwrap();
        assert_eq!((until.width(), until.to_string()), (1e-4, "1e-4".to_string()));
    }
}
