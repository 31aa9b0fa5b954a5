//! Temporary.
use super::*;
/// t
pub struct Tally {
    l: Layout,
    n: u64,
    e: Vec<f64>,
    e2: Vec<f64>,
    h: Vec<f64>,
    w: Vec<f64>,
}
/// d
#[derive(Debug, Clone)]
pub struct CellDistribution;
impl Tally {
    /// n
    #[must_use]
    pub fn new(l: Layout) -> Self {
        let c = l.cells();
        Self {
            l,
            n: 0,
            e: vec![0.0; c],
            e2: vec![0.0; c],
            h: vec![0.0; c],
            w: vec![0.0; c],
        }
    }
    /// a
    pub fn absorb(&mut self, b: &BlockRecord) {
        let c = self.l.cells();
        self.n += b.trials as u64;
        for (i, x) in b.estimates.iter().enumerate() {
            let k = i % c;
            let t = self.l.true_values[k / self.l.methods];
            if let Ok(a) = x {
                let e = a.point - t;
                self.e[k] += e;
                self.e2[k] += e * e;
                if a.lower <= t && t <= a.upper {
                    self.h[k] += 1.0;
                }
                self.w[k] += a.width();
            }
        }
    }
    /// m
    #[must_use]
    pub fn measures(&self, truth: usize, _arms: &[String]) -> TruthMeasures {
        for k in 0..self.l.cells() {
            let n = self.n as f64;
            println!(
                "t{truth} cell {k}: bias {:.4} sd {:.4} cover {:.4} width {:.4}",
                self.e[k] / n,
                (self.e2[k] / n - (self.e[k] / n).powi(2)).sqrt(),
                self.h[k] / n,
                self.w[k] / n
            );
        }
        TruthMeasures {
            truth,
            trials: self.n,
            cells: vec![],
            operating: vec![],
        }
    }
    /// d
    #[must_use]
    pub fn distributions(&self) -> Vec<CellDistribution> {
        vec![]
    }
}
