//! What a line's samples add up to, for its uncertainty.

/// Sums over a line's samples, of which the quadratic forms are made.
///
/// The run is charged with the full walk of its whole duration. A line's weights see the walk of its own window
/// differently: of an increment between two samples the run keeps, instead of all, the square of the sum `h` of the
/// weights of the samples nearer to the instant; `k` is the same of the weights' change with the extrapolation.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Sums {
    /// Of the weights' products with each other, and with those that the line at the other end has taken.
    pub(super) pp: f32,
    pub(super) ps: f32,
    pub(super) ss: f32,
    pub(super) shared_p: f32,
    pub(super) shared_s: f32,
    /// Of the increments' walk, and of that times products of `h` and `k`.
    pub(super) span: f32,
    pub(super) h: f32,
    pub(super) k: f32,
    pub(super) hh: f32,
    pub(super) hk: f32,
    pub(super) kk: f32,
    /// What the weights at the other end of the segment add.
    pub(super) other: f32,
    pub(super) other_k: f32,
    near: f32,
    nearer: [f32; 2],
    nearer_other: f32,
}

impl Sums {
    /// Takes the samples in the order of growing distance.
    pub(super) fn add(&mut self, far: f32, (p, s): (f32, f32), shared: f32, level_walk: f32) {
        if level_walk > 0.0 {
            let walk = level_walk * (far - self.near);
            let [h, k] = self.nearer;
            let (walk_h, walk_k) = (walk * h, walk * k);
            self.span += walk;
            self.h += walk_h;
            self.k += walk_k;
            self.hh += walk_h * h;
            self.hk += walk_h * k;
            self.kk += walk_k * k;
            self.nearer = [h + p, k + s];
            self.near = far;
            if self.nearer_other != 0.0 {
                self.other += 2.0 * self.nearer_other * (walk - walk_h);
                self.other_k += self.nearer_other * walk_k;
            }
        }
        self.pp += p * p;
        self.ps += p * s;
        self.ss += s * s;
        if shared != 0.0 {
            self.shared_p += p * shared;
            self.shared_s += s * shared;
            self.nearer_other += shared;
        }
    }
}
