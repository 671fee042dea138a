//! `spindrift generate`: showers events as a config says and streams them to an event file.

use std::io::{Write, stdout};
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::Instant;

use anyhow::bail;

use super::progress::Teller;
use super::summary::{Circumstances, Summary};
use super::words::{bytes, grouped, say, time};
use super::{EXIT_STOPPED, output, signals, threads};
use crate::config::{Overrides, RunPlan, load_with};
use crate::files::event_file::{EventFileWriter, WriteOptions};
use crate::run::assemble::{Assembled, assemble};
use crate::run::forecast::Forecast;
use crate::run::generator::Generator;
use crate::run::provenance::{describe, event_ids};
use crate::run::{RunError, Sink, run as run_events};

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
    let stop = signals::stop_flag()?;
    let overrides = Overrides {
        events: args.events,
        seed: args.seed,
    };
    let plan = load_with(&args.config, &overrides)?;
    let output = checked_output(args, &plan)?;
    let Assembled {
        generator,
        warnings,
    } = assemble(&plan)?;
    for warning in plan.warnings.iter().chain(&warnings) {
        say(&format!("warning: {warning}"));
    }
    if stop.load(Ordering::Relaxed) {
        say("stopped by a signal before the start; nothing was written");
        return Ok(ExitCode::from(EXIT_STOPPED));
    }
    let sink = open_sink(args, &plan, &generator, output.as_deref())?;
    if !args.quiet {
        forecast(&plan, &generator, threads, output.as_deref());
    }
    let summary = make_events(args, &plan, &generator, threads, output, sink, &stop)?;
    finish(args, &summary)
}

fn refuse_planned(args: &GenerateArgs) -> anyhow::Result<()> {
    let planned = [
        ("--shard", args.shard.is_some()),
        ("--ids", args.ids.is_some()),
        ("--resume", args.resume),
    ];
    match planned.iter().find(|(_, given)| *given) {
        Some((option, _)) => {
            bail!("{option} is not built yet; it comes with a later version of spindrift")
        }
        None => Ok(()),
    }
}

fn checked_output(args: &GenerateArgs, plan: &RunPlan) -> anyhow::Result<Option<PathBuf>> {
    if args.discard {
        return Ok(None);
    }
    let output = args.out.clone();
    let output = output.unwrap_or_else(|| output::default_for(&args.config));
    let inputs = plan.inputs.iter().map(|input| input.path.as_path());
    let inputs = inputs.chain([args.config.as_path()]);
    output::check(&output, args.overwrite, inputs)?;
    Ok(Some(output))
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
    Ok(Sink::File(writer))
}

fn forecast(plan: &RunPlan, generator: &Generator, threads: usize, output: Option<&Path>) {
    let record = output.map(|_| &plan.record);
    let cores = threads.min(threads::cores());
    let forecast = Forecast::measure(generator, event_ids(plan), cores, record);
    let size = match output {
        Some(path) => format!("{} in {}", bytes(forecast.bytes), path.display()),
        None => "nothing written".to_owned(),
    };
    say(&format!(
        "forecast: {} events, about {}, {size} (measured on the first {})",
        grouped(plan.events),
        time(forecast.seconds),
        grouped(forecast.events_sampled),
    ));
}

fn make_events(
    args: &GenerateArgs,
    plan: &RunPlan,
    generator: &Generator,
    threads: usize,
    output: Option<PathBuf>,
    sink: Sink,
    stop: &AtomicBool,
) -> Result<Summary, RunError> {
    let teller = Teller::new(plan.events, args.quiet);
    let start = Instant::now();
    let totals = run_events(generator, event_ids(plan), threads, sink, &teller, stop);
    teller.finish();
    let circumstances = Circumstances {
        config: args.config.clone(),
        output,
        threads,
        wall_time: start.elapsed(),
    };
    Ok(Summary::new(plan, circumstances, &totals?))
}

/// Prints the summary; the exit code says whether the run came to its end.
fn finish(args: &GenerateArgs, summary: &Summary) -> anyhow::Result<ExitCode> {
    if !args.quiet {
        say(&summary.to_string());
    }
    for warning in &summary.warnings {
        say(&format!("warning: {warning}"));
    }
    if !summary.complete {
        say(&summary.stop_message());
    }
    if args.json {
        let mut stdout = stdout().lock();
        serde_json::to_writer_pretty(&mut stdout, summary).map_err(std::io::Error::from)?;
        writeln!(stdout)?;
        stdout.flush()?;
    }
    Ok(if summary.complete {
        ExitCode::SUCCESS
    } else {
        ExitCode::from(EXIT_STOPPED)
    })
}
