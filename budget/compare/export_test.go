package compare

// LMDI splits the change of a sum of products, as the published examples do:
// rows are sub-categories, columns their factors.
func LMDI(base, head [][]float64) (terms [][]float64) {
	for n := range base {
		terms = append(terms, lmdiRow(base[n], head[n]))
	}
	return terms
}
