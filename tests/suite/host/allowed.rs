//! Which cpus may be used.

use proofhouse::host::{AllowedError, CpuChoice, Reading};

use super::{hosts, set};

fn only(list: &str) -> CpuChoice {
    CpuChoice::Only(set(list))
}

#[test]
fn all_means_all_that_are_online_and_allowed() {
    let host = hosts::holes().host("0-3,9");
    assert_eq!(host.allowed.choose(&CpuChoice::All, &host.topology), Ok(set("0,2-3")));
    assert_eq!(host.allowed.choose(&only("3"), &host.topology), Ok(set("3")));
    let host = hosts::holes().host("9");
    assert_eq!(host.allowed.choose(&CpuChoice::All, &host.topology), Err(AllowedError::Nothing { mask: set("9") }));
}

#[test]
fn a_named_cpu_that_cannot_be_had_is_an_error_with_a_remedy() {
    let host = hosts::holes().host("0,2-3");
    let refused = |list: &str| host.allowed.choose(&only(list), &host.topology).expect_err(list).to_string();
    let offline = refused("0-1");
    assert!(offline.starts_with("cpu 1 is offline") && offline.contains("chcpu --enable 1"), "{offline}");
    let unknown = refused("0,9");
    assert!(unknown.starts_with("cpu 9 does not exist") && unknown.contains("0,2-3,6"), "{unknown}");
    let masked = refused("0,6");
    assert!(masked.starts_with("cpu 6 is outside the affinity mask 0,2-3"), "{masked}");
    assert!(masked.contains("taskset --cpu-list 0,6"), "{masked}");
    assert!(!offline.contains('\n') && !unknown.contains('\n') && !masked.contains('\n'));
}

#[test]
fn the_cpuset_is_named_where_it_is_the_reason() {
    let host = hosts::container().host("2-3");
    assert_eq!(host.allowed.cpuset, Reading::Value(set("2-3")));
    let error = host.allowed.choose(&only("2-5"), &host.topology).expect_err("outside");
    let words = error.to_string();
    assert!(words.starts_with("cpu 4-5 is outside the cpuset 2-3 of this control group"), "{words}");
    assert!(words.contains("/sys/fs/cgroup/cpuset.cpus.effective"), "{words}");
    // inside the cpuset and outside the mask: the mask is the reason
    let host = hosts::container().host("2");
    let error = host.allowed.choose(&only("3"), &host.topology).expect_err("outside");
    assert!(matches!(error, AllowedError::OutsideMask { .. }), "{error}");
}

#[test]
fn a_group_without_the_file_has_the_cpus_of_the_one_above() {
    let tree = hosts::server();
    tree.line("proc/self/cgroup", "0::/a.slice/b.slice/c.scope")
        .line("sys/fs/cgroup/a.slice/cpuset.cpus.effective", "1-2");
    let allowed = tree.host("0-15").allowed;
    assert_eq!(allowed.cpuset, Reading::Value(set("1-2")));
    assert_eq!(allowed.cpuset_file.as_deref(), Some("/sys/fs/cgroup/a.slice/cpuset.cpus.effective"));
}

#[test]
fn both_versions_of_control_groups_are_read() {
    // cgroups(7), from memory: "hierarchy-ID:controller-list:cgroup-path"
    let tree = hosts::server();
    tree.remove("sys/fs/cgroup")
        .file("proc/self/cgroup", "9:name=systemd:/\n3:cpu,cpuset:/jobs/17\n0::/\n")
        .line("sys/fs/cgroup/cpuset/jobs/17/cpuset.cpus", "0-7")
        .line("sys/fs/cgroup/cpuset/jobs/17/cpuset.effective_cpus", "4-7");
    assert_eq!(tree.host("0").allowed.cpuset, Reading::Value(set("4-7")));
    tree.remove("sys/fs/cgroup").line("sys/fs/cgroup/unified/cpuset.cpus.effective", "0-1");
    assert_eq!(tree.host("0").allowed.cpuset, Reading::Value(set("0-1")));
}

#[test]
fn paths_out_of_the_namespace_are_not_followed() {
    let tree = hosts::server();
    tree.line("proc/self/cgroup", "0::/../../../etc");
    assert!(matches!(tree.host("0").allowed.cpuset, Reading::Unreadable(_)));
    tree.line("proc/self/cgroup", "0::no-slash");
    assert!(matches!(tree.host("0").allowed.cpuset, Reading::Unreadable(_)));
    assert_eq!(hosts::nothing().host("0").allowed.cpuset, Reading::Absent);
}
