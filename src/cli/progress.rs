//! How far a run has come: a bar on a terminal, a line now and then in a log.

use std::cell::Cell;
use std::fmt::Write;
use std::io::{IsTerminal, stderr};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressState, ProgressStyle};

use super::words::{grouped, percent, say, time};
use crate::run::Progress;

/// The first line of a log comes after this time; each wait is twice the one before,
const FIRST_WAIT: Duration = Duration::from_secs(10);
/// up to this.
const LONGEST_WAIT: Duration = Duration::from_secs(300);

/// One line, as wide as the terminal.
const BAR: &str = "{wide_bar} {percent:>3} %  {done} of {all} events  {rate}/s  {left} left";
/// Done, at work, to do.
const BAR_CHARACTERS: &str = "=~.";

/// Tells how far a run has come.
pub(super) enum Teller {
    /// Nothing at all.
    Silent,
    /// A bar that redraws itself.
    Bar(ProgressBar),
    /// Lines for a log.
    Log(Log),
}

impl Teller {
    /// What fits stderr.
    pub(super) fn new(events: u64, quiet: bool) -> Teller {
        if quiet {
            Teller::Silent
        } else if stderr().is_terminal() {
            let bar = ProgressBar::new(events);
            bar.set_style(bar_style());
            Teller::Bar(bar)
        } else {
            Teller::Log(Log::new(Instant::now()))
        }
    }

    /// Clears the bar.
    pub(super) fn finish(&self) {
        if let Teller::Bar(bar) = self {
            bar.finish_and_clear();
        }
    }
}

fn bar_style() -> ProgressStyle {
    let style = ProgressStyle::with_template(BAR).expect("a template without mistakes");
    let count = |value: u64, out: &mut dyn Write| {
        // a line on a terminal that cannot be written is no reason to stop
        let _ = out.write_str(&grouped(value));
    };
    style
        .progress_chars(BAR_CHARACTERS)
        .with_key("done", move |state: &ProgressState, out: &mut dyn Write| {
            count(state.pos(), out)
        })
        .with_key("all", move |state: &ProgressState, out: &mut dyn Write| {
            count(state.len().unwrap_or(0), out)
        })
        .with_key("rate", move |state: &ProgressState, out: &mut dyn Write| {
            count(state.per_sec() as u64, out)
        })
        .with_key("left", |state: &ProgressState, out: &mut dyn Write| {
            let _ = out.write_str(&time(state.eta().as_secs_f64()));
        })
}

impl Progress for Teller {
    fn events_done(&self, done: u64, total: u64) {
        match self {
            Teller::Silent => {}
            Teller::Bar(bar) => bar.set_position(done),
            Teller::Log(log) => {
                if let Some(line) = log.line(Instant::now(), done, total) {
                    say(&line);
                }
            }
        }
    }
}

/// Decides when a line is due.
pub(super) struct Log {
    start: Instant,
    next: Cell<Instant>,
    wait: Cell<Duration>,
}

impl Log {
    fn new(start: Instant) -> Log {
        Log {
            start,
            next: Cell::new(start + FIRST_WAIT),
            wait: Cell::new(FIRST_WAIT),
        }
    }

    fn line(&self, now: Instant, done: u64, total: u64) -> Option<String> {
        if now < self.next.get() || done == 0 || done >= total {
            return None;
        }
        self.wait.set((2 * self.wait.get()).min(LONGEST_WAIT));
        self.next.set(now + self.wait.get());
        let rate = done as f64 / (now - self.start).as_secs_f64();
        Some(format!(
            "{:>7}  {} of {} events  {} events/s  {} left",
            percent(done as f64 / total as f64),
            grouped(done),
            grouped(total),
            grouped(rate as u64),
            time((total - done) as f64 / rate)
        ))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_come_less_and_less_often() {
        let start = Instant::now();
        let log = Log::new(start);
        let due: Vec<u64> = (1..2000)
            .filter(|second| {
                let now = start + Duration::from_secs(*second);
                log.line(now, *second, 2000).is_some()
            })
            .collect();
        assert_eq!(due, [10, 30, 70, 150, 310, 610, 910, 1210, 1510, 1810]);
    }

    #[test]
    fn a_line_says_rate_and_time_left() {
        let start = Instant::now();
        let log = Log::new(start);
        let line = log
            .line(start + Duration::from_secs(20), 5000, 20_000)
            .unwrap();
        assert_eq!(
            line,
            " 25.0 %  5,000 of 20,000 events  250 events/s  1 min 00 s left"
        );
    }
}
