//! What is no part, or no part of this sweep, is named and refused, with exit code 2 and nothing written.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::sweep::{Damage, FORMAT, Part};

use super::{COLD_AND_HOT, PADDLES, Read, done, files, folder_with, plan, said, stillgate};

#[test]
fn every_truncation_and_every_flipped_bit_is_refused() {
    let read = Read::new(&format!("{PADDLES}{}", plan(40, 1)));
    let bytes = read.part(0, 40).to_bytes();
    assert!(Part::from_bytes(&bytes).is_ok());
    let mut rng = ChaCha8Rng::seed_from_u64(8);
    for length in 0..bytes.len() {
        // all of the head, and a part of the rest
        if length < 200 || bytes.len() - length < 50 || rng.random_bool(0.05) {
            let refused = Part::from_bytes(&bytes[..length]);
            assert!(refused.is_err(), "the first {length} of {} bytes are taken for a part", bytes.len());
            assert!(length < 150 || matches!(refused, Err(Damage::Truncated { .. })), "{length}: {refused:?}");
        }
    }
    for at in 0..bytes.len() {
        let mut flipped = bytes.clone();
        flipped[at] ^= 1 << rng.random_range(0..8);
        if at < 200 || rng.random_bool(0.2) {
            assert!(Part::from_bytes(&flipped).is_err(), "a flipped bit in byte {at} is not seen");
        }
    }
    for at in 0..130 {
        for bit in 0..8 {
            let mut flipped = bytes.clone();
            flipped[at] ^= 1 << bit;
            assert!(Part::from_bytes(&flipped).is_err(), "bit {bit} of byte {at}");
        }
    }
    let longer = [&bytes[..], b"\n"].concat();
    assert!(matches!(Part::from_bytes(&longer), Err(Damage::Damaged(_))));
    for noise in 0..300 {
        let bytes: Vec<u8> = (0..noise).map(|_| rng.random()).collect();
        assert!(Part::from_bytes(&bytes).is_err());
    }
}

#[test]
fn huge_numbers_in_a_head_ask_for_no_memory() {
    let read = Read::new(&format!("{PADDLES}{}", plan(10, 1)));
    let text = String::from_utf8(read.part(0, 10).to_bytes()).unwrap();
    let (first, rest) = text.split_once('\n').unwrap();
    let (_, body) = rest.split_once(" bytes").unwrap();
    for length in ["18446744073709551615", "18446744073709551614", "99999999999999999999999", "-1", "", "1e3"] {
        let forged = format!("{first}\n{length} bytes{body}");
        assert!(Part::from_bytes(forged.as_bytes()).is_err(), "{length}");
    }
    for number in [FORMAT - 1, FORMAT + 1] {
        let other = text.replacen(&format!("format {FORMAT}"), &format!("format {number}"), 1);
        let refused = Part::from_bytes(other.as_bytes());
        let Err(Damage::OtherFormat { found }) = refused else { panic!("another format") };
        assert!(found.contains(&format!("format {number}")), "{found}");
    }
    let other = text.replacen("layout ", "layout 7", 1);
    assert!(matches!(Part::from_bytes(other.as_bytes()), Err(Damage::OtherFormat { .. })));
}

/// A folder with three parts of a sweep of 300 samples, in `p`.
fn three_parts() -> tempfile::TempDir {
    let folder = folder_with(&format!("{PADDLES}{COLD_AND_HOT}{}", plan(300, 1)));
    for part in ["1/3", "2/3", "3/3"] {
        done(folder.path(), &["sweep", "paddles.toml", "--part", part, "--out", "p"]);
    }
    folder
}

const PARTS: [&str; 3] =
    ["p/part-0-99.stillgate-part", "p/part-100-199.stillgate-part", "p/part-200-299.stillgate-part"];

/// Merges these files into `out`, which must be refused with all of these words.
fn refused(folder: &std::path::Path, parts: &[&str], words: &[&str]) {
    let arguments = [&["merge", "--out", "out"][..], parts].concat();
    let output = stillgate(folder, &arguments);
    let told = said(&output);
    assert_eq!(output.status.code(), Some(2), "{parts:?}: {told}");
    assert!(output.stdout.is_empty() && !folder.join("out").exists(), "{parts:?} left something");
    for word in words {
        assert!(told.contains(word), "{parts:?}: no `{word}` in {told}");
    }
}

#[test]
fn damaged_foreign_overlapping_and_missing_parts_are_named() {
    let folder = three_parts();
    let at = folder.path();
    let [one, two, three] = PARTS;
    refused(
        at,
        &[one, three],
        &["no part has samples 100 to 199 (100 samples)", "--samples-from 100 --count 100", "--allow-gaps"],
    );
    refused(at, &[one, two, three, two], &["p/part-100-199", "both have samples 100 to 199", "leave one out"]);

    let bytes = std::fs::read(at.join(two)).unwrap();
    std::fs::write(at.join("short"), &bytes[..bytes.len() - 1000]).unwrap();
    refused(at, &[one, "short", three], &["short: truncated", "copy it again"]);
    let mut flipped = bytes.clone();
    flipped[bytes.len() / 2] ^= 4;
    std::fs::write(at.join("flipped"), &flipped).unwrap();
    refused(
        at,
        &[one, "flipped", three, "short"],
        &["flipped: damaged", "checksum", "short: truncated", "nothing was written"],
    );
    refused(at, &["flipped"], &["flipped: damaged"]);
    refused(at, &[one, "paddles.toml"], &["paddles.toml: not a part of a sweep"]);
    refused(at, &[one, "p"], &["p: this is a folder"]);
    refused(at, &["none", one, two], &["none: this file cannot be read"]);
    std::fs::write(at.join("empty"), "").unwrap();
    refused(at, &["empty"], &["empty: not a part"]);
    let newer = String::from_utf8(bytes).unwrap().replacen(&format!("format {FORMAT},"), "format 99,", 1);
    std::fs::write(at.join("newer"), newer).unwrap();
    refused(at, &[one, "newer", three], &["newer: of another version of the program", "format 99"]);

    let foreign = |name: &str, scenario: &str, options: &[&str]| {
        let arguments = [&["sweep", scenario, "--samples-from", "100", "--count", "100", "--out", name][..], options];
        done(at, &arguments.concat());
        format!("{name}/part-100-199.stillgate-part")
    };
    for (options, what) in [
        (&["--seed", "2"][..], "seed"),
        (&["--samples", "301"], "number of samples"),
        (&["--draw", "triangular"], "draw"),
        (&["--samples", "301", "--seed", "9"], "number of samples, seed"),
    ] {
        let part = foreign(&format!("f{}", options.join("")), "paddles.toml", options);
        refused(at, &[one, &part, three], &[&part, one, "different sweeps", &format!("not the same {what};")]);
    }
    let other = format!("{PADDLES}{COLD_AND_HOT}{}# a word more\n", plan(300, 1));
    std::fs::write(at.join("other.toml"), &other).unwrap();
    let part = foreign("text", "other.toml", &[]);
    refused(at, &[one, two, three, &part], &[&part, "scenario text"]);
    std::fs::write(at.join("tries.toml"), other.replace("tries = 1", "tries = 2")).unwrap();
    let part = foreign("tries", "tries.toml", &[]);
    refused(at, &[&part, two], &["scenario text, tries"]);

    // and all is well with the right ones
    done(at, &[&["merge", "--out", "out"][..], &PARTS].concat());
}

#[test]
fn bad_command_lines_say_the_remedy_and_leave_nothing() {
    let folder = folder_with(&format!("{PADDLES}{}", plan(100, 8)));
    let at = folder.path();
    for (arguments, remedy) in [
        (&["--samples-from", "4", "--count", "8"][..], "--samples-from 0 --count 16"),
        (&["--samples-from", "0", "--count", "12"], "--samples-from 0 --count 16"),
        (&["--samples-from", "96", "--count", "8"], "samples 0 to 99 only"),
        (&["--samples-from", "8"], "--count"),
        (&["--count", "8"], "--samples-from"),
        (&["--part", "0/3"], "K is 1 to N"),
        (&["--part", "3"], "as in 3/16"),
        (&["--part", "1/14"], "only 13 boards"),
        (&["--part", "1/2", "--samples-from", "0", "--count", "8"], "cannot be used with"),
        (&["--part", "1/2", "--strict"], "cannot be used with"),
        (&["--part", "1/2", "--until", "0.1"], "cannot be used with"),
        (&["--until", "0"], "such as 0.001"),
        (&["--until", "0.1", "--draw", "corners"], "not independent draws"),
        (&["--until", "0.1", "--draw", "hypercube"], "not independent draws"),
        (&["--keep-every", "0"], "not in 1.."),
    ] {
        let arguments = [&["sweep", "paddles.toml", "--out", "out"][..], arguments].concat();
        let output = stillgate(at, &arguments);
        let told = said(&output);
        assert_eq!(output.status.code(), Some(2), "{arguments:?}: {told}");
        assert!(told.contains(remedy), "{arguments:?}: {told}");
        assert_eq!(files(at).len(), 1, "{arguments:?} left a file");
    }
    for arguments in [&["sweep", "--continue", "paddles.toml"][..], &["sweep", "--continue", "none"], &["merge"]] {
        assert_eq!(stillgate(at, arguments).status.code(), Some(2), "{arguments:?}");
    }
    // the last board may be cut short, and is then the end of a part
    done(at, &["sweep", "paddles.toml", "--samples-from", "96", "--count", "4", "--out", "p"]);
    done(at, &["sweep", "paddles.toml", "--samples-from", "0", "--count", "96", "--out", "p"]);
    done(at, &["merge", "p/part-0-95.stillgate-part", "p/part-96-99.stillgate-part"]);
}
