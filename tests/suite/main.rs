//! The one integration binary, one file a topic.

mod supervisor;
//! One integration binary; one file a topic.

mod statistics;
mod statistics_edges;
