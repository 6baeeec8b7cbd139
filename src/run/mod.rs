//! Running work on cores: one long-lived worker process a cpu, pinned; a supervisor without IO; a driver that does
//! the IO. Emits events and prints nothing.

pub mod checker;
mod child;
pub mod driver;
pub mod fault;
mod lane;
pub mod pace;
mod partner;
pub mod pinning;
pub mod protocol;
mod records;
pub mod spec;
pub mod supervisor;
pub mod worker;
