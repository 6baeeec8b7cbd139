//! Wrong input: one line that names the value and the remedy, the right exit code, nothing half-written.

use std::os::unix::process::CommandExt;

use nix::sched::{CpuSet, sched_setaffinity};
use nix::unistd::Pid;

use super::running::{Scratch, program, run};

fn refused(args: &[&str], code: i32, words: &[&str]) {
    let output = run(args);
    let text = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(code), "{args:?}: {text}");
    assert_eq!(text.lines().count(), 1, "{args:?}: {text}");
    assert!(output.stdout.is_empty(), "{args:?}");
    for word in words {
        assert!(text.contains(word), "{args:?}: {word:?} is not in {text}");
    }
}

#[test]
fn budgets() {
    let cases = [
        ("60", "90s, 10m"),
        ("1x", "90s, 10m"),
        ("0", "90s, 10m"),
        ("0s", "at least 1s"),
        ("10 years", "7 days"),
        ("-5s", "90s, 10m"),
        ("", "90s, 10m"),
        ("99999999999999999999s", "90s, 10m"),
    ];
    for (budget, remedy) in cases {
        refused(&["window", &format!("--budget={budget}")], 2, &[budget, remedy]);
    }
    refused(&["window"], 2, &["--budget"]);
}

#[test]
fn cpus_kernels_variants_and_numbers() {
    let window = |more: &[&str], words: &[&str]| {
        let scratch = Scratch::new("bad-choice");
        let ledger = scratch.ledger();
        let mut args = vec!["window", "--budget", "2s", "--ledger", &ledger];
        args.extend(more);
        refused(&args, 2, words);
        assert!(!std::path::Path::new(&ledger).exists(), "{more:?} wrote a ledger");
    };
    window(&["--cpus", "9999"], &["9999"]);
    window(&["--cpus", "0-4000000000"], &["4000000000"]);
    window(&["--cpus", "zero"], &["zero"]);
    window(&["--cpus", ""], &["--cpus"]);
    window(&["--kernels", "fma.chain65"], &["fma.chain65", "fma.chain64"]);
    window(&["--kernels", "[a"], &["[a"]);
    window(&["--variants", "avx3"], &["avx3", "avx2"]);
    window(&["--confidence", "100%"], &["100%", "0.95"]);
    window(&["--confidence", "NaN"], &["NaN"]);
    window(&["--max-temp", "5000"], &["5000", "150"]);
    window(&["--seed", "-1"], &["-1"]);
    let one = super::running::cpus()[0].to_string();
    window(&["--kernels", "sync.*", "--cpus", &one], &["two cpus"]);
    window(&["--root", "/nonexistent/root"], &["/nonexistent/root"]);
    window(&["--explain", "--root", "/etc/passwd"], &["/etc/passwd"]);
    refused(&["ledger", "coverage", "--overdue", "30"], 2, &["30", "unit"]);
    refused(&["ledger", "coverage", "--kernels", "none.*"], 2, &["none.*"]);
    refused(&["drill", "--kernels", "sync.*"], 2, &["one cpu"]);
    refused(&["drill", "--faults", "0"], 2, &["0"]);
    refused(&["windows"], 2, &["windows"]);
    refused(&["window", "--budget", "2s", "--colour"], 2, &["--colour"]);
}

#[test]
fn ledgers() {
    let scratch = Scratch::new("bad-ledger");
    let file = scratch.path().join("file");
    std::fs::write(&file, "not a ledger").unwrap();
    let file = file.display().to_string();
    let foreign = scratch.path().join("foreign");
    std::fs::create_dir(&foreign).unwrap();
    std::fs::write(foreign.join("notes.txt"), "mine").unwrap();
    let foreign_text = foreign.display().to_string();
    let window = |place: &str, words: &[&str]| refused(&["window", "--budget", "2s", "--ledger", place], 3, words);
    window(&file, &[&file, "folder"]);
    window(&foreign_text, &[&foreign_text, "notes.txt"]);
    // root is stopped by no permission bits, but nobody can make a folder in /proc
    window("/proc/nowhere/ledger", &["/proc/nowhere"]);
    for command in ["show", "verify", "coverage"] {
        refused(&["ledger", command, "--ledger", &file], 3, &[&file]);
        refused(&["ledger", command, "--ledger", "/nonexistent/ledger"], 3, &["/nonexistent/ledger"]);
        refused(&["ledger", command, "--ledger", &foreign_text], 3, &[&foreign_text]);
    }
    let left: Vec<_> = std::fs::read_dir(&foreign).unwrap().flatten().map(|e| e.file_name()).collect();
    assert_eq!(left, ["notes.txt"]);
    assert_eq!(std::fs::read_to_string(&file).unwrap(), "not a ledger");
}

#[test]
fn a_full_disk_ends_the_window_with_what_happened() {
    let scratch = Scratch::new("full");
    let place = scratch.path().join("small");
    std::fs::create_dir(&place).unwrap();
    let mount = |args: &[&str]| std::process::Command::new("mount").args(args).status().is_ok_and(|s| s.success());
    let target = place.display().to_string();
    if !mount(&["-t", "tmpfs", "-o", "size=24k", "tmpfs", &target]) {
        eprintln!("left out: this user may not mount a small file system");
        return;
    }
    let ledger = place.join("ledger").display().to_string();
    let _turn = super::running::alone();
    let output = run(&["window", "--budget", "20s", "--kernels", "integer.*", "--ledger", &ledger]);
    let verified = run(&["ledger", "verify", "--ledger", &ledger]);
    let _ = std::process::Command::new("umount").arg(&target).status();
    let text = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(3), "{text}");
    assert!(text.contains("no space") && text.lines().count() == 1, "{text}");
    assert_eq!(verified.status.code(), Some(0), "what was synced can be read");
}

#[test]
fn a_read_only_file_system_is_named() {
    let scratch = Scratch::new("read-only");
    let place = scratch.path().display().to_string();
    let mount = |args: &[&str]| std::process::Command::new("mount").args(args).status().is_ok_and(|s| s.success());
    if !mount(&["-t", "tmpfs", "-o", "ro", "tmpfs", &place]) {
        eprintln!("left out: this user may not mount a read-only file system");
        return;
    }
    let ledger = scratch.ledger();
    let result = std::panic::catch_unwind(|| {
        refused(&["window", "--budget", "2s", "--ledger", &ledger], 3, &[&ledger, "read-only"]);
    });
    let _ = std::process::Command::new("umount").arg(&place).status();
    if let Err(why) = result {
        std::panic::resume_unwind(why);
    }
}

#[test]
fn cpus_outside_the_affinity_mask() {
    let cpus = super::running::cpus();
    let [first, .., last] = cpus.as_slice() else { return };
    let (first, last) = (*first, last.to_string());
    let mut command = program(&["window", "--budget", "2s", "--cpus", &last, "--ledger", "/nonexistent/never"]);
    let only = move || {
        let mut set = CpuSet::new();
        set.set(first as usize)?;
        sched_setaffinity(Pid::from_raw(0), &set).map_err(std::io::Error::from)
    };
    // SAFETY: between fork and exec the closure makes one system call and allocates nothing
    let output = unsafe { command.pre_exec(only) }.output().unwrap();
    let text = String::from_utf8_lossy(&output.stderr);
    assert_eq!((output.status.code(), text.lines().count()), (Some(2), 1), "{text}");
    assert!(text.contains(&last) && text.contains("mask"), "{text}");
}

#[test]
fn a_second_writer_is_refused_while_the_first_goes_on() {
    let _turn = super::running::alone();
    let scratch = Scratch::new("second");
    let ledger = scratch.ledger();
    let args = ["window", "--budget", "4s", "--kernels", "integer.*", "--ledger", &ledger];
    let first = program(&args).spawn().unwrap();
    std::thread::sleep(std::time::Duration::from_millis(1500));
    refused(&args, 3, &[&ledger, "another process"]);
    assert_eq!(first.wait_with_output().unwrap().status.code(), Some(0));
}
