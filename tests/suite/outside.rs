//! Faults from outside: a tracer attaches to a real worker and flips one bit in a vector register, in a general
//! register or in a page of its heap, in the middle of a slice. Whatever comes of it has to be put down to that
//! worker's core and to no other.
//!
//! `PROOFHOUSE_FLIPS=100` makes it the campaign of `scripts/outside-flips`; the default is short.

#![cfg(target_arch = "x86_64")]

use std::time::{Duration, SystemTime, UNIX_EPOCH};

use nix::sys::ptrace::{self, Options};
use nix::sys::wait::waitpid;
use nix::unistd::Pid;
use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};
use serde_json::Value;

use super::running::{Scratch, alone, cpus, json, program, worker, worker_within};

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Target {
    Vector,
    General,
    Heap,
}

fn unix_ms() -> u64 {
    SystemTime::now().duration_since(UNIX_EPOCH).unwrap().as_millis() as u64
}

/// Flips one bit in a stopped worker; false when the place could not be had.
fn flip(pid: Pid, target: Target, rng: &mut ChaCha12Rng) -> nix::Result<()> {
    match target {
        Target::Vector => {
            let mut registers = ptrace::getregset::<ptrace::regset::NT_PRFPREG>(pid)?;
            let place = rng.next_u64() as usize % (registers.xmm_space.len() * 32);
            registers.xmm_space[place / 32] ^= 1 << (place % 32);
            ptrace::setregset::<ptrace::regset::NT_PRFPREG>(pid, registers)
        }
        Target::General => {
            let mut registers = ptrace::getregs(pid)?;
            let bit = 1u64 << (rng.next_u64() % 64);
            // the pointers to stack and code crash at once and say nothing about attribution; all others are fair
            match rng.next_u64() % 14 {
                0 => registers.rax ^= bit,
                1 => registers.rbx ^= bit,
                2 => registers.rcx ^= bit,
                3 => registers.rdx ^= bit,
                4 => registers.rsi ^= bit,
                5 => registers.rdi ^= bit,
                6 => registers.rbp ^= bit,
                7 => registers.r8 ^= bit,
                8 => registers.r9 ^= bit,
                9 => registers.r10 ^= bit,
                10 => registers.r11 ^= bit,
                11 => registers.r12 ^= bit,
                12 => registers.r13 ^= bit,
                _ => registers.r14 ^= bit,
            }
            ptrace::setregs(pid, registers)
        }
        Target::Heap => {
            let maps = std::fs::read_to_string(format!("/proc/{pid}/maps")).unwrap_or_default();
            let heap = maps
                .lines()
                .find(|l| l.ends_with("[heap]"))
                .and_then(|l| l.split(' ').next())
                .and_then(|r| r.split_once('-'));
            let Some((low, high)) = heap else { return Err(nix::errno::Errno::ENOENT) };
            let parse = |t| u64::from_str_radix(t, 16).unwrap();
            let (low, high) = (parse(low), parse(high));
            let address = low + (rng.next_u64() % ((high - low) / 8)) * 8;
            let word = ptrace::read(pid, address as ptrace::AddressType)?;
            ptrace::write(pid, address as ptrace::AddressType, word ^ (1 << (rng.next_u64() % 64)))
        }
    }
}

/// One window with flips of one kind on the last cpu; returns (flips made, flips noticed).
fn campaign(target: Target, flips: u64, seed: u64) -> (u64, u64) {
    let _turn = alone();
    let cpu = *cpus().last().unwrap();
    let scratch = Scratch::new("outside");
    let ledger = scratch.ledger();
    let every = Duration::from_millis(450);
    let budget = format!("{}s", 4 + (every.as_millis() as u64 * flips).div_ceil(1000));
    let child = program(&["window", "--budget", &budget, "--format", "json", "--ledger", &ledger]).spawn().unwrap();
    let mut rng = ChaCha12Rng::seed_from_u64(seed);
    let mut times = Vec::new();
    worker(&child, cpu);
    std::thread::sleep(Duration::from_millis(900));
    for _ in 0..flips {
        std::thread::sleep(every.mul_f64(0.8 + 0.3 * (rng.next_u64() % 1000) as f64 / 1000.0));
        // it may have been lost to the last flip and replaced; after too many losses the cpu is left alone
        let Some(pid) = worker_within(&child, cpu, Duration::from_secs(3)) else { break };
        let made = ptrace::seize(pid, Options::empty()).and_then(|()| {
            ptrace::interrupt(pid)?;
            waitpid(pid, None)?;
            let made = flip(pid, target, &mut rng);
            ptrace::detach(pid, None)?;
            made
        });
        if made.is_ok() {
            times.push(unix_ms());
        }
    }
    let output = child.wait_with_output().unwrap();
    let report = json(&output);
    for core in report["cores"].as_array().unwrap() {
        if core["cpu"] != cpu {
            // of a worker that is lost while two cpus work together nobody knows which of them it was, unless one of
            // them is convicted of something else
            let any = |list: &str, of: &dyn Fn(&Value) -> bool| report[list].as_array().unwrap().iter().any(of);
            let together = any("lost", &|lost| lost["partner"] == core["cpu"]);
            let convicted = any("findings", &|f| f["cpu"] == cpu && f["confirmation"] == "repeated");
            let verdict = if together && !convicted { "watch" } else { "clear" };
            assert_eq!(
                (&core["verdict"], &core["mismatches"]),
                (&Value::from(verdict), &Value::from(0)),
                "{target:?}: {report:#}"
            );
        }
    }
    for list in ["findings", "lost"] {
        assert!(report[list].as_array().unwrap().iter().all(|f| f["cpu"] == cpu), "{target:?}: {report:#}");
    }
    let mut sightings = Vec::new();
    for line in std::fs::read_to_string(scratch.path().join("ledger/segment-000001.jsonl")).unwrap().lines() {
        let body = serde_json::from_str::<Value>(line).unwrap()["body"].clone();
        if body["kind"] == "mismatch" || body["kind"] == "lost" {
            assert_eq!(body["cpu"], cpu, "{target:?}: {body:#}");
            sightings.push(body["wall_ms"].as_u64().unwrap());
        }
    }
    // a sighting speaks for the last flip before it, so no flip is called noticed by the trace of another
    let before = |s: &u64| times.iter().rposition(|t| t <= s);
    let noticed = sightings.iter().filter_map(before).collect::<std::collections::BTreeSet<_>>().len() as u64;
    println!(
        "{target:?}: {} flips, {noticed} noticed, {} sightings, all on cpu {cpu}, verdict {}",
        times.len(),
        sightings.len(),
        report["verdict"]
    );
    (times.len() as u64, noticed)
}

fn flips(short: u64) -> u64 {
    std::env::var("PROOFHOUSE_FLIPS").ok().and_then(|n| n.parse().ok()).unwrap_or(short)
}

#[test]
fn flips_in_vector_registers_are_put_down_to_their_core() {
    let (made, noticed) = campaign(Target::Vector, flips(12), 1);
    assert!(made > 0 && noticed > 0, "{made} flips, {noticed} noticed");
}

#[test]
fn flips_in_general_registers_are_put_down_to_their_core() {
    let (made, noticed) = campaign(Target::General, flips(10), 2);
    assert!(made > 0 && noticed > 0, "{made} flips, {noticed} noticed");
}

#[test]
fn flips_in_the_heap_are_put_down_to_their_core() {
    let (made, _) = campaign(Target::Heap, flips(8), 3);
    assert!(made > 0);
}
