//! Every byte changed, every length cut, lines moved: detected, and never taken for other evidence.

use std::fs::{self, File, OpenOptions};
use std::io::Write;
use std::path::Path;

use proofhouse::event::Event;
use proofhouse::ledger::{Because, Condition, Error, Journal, Torn, salvage, verify};

use super::*;

fn segment(path: &Path, number: u32) -> std::path::PathBuf {
    path.join(format!("segment-{number:06}.jsonl"))
}

/// A ledger with a named torn tail in its middle: segment 1 with a tail, segment 2 that names it.
fn ledger_with_kept_tail(path: &Path) -> Vec<Event> {
    write(path, &history()[..3]);
    OpenOptions::new().append(true).open(segment(path, 1)).unwrap().write_all(b"{\"v\":1,\"seq\":3").unwrap();
    write(path, &history()[3..5]);
    let (events, summary) = read(path);
    assert_eq!((summary.condition, summary.kept_tails.len(), events.len()), (Condition::Clean, 1, 6));
    events
}

/// Reads, and holds what comes out against what went in: nothing but a shorter history, and never called clean.
fn must_be_noticed(path: &Path, truth: &[Event], what: &str) {
    match Reader::open(path) {
        // the marker itself is hit
        Err(Error::Foreign { .. } | Error::Newer { .. }) => {}
        Err(error) => panic!("{what}: {error}"),
        Ok(_) => {
            let (events, summary) = read(path);
            assert_ne!(summary.condition, Condition::Clean, "{what}");
            assert!(truth.starts_with(&events), "{what}: other evidence");
        }
    }
}

#[test]
fn every_changed_byte_is_noticed() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    let truth = ledger_with_kept_tail(&path);
    let mut changes = 0;
    for file in [path.join("ledger.json"), segment(&path, 1), segment(&path, 2)] {
        let whole = fs::read(&file).unwrap();
        for at in 0..whole.len() {
            let was = whole[at];
            for now in [was ^ 1, was ^ 0x20, was ^ 0x80, 0, b'\n', b' ', b'0'] {
                if now == was {
                    continue;
                }
                let mut changed = whole.clone();
                changed[at] = now;
                fs::write(&file, &changed).unwrap();
                must_be_noticed(&path, &truth, &format!("{} byte {at}: {was:#x} to {now:#x}", file.display()));
                changes += 1;
            }
        }
        fs::write(&file, &whole).unwrap();
    }
    println!("{changes} changes");
    assert!(changes > 15_000);
    assert_eq!(verify(&path).unwrap().condition, Condition::Clean);
}

#[test]
fn every_lost_or_inserted_byte_is_noticed() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    let truth = ledger_with_kept_tail(&path);
    for file in [path.join("ledger.json"), segment(&path, 1), segment(&path, 2)] {
        let whole = fs::read(&file).unwrap();
        for at in 0..whole.len() {
            let mut shorter = whole.clone();
            shorter.remove(at);
            fs::write(&file, &shorter).unwrap();
            must_be_noticed(&path, &truth, &format!("{} without byte {at}", file.display()));
            let mut longer = whole.clone();
            longer.insert(at, b'\n');
            fs::write(&file, &longer).unwrap();
            must_be_noticed(&path, &truth, &format!("{} with a newline at {at}", file.display()));
        }
        fs::write(&file, &whole).unwrap();
    }
}

#[test]
fn every_cut_leaves_the_lines_before_it() {
    let scratch = Scratch::new();
    let whole = scratch.at("whole");
    write(&whole, &history());
    let bytes = fs::read(segment(&whole, 1)).unwrap();
    let cut = scratch.at("cut");
    copy(&whole, &cut);
    for length in 0..=bytes.len() {
        fs::write(segment(&cut, 1), &bytes[..length]).unwrap();
        let lines = bytes[..length].iter().filter(|&&b| b == b'\n').count();
        let (events, summary) = read(&cut);
        assert_eq!(events, history()[..lines]);
        let left = length - bytes[..length].iter().rposition(|&b| b == b'\n').map_or(0, |p| p + 1);
        match &summary.condition {
            Condition::Clean => assert_eq!(left, 0),
            Condition::TornTail { tails } => assert!(left > 0 && tails.len() == 1 && tails[0].bytes == left as u64),
            broken => panic!("cut at {length}: {broken}"),
        }
    }
}

/// Cut anywhere, go on, cut anywhere again: what was whole stays, the torn bytes too, and nothing is torn in the end.
#[test]
fn every_cut_can_be_gone_on_from() {
    let scratch = Scratch::new();
    let whole = scratch.at("whole");
    write(&whole, &history()[..2]);
    let bytes = fs::read(segment(&whole, 1)).unwrap();
    for length in 0..=bytes.len() {
        let path = scratch.at("cut");
        copy(&whole, &path);
        fs::write(segment(&path, 1), &bytes[..length]).unwrap();
        let (mut journal, opening) = Journal::open(&path, 9).unwrap();
        let torn = usize::from(!opening.salvaged.is_empty());
        assert_eq!(torn == 0, length == 0 || bytes[length - 1] == b'\n');
        journal.append(&remark("after")).unwrap();
        journal.sync().unwrap();
        drop(journal);
        assert!(fs::read(segment(&path, 1)).unwrap().starts_with(&bytes[..length]), "cut at {length}: touched");
        let (events, summary) = read(&path);
        let lines = bytes[..length].iter().filter(|&&b| b == b'\n').count();
        assert_eq!(events[..lines], history()[..lines]);
        assert_eq!((events.len(), events.last()), (lines + torn + 1, Some(&remark("after"))));
        assert_eq!((summary.condition, summary.kept_tails.len()), (Condition::Clean, torn));
        fs::remove_dir_all(&path).unwrap();
    }
}

/// The start that was to name a torn tail is itself cut off, at every byte of what it writes.
#[test]
fn cut_off_while_going_on() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    ledger_with_kept_tail(&path);
    let second = fs::read(segment(&path, 2)).unwrap();
    let naming = second.iter().position(|&b| b == b'\n').unwrap();
    for length in 0..=naming {
        let again = scratch.at("again");
        copy(&path, &again);
        fs::write(segment(&again, 2), &second[..length]).unwrap();
        let (_, summary) = read(&again);
        let Condition::TornTail { tails } = summary.condition else { panic!("{}", summary.condition) };
        assert_eq!(tails.len(), if length == 0 { 1 } else { 2 });
        write(&again, &history()[3..]);
        let (events, summary) = read(&again);
        assert_eq!((summary.condition, summary.kept_tails), (Condition::Clean, tails));
        assert_eq!(summary.segments, 3);
        assert_eq!((&events[..3], &events[4..]), (&history()[..3], &history()[3..]));
        fs::remove_dir_all(&again).unwrap();
    }
}

fn broken(path: &Path, seq: u64, because: &Because) {
    let summary = verify(path).unwrap();
    match &summary.condition {
        Condition::Broken { seq: at, because: why, .. } => assert_eq!((*at, why), (seq, because)),
        other => panic!("{other}"),
    }
    assert_eq!(summary.lines, seq);
    // nothing is appended to it, and nothing changed by trying
    let before = fs::read(segment(path, 1)).unwrap();
    match Journal::open(path, 1).map(drop) {
        Err(error @ Error::Broken { .. }) => {
            let said = error.to_string();
            assert!(said.contains(&format!("broken at seq {seq}")) && said.contains("ledger salvage"), "{said}");
        }
        other => panic!("{other:?}"),
    }
    assert_eq!(fs::read(segment(path, 1)).unwrap(), before);
}

#[test]
fn lines_and_segments_that_were_moved_are_noticed() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    write(&path, &history());
    let whole = fs::read(segment(&path, 1)).unwrap();
    let lines: Vec<&[u8]> = whole.split_inclusive(|&b| b == b'\n').collect();
    let with = |order: &[usize]| order.iter().flat_map(|&n| lines[n].iter().copied()).collect::<Vec<u8>>();
    for (order, seq, because) in
        [(&[0, 1, 3][..], 2, Because::Seq(3)), (&[0, 1, 1, 2], 2, Because::Seq(1)), (&[1, 0], 0, Because::Seq(1))]
    {
        fs::write(segment(&path, 1), with(order)).unwrap();
        broken(&path, seq, &because);
    }
    fs::write(segment(&path, 1), with(&[0, 1])).unwrap();
    fs::write(segment(&path, 3), with(&[2, 3])).unwrap();
    broken(&path, 2, &Because::SegmentMissing);
    fs::write(segment(&path, 2), b"").unwrap();
    assert_eq!(verify(&path).unwrap().lines, 4);
    fs::remove_file(segment(&path, 3)).unwrap();
    fs::create_dir(segment(&path, 3)).unwrap();
    let summary = verify(&path).unwrap();
    assert!(matches!(summary.condition, Condition::Broken { seq: 2, because: Because::Unreadable(_), .. }));
    fs::remove_dir(segment(&path, 3)).unwrap();
    // a hole instead of a file, far longer than memory should be
    File::create(segment(&path, 3)).unwrap().set_len(1 << 40).unwrap();
    broken(&path, 2, &Because::SegmentTooLong);
}

#[test]
fn kept_tails_must_be_there_and_be_named() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    ledger_with_kept_tail(&path);
    let first = fs::read(segment(&path, 1)).unwrap();
    let lines = first.iter().rposition(|&b| b == b'\n').unwrap() + 1;
    fs::write(segment(&path, 1), &first[..lines]).unwrap();
    broken(&path, 3, &Because::TailGone);
    fs::write(segment(&path, 1), &first[..first.len() - 1]).unwrap();
    broken(&path, 3, &Because::TailNotNamed);

    let other = scratch.at("other");
    write(&other, &history()[..3]);
    let bytes = fs::read(segment(&other, 1)).unwrap();
    let at = bytes[..bytes.len() - 1].iter().rposition(|&b| b == b'\n').unwrap() + 1;
    fs::write(segment(&other, 1), [&bytes[..at], b"{\"v\""].concat()).unwrap();
    fs::write(segment(&other, 2), &bytes[at..]).unwrap();
    broken(&other, 2, &Because::TailNotNamed);
}

#[test]
fn salvage_keeps_the_damaged_one_and_its_hashes() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    let truth = ledger_with_kept_tail(&path);
    let second = fs::read(segment(&path, 2)).unwrap();
    let mut changed = second.clone();
    let at = second.len() - 20;
    changed[at] ^= 1;
    fs::write(segment(&path, 2), &changed).unwrap();
    let (events, summary) = read(&path);
    assert_eq!(events, truth[..5]);

    let target = scratch.at("saved");
    let done = salvage(&path, &target, 9).unwrap();
    assert_eq!(done.from, summary);
    assert_eq!(fs::read(segment(&path, 2)).unwrap(), changed, "the damaged one was touched");
    let (saved, summary) = read(&target);
    assert_eq!((&saved[..5], saved.len()), (&truth[..5], 6));
    assert_eq!((&summary.condition, &summary), (&Condition::Clean, &done.to));
    assert_eq!(summary.kept_tails.len(), 1);
    let Event::Remark(said) = &saved[5] else { panic!() };
    assert!(said.text.contains("broken at seq 5") && said.text.contains("ledger"), "{}", said.text);
    let copied = fs::read(segment(&target, 2)).unwrap();
    assert!(second.starts_with(&copied[..200]), "hashes stay what reports quote");
    write(&target, &[closed(1)]);

    // never over something that is there
    assert!(matches!(salvage(&path, &target, 9), Err(Error::Foreign { .. })));
    fs::create_dir(scratch.at("taken")).unwrap();
    fs::write(scratch.at("taken").join("x"), "").unwrap();
    assert!(matches!(salvage(&path, &scratch.at("taken"), 9), Err(Error::Foreign { .. })));
    assert!(matches!(salvage(&path, &path, 9), Err(Error::Foreign { .. })));
}

#[test]
fn salvage_of_a_torn_or_empty_ledger() {
    let scratch = Scratch::new();
    let path = scratch.at("ledger");
    write(&path, &[]);
    assert_eq!(salvage(&path, &scratch.at("empty"), 9).unwrap().to.lines, 1);
    write(&path, &history());
    let whole = fs::read(segment(&path, 1)).unwrap();
    fs::write(segment(&path, 1), &whole[..whole.len() - 3]).unwrap();
    let done = salvage(&path, &scratch.at("torn"), 9).unwrap();
    assert!(
        matches!(&done.from.condition, Condition::TornTail { tails } if matches!(tails[..], [Torn { segment: 1, .. }]))
    );
    assert_eq!((done.to.lines, done.to.condition), (7, Condition::Clean));
}
