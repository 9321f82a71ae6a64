//! Twelfths of a recording: sums kept apart so that halves, thirds and quarters can be compared.

/// Number of epochs; twelve divides into halves, thirds and quarters.
pub const EPOCHS: usize = 12;

/// Sums by epoch; an epoch without blocks takes no memory, so a chunk holds one or two.
#[derive(Debug, Clone, Default)]
pub(crate) struct Epochs {
    sums: [Option<Vec<f64>>; EPOCHS],
}

impl Epochs {
    pub(crate) fn add(&mut self, epoch: usize, values: &[f64]) {
        let sum = self.sums[epoch].get_or_insert_with(|| vec![0.0; values.len()]);
        for (s, v) in sum.iter_mut().zip(values) {
            *s += v;
        }
    }

    pub(crate) fn merge(&mut self, later: Self) {
        for (mine, next) in self.sums.iter_mut().zip(later.sums) {
            match (mine.as_mut(), next) {
                (Some(sum), Some(next)) => {
                    for (s, n) in sum.iter_mut().zip(&next) {
                        *s += n;
                    }
                }
                (None, Some(next)) => *mine = Some(next),
                (_, None) => {}
            }
        }
    }

    /// Sum over all epochs, in their order.
    pub(crate) fn total(&self, length: usize) -> Vec<f64> {
        let mut total = vec![0.0; length];
        for sum in self.sums.iter().flatten() {
            for (t, s) in total.iter_mut().zip(sum) {
                *t += s;
            }
        }
        total
    }

    /// Mean of each epoch that has blocks, with their number.
    pub(crate) fn means(&self, blocks: &[u64; EPOCHS]) -> Vec<(u64, Vec<f64>)> {
        self.sums
            .iter()
            .zip(blocks)
            .filter_map(|(sum, count)| {
                let mean = sum.as_ref()?.iter().map(|s| s / *count as f64).collect();
                Some((*count, mean))
            })
            .collect()
    }
}
