//! Random numbers of stated distributions, and streams of them that never meet.

use super::Random;

/// 2¹²⁸ steps at once, as published with the generator.
const JUMP: [u64; 4] = [
    0x180e_c6d3_3cfd_0aba,
    0xd5a6_1266_f0c9_392c,
    0xa958_2618_e03f_c9aa,
    0x39ab_dc45_29b1_661c,
];
/// 2⁻⁵³.
const UNIT: f64 = 1.0 / (1u64 << 53) as f64;

impl Random {
    /// A stream of 2¹²⁸ numbers of its own; this one goes on behind it.
    pub(crate) fn stream(&mut self) -> Random {
        let stream = self.clone();
        let mut state = [0; 4];
        for word in JUMP {
            for bit in 0..64 {
                if word >> bit & 1 == 1 {
                    state.iter_mut().zip(&self.state).for_each(|(a, b)| *a ^= b);
                }
                self.bits();
            }
        }
        self.state = state;
        stream
    }

    /// Uniform, above 0 and below 1.
    pub(crate) fn uniform(&mut self) -> f64 {
        ((self.bits() >> 11) as f64 + 0.5) * UNIT
    }

    /// Standard normal: Marsaglia & Bray, *SIAM Review* 6 (1964) 260–264, one of each pair.
    pub(crate) fn normal(&mut self) -> f64 {
        loop {
            let (u, v) = (2.0 * self.uniform() - 1.0, 2.0 * self.uniform() - 1.0);
            let square = u * u + v * v;
            if square < 1.0 {
                return u * (-2.0 * square.ln() / square).sqrt();
            }
        }
    }

    /// Chi-square with `df > 0`: Marsaglia & Tsang, *ACM Trans. Math. Software* 26 (2000) 363–372.
    pub(crate) fn chi_square(&mut self, df: f64) -> f64 {
        let shape = df / 2.0;
        if shape < 1.0 {
            let thinned = self.uniform().powf(1.0 / shape);
            return 2.0 * self.gamma(shape + 1.0) * thinned;
        }
        2.0 * self.gamma(shape)
    }

    /// Gamma of `shape` at least 1.
    fn gamma(&mut self, shape: f64) -> f64 {
        let d = shape - 1.0 / 3.0;
        let c = 1.0 / (9.0 * d).sqrt();
        loop {
            let x = self.normal();
            let cube = (1.0 + c * x).powi(3);
            if cube > 0.0 && self.uniform().ln() < 0.5 * x * x + d - d * cube + d * cube.ln() {
                return d * cube;
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantile::chi_square_above;

    const DRAWS: usize = 20_000;

    /// Kolmogorov & Smirnov: the largest gap stays below its 0.1 % point, 1.95 / √n.
    fn follows(name: &str, mut above: Vec<f64>) {
        above.sort_by(f64::total_cmp);
        let n = above.len() as f64;
        let gap = |(i, p): (usize, &f64)| (p - (i as f64 + 0.5) / n).abs();
        let largest = above.iter().enumerate().map(gap).fold(0.0, f64::max);
        assert!(largest < 1.95 / n.sqrt(), "{name}: {largest}");
    }

    #[test]
    fn chi_squares_and_normals_follow_their_distributions() {
        let mut random = Random::new(7);
        for df in [0.5, 1.0, 2.0, 9.0, 60.0] {
            let mut stream = random.stream();
            let above = |_| chi_square_above(stream.chi_square(df), df);
            follows(&format!("df {df}"), (0..DRAWS).map(above).collect());
        }
        let mut stream = random.stream();
        let squares: Vec<f64> = (0..DRAWS).map(|_| stream.normal()).collect();
        let positive = squares.iter().filter(|x| **x > 0.0).count() as f64;
        assert!((positive / DRAWS as f64 - 0.5).abs() < 3.3 * 0.5 / (DRAWS as f64).sqrt());
        let above = squares.iter().map(|x| chi_square_above(x * x, 1.0));
        follows("normal", above.collect());
    }

    #[test]
    fn streams_differ() {
        let mut random = Random::new(7);
        let (mut first, mut second) = (random.stream(), random.stream());
        assert!((0..1000).all(|_| first.bits() != second.bits()));
    }
}
