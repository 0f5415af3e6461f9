//! All delays of a circuit times one factor: hot or cold, at low or high supply.

use super::{Billionths, DelayModel, DelayRange, Filter};
use crate::time::Span;

impl Billionths {
    /// A plain decimal such as `0.85`, with up to 9 digits behind the point, below 10^9. `None` for anything else.
    ///
    /// ```
    /// use stillgate::delay::Billionths;
    /// assert_eq!(Billionths::parse("0.85"), Some(Billionths(850_000_000)));
    /// assert_eq!(Billionths::parse("1e-1"), None);
    /// assert_eq!(Billionths(1_250_000_000).to_string(), "1.25");
    /// ```
    pub fn parse(text: &str) -> Option<Billionths> {
        let (whole, part) = text.split_once('.').unwrap_or((text, ""));
        let digits = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
        if whole.is_empty() || whole.len() > 9 || part.len() > 9 || !digits(whole) || !digits(part) {
            return None;
        }
        format!("{whole}{part:0<9}").parse().ok().map(Billionths)
    }

    /// This factor of a span, rounded to the nearest fs, half a fs up. `None` from 2^62 fs on.
    pub fn of(self, span: Span) -> Option<Span> {
        let fs = (u128::from(span.fs()) * u128::from(self.0) + 500_000_000) / 1_000_000_000;
        let span = Span::from_fs(u64::try_from(fs).ok()?);
        (span < Span::LIMIT).then_some(span)
    }
}

impl std::fmt::Display for Billionths {
    fn fmt(&self, to: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let (whole, part) = (self.0 / Billionths::ONE.0, self.0 % Billionths::ONE.0);
        let part = format!("{part:09}");
        match part.trim_end_matches('0') {
            "" => write!(to, "{whole}"),
            part => write!(to, "{whole}.{part}"),
        }
    }
}

impl DelayModel {
    /// Every least, typical and greatest delay of gates and wires times a factor, and the reject limits and time constants
    /// of the filters with them, each rounded to the nearest fs. `None` if a delay leaves the span from 1 fs to below
    /// 2^62 fs.
    pub fn scaled(&self, factor: Billionths) -> Option<DelayModel> {
        let span = |span: Span| factor.of(span).filter(|span| *span > Span::ZERO);
        let range = |range: &DelayRange| {
            Some(DelayRange { min: span(range.min)?, typ: span(range.typ)?, max: span(range.max)? })
        };
        let edges = |edges: &[DelayRange; 2]| Some([range(&edges[0])?, range(&edges[1])?]);
        let filter = |filter: &Filter| {
            Some(match filter {
                Filter::Inertial => Filter::Inertial,
                Filter::Transport => Filter::Transport,
                Filter::Reject(limit) => Filter::Reject(span(*limit)?),
                Filter::Involution(tau) => Filter::Involution(span(*tau)?),
            })
        };
        Some(DelayModel {
            gate: self.gate.iter().map(edges).collect::<Option<_>>()?,
            wire: self.wire.iter().map(edges).collect::<Option<_>>()?,
            filter: self.filter.iter().map(filter).collect::<Option<_>>()?,
            ..self.clone()
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn factors_are_exact_and_round_to_the_nearest() {
        let of = |text: &str, fs: u64| Billionths::parse(text).and_then(|it| it.of(Span::from_fs(fs))).map(Span::fs);
        assert_eq!(of("0.8", 6_000_000), Some(4_800_000));
        assert_eq!(of("0.3", 5), Some(2), "1.5 goes up");
        assert_eq!(of("0.3", 4), Some(1), "1.2 goes down");
        assert_eq!(of("0.000000001", 499_999_999), Some(0));
        assert_eq!(of("1", (1 << 62) - 1), Some((1 << 62) - 1));
        assert_eq!(of("1.000000001", (1 << 62) - 1), None, "no longer a delay");
        for bad in ["", ".5", "-1", "1e3", "nan", "0.0000000001", "1_000", "+1", "10000000000"] {
            assert_eq!(Billionths::parse(bad), None, "{bad}");
        }
        for text in ["0.8", "1", "12.000000001", "0"] {
            assert_eq!(Billionths::parse(text).map(|it| it.to_string()).as_deref(), Some(text));
        }
    }
}
