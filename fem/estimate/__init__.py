"""Before anything is solved: what rules the freezing, and how long it takes by hand."""
