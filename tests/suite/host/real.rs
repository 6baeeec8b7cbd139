//! The machine that the tests run on, checked against other ways to the same answers.

use proofhouse::host::{Cpu, CpuSet, Host, HostSurvey, Root, affinity};

#[test]
fn mask_is_the_one_that_the_c_library_gives() {
    // nix goes through the C library's fixed mask of 1,024 cpus
    let expected = nix::sched::sched_getaffinity(nix::unistd::Pid::from_raw(0)).expect("mask");
    let expected: CpuSet =
        (0..nix::sched::CpuSet::count()).filter(|&n| expected.is_set(n) == Ok(true)).map(|n| Cpu(n as u32)).collect();
    assert_eq!(affinity::mask().expect("mask"), expected);
}

#[test]
fn a_bound_thread_runs_where_it_was_bound() {
    let all = affinity::mask().expect("mask");
    for cpu in all.iter() {
        // in a thread of its own, since the binding stays with it
        let (mask, ran_on) = std::thread::spawn(move || {
            let mask = affinity::bind(&CpuSet::from_iter([cpu])).expect("bound");
            (mask, affinity::current_cpu().expect("cpu"))
        })
        .join()
        .expect("thread");
        assert_eq!(mask, CpuSet::from_iter([cpu]));
        // user-mode emulation may say 0 for every cpu
        assert!(ran_on == cpu || cfg!(not(target_arch = "x86_64")), "bound to {cpu}, ran on {ran_on}");
    }
    assert!(affinity::bind(&CpuSet::new()).is_err());
    assert!(affinity::bind(&CpuSet::from_iter([Cpu(1 << 20)])).is_err());
}

#[test]
fn this_machine_is_read_consistently() {
    let host = Host::read(&Root::new("/")).expect("host");
    let survey = HostSurvey::of(&host);
    assert!(host.allowed.mask.is_subset(&host.topology.online()));
    let threads: usize = host.topology.cores.iter().map(|core| core.cpus.len()).sum();
    assert_eq!(threads, survey.cpus.len());
    // second opinion: proc(5) has one line "cpuN" for every online cpu in /proc/stat
    let stat = std::fs::read_to_string("/proc/stat").expect("/proc/stat");
    let numbers = stat.lines().filter_map(|line| line.strip_prefix("cpu")?.split(' ').next()?.parse().ok());
    assert_eq!(host.topology.online(), numbers.map(Cpu).collect());
    for entry in &survey.unreadable {
        assert!(!entry.remedy.is_empty());
    }
    println!("{}", serde_json::to_string_pretty(&survey).expect("json"));
}
