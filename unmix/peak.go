package unmix

// Peak finds where the product of an excitation and an emission spectrum is greatest:
// own over all cells (j, k), seen over those whose emission is longer than the
// excitation. Nothing fluoresces elsewhere (Stokes' law): a peak there is made of
// loadings that were each seen with others. Wavelengths in nm; NaN is passed over;
// −1, −1 where no cell is left.
func Peak(exNM, emNM, ex, em []float64) (own, seen [2]int) {
	own, seen = [2]int{-1, -1}, [2]int{-1, -1}
	for j, x := range ex {
		for k, m := range em {
			v := x * m
			if v != v {
				continue
			}
			if own[0] < 0 || v > ex[own[0]]*em[own[1]] {
				own = [2]int{j, k}
			}
			if emNM[k] > exNM[j] && (seen[0] < 0 || v > ex[seen[0]]*em[seen[1]]) {
				seen = [2]int{j, k}
			}
		}
	}
	return own, seen
}
