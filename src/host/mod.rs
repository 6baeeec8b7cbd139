//! What this host is: cpus and the cores behind them, identity, sensors, error counters, allowed cpus.
//!
//! Everything is read under one [`Root`], and nothing is written. What a host does not tell is never zero and never
//! guessed in silence: see [`Reading`] and [`Unreadable`]. Start with [`Host::read`]; [`HostSurvey::of`] makes the
//! document. During work, [`Sensors::read`] and [`Counters::read`] are the two that are called again.

pub mod affinity;
pub mod allowed;
pub mod caches;
pub mod core_types;
pub mod cores;
pub mod counters;
pub mod cpuinfo;
pub mod cpulist;
pub mod hwmon;
pub mod identity;
pub mod keys;
pub mod lacks;
pub mod machine;
pub mod placeholder;
pub mod root;
pub mod sensors;
pub mod survey;
pub mod text;
pub mod topology;
pub mod unreadable;
pub mod virtualised;

pub use allowed::{Allowed, AllowedError};
pub use counters::{Change, Counter, Counters};
pub use cpulist::{Core, Cpu, CpuChoice, CpuListError, CpuSet};
pub use machine::Host;
pub use root::{Reading, Root};
pub use sensors::{CpuReadings, Sensors};
pub use survey::HostSurvey;
pub use topology::Topology;
pub use unreadable::Unreadable;
