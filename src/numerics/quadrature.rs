//! Temporary.
use super::distribution::normal_cdf;
/// P(largest)
pub fn probability_of_being_largest(m: &[f64], s: &[f64], out: &mut [f64]) {
    if m.len() == 2 {
        let p = normal_cdf((m[1] - m[0]) / (s[0] * s[0] + s[1] * s[1]).sqrt());
        out[0] = 1.0 - p;
        out[1] = p;
        return;
    }
    let n = 257;
    let mut total = 0.0;
    for a in 0..m.len() {
        let mut sum = 0.0;
        for i in 0..n {
            let u = -8.0 + 16.0 * i as f64 / (n - 1) as f64;
            let mut v = (-u * u / 2.0f64).exp();
            for b in 0..m.len() {
                if b != a {
                    v *= normal_cdf((m[a] + s[a] * u - m[b]) / s[b]);
                }
            }
            sum += v;
        }
        out[a] = sum;
        total += sum;
    }
    for o in out.iter_mut() {
        *o /= total;
    }
}
