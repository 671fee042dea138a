//! `spindrift generate`: showers events as a config says and streams them to an event file.

use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::atomic::Ordering;
use std::time::Instant;

use anyhow::Context;

use super::progress::Teller;
use super::summary::{SummaryText, forecast_line, stop_message};
use super::words::{print_data, say};
use super::{EXIT_STOPPED, later, output, signals, threads};
use crate::config::{Overrides, RunPlan, load_with};
use crate::files::event_file::{EventFileWriter, WriteOptions};
use crate::run::assemble::assemble;
use crate::run::fields::FieldSeries;
use crate::run::forecast::Forecast;
use crate::run::generator::Generator;
use crate::run::provenance::{describe, event_ids};
use crate::run::summary::{Circumstances, RunSummary};
use crate::run::{Sink, probe, run as run_events};

/// Showers events as CONFIG says and streams them to an event file.
#[derive(Clone, Debug, clap::Args)]
pub struct GenerateArgs {
    /// The config, JSON; `spindrift schema` says what it may hold
    #[arg(value_name = "CONFIG")]
    pub config: PathBuf,
    /// The event file [default: the config's name with .h5, in the working directory]
    #[arg(long, value_name = "FILE")]
    pub out: Option<PathBuf>,
    /// Number of events, instead of the config's
    #[arg(long, value_name = "N")]
    pub events: Option<u64>,
    /// Seed of all random streams, instead of the config's
    #[arg(long, value_name = "N")]
    pub seed: Option<u64>,
    /// Number of threads [default: SLURM_CPUS_PER_TASK, else all cores it may use]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=i64::from(threads::MOST_THREADS)))]
    pub threads: Option<u16>,
    /// Replaces an existing event file
    #[arg(long)]
    pub overwrite: bool,
    /// Showers only and writes nothing, for timing
    #[arg(long, conflicts_with_all = ["out", "overwrite"])]
    pub discard: bool,
    /// Says nothing on stderr but warnings and errors
    #[arg(long)]
    pub quiet: bool,
    /// Prints the closing summary as JSON on stdout
    #[arg(long)]
    pub json: bool,
    /// Makes one part of the sample (in a later version)
    #[arg(long, value_name = "I/N")]
    pub shard: Option<String>,
    /// Makes a range of event numbers (in a later version)
    #[arg(long, value_name = "A..B")]
    pub ids: Option<String>,
    /// Continues an incomplete event file (in a later version)
    #[arg(long)]
    pub resume: bool,
}

/// Makes the sample.
///
/// # Errors
/// Whatever stops it, before the start or later; see [`exit_code`](super::exit_code).
pub fn run(args: &GenerateArgs) -> anyhow::Result<ExitCode> {
    refuse_planned(args)?;
    let threads = threads::choose(args.threads)?;
    let stop = signals::stop_flag().context("cannot listen for signals")?;
    let overrides = Overrides {
        events: args.events,
        seed: args.seed,
    };
    let plan = load_with(&args.config, &overrides)?;
    let output = match (args.discard, &args.out) {
        (true, _) => None,
        (false, Some(out)) => Some(out.clone()),
        (false, None) => Some(output::default_for(&args.config)),
    };
    if let Some(output) = &output {
        output::check(output, args.overwrite, &args.config, &plan)?;
    }
    let assembled = assemble(&plan)?;
    let input_warnings = [&plan.warnings[..], &assembled.warnings[..]].concat();
    warn(&input_warnings);
    if stop.load(Ordering::Relaxed) {
        say("stopped by a signal before the start; nothing was written");
        return Ok(ExitCode::from(EXIT_STOPPED));
    }
    let generator = assembled.generator;
    probe(&generator, event_ids(&plan))?;
    let sink = open_sink(args, &plan, &generator, output.as_deref())?;
    if !args.quiet {
        let cores = threads.min(threads::cores());
        let record = output.as_ref().map(|_| &plan.record);
        let forecast = Forecast::measure(&generator, event_ids(&plan), cores, record);
        // the new file holds all but the columns already
        let empty_file = output.as_ref().and_then(|path| path.metadata().ok());
        let size = empty_file.map(|about| about.len() as f64 + forecast.bytes);
        say(&forecast_line(plan.events, &forecast, size));
    }
    let teller = Teller::new(plan.events, args.quiet);
    let start = Instant::now();
    let totals = run_events(&generator, event_ids(&plan), threads, sink, &teller, &stop);
    teller.finish();
    let late = generator.fields.as_ref().map(FieldSeries::warnings);
    let late = late.unwrap_or_default();
    warn(&late);
    let circumstances = Circumstances {
        config: args.config.clone(),
        output,
        threads,
        wall_time: start.elapsed(),
        input_warnings: [input_warnings, late].concat(),
    };
    close(args, &RunSummary::new(&plan, circumstances, &totals?))
}

fn refuse_planned(args: &GenerateArgs) -> anyhow::Result<()> {
    let planned = [
        ("--shard", args.shard.is_some()),
        ("--ids", args.ids.is_some()),
        ("--resume", args.resume),
    ];
    match planned.iter().find(|(_, given)| *given) {
        Some((option, _)) => later(option).map(|_| ()),
        None => Ok(()),
    }
}

fn warn(warnings: &[String]) {
    for warning in warnings {
        say(&format!("warning: {warning}"));
    }
}

fn open_sink(
    args: &GenerateArgs,
    plan: &RunPlan,
    generator: &Generator,
    output: Option<&Path>,
) -> anyhow::Result<Sink> {
    let Some(path) = output else {
        return Ok(Sink::Discard);
    };
    let options = WriteOptions {
        overwrite: args.overwrite,
    };
    let writer = EventFileWriter::create(path, &describe(plan, generator), options)?;
    Ok(Sink::File(Box::new(writer)))
}

/// Prints what a run came to; the exit code says whether it reached its end.
fn close(args: &GenerateArgs, summary: &RunSummary) -> anyhow::Result<ExitCode> {
    if !args.quiet {
        say(&SummaryText(summary).to_string());
    }
    warn(&summary.warnings);
    if !summary.complete {
        say(&stop_message(summary));
    }
    if args.json {
        let json = serde_json::to_string_pretty(summary)?;
        print_data(&format!("{json}\n"))?;
    }
    Ok(if summary.complete {
        ExitCode::SUCCESS
    } else {
        ExitCode::from(EXIT_STOPPED)
    })
}
