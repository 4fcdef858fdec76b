//! The clock's own account: the line of time on grid index, and the scatter of neighbouring rows.

/// Least-squares line of time on index: one slope, an intercept for each run.
pub(super) struct Fit {
    /// Residues d are taken from this period and from the run's first row, so that the sums stay small.
    reference: f64,
    first: (f64, f64),
    count: f64,
    c: f64,
    cc: f64,
    d: f64,
    cd: f64,
    /// Σ (c − c̄)² and Σ (c − c̄)(d − d̄) of the runs that are complete.
    squares: f64,
    products: f64,
}

impl Fit {
    pub(super) fn new(reference: f64) -> Self {
        Self {
            reference,
            first: (0.0, 0.0),
            count: 1.0,
            c: 0.0,
            cc: 0.0,
            d: 0.0,
            cd: 0.0,
            squares: 0.0,
            products: 0.0,
        }
    }

    #[inline(always)]
    pub(super) fn add(&mut self, index: f64, time: f64) {
        let c = index - self.first.0;
        let d = (time - self.first.1) - c * self.reference;
        self.count += 1.0;
        self.c += c;
        self.cc += c * c;
        self.d += d;
        self.cd += c * d;
    }

    /// Ends the run; the next one starts at this row, which is still to be added (as zeros).
    pub(super) fn cut(&mut self, index: f64, time: f64) {
        let (squares, products) = self.sums();
        *self = Self {
            first: (index, time),
            count: 0.0,
            squares,
            products,
            ..Self::new(self.reference)
        };
    }

    fn sums(&self) -> (f64, f64) {
        let squares = self.cc - self.c * self.c / self.count;
        let products = self.cd - self.c * self.d / self.count;
        (self.squares + squares, self.products + products)
    }

    pub(super) fn period(&self) -> f64 {
        let (squares, products) = self.sums();
        if squares > 0.0 { self.reference + products / squares } else { self.reference }
    }
}

/// Intervals between neighbours on the grid, as excesses over a reference.
pub(super) struct Neighbours {
    reference: f64,
    count: f64,
    excess: f64,
    squares: f64,
    pub(super) shortest: f64,
    pub(super) longest: f64,
}

impl Neighbours {
    pub(super) fn new(reference: f64) -> Self {
        let (shortest, longest) = (f64::INFINITY, f64::NEG_INFINITY);
        Self { reference, count: 0.0, excess: 0.0, squares: 0.0, shortest, longest }
    }

    #[inline(always)]
    pub(super) fn add(&mut self, interval: f64) {
        let excess = interval - self.reference;
        self.count += 1.0;
        self.excess += excess;
        self.squares += excess * excess;
        // Plain comparisons: no NaN comes here.
        self.shortest = if excess < self.shortest { excess } else { self.shortest };
        self.longest = if excess > self.longest { excess } else { self.longest };
    }

    /// Standard deviation, and largest distance from the mean.
    pub(super) fn spread(&self) -> (f64, f64) {
        if self.count < 2.0 {
            return (0.0, 0.0);
        }
        let mean = self.excess / self.count;
        let variance = (self.squares - self.excess * mean) / (self.count - 1.0);
        (variance.max(0.0).sqrt(), (self.longest - mean).max(mean - self.shortest))
    }
}
