"""The knowledge graph: Turtle of kb/ into the compiled index, its cache, the check of the graph, names."""
