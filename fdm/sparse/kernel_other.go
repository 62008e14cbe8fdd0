//go:build !amd64

package sparse

var haveStrips, haveWide = false, false

func mulSubStrip(c, a, b *float64, ldc, lda, ldb, m, n, k, step, fresh int) {
	panic("sparse: no strip kernel on this machine")
}

func scaleStrip(c, t *float64, ldc, ldt, m, n int) {
	panic("sparse: no strip kernel on this machine")
}

func forwardFront(p, y, x *float64, ld, cols, own int, rows *int32, below int, unit bool) {
	panic("sparse: no strip kernel on this machine")
}

func backwardFront(p, y, x *float64, ld, cols, own int, rows *int32, below int, unit bool) {
	panic("sparse: no strip kernel on this machine")
}

func addRuns(dst, src *float64, ld, n, cols, skip, shift int, runs *run, count int) {
	panic("sparse: no strip kernel on this machine")
}
