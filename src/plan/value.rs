//! What another second of a cell is worth.
//!
//! Weights of families are rough readings of published yields, one figure each, to be corrected by one's own ledgers: FMA
//! more than 75 % of cases in a study of vector units (Mei et al., ASPLOS 2026, obs. 13); vector and floating point orders
//! of magnitude above scalar integer addition (Chatzopoulos et al., HPCA 2025); 8 of 27 failing processors in coherence
//! and transactions (Wang et al., SOSP 2023, obs. 5); copies share logic with vector operations, and loads and gathers
//! err by offset (Hochschild et al., HotOS 2021; Mei et al., obs. 9). All read in notes on the papers only.

/// Weight of a kernel's family.
pub fn weight(family: &str) -> f64 {
    match family {
        "fma" => 4.0,
        "sync" => 3.0,
        "vector" => 2.5,
        "float" | "string" | "memory" | "cache" => 1.5,
        "cipher" | "checksum" => 1.0,
        _ => 0.75,
    }
}

/// Weight of a kernel that this core has been wrong in, against one that it has not.
pub const SUSPECTED: f64 = 20.0;
/// The same for another kernel of that family.
pub const RELATED: f64 = 4.0;
/// Part of the slots that go to what a core has been wrong in, where there is such.
pub const SUSPECTS_PART: f64 = 0.5;

/// Value of the next second: more than 80 % of failing settings show within one second and the rest thin out over
/// decades of time (Mei et al., ASPLOS 2026, obs. 5, read in notes only), so the gain falls as one over the time that was
/// spent already; it grows with every week that the cell was left alone.
pub fn next_second(weight: f64, spent_s: f64, idle_days: f64) -> f64 {
    weight * (1.0 + idle_days.clamp(0.0, 60.0) / 7.0) / (1.0 + spent_s)
}
