//! Second differences of a level at octave lags: what a trace says of its own noise, one sample at a time.

use crate::math;

/// Sums of squared second differences `D = x(t) - 2 x(t - tau) + x(t - 2 tau)` of a level at the lags `tau` of 1, 2, 4
/// ... 2^(N-1) sample periods.
///
/// Octave `k` takes every `2^k`-th sample and differences consecutive triples of those: the plain estimator of the
/// Allan variance, `E[D^2] / (2 tau^2)` (IEEE Std 1139-2008; NIST SP 1065, section 5.2.1; the level is what these call
/// phase). A steady drift cancels in `D`; so does any origin of the level. Samples must be equally spaced.
///
/// All sums are integers and exact while levels lie within 2^61 counts of each other; beyond that differences saturate
/// at the ends of `i64`, and sums at 2^128. After 2^32 - 1 differences an octave takes no more. Octaves past the 32nd
/// stay empty. A sample costs two octaves on the average and `N` at most; memory is 48 bytes an octave at most.
///
/// ```
/// use brimline::estimate::Octaves;
///
/// let mut zeros = Octaves::<16>::new();
/// for level in [0, 1, 5, 6, 10, 11] {
///     zeros.feed(level); // first differences 1, 4, 1, 4, 1: second differences 3, -3, 3, -3
/// }
/// let shortest = zeros.octave(0).expect("there were triples");
/// assert_eq!((shortest.lag, shortest.count, shortest.mean_square), (1, 4, 9.0));
/// // At twice the lag the only triple, 0, 5, 10, is a straight line.
/// assert_eq!(zeros.octave(1).expect("there was a triple").mean_square, 0.0);
///
/// zeros.break_chain(); // the next zero starts at another level: the sums go on, no triple spans the break
/// for level in [7000, 7003] {
///     zeros.feed(level);
/// }
/// assert_eq!(zeros.octave(0), Some(shortest));
/// ```
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Octaves<const N: usize> {
    chains: [Chain; N],
    /// Samples since the last break, wrapping: 2^32 is a multiple of every lag.
    taken: u32,
}

/// One octave's pending samples and sums.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
struct Chain {
    last: i64,
    before: i64,
    pending: u8,
    count: u32,
    squares: u128,
}

const OCTAVES_MAX: u32 = 32;

impl<const N: usize> Octaves<N> {
    /// No samples yet.
    pub const fn new() -> Self {
        Self { chains: [Chain { last: 0, before: 0, pending: 0, count: 0, squares: 0 }; N], taken: 0 }
    }

    /// The level, counts, one sample period after the one before.
    pub fn feed(&mut self, level: i64) {
        let reached = (self.taken.trailing_zeros() + 1).min(OCTAVES_MAX);
        for (chain, _) in self.chains.iter_mut().zip(0..reached) {
            chain.take(level);
        }
        self.taken = self.taken.wrapping_add(1);
    }

    /// The next sample is no continuation of the last: a new zero, a reset, a gap. Sums stay, pending samples go.
    pub fn break_chain(&mut self) {
        self.taken = 0;
        for chain in &mut self.chains {
            chain.pending = 0;
        }
    }

    /// What was found at a lag of `2^k` samples; `None` without a triple of samples that far apart.
    pub fn octave(&self, k: usize) -> Option<Octave> {
        let chain = self.chains.get(k).filter(|chain| chain.count > 0)?;
        let lag = 1_u32.checked_shl(u32::try_from(k).ok()?)?;
        // A saturated sum would round up to infinity.
        let sum = (chain.squares as f32).min(f32::MAX);
        Some(Octave { lag, count: chain.count, mean_square: sum / chain.count as f32 })
    }
}

impl<const N: usize> Default for Octaves<N> {
    fn default() -> Self {
        Self::new()
    }
}

impl Chain {
    fn take(&mut self, level: i64) {
        if self.pending >= 2 {
            let rise = level.saturating_sub(self.last);
            let difference = rise.saturating_sub(self.last.saturating_sub(self.before));
            let size = u128::from(difference.unsigned_abs());
            if let Some(count) = self.count.checked_add(1) {
                self.count = count;
                self.squares = self.squares.saturating_add(size * size);
            }
        } else {
            self.pending += 1;
        }
        self.before = self.last;
        self.last = level;
    }
}

/// The second differences found at one lag.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Octave {
    /// The lag `tau`, sample periods.
    pub lag: u32,
    /// Number of second differences, above 0.
    pub count: u32,
    /// Their mean square, counts^2.
    pub mean_square: f32,
}

impl Octave {
    /// Effective degrees of freedom of [`mean_square`](Self::mean_square), whose relative standard uncertainty is
    /// `sqrt(2 / dof)`: the fewest that it can have whatever the noise is made of, at least 1.
    ///
    /// Consecutive triples share samples, so their second differences correlate by `rho_m` over `m` lags, and `n` of
    /// them are worth `n / (1 + 2 sum (1 - m/n) rho_m^2)`. White readout noise has the strongest correlations, -2/3 and
    /// 1/6: 1.94 differences make a degree of freedom (white input noise: 1.50, flicker: 1.13, wander of the drift:
    /// 1.13). Here all terms have the factor `1 - 1/n`.
    pub fn dof(&self) -> f32 {
        let n = self.count as f32;
        n / (1.0 + (overlap(0, 0, 0) - 1.0) * (1.0 - 1.0 / n))
    }

    /// Allan deviation of the level's rate, counts/s: `sqrt(E[D^2] / 2) / tau`, with samples every `sample_s` seconds.
    pub fn allan_deviation(&self, sample_s: f32) -> f32 {
        math::sqrt(0.5 * self.mean_square) / (self.lag as f32 * sample_s)
    }

    /// Root mean square of `D`, counts: the standard uncertainty of a run of duration `tau` whose drift is taken from
    /// the zero of duration `tau` just before it, end point to end point. It needs no model of the noise.
    pub fn zero_and_run_u(&self) -> f32 {
        math::sqrt(self.mean_square)
    }
}

/// Noises told apart: readout, random walk of the level, flicker and random walk of its rate. Noise `p` adds to
/// `E[D^2]` in proportion to `tau^p`.
pub(super) const NOISES: usize = 4;

/// Octaves apart up to which overlaps count: all that are further apart change no uncertainty by 1 %.
const APART: usize = 6;

/// `sum rho_p rho_q` over all second differences of an octave, where `rho` are their covariances with one second
/// difference `apart` octaves above, for two of the noises, relative to the variance of the former.
pub(super) fn overlap(apart: usize, p: usize, q: usize) -> f32 {
    OVERLAPS.get(apart).and_then(|table| table.get(p)).and_then(|row| row.get(q)).copied().unwrap_or(0.0)
}

/// Worked out by the compiler.
static OVERLAPS: [[[f32; NOISES]; NOISES]; APART + 1] = overlaps();

#[allow(clippy::indexing_slicing, reason = "runs while compiling only, where a wrong index is an error")]
const fn overlaps() -> [[[f32; NOISES]; NOISES]; APART + 1] {
    let logarithms = logarithms();
    let mut overlaps = [[[0.0; NOISES]; NOISES]; APART + 1];
    let mut apart = 0;
    while apart <= APART {
        let long = 1_i32 << apart;
        let mut sums = [[0.0; NOISES]; NOISES];
        // Flicker is felt beyond the samples too; its covariances fall with the square of the distance.
        let mut shift = -4 * long - 4;
        while shift <= 2 * long + 4 {
            let rho = covariances(shift, long, &logarithms);
            let mut pq = 0;
            while pq < NOISES * NOISES {
                sums[pq / NOISES][pq % NOISES] += rho[pq / NOISES] * rho[pq % NOISES];
                pq += 1;
            }
            shift += 1;
        }
        let mut pq = 0;
        while pq < NOISES * NOISES {
            overlaps[apart][pq / NOISES][pq % NOISES] = sums[pq / NOISES][pq % NOISES] as f32;
            pq += 1;
        }
        apart += 1;
    }
    overlaps
}

/// Covariance, for each noise, of a second difference of lag 1 with one of lag `long` that starts `shift` later,
/// relative to the variance of the former.
///
/// Second differences see a noise through its generalised covariance `g(h)`: 1 at 0, `-|h| / 2`, `h^2 ln|h| / 2` and
/// `|h|^3 / 12`, whose fourth difference `6 g(0) - 8 g(1) + 2 g(2)` is the variance at lag 1.
#[allow(clippy::indexing_slicing, reason = "runs while compiling only, where a wrong index is an error")]
const fn covariances(shift: i32, long: i32, logarithms: &[f64; DISTANCES]) -> [f64; NOISES] {
    const WEIGHTS: [f64; 3] = [1.0, -2.0, 1.0];
    let mut sums = [0.0; NOISES];
    let mut pair = 0;
    while pair < 9 {
        let distance = (shift + long * (pair / 3) as i32 - (pair % 3) as i32).unsigned_abs();
        let weight = WEIGHTS[pair / 3] * WEIGHTS[pair % 3];
        let h = distance as f64;
        sums[0] += if distance == 0 { weight } else { 0.0 };
        sums[1] -= weight * h / 2.0;
        sums[2] += weight * h * h * logarithms[distance as usize] / 2.0;
        sums[3] += weight * h * h * h / 12.0;
        pair += 1;
    }
    [sums[0] / 6.0, sums[1] / 2.0, sums[2] / (4.0 * core::f64::consts::LN_2), sums[3] / (2.0 / 3.0)]
}

/// Distances between samples that occur in the sums.
const DISTANCES: usize = 4 * (1 << APART) + 8;

/// Natural logarithms of whole numbers (0 for 0): `ln(n + 1) = ln(n) + 2 artanh(1 / (2n + 1))`.
#[allow(clippy::indexing_slicing, reason = "runs while compiling only, where a wrong index is an error")]
const fn logarithms() -> [f64; DISTANCES] {
    let mut logarithms = [0.0; DISTANCES];
    let mut n = 1;
    while n + 1 < DISTANCES {
        let z = 1.0 / (2 * n + 1) as f64;
        let (mut power, mut term, mut artanh) = (z, 1, 0.0);
        while term < 40 {
            artanh += power / term as f64;
            power *= z * z;
            term += 2;
        }
        logarithms[n + 1] = logarithms[n] + 2.0 * artanh;
        n += 1;
    }
    logarithms
}
