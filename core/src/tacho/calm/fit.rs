//! Least squares through weighted points: a line, and the parabola that goes on from it.
//!
//! The parabola is the line and a multiple of the polynomial of second degree that is orthogonal to it over the points
//! (G. E. Forsythe, Generation and use of orthogonal polynomials for data-fitting with a digital computer, J. SIAM 5, 1957,
//! 74-88; from memory): line and scatter stay as they are, and the standard errors add as squares.

use libm::{fabsf, sqrtf};

/// A curve leaves at least this share of a point's error, or nothing can be said of it.
const LEAST_LEFT: f32 = 1e-3;

/// A point.
#[derive(Clone, Copy, Debug)]
pub(super) struct Point {
    /// Its weight.
    pub(super) turns: i32,
    /// Its place, half-turns.
    pub(super) at: i32,
    /// ns.
    pub(super) late: i64,
}

/// By how much the newer half of the points is slower than the older one, as a share, and where it begins.
#[inline(never)]
pub(super) fn bend(points: &[Point], period: f32) -> (f32, usize) {
    let [oldest, .., newest] = points else {
        return (0.0, 0);
    };
    let whole = (newest.at - oldest.at).max(1);
    let past_middle = |p: &Point| 2 * (p.at - oldest.at) >= whole;
    let Some((half, middle)) = points.iter().enumerate().find(|(_, p)| past_middle(p)) else {
        return (0.0, 0);
    };
    let (part, whole) = ((middle.at - oldest.at) as f32, whole as f32);
    // The sagitta of the bend over its chord: a quarter of the window's time times the difference of the speeds.
    let chord = (newest.late - oldest.late) as f32 * part / whole;
    let sagitta = chord - (middle.late - oldest.late) as f32;
    (8.0 * sagitta / (whole * period), half)
}

/// The straight line.
#[derive(Clone, Copy, Debug)]
pub(super) struct Line {
    /// Mean place: a whole number and the rest.
    centre: i32,
    rest: f32,
    sum: f32,
    /// Squares of the places from their mean.
    spread: f32,
    /// At the mean place.
    level: f32,
    /// ns late a half-turn.
    pub(super) slope: f32,
}

impl Line {
    /// Through two points at least, at different places. Exact in whole numbers but for the last division.
    #[inline(never)]
    pub(super) fn through(points: &[Point]) -> Line {
        // Of 20,000 turns a second at most: 32 bits hold this.
        let (mut sum, mut sx) = (0_i32, 0_i32);
        for p in points {
            sum += p.turns;
            sx += p.turns * p.at;
        }
        // From about the middle, so that 64 bits hold every product.
        let centre = sx / sum.max(1);
        let (mut sx, mut sy, mut sxx, mut sxy) = (0_i32, 0_i64, 0_i64, 0_i64);
        for p in points {
            let x = p.at - centre;
            sx += p.turns * x;
            sy += i64::from(p.turns) * p.late;
            sxx += i64::from(p.turns * x) * i64::from(x);
            sxy += i64::from(p.turns * x) * p.late;
        }
        // What the middle lacks to the mean is less than half a turn, and single precision enough for it.
        let (sum, sx, sy) = (sum as f32, sx as f32, sy as f32);
        let rest = sx / sum;
        let spread = sxx as f32 - sx * rest;
        Line {
            centre,
            rest,
            sum,
            spread,
            level: sy / sum,
            slope: (sxy as f32 - rest * sy) / spread,
        }
    }

    /// Place from the mean one.
    fn place(&self, x: i32) -> f32 {
        (x - self.centre) as f32 - self.rest
    }

    /// How far a point is from the line.
    fn off(&self, u: f32, y: i64) -> f32 {
        y as f32 - self.level - self.slope * u
    }

    /// Scatter about the line, and the standard error of the slope.
    pub(super) fn scatter(&self, points: &[Point]) -> (Scatter, f32) {
        let mut scatter = Scatter::new(2.0);
        let mut end = 0.0;
        for p in points {
            end = self.place(p.at);
            scatter.add(p.turns as f32, self.off(end, p.late));
        }
        scatter.lever = 1.0 / self.sum + end * end / self.spread;
        (scatter, sqrtf(scatter.variance() / self.spread))
    }
}

/// How points scatter about a curve.
#[derive(Clone, Copy, Debug)]
pub(super) struct Scatter {
    sum: f32,
    /// Points beyond what the curve takes.
    free: f32,
    /// The last point's weight, how far it is off, and how much of that the curve follows, over the weight.
    last: (f32, f32),
    lever: f32,
}

impl Scatter {
    fn new(parameters: f32) -> Scatter {
        Scatter {
            sum: 0.0,
            free: -parameters,
            last: (0.0, 0.0),
            lever: 0.0,
        }
    }

    fn add(&mut self, w: f32, off: f32) {
        self.sum += w * off * off;
        self.free += 1.0;
        self.last = (w, off);
    }

    /// Variance of a point of weight one, ns^2.
    pub(super) fn variance(&self) -> f32 {
        self.sum / self.free.max(1.0)
    }

    /// Whether the last point is further from the curve through the others than `most` of their standard deviations, which are
    /// `floor` ns at least (R. D. Cook and S. Weisberg, Residuals and Influence in Regression, 1982, 2.2: the externally
    /// studentized residual).
    pub(super) fn misfit(&self, most: f32, floor: f32) -> bool {
        let (w, off) = self.last;
        let of_last = w * off * off / (1.0 - w * self.lever).max(LEAST_LEFT);
        let of_others = (self.sum - of_last).max(0.0) / (self.free - 1.0);
        self.free > 1.0 && of_last > most * most * of_others.max(floor * floor)
    }
}

/// The parabola, and how well it fits.
#[derive(Clone, Copy, Debug)]
pub(super) struct Parabola {
    line: Line,
    /// The orthogonal polynomial is u^2 - a u - b, with u the place from the mean one; the sum of its squares.
    a: f32,
    squares: f32,
    /// How much of it there is: ns late a half-turn squared.
    curve: f32,
    pub(super) scatter: Scatter,
}

impl Parabola {
    /// Through three points at least, at different places.
    pub(super) fn through(points: &[Point]) -> Parabola {
        let line = Line::through(points);
        let mut cubes = 0.0;
        for p in points {
            let u = line.place(p.at);
            cubes += p.turns as f32 * u * u * u;
        }
        let (a, b) = (cubes / line.spread, line.spread / line.sum);
        let (mut squares, mut part) = (0.0, 0.0);
        for p in points {
            let u = line.place(p.at);
            let q = (u - a) * u - b;
            let weighted = p.turns as f32 * q;
            squares += weighted * q;
            part += weighted * line.off(u, p.late);
        }
        let curve = part / squares;
        let mut scatter = Scatter::new(3.0);
        let (mut end, mut bent) = (0.0, 0.0);
        for p in points {
            end = line.place(p.at);
            bent = (end - a) * end - b;
            scatter.add(p.turns as f32, line.off(end, p.late) - curve * bent);
        }
        scatter.lever = 1.0 / line.sum + end * end / line.spread + bent * bent / squares;
        Parabola {
            line,
            a,
            squares,
            curve,
            scatter,
        }
    }

    /// How much of it there is, in its standard errors if the variance were one.
    pub(super) fn bend(&self) -> f32 {
        fabsf(self.curve) * sqrtf(self.squares)
    }

    /// Slope at a place that is `beyond` half-turns after `x`, and its standard error.
    pub(super) fn slope(&self, x: i32, beyond: f32) -> (f32, f32) {
        let steepness = 2.0 * (self.line.place(x) + beyond) - self.a;
        let parts = 1.0 / self.line.spread + steepness * steepness / self.squares;
        (
            self.line.slope + self.curve * steepness,
            sqrtf(self.scatter.variance() * parts),
        )
    }
}
