//! `survey`: what this host is, and which kernels can run on it.

use std::fmt::Write;

use kernels::kernel::Proven;
use kernels::{Variant, catalogue, isa};
use serde::Serialize;

use super::args::{Format, SurveyArgs};
use super::{common, say, say_json};
use crate::error::Error;
use crate::exit_code::Exit;
use crate::host::{Host, HostSurvey, Root};
use crate::plan::Unit;
use crate::report::gathering::Skipped;
use crate::report::text::{Table, printable};
use crate::report::window::VIRTUAL;

/// The document `proofhouse/survey/1`.
#[derive(Serialize)]
struct Survey {
    schema: &'static str,
    program: &'static str,
    golden: String,
    #[serde(flatten)]
    host: HostSurvey,
    kernels: Vec<KernelLine>,
    #[serde(skip_serializing_if = "Option::is_none")]
    recheck: Option<Recheck>,
}

#[derive(Serialize)]
struct KernelLine {
    kernel: &'static str,
    family: &'static str,
    summary: &'static str,
    variants: Vec<VariantLine>,
    skipped: Vec<Skipped>,
}

#[derive(Serialize)]
struct VariantLine {
    variant: &'static str,
    proven: &'static str,
}

/// Golden cases run with every variant in this process.
#[derive(Serialize)]
struct Recheck {
    cases: u64,
    differing: Vec<String>,
}

/// Runs the command.
pub fn run(args: &SurveyArgs) -> Result<Exit, Error> {
    common::open_golden()?;
    if !args.root.is_dir() {
        return Err(Error::Usage(format!(
            "--root {}: no such folder; give one that holds proc and sys",
            args.root.display()
        )));
    }
    let host = Host::read(&Root::new(&args.root)).map_err(|why| Error::CannotDo(why.to_string()))?;
    if args.choice.cpus.is_some() {
        common::seats(&host, &args.choice)?;
    }
    let (units, _) = common::units(&args.choice)?;
    let survey = Survey {
        schema: "proofhouse/survey/1",
        program: env!("CARGO_PKG_VERSION"),
        golden: golden::table::set_digest(),
        host: HostSurvey::of(&host),
        kernels: kernel_lines(&units),
        recheck: args.recheck.then(|| recheck(&units)),
    };
    match args.output.format {
        Format::Text => say(&text(&survey))?,
        Format::Json => say_json(&survey)?,
    }
    // which core it was cannot be told here: nothing was pinned
    let differing = survey.recheck.as_ref().is_some_and(|r| !r.differing.is_empty());
    Ok(if differing { Exit::Watch } else { Exit::Clear })
}

fn kernel_lines(units: &[Unit]) -> Vec<KernelLine> {
    catalogue::KERNELS
        .iter()
        .filter(|k| units.iter().any(|u| u.kernel == k.id()))
        .map(|kernel| {
            let mut line = KernelLine {
                kernel: kernel.id(),
                family: kernel.family(),
                summary: kernel.summary(),
                variants: Vec::new(),
                skipped: Vec::new(),
            };
            for (variant, proof) in isa::survey(*kernel) {
                match proof {
                    Ok(_) => {
                        line.variants.push(VariantLine { variant: variant.name(), proven: proven(*kernel, variant) })
                    }
                    Err(why) => line.skipped.push(Skipped {
                        kernel: kernel.id().to_owned(),
                        variant: variant.name().to_owned(),
                        why: why.to_string(),
                    }),
                }
            }
            line
        })
        .collect()
}

fn proven(kernel: &dyn kernels::Kernel, variant: Variant) -> &'static str {
    match kernel.builds().iter().find(|b| b.variant == variant).map(|b| b.proven) {
        Some(Proven::Hardware) => "on hardware",
        Some(Proven::Emulator) => "under an emulator",
        Some(Proven::Unexecuted) | None => "unverified: compiled and disassembled, never executed by its authors",
    }
}

fn recheck(units: &[Unit]) -> Recheck {
    let mut result = Recheck { cases: 0, differing: Vec::new() };
    for unit in units {
        let Some(kernel) = catalogue::find(unit.kernel) else { continue };
        let Ok(proof) = isa::prove(kernel, unit.variant) else { continue };
        for case in golden::table::cases(unit.kernel, unit.size) {
            let mut out = vec![0; kernel.output_words(unit.size)];
            kernel.prepare(&case, proof).run_anywhere(&mut out);
            result.cases += 1;
            if golden::table::expected(&case) != Some(out.as_slice()) {
                result.differing.push(format!("{case} {}", unit.variant));
            }
        }
    }
    result
}

fn text(survey: &Survey) -> String {
    let mut out = String::new();
    let host = &survey.host;
    let _ = writeln!(out, "proofhouse {}, golden tables {}", survey.program, &survey.golden[..16]);
    for p in &host.identity.processors {
        let _ = writeln!(out, "Processor: {}, cpus {}", printable(&p.model.to_string()), p.cpus);
    }
    if let Some(key) = &host.identity.host_key {
        let _ = writeln!(out, "Host key: {} (from {})", printable(&key.key), key.source.name());
    }
    match host.virtualised {
        Some(true) => {
            let _ = writeln!(out, "{VIRTUAL}");
        }
        Some(false) => {}
        None => {
            let _ = writeln!(out, "Whether this is a virtual machine cannot be told.");
        }
    }
    let or_unknown = |n: Option<u32>| n.map_or("unknown".to_owned(), |n| n.to_string());
    let mut table = Table::new(&["cpu", "core", "socket", "node", "siblings", "may be used"]);
    for c in &host.cpus {
        table.row([
            c.cpu.to_string(),
            c.core.to_string(),
            or_unknown(c.socket),
            or_unknown(c.node),
            c.siblings.to_string(),
            if c.allowed { "yes" } else { "no" }.to_owned(),
        ]);
    }
    let _ = write!(out, "\n{}", table.text());
    let unexecuted =
        survey.kernels.iter().flat_map(|k| &k.variants).filter(|v| v.proven.starts_with("unverified")).count();
    if unexecuted > 0 {
        let _ = writeln!(
            out,
            "\n{unexecuted} variants marked * are unverified: compiled and disassembled, never executed by their authors."
        );
    }
    let mut table = Table::new(&["kernel", "variants", "built, but not for this cpu"]);
    for k in &survey.kernels {
        let mark = |v: &VariantLine| if v.proven.starts_with("unverified") { "*" } else { "" };
        let names: Vec<String> = k.variants.iter().map(|v| format!("{}{}", v.variant, mark(v))).collect();
        // what was never built for this architecture is in the document; here only what this cpu lacks
        let lacking = k.skipped.iter().filter(|s| s.why.starts_with("cpu lacks"));
        let skipped: Vec<String> = lacking.map(|s| format!("{} ({})", s.variant, s.why)).collect();
        table.row([k.kernel.to_owned(), names.join(" "), skipped.join("; ")]);
    }
    let _ = write!(out, "\n{}", table.text());
    if host.sensors.is_empty() {
        let _ = writeln!(out, "\nNo sensors.");
    }
    for s in &host.sensors {
        let value = s.value.map_or_else(|| s.why.clone().unwrap_or_default(), |v| format!("{v} {}", s.unit));
        let _ = writeln!(out, "Sensor: {} {} (cpus {}): {}", s.kind, printable(&s.name), s.cpus, printable(&value));
    }
    if !host.unreadable.is_empty() {
        let _ = writeln!(out, "\nWhat cannot be read:");
    }
    for u in &host.unreadable {
        let _ = writeln!(out, "- {}: {}\n    {}", printable(&u.what), printable(&u.why), printable(&u.remedy));
    }
    if let Some(r) = &survey.recheck {
        let _ = writeln!(out, "\nRecheck: {} golden cases run, {} differ.", r.cases, r.differing.len());
        for line in r.differing.iter().take(20) {
            let _ = writeln!(out, "- {line}");
        }
    }
    out
}
