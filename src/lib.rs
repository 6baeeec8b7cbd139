//! Finds CPU cores that compute wrongly, and says how rare their wrong answers are.

pub mod cli;
pub mod condition;
pub mod error;
pub mod event;
pub mod exit_code;
pub mod host;
pub mod judge;
pub mod ledger;
pub mod plan;
pub mod report;
pub mod run;
pub mod stats;
