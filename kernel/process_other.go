//go:build !unix

package kernel

// alive cannot tell here. Jupyter ends its kernels itself.
func alive(int) bool { return true }
