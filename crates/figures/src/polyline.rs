//! Curves in design pixels: gaps, reduction, clipping, dashes. y downwards.

/// A point on the page.
pub(crate) type Point = (f64, f64);

/// An upright rectangle on the page.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Box2 {
    pub(crate) left: f64,
    pub(crate) top: f64,
    pub(crate) right: f64,
    pub(crate) bottom: f64,
}

impl Box2 {
    pub(crate) fn new(left: f64, top: f64, right: f64, bottom: f64) -> Self {
        Self {
            left,
            top,
            right,
            bottom,
        }
    }

    pub(crate) fn width(&self) -> f64 {
        self.right - self.left
    }

    pub(crate) fn height(&self) -> f64 {
        self.bottom - self.top
    }

    pub(crate) fn contains(&self, (x, y): Point) -> bool {
        x >= self.left && x <= self.right && y >= self.top && y <= self.bottom
    }

    pub(crate) fn holds(&self, other: &Self) -> bool {
        other.left >= self.left
            && other.right <= self.right
            && other.top >= self.top
            && other.bottom <= self.bottom
    }

    pub(crate) fn meets(&self, other: &Self) -> bool {
        self.left < other.right
            && other.left < self.right
            && self.top < other.bottom
            && other.top < self.bottom
    }

    pub(crate) fn grown(&self, by: f64) -> Self {
        Self::new(
            self.left - by,
            self.top - by,
            self.right + by,
            self.bottom + by,
        )
    }

    pub(crate) fn corners(&self) -> [Point; 4] {
        let Self {
            left,
            top,
            right,
            bottom,
        } = *self;
        [(left, top), (right, top), (right, bottom), (left, bottom)]
    }
}

/// The stretches of finite points between gaps.
pub(crate) fn runs(points: impl Iterator<Item = Point>) -> Vec<Vec<Point>> {
    let mut out = Vec::new();
    let mut run = Vec::new();
    for point in points {
        if point.0.is_finite() && point.1.is_finite() {
            run.push(point);
        } else if !run.is_empty() {
            out.push(std::mem::take(&mut run));
        }
    }
    if !run.is_empty() {
        out.push(run);
    }
    out
}

/// Reduces neighbours that fall into one column of the given width to the
/// first, the lowest, the highest and the last, in their order. What is left
/// paints the same columns: no extreme is lost and none is made up.
pub(crate) fn thin(run: &[Point], column: f64) -> Vec<Point> {
    let key = |p: &Point| (p.0 / column).floor();
    let mut out = Vec::new();
    let mut start = 0;
    while start < run.len() {
        let column = key(&run[start]);
        let mut end = start + 1;
        let (mut low, mut high) = (start, start);
        while end < run.len() && key(&run[end]) == column {
            if run[end].1 < run[low].1 {
                low = end;
            }
            if run[end].1 > run[high].1 {
                high = end;
            }
            end += 1;
        }
        let mut kept = [start, low.min(high), low.max(high), end - 1].to_vec();
        kept.dedup();
        out.extend(kept.into_iter().map(|i| run[i]));
        start = end;
    }
    out
}

/// The parts of a polyline inside a box.
pub(crate) fn clip(run: &[Point], frame: &Box2) -> Vec<Vec<Point>> {
    let mut out: Vec<Vec<Point>> = Vec::new();
    if let [only] = run {
        return if frame.contains(*only) {
            vec![vec![*only]]
        } else {
            out
        };
    }
    let mut open = false;
    for pair in run.windows(2) {
        let Some((a, b)) = clip_segment(pair[0], pair[1], frame) else {
            open = false;
            continue;
        };
        match out.last_mut() {
            Some(part) if open && a == pair[0] => part.push(b),
            _ => out.push(vec![a, b]),
        }
        open = b == pair[1];
    }
    out
}

/// Liang and Barsky's parametric clipping.
pub(crate) fn clip_segment(a: Point, b: Point, frame: &Box2) -> Option<(Point, Point)> {
    let (dx, dy) = (b.0 - a.0, b.1 - a.1);
    let (mut t0, mut t1) = (0.0_f64, 1.0_f64);
    let sides = [
        (-dx, a.0 - frame.left),
        (dx, frame.right - a.0),
        (-dy, a.1 - frame.top),
        (dy, frame.bottom - a.1),
    ];
    for (p, q) in sides {
        if p == 0.0 {
            if q < 0.0 {
                return None;
            }
        } else if p < 0.0 {
            t0 = t0.max(q / p);
        } else {
            t1 = t1.min(q / p);
        }
    }
    if t0 > t1 {
        return None;
    }
    let at = |t: f64| (a.0 + t * dx, a.1 + t * dy);
    Some((
        if t0 > 0.0 { at(t0) } else { a },
        if t1 < 1.0 { at(t1) } else { b },
    ))
}

/// The part of a polygon inside a box, side by side (Sutherland and Hodgman).
pub(crate) fn clip_polygon(corners: Vec<Point>, frame: &Box2) -> Vec<Point> {
    let left = |p: Point| p.0 - frame.left;
    let right = |p: Point| frame.right - p.0;
    let top = |p: Point| p.1 - frame.top;
    let bottom = |p: Point| frame.bottom - p.1;
    let sides: [&dyn Fn(Point) -> f64; 4] = [&left, &right, &top, &bottom];
    let mut shape = corners;
    for inside in sides {
        let mut kept = Vec::with_capacity(shape.len() + 4);
        for i in 0..shape.len() {
            let (a, b) = (shape[i], shape[(i + 1) % shape.len()]);
            let (da, db) = (inside(a), inside(b));
            if da >= 0.0 {
                kept.push(a);
            }
            if (da >= 0.0) != (db >= 0.0) {
                let t = da / (da - db);
                kept.push((a.0 + t * (b.0 - a.0), a.1 + t * (b.1 - a.1)));
            }
        }
        shape = kept;
    }
    shape
}

/// Length along a polyline.
pub(crate) fn length(run: &[Point]) -> f64 {
    run.windows(2)
        .map(|p| (p[1].0 - p[0].0).hypot(p[1].1 - p[0].1))
        .sum()
}

/// Cuts a polyline into the dashes of a pattern of line and gap lengths.
pub(crate) fn dashes(run: &[Point], pattern: &[f64]) -> Vec<Vec<Point>> {
    let mut out = Vec::new();
    let Some(&first) = run.first() else {
        return out;
    };
    let mut phase = 0;
    let mut left = pattern[0];
    let mut dash = vec![first];
    for pair in run.windows(2) {
        let (a, b) = (pair[0], pair[1]);
        let whole = (b.0 - a.0).hypot(b.1 - a.1);
        let mut gone = 0.0;
        while whole - gone > left {
            gone += left;
            let t = gone / whole;
            let at = (a.0 + t * (b.0 - a.0), a.1 + t * (b.1 - a.1));
            if phase % 2 == 0 {
                dash.push(at);
                out.push(std::mem::take(&mut dash));
            } else {
                dash = vec![at];
            }
            phase = (phase + 1) % pattern.len();
            left = pattern[phase];
        }
        left -= whole - gone;
        if phase % 2 == 0 {
            dash.push(b);
        }
    }
    if dash.len() > 1 {
        out.push(dash);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_gap_splits_a_curve() {
        let points = [
            (0.0, 1.0),
            (1.0, f64::NAN),
            (2.0, 1.0),
            (3.0, 1.0),
            (4.0, f64::INFINITY),
        ];
        let runs = runs(points.into_iter());
        assert_eq!(runs, vec![vec![(0.0, 1.0)], vec![(2.0, 1.0), (3.0, 1.0)]]);
    }

    #[test]
    fn thinning_keeps_every_extreme_and_the_ends() {
        let run: Vec<Point> = (0..100_000_u32)
            .map(|i| {
                (
                    f64::from(i) / 100.0,
                    f64::from(i.wrapping_mul(2_654_435_761) >> 8),
                )
            })
            .collect();
        let thinned = thin(&run, 1.0);
        assert!(thinned.len() <= 4 * 1000);
        for column in 0..1000_usize {
            let all = &run[column * 100..(column + 1) * 100];
            let kept: Vec<f64> = thinned
                .iter()
                .filter(|p| p.0.floor() == column as f64)
                .map(|p| p.1)
                .collect();
            let extremes = |v: &[f64]| {
                v.iter()
                    .fold((f64::MAX, f64::MIN), |(l, h), &y| (l.min(y), h.max(y)))
            };
            let all: Vec<f64> = all.iter().map(|p| p.1).collect();
            assert_eq!(extremes(&all), extremes(&kept));
        }
        assert_eq!(
            (thinned[0], thinned[thinned.len() - 1]),
            (run[0], run[99_999])
        );
    }

    #[test]
    fn clipping_cuts_at_the_border_and_nowhere_else() {
        let frame = Box2::new(0.0, 0.0, 10.0, 10.0);
        let run = [
            (-5.0, 5.0),
            (5.0, 5.0),
            (5.0, 25.0),
            (8.0, 25.0),
            (8.0, 5.0),
        ];
        let parts = clip(&run, &frame);
        assert_eq!(
            parts,
            vec![
                vec![(0.0, 5.0), (5.0, 5.0), (5.0, 10.0)],
                vec![(8.0, 10.0), (8.0, 5.0)]
            ]
        );
        let whole = clip_polygon(
            vec![(-5.0, -5.0), (15.0, -5.0), (15.0, 15.0), (-5.0, 15.0)],
            &frame,
        );
        assert_eq!(whole.len(), 4);
        assert!(whole.iter().all(|&p| frame.contains(p)));
    }

    #[test]
    fn dashes_cover_their_share_whatever_the_corners() {
        let straight = dashes(&[(0.0, 0.0), (100.0, 0.0)], &[6.0, 4.0]);
        assert_eq!(straight.len(), 10);
        let broken: Vec<Point> = (0..=1000).map(|i| (f64::from(i) * 0.1, 0.0)).collect();
        let bent = dashes(&broken, &[6.0, 4.0]);
        let total = |d: &[Vec<Point>]| d.iter().map(|d| length(d)).sum::<f64>();
        // 2000 additions of numbers below 100, each within an ulp of 1.4e-14
        assert!((total(&straight) - 60.0).abs() < 1e-10);
        assert!((total(&bent) - 60.0).abs() < 1e-10);
    }
}
