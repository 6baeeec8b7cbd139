//! The document about a host, and its list of what could not be read.

use proofhouse::host::HostSurvey;
use proofhouse::host::keys::CpuSource;
use serde_json::Value;

use super::{hosts, set};

fn json(survey: &HostSurvey) -> Value {
    serde_json::to_value(survey).expect("json")
}

fn why<'a>(survey: &'a HostSurvey, what: &str) -> Vec<&'a str> {
    survey.unreadable.iter().filter(|entry| entry.what.starts_with(what)).map(|entry| entry.why.as_str()).collect()
}

#[test]
fn fixed_names_of_a_cpu() {
    let survey = json(&HostSurvey::of(&hosts::server().host("0-7")));
    let cpu = &survey["cpus"][14];
    assert_eq!(cpu["cpu"], 14);
    assert_eq!(cpu["core"], 6);
    assert_eq!(cpu["socket"], 1);
    assert_eq!(cpu["node"], 1);
    assert_eq!(cpu["siblings"], serde_json::json!([6, 14]));
    assert_eq!(cpu["allowed"], false);
    assert_eq!(survey["cpus"][3]["isolated"], true);
    assert_eq!(survey["allowed"]["mask"], serde_json::json!([0, 1, 2, 3, 4, 5, 6, 7]));
    assert_eq!(survey["virtualised"], false);
    assert_eq!(survey["identity"]["kernel"], "6.1.0-18-amd64");
    assert_eq!(survey["caches"].as_array().map(Vec::len), Some(8 + 8 + 2));
}

#[test]
fn a_server_that_tells_everything_lacks_nothing() {
    let survey = HostSurvey::of(&hosts::server().host("0-15"));
    assert_eq!(survey.unreadable, []);
    let polls = survey.counters.iter().find(|counter| counter.counter == "MCP").expect("polls");
    assert_eq!((polls.total, &polls.nonzero), (Some(65), &set("0-15")));
    let checks = survey.counters.iter().find(|counter| counter.counter == "MCE").expect("machine checks");
    assert_eq!((checks.total, checks.nonzero.is_empty()), (Some(0), true));
}

#[test]
fn serial_numbers_stay_out() {
    let text = json(&HostSurvey::of(&hosts::server().host("0-15"))).to_string().to_lowercase();
    for secret in ["4c4c4544", "7d2k9r3", "cn7475141b00zx", "7f0c1f5b2c864f7e9d3a5b0c8e1d2f34", "1f2e3d4c"] {
        assert!(!text.contains(secret), "{secret}");
    }
    assert!(text.contains("rack7-node3"));
}

#[test]
fn every_lack_has_a_reason_and_a_remedy() {
    let trees = [
        hosts::server(),
        hosts::hybrid(),
        hosts::arm(),
        hosts::container(),
        hosts::holes(),
        hosts::single(),
        hosts::nothing(),
    ];
    for tree in &trees {
        let survey = HostSurvey::of(&tree.host("0-1"));
        let mut seen = std::collections::BTreeSet::new();
        for entry in &survey.unreadable {
            assert!(seen.insert(&entry.what), "{} twice", entry.what);
            for words in [&entry.what, &entry.why, &entry.remedy] {
                assert!(!words.is_empty() && !words.contains('\n'), "{entry:?}");
            }
        }
        let back: HostSurvey = serde_json::from_value(json(&survey)).expect("survey");
        assert_eq!(back, survey);
    }
}

#[test]
fn where_everything_is_missing_the_mask_is_left() {
    let survey = HostSurvey::of(&hosts::nothing().host("1,3"));
    let cpus: Vec<u32> = survey.cpus.iter().map(|cpu| cpu.cpu.0).collect();
    assert_eq!(cpus, [1, 3]);
    assert_eq!((survey.virtualised, survey.identity.host_key.as_ref()), (None, None));
    assert!(survey.sensors.is_empty() && survey.caches.is_empty() && survey.counters.is_empty());
    for what in [
        "list of online cpus",
        "processor model",
        "socket",
        "core id",
        "memory node",
        "temperature",
        "present frequency",
        "energy",
        "machine check counts",
        "memory error counts",
        "id of the machine",
        "id of the installation",
        "inventory number",
        "microcode",
        "kernel release",
    ] {
        assert_eq!(why(&survey, what), ["not offered by this kernel or machine"], "{what}");
    }
}

#[test]
fn a_virtual_machine_says_that_it_is_the_reason() {
    let survey = HostSurvey::of(&hosts::single().host("0"));
    assert_eq!(survey.virtualised, Some(true));
    assert_eq!(why(&survey, "temperature"), ["not offered inside this virtual machine"]);
    assert_eq!(why(&survey, "machine check counts"), [""; 0]);
    // what the guest's own system decides is not the hypervisor's doing
    assert_eq!(why(&survey, "machine check log"), ["not offered by this kernel or machine"]);
    assert_eq!(why(&survey, "id of the installation"), ["not offered by this kernel or machine"]);
}

#[test]
fn what_holds_for_some_cpus_only_names_them() {
    let tree = hosts::server();
    tree.remove("sys/devices/system/cpu/cpu4/cpufreq")
        .line("sys/devices/system/cpu/cpu6/cpufreq/scaling_cur_freq", "?");
    let survey = HostSurvey::of(&tree.host("0-15"));
    let lacks: Vec<(&str, &str)> = survey.unreadable.iter().map(|e| (e.what.as_str(), e.why.as_str())).collect();
    let place = "(/sys/devices/system/cpu/cpu*/cpufreq/scaling_cur_freq)";
    assert_eq!(
        lacks,
        [
            (format!("present frequency of cpu 4 {place}").as_str(), "not offered by this kernel or machine"),
            (format!("present frequency of cpu 6 {place}").as_str(), "holds \"?\", which makes no sense there"),
        ]
    );
}

#[test]
fn placeholders_and_contradictions_are_said() {
    let survey = HostSurvey::of(&hosts::hybrid().host("0-7"));
    assert!(why(&survey, "serial number of the machine")[0].contains("To Be Filled By O.E.M."));
    let tree = hosts::server();
    tree.line("sys/devices/system/cpu/cpu8/topology/core_cpus_list", "1,8");
    let survey = HostSurvey::of(&tree.host("0-15"));
    assert_eq!(why(&survey, "threads of one core of cpu 0,8"), ["the lists of these cpus contradict each other"]);
}

#[test]
fn what_needs_root_says_so() {
    let tree = hosts::server();
    tree.owner_only("sys/class/dmi/id/product_uuid", 0o000)
        .owner_only("sys/class/powercap/intel-rapl:0/energy_uj", 0o000);
    for n in 0..16 {
        tree.owner_only(&format!("sys/devices/system/cpu/cpu{n}/topology/ppin"), 0o000);
    }
    // root reads all: this thread looks at files as another user does; without root the mode is enough
    let as_another_user = || {
        nix::unistd::setfsuid(nix::unistd::Uid::from_raw(65534));
        HostSurvey::of(&tree.host("0-15"))
    };
    let survey = std::thread::scope(|scope| scope.spawn(as_another_user).join().expect("thread"));
    let lacks: Vec<(&str, &str)> = survey.unreadable.iter().map(|e| (e.what.as_str(), e.why.as_str())).collect();
    assert_eq!(
        lacks,
        [
            ("energy of package-0", "permission denied"),
            ("inventory number of the processor (/sys/devices/system/cpu/cpu*/topology/ppin)", "permission denied"),
            ("id of the machine (/sys/class/dmi/id/product_uuid)", "permission denied"),
        ]
    );
    assert!(survey.unreadable.iter().all(|entry| entry.remedy.starts_with("run as root")));
    assert!(survey.cpus.iter().all(|cpu| cpu.key.as_ref().is_some_and(|key| key.source == CpuSource::HostAndPlace)));
}
