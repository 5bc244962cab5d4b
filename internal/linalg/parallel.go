package linalg

import (
	"runtime"
	"sync"
)

// parallel runs f once for each of up to workers shares, on goroutines when the
// work (in multiply-adds) pays for them. f must write to its share only.
func parallel(workers, work int, f func(w, of int)) {
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	if workers > work>>14 {
		workers = work >> 14
	}
	if workers <= 1 {
		f(0, 1)
		return
	}
	var wg sync.WaitGroup
	for w := range workers {
		wg.Go(func() { f(w, workers) })
	}
	wg.Wait()
}

// chunk4 cuts n into shares whose bounds are multiples of four, so that columns
// are grouped in fours the same way for any number of shares.
func chunk4(n, w, of int) (lo, hi int) {
	per := (n/of + 3) &^ 3
	lo, hi = w*per, (w+1)*per
	if w == of-1 || hi > n {
		hi = n
	}
	if lo > n {
		lo = n
	}
	return lo, hi
}
