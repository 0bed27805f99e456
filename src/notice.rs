//! What a step has to say besides its request.

/// Something that happened, with the tick it happened at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Notice {
    /// Counter value of the event: the sample that showed it, or the switching instant.
    pub tick: u32,
    /// What happened.
    pub event: Event,
}

/// The kinds of notices.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum Event {
    /// A run started: the input was connected.
    RunStarted,
    /// A run stopped: its last integrating sample was the one at this tick.
    RunStopped,
    /// The reset switch closed within a run.
    ResetClosed,
    /// The reset switch opened within a run.
    ResetOpened,
    /// A reset was due by the headroom guard; stated once until the next reset.
    ResetDue,
    /// A reset failed, and so did this many in a row with it. Another one is asked for until the policy's
    /// `reset_attempts` are used up. Where a sample shows two that failed, the second is stated: the number counts
    /// both.
    ResetFailed {
        /// Failures in a row.
        in_a_row: u8,
    },
    /// With the reset switch closed the output settled slowly: with so many per cent of `switch_resistance_ohm` times
    /// the capacitance. A switch whose resistance grows from reset to reset will fail.
    SettlingSlow {
        /// Observed over expected time constant, per cent; at least the former.
        percent: u16,
    },
    /// The drift of a zero differs from that of the zero before by more than 5 of its uncertainties, and in the way of
    /// a level that decays toward the reset level: a leak of reset switch or board that the set-up does not know, or
    /// more of one than it says. Stated at the end of a zero.
    Decay {
        /// The time constant of what is missing, s, rounded down: 0 is below a second.
        time_constant_s: u32,
    },
    /// A sample of a zero was too far off for noise, and was left out.
    Spike,
    /// Input began during a zero, at this tick at the latest found. The zero is not used from there on; what arrives is
    /// kept in the run that follows.
    InputInZero,
    /// Single samples scatter clearly otherwise than `readout_counts` says: by more than a fifth, either way. Readings
    /// use the observed figure. Hum counts as scatter. Stated at the end of a zero.
    ReadoutNoise {
        /// Of the set-up with rounding, hundredths of a count rms.
        stated_centicounts: u16,
        /// As the blocks of zero samples show it, hundredths of a count rms.
        observed_centicounts: u16,
    },
    /// The zeros scatter by so many per cent of what the set-up's noise figures say, clearly not 100. Where it is more,
    /// uncertainties are widened by as much. Stated at the end of a zero.
    NoiseFigures {
        /// Observed over expected standard deviation, per cent.
        percent: u16,
    },
    /// The drifts of successive zeros differ by so many per cent of what the set-up's walks allow, clearly more than
    /// 100: the offset wanders more than stated, or something else moves it. Uncertainties are widened by as much.
    /// Stated at the end of a zero.
    DriftWander {
        /// Observed over expected standard deviation, per cent.
        percent: u16,
    },
    /// Something that takes the trust from a reading; stated once for each run, or for each zero.
    Fault(Reason),
}

/// Why a reading is not good.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub enum Reason {
    /// The converter gave an end code, or the level was at a rail.
    AtRail = 0,
    /// No sample for longer than the policy's limit.
    Gap = 1,
    /// The level moved from one sample to the next by more than the worst-case input allows: a reset that no sample
    /// showed, or a disturbance.
    Jump = 2,
    /// The input during a dead time is a guess: there were too few samples beside the reset to fit a line.
    DeadTime = 3,
    /// A reset after which the level had not arrived at the reset level.
    ResetNotArrived = 4,
    /// The readings stood still although the channel's noise should move them.
    Frozen = 5,
    /// The drift lies outside what offset voltage and bias current can cause by more than 4 of its uncertainties.
    DriftOutsideLimits = 6,
    /// The counter stood still or ran backwards; the sample was not used.
    ClockStalled = 7,
    /// A zero beside the run was no zero: input began, or the drift had changed. The zero was not used from there on.
    InputInZero = 8,
    /// The value at stop and the closed one differ by more than the closing zero can have added.
    Inconsistent = 9,
    /// The droop of a hold lies outside what the bias current can cause by more than 4 of its uncertainties: the input
    /// or the reset switch leaks. The hold's own movement is cut out of the run, but the switch leaks in the run too.
    DroopOutsideLimits = 10,
    /// After a reset the level stayed where the closed switch had held it, although drift, noise or pedestal should
    /// have moved it.
    SwitchStuckClosed = 11,
    /// As many resets in a row as the policy allows have failed: the switch is given up until it is repaired.
    SwitchFailed = 12,
    /// The run, with what leaked in it, came to more than 2^46 counts of movement: its books end there.
    OutOfRange = 13,
}

impl Reason {
    /// All reasons, in the order of their bits.
    pub const ALL: [Self; 14] = [
        Self::AtRail,
        Self::Gap,
        Self::Jump,
        Self::DeadTime,
        Self::ResetNotArrived,
        Self::Frozen,
        Self::DriftOutsideLimits,
        Self::ClockStalled,
        Self::InputInZero,
        Self::Inconsistent,
        Self::DroopOutsideLimits,
        Self::SwitchStuckClosed,
        Self::SwitchFailed,
        Self::OutOfRange,
    ];

    /// A stable name for logs: lower case, words joined by `_`.
    pub const fn name(self) -> &'static str {
        match self {
            Self::AtRail => "at_rail",
            Self::Gap => "gap",
            Self::Jump => "jump",
            Self::DeadTime => "dead_time",
            Self::ResetNotArrived => "reset_not_arrived",
            Self::Frozen => "frozen",
            Self::DriftOutsideLimits => "drift_outside_limits",
            Self::ClockStalled => "clock_stalled",
            Self::InputInZero => "input_in_zero",
            Self::Inconsistent => "inconsistent",
            Self::DroopOutsideLimits => "droop_outside_limits",
            Self::SwitchStuckClosed => "switch_stuck_closed",
            Self::SwitchFailed => "switch_failed",
            Self::OutOfRange => "out_of_range",
        }
    }

    /// Whether the total is still a lower bound of a unipolar input's integral.
    const fn leaves_lower_bound(self) -> bool {
        matches!(self, Self::AtRail | Self::Gap | Self::DeadTime | Self::InputInZero)
    }
}

/// A set of [`Reason`]s.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Reasons(u16);

impl Reasons {
    /// The reasons in the set.
    pub fn iter(self) -> impl Iterator<Item = Reason> {
        Reason::ALL.into_iter().filter(move |&r| self.contains(r))
    }

    /// Whether the set is empty.
    pub const fn is_empty(self) -> bool {
        self.0 == 0
    }

    /// Whether the set holds `reason`.
    pub const fn contains(self, reason: Reason) -> bool {
        self.0 & (1 << reason as u16) != 0
    }

    /// How far a reading with these reasons can be trusted.
    pub fn trust(self) -> Trust {
        if self.is_empty() {
            Trust::Good
        } else if self.iter().all(Reason::leaves_lower_bound) {
            Trust::LowerBound
        } else {
            Trust::Invalid
        }
    }

    /// Adds a reason; `true` if it was not there before.
    pub(crate) fn insert(&mut self, reason: Reason) -> bool {
        let new = !self.contains(reason);
        self.0 |= 1 << reason as u16;
        new
    }
}

/// How far a reading can be trusted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Trust {
    /// Value and uncertainty hold.
    Good,
    /// Input may have gone unseen: for an input that keeps one sign, the true integral is at least this large. By
    /// `AtRail`, `Gap`, `DeadTime` and `InputInZero` alone.
    LowerBound,
    /// The value means nothing. By any other reason.
    Invalid,
}
