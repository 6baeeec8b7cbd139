//! Temperature, frequency, throttling, energy.

use proofhouse::host::hwmon::Scope;
use proofhouse::host::sensors::energy_used;
use proofhouse::host::{CpuReadings, Reading};

use super::{cpu, hosts, set};

#[test]
fn server_cpus_have_the_temperature_of_their_own_core() {
    let tree = hosts::server();
    let host = tree.host("0-15");
    // cpu 14: socket 1, core id 8, third place: 40 + 10 + 1 °C
    let expected = CpuReadings {
        celsius: Some(51.0),
        celsius_of: Some(Scope::Core),
        frequency_khz: Some(2_000_014),
        core_throttles: Some(0),
        package_throttles: Some(9),
        package_uj: Some(123_456_790),
    };
    assert_eq!(host.sensors.read(cpu(14)), expected);
    // cpu 13 and its sibling 5: socket 1, core id 1, second place
    assert_eq!(host.sensors.read(cpu(13)).celsius, Some(50.5));
    assert_eq!(host.sensors.read(cpu(13)).core_throttles, Some(7));
    // read anew at every call
    tree.line("sys/class/hwmon/hwmon2/temp10_input", 93_125);
    assert_eq!(host.sensors.read(cpu(14)).celsius, Some(93.125));
    assert_eq!(host.sensors.read(cpu(99)), CpuReadings::default());
}

#[test]
fn the_package_stands_in_where_a_core_has_no_temperature() {
    let tree = hosts::server();
    tree.remove("sys/class/hwmon/hwmon1/temp3_input");
    let readings = tree.host("0-15").sensors.read(cpu(9));
    assert_eq!((readings.celsius, readings.celsius_of), (Some(60.0), Some(Scope::Package)));
}

#[test]
fn monitors_of_other_things_are_left_out() {
    let list = hosts::server().host("0").sensors.list();
    assert!(list.iter().all(|entry| !entry.name.contains("nvme") && entry.name != "dram"));
    let count = |kind: &str| list.iter().filter(|entry| entry.kind == kind).count();
    assert_eq!((count("temperature"), count("frequency"), count("energy")), (10, 16, 2));
    let core = list.iter().find(|entry| entry.name == "coretemp Core 9" && entry.cpus == set("7,15")).expect("core 9");
    assert_eq!((core.value, core.unit.as_str(), &core.why), (Some(51.5), "°C", &None));
}

#[test]
fn control_temperature_belongs_to_the_socket_of_its_node() {
    // two sockets watched by k10temp: only the PCI device's node says which is which
    let tree = hosts::server();
    for (hwmon, node) in [(1, 1), (2, 0)] {
        let folder = format!("sys/class/hwmon/hwmon{hwmon}");
        tree.remove(&folder);
        tree.line(&format!("{folder}/name"), "k10temp")
            .line(&format!("{folder}/temp1_label"), "Tctl")
            .line(&format!("{folder}/temp1_input"), 70_000 + node * 1000)
            .line(&format!("{folder}/temp3_label"), "Tccd1")
            .line(&format!("{folder}/temp3_input"), 30_000)
            .line(&format!("{folder}/device/numa_node"), node);
    }
    let host = tree.host("0-15");
    assert_eq!(host.sensors.read(cpu(4)).celsius, Some(71.0));
    assert_eq!(host.sensors.read(cpu(8)).celsius, Some(70.0));
    assert_eq!(host.sensors.read(cpu(8)).celsius_of, Some(Scope::Package));
    // without it neither is guessed
    tree.line("sys/class/hwmon/hwmon1/device/numa_node", -1).remove("sys/class/hwmon/hwmon2/device");
    let host = tree.host("0-15");
    assert_eq!((host.sensors.read(cpu(4)).celsius, host.sensors.read(cpu(8)).celsius), (None, None));
    assert!(host.sensors.list().iter().any(|entry| entry.name == "k10temp Tctl" && entry.cpus.is_empty()));
}

#[test]
fn die_temperature_is_preferred_to_the_control_value() {
    let tree = hosts::single();
    tree.line("sys/class/hwmon/hwmon0/name", "k10temp")
        .line("sys/class/hwmon/hwmon0/temp1_label", "Tctl")
        .line("sys/class/hwmon/hwmon0/temp1_input", 77_000)
        .line("sys/class/hwmon/hwmon0/temp2_label", "Tdie")
        .line("sys/class/hwmon/hwmon0/temp2_input", 50_000);
    assert_eq!(tree.host("0").sensors.read(cpu(0)).celsius, Some(50.0));
}

#[test]
fn labels_count_dies_where_a_socket_has_several() {
    let tree = hosts::server();
    // socket 1 becomes die 1 of socket 0
    for n in 0..16 {
        let folder = format!("sys/devices/system/cpu/cpu{n}/topology");
        tree.line(&format!("{folder}/physical_package_id"), 0).line(&format!("{folder}/die_id"), n / 4 % 2);
    }
    tree.line("sys/class/powercap/intel-rapl:0/name", "package-0-die-0");
    tree.line("sys/class/powercap/intel-rapl:1/name", "package-0-die-1");
    let sensors = tree.host("0-15").sensors;
    assert_eq!((sensors.read(cpu(0)).celsius, sensors.read(cpu(4)).celsius), (Some(40.0), Some(50.0)));
    assert_eq!(sensors.read(cpu(12)).package_uj, Some(123_456_790));
}

#[test]
fn hybrid_and_arm() {
    let tree = hosts::hybrid();
    let host = tree.host("0-7");
    assert_eq!(host.sensors.read(cpu(3)).celsius, Some(50.4));
    assert_eq!(host.sensors.read(cpu(6)).celsius, Some(51.0));
    assert_eq!(host.sensors.read(cpu(6)).frequency_khz, None);
    let arm = hosts::arm().host("0-7").sensors.read(cpu(5));
    assert_eq!((arm.celsius, arm.celsius_of), (Some(47.222), Some(Scope::Package)));
    assert_eq!((arm.frequency_khz, arm.core_throttles, arm.package_uj), (Some(1_500_000), None, None));
}

#[test]
fn zero_absent_and_unreadable_stay_apart() {
    let tree = hosts::server();
    let file = |n: u32| format!("sys/devices/system/cpu/cpu{n}/cpufreq/scaling_cur_freq");
    tree.line(&file(0), 0).remove(&file(1)).line(&file(2), "<unknown>").line(&file(3), 100_000_001);
    let sensors = tree.host("0-15").sensors;
    let frequencies = sensors.frequencies();
    assert_eq!(frequencies[&cpu(0)], Reading::Value(0));
    assert_eq!(frequencies[&cpu(1)], Reading::Absent);
    assert!(matches!(frequencies[&cpu(2)], Reading::Unreadable(_)));
    assert!(matches!(frequencies[&cpu(3)], Reading::Unreadable(_)));
    let listed = sensors.list();
    let entry = |n: u32| listed.iter().find(|e| e.kind == "frequency" && e.cpus == set(&n.to_string()));
    assert_eq!(entry(0).expect("listed").value, Some(0.0));
    assert!(entry(1).is_none());
    assert!(entry(2).expect("listed").why.as_ref().expect("a reason").contains("<unknown>"));
}

#[test]
fn temperatures_that_cannot_be_are_no_temperatures() {
    for (text, celsius) in
        [("250001", None), ("-100001", None), ("9223372036854775808", None), ("-1500", Some(-1.5)), ("0", Some(0.0))]
    {
        let tree = hosts::server();
        tree.line("sys/class/hwmon/hwmon1/temp2_input", text);
        assert_eq!(tree.host("0").sensors.read(cpu(0)).celsius, celsius, "{text}");
    }
}

#[test]
fn energy_counters_wrap() {
    // counts 0 … top are top + 1 values: from top to 0 is one step
    assert_eq!(energy_used(100, 350, None), Some(250));
    assert_eq!(energy_used(262_143_328_850, 0, Some(262_143_328_850)), Some(1));
    assert_eq!(energy_used(262_143_328_800, 50, Some(262_143_328_850)), Some(101));
    assert_eq!(energy_used(100, 50, None), None);
    assert_eq!(energy_used(100, 50, Some(60)), None);
    assert_eq!(energy_used(u64::MAX, 0, Some(u64::MAX)), Some(1));
}
