//! How hard a worker works: when it is to begin a stretch of runs and when to end it, on the system's monotonic clock.
//!
//! A pause of more than [`SPIN`] is slept but for its last part, because waking takes the system tens of
//! microseconds; the rest, and shorter pauses, are spun in the processor's own waiting instruction.

use std::time::Duration;

use rand_chacha::ChaCha12Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

use crate::condition::Pace;

/// The last part of a pause that is spun, in nanoseconds; before a step more, so that it begins on time where waking takes
/// long.
const SPIN: u64 = 150_000;
const SPIN_STEP: u64 = 400_000;
/// Steps begin so long after the multiples of their period, in nanoseconds: the system's own tick falls on multiples of
/// 1, 4 or 10 ms of the same clock, on every cpu.
pub const CLEAR_OF_TICK: u64 = 300_000;
/// Longest sleep without a look whether to go on, in nanoseconds.
const NAP: u64 = 10_000_000;
/// A stretch of work under a steady duty below 100 %, in nanoseconds.
const STRETCH: u64 = 1_000_000;
/// A step that begins no later than this after its time is on time, in nanoseconds.
pub const ON_TIME: u64 = 20_000;

/// Nanoseconds of the system's monotonic clock, which all processes share.
pub fn monotonic() -> u64 {
    nix::time::clock_gettime(nix::time::ClockId::CLOCK_MONOTONIC).map_or(0, |t| Duration::from(t).as_nanos() as u64)
}

/// Gives the beat of one slice.
pub struct Metronome {
    pace: Pace,
    start: u64,
    begun: u64,
    rng: ChaCha12Rng,
    /// Time inside stretches so far, in nanoseconds.
    pub worked: u64,
    /// Stretches begun.
    pub stretches: u64,
    /// Those of a stepped pace that began on time.
    pub on_time: u64,
}

impl Metronome {
    /// For a slice that starts now; `seed` draws the delays of dithered steps.
    pub fn new(pace: Pace, seed: u64) -> Metronome {
        let now = monotonic();
        Metronome {
            pace,
            start: now,
            begun: now,
            rng: ChaCha12Rng::seed_from_u64(seed),
            worked: 0,
            stretches: 0,
            on_time: 0,
        }
    }

    /// Whether there are no pauses at all.
    pub fn full(&self) -> bool {
        self.pace == Pace::FULL
    }

    /// How long a stretch lasts at most, if pauses are ordered.
    pub fn stretch(&self) -> Option<Duration> {
        let ns = match self.pace {
            Pace::FULL => return None,
            Pace::Steady { .. } => STRETCH,
            Pace::Burst { on_us, .. } => u64::from(on_us) * 1000,
            Pace::Step { period_us, .. } => u64::from(period_us) * 500,
        };
        Some(Duration::from_nanos(ns))
    }

    /// Waits for the next stretch. Gives its end, or nothing when `until` comes first or `stop` says so. The first one of
    /// a slice, and any without pauses, is given however late it is: a slice without a run says nothing.
    pub fn next(&mut self, until: u64, stop: impl Fn() -> bool) -> Option<u64> {
        let now = monotonic();
        let until = if self.stretches == 0 || self.full() { u64::MAX } else { until };
        let (due, length) = match self.pace {
            Pace::FULL => (now, u64::MAX - now),
            Pace::Steady { percent } => (self.start + self.worked * 100 / u64::from(percent.max(1)), STRETCH),
            Pace::Burst { on_us, off_us } => {
                let pause = if self.stretches == 0 { 0 } else { u64::from(off_us) * 1000 };
                (self.begun + pause, u64::from(on_us) * 1000)
            }
            Pace::Step { period_us, dithered } => {
                let period = (u64::from(period_us) * 1000).max(2);
                let late = if dithered { self.rng.next_u64() % (period / 2) } else { 0 };
                let clear = CLEAR_OF_TICK % (period / 2).max(1);
                ((now.saturating_sub(clear) / period + 1) * period + clear + late, period / 2)
            }
        };
        let spin = if matches!(self.pace, Pace::Step { .. }) { SPIN_STEP } else { SPIN };
        wait(due, until, spin, stop)?;
        self.begun = monotonic();
        if self.begun >= until {
            return None;
        }
        self.stretches += 1;
        self.on_time += u64::from(self.begun.saturating_sub(due) <= ON_TIME);
        Some(self.begun.saturating_add(length))
    }

    /// The stretch has ended.
    pub fn ended(&mut self) {
        let now = monotonic();
        self.worked += now.saturating_sub(self.begun);
        // a burst's pause counts from here
        self.begun = now;
    }

    /// Steps begun and those on time, if the pace is stepped.
    pub fn steps(&self) -> Option<(u64, u64)> {
        matches!(self.pace, Pace::Step { .. }).then_some((self.stretches, self.on_time))
    }
}

/// Waits until `due`; nothing if `until` comes first or `stop` says so.
fn wait(due: u64, until: u64, spin: u64, stop: impl Fn() -> bool) -> Option<()> {
    let target = due.min(until);
    loop {
        let left = target.saturating_sub(monotonic());
        if left == 0 {
            break;
        }
        if left > spin + SPIN {
            if stop() {
                return None;
            }
            std::thread::sleep(Duration::from_nanos((left - spin).min(NAP)));
        } else {
            std::hint::spin_loop();
        }
    }
    (due <= until).then_some(())
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Plays a pace for `ms` milliseconds with stretches that take exactly as long as they may.
    fn play(pace: Pace, ms: u64) -> (Metronome, f64) {
        let mut beat = Metronome::new(pace, 7);
        let start = monotonic();
        let until = start + ms * 1_000_000;
        while let Some(end) = beat.next(until, || false) {
            while monotonic() < end.min(until) {
                std::hint::spin_loop();
            }
            beat.ended();
        }
        let share = beat.worked as f64 / (monotonic() - start) as f64;
        (beat, share)
    }

    #[test]
    fn a_duty_is_kept_by_its_own_account() {
        for percent in [5, 25, 50, 75] {
            let (beat, share) = play(Pace::Steady { percent }, 200);
            // others may hold this thread up; the account corrects itself, so that no more is worked than ordered
            assert!(beat.stretches > 2 && share < f64::from(percent) / 100.0 + 0.03, "{percent} %: {share}");
        }
    }

    #[test]
    fn aligned_steps_begin_at_multiples_of_their_period() {
        let mut beat = Metronome::new(Pace::Step { period_us: 2000, dithered: false }, 0);
        let mut on_time = 0;
        for _ in 0..5 {
            let end = beat.next(u64::MAX, || false).unwrap();
            let began = end - 1_000_000;
            assert_eq!(began, beat.begun);
            // how late each was is its distance from the last due time, unless it was held up for a whole period
            on_time += u64::from((began - CLEAR_OF_TICK) % 2_000_000 <= ON_TIME);
            beat.ended();
        }
        let (steps, counted) = beat.steps().unwrap();
        assert!(steps == 5 && counted <= on_time, "{counted} counted on time, {on_time} are");
        assert!(Metronome::new(Pace::FULL, 0).steps().is_none());
    }

    #[test]
    fn the_first_stretch_and_any_at_full_pace_come_however_late() {
        for pace in [Pace::FULL, Pace::Steady { percent: 50 }, Pace::Step { period_us: 2000, dithered: true }] {
            let mut beat = Metronome::new(pace, 0);
            assert!(beat.next(0, || false).is_some(), "{pace}");
            beat.ended();
            assert_eq!(beat.next(0, || false).is_some(), pace == Pace::FULL, "{pace}");
        }
    }

    #[test]
    fn an_end_or_a_halt_cuts_a_pause_short() {
        let mut beat = Metronome::new(Pace::Burst { on_us: 10, off_us: 60_000_000 }, 0);
        assert!(beat.next(u64::MAX, || false).is_some());
        beat.ended();
        assert!(beat.next(monotonic() + 1_000_000, || false).is_none());
        assert!(beat.next(u64::MAX, || true).is_none());
    }
}
