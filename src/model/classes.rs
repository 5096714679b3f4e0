//! Communicating classes of a graph, in the order in which they are left.

/// A graph in compressed rows: the targets of each node.
pub(super) trait Graph {
    fn nodes(&self) -> usize;
    fn targets(&self, node: usize) -> &[u32];
}

/// Strongly connected components, numbered so that every edge between two of them leads from a higher to a lower number.
#[derive(Debug)]
pub(super) struct Components {
    /// Component of each node.
    pub(super) of: Vec<u32>,
    /// How many there are.
    pub(super) count: usize,
}

/// Finds the strongly connected components with an explicit stack: a chain of a million states in a line needs no
/// recursion.
///
/// # Complexity
/// Linear in nodes and edges.
///
/// # Reference
/// Tarjan, SIAM J. Comput. 1 (1972) 146, doi:10.1137/0201010.
pub(super) fn strongly_connected(graph: &impl Graph) -> Components {
    const UNSEEN: u32 = u32::MAX;
    let nodes = graph.nodes();
    let mut of = vec![UNSEEN; nodes];
    let mut order = vec![UNSEEN; nodes];
    let mut low = vec![0u32; nodes];
    let mut next_edge = vec![0usize; nodes];
    let mut next_order = 0u32;
    let mut count = 0u32;
    let mut open: Vec<usize> = Vec::new();
    let mut path: Vec<usize> = Vec::new();
    for root in 0..nodes {
        if order[root] != UNSEEN {
            continue;
        }
        path.push(root);
        while let Some(&node) = path.last() {
            if order[node] == UNSEEN {
                order[node] = next_order;
                low[node] = next_order;
                next_order += 1;
                open.push(node);
            }
            if let Some(&target) = graph.targets(node).get(next_edge[node]) {
                let target = target as usize;
                if order[target] == UNSEEN {
                    // The edge is looked at again when the target is finished, and takes over its low link then.
                    path.push(target);
                    continue;
                }
                if of[target] == UNSEEN {
                    low[node] = low[node].min(low[target]);
                }
                next_edge[node] += 1;
                continue;
            }
            if low[node] == order[node] {
                while let Some(member) = open.pop() {
                    of[member] = count;
                    if member == node {
                        break;
                    }
                }
                count += 1;
            }
            path.pop();
        }
    }
    Components { of, count: count as usize }
}

#[cfg(test)]
mod tests {
    use super::*;

    struct Lists(Vec<Vec<u32>>);

    impl Graph for Lists {
        fn nodes(&self) -> usize {
            self.0.len()
        }
        fn targets(&self, node: usize) -> &[u32] {
            &self.0[node]
        }
    }

    #[test]
    fn classes_are_those_of_mutual_reachability_and_edges_lead_downwards() {
        // All graphs of four nodes without self-loops: 4096 of them, against the closure of the edges.
        let pairs: Vec<(usize, usize)> =
            (0..4).flat_map(|a| (0..4).map(move |b| (a, b))).filter(|(a, b)| a != b).collect();
        for bits in 0u32..1 << pairs.len() {
            let mut lists = vec![Vec::new(); 4];
            let mut reach = [[false; 4]; 4];
            for (i, &(a, b)) in pairs.iter().enumerate() {
                if bits >> i & 1 == 1 {
                    lists[a].push(b as u32);
                    reach[a][b] = true;
                }
            }
            for via in 0..4 {
                for a in 0..4 {
                    for b in 0..4 {
                        reach[a][b] |= reach[a][via] && reach[via][b];
                    }
                }
            }
            let found = strongly_connected(&Lists(lists.clone()));
            for &(a, b) in &pairs {
                assert_eq!(found.of[a] == found.of[b], reach[a][b] && reach[b][a], "{lists:?} {a} {b}");
                assert!(!reach[a][b] || found.of[a] >= found.of[b], "{lists:?} {a} {b}");
            }
        }
    }

    #[test]
    fn a_line_and_a_ring_of_a_million_states_need_no_deep_stack() {
        let n = 1_000_000u32;
        let line = Lists((0..n).map(|i| if i + 1 < n { vec![i + 1] } else { vec![] }).collect());
        assert_eq!(strongly_connected(&line).count, n as usize);
        let ring = Lists((0..n).map(|i| vec![(i + 1) % n]).collect());
        assert_eq!(strongly_connected(&ring).count, 1);
    }
}
