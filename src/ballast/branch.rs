//! Choices that are not continuous: unit weights, nothing or at least so much, one of several sets
//! of rows. Branch and bound over the convex programs.

use std::cmp::Ordering;
use std::collections::BinaryHeap;

use nalgebra::{DMatrix, DVector};

use super::conic::{self, Point, Solved};
use super::row::{Demand, Row};
use crate::statics::nnls::least_squares;

/// What is sought.
pub(super) struct Program<'a> {
    pub(super) cost: Vec<f64>,
    pub(super) hi: Vec<f64>,
    pub(super) lo: Vec<f64>,
    /// Whole multiples of this only.
    pub(super) step: Vec<Option<f64>>,
    /// Nothing, or at least this.
    pub(super) least: Vec<f64>,
    pub(super) rows: Vec<Row>,
    pub(super) demands: &'a [Demand],
    /// The size of x.
    pub(super) mass: f64,
    /// Programs that are solved before it stops with a gap.
    pub(super) most_nodes: usize,
    /// Whether an answer holds in exact figures.
    pub(super) accept: &'a dyn Fn(&[f64]) -> bool,
}

/// An answer that holds.
#[derive(Clone, Debug)]
pub(super) struct Best {
    pub(super) x: Vec<f64>,
    pub(super) cost: f64,
    pub(super) rows: Vec<Row>,
    pub(super) dual: Vec<Vec<f64>>,
}

/// What came of a search.
#[derive(Clone, Debug)]
pub(super) struct Searched {
    pub(super) best: Option<Best>,
    /// No answer costs less than this; infinite where there is none.
    pub(super) bound: f64,
    /// A choice had to be made.
    pub(super) branched: bool,
    /// Some program could not be solved, or not all were.
    pub(super) unsure: bool,
}

struct Node {
    bound: f64,
    order: usize,
    lo: Vec<f64>,
    hi: Vec<f64>,
    chosen: Vec<Option<usize>>,
}

impl PartialEq for Node {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}
impl Eq for Node {}
impl PartialOrd for Node {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}
impl Ord for Node {
    /// The greatest is taken first: the least bound, then the newest.
    fn cmp(&self, other: &Self) -> Ordering {
        other
            .bound
            .total_cmp(&self.bound)
            .then(self.order.cmp(&other.order))
    }
}

impl Program<'_> {
    fn costs(&self, x: &[f64]) -> f64 {
        self.cost.iter().zip(x).map(|(c, x)| c * x).sum()
    }

    /// Rows of a node: the common ones, those of demands with one list, and the chosen lists.
    fn rows<'r>(&'r self, chosen: &[Option<usize>]) -> Vec<&'r Row> {
        let lists = self.demands.iter().zip(chosen);
        let lists = lists.filter_map(|(d, c)| match (d.any.as_slice(), c) {
            ([one], _) => Some(one),
            (many, Some(c)) => many.get(*c),
            _ => None,
        });
        self.rows.iter().chain(lists.flatten()).collect()
    }

    /// The least cost, best first.
    pub(super) fn search(&self) -> Searched {
        let mut out = Searched {
            best: None,
            bound: f64::INFINITY,
            branched: false,
            unsure: false,
        };
        let mut open = BinaryHeap::new();
        let mut order = 0;
        open.push(Node {
            bound: f64::NEG_INFINITY,
            order,
            lo: self.lo.clone(),
            hi: self.hi.clone(),
            chosen: vec![None; self.demands.len()],
        });
        let mut solved = 0;
        // Bounds of branches that were given up.
        let mut dropped = f64::INFINITY;
        while let Some(node) = open.pop() {
            let cut = |best: &Option<Best>| {
                best.as_ref()
                    .map_or(f64::INFINITY, |b| b.cost - 1e-12 * self.mass)
            };
            if node.bound >= cut(&out.best) {
                continue;
            }
            if solved >= self.most_nodes {
                out.unsure = true;
                dropped = dropped.min(node.bound);
                continue;
            }
            solved += 1;
            let rows = self.rows(&node.chosen);
            let point = match conic::solve(&self.cost, &node.lo, &node.hi, &rows, self.mass) {
                Solved::Found(p) => p,
                Solved::Infeasible => continue,
                Solved::Unknown => {
                    out.unsure = true;
                    dropped = dropped.min(node.bound);
                    continue;
                }
            };
            let bound = point.bound.max(node.bound);
            if bound >= cut(&out.best) {
                continue;
            }
            if let Some(children) = self.split(&node, &point, bound, &mut order) {
                out.branched = true;
                open.extend(children);
                continue;
            }
            match self.finish(&node, point) {
                Some(best) => {
                    if out.best.as_ref().is_none_or(|b| best.cost < b.cost) {
                        out.best = Some(best);
                    }
                    // What this node could still save lies between its bound and its answer.
                    dropped = dropped.min(bound);
                }
                None => {
                    out.unsure = true;
                    dropped = dropped.min(bound);
                }
            }
        }
        out.bound = dropped;
        out
    }

    /// The two or more nodes below one whose answer leaves a choice open.
    fn split(
        &self,
        node: &Node,
        point: &Point,
        bound: f64,
        order: &mut usize,
    ) -> Option<Vec<Node>> {
        let mut child = |change: &dyn Fn(&mut Node)| {
            *order += 1;
            let mut n = Node {
                bound,
                order: *order,
                lo: node.lo.clone(),
                hi: node.hi.clone(),
                chosen: node.chosen.clone(),
            };
            change(&mut n);
            n
        };
        let x = &point.x;
        let tiny = 1e-9 * self.mass;
        // The place furthest from a whole number of units.
        let off = |j: usize| {
            let s = self.step[j]?;
            let away = (x[j] / s - (x[j] / s).round()).abs();
            (node.hi[j] > node.lo[j] && away * s > tiny && away > 1e-7).then_some(away)
        };
        let worst = (0..x.len())
            .filter_map(|j| off(j).map(|a| (j, a)))
            .max_by(|a, b| a.1.total_cmp(&b.1).then(b.0.cmp(&a.0)));
        if let Some((j, _)) = worst {
            let s = self.step[j]?;
            let below = (x[j] / s).floor();
            return Some(vec![
                child(&|n| n.lo[j] = (below + 1.0) * s),
                child(&|n| n.hi[j] = below * s),
            ]);
        }
        for (j, least) in self.least.iter().enumerate() {
            if x[j] > tiny && x[j] < least * (1.0 - 1e-9) && node.lo[j] < *least {
                return Some(vec![
                    child(&|n| n.lo[j] = *least),
                    child(&|n| n.hi[j] = 0.0),
                ]);
            }
        }
        for (d, demand) in self.demands.iter().enumerate() {
            let open = demand.any.len() > 1 && node.chosen[d].is_none();
            if open && self.holding(demand, x).is_none() {
                let lists = 0..demand.any.len();
                return Some(lists.map(|k| child(&|n| n.chosen[d] = Some(k))).collect());
            }
        }
        None
    }

    /// The list of a demand that holds at `x`.
    fn holding(&self, demand: &Demand, x: &[f64]) -> Option<usize> {
        let holds = |r: &Row| r.slack(x) >= -1e-9 * r.size(self.mass);
        demand.any.iter().position(|list| list.iter().all(holds))
    }

    /// An answer that holds in exact figures, made of one that holds to the solver's tolerance:
    /// whole units are made whole and held, and what binds is solved again to rounding.
    fn finish(&self, node: &Node, point: Point) -> Option<Best> {
        let (mut lo, mut hi) = (node.lo.clone(), node.hi.clone());
        let tiny = 1e-9 * self.mass;
        let mut held = false;
        for j in 0..lo.len() {
            let whole = match self.step[j] {
                Some(s) => Some((point.x[j] / s).round() * s),
                None if self.least[j] > 0.0 && point.x[j] <= tiny && lo[j] <= 0.0 => Some(0.0),
                None => None,
            };
            if let Some(w) = whole {
                held |= hi[j] > lo[j];
                (lo[j], hi[j]) = (w, w);
            } else if self.least[j] > 0.0 {
                held |= lo[j] < self.least[j];
                lo[j] = self.least[j].max(lo[j]);
            }
        }
        let mut chosen = node.chosen.clone();
        for (d, demand) in self.demands.iter().enumerate() {
            if demand.any.len() > 1 && chosen[d].is_none() {
                chosen[d] = self.holding(demand, &point.x);
                held = true;
            }
        }
        let rows = self.rows(&chosen);
        let mut point = point;
        if held {
            match conic::solve(&self.cost, &lo, &hi, &rows, self.mass) {
                Solved::Found(p) => point = p,
                _ => return None,
            }
        }
        let done = |x: Vec<f64>, dual: Vec<Vec<f64>>| Best {
            cost: self.costs(&x),
            x,
            rows: rows.iter().map(|r| (*r).clone()).collect(),
            dual,
        };
        let polished = polish(&point.x, &lo, &hi, &rows, self.mass);
        if (self.accept)(&polished) {
            return Some(done(polished, point.dual));
        }
        if (self.accept)(&point.x) {
            return Some(done(point.x.clone(), point.dual));
        }
        // Bands a little narrower than asked leave room for rounding.
        for tighter in [1e-11, 1e-10, 1e-9, 1e-8, 1e-7] {
            let narrow: Vec<Row> = rows
                .iter()
                .map(|r| {
                    let mut r = (*r).clone();
                    if !r.equality {
                        r.t.constant -= tighter * r.size(self.mass);
                    }
                    r
                })
                .collect();
            let narrow: Vec<&Row> = narrow.iter().collect();
            if let Solved::Found(p) = conic::solve(&self.cost, &lo, &hi, &narrow, self.mass) {
                let polished = polish(&p.x, &lo, &hi, &narrow, self.mass);
                for x in [polished, p.x] {
                    if (self.accept)(&x) {
                        return Some(done(x, point.dual));
                    }
                }
            }
        }
        None
    }
}

/// Newton steps of least length onto the rows that bind, with what lies at its end held there.
fn polish(x: &[f64], lo: &[f64], hi: &[f64], rows: &[&Row], mass: f64) -> Vec<f64> {
    let near = 1e-8 * mass;
    let mut x: Vec<f64> = x
        .iter()
        .enumerate()
        .map(|(j, &x)| {
            if x - lo[j] <= near {
                lo[j]
            } else if hi[j] - x <= near {
                hi[j]
            } else {
                x
            }
        })
        .collect();
    let free: Vec<usize> = (0..x.len())
        .filter(|&j| x[j] > lo[j] && x[j] < hi[j])
        .collect();
    let active: Vec<&&Row> = rows
        .iter()
        .filter(|r| r.slack(&x) <= 1e-7 * r.size(mass))
        .collect();
    if free.is_empty() || active.is_empty() {
        return x;
    }
    for _ in 0..6 {
        let scale: Vec<f64> = active.iter().map(|r| 1.0 / r.size(mass)).collect();
        let g: Vec<Vec<f64>> = active.iter().map(|r| r.gradient(&x)).collect();
        let a = DMatrix::from_fn(active.len(), free.len(), |r, c| g[r][free[c]] * scale[r]);
        let b = DVector::from_fn(active.len(), |r, _| -active[r].slack(&x) * scale[r]);
        let d = least_squares(&a, &b);
        for (c, &j) in free.iter().enumerate() {
            x[j] = (x[j] + d[c]).clamp(lo[j], hi[j]);
        }
    }
    x
}
