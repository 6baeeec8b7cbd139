//! Made-up faults for drills: applied inside a real worker to real outputs, before its own comparison sees them.

use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};
use serde::{Deserialize, Serialize};

/// A made-up fault of one worker during one slice.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Fault {
    /// One bit of one output word is flipped: in the first run, and in later ones with this probability.
    FlippedBit {
        /// Probability per run.
        per_run: f64,
        /// Seed of time and place.
        seed: u64,
    },
    /// In every output, the words of one lane hold one value.
    StuckLane {
        /// Words whose index is this, modulo 4.
        lane: u8,
        /// The value.
        value: u64,
    },
    /// As a flipped bit, and the worker's own comparison sees nothing.
    BlindComparison {
        /// Probability per run.
        per_run: f64,
        /// Seed of time and place.
        seed: u64,
    },
    /// The worker ends itself by a signal after this part of the slice.
    Crash {
        /// Signal number.
        signal: i32,
        /// From 0 to 1.
        after: f64,
    },
    /// The worker stops answering after this part of the slice.
    Hang {
        /// From 0 to 1.
        after: f64,
    },
    /// The worker writes nonsense to its pipe.
    Babble,
}

/// A fault's state within a slice.
pub struct Armed {
    fault: Fault,
    rng: ChaCha12Rng,
    shown: bool,
}

/// What a fault does to the run under way.
pub struct Effect {
    /// The worker's own comparison is to see nothing.
    pub blind: bool,
}

impl Armed {
    /// Arms a fault.
    pub fn new(fault: Fault) -> Armed {
        let seed = match fault {
            Fault::FlippedBit { seed, .. } | Fault::BlindComparison { seed, .. } => seed,
            _ => 0,
        };
        Armed { fault, rng: ChaCha12Rng::seed_from_u64(seed), shown: false }
    }

    /// Alters one output; `elapsed` is the part of the slice that is over.
    pub fn apply(&mut self, out: &mut [u64], elapsed: f64) -> Effect {
        match self.fault {
            Fault::FlippedBit { per_run, .. } => {
                self.flip(out, per_run);
                Effect { blind: false }
            }
            Fault::BlindComparison { per_run, .. } => {
                self.flip(out, per_run);
                Effect { blind: true }
            }
            Fault::StuckLane { lane, value } => {
                let lanes = out.len().min(4);
                for word in out.iter_mut().skip(usize::from(lane) % lanes).step_by(lanes) {
                    *word = value;
                }
                Effect { blind: false }
            }
            Fault::Crash { signal, after } => {
                if elapsed >= after {
                    crash(signal);
                }
                Effect { blind: false }
            }
            Fault::Hang { after } => {
                if elapsed >= after {
                    loop {
                        std::thread::park();
                    }
                }
                Effect { blind: false }
            }
            Fault::Babble => Effect { blind: false },
        }
    }

    fn flip(&mut self, out: &mut [u64], per_run: f64) {
        // 53 random bits as a fraction of 2^53: uniform in [0, 1)
        let chance = (self.rng.next_u64() >> 11) as f64 / (1u64 << 53) as f64;
        if chance < per_run || !self.shown {
            self.shown = true;
            let place = self.rng.next_u64();
            let index = (place >> 6) as usize % out.len();
            out[index] ^= 1 << (place & 63);
        }
    }
}

fn crash(signal: i32) -> ! {
    if let Ok(signal) = nix::sys::signal::Signal::try_from(signal) {
        // a handler of the runtime may stand in the way of a plain raise of SIGSEGV
        let default = nix::sys::signal::SigAction::new(
            nix::sys::signal::SigHandler::SigDfl,
            nix::sys::signal::SaFlags::empty(),
            nix::sys::signal::SigSet::empty(),
        );
        // SAFETY: the default action is no handler, so no code of ours runs in a signal's context
        let _ = unsafe { nix::sys::signal::sigaction(signal, &default) };
        let _ = nix::sys::signal::raise(signal);
    }
    std::process::abort()
}
