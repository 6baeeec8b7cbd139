//! Makes and accepts golden tables: every case of the plan by reference and by witness; refuses where they differ.
//!
//! `golden-tables [KERNEL…]` run from the repository's root; `scripts/golden` prepares the witness's Python.

use std::collections::BTreeMap;
use std::io::{BufRead, BufReader, Write};
use std::path::Path;
use std::process::{Command, ExitCode, Stdio};

use golden::reference;
use golden::table::{PLAN, Provenance, Row, Source, Table, format_words, parse_words, sha256_hex};
use kernels::{Case, Seed, Size};
use rayon::prelude::*;

type Outputs = BTreeMap<(u32, u64), Vec<u64>>;

fn main() -> ExitCode {
    let wanted: Vec<String> = std::env::args().skip(1).collect();
    if let Some(unknown) = wanted.iter().find(|w| !PLAN.iter().any(|(id, _)| id == w)) {
        eprintln!("golden-tables: no kernel {unknown} in the plan of golden/src/table.rs");
        return ExitCode::from(2);
    }
    let chosen: Vec<_> = PLAN.iter().filter(|(id, _)| wanted.is_empty() || wanted.iter().any(|w| w == id)).collect();
    // half of the cores for the references, half for the witnesses' processes
    let results: Vec<Result<(), String>> =
        chosen.par_iter().map(|(id, sizes)| accept(id, sizes).map_err(|why| format!("{id}: {why}"))).collect();
    let mut failed = false;
    for why in results.into_iter().filter_map(Result::err) {
        eprintln!("golden-tables: {why}");
        failed = true;
    }
    if let Err(why) = pin() {
        eprintln!("golden-tables: pins: {why}");
        failed = true;
    }
    ExitCode::from(u8::from(failed))
}

fn accept(id: &'static str, sizes: &[(u32, u64)]) -> Result<(), String> {
    let cases: Vec<Case> = sizes
        .iter()
        .flat_map(|&(kib, seeds)| (0..seeds).map(move |s| Case { kernel: id, seed: Seed(s), size: Size(kib) }))
        .collect();
    let mine: Outputs = cases
        .par_iter()
        .map(|case| {
            let words = reference::words(case).ok_or_else(|| "no reference".to_owned())?;
            Ok(((case.size.0, case.seed.0), words))
        })
        .collect::<Result<_, String>>()?;
    let (theirs, libraries) = witness(id, &cases)?;
    for (key @ (kib, seed), words) in &mine {
        let other = theirs.get(key).ok_or_else(|| format!("witness gave no words for size {kib} seed {seed}"))?;
        if let Some(i) = (0..words.len().max(other.len())).find(|&i| words.get(i) != other.get(i)) {
            return Err(format!(
                "reference and witness differ at size {kib} seed {seed} word {i}: {:016x?} against {:016x?}; \
                 the table is left as it was",
                words.get(i),
                other.get(i)
            ));
        }
    }
    write(id, &mine, libraries).map_err(|e| e.to_string())?;
    println!("{id}: {} cases accepted", mine.len());
    Ok(())
}

fn witness(id: &str, cases: &[Case]) -> Result<(Outputs, String), String> {
    let python = std::env::var("PROOFHOUSE_PYTHON").unwrap_or_else(|_| "python3".to_owned());
    let mut child = Command::new(python)
        .arg("golden/witness/answer.py")
        .arg(id)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .map_err(|e| format!("witness cannot be started: {e}"))?;
    let mut questions = child.stdin.take().ok_or("no pipe to the witness")?;
    let list: String = cases.iter().map(|c| format!("{} {}\n", c.seed.0, c.size.0)).collect();
    // the witness reads all questions before it answers, so this cannot block on a full answer pipe
    questions.write_all(list.as_bytes()).map_err(|e| format!("witness: {e}"))?;
    drop(questions);
    let mut answers = BufReader::new(child.stdout.take().ok_or("no pipe from the witness")?).lines();
    let libraries = answers.next().ok_or("witness said nothing")?.map_err(|e| e.to_string())?;
    let mut outputs = Outputs::new();
    for line in answers {
        let line = line.map_err(|e| e.to_string())?;
        let mut fields = line.split(' ');
        let parsed = (|| {
            let seed = fields.next()?.parse().ok()?;
            let kib = fields.next()?.parse().ok()?;
            Some(((kib, seed), parse_words(fields.next()?)?))
        })();
        let (key, words) = parsed.ok_or_else(|| format!("witness line cannot be read: {line:.80}"))?;
        outputs.insert(key, words);
    }
    let status = child.wait().map_err(|e| e.to_string())?;
    if status.success() { Ok((outputs, libraries)) } else { Err(format!("witness ended with {status}")) }
}

fn source(file: String) -> std::io::Result<Source> {
    let bytes = std::fs::read(Path::new("golden").join(&file))?;
    Ok(Source { file, sha256: sha256_hex(&bytes) })
}

/// The files of a family's folder that its kernels share.
fn shared(folder: &str) -> std::io::Result<Vec<Source>> {
    let mut names = Vec::new();
    for entry in std::fs::read_dir(Path::new("golden").join(folder))? {
        let name = entry?.file_name().to_string_lossy().into_owned();
        if name.starts_with("common_") {
            names.push(format!("{folder}/{name}"));
        }
    }
    names.sort();
    names.into_iter().map(source).collect()
}

fn write(id: &str, outputs: &Outputs, libraries: String) -> std::io::Result<()> {
    let stem = id.replace('.', "/");
    let family = id.split('.').next().unwrap_or(id);
    let mut both = shared(&format!("src/reference/{family}"))?;
    both.extend(shared(&format!("witness/{family}"))?);
    let table = Table {
        schema: "proofhouse/golden/1".into(),
        kernel: id.into(),
        provenance: Provenance {
            reference: source(format!("src/reference/{stem}.rs"))?,
            witness: source(format!("witness/{stem}.py"))?,
            shared: both,
            libraries,
        },
        cases: outputs.iter().map(|(&(size, seed), words)| Row { seed, size, words: format_words(words) }).collect(),
    };
    let mut text = serde_json::to_string(&table)?.replace("{\"seed\"", "\n{\"seed\"");
    text.push('\n');
    let target = format!("golden/tables/{id}.json");
    let part = format!("{target}.part");
    std::fs::write(&part, text)?;
    std::fs::rename(part, target)
}

fn pin() -> std::io::Result<()> {
    let mut lines = String::new();
    for (id, _) in PLAN {
        let bytes = std::fs::read(format!("golden/tables/{id}.json"))?;
        lines.push_str(&format!("{}  {id}.json\n", sha256_hex(&bytes)));
    }
    std::fs::write("golden/tables/SHA256SUMS", lines)
}
