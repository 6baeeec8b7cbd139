//! A worker as the supervisor's side sees it: a process, a thread that reads what it says, a thread that writes to it.

use std::io::{self, BufReader, Write};
use std::os::unix::process::CommandExt;
use std::path::Path;
use std::process::{Command, Stdio};
use std::sync::mpsc::{Sender, channel};
use std::time::{Duration, Instant};

use nix::sys::signal::{Signal, kill};
use nix::sys::wait::{WaitPidFlag, WaitStatus, waitpid};
use nix::unistd::Pid;

use super::protocol::{Message, Order, Received, receive};
use super::spec::Pulse;
use crate::event::How;
use crate::host::Cpu;

/// What a child's reader hands on: cpu, which of its workers, what.
pub type Heard = (Cpu, u64, Received<Message>);

impl Pulse {
    /// From `/proc/PID/stat` (proc_pid_stat(5), from memory): the state is the first field after the name in
    /// parentheses, utime and stime are the 12th and 13th, in ticks of 1/100 s on every Linux ABI.
    fn parse(stat: &str) -> Option<Pulse> {
        let mut fields = stat.rsplit_once(')')?.1.split_ascii_whitespace();
        let state = fields.next()?.chars().next()?;
        let mut times = fields.skip(10);
        let ticks = times.next()?.parse::<u64>().ok()? + times.next()?.parse::<u64>().ok()?;
        Some(Pulse { waiting: matches!(state, 'R' | 'D'), busy: Duration::from_millis(ticks * 10) })
    }
}

/// One worker process.
pub struct Child {
    pid: Pid,
    /// Tells this worker from earlier ones of the same cpu.
    pub generation: u64,
    orders: Sender<Vec<u8>>,
    ended: Option<How>,
}

impl Child {
    /// Starts `program worker --cpu N [--node N]`.
    pub fn start(
        program: &Path,
        cpu: Cpu,
        node: Option<u32>,
        generation: u64,
        hear: Sender<Heard>,
    ) -> io::Result<Child> {
        let mut process = Command::new(program)
            .args(["worker", "--cpu", &cpu.to_string()])
            .args(node.map(|node| format!("--node={node}")))
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            // a Ctrl-C is meant for the supervisor, which ends its workers when they have reported
            .process_group(0)
            // a worker's last words are no part of the report; its exit status is
            .stderr(Stdio::null())
            .spawn()?;
        let pid = Pid::from_raw(process.id() as i32);
        let (orders, queue) = channel::<Vec<u8>>();
        let gone = || io::Error::other("no pipe to the worker");
        let mut input = process.stdin.take().ok_or_else(gone)?;
        let output = process.stdout.take().ok_or_else(gone)?;
        std::thread::spawn(move || {
            for line in queue {
                // a worker that does not read any more is noticed by its end or its deadline
                if input.write_all(&line).and_then(|()| input.flush()).is_err() {
                    return;
                }
            }
        });
        std::thread::spawn(move || {
            let mut output = BufReader::new(output);
            loop {
                let heard = receive(&mut output);
                let last = matches!(heard, Received::End);
                if hear.send((cpu, generation, heard)).is_err() || last {
                    return;
                }
            }
        });
        Ok(Child { pid, generation, orders, ended: None })
    }

    /// What the system says of its main thread; none when it is gone.
    pub fn pulse(&self) -> Option<Pulse> {
        let stat = std::fs::read_to_string(format!("/proc/{}/stat", self.pid)).ok()?;
        Pulse::parse(&stat)
    }

    /// Queues an order.
    pub fn order(&self, order: &Order) {
        if let Ok(mut line) = serde_json::to_vec(order) {
            line.push(b'\n');
            // the writer is gone only when the worker is, which is noticed elsewhere
            let _ = self.orders.send(line);
        }
    }

    /// Looks for a change of state: `Some(true)` stopped from outside, `Some(false)` goes on.
    pub fn look(&mut self) -> Option<bool> {
        if self.ended.is_some() {
            return None;
        }
        let flags = WaitPidFlag::WNOHANG | WaitPidFlag::WUNTRACED | WaitPidFlag::WCONTINUED;
        match waitpid(self.pid, Some(flags)) {
            Ok(WaitStatus::Stopped(..)) => Some(true),
            Ok(WaitStatus::Continued(_)) => Some(false),
            Ok(status) => {
                self.note(status);
                None
            }
            Err(_) => None,
        }
    }

    fn note(&mut self, status: WaitStatus) {
        match status {
            WaitStatus::Exited(_, code) => self.ended = Some(How::Exit(code)),
            WaitStatus::Signaled(_, signal, _) => self.ended = Some(How::Signal(signal as i32)),
            _ => {}
        }
    }

    /// How it ended, once its pipe has closed; one that closed its pipe and lives on is killed.
    pub fn end(mut self) -> How {
        let patience = Instant::now() + Duration::from_millis(300);
        while self.ended.is_none() && Instant::now() < patience {
            self.look();
            std::thread::sleep(Duration::from_millis(1));
        }
        self.ended.take().unwrap_or_else(|| {
            self.kill();
            How::Babbled("closed its output and lived on".to_owned())
        })
    }

    /// Ends it at once and leaves no zombie, even where it takes the kernel a while.
    pub fn kill(mut self) {
        if self.ended.is_none() {
            let _ = kill(self.pid, Signal::SIGKILL);
            let pid = self.pid;
            self.ended = Some(How::Signal(Signal::SIGKILL as i32));
            std::thread::spawn(move || waitpid(pid, None));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn state_and_processor_time_are_found_behind_any_name() {
        let stat = "4711 (a) R (b) S 1 4711 4711 0 -1 4194304 100 0 0 0 250 50 0 0 20 0 2 0 12345 1000 100";
        assert_eq!(Pulse::parse(stat), Some(Pulse { waiting: false, busy: Duration::from_secs(3) }));
        assert_eq!(Pulse::parse("4711 (worker) R 1"), None);
        assert_eq!(Pulse::parse(""), None);
    }
}
