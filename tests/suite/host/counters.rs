//! Counters of machine checks and memory errors.

use proofhouse::host::counters::{How, Row};
use proofhouse::host::{Counter, Counters, Reading};

use super::hosts::interrupts;
use super::{cpu, hosts};

fn mce(number: u32) -> Counter {
    Counter::Interrupt { row: Row::MachineCheck, cpu: cpu(number) }
}

#[test]
fn columns_are_online_cpus() {
    let counters = Counters::read(&hosts::holes().root());
    // header CPU0 CPU2 CPU3 CPU6, row 0 1 2 3
    let of = |n: u32| counters.values.get(&mce(n)).cloned();
    assert_eq!(
        (of(0), of(2), of(3), of(6)),
        (Some(Reading::Value(0)), Some(Reading::Value(1)), Some(Reading::Value(2)), Some(Reading::Value(3)))
    );
    assert_eq!((of(1), of(4)), (None, None));
    assert_eq!(counters.rows, Reading::Value(vec![Row::MachineCheck, Row::Poll]));
}

#[test]
fn memory_errors_are_counted_by_controller_and_module() {
    let counters = Counters::read(&hosts::server().root());
    let corrected = |place: &str| counters.values.get(&Counter::Corrected { place: place.to_owned() }).cloned();
    assert_eq!(corrected("mc0"), Some(Reading::Value(0)));
    assert_eq!(corrected("mc1"), Some(Reading::Value(3)));
    assert_eq!(corrected("mc1/dimm0"), Some(Reading::Value(3)));
    assert_eq!(counters.controllers, Reading::Value(vec!["mc0".to_owned(), "mc1".to_owned()]));
    assert_eq!(Counters::read(&hosts::single().root()).controllers, Reading::Absent);
}

#[test]
fn nothing_changes_by_itself() {
    let root = hosts::server();
    let (before, after) = (Counters::read(&root.root()), Counters::read(&root.root()));
    assert!(!before.values.is_empty());
    assert_eq!(before.until(&after), []);
}

#[test]
fn a_difference_says_what_rose_fell_vanished_and_appeared() {
    let tree = hosts::server();
    let before = Counters::read(&tree.root());
    let mut rising = [0u64; 15];
    rising[9] = 2;
    let polls = [4u64; 15];
    // cpu 15 went offline; deferred errors are counted since a driver was loaded
    let cpus: Vec<u32> = (0..15).collect();
    let rows: [(&str, &[u64]); 4] = [("THR", &[0; 15]), ("MCE", &rising), ("MCP", &polls), ("TRM", &[1; 15])];
    tree.file("proc/interrupts", interrupts(&cpus, &rows));
    tree.line("sys/devices/system/edac/mc/mc1/ce_count", 1).line("sys/devices/system/edac/mc/mc0/ue_count", 1);
    tree.line("sys/devices/system/edac/mc/mc2/ue_count", 0);
    let changes = before.until(&Counters::read(&tree.root()));
    let how = |counter: &Counter| changes.iter().find(|change| change.counter == *counter).map(|change| change.how);
    assert_eq!(how(&mce(9)), Some(How::Rose { by: 2 }));
    assert_eq!(how(&mce(15)), Some(How::Vanished { before: 0 }));
    assert_eq!(how(&Counter::Corrected { place: "mc1".to_owned() }), Some(How::WentBack { before: 3, after: 1 }));
    assert_eq!(how(&Counter::Uncorrected { place: "mc2".to_owned() }), Some(How::Appeared { after: 0 }));
    assert_eq!(how(&mce(8)), None);
    // the rises that mean an error: not polls, not heat
    let errors: Vec<String> = changes.iter().filter(|c| c.is_error()).map(ToString::to_string).collect();
    assert_eq!(errors, ["MCE interrupts on cpu 9: 2 more", "uncorrected memory errors at mc0: 1 more"]);
    let heat = Counter::Interrupt { row: Row::Thermal, cpu: cpu(3) };
    assert_eq!(how(&heat), Some(How::Rose { by: 1 }));
    let back = changes.iter().find(|change| matches!(change.how, How::WentBack { .. })).expect("one");
    assert!(back.to_string().contains("from 3 to 1"));
}

#[test]
fn short_rows_and_odd_words_are_no_zeros() {
    let tree = hosts::nothing();
    tree.file("proc/interrupts", "  CPU0 CPU1 CPU2\nMCE: 5 -1\nTHR: 99999999999999999999 0 0\nDFR:\nMCE0: 1 1 1\n");
    let counters = Counters::read(&tree.root());
    assert_eq!(counters.values.get(&mce(0)), Some(&Reading::Value(5)));
    assert!(matches!(counters.values.get(&mce(1)), Some(Reading::Unreadable(_))));
    assert_eq!(counters.values.get(&mce(2)), None);
    let threshold = Counter::Interrupt { row: Row::Threshold, cpu: cpu(0) };
    assert!(matches!(counters.values.get(&threshold), Some(Reading::Unreadable(_))));
    assert_eq!(counters.rows, Reading::Value(vec![Row::MachineCheck, Row::Threshold]));
}

#[test]
fn a_file_without_a_header_is_unreadable() {
    for text in ["", "MCE: 1 2\n", "CPU0 CPUx\nMCE: 1 2\n", "CPU0 CPU70000\nMCE: 1 2\n", "\n\n\n"] {
        let tree = hosts::nothing();
        tree.file("proc/interrupts", text);
        let counters = Counters::read(&tree.root());
        assert!(matches!(counters.rows, Reading::Unreadable(_)), "{text:?}");
        assert!(counters.values.is_empty());
    }
    assert_eq!(Counters::read(&hosts::nothing().root()).rows, Reading::Absent);
}

#[test]
fn changes_survive_json() {
    let tree = hosts::server();
    let before = Counters::read(&tree.root());
    tree.line("sys/devices/system/edac/mc/mc0/ue_count", 1);
    let changes = before.until(&Counters::read(&tree.root()));
    let json = serde_json::to_string(&changes).expect("json");
    assert_eq!(json, r#"[{"counter":{"uncorrected":{"place":"mc0"}},"how":{"rose":{"by":1}}}]"#);
    assert_eq!(serde_json::from_str::<Vec<proofhouse::host::Change>>(&json).expect("changes"), changes);
}
