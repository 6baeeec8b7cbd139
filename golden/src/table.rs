//! The accepted values: embedded JSON tables, pinned by SHA-256.

use std::collections::HashMap;
use std::fmt;
use std::sync::LazyLock;

use kernels::{Case, Seed, Size};
use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};

/// Seeds 0 … n−1 are in the tables for each listed (kernel, size in KiB, n). A test holds this against the catalogue.
pub static PLAN: &[(&str, &[(u32, u64)])] = &[
    ("integer.multiply", &[(9, 64)]),
    ("integer.divide", &[(6, 64)]),
    ("integer.carry", &[(25, 64)]),
    ("integer.bits", &[(2, 64)]),
    ("integer.bignum", &[(6, 64)]),
    ("integer.compress", &[(8, 64)]),
    ("integer.sort", &[(8, 64)]),
    ("checksum.crc32c", &[(17, 64)]),
    ("checksum.clmul", &[(13, 64)]),
    ("float.chain32", &[(21, 64)]),
    ("float.chain64", &[(21, 64)]),
    ("float.convert", &[(18, 64)]),
    ("float.powcast", &[(4, 64)]),
    ("float.elementary", &[(24, 64)]),
    ("float.x87", &[(2, 64)]),
    ("fma.chain32", &[(22, 64)]),
    ("fma.chain64", &[(22, 64)]),
    ("fma.matmul32", &[(108, 64)]),
    ("fma.matmul64", &[(216, 64)]),
    ("fma.mixed", &[(18, 64)]),
    ("vector.shuffle", &[(13, 64)]),
    ("vector.gather", &[(25, 64), (265, 64)]),
    ("vector.integer", &[(23, 64)]),
    ("vector.permute", &[(9, 64)]),
    ("vector.dot8", &[(25, 64)]),
    ("vector.mask", &[(17, 64)]),
    ("cipher.aes", &[(6, 64)]),
    ("cipher.sha256", &[(16, 64)]),
    ("string.copy", &[(20, 64)]),
    ("cache.walk", &[(256, 64), (16, 64), (4096, 64)]),
    ("cache.forward", &[(12, 64)]),
    ("cache.evict", &[(512, 64), (4096, 64), (32_768, 64)]),
    ("memory.march", &[(1024, 64), (32, 64), (4096, 64)]),
    ("memory.copy", &[(384, 64), (24, 64), (3072, 64)]),
    ("memory.stream", &[(384, 64), (24, 64), (4096, 64), (32_768, 64)]),
    ("memory.walk", &[(4096, 64), (256, 64), (32_768, 64)]),
    ("sync.counter", &[(25, 64)]),
    ("sync.lock", &[(9, 64)]),
    ("sync.pingpong", &[(21, 64)]),
    ("sync.ordering", &[(19, 64)]),
];

macro_rules! embed {
    ($($id:literal),* $(,)?) => {
        &[$(($id, include_str!(concat!("../tables/", $id, ".json")))),*]
    };
}

/// Every embedded table's text by kernel id.
pub static TABLES: &[(&str, &str)] = embed![
    "integer.multiply",
    "integer.divide",
    "integer.carry",
    "integer.bits",
    "integer.bignum",
    "integer.compress",
    "integer.sort",
    "checksum.crc32c",
    "checksum.clmul",
    "float.chain32",
    "float.chain64",
    "float.convert",
    "float.powcast",
    "float.elementary",
    "float.x87",
    "fma.chain32",
    "fma.chain64",
    "fma.matmul32",
    "fma.matmul64",
    "fma.mixed",
    "vector.shuffle",
    "vector.gather",
    "vector.integer",
    "vector.permute",
    "vector.dot8",
    "vector.mask",
    "cipher.aes",
    "cipher.sha256",
    "string.copy",
    "cache.walk",
    "cache.forward",
    "cache.evict",
    "memory.march",
    "memory.copy",
    "memory.stream",
    "memory.walk",
    "sync.counter",
    "sync.lock",
    "sync.pingpong",
    "sync.ordering",
];

/// SHA-256 of each table, in the format of `sha256sum`.
pub static PINS: &str = include_str!("../tables/SHA256SUMS");

/// A table's file.
#[derive(Debug, Serialize, Deserialize)]
pub struct Table {
    /// `proofhouse/golden/1`.
    pub schema: String,
    /// Kernel id.
    pub kernel: String,
    /// Who computed the values.
    pub provenance: Provenance,
    /// The accepted outputs.
    pub cases: Vec<Row>,
}

/// The two ways that agreed on every word of a table.
#[derive(Debug, Serialize, Deserialize)]
pub struct Provenance {
    /// Rust module and the SHA-256 of its source.
    pub reference: Source,
    /// Python file and the SHA-256 of its source.
    pub witness: Source,
    /// The `common_*` files of the family that both may lean on, reference's first, each side by name.
    pub shared: Vec<Source>,
    /// Libraries that the witness leans on, with versions.
    pub libraries: String,
}

/// A source file by path and digest.
#[derive(Debug, Serialize, Deserialize)]
pub struct Source {
    /// Path below `golden/`.
    pub file: String,
    /// SHA-256 of the file, hexadecimal.
    pub sha256: String,
}

/// One accepted output.
#[derive(Debug, Serialize, Deserialize)]
pub struct Row {
    /// Operand seed.
    pub seed: u64,
    /// Footprint in KiB.
    pub size: u32,
    /// Output words, 16 hexadecimal digits each, most significant digit first.
    pub words: String,
}

/// Why the embedded tables cannot be believed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum TableError {
    /// The SHA-256 of the table is not the pinned one, or there is no pin.
    Digest(&'static str),
    /// The table is no valid JSON of its schema.
    Format(&'static str, String),
}

impl fmt::Display for TableError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            TableError::Digest(id) => {
                write!(f, "golden table {id} does not have its pinned digest; reinstall the program")
            }
            TableError::Format(id, why) => write!(f, "golden table {id} cannot be read: {why}"),
        }
    }
}

impl std::error::Error for TableError {}

/// Lower-case hexadecimal SHA-256.
pub fn sha256_hex(bytes: &[u8]) -> String {
    Sha256::digest(bytes).iter().map(|b| format!("{b:02x}")).collect()
}

/// Checks every embedded table against its pin.
pub fn verify_pins() -> Result<(), TableError> {
    for (id, text) in TABLES {
        let line = format!("{}  {id}.json", sha256_hex(text.as_bytes()));
        if !PINS.lines().any(|pin| pin == line) {
            return Err(TableError::Digest(id));
        }
    }
    Ok(())
}

/// SHA-256 over all pins: one digest that names the whole set of tables.
pub fn set_digest() -> String {
    sha256_hex(PINS.as_bytes())
}

/// Output words from their hexadecimal text.
pub fn parse_words(text: &str) -> Option<Vec<u64>> {
    if !text.is_ascii() || !text.len().is_multiple_of(16) {
        return None;
    }
    (0..text.len() / 16).map(|i| u64::from_str_radix(&text[i * 16..i * 16 + 16], 16).ok()).collect()
}

/// The inverse of [`parse_words`].
pub fn format_words(words: &[u64]) -> String {
    words.iter().map(|w| format!("{w:016x}")).collect()
}

type Parsed = HashMap<Case, Vec<u64>>;

fn parse_all() -> Result<Parsed, TableError> {
    let mut all = HashMap::new();
    for (id, text) in TABLES {
        let table: Table = serde_json::from_str(text).map_err(|e| TableError::Format(id, e.to_string()))?;
        for row in table.cases {
            let words =
                parse_words(&row.words).ok_or_else(|| TableError::Format(id, format!("words of seed {}", row.seed)))?;
            all.insert(Case { kernel: id, seed: Seed(row.seed), size: Size(row.size) }, words);
        }
    }
    Ok(all)
}

static PARSED: LazyLock<Result<Parsed, TableError>> = LazyLock::new(|| verify_pins().and_then(|()| parse_all()));

/// Opens the tables: pins checked, everything parsed.
pub fn open() -> Result<(), TableError> {
    PARSED.as_ref().map(|_| ()).map_err(Clone::clone)
}

/// The accepted output of `case`, if the tables have it. Call [`open`] first to learn of damaged tables.
pub fn expected(case: &Case) -> Option<&'static [u64]> {
    PARSED.as_ref().ok()?.get(case).map(Vec::as_slice)
}

/// The cases in the tables for a kernel and size, by seed.
pub fn cases(kernel: &str, size: Size) -> Vec<Case> {
    PLAN.iter()
        .filter(|(id, _)| *id == kernel)
        .flat_map(|(id, sizes)| sizes.iter().map(move |s| (*id, *s)))
        .filter(|(_, (kib, _))| *kib == size.0)
        .flat_map(|(id, (_, seeds))| (0..seeds).map(move |s| Case { kernel: id, seed: Seed(s), size }))
        .collect()
}
