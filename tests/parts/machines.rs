//! The recipe for many machines, run on this one.

use std::path::Path;
use std::process::{Command, Stdio};

use super::{COLD_AND_HOT, PADDLES, done, files, folder_with, plan};

fn script() -> String {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("scripts/sweep-part.sh").display().to_string()
}

fn there(program: &str) -> bool {
    let found = Command::new(program).arg("--version").stdout(Stdio::null()).stderr(Stdio::null()).status();
    found.is_ok_and(|status| status.success())
}

/// All parts below a folder.
fn parts(folder: &Path) -> Vec<String> {
    let each = std::fs::read_dir(folder).unwrap().flat_map(|entry| {
        let inner = entry.unwrap().path();
        let names: Vec<String> = files(&inner).into_keys().collect();
        names.into_iter().map(move |name| inner.join(name).display().to_string())
    });
    each.collect()
}

/// Merges what is below `parts` and compares it with one sweep.
fn is_the_whole(at: &Path, options: &[&str], count: usize) {
    let whole = done(at, &[&["sweep", "paddles.toml", "--out", "whole"][..], options].concat());
    let parts = parts(&at.join("parts"));
    assert_eq!(parts.len(), count, "{parts:?}");
    let names = parts.iter().map(String::as_str);
    let arguments: Vec<&str> = ["merge", "--out", "merged"].into_iter().chain(names).collect();
    assert!(done(at, &arguments) == whole);
    assert!(files(&at.join("merged")) == files(&at.join("whole")));
}

#[test]
fn parts_that_run_side_by_side_merge_to_the_bytes_of_one_sweep() {
    let folder = folder_with(&format!("{PADDLES}{COLD_AND_HOT}{}", plan(1500, 1)));
    let at = folder.path();
    let script = script();
    let part = ["paddles.toml", "parts", "6"];
    let options = ["--samples", "1201", "--seed", "3"];
    let mut command = if there("parallel") {
        println!("side by side with GNU parallel");
        let mut command = Command::new("parallel");
        command.args(["--jobs", "2", "--halt", "now,fail=1", &script]).args(part).arg("{}").args(options);
        command.args([":::", "1", "2", "3", "4", "5", "6"]);
        command
    } else {
        // the same jobs, by what every system has
        println!("GNU parallel is not installed (Debian package `parallel`): side by side with xargs -P instead");
        let mut command = Command::new("sh");
        let line = format!("seq 6 | xargs -P 2 -I N '{script}' {} N {}", part.join(" "), options.join(" "));
        command.args(["-c", &line]);
        command
    };
    // GNU parallel notes in the home folder that it was asked to cite itself
    let output = command.current_dir(at).env("HOME", at).env("STILLGATE", env!("CARGO_BIN_EXE_stillgate")).output();
    let output = output.expect("it starts");
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    is_the_whole(at, &options, 6);
}

#[test]
fn a_job_of_an_array_takes_its_index_from_a_variable() {
    let folder = folder_with(&format!("{PADDLES}{}", plan(503, 10)));
    let at = folder.path();
    let job = |arguments: &[&str], variables: &[(&str, &str)]| {
        let mut command = Command::new(script());
        command.current_dir(at).args(arguments).env("STILLGATE", env!("CARGO_BIN_EXE_stillgate"));
        command.env_remove("JOB_INDEX").env_remove("FIRST").envs(variables.iter().copied());
        command.output().expect("the script starts")
    };
    let arguments = ["paddles.toml", "parts", "3", "JOB_INDEX"];
    for index in ["0", "1", "2"] {
        let output = job(&arguments, &[("JOB_INDEX", index), ("FIRST", "0")]);
        assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    }
    // a job that is run once more does nothing
    let before = files(&at.join("parts/part-3-of-3"));
    let output = job(&arguments, &[("JOB_INDEX", "3")]);
    assert!(output.status.success() && String::from_utf8_lossy(&output.stdout).contains("there already"));
    assert!(files(&at.join("parts/part-3-of-3")) == before);
    is_the_whole(at, &[], 3);
    // what is wrong with a job is said
    for (arguments, variables) in [
        (&arguments[..], &[][..]),
        (&arguments, &[("JOB_INDEX", "4")]),
        (&["paddles.toml", "parts", "3", "a;b"], &[]),
        (&["paddles.toml"], &[]),
    ] {
        let output = job(arguments, variables);
        assert_eq!(output.status.code(), Some(2), "{arguments:?}");
        assert!(!output.stderr.is_empty());
    }
}

#[test]
fn a_job_that_was_stopped_goes_on_when_it_is_run_again() {
    let folder = folder_with(&format!("{PADDLES}{}", plan(20_000, 1)));
    let at = folder.path();
    let job = || {
        let mut command = Command::new(script());
        command.current_dir(at).args(["paddles.toml", "parts", "1", "1", "--threads", "1"]);
        command.env("STILLGATE", env!("CARGO_BIN_EXE_stillgate")).env("KEEP_EVERY", "500");
        command.stdout(Stdio::null()).stderr(Stdio::null());
        command
    };
    let mut child = job().spawn().unwrap();
    let kept = at.join("parts/part-1-of-1/unfinished-0-19999.stillgate-part");
    while !kept.exists() && child.try_wait().unwrap().is_none() {
        std::thread::sleep(std::time::Duration::from_millis(2));
    }
    child.kill().unwrap();
    child.wait().unwrap();
    assert!(kept.exists(), "it was over too soon");
    assert!(job().status().unwrap().success());
    is_the_whole(at, &[], 1);
}
