//! Cores: connected regions of swirling strength, one for each distinct peak.

use ndarray::Array2;

use super::EddyOptions;
use crate::task::{Cancelled, Task};

/// One region of swirling strength of one sign.
#[derive(Clone, Debug)]
pub(super) struct Core {
    /// The nodes (j, i) of the region, the strongest first.
    pub nodes: Vec<(usize, usize)>,
}

/// Swirling strength below this part of the largest derivative is rounding, not rotation.
const ROUNDING: f64 = 1e-3;

/// The cores of a field of swirling strength signed by vorticity, in no particular order.
///
/// Nodes are taken from the strongest down. A node beside no core founds one; a node beside one
/// joins it; a node beside two of one sign joins the one whose neighbour is stronger, and the two
/// become one unless this saddle is lower than `saddle` times the lower of their peaks. The
/// descent ends at `threshold` times the strongest.
pub(super) fn cores(
    swirl: &Array2<f64>,
    largest_derivative: f64,
    options: &EddyOptions,
    task: &Task,
) -> Result<Vec<Core>, Cancelled> {
    let strongest = swirl.iter().filter(|s| s.is_finite());
    let strongest = strongest.fold(0.0, |m: f64, s| m.max(s.abs()));
    let least = (options.threshold * strongest).max(ROUNDING * largest_derivative);
    let mut order: Vec<(usize, usize)> = swirl
        .indexed_iter()
        .filter(|(_, s)| s.abs() >= least && **s != 0.0)
        .map(|(node, _)| node)
        .collect();
    let strength = |node: (usize, usize)| swirl[node].abs();
    order.sort_by(|&a, &b| strength(b).total_cmp(&strength(a)).then(a.cmp(&b)));

    let mut descent = Descent {
        swirl,
        owner: Array2::from_elem(swirl.dim(), None),
        cores: Vec::new(),
        saddle: options.saddle,
    };
    for (count, node) in order.into_iter().enumerate() {
        if count % 1024 == 0 {
            task.check()?;
        }
        descent.take(node);
    }
    Ok(descent
        .cores
        .into_iter()
        .filter(|core| core.nodes.len() >= options.least_nodes)
        .collect())
}

struct Descent<'a> {
    swirl: &'a Array2<f64>,
    owner: Array2<Option<usize>>,
    /// Cores by number; one that was swallowed is left without nodes.
    cores: Vec<Core>,
    saddle: f64,
}

impl Descent<'_> {
    fn take(&mut self, node: (usize, usize)) {
        let here = self.swirl[node];
        let mut beside: Vec<(f64, usize)> = neighbours(node, self.swirl.dim())
            .filter(|&n| self.swirl[n] * here > 0.0)
            .filter_map(|n| Some((self.swirl[n].abs(), self.owner[n]?)))
            .collect();
        beside.sort_by(|a, b| b.0.total_cmp(&a.0));
        let mut home = match beside.first() {
            Some(&(_, core)) => core,
            None => {
                self.cores.push(Core { nodes: Vec::new() });
                self.cores.len() - 1
            }
        };
        for (_, other) in beside.into_iter().skip(1) {
            // An earlier turn of this loop may have moved `other`'s nodes already.
            if other != home
                && !self.cores[other].nodes.is_empty()
                && self.shallow(home, other, here)
            {
                home = self.merge(home, other);
            }
        }
        self.owner[node] = Some(home);
        self.cores[home].nodes.push(node);
    }

    fn peak(&self, core: usize) -> f64 {
        let first = self.cores[core].nodes.first();
        first.map_or(0.0, |&node| self.swirl[node].abs())
    }

    /// True when the saddle `here` does not part the two.
    fn shallow(&self, a: usize, b: usize, here: f64) -> bool {
        here.abs() >= self.saddle * self.peak(a).min(self.peak(b))
    }

    /// Gives the weaker core's nodes to the stronger and says which that is.
    fn merge(&mut self, a: usize, b: usize) -> usize {
        let (keep, give) = if self.peak(a) >= self.peak(b) {
            (a, b)
        } else {
            (b, a)
        };
        let nodes = std::mem::take(&mut self.cores[give].nodes);
        for &node in &nodes {
            self.owner[node] = Some(keep);
        }
        self.cores[keep].nodes.extend(nodes);
        keep
    }
}

/// The up to four neighbours of a node along x and y.
pub(super) fn neighbours(
    (j, i): (usize, usize),
    (ny, nx): (usize, usize),
) -> impl Iterator<Item = (usize, usize)> {
    let left = i.checked_sub(1).map(|i| (j, i));
    let below = j.checked_sub(1).map(|j| (j, i));
    let right = (i + 1 < nx).then_some((j, i + 1));
    let above = (j + 1 < ny).then_some((j + 1, i));
    [left, below, right, above].into_iter().flatten()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn found(row: &[f64], saddle: f64) -> Vec<usize> {
        let swirl = Array2::from_shape_vec((1, row.len()), row.to_vec()).unwrap();
        let options = EddyOptions {
            saddle,
            least_nodes: 1,
            threshold: 0.1,
            ..EddyOptions::default()
        };
        let cores = cores(&swirl, 1.0, &options, &Task::quiet()).unwrap();
        let mut sizes: Vec<usize> = cores.iter().map(|c| c.nodes.len()).collect();
        sizes.sort();
        sizes
    }

    #[test]
    fn a_deep_saddle_parts_two_peaks_and_a_shallow_one_does_not() {
        let deep = [0.0, 5.0, 9.0, 5.0, 3.0, 6.0, 8.0, 4.0];
        assert_eq!(found(&deep, 0.8), [3, 4]);
        assert_eq!(found(&deep, 0.3), [7]);
        let shallow = [0.0, 5.0, 9.0, 8.0, 7.9, 8.0, 8.2, 4.0];
        assert_eq!(found(&shallow, 0.8), [7]);
    }

    #[test]
    fn senses_and_masked_nodes_part_regions() {
        assert_eq!(found(&[5.0, 6.0, -6.0, -5.0, -5.0], 0.1), [2, 3]);
        assert_eq!(found(&[5.0, 6.0, f64::NAN, 6.0], 0.1), [1, 2]);
        assert_eq!(found(&[0.0, 0.0], 0.1), [0usize; 0]);
        assert_eq!(found(&[1e-9, 1e-9], 0.1), [0usize; 0]);
    }
}
