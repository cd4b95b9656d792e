package lexmin

// components splits a set of vertices, marked with new numbers, into its connected components. Edges count only
// between two vertices of the set.
func (w *worker) components(q []int32) []part {
	id := w.ids.Add(1)
	for _, v := range q {
		w.set[v] = id
	}
	return w.split(q, id)
}

// split is components for a set that carries the number id already; the parts get new numbers.
func (w *worker) split(q []int32, id int32) []part {
	var parts []part
	for _, root := range q {
		if w.set[root] != id {
			continue
		}
		part := part{id: w.ids.Add(1)}
		from := len(w.stack)
		w.stack = append(w.stack, root)
		w.set[root] = part.id
		for i := from; i < len(w.stack); i++ {
			v := w.stack[i]
			cols, _ := w.g.Row(int(v))
			for _, u := range cols {
				if w.set[u] == id {
					w.set[u] = part.id
					w.stack = append(w.stack, u)
				}
			}
		}
		part.vertices = w.stack[from:len(w.stack):len(w.stack)]
		parts = append(parts, part)
	}
	return parts
}
