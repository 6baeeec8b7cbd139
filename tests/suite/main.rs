//! One integration binary; one file a topic.

mod statistics;
mod statistics_edges;
