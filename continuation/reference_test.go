package continuation_test

import (
	"fmt"
	"testing"
	"time"

	"brinkline/continuation"
	"brinkline/continuation/internal/reference"
)

func TestTry(t *testing.T) {
	cases, err := reference.Load("../testdata/reference-cases.json")
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range cases {
		m, err := c.Model(true)
		if err != nil {
			t.Error(c.ID, err)
			continue
		}
		x, err := reference.Values(c.Start.State, m)
		if err != nil {
			t.Error(c.ID, err)
			continue
		}
		p, err := m.Settle(x)
		if err != nil {
			t.Error(c.ID, err)
			continue
		}
		t0 := time.Now()
		b, err := p.Follow(c.Follow.Param, continuation.Within(float64(c.Follow.From), float64(c.Follow.To)))
		if err != nil {
			t.Error(c.ID, err)
			continue
		}
		fmt.Printf("== %s want %v: %d points %d rejected %v %v ends %q %q\n", c.ID, c.Branch.Counts, len(b.Points()), len(b.Rejections()), b.Notes(), time.Since(t0), b.Ends()[0].Text, b.Ends()[1].Text)
		for i, s := range b.Specials() {
			want := float64(0)
			k := -1
			j := 0
			for _, f := range c.Branch.SpecialPoints {
				if c.Facts[f].Kind == "neutral saddle" {
					continue
				}
				if j == i {
					k = f
					want = float64(c.Facts[f].At[c.Follow.Param])
				}
				j++
			}
			_ = k
			fmt.Printf("    %s  want %.17g err %.2g digits %d\n", s.Summary(), want, s.Where().Value()-want, s.Digits())
		}
	}
}
