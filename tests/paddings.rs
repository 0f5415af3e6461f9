//! Delays to add: the least that do, shown by proofs; and none where none can.

use stillgate::circuit::WireId;
use stillgate::proof::{Call, PaddingEnd};
use stillgate::reader;
use stillgate::scenario::{Padded, Scenario};
use stillgate::time::Span;

use crate::bounded::{latch_text, read};
use crate::races::{claim, proof, selector};

fn padded(scenario: &Scenario, pads: &[(Padded, Span)], less: u64) -> Scenario {
    let mut delays = scenario.delays.as_ref().clone();
    for (place, pad) in pads {
        let pad = Span::from_fs(pad.fs() - less);
        let edges = match place {
            Padded::Gate(gate) => &mut delays.gate[gate.index()],
            Padded::Wire(wire) => &mut delays.wire[wire.index()],
        };
        for range in edges {
            *range = stillgate::delay::DelayRange { min: range.min + pad, typ: range.typ + pad, max: range.max + pad };
        }
    }
    Scenario { delays: delays.into(), ..scenario.clone() }
}

/// The wire of the selector's direct way has to make up for 3 and 1 fs more, as a pulse just as long as its gate is slow still passes;
/// 1 fs it has. That much, and not 1 fs less.
#[test]
fn padding_of_a_selector() {
    for (allow, wire) in [("\"a -> ab\"", true), ("\"ab\"", false), ("\"ab\", \"ac\", \"na\"", false)] {
        let scenario = selector("\"1 fs\"", &format!("[padding]\nallow = [{allow}]"));
        let (_, told) = proof(&scenario, false, true);
        let padding = told.padding.unwrap();
        assert_eq!(padding.end, PaddingEnd::Found, "{allow}");
        assert!(!padding.cut);
        let [(place, pad)] = padding.pads[..] else { panic!("{allow}: {:?}", padding.pads) };
        let ab = scenario.circuit.driver(scenario.circuit.net("ab").unwrap()).unwrap();
        assert_eq!(place, if wire { Padded::Wire(WireId(0)) } else { Padded::Gate(ab) });
        assert_eq!(pad, Span::from_fs(3_000_000));
        for (less, call) in [(0, Call::Proved), (1, Call::Refuted)] {
            let other = padded(&scenario, &padding.pads, less);
            let (asked, told) = proof(&other, false, false);
            assert_eq!(claim(&other, &asked, &told, "glitch_free", 1, Some("y")).call, call, "{allow} less {less} fs");
        }
    }
}

/// Without a list the watched gate itself is not padded; with it and nothing else, it can be: it then swallows the pulse.
#[test]
fn what_may_be_padded() {
    let scenario = selector("\"1 fs\"", "");
    let names: Vec<Padded> = scenario.paddable();
    assert_eq!(names.len(), 4, "three gates and a wire: {names:?}");
    let (_, told) = proof(&scenario, false, true);
    let padding = told.padding.unwrap();
    assert_eq!((padding.end, padding.pads.len()), (PaddingEnd::Found, 1));
    // only delay that makes it worse
    let scenario = selector("\"1 fs\"", "[padding]\nallow = [\"na\", \"ac\"]");
    let (_, told) = proof(&scenario, false, true);
    let padding = told.padding.unwrap();
    assert!(matches!(padding.end, PaddingEnd::Impossible(_)), "{padding:?}");
    let scenario = selector("\"1 fs\"", "[padding]\nallow = []");
    let (_, told) = proof(&scenario, false, true);
    assert!(matches!(told.padding.unwrap().end, PaddingEnd::Impossible(_)));
    let proved = read(&latch_text("[4, 6]", "[7, 9]"));
    assert_eq!(proof(&proved, false, true).1.padding.unwrap().end, PaddingEnd::NotNeeded);
}

/// A race between two gates is cured by slowing either: by as much as its ranges overlap, and one tick more, as equal delays
/// still are a tie.
#[test]
fn padding_of_a_latch() {
    let text = format!(
        "{}[padding]\nallow = [\"q\", \"qn\"]\n[rules]\noscillation = \"allowed\"\nglitch_free = []\n",
        latch_text("[4, 8]", "[5, 9]")
    );
    let scenario = read(&text);
    let (_, told) = proof(&scenario, false, true);
    let padding = told.padding.unwrap();
    assert_eq!(padding.end, PaddingEnd::Found, "{padding:?}");
    // qn last: 8 against 5
    let qn = scenario.circuit.driver(scenario.circuit.net("qn").unwrap()).unwrap();
    assert_eq!(padding.pads, [(Padded::Gate(qn), Span::from_fs(3_000_001))]);
}

/// Names in `[padding]` are checked, each fault with its place and a remedy.
#[test]
fn names_are_checked() {
    let fault = |allow: &str| {
        let text = format!("{}[padding]\nallow = [{allow}]\n", latch_text("[4, 8]", "[5, 9]"));
        let faults = reader::read(&text, "t").unwrap_err();
        (faults.items()[0].message.clone(), faults.items()[0].help.clone())
    };
    assert_eq!(fault("\"qm\"").0, "there is no net `qm`");
    assert!(fault("\"r\"").0.contains("is an input and has no delay"));
    let (message, help) = fault("\"r -> q\"");
    assert!(message.contains("no wire from `r` to `q`") && help.contains("wires = { r"), "{message} {help}");
    assert!(fault("\"q\", \"q\"").0.contains("allowed twice"));
    assert_eq!(fault("\"q -> zz\"").0, "there is no net `zz`");
}
