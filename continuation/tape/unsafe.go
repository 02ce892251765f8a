package tape

import "unsafe"

func unsafeFloats(at unsafe.Pointer, n int) []float64 { return unsafe.Slice((*float64)(at), n) }
