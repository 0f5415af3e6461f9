//! Figures of a data sheet, found by the search for a limit: set pulse of a latch, setup and hold of a flip-flop. All delays
//! are one unit of 1 ns; the model of the gates stands beside every figure.

use stillgate::limit::Boundary;

use crate::limits::{NS, search};

/// The value is the shortest that passes, to 1 fs.
fn shortest(fs: i64) -> Option<Boundary> {
    Some(Boundary { passes: fs, fails: fs - 1 })
}

/// A latch of two NORs is set by a pulse and looked at once it is at rest.
fn set_pulse(filter: &str) -> Option<Boundary> {
    let text = format!(
        r#"
outputs = []
[inputs]
s = 0
r = 0
look = 0
[initial]
q = 0
[gates]
q = {{ nor = ["r", "qb"], filter = {filter} }}
qb = {{ nor = ["s", "q"], filter = {filter} }}
seen = {{ buf = ["look"] }}
[[steps]]
label = "set"
at = 10
set = {{ s = 1 }}
[[steps]]
label = "let go"
after = 4
set = {{ s = 0 }}
[[steps]]
label = "look"
rest = 10
set = {{ look = 1 }}
expect = {{ q = 1, qb = 0 }}
[rules]
not_judged = "allowed"
[sweep]
samples = 1
"#
    );
    let report = search(&text, &["pulse", "s"], 0, 5);
    assert!(report.alike);
    report.limit
}

/// Inertial: above 1 unit (at 1 unit the tie oscillates); transport: from 2 units on, the loop delay [computed; the textbook
/// minimum is the sum of both gate delays, from memory].
#[test]
fn nor_latch_set_pulse_of_inertial_and_transport_gates() {
    assert_eq!(set_pulse("\"inertial\""), shortest(NS + 1));
    assert_eq!(set_pulse("\"transport\""), shortest(2 * NS));
}

/// Reject limit r: as transport, the pulse of width w circulates with a gap of 2 - w; a gap of r or less is swallowed, and
/// the latch stays set. So from 2 - r on, r of 1/4 and 4/10 of a unit [computed by hand].
#[test]
fn nor_latch_set_pulse_of_gates_with_a_reject_limit() {
    assert_eq!(set_pulse("{ reject = 0.4 }"), shortest(1_600_000));
    assert_eq!(set_pulse("{ reject = 0.25 }"), shortest(1_750_000));
}

/// Involution, rise and fall of one unit: the pulse that circulates for ever has width and gap δ(0), since then T = 0 for
/// every change; shorter ones die out, longer ones fill the loop. Which width of the set pulse leads there is found by
/// following the changes of both gates by the formula of the channel (4.2 to 4.4 of the published model, from memory) in
/// floating point: the latch is set if a gap vanishes, and not if a pulse does.
#[test]
fn nor_latch_set_pulse_of_involution_gates() {
    for tau in [0.3, 0.5, 1.0] {
        let found = set_pulse(&format!("{{ involution = {{ tau = {tau} }} }}")).unwrap();
        let (mut low, mut high) = (0.0, 2.0);
        for _ in 0..60 {
            let width = (low + high) / 2.0;
            if sets(width, tau) { high = width } else { low = width }
        }
        let expected = (high * NS as f64) as i64;
        assert!((found.passes - expected).abs() <= 25, "tau {tau}: {found:?}, by the formula {expected}");
        assert!(found.passes > NS && found.passes < 2 * NS, "between those of inertial and transport gates");
    }
}

/// Does a set pulse of this width set a latch of two gates with both delays 1?
fn sets(width: f64, tau: f64) -> bool {
    let delay = |since: f64| {
        let inner = 1.0 - (-(since + 1.0) / tau).exp();
        if inner > 0.0 { tau * inner.ln() + 1.0 } else { f64::NEG_INFINITY }
    };
    // last changes of qb and q; the first of both take the full delay
    let (mut qb, mut q) = (1.0, 2.0);
    // qb rises when s falls
    let mut next_qb = width + delay(width - qb);
    for change in 0.. {
        let is_gap = change % 2 == 0;
        if next_qb <= qb {
            // the first pulse of qb vanishes, or a later pulse or gap
            return !is_gap;
        }
        qb = next_qb;
        let next_q = qb + delay(qb - q);
        let after = q + delay(q - qb);
        if after <= qb {
            return is_gap;
        }
        if next_q <= q {
            return !is_gap;
        }
        (next_qb, q) = (after, next_q);
        if change > 10_000 {
            break;
        }
    }
    false
}

/// The edge-triggered flip-flop of six NANDs: D changes to `new` a while before or after the clock rises, and Q is looked at
/// once all is at rest. `lead`: the new value is to be held, `lag`: the old one.
fn flip_flop(filter: &str, new: u8, kind: &str) -> Option<Boundary> {
    let old = 1 - new;
    let wanted = if kind == "lead" { new } else { old };
    let before = 1 - wanted;
    let text = format!(
        r#"
outputs = []
[inputs]
c = 0
d = {old}
look = 0
[initial]
q = {before}
[gates]
n1 = {{ nand = ["n4", "n2"], filter = "{filter}" }}
n2 = {{ nand = ["n1", "c"], filter = "{filter}" }}
n3 = {{ nand = ["n2", "c", "n4"], filter = "{filter}" }}
n4 = {{ nand = ["n3", "d"], filter = "{filter}" }}
q = {{ nand = ["n2", "qb"], filter = "{filter}" }}
qb = {{ nand = ["n3", "q"], filter = "{filter}" }}
seen = {{ buf = ["look"] }}
[[clocks]]
net = "c"
first = 20
period = 900
high = 400
count = 1
[[steps]]
label = "data"
at = 10
set = {{ d = {new} }}
[[steps]]
label = "look"
rest = 10
set = {{ look = 1 }}
expect = {{ q = {wanted}, qb = {before} }}
[rules]
not_judged = "allowed"
[sweep]
samples = 1
"#
    );
    search(&text, &[kind, "data", "c rise 1"], -5, 8).limit
}

/// Inertial gates: setup of a 0 above 1 unit, of a 1 above 0; hold of a 0 above 0, of a 1 above -1 [computed].
#[test]
fn flip_flop_setup_and_hold_of_inertial_gates() {
    assert_eq!(flip_flop("inertial", 0, "lead"), shortest(NS + 1), "setup of a 0");
    assert_eq!(flip_flop("inertial", 1, "lead"), shortest(1), "setup of a 1");
    assert_eq!(flip_flop("inertial", 1, "lag"), shortest(1), "hold of a 0");
    assert_eq!(flip_flop("inertial", 0, "lag"), shortest(-NS + 1), "hold of a 1");
}

/// Transport gates: setup of a 0 from 2 units, of a 1 from 1; hold of a 0 from 1, of a 1 from 0 [computed; the textbook's 2
/// and 1 gate delays, from memory].
#[test]
fn flip_flop_setup_and_hold_of_transport_gates() {
    assert_eq!(flip_flop("transport", 0, "lead"), shortest(2 * NS), "setup of a 0");
    assert_eq!(flip_flop("transport", 1, "lead"), shortest(NS), "setup of a 1");
    assert_eq!(flip_flop("transport", 1, "lag"), shortest(NS), "hold of a 0");
    assert_eq!(flip_flop("transport", 0, "lag"), shortest(0), "hold of a 1");
}
