//! The one integration binary, one file a topic.

mod bad_input;
mod confirming;
mod host;
mod house;
mod ledger;
mod ledger_show;
mod outside;
mod pacing;
mod reckon;
mod reckon_refusals;
mod running;
mod statistics;
mod statistics_edges;
mod statistics_planning;
mod supervisor;
mod verdicts;
