//! A file with a good checksum need not hold good figures: whatever it holds, nothing panics.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use serde_json::{Value, json};
use stillgate::sweep::Part;

use super::{COLD_AND_HOT, PADDLES, Read, permit, plan};

/// All places of a document.
fn places(value: &Value, at: &str, into: &mut Vec<String>) {
    into.push(at.to_string());
    match value {
        Value::Array(list) => list.iter().enumerate().for_each(|(i, it)| places(it, &format!("{at}/{i}"), into)),
        Value::Object(all) => all.iter().for_each(|(key, it)| places(it, &format!("{at}/{key}"), into)),
        _ => {}
    }
}

/// Something else in the place of a value.
fn other(value: &Value, rng: &mut ChaCha8Rng) -> Value {
    const NUMBERS: [u64; 12] = [0, 1, 2, 7, 63, 64, 1 << 20, (1 << 32) - 1, 1 << 62, (1 << 63) - 1, 1 << 63, u64::MAX];
    match (value, rng.random_range(0..4)) {
        (Value::Number(_), 0..3) => json!(NUMBERS[rng.random_range(0..NUMBERS.len())]),
        (Value::Number(it), _) => json!(it.as_u64().unwrap_or(0).wrapping_add(1)),
        (Value::Array(list), 0) if !list.is_empty() => {
            let mut list = list.clone();
            list.remove(rng.random_range(0..list.len()));
            Value::Array(list)
        }
        (Value::Array(list), 1) if !list.is_empty() => {
            let mut list = list.clone();
            list.push(list[rng.random_range(0..list.len())].clone());
            Value::Array(list)
        }
        (Value::Array(_), 2) => json!([]),
        (Value::Bool(it), _) => json!(!it),
        (Value::String(it), 0) => json!(it.chars().rev().collect::<String>()),
        _ => Value::Null,
    }
}

#[test]
fn forged_figures_are_refused_or_said_but_never_a_panic() {
    let mut tried = 0;
    let mut refused = 0;
    let mut taken = 0;
    for (text, number) in [
        (format!("{PADDLES}{}", plan(30, 1)), 500),
        (format!("{PADDLES}{COLD_AND_HOT}{}", plan(25, 4)), 300),
        (permit(40), 500),
    ] {
        let read = Read::new(&text);
        let half = read.scenario.plan.samples / 8 * 4;
        let (first, second) = (read.part(0, half), read.part(half, read.scenario.plan.samples));
        let sound = serde_json::to_value(&first).unwrap();
        let mut all = Vec::new();
        places(&sound, "", &mut all);
        let mut rng = ChaCha8Rng::seed_from_u64(17);
        for _ in 0..number {
            let mut forged = sound.clone();
            for _ in 0..rng.random_range(1..3) {
                let at = &all[rng.random_range(0..all.len())];
                if let Some(value) = forged.pointer_mut(at) {
                    *value = other(value, &mut rng);
                }
            }
            if forged == sound {
                continue;
            }
            tried += 1;
            let Ok(part) = serde_json::from_value::<Part>(forged) else {
                refused += 1;
                continue;
            };
            // with a good head, as a forger would write it
            let part = Part::from_bytes(&part.to_bytes()).expect("what can be written can be read");
            match read.merge(&[("forged".into(), part), ("second".into(), second.clone())]) {
                Err(refusals) => {
                    refused += 1;
                    assert!(refusals.iter().all(|it| !it.to_string().is_empty()));
                }
                Ok(whole) => {
                    taken += 1;
                    // a state that no rest can be is found out by the views that check each other
                    let _ = read.said(&whole.cases);
                }
            }
        }
    }
    assert!(refused > tried / 2 && taken > 50, "of {tried} {refused} were refused and {taken} taken");
}
