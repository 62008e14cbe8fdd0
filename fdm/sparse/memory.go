package sparse

import "unsafe"

// largeArray is the number of bytes from which an array is worth pages of its
// own size.
const largeArray = 4 << 20

// hugeArray is the number of bytes from which it is not any more: a virtual
// machine may have given its free large pages back and gets them again slowly
// (measured: 300 MB three times slower at first touch, 40 MB a sixth faster).
const hugeArray = 128 << 20

// large is make for arrays that are written all over soon. The first touch of a
// small page costs as much as computing what goes there: a large array asks the
// system for large pages where there are such.
func large[T int32 | int64 | float64](n int) []T {
	s := make([]T, n)
	if size := uintptr(n) * unsafe.Sizeof(T(0)); size >= largeArray && size < hugeArray {
		wantLargePages(unsafe.Slice((*byte)(unsafe.Pointer(unsafe.SliceData(s))), size))
	}
	return s
}
