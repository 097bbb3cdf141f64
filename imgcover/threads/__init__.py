"""From linear light to ends and picks: which lattice repeats, which of its lines are the threads,
and how many of them lie between the edges of the field."""
