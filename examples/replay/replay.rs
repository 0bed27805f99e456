//! Feeds a channel and collects what happened, as plain numbers in SI units.

use brimline::unit::Photodetector;
use brimline::{Channel, Charge, Estimate, Event, Flux, Integral, Measured, Mode, Reading, Sample, Setup};
use brimline::{Reason, Trust};

/// An integral as a bare number, and what a detector makes of it.
pub(crate) trait Amount: Integral {
    /// The unit of the input.
    const INPUT_UNIT: &'static str;

    /// The value in its SI unit.
    fn number(self) -> f64;

    /// The radiant exposure, J/m^2, with its standard uncertainty.
    fn exposure(measured: Measured<Self>, detector: &Photodetector) -> Option<(f64, f64)>;
}

impl Amount for Charge {
    const INPUT_UNIT: &'static str = "A";

    fn number(self) -> f64 {
        self.as_coulombs()
    }

    fn exposure(measured: Measured<Self>, detector: &Photodetector) -> Option<(f64, f64)> {
        let exposure = detector.radiant_exposure(measured);
        Some((exposure.value.as_joules_per_square_metre(), exposure.u.as_joules_per_square_metre()))
    }
}

impl Amount for Flux {
    const INPUT_UNIT: &'static str = "V";

    fn number(self) -> f64 {
        self.as_volt_seconds()
    }

    fn exposure(_: Measured<Self>, _: &Photodetector) -> Option<(f64, f64)> {
        None
    }
}

/// One estimate: value, standard uncertainty, and the parts of that as standard uncertainties.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Figure {
    pub(crate) value: f64,
    pub(crate) u: f64,
    pub(crate) readout: f64,
    pub(crate) input_noise: f64,
    pub(crate) drift: f64,
    pub(crate) dead_time: f64,
    pub(crate) leak_and_soakage: f64,
    pub(crate) scale: f64,
}

impl Figure {
    fn new<Q: Amount>(estimate: &Estimate<Q>) -> Self {
        let budget = &estimate.budget;
        Self {
            value: estimate.integral.value.number(),
            u: estimate.integral.u.number(),
            readout: budget.readout.number(),
            input_noise: budget.input_noise.number(),
            drift: budget.drift.number(),
            dead_time: budget.dead_time.number(),
            leak_and_soakage: budget.leak_and_soakage.number(),
            scale: budget.scale.number(),
        }
    }
}

/// One run.
#[derive(Clone, Debug)]
pub(crate) struct RunRecord {
    pub(crate) start_tick: u32,
    pub(crate) end_tick: u32,
    /// Seconds since the trace's first row.
    pub(crate) start_s: f64,
    pub(crate) elapsed_s: f64,
    pub(crate) at_stop: Figure,
    pub(crate) closed: Option<Figure>,
    pub(crate) measured: f64,
    pub(crate) interpolated: f64,
    pub(crate) drift_removed: f64,
    pub(crate) restored: f64,
    /// Time in holds, s.
    pub(crate) held_s: f64,
    pub(crate) resets: u32,
    pub(crate) warming_mk: Option<i32>,
    pub(crate) noise_tested: bool,
    pub(crate) spikes: u16,
    pub(crate) trust: Trust,
    pub(crate) reasons: Vec<Reason>,
    /// Of the latest estimate, J/m^2 with its standard uncertainty.
    pub(crate) exposure: Option<(f64, f64)>,
    /// Whether the run was still going when the trace ended.
    pub(crate) ongoing: bool,
}

impl RunRecord {
    /// The better of the two estimates.
    pub(crate) fn latest(&self) -> &Figure {
        self.closed.as_ref().unwrap_or(&self.at_stop)
    }
}

/// A notice with its time.
#[derive(Clone, Copy, Debug)]
pub(crate) struct NoticeRecord {
    pub(crate) tick: u32,
    /// Seconds since the trace's first row.
    pub(crate) time_s: f64,
    pub(crate) event: Event,
}

/// The drift as of the latest zero.
#[derive(Clone, Copy, Debug)]
pub(crate) struct DriftRecord {
    pub(crate) rate_v_per_s: f64,
    pub(crate) u: f64,
    /// The input that would move the output alike, A or V.
    pub(crate) as_input: f64,
    pub(crate) as_input_u: f64,
}

/// What zeros and holds together tell of the amplifier; each a value and its standard uncertainty.
#[derive(Clone, Copy, Debug)]
pub(crate) struct AmplifierRecord {
    pub(crate) droop_v_per_s: (f64, f64),
    pub(crate) offset_v: (f64, f64),
    pub(crate) bias_a: (f64, f64),
}

/// Everything that a trace gave.
#[derive(Clone, Debug)]
pub(crate) struct Outcome {
    /// `C` or `V s`.
    pub(crate) unit: &'static str,
    /// `A` or `V`.
    pub(crate) input_unit: &'static str,
    pub(crate) samples: u64,
    /// From the first row to the last, s.
    pub(crate) span_s: f64,
    pub(crate) runs: Vec<RunRecord>,
    pub(crate) drift: DriftRecord,
    /// Whether the drift was measured, or is what the data sheet allows.
    pub(crate) drift_measured: bool,
    /// Given where there was a hold.
    pub(crate) amplifier: Option<AmplifierRecord>,
    pub(crate) notices: Vec<NoticeRecord>,
}

/// A channel with its books.
pub(crate) struct Replay<'s, Q> {
    setup: &'s Setup<Q>,
    detector: Option<Photodetector>,
    channel: Channel<'s, Q>,
    mode: Option<Mode>,
    last_tick: u32,
    ticks: u64,
    samples: u64,
    zero_samples: u64,
    running: bool,
    /// A run has stopped and its reading is not final yet.
    pending: bool,
    run_start_s: f64,
    runs: Vec<RunRecord>,
    notices: Vec<NoticeRecord>,
}

impl<'s, Q: Amount> Replay<'s, Q> {
    pub(crate) fn new(setup: &'s Setup<Q>, detector: Option<Photodetector>) -> Self {
        Self {
            setup,
            detector,
            channel: Channel::new(setup),
            mode: None,
            last_tick: 0,
            ticks: 0,
            samples: 0,
            zero_samples: 0,
            running: false,
            pending: false,
            run_start_s: 0.0,
            runs: Vec::new(),
            notices: Vec::new(),
        }
    }

    /// Takes the trace's next row.
    pub(crate) fn feed(&mut self, sample: Sample) {
        if self.mode == Some(Mode::Zero) && sample.mode != Mode::Zero {
            self.take_stopped();
        }
        if self.samples > 0 {
            self.ticks += u64::from(sample.tick.wrapping_sub(self.last_tick));
        }
        self.last_tick = sample.tick;
        self.mode = Some(sample.mode);
        self.samples += 1;
        self.zero_samples += u64::from(sample.mode == Mode::Zero);

        let step = self.channel.feed(sample);
        for notice in step.notices.iter() {
            let ago = u64::from(sample.tick.wrapping_sub(notice.tick));
            let time_s = self.seconds(self.ticks.saturating_sub(ago));
            match notice.event {
                Event::RunStarted => {
                    self.running = true;
                    self.run_start_s = time_s;
                }
                Event::RunStopped => {
                    self.running = false;
                    self.pending = true;
                }
                _ => {}
            }
            self.notices.push(NoticeRecord { tick: notice.tick, time_s, event: notice.event });
        }
    }

    /// The end of the trace. `whole`: a run that is still going is worth a report.
    pub(crate) fn finish(mut self, whole: bool) -> Outcome {
        self.take_stopped();
        if self.running && whole {
            self.take();
        }
        let drift = self.channel.drift();
        let (rate, u) = (drift.value.as_volts_per_second(), drift.u.as_volts_per_second());
        let gain = self.setup.circuit().gain();
        let droop = self.channel.droop();
        let amplifier = self.channel.offset_and_bias().map(|(offset, bias)| AmplifierRecord {
            droop_v_per_s: (droop.value.as_volts_per_second(), droop.u.as_volts_per_second()),
            offset_v: (offset.value.as_volts(), offset.u.as_volts()),
            bias_a: (bias.value.as_amperes(), bias.u.as_amperes()),
        });
        Outcome {
            unit: Q::SYMBOL,
            input_unit: Q::INPUT_UNIT,
            samples: self.samples,
            span_s: self.now_s(),
            drift: DriftRecord { rate_v_per_s: rate, u, as_input: rate / gain, as_input_u: (u / gain).abs() },
            drift_measured: self.zero_samples > 1,
            amplifier,
            runs: self.runs,
            notices: self.notices,
        }
    }

    /// Seconds since the trace's first row.
    pub(crate) fn now_s(&self) -> f64 {
        self.seconds(self.ticks)
    }

    /// The running run's reading; `None` outside a run.
    pub(crate) fn running(&self) -> Option<Reading<Q>> {
        self.channel.reading().filter(|_| self.running)
    }

    pub(crate) fn channel(&self) -> &Channel<'s, Q> {
        &self.channel
    }

    fn seconds(&self, ticks: u64) -> f64 {
        ticks as f64 / self.setup.converter().tick_hz
    }

    /// Takes the reading of a run whose zero is over.
    fn take_stopped(&mut self) {
        if self.pending {
            self.pending = false;
            self.take();
        }
    }

    fn take(&mut self) {
        let Some(reading) = self.channel.reading() else { return };
        let exposure = self.detector.and_then(|detector| Q::exposure(reading.latest().integral, &detector));
        self.runs.push(RunRecord {
            start_tick: reading.start_tick,
            end_tick: reading.end_tick,
            start_s: self.run_start_s,
            elapsed_s: reading.elapsed_s,
            at_stop: Figure::new(&reading.at_stop),
            closed: reading.closed.as_ref().map(Figure::new),
            measured: reading.measured.number(),
            interpolated: reading.interpolated.number(),
            drift_removed: reading.drift_removed.number(),
            restored: reading.restored.number(),
            held_s: reading.held_s,
            resets: reading.resets,
            warming_mk: reading.warming_mk,
            noise_tested: reading.noise_tested,
            spikes: reading.spikes,
            trust: reading.trust,
            reasons: reading.reasons.iter().collect(),
            exposure,
            ongoing: self.running,
        });
    }
}
