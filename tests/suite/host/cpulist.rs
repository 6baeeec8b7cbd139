//! Lists of cpus as the kernel and as users write them.

use proofhouse::host::{CpuChoice, CpuListError, CpuSet};

use super::{cpu, numbers, set};

#[test]
fn kernel_lists_are_read_and_written_alike() {
    // examples in the syntax of the kernel's bitmap lists ("%*pbl"), from memory
    for (list, expected) in [
        ("", vec![]),
        ("\n", vec![]),
        ("0\n", vec![0]),
        ("0-3,8,10-11\n", vec![0, 1, 2, 3, 8, 10, 11]),
        ("65535", vec![65535]),
    ] {
        let parsed = CpuSet::parse_kernel(list).expect(list);
        assert_eq!(numbers(&parsed), expected, "{list:?}");
        assert_eq!(parsed.to_string(), list.trim());
    }
}

#[test]
fn order_overlap_and_spaces_do_not_matter() {
    assert_eq!(numbers(&set("7, 2-4 ,3-5,2")), [2, 3, 4, 5, 7]);
    assert_eq!(set("0-1,2,3-5").to_string(), "0-5");
    assert_eq!(set("0-65535").len(), 65536);
    // 13,000 full ranges are merged before they are expanded
    let long = vec!["0-65535"; 13_000].join(",");
    assert_eq!(set(&long).len(), 65536);
}

#[test]
fn what_is_no_list_is_refused_in_one_line_that_names_it() {
    for (list, part) in [
        ("x7", "x7"),
        ("0-3,,5", ""),
        ("1-", "1-"),
        ("-1", "-1"),
        ("+3", "+3"),
        ("1-2-3", "1-2-3"),
        ("0-31:1/2", "0-31:1/2"),
        ("٣", "٣"),
        ("0x10", "0x10"),
    ] {
        let error = CpuSet::parse_kernel(list).expect_err(list);
        assert_eq!(error, CpuListError::NotANumber { part: part.to_owned() });
        let words = error.to_string();
        assert!(words.contains(&format!("{part:?}")) && words.contains("0-3,8,10-11") && !words.contains('\n'));
    }
    assert_eq!(CpuSet::parse_kernel("5-2"), Err(CpuListError::Backwards { part: "5-2".to_owned() }));
    for list in ["0-4000000000", "65536", "99999999999999999999999999", "0-99999999999999999999999999"] {
        assert_eq!(CpuSet::parse_kernel(list), Err(CpuListError::TooHigh { part: list.to_owned() }));
    }
    let words = CpuSet::parse_kernel("70000").expect_err("too high").to_string();
    assert!(words.contains("65535"), "{words}");
}

#[test]
fn a_users_choice_names_something() {
    assert_eq!("all".parse(), Ok(CpuChoice::All));
    assert_eq!("1,0".parse(), Ok(CpuChoice::Only(set("0-1"))));
    assert_eq!("  ".parse::<CpuChoice>(), Err(CpuListError::Empty));
    assert!("every".parse::<CpuChoice>().is_err());
    let words = "\u{1b}[2J,3".parse::<CpuChoice>().expect_err("no number").to_string();
    assert!(!words.contains('\u{1b}'), "{words:?}");
}

#[test]
fn json_has_plain_numbers() {
    let json = serde_json::to_string(&set("0-1,9")).expect("json");
    assert_eq!(json, "[0,1,9]");
    assert_eq!(serde_json::from_str::<CpuSet>(&json).expect("a set"), set("0-1,9"));
    assert_eq!(serde_json::to_string(&cpu(3)).expect("json"), "3");
}
