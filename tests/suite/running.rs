//! Windows and drills as a user starts them: the program's own binary, its documents, its exit codes, and what it
//! does when it is disturbed from outside.

use std::path::{Path, PathBuf};
use std::process::{Child, Command, Output, Stdio};
use std::time::{Duration, Instant};

use nix::sched::{CpuSet, sched_setaffinity};
use nix::sys::signal::{Signal, kill};
use nix::unistd::Pid;
use serde_json::Value;

/// A folder of its own that goes with the test.
pub struct Scratch(PathBuf);

impl Scratch {
    pub fn new(name: &str) -> Scratch {
        let path = std::env::temp_dir().join(format!("proofhouse-{}-{name}", std::process::id()));
        let _ = std::fs::remove_dir_all(&path);
        std::fs::create_dir_all(&path).unwrap();
        Scratch(path)
    }

    pub fn path(&self) -> &Path {
        &self.0
    }

    pub fn ledger(&self) -> String {
        self.0.join("ledger").display().to_string()
    }
}

impl Drop for Scratch {
    fn drop(&mut self) {
        let _ = std::fs::remove_dir_all(&self.0);
    }
}

pub fn program(args: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_proofhouse"));
    command.args(args).stdin(Stdio::null()).stdout(Stdio::piped()).stderr(Stdio::piped());
    command
}

pub fn run(args: &[&str]) -> Output {
    program(args).output().unwrap()
}

pub fn json(output: &Output) -> Value {
    serde_json::from_slice(&output.stdout).unwrap_or_else(|e| {
        panic!("{e}: {}{}", String::from_utf8_lossy(&output.stdout), String::from_utf8_lossy(&output.stderr))
    })
}

/// Cpus of the machine; tests that need two say so and pass on one.
pub fn cpus() -> Vec<u32> {
    proofhouse::host::affinity::mask().unwrap().iter().map(|c| c.0).collect()
}

/// Runs one window at a time: two at once on the same cores would hold each other up.
pub fn alone() -> std::sync::MutexGuard<'static, ()> {
    static TURN: std::sync::Mutex<()> = std::sync::Mutex::new(());
    TURN.lock().unwrap_or_else(|e| e.into_inner())
}

/// The worker of `cpu` below the program `parent`, once it is there.
pub fn worker(parent: &Child, cpu: u32) -> Pid {
    worker_within(parent, cpu, Duration::from_secs(10)).unwrap_or_else(|| panic!("no worker of cpu {cpu} came up"))
}

/// The same, if it comes up within `patience`.
pub fn worker_within(parent: &Child, cpu: u32, patience: Duration) -> Option<Pid> {
    let wanted = format!("worker\0--cpu\0{cpu}\0");
    let patience = Instant::now() + patience;
    while Instant::now() < patience {
        for entry in std::fs::read_dir("/proc").unwrap().flatten() {
            let Some(pid) = entry.file_name().to_str().and_then(|n| n.parse::<i32>().ok()) else { continue };
            let text = |file: &str| std::fs::read_to_string(entry.path().join(file)).unwrap_or_default();
            let parent_line = format!("PPid:\t{}\n", parent.id());
            if text("status").contains(&parent_line) && text("cmdline").ends_with(&wanted) {
                return Some(Pid::from_raw(pid));
            }
        }
        std::thread::sleep(Duration::from_millis(5));
    }
    None
}

fn window(scratch: &Scratch, budget: &str, more: &[&str]) -> Child {
    let ledger = scratch.ledger();
    let mut args =
        vec!["window", "--budget", budget, "--format", "json", "--ledger", &ledger, "--kernels", "integer.*"];
    args.extend(more);
    program(&args).spawn().unwrap()
}

#[test]
fn a_window_ends_on_its_budget_and_covers_every_unit_on_every_cpu() {
    let _turn = alone();
    let scratch = Scratch::new("budget");
    let begun = Instant::now();
    let ledger = scratch.ledger();
    let output = run(&["window", "--budget", "6s", "--format", "json", "--ledger", &ledger]);
    let took = begun.elapsed();
    let report = json(&output);
    assert_eq!(output.status.code(), Some(0), "{report:#}");
    assert!(took <= Duration::from_secs(7), "took {took:?} of 6 s");
    assert_eq!(report["schema"], "proofhouse/window/1");
    assert_eq!(report["verdict"], "clear");
    let cpus = cpus();
    assert_eq!(report["cores"].as_array().unwrap().len(), cpus.len());
    for cpu in &cpus {
        for kernel in kernels::catalogue::KERNELS {
            for (variant, proof) in kernels::isa::survey(*kernel) {
                let ran = report["kernels"].as_array().unwrap().iter().any(|k| {
                    k["kernel"] == kernel.id()
                        && k["variant"] == variant.name()
                        && k["cpu"] == *cpu
                        && k["runs"].as_u64() > Some(0)
                });
                assert_eq!(ran, proof.is_ok(), "{} {variant} on cpu {cpu}", kernel.id());
            }
        }
    }
    for core in report["cores"].as_array().unwrap() {
        assert_eq!(core["mismatches"], 0);
        let rate = &core["per_hour"];
        // Garwood 1936: no event in t hours bounds the rate by -ln(0.05) / t with 95 % confidence
        let bound = 2.995_732_273_553_991 * 3600.0 / core["busy_s"].as_f64().unwrap();
        assert!((rate["upper"].as_f64().unwrap() / bound - 1.0).abs() < 1e-6, "{core:#}");
        assert_eq!(rate["confidence"], 0.95);
    }
    let verified = run(&["ledger", "verify", "--ledger", &ledger, "--format", "json"]);
    assert_eq!((verified.status.code(), &json(&verified)["condition"]["state"]), (Some(0), &Value::from("clean")));
    let shown = json(&run(&["ledger", "show", "--ledger", &ledger, "--format", "json"]));
    let sum =
        |v: &Value, key: &str| v[key].as_array().unwrap().iter().map(|c| c["runs"].as_u64().unwrap()).sum::<u64>();
    assert_eq!(sum(&shown, "cells"), sum(&report, "kernels"), "the ledger holds every run that the window reported");
}

#[test]
fn a_drill_notices_every_fault_on_its_core_and_counts_nowhere() {
    let _turn = alone();
    if cpus().len() < 2 {
        return;
    }
    let scratch = Scratch::new("drill");
    let ledger = scratch.ledger();
    let output = run(&["drill", "--faults", "36", "--seed", "11", "--format", "json", "--ledger", &ledger]);
    let report = json(&output);
    assert_eq!(output.status.code(), Some(0), "{report:#}");
    assert_eq!((&report["faults"], &report["noticed"]), (&Value::from(36), &Value::from(36)));
    assert_eq!(report["on_others"], Value::Array(vec![]));
    let kinds = report["kinds"].as_array().unwrap();
    assert_eq!(kinds.len(), 6);
    let blind = kinds.iter().find(|k| k["kind"] == "flipped bit, blind comparison").unwrap();
    assert_eq!(blind["by_fold"], blind["drilled"], "a worker that compares wrongly is caught by the fold");
    assert!(report["confirmed"].as_u64() > Some(0), "{report:#}");
    let shown = json(&run(&["ledger", "show", "--ledger", &ledger, "--format", "json"]));
    assert_eq!((&shown["cpus"], &shown["cells"]), (&Value::Array(vec![]), &Value::Array(vec![])));
    assert!(shown["left_out"]["drill"].as_u64() > Some(72));
}

#[test]
fn workers_that_are_killed_or_stopped_from_outside_are_replaced_and_accuse_nobody() {
    let _turn = alone();
    let cpu = *cpus().last().unwrap();
    for (signal, how) in [(Signal::SIGKILL, "SIGKILL"), (Signal::SIGSTOP, "stopped from outside")] {
        let scratch = Scratch::new("killed");
        let child = window(&scratch, "9s", &[]);
        let pid = worker(&child, cpu);
        std::thread::sleep(Duration::from_millis(800));
        kill(pid, signal).unwrap();
        let output = child.wait_with_output().unwrap();
        let report = json(&output);
        let lost = report["lost"].as_array().unwrap();
        assert_eq!(lost.len(), 1, "{report:#}");
        assert_eq!(lost[0]["cpu"], cpu);
        assert!(lost[0]["how"].as_str().unwrap().contains(how), "{}", lost[0]);
        assert_eq!((output.status.code(), &report["verdict"]), (Some(0), &Value::from("clear")), "{report:#}");
        let busy = report["cores"].as_array().unwrap().iter().find(|c| c["cpu"] == cpu).unwrap()["busy_s"].as_f64();
        assert!(busy > Some(1.0), "the worker was replaced: {busy:?}");
    }
}

#[test]
fn a_worker_that_crashes_is_held_against_its_core() {
    let _turn = alone();
    let cpu = *cpus().last().unwrap();
    let scratch = Scratch::new("crash");
    let child = window(&scratch, "4s", &[]);
    let pid = worker(&child, cpu);
    std::thread::sleep(Duration::from_millis(800));
    // the runtime of the worker lets a mere signal SIGSEGV pass; a real fault would come again at once
    kill(pid, Signal::SIGILL).unwrap();
    let output = child.wait_with_output().unwrap();
    let report = json(&output);
    assert_eq!((output.status.code(), &report["verdict"]), (Some(10), &Value::from("watch")), "{report:#}");
    for core in report["cores"].as_array().unwrap() {
        assert_eq!(core["verdict"], if core["cpu"] == cpu { "watch" } else { "clear" });
    }
}

#[test]
fn a_slice_whose_worker_was_moved_is_void() {
    let _turn = alone();
    let cpus = cpus();
    let [first, .., last] = cpus.as_slice() else { return };
    let scratch = Scratch::new("moved");
    let child = window(&scratch, "4s", &[]);
    let pid = worker(&child, *last);
    std::thread::sleep(Duration::from_millis(900));
    let mut elsewhere = CpuSet::new();
    elsewhere.set(*first as usize).unwrap();
    sched_setaffinity(pid, &elsewhere).unwrap();
    let output = child.wait_with_output().unwrap();
    let report = json(&output);
    let remarks = report["remarks"].to_string();
    assert!(remarks.contains(&format!("of cpu {last} is void")), "{report:#}");
    assert_eq!(report["findings"], Value::Array(vec![]));
    assert_ne!(report["verdict"], "withdraw");
}

#[test]
fn a_request_to_end_is_answered_with_what_was_learnt() {
    let _turn = alone();
    for signal in [Signal::SIGTERM, Signal::SIGINT] {
        let scratch = Scratch::new("term");
        let child = window(&scratch, "10m", &[]);
        worker(&child, cpus()[0]);
        std::thread::sleep(Duration::from_millis(1500));
        let asked = Instant::now();
        kill(Pid::from_raw(child.id() as i32), signal).unwrap();
        let output = child.wait_with_output().unwrap();
        assert!(asked.elapsed() < Duration::from_secs(2), "{:?}", asked.elapsed());
        let report = json(&output);
        assert_eq!(report["ending"], "signal");
        assert!(report["cores"][0]["runs"].as_u64() > Some(0), "{report:#}");
        let verified = run(&["ledger", "verify", "--ledger", &scratch.ledger()]);
        assert_eq!(verified.status.code(), Some(0));
    }
}

#[test]
fn a_killed_window_is_attributed_by_the_next_and_only_once() {
    let _turn = alone();
    let scratch = Scratch::new("abandoned");
    let mut child = window(&scratch, "10m", &[]);
    let workers: Vec<Pid> = cpus().into_iter().map(|cpu| worker(&child, cpu)).collect();
    std::thread::sleep(Duration::from_millis(800));
    child.kill().unwrap();
    child.wait().unwrap();
    std::thread::sleep(Duration::from_millis(300));
    for pid in workers {
        // a process that nobody has reaped yet is as good as gone
        let state = std::fs::read_to_string(format!("/proc/{pid}/stat")).unwrap_or_default();
        assert!(state.is_empty() || state.contains(") Z "), "worker {pid} outlived its supervisor: {state}");
    }
    let report = json(&window(&scratch, "2s", &[]).wait_with_output().unwrap());
    let cut_off = |r: &Value| r["remarks"].to_string().matches("when an earlier job was cut off").count();
    assert!(cut_off(&report) >= cpus().len(), "{report:#}");
    let report = json(&window(&scratch, "2s", &[]).wait_with_output().unwrap());
    assert_eq!(cut_off(&report), 0, "{report:#}");
}

#[test]
fn a_signal_to_every_process_at_once_still_gives_a_whole_report() {
    let _turn = alone();
    let scratch = Scratch::new("everyone");
    let child = window(&scratch, "10m", &[]);
    let workers: Vec<Pid> = cpus().into_iter().map(|cpu| worker(&child, cpu)).collect();
    std::thread::sleep(Duration::from_millis(1200));
    for pid in workers {
        kill(pid, Signal::SIGTERM).unwrap();
    }
    kill(Pid::from_raw(child.id() as i32), Signal::SIGTERM).unwrap();
    let report = json(&child.wait_with_output().unwrap());
    assert_eq!((&report["lost"], &report["ending"]), (&Value::Array(vec![]), &Value::from("signal")), "{report:#}");
    assert!(report["cores"].as_array().unwrap().iter().all(|c| c["runs"].as_u64() > Some(0)));
}

#[test]
fn a_supervisor_that_was_held_up_blames_nobody() {
    let _turn = alone();
    let scratch = Scratch::new("held-up");
    let child = window(&scratch, "9s", &[]);
    let supervisor = Pid::from_raw(child.id() as i32);
    let everyone: Vec<Pid> = cpus().into_iter().map(|cpu| worker(&child, cpu)).chain([supervisor]).collect();
    std::thread::sleep(Duration::from_millis(1200));
    // as a frozen control group would have it: the workers first, all of them for longer than any deadline
    everyone.iter().for_each(|pid| kill(*pid, Signal::SIGSTOP).unwrap());
    std::thread::sleep(Duration::from_millis(4500));
    everyone.iter().for_each(|pid| kill(*pid, Signal::SIGCONT).unwrap());
    let output = child.wait_with_output().unwrap();
    let report = json(&output);
    assert_eq!((output.status.code(), &report["verdict"]), (Some(0), &Value::from("clear")), "{report:#}");
    assert!(report["remarks"].to_string().contains("held up"), "{report:#}");
}

/// A host of two cpus with one temperature and one memory controller, as files.
fn made_up_host(scratch: &Scratch) -> impl Fn(&str, &str) {
    let root = scratch.path().join("root");
    let put = move |path: &str, text: &str| {
        let path = root.join(path);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        // as a whole, so that no reader sees half of it
        let next = path.with_extension("next");
        std::fs::write(&next, text).unwrap();
        std::fs::rename(next, path).unwrap();
    };
    let all = cpus();
    let list: Vec<String> = all.iter().map(u32::to_string).collect();
    put("sys/devices/system/cpu/online", &format!("{}\n", list.join(",")));
    for cpu in all {
        let folder = format!("sys/devices/system/cpu/cpu{cpu}/topology");
        put(&format!("{folder}/core_id"), &format!("{cpu}\n"));
        put(&format!("{folder}/physical_package_id"), "0\n");
        put(&format!("{folder}/thread_siblings_list"), &format!("{cpu}\n"));
    }
    put("sys/class/hwmon/hwmon0/name", "k10temp\n");
    put("sys/class/hwmon/hwmon0/temp1_label", "Tctl\n");
    put("sys/class/hwmon/hwmon0/temp1_input", "50000\n");
    put("sys/devices/system/edac/mc/mc0/ce_count", "0\n");
    put("sys/devices/system/edac/mc/mc0/ue_count", "0\n");
    put
}

#[test]
fn a_hot_cpu_pauses_and_goes_on_and_a_corrected_error_is_attached() {
    let _turn = alone();
    let scratch = Scratch::new("hot");
    let put = made_up_host(&scratch);
    let root = scratch.path().join("root").display().to_string();
    let child = window(&scratch, "9s", &["--root", &root, "--max-temp", "80"]);
    worker(&child, cpus()[0]);
    std::thread::sleep(Duration::from_millis(1500));
    put("sys/class/hwmon/hwmon0/temp1_input", "91500\n");
    put("sys/devices/system/edac/mc/mc0/ce_count", "3\n");
    std::thread::sleep(Duration::from_millis(2500));
    put("sys/class/hwmon/hwmon0/temp1_input", "60000\n");
    let output = child.wait_with_output().unwrap();
    let report = json(&output);
    let remarks = report["remarks"].to_string();
    for cpu in cpus() {
        assert!(remarks.contains(&format!("cpu {cpu} pauses: 91.5 °C")), "{report:#}");
        assert!(remarks.contains(&format!("cpu {cpu} goes on: it has cooled to 60.0 °C")), "{report:#}");
    }
    assert!(remarks.contains("corrected memory errors at mc0: 3 more"), "{report:#}");
    assert_eq!((output.status.code(), &report["verdict"]), (Some(0), &Value::from("clear")), "{report:#}");
    assert!(report["wall_s"].as_f64() < Some(10.0));
}

#[test]
fn a_cpu_that_goes_offline_is_recorded_and_skipped() {
    let _turn = alone();
    let cpus = cpus();
    let [first, .., last] = cpus.as_slice() else { return };
    let scratch = Scratch::new("offline");
    let put = made_up_host(&scratch);
    let root = scratch.path().join("root").display().to_string();
    let child = window(&scratch, "6s", &["--root", &root]);
    worker(&child, *last);
    std::thread::sleep(Duration::from_millis(1500));
    let left: Vec<String> = cpus.iter().filter(|c| *c != last).map(u32::to_string).collect();
    put("sys/devices/system/cpu/online", &format!("{}\n", left.join(",")));
    let output = child.wait_with_output().unwrap();
    let report = json(&output);
    assert!(report["remarks"].to_string().contains(&format!("cpu {last} is skipped from now on: it went offline")));
    assert_eq!((output.status.code(), &report["lost"]), (Some(0), &Value::Array(vec![])), "{report:#}");
    let busy = |cpu: u32| {
        let cores = report["cores"].as_array().unwrap();
        cores.iter().find(|c| c["cpu"] == cpu).unwrap()["busy_s"].as_f64().unwrap()
    };
    assert!(busy(*first) > busy(*last) && busy(*last) > 0.0, "{report:#}");
}

#[test]
fn a_plan_is_explained_without_a_ledger_and_coverage_grows_with_windows() {
    let _turn = alone();
    let scratch = Scratch::new("explain");
    let ledger = scratch.ledger();
    let explained = run(&["window", "--explain", "--budget", "10m", "--format", "json", "--ledger", &ledger]);
    let plan = json(&explained);
    assert_eq!((explained.status.code(), &plan["schema"]), (Some(0), &Value::from("proofhouse/plan/1")));
    assert!(!Path::new(&ledger).exists(), "explaining a plan leaves nothing behind");
    assert_eq!(plan["grid"]["cells"], plan["grid"]["uncovered_before"]);
    assert!(plan["phases"].as_array().unwrap().len() > 10);
    let coverage = |args: &[&str]| {
        let mut all = vec!["ledger", "coverage", "--format", "json", "--ledger", &ledger];
        all.extend(args);
        run(&all)
    };
    assert_eq!(coverage(&[]).status.code(), Some(3), "there is no ledger yet");
    json(&window(&scratch, "3s", &[]).wait_with_output().unwrap());
    let covered = json(&coverage(&["--kernels", "integer.*"]));
    assert_eq!(covered["schema"], "proofhouse/coverage/1");
    let plain = if cpus().len() > 1 { "all steady 100%" } else { "solo steady 100%" };
    let sweep = &covered["conditions"][plain];
    assert_eq!(sweep["cells"], sweep["covered"], "{:#}", covered["conditions"]);
    assert_eq!(sweep["overdue"], 0);
    let text = String::from_utf8(run(&["window", "--explain", "--budget", "1s", "--ledger", &ledger]).stdout).unwrap();
    assert!(text.contains("Nothing was run"), "{text}");
}
