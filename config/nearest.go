package config

// nearest returns the word of known that takes the fewest edits to reach from
// word, or "" when none is near enough to be meant: more than two edits and
// more than a third of the word.
func nearest(word string, known []string) string {
	best, fewest := "", max(2, len(word)/3)+1
	for _, k := range known {
		if gap := len(k) - len(word); gap >= fewest || -gap >= fewest {
			continue
		}
		if n := edits(word, k); n < fewest {
			best, fewest = k, n
		}
	}
	return best
}

// edits returns the number of insertions, deletions, replacements and swaps of
// neighbouring bytes that turn a into b (optimal string alignment distance).
func edits(a, b string) int {
	before, last, row := make([]int, len(b)+1), make([]int, len(b)+1), make([]int, len(b)+1)
	for j := range last {
		last[j] = j
	}
	for i := 1; i <= len(a); i++ {
		row[0] = i
		for j := 1; j <= len(b); j++ {
			change := 1
			if a[i-1] == b[j-1] {
				change = 0
			}
			row[j] = min(last[j]+1, row[j-1]+1, last[j-1]+change)
			if i > 1 && j > 1 && a[i-1] == b[j-2] && a[i-2] == b[j-1] {
				row[j] = min(row[j], before[j-2]+1)
			}
		}
		before, last, row = last, row, before
	}
	return last[len(b)]
}
