package display

import (
	"testing"
)

// BenchmarkSVG lays out and writes a branch with two folds and a Hopf point.
func BenchmarkSVG(b *testing.B) {
	path := tankBranch(b)
	b.ReportAllocs()
	for b.Loop() {
		f := Plot(path)
		if err := f.Err(); err != nil {
			b.Fatal(err)
		}
		f.built.svg()
	}
}

// BenchmarkCrowd places 16 labels.
func BenchmarkCrowd(b *testing.B) {
	path := waveBranch(b)
	for b.Loop() {
		f := Plot(path)
		if err := f.Err(); err != nil {
			b.Fatal(err)
		}
		f.built.svg()
	}
}

// BenchmarkFourBranches places four names and eight labels.
func BenchmarkFourBranches(b *testing.B) {
	f := gallery(b)["lakes"]
	if err := f.Err(); err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		f.built.svg()
	}
}

// BenchmarkBundle also draws the PNG.
func BenchmarkBundle(b *testing.B) {
	path := tankBranch(b)
	for b.Loop() {
		Render(path)
	}
}
