//! Garbage everywhere: nothing may panic, nothing may be invented.

use proofhouse::host::{CpuChoice, HostSurvey};

use super::tree::Tree;
use super::{hosts, set};

/// What may stand in a file in the place of what should.
fn rubbish() -> Vec<(&'static str, Vec<u8>)> {
    vec![
        ("nothing", vec![]),
        ("zero bytes", vec![0; 64]),
        ("binary", (0..=255).collect()),
        ("not UTF-8", b"\xff\xfe\xc3\x28\n".to_vec()),
        ("huge number", b"99999999999999999999999999999999999999\n".to_vec()),
        ("largest u64", b"18446744073709551615\n".to_vec()),
        ("largest i64", b"9223372036854775807\n".to_vec()),
        ("negative", b"-42\n".to_vec()),
        ("huge range", b"0-4000000000\n".to_vec()),
        ("commas", b",,,,,\n".to_vec()),
        ("too long", vec![b'7'; 70_000]),
        ("line feeds", vec![b'\n'; 5_000]),
        ("colons", b":::::\n:\nprocessor:\nprocessor: -1\nprocessor: 4294967295\nflags:\n".to_vec()),
        ("control characters", b"\x1b[2J\x07\x00\x08Core 1\n".to_vec()),
        ("words", b"CPU0 CPU99999999999\nMCE: x y z\n".to_vec()),
    ]
}

/// Everything that can be asked of a host.
fn ask(tree: &Tree, what: &str) -> HostSurvey {
    let host = tree.host("0-1");
    let survey = HostSurvey::of(&host);
    for &cpu in host.topology.cpus.keys() {
        host.sensors.read(cpu);
    }
    // wanted cpus that exist are given, or refused in words
    let _ = host.allowed.choose(&CpuChoice::All, &host.topology).map_err(|error| error.to_string());
    let text = serde_json::to_string(&survey).expect("json");
    assert!(!text.contains("\\u001b") && !text.contains("\\u0000"), "{what}: control characters come through");
    assert_eq!(serde_json::from_str::<HostSurvey>(&text).expect("a survey"), survey, "{what}");
    survey
}

#[test]
fn one_kind_of_rubbish_in_every_file() {
    for (what, content) in rubbish() {
        let tree = hosts::server();
        tree.files().iter().for_each(|file| {
            tree.file(file, &content);
        });
        let survey = ask(&tree, what);
        assert!(survey.unreadable.len() > 10, "{what}: {} lacks", survey.unreadable.len());
        // the folders are still there and tell sixteen cpus, unless the rubbish is a list of its own
        assert!(survey.cpus.len() == 16 || survey.cpus.len() == 1, "{what}: {} cpus", survey.cpus.len());
        for counter in &survey.counters {
            assert!(counter.total != Some(0), "{what}: {counter:?} is a zero that nobody counted");
        }
    }
}

#[test]
fn folders_in_the_place_of_files_and_files_in_the_place_of_folders() {
    let tree = hosts::server();
    tree.files().iter().for_each(|file| {
        tree.folder(file);
    });
    let survey = ask(&tree, "folders");
    assert_eq!(survey.cpus.len(), 16);
    assert!(survey.cpus.iter().all(|cpu| cpu.socket.is_none() && cpu.core_id.is_none()));
    let tree = hosts::server();
    for place in ["sys/devices/system", "sys/class", "proc", "etc", "var"] {
        tree.remove(place).line(place, "a file");
    }
    let survey = ask(&tree, "files");
    assert_eq!(survey.cpus.len(), 2);
    assert!(survey.sensors.is_empty());
}

#[test]
fn random_damage_never_panics() {
    // xorshift64 with a fixed seed: the same damage at every run
    let mut state = 0x9e37_79b9_7f4a_7c15_u64;
    let mut random = |below: usize| {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        (state % below as u64) as usize
    };
    let rubbish = rubbish();
    let makers = [hosts::server, hosts::hybrid, hosts::arm, hosts::holes];
    for round in 0..40 {
        let tree = makers[round % makers.len()]();
        let files = tree.files();
        for file in &files {
            let path = tree.root().base().join(file);
            match random(12) {
                0 => drop(tree.file(file, &rubbish[random(rubbish.len())].1)),
                1 => drop(tree.remove(file)),
                2 | 3 => {
                    let mut bytes = std::fs::read(&path).expect("bytes");
                    for _ in 0..=bytes.len() / 16 {
                        let length = bytes.len();
                        if length > 0 {
                            bytes[random(length)] = random(256) as u8;
                        }
                    }
                    tree.file(file, bytes);
                }
                _ => {}
            }
        }
        ask(&tree, &format!("round {round}"));
    }
}

#[test]
fn numbers_past_the_limit_are_no_cpus() {
    let tree = hosts::single();
    tree.line("sys/devices/system/cpu/online", "0-70000")
        .folder("sys/devices/system/cpu/cpu70000")
        .folder("sys/devices/system/cpu/cpu007")
        .folder("sys/devices/system/cpu/cpu99999999999999999999");
    assert_eq!(tree.host("0").topology.online(), set("0"));
}
