//go:build !linux

package sparse

func wantLargePages([]byte) {}
