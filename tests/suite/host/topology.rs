//! Cpus, cores, sockets, nodes, caches, kinds of core.

use proofhouse::host::caches::Cache;
use proofhouse::host::{Cpu, Reading};

use super::{cpu, hosts, numbers, set};

#[test]
fn server_has_eight_cores_of_two_threads() {
    let host = hosts::server().host("0-15");
    let topology = &host.topology;
    assert_eq!(topology.online(), set("0-15"));
    assert_eq!(topology.cores.len(), 8);
    // numbered by socket, then by the kernel's core id, each with both threads
    let threads: Vec<Vec<u32>> = topology.cores.iter().map(|core| numbers(&core.cpus)).collect();
    assert_eq!(threads, [[0, 8], [1, 9], [2, 10], [3, 11], [4, 12], [5, 13], [6, 14], [7, 15]]);
    let address = topology.cores[6].address.expect("a place");
    assert_eq!(address.to_string(), "socket 1 die 0 core 8");
    let place = &topology.cpus[&cpu(14)];
    assert_eq!(
        (place.core.0, place.socket.get(), place.node.get(), place.core_id.get()),
        (6, Some(1), Some(1), Some(8))
    );
    assert_eq!(place.siblings, set("6,14"));
    assert_eq!(topology.sockets(), [0, 1]);
    assert_eq!(topology.smt_active, Reading::Value(true));
    let isolated: Vec<u32> = topology.cpus.values().filter(|p| p.isolated == Some(true)).map(|p| p.cpu.0).collect();
    assert_eq!(isolated, [3, 11]);
    assert_eq!(topology.nohz_full, Reading::Value(set("")));
    assert!(topology.offline.is_empty() && topology.doubtful.is_empty() && host.core_types.is_empty());
}

#[test]
fn server_caches_are_data_caches_with_those_who_share_them() {
    let host = hosts::server().host("0-15");
    let caches = &host.caches[&cpu(13)];
    assert_eq!(caches.l1d, Reading::Value(Cache { level: 1, kib: 48, cpus: set("5,13") }));
    assert_eq!(caches.l2, Reading::Value(Cache { level: 2, kib: 1280, cpus: set("5,13") }));
    assert_eq!(caches.l3, Reading::Value(Cache { level: 3, kib: 24576, cpus: set("4-7,12-15") }));
}

#[test]
fn cache_sizes_that_make_no_sense_are_unreadable_and_not_zero() {
    for size in ["0K", "32", "-4K", "K", "", "99999999999K", "32KK", "4194304M"] {
        let tree = hosts::server();
        tree.line("sys/devices/system/cpu/cpu0/cache/index0/size", size);
        let l1d = tree.host("0").caches[&cpu(0)].l1d.clone();
        assert!(matches!(l1d, Reading::Unreadable(_)), "{size:?}: {l1d:?}");
    }
}

#[test]
fn hybrid_has_two_kinds_of_core() {
    let tree = hosts::hybrid();
    let host = tree.host("0-7");
    let threads: Vec<Vec<u32>> = host.topology.cores.iter().map(|core| numbers(&core.cpus)).collect();
    assert_eq!(threads, vec![vec![0, 1], vec![2, 3], vec![4], vec![5], vec![6], vec![7]]);
    let kinds = |host: &proofhouse::host::Host| -> Vec<(String, String)> {
        host.core_types.iter().map(|kind| (kind.name.clone(), kind.cpus.to_string())).collect()
    };
    let pairs = |a: &str, b: &str| vec![(a.to_owned(), "0-3".to_owned()), (b.to_owned(), "4-7".to_owned())];
    assert_eq!(kinds(&host), pairs("core", "atom"));
    // without the counters' lists, frequency shows it; 5.0 and 4.9 GHz are one kind
    tree.remove("sys/devices/cpu_core").remove("sys/devices/cpu_atom");
    assert_eq!(kinds(&tree.host("0-7")), pairs("up to 5000 MHz", "up to 3800 MHz"));
}

#[test]
fn arm_cores_with_repeating_ids_are_told_apart_by_cluster() {
    let host = hosts::arm().host("0-7");
    assert_eq!(host.topology.cores.len(), 8);
    let address = |n: u32| host.topology.core_of(cpu(n)).and_then(|core| core.address).expect("a place").to_string();
    assert_eq!(address(1), "socket 0 die 0 cluster 0 core 1");
    assert_eq!(address(5), "socket 0 die 0 cluster 1 core 1");
    assert_eq!(host.topology.cpus[&cpu(5)].die, Reading::Absent);
    assert_eq!(host.topology.cpus[&cpu(5)].node, Reading::Absent);
    let kinds: Vec<(&str, String)> =
        host.core_types.iter().map(|kind| (kind.sign.as_str(), kind.cpus.to_string())).collect();
    let sign = "models in /proc/cpuinfo";
    assert_eq!(kinds, [(sign, "0-3".to_owned()), (sign, "4-7".to_owned())]);
}

#[test]
fn arm_kinds_show_in_capacity_where_models_do_not() {
    let tree = hosts::arm();
    tree.remove("proc/cpuinfo");
    let host = tree.host("0-7");
    let names: Vec<&str> = host.core_types.iter().map(|kind| kind.name.as_str()).collect();
    assert_eq!(names, ["capacity 1024", "capacity 446"]);
}

#[test]
fn holes_in_the_numbers_are_kept() {
    let host = hosts::holes().host("0,2-3,6");
    let topology = &host.topology;
    assert_eq!(topology.online(), set("0,2-3,6"));
    // present and not online; what is only possible (8-63) is no cpu
    assert_eq!(topology.offline, set("1,4-5,7"));
    let threads: Vec<Vec<u32>> = topology.cores.iter().map(|core| numbers(&core.cpus)).collect();
    assert_eq!(threads, vec![vec![0], vec![2, 3], vec![6]]);
    assert_eq!(topology.cpus[&cpu(6)].core.0, 2);
    assert_eq!(topology.cpus[&cpu(6)].node, Reading::Value(2));
    assert_eq!(topology.sockets(), [3]);
    assert!(!topology.is_online(cpu(1)) && topology.core_of(cpu(1)).is_none());
}

#[test]
fn online_cpus_come_from_the_next_best_source() {
    let tree = hosts::server();
    tree.remove("sys/devices/system/cpu/online").line("sys/devices/system/cpu/cpu5/online", 0);
    let topology = tree.host("0-1").topology;
    assert_eq!((topology.online(), topology.offline), (set("0-4,6-15"), set("5")));
    assert!(topology.online_from.contains("folders"));
    tree.remove("sys/devices/system/cpu");
    let topology = tree.host("0-1").topology;
    assert_eq!((topology.online(), topology.online_from), (set("0-15"), "/proc/cpuinfo"));
    // without a word on cores each cpu is its own
    assert_eq!(topology.cores.len(), 16);
    let topology = hosts::nothing().host("1,3").topology;
    assert_eq!(topology.online(), set("1,3"));
    assert!(topology.online_from.contains("affinity"));
    assert!(topology.cpus.values().all(|place| place.socket == Reading::Absent && place.isolated.is_none()));
}

#[test]
fn lists_that_contradict_each_other_give_way_to_core_ids() {
    let tree = hosts::server();
    let folder = |n: u32| format!("sys/devices/system/cpu/cpu{n}/topology/core_cpus_list");
    tree.line(&folder(8), "1,8").line(&folder(5), "6").line(&folder(3), "rubbish");
    let topology = tree.host("0-15").topology;
    // equal ids still join 0 with 8, 5 with 13, 3 with 11
    let threads: Vec<Vec<u32>> = topology.cores.iter().map(|core| numbers(&core.cpus)).collect();
    assert_eq!(threads, [[0, 8], [1, 9], [2, 10], [3, 11], [4, 12], [5, 13], [6, 14], [7, 15]]);
    assert_eq!(topology.doubtful, set("0,5,8,11,13"));
    assert!(matches!(topology.cpus[&cpu(3)].siblings_told, Reading::Unreadable(_)));
    // with the ids gone too, each is a core of its own
    tree.remove("sys/devices/system/cpu/cpu0/topology/core_id");
    tree.remove("sys/devices/system/cpu/cpu8/topology/core_id");
    let topology = tree.host("0-15").topology;
    assert_eq!((topology.cores.len(), topology.cpus[&cpu(8)].siblings.clone()), (9, set("8")));
}

#[test]
fn minus_one_is_unknown_and_zero_is_a_socket() {
    let tree = hosts::server();
    let socket = |n: u32| format!("sys/devices/system/cpu/cpu{n}/topology/physical_package_id");
    tree.line(&socket(0), -1).line(&socket(1), -7).line(&socket(2), 0).remove(&socket(3)).folder(&socket(8));
    let topology = tree.host("0-15").topology;
    let of = |n: u32| topology.cpus[&Cpu(n)].socket.clone();
    assert_eq!(of(0), Reading::Absent);
    assert!(matches!(of(1), Reading::Unreadable(_)));
    assert_eq!(of(2), Reading::Value(0));
    assert_eq!(of(3), Reading::Absent);
    assert!(matches!(of(8), Reading::Unreadable(_)));
}

#[test]
fn two_dies_with_equal_core_ids_are_different_cores() {
    let tree = hosts::server();
    // socket 1 becomes die 1 of socket 0; sibling lists are gone
    for n in 0..16 {
        let folder = format!("sys/devices/system/cpu/cpu{n}/topology");
        tree.line(&format!("{folder}/physical_package_id"), 0).line(&format!("{folder}/die_id"), n / 4 % 2);
        tree.remove(&format!("{folder}/core_cpus_list")).remove(&format!("{folder}/thread_siblings_list"));
    }
    let topology = tree.host("0-15").topology;
    let threads: Vec<Vec<u32>> = topology.cores.iter().map(|core| numbers(&core.cpus)).collect();
    assert_eq!(threads, [[0, 8], [1, 9], [2, 10], [3, 11], [4, 12], [5, 13], [6, 14], [7, 15]]);
    assert_eq!(topology.cores[7].address.expect("a place").to_string(), "socket 0 die 1 core 9");
}
