//! Ledgers that were written once by another program (tests/data/ledgers/make.py) and stay readable for ever.

use std::collections::BTreeMap;
use std::fs;

use proofhouse::event::{Event, How};
use proofhouse::host::Cpu;
use proofhouse::ledger::{Because, Condition, Error, Journal, Scope, Tally, verify};

use super::*;

/// SHA-256 of the last line of `clean` and of its marker, from GNU coreutils' `sha256sum`.
const CLEAN_HEAD: &str = "2b1c4f221b40607298555cc705692ed1ae758afbce40d31c89af511dafdf42e4";
const CLEAN_MARKER: &str = "2e91bddc3e26299c778d00e675c52ac29e4e731f4edcedc02f0eafe138904d44";

#[test]
fn clean_v1() {
    let summary = verify(&data("clean")).unwrap();
    assert_eq!((&summary.condition, summary.lines, summary.segments), (&Condition::Clean, 13, 2));
    let head = summary.head.unwrap();
    assert_eq!((head.seq, head.sha256.to_string().as_str()), (12, CLEAN_HEAD));
    assert_eq!(summary.marker.sha256.to_string(), CLEAN_MARKER);
    assert_eq!(summary.marker.name, "000102030405060708090a0b0c0d0e0f");
    assert_eq!(summary.unknown, BTreeMap::from([("novelty".to_string(), 1)]));
    assert_eq!((summary.first_ms, summary.last_ms), (Some(1_700_000_000_000), Some(1_700_000_090_010)));

    let (tally, _) = Tally::read(&data("clean"), Scope::default()).unwrap();
    let cells: Vec<_> = tally.cells.iter().map(|(k, c)| (k.core, c.runs, c.busy_ns, c.mismatches)).collect();
    assert_eq!(cells, [(0, 80_000, 990_000_000, 0), (1, 80_000, 990_000_000, 1)]);
    assert_eq!(tally.cpus[&Cpu(1)].lost[0].how, How::Signal(4));
    assert!(tally.cpus[&Cpu(1)].findings[0].confirmed);
    assert_eq!((tally.left_out.void, tally.left_out.unknown), (1, 1));
    let text = read(&data("clean")).0.into_iter().find_map(|event| match event {
        Event::Remark(remark) => Some(remark.text),
        _ => None,
    });
    assert_eq!(text.as_deref(), Some("grüße, \"quoted\" \\ and\ttabbed"));
}

#[test]
fn clean_v1_can_be_gone_on_with() {
    let scratch = Scratch::new();
    copy(&data("clean"), &scratch.at("ledger"));
    let (mut journal, opening) = Journal::open(&scratch.at("ledger"), 1).unwrap();
    assert_eq!((opening.next_job, opening.abandoned.len()), (3, 1));
    assert_eq!((opening.abandoned[0].job_id, opening.abandoned[0].slice, opening.abandoned[0].cpu), (2, 2, Cpu(1)));
    assert_eq!(journal.record(&Event::Lost(opening.abandoned[0].clone())).unwrap(), 13);
    drop(journal);
    assert_eq!(verify(&scratch.at("ledger")).unwrap().lines, 14);
}

#[test]
fn torn_and_salvaged_v1() {
    let summary = verify(&data("torn")).unwrap();
    assert_eq!(summary.lines, 12);
    assert_eq!(summary.condition.to_string(), "torn tail: 100 bytes in segment-000002.jsonl from byte 1185");
    let json = serde_json::to_value(&summary).unwrap();
    assert_eq!(json["condition"]["state"], "torn_tail");
    assert_eq!(json["condition"]["tails"][0]["bytes"], 100);
    let summary = verify(&data("salvaged")).unwrap();
    assert_eq!((summary.condition, summary.lines), (Condition::Clean, 14));
    let kept: Vec<_> = summary.kept_tails.iter().map(|t| (t.segment, t.bytes)).collect();
    assert_eq!(kept, [(1, 100), (2, 4)]);
}

#[test]
fn damaged_v1() {
    let json = serde_json::to_value(verify(&data("broken")).unwrap()).unwrap();
    assert_eq!(json["condition"]["state"], "broken");
    assert_eq!(json["condition"]["because"], "the line says that it is seq 6");
    for (name, seq, because) in [("broken", 5, Because::Seq(6)), ("changed", 3, Because::BodyHash)] {
        let summary = verify(&data(name)).unwrap();
        assert_eq!(summary.lines, seq, "{name}");
        assert!(
            matches!(&summary.condition, Condition::Broken { seq: at, because: why, .. } if *at == seq && *why == because),
            "{name}: {}",
            summary.condition
        );
    }
}

#[test]
fn newer_versions_are_refused_by_name() {
    let scratch = Scratch::new();
    let (marker, line) = (scratch.at("marker"), scratch.at("line"));
    copy(&data("newer-marker"), &marker);
    copy(&data("newer-line"), &line);
    for error in [verify(&marker).unwrap_err(), Journal::open(&marker, 1).map(drop).unwrap_err()] {
        assert!(matches!(error, Error::Newer { .. }), "{error}");
        assert!(error.to_string().contains("proofhouse/ledger/2"), "{error}");
    }
    assert!(!marker.join("ledger.lock").exists(), "written into");
    let summary = verify(&line).unwrap();
    assert_eq!(summary.lines, 13);
    assert!(matches!(summary.condition, Condition::Broken { seq: 13, because: Because::Version(2), .. }));
    let error = Journal::open(&line, 1).map(drop).unwrap_err();
    assert!(matches!(error, Error::Newer { .. }) && error.to_string().contains("line version 2"), "{error}");
}

#[test]
fn folder_of_another_program() {
    let scratch = Scratch::new();
    let path = scratch.at("theirs");
    copy(&data("foreign"), &path);
    for error in [verify(&path).unwrap_err(), Journal::open(&path, 1).map(drop).unwrap_err()] {
        assert!(matches!(error, Error::Foreign { .. }) && error.to_string().contains("notes.txt"), "{error}");
    }
    assert_eq!(fs::read_dir(&path).unwrap().count(), 1, "written into");
}
