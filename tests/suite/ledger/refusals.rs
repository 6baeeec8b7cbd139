//! Places where no ledger can be, each with an error that names the place and a remedy.

use std::fs;
use std::path::Path;
use std::process::Command;

use proofhouse::ledger::{Condition, Error, Journal, verify};

use super::*;

fn refused(path: &Path) -> Error {
    let error = Journal::open(path, 1).map(drop).unwrap_err();
    let said = error.to_string();
    assert!(said.contains(&*path.to_string_lossy()), "names no place: {said}");
    assert!(!said.contains('\n'), "more than a line: {said}");
    error
}

#[test]
fn file_in_the_way() {
    let scratch = Scratch::new();
    let file = scratch.at("file");
    fs::write(&file, "work of somebody").unwrap();
    assert!(matches!(refused(&file), Error::NotAFolder { .. }));
    assert!(matches!(verify(&file), Err(Error::NotAFolder { .. })));
    assert!(matches!(refused(&file.join("below")), Error::NotAFolder { .. }));
    assert_eq!(fs::read_to_string(&file).unwrap(), "work of somebody");
    assert!(matches!(refused(Path::new("")), Error::NotAFolder { .. }), "the current folder was not meant");
}

#[test]
fn nothing_to_read() {
    let scratch = Scratch::new();
    for path in [scratch.at("absent"), scratch.0.clone()] {
        assert!(matches!(verify(&path), Err(Error::NoLedger { .. })));
    }
    assert!(!scratch.at("absent").exists());
}

#[test]
fn markers_of_others() {
    let scratch = Scratch::new();
    for (n, text) in
        ["", "{}", "[]", "{\"schema\":\"other/1\"}", "{\"schema\":\"proofhouse/ledger/1\"}", "\u{0}"].iter().enumerate()
    {
        let path = scratch.at(&n.to_string());
        fs::create_dir(&path).unwrap();
        fs::write(path.join("ledger.json"), text).unwrap();
        assert!(matches!(refused(&path), Error::Foreign { .. }), "{text}");
        assert_eq!(fs::read_dir(&path).unwrap().count(), 1, "written into");
    }
}

#[test]
fn start_that_was_cut_off_before_the_marker_is_gone_on_with() {
    let scratch = Scratch::new();
    fs::write(scratch.at("ledger.lock"), "").unwrap();
    fs::write(scratch.at("ledger.json.new"), "{\"sche").unwrap();
    fs::create_dir(scratch.at("lost+found")).unwrap();
    write(&scratch.0, &history());
    assert_eq!(verify(&scratch.0).unwrap().condition, Condition::Clean);
}

#[test]
fn second_writer_waits_outside() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    let (mut first, _) = Journal::open(&path, 1).unwrap();
    assert!(matches!(refused(&path), Error::Locked { .. }));
    first.record(&opened(1)).unwrap();
    first.sync().unwrap();
    assert_eq!(verify(&path).unwrap().lines, 1, "readers need no lock");
    drop(first);
    drop(Journal::open(&path, 1).unwrap());
}

/// A worker that outlives its supervisor must not keep the next start out.
#[test]
fn lock_is_not_inherited() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    let (journal, _) = Journal::open(&path, 1).unwrap();
    let mut worker = Command::new("sleep").arg("60").spawn().unwrap();
    drop(journal);
    let next = Journal::open(&path, 1).map(drop);
    worker.kill().unwrap();
    worker.wait().unwrap();
    next.unwrap();
}

#[test]
fn many_starts_at_once_make_one_ledger() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    let won: usize = std::thread::scope(|scope| {
        let starts: Vec<_> = (0..8)
            .map(|_| {
                scope.spawn(|| match Journal::open(&path, 1) {
                    Ok((mut journal, _)) => {
                        journal.append(&remark("one")).unwrap();
                        journal.sync().unwrap();
                        1
                    }
                    Err(Error::Locked { .. }) => 0,
                    Err(error) => panic!("{error}"),
                })
            })
            .collect();
        starts.into_iter().map(|start| start.join().unwrap()).sum()
    });
    let summary = verify(&path).unwrap();
    assert!(won >= 1);
    assert_eq!((summary.lines, summary.condition), (won as u64, Condition::Clean));
}

/// The system's own folders take no files, not even from root.
#[test]
fn folders_that_take_no_files() {
    let error = refused(Path::new("/proc/sys/ledger"));
    assert!(matches!(error, Error::Forbidden { .. } | Error::ReadOnly { .. } | Error::Io { .. }), "{error}");
    assert!(error.to_string().starts_with("cannot make the folder /proc/sys/ledger"), "{error}");
}

/// Runs `script` where it may mount; `None`, with the reason printed, where that is not allowed.
fn with_mount(options: &str, body: &str) -> Option<String> {
    let test = std::env::current_exe().unwrap();
    let scratch = Scratch::new();
    let script = format!(
        "mount -t tmpfs -o {options} none '{0}' || exit 77\n{body} '{1}' --ignored --exact --nocapture ",
        scratch.0.display(),
        test.display(),
    );
    let ran = Command::new("unshare")
        .args(["--mount", "--propagation", "private", "sh", "-c"])
        .arg(script.clone() + "ledger::refusals::child_on_a_mount")
        .env("PROOFHOUSE_TEST_MOUNT", &scratch.0)
        .output();
    match ran {
        Ok(out) if out.status.success() => Some(String::from_utf8(out.stdout).unwrap()),
        Ok(out)
            if matches!(out.status.code(), Some(1 | 77))
                && !String::from_utf8_lossy(&out.stdout).contains("panicked") =>
        {
            println!("skipped: cannot mount here: {}", String::from_utf8_lossy(&out.stderr).trim());
            None
        }
        Ok(out) => panic!("{}{}", String::from_utf8_lossy(&out.stdout), String::from_utf8_lossy(&out.stderr)),
        Err(error) => {
            println!("skipped: unshare cannot be run: {error}");
            None
        }
    }
}

#[test]
#[ignore = "run by the two tests below, in a mount namespace of its own"]
fn child_on_a_mount() {
    let Ok(mount) = std::env::var("PROOFHOUSE_TEST_MOUNT") else { panic!("only to be run by another test") };
    let path = Path::new(&mount).join("ledger");
    let opened = Journal::open(&path, 1);
    let (mut journal, _) = match opened {
        Ok(opened) => opened,
        Err(error) => return println!("refused: {error}"),
    };
    let mut acknowledged = 0;
    let error = loop {
        match journal.append(&Event::Slice(slice(1, acknowledged))).and_then(|_| journal.sync()) {
            Ok(()) => acknowledged += 1,
            Err(error) => break error,
        }
    };
    println!("full: {error}");
    assert!(matches!(error, Error::Full { .. }));
    drop(journal);
    let summary = verify(&path).unwrap();
    println!("found: {} lines, {} acknowledged, {}", summary.lines, acknowledged, summary.condition);
    assert!(summary.lines >= acknowledged);
    assert!(matches!(summary.condition, Condition::TornTail { .. } | Condition::Clean));
    // a start on the full disk is refused too, and spoils nothing
    let again =
        Journal::open(&path, 1).map(|(mut journal, _)| journal.append(&remark("x")).and_then(|_| journal.sync()));
    assert!(matches!(again, Err(Error::Full { .. }) | Ok(Err(Error::Full { .. }))), "{again:?}");
    // room again
    fs::remove_file(Path::new(&mount).join("ballast")).unwrap();
    let (mut journal, _) = Journal::open(&path, 1).unwrap();
    journal.append(&remark("room again")).unwrap();
    journal.sync().unwrap();
    drop(journal);
    let after = verify(&path).unwrap();
    assert_eq!(after.condition, Condition::Clean);
    assert!(after.lines > summary.lines);
    println!("went on");
}

#[test]
fn full_disk() {
    let ballast = "head -c 32768 /dev/zero > \"$PROOFHOUSE_TEST_MOUNT/ballast\" && ";
    if let Some(said) = with_mount("size=128k", ballast) {
        println!("{said}");
        assert!(said.contains("no space is left; free some") && said.contains("went on"), "{said}");
    }
}

#[test]
fn read_only_disk() {
    if let Some(said) = with_mount("ro", "") {
        assert!(said.contains("the file system is read-only; give a folder"), "{said}");
    }
}
