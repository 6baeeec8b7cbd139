//! The figures that the verdict rules are built to keep: how often one-off upsets are reckoned with, and how often a
//! healthy host may lose a core for them.
//!
//! A healthy core is wrong now and then: a particle strikes a latch that nothing guards. Such an upset happens once and
//! not again. Two of them on one core are the only way in which a healthy core is withdrawn by counting, so the number
//! of slices with mismatches that convicts grows with the time on record.

use crate::stats::poisson_at_least;

/// Rates and risks that the rules assume and promise.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Design {
    /// One-off upsets of a healthy core per busy hour.
    pub upsets_per_core_hour: f64,
    /// Probability that a healthy host has a core withdrawn within a year by counting, over all its cores, kernels and
    /// windows.
    pub false_withdraw_per_host_year: f64,
    /// Windows a year, where the record is too young to tell.
    pub windows_per_year: f64,
}

/// The design that is used.
///
/// Upsets: 114 silent failures per 10⁹ hours is the aim that makers have published for a whole processor (a thousand
/// years between silent errors: D. C. Bossen, IRPS 2002, as told by S. S. Mukherjee, J. Emer & S. K. Reinhardt, HPCA
/// 2005; from memory). Taken here nine times over and for every core: 10⁻⁶ per busy core-hour. Windows: one a day,
/// common practice, no source. The risk is this project's own choice.
pub const DESIGN: Design =
    Design { upsets_per_core_hour: 1e-6, false_withdraw_per_host_year: 1e-5, windows_per_year: 365.0 };

/// Silence this long after a mismatch, in units of the exposure that the mismatch took to show, has 5 % probability if
/// the core is as bad as it showed: −ln 0.05, the rule of three.
pub const SETTLED_AFTER: f64 = 2.995_732_273_553_991;

/// What the record of one core says about its past and its pace.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Exposure {
    /// Busy hours of this core on record, this job's among them.
    pub hours: f64,
    /// Busy hours of one window like this one.
    pub hours_a_window: f64,
    /// Cores of the host that are tested.
    pub cores: u64,
}

impl Design {
    /// The probability per year that upsets alone bring some healthy core of such a host to `occasions` slices with
    /// mismatches on its record: the last of them falls into the year, the others into the hours on record.
    pub fn false_withdraw(&self, exposure: &Exposure, occasions: u64) -> f64 {
        let upsets_a_year = self.upsets_per_core_hour * exposure.hours_a_window * self.windows_per_year;
        let before = self.upsets_per_core_hour * exposure.hours;
        let others = if occasions < 2 { 1.0 } else { poisson_at_least(occasions - 1, before) };
        (exposure.cores as f64 * upsets_a_year * others).min(1.0)
    }

    /// Slices with mismatches that convict: the fewest, but two at least, that keep the promise.
    pub fn occasions_needed(&self, exposure: &Exposure) -> u64 {
        (2..100).find(|&n| self.false_withdraw(exposure, n) <= self.false_withdraw_per_host_year).unwrap_or(100)
    }

    /// The probability that upsets alone bring one healthy core to so many in its hours on record.
    pub fn by_upsets(&self, occasions: u64, hours: f64) -> f64 {
        poisson_at_least(occasions, self.upsets_per_core_hour * hours)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn exposure(hours: f64, hours_a_window: f64, cores: u64) -> Exposure {
        Exposure { hours, hours_a_window, cores }
    }

    #[test]
    fn two_slices_convict_in_windows_and_more_after_a_long_soak() {
        let window = exposure(1.0 / 6.0, 1.0 / 6.0, 128);
        assert_eq!(DESIGN.occasions_needed(&window), 2);
        // five years of daily windows
        assert_eq!(DESIGN.occasions_needed(&exposure(5.0 * 365.0 / 6.0, 1.0 / 6.0, 128)), 2);
        assert!(DESIGN.occasions_needed(&exposure(50_000.0, 8.0, 256)) > 2);
        assert_eq!(DESIGN.occasions_needed(&Exposure::default()), 2);
    }

    /// By hand: 128 cores, 60.8 hours a year at 10⁻⁶, 304 hours on record: 128 · 6.08e-5 · 3.04e-4.
    #[test]
    fn the_promise_is_what_the_law_says() {
        let five_years = exposure(5.0 * 365.0 / 6.0, 1.0 / 6.0, 128);
        let by_hand = 128.0 * (365.0 / 6.0 * 1e-6) * (-(-5.0 * 365.0 / 6.0 * 1e-6_f64).exp_m1());
        assert!((DESIGN.false_withdraw(&five_years, 2) / by_hand - 1.0).abs() < 1e-9);
        assert!(by_hand < DESIGN.false_withdraw_per_host_year);
        assert!(DESIGN.false_withdraw(&five_years, 1) > DESIGN.false_withdraw_per_host_year);
    }
}
