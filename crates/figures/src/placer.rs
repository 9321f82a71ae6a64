use crate::polyline::{Box2, Point, clip_segment};

/// Side of the cells in which drawn data is remembered, design pixels.
const CELL: f64 = 4.0;
/// Least distance between two pieces of text.
const APART: f64 = 5.0;
/// Share of a leader's cells that may lie over data.
const CROSSED: f64 = 0.25;
/// Farthest a label may stand to the side of its point.
const REACH: f64 = 40.0;

/// Finds free places for text inside a plot.
pub(crate) struct Placer {
    frame: Box2,
    columns: usize,
    rows: usize,
    inked: Vec<bool>,
    taken: Vec<Box2>,
    leaders: Vec<(Point, Point)>,
}

/// Where a label goes, and the line that ties it to its point.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Placed {
    pub(crate) place: Box2,
    pub(crate) leader: Option<(Point, Point)>,
}

impl Placer {
    pub(crate) fn new(frame: Box2) -> Self {
        let columns = (frame.width() / CELL).ceil().max(1.0) as usize;
        let rows = (frame.height() / CELL).ceil().max(1.0) as usize;
        Self {
            frame,
            columns,
            rows,
            inked: vec![false; columns * rows],
            taken: Vec::new(),
            leaders: Vec::new(),
        }
    }

    fn cell(&self, (x, y): Point) -> (usize, usize) {
        let index = |v: f64, most: usize| ((v / CELL).max(0.0) as usize).min(most - 1);
        (
            index(x - self.frame.left, self.columns),
            index(y - self.frame.top, self.rows),
        )
    }

    /// Remembers a clipped curve.
    pub(crate) fn ink(&mut self, run: &[Point]) {
        for (i, &b) in run.iter().enumerate() {
            let a = run[i.saturating_sub(1)];
            let steps = ((b.0 - a.0).hypot(b.1 - a.1) / CELL).ceil().max(1.0);
            for k in 0..=(steps as usize) {
                let t = k as f64 / steps;
                let (column, row) = self.cell((a.0 + t * (b.0 - a.0), a.1 + t * (b.1 - a.1)));
                self.inked[row * self.columns + column] = true;
            }
        }
    }

    /// Keeps text off a box.
    pub(crate) fn take(&mut self, place: Box2) {
        self.taken.push(place);
    }

    /// Share of a box's cells that hold data.
    pub(crate) fn covered(&self, place: &Box2) -> f64 {
        let (c0, r0) = self.cell((place.left, place.top));
        let (c1, r1) = self.cell((place.right, place.bottom));
        let mut inked = 0;
        for row in r0..=r1 {
            let cells = &self.inked[row * self.columns + c0..=row * self.columns + c1];
            inked += cells.iter().filter(|&&c| c).count();
        }
        inked as f64 / ((c1 - c0 + 1) * (r1 - r0 + 1)) as f64
    }

    fn free(&self, place: &Box2) -> bool {
        let apart = place.grown(APART);
        self.frame.grown(-2.0).holds(place)
            && !self.taken.iter().any(|t| t.meets(&apart))
            && !self
                .leaders
                .iter()
                .any(|l| clip_segment(l.0, l.1, &apart).is_some())
    }

    /// The free one of some places that covers least data, the first of equals.
    pub(crate) fn note(&mut self, places: &[Box2], tolerated: f64) -> Option<Box2> {
        let mut best: Option<(f64, Box2)> = None;
        for place in places.iter().filter(|p| self.free(p)) {
            let cost = self.covered(&place.grown(3.0));
            if cost <= tolerated && best.is_none_or(|(least, _)| cost < least) {
                best = Some((cost, *place));
            }
        }
        let (_, place) = best?;
        self.take(place);
        Some(place)
    }

    /// A place near a point for a label of the given size: straight above its
    /// crest (the point itself, or the tip of a band around it) if that is
    /// free, else the cheapest in distance and in data crossed by its leader.
    /// A label never covers data.
    pub(crate) fn label(
        &mut self,
        at: Point,
        crest: f64,
        width: f64,
        height: f64,
    ) -> Option<Placed> {
        let mut best: Option<(f64, Placed)> = None;
        let mut weigh = |left: f64, bottom: f64| {
            let place = Box2::new(left, bottom - height, left + width, bottom);
            if self.covered(&place.grown(2.0)) > 0.0 || !self.free(&place) {
                return;
            }
            let above = place.bottom <= crest;
            let end_y = if above {
                place.bottom + 3.0
            } else {
                at.1.clamp(place.top, place.bottom)
            };
            let end = (at.0.clamp(place.left, place.right), end_y);
            let whole = (end.0 - at.0).hypot(end.1 - at.1);
            let distance = (end.0 - at.0).hypot(end.1 - if above { crest } else { at.1 });
            let leader = (distance > 9.0).then_some((at, end));
            let mut cost = distance + 0.15 * (left + 0.5 * width - at.0).abs();
            if let Some((a, b)) = leader {
                let near = (
                    a.0 + 6.0 * (b.0 - a.0) / whole,
                    a.1 + 6.0 * (b.1 - a.1) / whole,
                );
                if self
                    .taken
                    .iter()
                    .any(|t| clip_segment(near, b, &t.grown(2.0)).is_some())
                    || self.leaders.iter().any(|&l| cross((near, b), l))
                {
                    return;
                }
                let crossed = self.crossed(near, b);
                if crossed > CROSSED || (b.0 - a.0).abs() > REACH {
                    return;
                }
                cost += 25.0 + 150.0 * crossed;
            }
            if best.is_none_or(|(least, _)| cost < least) {
                best = Some((cost, Placed { place, leader }));
            }
        };
        for level in 0..14 {
            let bottom = crest - 8.0 - 11.0 * f64::from(level);
            for step in [
                0.0, 0.25, -0.25, 0.5, -0.5, 0.62, -0.62, 0.85, -0.85, 1.1, -1.1,
            ] {
                weigh(at.0 - 0.5 * width + step * width, bottom);
            }
        }
        for side in [8.0, -8.0 - width] {
            for drop in [0.5, 1.0, 0.0] {
                weigh(at.0 + side, at.1 + drop * height);
            }
        }
        let (_, placed) = best?;
        self.take(placed.place);
        self.leaders.extend(placed.leader);
        Some(placed)
    }

    /// Share of a line's cells that hold data.
    fn crossed(&self, a: Point, b: Point) -> f64 {
        let steps = ((b.0 - a.0).hypot(b.1 - a.1) / CELL).ceil().max(1.0);
        let inked = (0..=(steps as usize)).filter(|&k| {
            let t = k as f64 / steps;
            let (column, row) = self.cell((a.0 + t * (b.0 - a.0), a.1 + t * (b.1 - a.1)));
            self.inked[row * self.columns + column]
        });
        inked.count() as f64 / (steps + 1.0)
    }
}

fn cross((a, b): (Point, Point), (c, d): (Point, Point)) -> bool {
    let side = |p: Point, q: Point, r: Point| (q.0 - p.0) * (r.1 - p.1) - (q.1 - p.1) * (r.0 - p.0);
    side(a, b, c) * side(a, b, d) < 0.0 && side(c, d, a) * side(c, d, b) < 0.0
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn labels_never_meet_and_never_leave_the_frame() {
        let frame = Box2::new(0.0, 0.0, 600.0, 300.0);
        let mut placer = Placer::new(frame);
        placer.ink(&[(0.0, 250.0), (600.0, 250.0)]);
        let mut placed = Vec::new();
        for i in 0..60 {
            let at = (f64::from(i) * 10.0 + 3.0, 250.0 - f64::from(i % 7) * 20.0);
            placed.extend(placer.label(at, at.1, 110.0, 12.0));
        }
        assert!(placed.len() > 10, "{}", placed.len());
        for (i, a) in placed.iter().enumerate() {
            assert!(frame.holds(&a.place));
            for b in &placed[..i] {
                assert!(!a.place.meets(&b.place));
                if let Some(leader) = a.leader {
                    assert!(clip_segment(leader.1, leader.1, &b.place).is_none());
                }
            }
        }
    }

    #[test]
    fn the_first_label_gets_the_place_above_its_point() {
        let mut placer = Placer::new(Box2::new(0.0, 0.0, 600.0, 300.0));
        let placed = placer.label((300.0, 200.0), 200.0, 100.0, 12.0);
        let place = Box2::new(250.0, 180.0, 350.0, 192.0);
        assert_eq!(
            placed,
            Some(Placed {
                place,
                leader: None
            })
        );
    }

    #[test]
    fn a_label_that_would_cover_data_is_left_out() {
        let mut placer = Placer::new(Box2::new(0.0, 0.0, 100.0, 100.0));
        for y in 0..25 {
            let y = f64::from(y) * 4.0 + 2.0;
            placer.ink(&[(0.0, y), (100.0, y)]);
        }
        assert_eq!(placer.label((50.0, 50.0), 50.0, 60.0, 12.0), None);
    }
}
