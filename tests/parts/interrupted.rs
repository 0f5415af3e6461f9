//! What is interrupted or killed goes on from what was kept, to the same bytes.

use std::path::{Path, PathBuf};
use std::process::{Child, Stdio};
use std::thread::sleep;
use std::time::{Duration, SystemTime};

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use stillgate::reader::load_part;

use super::{COLD_AND_HOT, PADDLES, command, done, files, folder_with, plan, said, stillgate};

/// The unfinished part in a folder, if there is one.
fn unfinished(folder: &Path) -> Option<PathBuf> {
    let mut all = std::fs::read_dir(folder).ok()?.filter_map(|it| Some(it.ok()?.path()));
    all.find(|it| it.file_name().is_some_and(|name| name.to_string_lossy().starts_with("unfinished-")))
}

/// When the unfinished part was written, if there is one.
fn written(folder: &Path) -> Option<SystemTime> {
    unfinished(folder)?.metadata().ok()?.modified().ok()
}

/// Waits until an unfinished part is written anew, or the program has ended.
fn wait_for_more(folder: &Path, than: Option<SystemTime>, child: &mut Child) {
    while child.try_wait().unwrap().is_none() {
        if written(folder) > than {
            return;
        }
        sleep(Duration::from_millis(2));
    }
}

/// Samples in a part, over all conditions. It must be sound whenever its sweep was killed.
fn kept(file: &Path) -> u64 {
    let loaded = load_part(file).unwrap_or_else(|refusal| panic!("{refusal}"));
    loaded.part.cases.0.iter().map(|case| case.done.count()).sum()
}

/// Sweeps in `out` with these options, killed again and again; then to the end.
fn killed_and_killed_again(at: &Path, options: &[&str], seed: u64) -> String {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let out = at.join("out");
    let (mut kills, mut had) = (0, 0);
    let begin = [&["sweep", "paddles.toml", "--out", "out", "--keep-every", "300"][..], options].concat();
    for _ in 0..5 {
        let begun = unfinished(&out).map(|file| file.display().to_string());
        let arguments = match &begun {
            Some(file) => vec!["sweep", "--continue", file, "--keep-every", "300"],
            None => begin.clone(),
        };
        let before = written(&out);
        let mut child = command(at, &arguments).stdout(Stdio::null()).stderr(Stdio::null()).spawn().unwrap();
        wait_for_more(&out, before, &mut child);
        sleep(Duration::from_millis(rng.random_range(0..40)));
        child.kill().unwrap();
        let ended = child.wait().unwrap();
        let Some(file) = unfinished(&out) else {
            // killed when it had done its work, or it is lost
            let complete = ended.success() || files(&out) == files(&at.join("whole"));
            assert!(complete, "nothing is kept of a killed sweep");
            break;
        };
        kills += 1;
        let has = kept(&file);
        assert!(has >= had && has > 0, "{has} samples are kept, and {had} were before");
        had = has;
    }
    assert!(kills > 0, "the sweep was over before it could be killed");
    match unfinished(&out) {
        Some(file) => done(at, &["sweep", "--continue", &file.display().to_string()]),
        None => done(at, &begin),
    }
}

#[test]
fn a_sweep_that_is_killed_at_any_moment_goes_on_to_the_same_bytes() {
    for (number, text) in
        [format!("{PADDLES}{COLD_AND_HOT}{}", plan(3000, 1)), format!("{PADDLES}{}", plan(7007, 7))].iter().enumerate()
    {
        let folder = folder_with(text);
        let at = folder.path();
        let whole = done(at, &["sweep", "paddles.toml", "--out", "whole", "--threads", "1"]);
        let said = killed_and_killed_again(at, &["--threads", "1"], number as u64);
        assert!(said == whole, "{said}\n{whole}");
        assert!(files(&at.join("out")) == files(&at.join("whole")), "{:?}", files(&at.join("out")).keys());
    }
}

#[test]
fn a_killed_part_goes_on_to_the_same_bytes() {
    let folder = folder_with(&format!("{PADDLES}{}", plan(20_000, 1)));
    let at = folder.path();
    done(at, &["sweep", "paddles.toml", "--part", "2/2", "--out", "whole"]);
    killed_and_killed_again(at, &["--part", "2/2", "--threads", "1"], 3);
    assert!(files(&at.join("out")) == files(&at.join("whole")), "{:?}", files(&at.join("out")).keys());
}

/// Starts a sweep and interrupts it as Ctrl-C does, once it has kept something.
#[cfg(unix)]
fn interrupt(at: &Path, arguments: &[&str], out: &Path) -> std::process::Output {
    let mut child = command(at, arguments).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    wait_for_more(out, None, &mut child);
    let id = child.id().to_string();
    assert!(std::process::Command::new("kill").args(["-INT", &id]).status().unwrap().success());
    child.wait_with_output().unwrap()
}

#[cfg(unix)]
#[test]
fn an_interrupt_keeps_what_is_done_and_says_how_much_it_is() {
    let folder = folder_with(&format!("{PADDLES}{}", plan(15_000, 1)));
    let at = folder.path();
    let whole = done(at, &["sweep", "paddles.toml", "--out", "whole"]);
    let arguments = ["sweep", "paddles.toml", "--out", "out", "--keep-every", "128", "--threads", "1"];
    let output = interrupt(at, &arguments, &at.join("out"));
    assert_eq!(output.status.code(), Some(130), "{}", said(&output));
    let file = unfinished(&at.join("out")).expect("what is done is kept");
    let name = file.file_name().unwrap().to_string_lossy();
    assert_eq!(name, "unfinished-0-14999.stillgate-part");
    let loaded = load_part(&file).unwrap();
    let samples = loaded.part.cases.done().count();
    assert!(samples > 0 && samples < 15_000, "{samples}");
    let told = said(&output);
    let grouped = stillgate::review::grouped(samples);
    assert!(told.contains(&format!("interrupted: {grouped} of 15,000 samples are done")), "{told}");
    assert!(told.contains("--continue out/unfinished-0-14999.stillgate-part"), "{told}");
    // the figures are those of the samples that are there, and the text says so
    let text = String::from_utf8(output.stdout).unwrap();
    assert!(
        text.contains(&format!("Only {grouped} of 15,000 draws were run. Missing: samples {samples} to 14999")),
        "{text}"
    );

    // one way to finish it: what is missing as a part, and both merged
    let (from, count) = (samples.to_string(), (15_000 - samples).to_string());
    done(at, &["sweep", "paddles.toml", "--samples-from", &from, "--count", &count, "--out", "rest"]);
    let rest = format!("rest/part-{samples}-14999.stillgate-part");
    let unfinished_part = file.display().to_string();
    let merged = done(at, &["merge", &rest, &unfinished_part, "--out", "merged"]);
    assert!(merged == whole && files(&at.join("merged")) == files(&at.join("whole")));

    // a new sweep in the same folder says that there is something to go on with
    let output = stillgate(at, &["sweep", "paddles.toml", "--out", "out", "--samples", "15000"]);
    assert!(said(&output).contains("is there already"), "{}", said(&output));
    assert!(file.exists(), "and leaves it alone");

    // the other way; the file is gone once the sweep is whole
    let text = done(&at.join("out"), &["sweep", "--continue", &name]);
    assert!(text == whole);
    assert!(files(&at.join("out")) == files(&at.join("whole")), "{:?}", files(&at.join("out")).keys());
}

#[cfg(unix)]
#[test]
fn an_interrupted_part_says_so_and_goes_on() {
    let folder = folder_with(&format!("{PADDLES}{COLD_AND_HOT}{}", plan(20_000, 1)));
    let at = folder.path();
    let arguments = ["sweep", "paddles.toml", "--samples-from", "10000", "--count", "6000", "--out", "out"];
    let arguments = [&arguments[..], &["--keep-every", "128", "--threads", "1"]].concat();
    let output = interrupt(at, &arguments, &at.join("out"));
    assert_eq!(output.status.code(), Some(130), "{}", said(&output));
    assert!(output.stdout.is_empty() && said(&output).contains("(hot)"), "{}", said(&output));
    let file = unfinished(&at.join("out")).unwrap();
    assert!(file.ends_with("unfinished-10000-15999.stillgate-part"));
    done(at, &["sweep", "--continue", &file.display().to_string()]);
    assert_eq!(files(&at.join("out")).into_keys().collect::<Vec<_>>(), ["part-10000-15999.stillgate-part"]);
    done(at, &["sweep", "paddles.toml", "--samples-from", "10000", "--count", "6000", "--out", "again"]);
    assert!(files(&at.join("out")) == files(&at.join("again")));
}
