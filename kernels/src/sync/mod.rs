//! What passes between two cores: atomics, locks, ownership of cache lines, order of memory accesses.
