//! Which host, which processor, virtual or not.

use proofhouse::host::Reading;
use proofhouse::host::keys::{CpuSource, HostKey, HostSource, SameHost, compare};

use super::{cpu, hosts};

#[test]
fn server_is_known_by_its_uuid_whatever_the_case() {
    let tree = hosts::server();
    let host = tree.host("0-15");
    let key = host.host_key().expect("a key").clone();
    assert_eq!(key.source, HostSource::ProductUuid);
    assert!(key.key.len() == 32 && key.key.bytes().all(|b| b.is_ascii_hexdigit()));
    tree.line("sys/class/dmi/id/product_uuid", "4c4c4544-0042-3510-8052-b4c04f4d3332");
    assert_eq!(tree.host("0-15").host_key(), Some(&key));
    tree.line("sys/class/dmi/id/product_uuid", "4c4c4544-0042-3510-8052-b4c04f4d3333");
    assert_ne!(tree.host("0-15").host_key().map(|k| &k.key), Some(&key.key));
}

#[test]
fn keys_do_not_change_between_builds() {
    // SHA-256 over "host 1\0product_uuid\0\04c4c4544-0042-3510-8052-b4c04f4d3332\0", computed with Python's hashlib
    let key = hosts::server().host("0").host_key().expect("a key").key.clone();
    assert_eq!(key, "68ad785a55d1ab819e161ab888910680");
}

#[test]
fn placeholders_are_passed_over() {
    let host = hosts::hybrid().host("0-7");
    let sources: Vec<HostSource> = host.host_keys.iter().map(|key| key.source).collect();
    assert_eq!(sources, [HostSource::MachineId]);
}

#[test]
fn arm_is_known_by_its_device_tree() {
    let host = hosts::arm().host("0-7");
    assert_eq!(host.identity.tree_serial, Reading::Value("c1a5e0f00d77".to_owned()));
    assert_eq!(host.host_key().map(|key| key.source), Some(HostSource::TreeSerial));
    let model = host.cpu_identities[&cpu(4)].model.value().expect("a model");
    assert_eq!(model.to_string(), "0x41 family 8 model 0xd08 stepping r1p2");
    assert_eq!(host.cpu_identities[&cpu(4)].microcode, Reading::Absent);
}

#[test]
fn a_host_without_identity_has_no_key() {
    let host = hosts::nothing().host("0-1");
    assert!(host.host_keys.is_empty());
    // cpu keys still keep the cpus apart, and say how little they rest on
    let keys = &host.cpu_keys;
    assert_ne!(keys[&cpu(0)].key, keys[&cpu(1)].key);
    assert_eq!(keys[&cpu(0)].source, CpuSource::HostAndNumber);
}

#[test]
fn less_rights_do_not_make_another_host() {
    let tree = hosts::server();
    let as_root = tree.host("0-15");
    tree.remove("sys/class/dmi/id/product_uuid");
    tree.remove("sys/class/dmi/id/product_serial");
    tree.remove("sys/class/dmi/id/board_serial");
    let as_user = tree.host("0-15");
    let recorded = as_user.host_key().expect("a key");
    assert_eq!(recorded.source, HostSource::MachineId);
    assert_eq!(compare(recorded, &as_root.host_keys), SameHost::Yes);
    assert_eq!(compare(as_root.host_key().expect("a key"), &as_user.host_keys), SameHost::Unknown);
    let other = HostKey { key: "0".repeat(32), source: HostSource::MachineId };
    assert_eq!(compare(&other, &as_root.host_keys), SameHost::No);
}

#[test]
fn processors_have_one_part_key_and_threads_their_own() {
    let tree = hosts::server();
    let host = tree.host("0-15");
    let keys = &host.cpu_keys;
    assert!(keys.values().all(|key| key.source == CpuSource::Ppin));
    assert_eq!(keys[&cpu(0)].part, keys[&cpu(11)].part);
    assert_ne!(keys[&cpu(0)].part, keys[&cpu(4)].part);
    let all: std::collections::BTreeSet<&String> = keys.values().map(|key| &key.key).collect();
    assert_eq!(all.len(), 16);
    // the two processors change places: every key goes with its part
    for n in 0..16u32 {
        let other = 0x1f2e_3d4c_0000_u64 + u64::from(1 - n / 4 % 2);
        tree.line(&format!("sys/devices/system/cpu/cpu{n}/topology/ppin"), format_args!("0x{other:x}"));
    }
    let swapped = tree.host("0-15").cpu_keys;
    assert_eq!(swapped[&cpu(4)], keys[&cpu(0)]);
    assert_eq!(swapped[&cpu(10)], keys[&cpu(14)]);
}

#[test]
fn a_part_that_keeps_its_number_to_itself_is_known_by_its_place() {
    for text in ["0x0", "0xffffffffffffffff"] {
        let tree = hosts::server();
        tree.line("sys/devices/system/cpu/cpu2/topology/ppin", text);
        let host = tree.host("0-15");
        assert_eq!(host.cpu_identities[&cpu(2)].ppin, Reading::Absent, "{text}");
        assert_eq!(host.cpu_keys[&cpu(2)].source, CpuSource::HostAndPlace);
    }
    let tree = hosts::server();
    tree.line("sys/devices/system/cpu/cpu2/topology/ppin", "0x12345678123456781");
    assert!(matches!(tree.host("0").cpu_identities[&cpu(2)].ppin, Reading::Unreadable(_)));
}

#[test]
fn place_keys_stay_when_cpu_numbers_shift() {
    let before = {
        let tree = hosts::hybrid();
        tree.host("0-7").cpu_keys
    };
    // the same cores, met in another order: cpus 4 and 7 change names
    let tree = hosts::hybrid();
    let file = |n: u32| format!("sys/devices/system/cpu/cpu{n}/topology/core_id");
    tree.line(&file(4), 11).line(&file(7), 8);
    let cpuinfo = std::fs::read_to_string(tree.root().base().join("proc/cpuinfo")).expect("cpuinfo");
    let cpuinfo = cpuinfo.replace("apicid\t\t: 8\n", "apicid\t\t: X\n").replace("apicid\t\t: 14\n", "apicid\t\t: 8\n");
    tree.file("proc/cpuinfo", cpuinfo.replace("apicid\t\t: X\n", "apicid\t\t: 14\n"));
    let after = tree.host("0-7").cpu_keys;
    assert_eq!((&after[&cpu(4)], &after[&cpu(7)]), (&before[&cpu(7)], &before[&cpu(4)]));
    assert_eq!(after[&cpu(0)], before[&cpu(0)]);
}

#[test]
fn virtual_machines_are_known_by_their_signs() {
    let flag = hosts::single().host("0");
    assert_eq!(flag.virtualised.answer, Some(true));
    assert!(flag.virtualised.because.contains("hypervisor flag"));
    assert_eq!(flag.cpu_keys[&cpu(0)].source, CpuSource::Virtual);
    assert_eq!(hosts::server().host("0").virtualised.answer, Some(false));
    assert_eq!(hosts::arm().host("0").virtualised.answer, Some(false));
    assert_eq!(hosts::nothing().host("0").virtualised.answer, None);
    for (file, content) in [
        ("sys/hypervisor/type", "xen"),
        ("sys/class/dmi/id/product_name", "KVM Virtual Machine"),
        ("sys/firmware/devicetree/base/compatible", "linux,dummy-virt"),
        ("sys/firmware/devicetree/base/hypervisor/compatible", "linux,kvm"),
    ] {
        let tree = hosts::arm();
        tree.line(file, content);
        let virtualised = tree.host("0").virtualised;
        assert_eq!(virtualised.answer, Some(true), "{file}");
    }
}

#[test]
fn microcode_comes_from_the_cpu_and_else_from_cpuinfo() {
    let tree = hosts::server();
    tree.line("sys/devices/system/cpu/cpu1/microcode/version", "0xd0003b0");
    tree.remove("sys/devices/system/cpu/cpu2/microcode");
    let host = tree.host("0");
    let of = |n: u32| host.cpu_identities[&cpu(n)].microcode.clone();
    assert_eq!(of(1), Reading::Value("0xd0003b0".to_owned()));
    assert_eq!(of(2), Reading::Value("0xd0003a5".to_owned()));
}
