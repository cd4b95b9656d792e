// Package graph turns neighbour lists, or given edges, into the weighted graph that the labels spread over.
//
// FromLists (K nearest) and FromRagged (all within a radius) join the lists of one neighbour search into a Graph: the
// undirected skeleton with a distance on each edge. Graph.LogWeights puts a kernel and a bandwidth on it and gives
// ln w for each edge, the form every solver takes: weights stay logarithms, so no bandwidth underflows silently.
// FromEdges builds the same form from weights that the user gives. Around them: FindReach and Graph.Join for components
// without a label, SmallestK, SmallestBandwidth and SufficientK for what would reach them, Tether for labels that carry
// noise, BandwidthWindow for the range of sound bandwidths, Measure for the health of the graph, WriteEdgeList and
// WriteMatrixMarket for its export.
//
// Vertices are distinct points in an order that is a function of the point set; everything here follows that order and
// nothing else, so the answers do not depend on the order of rows in a file, nor on the number of workers.
package graph

import (
	"fmt"
	"sync"

	"pinfill/internal/sparse"
)

// LocalRank is the rank of the neighbour whose distance is a vertex's own scale under the local bandwidth
// (Zelnik-Manor and Perona 2004: the 7th). Search with K >= LocalRank, so that the scale does not move with K.
const LocalRank = 7

// rowGrain is the number of rows in a chunk of a parallel loop over vertices.
const rowGrain = 2048

// Graph is an undirected neighbour graph before its edges are weighted.
type Graph struct {
	Skeleton *sparse.CSR // Val is the distance between the ends, in scaled units, > 0
	Local    []float64   // own scale s_i of each vertex: distance to its neighbour of rank Rank, > 0; NaN if it has none
	Rank     int         // LocalRank, or less where the lists were shorter

	forests [2]struct { // spanning forests of the distances and of the local lengths, found once
		once  sync.Once
		edges []Edge
	}
}

// Edges is the number of undirected edges.
func (g *Graph) Edges() int { return g.Skeleton.NNZ() / 2 }

// sizeError says that an argument does not fit the graph.
func sizeError(what string, got, want int) error {
	return fmt.Errorf("%s has %d entries for %d vertices", what, got, want)
}
