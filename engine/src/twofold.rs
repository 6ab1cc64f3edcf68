//! Numbers of twice the precision of f64, as an unevaluated sum of two.
//!
//! Sums of squares of readings that differ in the last digits only need their means to more digits than
//! a reading has. Source: Dekker, *Numerische Mathematik* 18 (1971) 224–242; Knuth's two-sum.

/// `head + tail`, `tail` at most half a unit in the last place of `head`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Twofold {
    head: f64,
    tail: f64,
}

impl Twofold {
    pub(crate) const ZERO: Twofold = Twofold {
        head: 0.0,
        tail: 0.0,
    };

    /// `a - b` without rounding.
    pub(crate) fn difference(a: f64, b: f64) -> Twofold {
        Twofold::sum(a, -b)
    }

    /// `a + b` without rounding.
    fn sum(a: f64, b: f64) -> Twofold {
        let head = a + b;
        let shadow = head - a;
        Twofold {
            head,
            tail: (a - (head - shadow)) + (b - shadow),
        }
    }

    /// `a × b` without rounding.
    pub(crate) fn product(a: f64, b: f64) -> Twofold {
        let head = a * b;
        let ((a1, a2), (b1, b2)) = (halves(a), halves(b));
        Twofold {
            head,
            tail: ((a1 * b1 - head) + a1 * b2 + a2 * b1) + a2 * b2,
        }
    }

    pub(crate) fn plus(self, other: Twofold) -> Twofold {
        let sum = Twofold::sum(self.head, other.head);
        Twofold::sum(sum.head, sum.tail + (self.tail + other.tail))
    }

    pub(crate) fn minus(self, other: Twofold) -> Twofold {
        self.plus(Twofold {
            head: -other.head,
            tail: -other.tail,
        })
    }

    pub(crate) fn over(self, divisor: f64) -> Twofold {
        let head = self.head / divisor;
        let product = Twofold::product(head, divisor);
        let rest = ((self.head - product.head) - product.tail) + self.tail;
        Twofold::sum(head, rest / divisor)
    }

    pub(crate) fn squared(self) -> Twofold {
        let square = Twofold::product(self.head, self.head);
        Twofold::sum(square.head, square.tail + 2.0 * self.head * self.tail)
    }

    pub(crate) fn value(self) -> f64 {
        self.head + self.tail
    }
}

/// `x` as two numbers of half the digits each, whose products are exact.
///
/// Not by a fused multiply: without it in the machine's basic instructions that is a call, and takes longer.
fn halves(x: f64) -> (f64, f64) {
    const SHIFT: f64 = (1u64 << 27) as f64 + 1.0;
    let shifted = SHIFT * x;
    let upper = shifted - (shifted - x);
    (upper, x - upper)
}

/// A sum that is added to, with what its additions round off kept beside it; cheaper than a [`Twofold`] as long as the
/// rest is small beside what was added.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Running {
    sum: f64,
    rest: f64,
}

impl Running {
    pub(crate) const ZERO: Running = Running {
        sum: 0.0,
        rest: 0.0,
    };

    pub(crate) fn add(&mut self, x: f64) {
        let sum = Twofold::sum(self.sum, x);
        self.sum = sum.head;
        self.rest += sum.tail;
    }

    pub(crate) fn add_running(&mut self, other: Running) {
        self.add(other.sum);
        self.rest += other.rest;
    }

    pub(crate) fn subtract(&mut self, other: Running) {
        self.add(-other.sum);
        self.rest -= other.rest;
    }

    /// `a - b` without rounding.
    pub(crate) fn difference(a: f64, b: f64) -> Running {
        Twofold::difference(a, b).into()
    }

    pub(crate) fn over(self, divisor: f64) -> Running {
        Twofold::sum(self.sum, self.rest).over(divisor).into()
    }

    pub(crate) fn value(self) -> f64 {
        self.sum + self.rest
    }
}

impl From<Twofold> for Running {
    fn from(x: Twofold) -> Running {
        Running {
            sum: x.head,
            rest: x.tail,
        }
    }
}
