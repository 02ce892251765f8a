package display

import (
	"fmt"
	"math"
	"strings"

	"brinkline/continuation"
)

// corners returns the special points of all loci and those given alone, each once: a
// Bogdanov-Takens point lies on two loci.
func (f *Figure) corners() []*continuation.LocusSpecial {
	var list []*continuation.LocusSpecial
	for _, it := range f.items {
		switch {
		case it.locus != nil:
			for _, c := range it.locus.Specials() {
				list = withCorner(list, c)
			}
		case it.corner != nil:
			list = withCorner(list, it.corner)
		}
	}
	return list
}

func withCorner(list []*continuation.LocusSpecial, c *continuation.LocusSpecial) []*continuation.LocusSpecial {
	for _, have := range list {
		if have.Kind == c.Kind && cornerText(have, 6) == cornerText(c, 6) {
			return list
		}
	}
	return append(list, c)
}

// cornerDigits is how many digits are shown of the parameters at a special point of
// a locus: it is located to the tolerance of the walker.
const cornerDigits = 8

// cornerText says one special point of a locus: where it lies.
func cornerText(c *continuation.LocusSpecial, digits int) string {
	first, second := pairOf(c.Where)
	return fmt.Sprintf("%s at %s, %s", c.Kind, labelled(first.Variable, first.Value, digits), labelled(second.Variable, second.Value, digits))
}

// locusMeaning explains the lines of loci, and what else a plane of parameters
// shows.
func (f *Figure) locusMeaning(s *scene) string {
	seen, fine := map[lineKind]bool{}, false
	for _, c := range s.curves {
		for _, r := range c.runs {
			seen[r.line] = seen[r.line] || c.locus
			fine = fine || r.fine
		}
	}
	var list []string
	for _, one := range []struct {
		line lineKind
		text string
	}{
		{solid, "solid: folds, where two steady states meet and vanish"},
		{dashDotted, "dash-dotted: Hopf points, where oscillations begin"},
		{dotted, "dotted: neutral saddles, where nothing is lost"},
	} {
		if seen[one.line] {
			list = append(list, one.text)
		}
	}
	if fine {
		list = append(list, "thinner: no stable steady state is lost there")
	}
	var parts []string
	if len(list) > 0 {
		parts = append(parts, capital(strings.Join(list, ", "))+".")
	}
	return strings.Join(append(parts, f.planeMeaning(s)...), " ")
}

func (f *Figure) planeMeaning(s *scene) (parts []string) {
	if !s.plane() {
		return nil
	}
	if len(f.branches()) > 0 {
		parts = append(parts, "The thin line is the path along which the branch was followed.")
	}
	if now, ok := f.now(s); ok && f.nowDrawn {
		parts = append(parts, fmt.Sprintf("The dot is where the model was made: %s, %s.", labelled(s.x.variable, now.x, 6), labelled(s.y.variable, now.y, 6)))
	}
	return parts
}

// fanMeaning says that the fan at a Hopf point is an estimate.
func (f *Figure) fanMeaning(s *scene) string {
	stable, unstable := false, false
	for _, h := range s.hair {
		stable = stable || (h.fan && h.line == solid)
		unstable = unstable || (h.fan && h.line == dashed)
	}
	var list []string
	if stable {
		list = append(list, "solid: a stable oscillation")
	}
	if unstable {
		list = append(list, "dashed: an unstable one")
	}
	if len(list) == 0 {
		return ""
	}
	return fmt.Sprintf("The thin fan at a Hopf point is a local estimate of the greatest and least %s in the oscillation, to leading order (%s); no oscillation was followed.",
		s.y.what(), strings.Join(list, ", "))
}

// meaningOf says in a sentence what a special point of a locus stands for.
func meaningOf(c *continuation.LocusSpecial) string {
	switch c.Kind {
	case cuspKind:
		return cuspMeaning(c)
	case takensKind:
		return takensMeaning(c)
	case foldHopfKind:
		return "a fold and a Hopf point meet: a real eigenvalue and a pair reach the imaginary axis together; near by, oscillations can beat with a second, slow frequency"
	case hopfHopfKind:
		return "two Hopf loci cross: two pairs reach the imaginary axis together; near by, both frequencies can be seen at once"
	case degenerateKind:
		return "the first Lyapunov coefficient is 0: on one side of this point the Hopf points lose stability softly, on the other hard"
	}
	return c.Kind
}

func cuspMeaning(c *continuation.LocusSpecial) string {
	text := "two folds meet here and vanish: between the edges of the wedge there are three steady states near by, outside it one, which then changes without a jump"
	switch {
	case c.Where.Model().Balance() || beyond(c, 1) > 0 || c.Cubic == 0 || math.IsNaN(c.Cubic):
		return text
	case c.Cubic < 0:
		return text + "; of the three, the outer two are stable"
	default:
		return text + "; of the three, the middle one is stable"
	}
}

func takensMeaning(c *continuation.LocusSpecial) string {
	text := "a second eigenvalue vanishes on the fold: a Hopf locus begins here, touching the locus of folds, with a period that grows beyond bounds towards it"
	switch product := c.A2 * c.B2; {
	case c.Where.Model().Balance() || beyond(c, 2) > 0 || product == 0 || math.IsNaN(product):
		return text
	case product < 0:
		return text + "; its small oscillations are stable (a2 b2 < 0)"
	default:
		return text + "; its small oscillations are unstable (a2 b2 > 0)"
	}
}

// beyond counts eigenvalues with positive real part at a special point of a locus,
// leaving out the critical ones, those nearest the imaginary axis.
func beyond(c *continuation.LocusSpecial, critical int) int {
	n := 0
	for i, v := range c.Where.Eigenvalues {
		nearer := 0
		for k, w := range c.Where.Eigenvalues {
			a, b := math.Abs(real(w)), math.Abs(real(v))
			if a < b || (a == b && k < i) {
				nearer++
			}
		}
		if nearer >= critical && real(v) > 0 {
			n++
		}
	}
	return n
}
