//! Chance with a stated seed: the same seed gives the same numbers on every machine.
//!
//! xoshiro256++ 1.0 (Blackman & Vigna, *ACM Trans. Math. Software* 47 (2021) 36), its state filled by SplitMix64
//! (Steele, Lea & Flood, OOPSLA 2014), as its authors advise. Not for secrets.

mod variates;

/// A stream of random numbers.
#[derive(Debug, Clone)]
pub(crate) struct Random {
    state: [u64; 4],
}

impl Random {
    pub(crate) fn new(seed: u64) -> Random {
        let mut mixer = seed;
        Random {
            state: std::array::from_fn(|_| split_mix(&mut mixer)),
        }
    }

    /// All 64 bits.
    pub(crate) fn bits(&mut self) -> u64 {
        let s = &mut self.state;
        let out = s[0].wrapping_add(s[3]).rotate_left(23).wrapping_add(s[0]);
        let t = s[1] << 17;
        s[2] ^= s[0];
        s[3] ^= s[1];
        s[1] ^= s[2];
        s[0] ^= s[3];
        s[2] ^= t;
        s[3] = s[3].rotate_left(45);
        out
    }

    /// A whole number from 0 to `end - 1`, each equally likely (Lemire 2019).
    pub(crate) fn below(&mut self, end: u64) -> u64 {
        let unfair = end.wrapping_neg() % end.max(1);
        loop {
            let wide = u128::from(self.bits()) * u128::from(end);
            if wide as u64 >= unfair {
                return (wide >> 64) as u64;
            }
        }
    }

    /// Every order equally likely (Fisher & Yates).
    pub(crate) fn shuffle<T>(&mut self, items: &mut [T]) {
        for last in (1..items.len()).rev() {
            items.swap(last, self.below(last as u64 + 1) as usize);
        }
    }
}

fn split_mix(state: &mut u64) -> u64 {
    *state = state.wrapping_add(0x9e37_79b9_7f4a_7c15);
    let mut z = *state;
    z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    z ^ (z >> 31)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Output of the authors' C program for the state 1, 2, 3, 4, as the crate `rand_xoshiro` tests it.
    #[test]
    fn the_published_stream() {
        let mut random = Random {
            state: [1, 2, 3, 4],
        };
        let expected = [
            41_943_041,
            58_720_359,
            3_588_806_011_781_223,
            3_591_011_842_654_386,
        ];
        assert_eq!(expected.map(|_| random.bits()), expected);
    }

    /// SplitMix64 from 1234567 as its reference program prints it.
    #[test]
    fn the_published_seeding() {
        let mut state = 1_234_567;
        let expected = [
            6_457_827_717_110_365_317,
            3_203_168_211_198_807_973,
            9_817_491_932_198_370_423,
        ];
        assert_eq!(expected.map(|_| split_mix(&mut state)), expected);
    }

    #[test]
    fn every_order_of_three_is_as_likely_as_another() {
        let mut random = Random::new(7);
        let mut seen = std::collections::BTreeMap::new();
        for _ in 0..6000 {
            let mut items = [0, 1, 2];
            random.shuffle(&mut items);
            *seen.entry(items).or_insert(0) += 1;
        }
        assert_eq!(seen.len(), 6);
        // Chi-square with 5 df above 20.5: one in a thousand.
        let chi_square: f64 = seen
            .values()
            .map(|&n| (f64::from(n) - 1000.0).powi(2) / 1000.0)
            .sum();
        assert!(chi_square < 20.5, "{seen:?}");
    }
}
