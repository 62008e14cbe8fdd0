package sparse

import (
	"os"
	"unsafe"

	"golang.org/x/sys/unix"
)

// wantLargePages asks for large pages under b. It is a hint: that a system has
// none is no error.
func wantLargePages(b []byte) {
	page := uintptr(os.Getpagesize())
	skip := -uintptr(unsafe.Pointer(unsafe.SliceData(b))) & (page - 1)
	if skip < uintptr(len(b)) {
		b = b[skip:]
		_ = unix.Madvise(b[:uintptr(len(b))&^(page-1)], unix.MADV_HUGEPAGE)
	}
}
