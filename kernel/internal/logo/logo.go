// Package logo holds the kernel's picture: a branch that turns at a brink, solid
// where it is stable and dashed where it is not, with the fold's bar.
//
// The files are drawn by Draw and SVG; go test -update writes them anew.
package logo

import "embed"

// Files holds the logo under the names that notebook clients look for.
//
//go:embed logo-32x32.png logo-64x64.png logo-svg.svg
var Files embed.FS
