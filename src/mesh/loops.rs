//! Boundary loops: the open edges of a shell, strung together.

use std::collections::BTreeMap;

/// An edge whose passages do not cancel, in the direction that prevails.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct OpenEdge {
    pub(crate) from: u32,
    pub(crate) to: u32,
    /// How many passages are left over.
    pub(crate) surplus: u32,
    /// The triangles that pass along it.
    pub(crate) triangles: Vec<u32>,
}

/// A closed chain of open edges, as vertex numbers in the direction of its triangles.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Loop {
    /// Vertices in order; the last is joined to the first.
    pub(crate) vertices: Vec<u32>,
    /// The triangles along it, ascending.
    pub(crate) triangles: Vec<u32>,
    /// Whether every edge of it is one that two triangles pass in the same direction.
    pub(crate) conflict: bool,
}

/// Strings the edges into loops that meet no vertex twice. Each edge is used once, whatever its
/// surplus. Edges that close no loop (which happens only where surpluses differ) are returned as
/// loops of their own chain.
pub(crate) fn loops(edges: &[OpenEdge]) -> Vec<Loop> {
    let mut out: BTreeMap<u32, Vec<usize>> = BTreeMap::new();
    for (i, e) in edges.iter().enumerate().rev() {
        // Reversed, so that popping takes the first in order.
        out.entry(e.from).or_default().push(i);
    }
    let mut found = Vec::new();
    let starts: Vec<u32> = out.keys().copied().collect();
    for start in starts {
        while out.get(&start).is_some_and(|v| !v.is_empty()) {
            let mut path: Vec<usize> = Vec::new();
            let mut place: BTreeMap<u32, usize> = BTreeMap::from([(start, 0)]);
            let mut at = start;
            while let Some(i) = out.get_mut(&at).and_then(Vec::pop) {
                path.push(i);
                at = edges[i].to;
                if let Some(&since) = place.get(&at) {
                    // Back at a vertex of the path: that part is a loop; go on with the rest.
                    let cycle = path.split_off(since);
                    for &j in &cycle {
                        if edges[j].from != at {
                            place.remove(&edges[j].from);
                        }
                    }
                    found.push(closed(&cycle, edges));
                } else {
                    place.insert(at, path.len());
                }
            }
            if !path.is_empty() {
                found.push(closed(&path, edges));
            }
        }
    }
    found
}

fn closed(path: &[usize], edges: &[OpenEdge]) -> Loop {
    let mut triangles: Vec<u32> = path
        .iter()
        .flat_map(|&i| edges[i].triangles.iter().copied())
        .collect();
    triangles.sort_unstable();
    triangles.dedup();
    Loop {
        vertices: path.iter().map(|&i| edges[i].from).collect(),
        triangles,
        conflict: path.iter().all(|&i| edges[i].surplus > 1),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn edge(from: u32, to: u32) -> OpenEdge {
        OpenEdge {
            from,
            to,
            surplus: 1,
            triangles: vec![from],
        }
    }

    #[test]
    fn loops_that_touch_at_a_vertex_are_two() {
        let edges = [
            edge(1, 2),
            edge(2, 3),
            edge(3, 4),
            edge(4, 1),
            edge(3, 5),
            edge(5, 6),
            edge(6, 3),
        ];
        let mut found: Vec<Vec<u32>> = loops(&edges)
            .into_iter()
            .map(|l| {
                let mut v = l.vertices;
                v.sort_unstable();
                v
            })
            .collect();
        found.sort_unstable();
        assert_eq!(found, [vec![1, 2, 3, 4], vec![3, 5, 6]]);
    }
}
