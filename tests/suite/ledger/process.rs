//! Writers that are killed while they write.

use std::io::{BufRead, BufReader, Read, Write};
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::Duration;

use proofhouse::event::Event;
use proofhouse::ledger::{Condition, Journal};

use super::*;

#[test]
#[ignore = "run by the test below, which kills it"]
fn child_that_writes() {
    let path = std::env::var("PROOFHOUSE_TEST_LEDGER").expect("only to be run by another test");
    let (mut journal, _) = Journal::open(Path::new(&path), 1).unwrap();
    let mut out = std::io::stdout().lock();
    for n in 0u64.. {
        let text = format!("n {n} {}", "x".repeat((n as usize * 7919) % 20_000));
        let seq = journal.append(&remark(&text)).unwrap();
        if n % 3 == 0 {
            journal.sync().unwrap();
            // the parent may believe in the line from here on
            writeln!(out, "synced {seq} {n}").unwrap();
            out.flush().unwrap();
        }
    }
}

#[test]
fn killed_writers_lose_nothing_that_was_synced() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    let mut acknowledged: Vec<(u64, String)> = Vec::new();
    for kill in 0..30u64 {
        let mut child = Command::new(std::env::current_exe().unwrap())
            .args(["--ignored", "--exact", "--nocapture", "ledger::process::child_that_writes"])
            .env("PROOFHOUSE_TEST_LEDGER", &path)
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .unwrap();
        let mut out = BufReader::new(child.stdout.take().unwrap());
        let mut said = String::new();
        while !said.contains("synced") {
            said.clear();
            assert_ne!(out.read_line(&mut said).unwrap(), 0, "the writer ended by itself");
        }
        // any instant will do: the lengths differ by a prime so that they fall into all parts of a write
        std::thread::sleep(Duration::from_micros(kill * 733 % 9_000));
        child.kill().unwrap();
        child.wait().unwrap();
        out.read_to_string(&mut said).unwrap();
        // the last line of the pipe may be cut as well
        for line in said.split_inclusive('\n').filter(|line| line.ends_with('\n')) {
            if let Some((seq, n)) = line.trim().split_once("synced ").and_then(|(_, rest)| rest.split_once(' ')) {
                acknowledged.push((seq.parse().unwrap(), n.to_string()));
            }
        }
        let (events, summary) = read(&path);
        assert!(!matches!(summary.condition, Condition::Broken { .. }), "kill {kill}: {}", summary.condition);
        for (seq, n) in &acknowledged {
            match events.get(*seq as usize) {
                Some(Event::Remark(remark)) => assert!(remark.text.starts_with(&format!("n {n} "))),
                other => panic!("kill {kill}: line {seq} is {other:?}"),
            }
        }
    }
    let (events, summary) = read(&path);
    println!(
        "{} lines, {} acknowledged, {} kept tails, {} segments",
        events.len(),
        acknowledged.len(),
        summary.kept_tails.len(),
        summary.segments
    );
    assert!(acknowledged.len() >= 30);
    drop(Journal::open(&path, 1).unwrap());
    assert_eq!(read(&path).1.condition, Condition::Clean);
}
